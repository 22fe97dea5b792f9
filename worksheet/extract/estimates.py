"""From a fit to parameters as the process file names them, each with its error, or with the reason why there is none.

A number that the data leave open is None, never a guess: because some direction of the data is blind to it, because its
error is as large as the range it could have, or because weak and strong inversion are not both there.
"""

from __future__ import annotations

import math

import numpy as np

from worksheet.extract.choose import CORE, Choice, unseen
from worksheet.extract.data import Estimate, Rows
from worksheet.extract.fit import Solution
from worksheet.extract.law import AT, Reference

UNITS = {
    "kappa": "",
    "threshold": "V",
    "specific_current": "A",
    "drain_coupling": "",
    "drain_coupling_length": "m",
    "drain_coupling_exponent": "",
    "length_modulation": "m/V",
    "surface_potential": "V",
    "velocity_length": "m",
    "threshold_drift": "V/K",
    "mobility_exponent": "",
    "length_offset": "m",
    "width_offset": "m",
}
"""Every estimate and its SI unit: parameters of the process file, then the offsets of effective size."""

OFFSETS = ("length_offset", "width_offset")
"""L - L_eff and W_eff - W: told, but no parameter of the process file."""

_FITTED_AS = {"specific_current": "log_current", "surface_potential": "inverse_potential"}
_LARGEST_ERROR = {
    "kappa": 0.05,
    "threshold": 0.03,
    "log_current": 0.3,
    "drain_coupling": 0.02,
    "drain_coupling_exponent": 0.5,
    "threshold_drift": 5e-4,
    "mobility_exponent": 0.75,
}
_WEAK, _STRONG = 0.1, 10.0


def estimates(choice: Choice, rows: Rows, inversion: tuple[float, float], reference: Reference) -> dict[str, Estimate]:
    """The parameters of one fit.

    What was tried and left out is looked at once more: a value that the data would not show is not stated as 0.

    Args:
        choice: The fit.
        rows: The rows it used.
        inversion: Lowest and highest inversion among them. [-]
        reference: Where the parameters are stated.
    """
    solution = choice.solution
    blind = _blind(solution, inversion)
    hidden = unseen(rows, choice, reference)
    found = {}
    for name, unit in UNITS.items():
        inner = _FITTED_AS.get(name, name)
        if name == "drain_coupling_length":
            found[name] = _reference_length(rows, reference)
        elif inner in choice.reasons:
            found[name] = _unfitted(name, inner, choice, rows, hidden=inner in hidden)
        elif inner in blind:
            found[name] = Estimate(None, None, unit, blind[inner])
        else:
            found[name] = _fitted(name, inner, solution, rows)
    return found


def correlations(choice: Choice) -> dict[tuple[str, str], float]:
    """Correlation of the errors of every pair of fitted parameters, by names of the process file. [-]"""
    solution = choice.solution
    shown = {inner: name for name, inner in _FITTED_AS.items()}
    sizes = np.sqrt(np.maximum(np.diag(solution.covariance), 1e-300))
    found = {}
    for first, one in enumerate(solution.free):
        for second in range(first + 1, len(solution.free)):
            other = solution.free[second]
            sign = -1.0 if ("inverse_potential" in {one, other}) else 1.0
            value = sign * float(solution.covariance[first, second] / (sizes[first] * sizes[second]))
            found[shown.get(one, one), shown.get(other, other)] = value
    return found


def _blind(solution: Solution, inversion: tuple[float, float]) -> dict[str, str]:
    """Fitted parameters that the data do not fix, with the reason."""
    found = {}
    for name, largest in _LARGEST_ERROR.items():
        error = solution.error(name)
        if error is None:
            continue
        if name in solution.undetermined:
            found[name] = "the data leave it open: other parameters can take its part exactly"
        elif error > largest and not (name == "drain_coupling" and error < 0.5 * solution.value(name)):
            found[name] = f"the data leave it open: its standard error would be {error:.2g}"
    low, high = inversion
    if high < _WEAK:
        reason = f"no moderate inversion: the highest inversion coefficient is about {high:.2g}, 0.1 or more is needed"
        found["threshold"] = found["log_current"] = reason
    elif low > _STRONG:
        reason = f"no weak or moderate inversion: the lowest inversion coefficient is about {low:.2g}"
        found.update(dict.fromkeys(CORE, reason))
    return found


def _fitted(name: str, inner: str, solution: Solution, rows: Rows) -> Estimate:
    """A parameter that was fitted."""
    value, error = solution.value(inner), solution.error(inner)
    if error is None:
        return Estimate(None, None, UNITS[name], "it was not fitted")
    if name == "specific_current":
        return Estimate(math.exp(value), math.exp(value) * error, UNITS[name])
    if name == "surface_potential":
        return Estimate(1.0 / value, error / value**2, UNITS[name])
    if name == "length_modulation" and not np.isfinite(rows.length).all():
        return Estimate(None, None, UNITS[name], f"the length is not known; lambda_L/L is {value:.3g} /V")
    return Estimate(value, error, UNITS[name])


def _unfitted(name: str, inner: str, choice: Choice, rows: Rows, *, hidden: bool) -> Estimate:
    """A parameter that is not in the fit: None where nothing is known of it, else its default, which is 0."""
    reason = choice.reasons[inner]
    if name == "drain_coupling":
        seen = reason.startswith("it is not above 0")
        return Estimate(0.0 if seen else None, None, UNITS[name], reason)
    if inner not in choice.tried:
        return Estimate(None, None, UNITS[name], reason)
    if hidden and reason.startswith("it does not earn"):
        return Estimate(None, None, UNITS[name], "the data cannot tell it from 0, nor from a value that would matter")
    if name == "length_modulation" and not np.isfinite(rows.length).all():
        return Estimate(None, None, UNITS[name], "the length is not known")
    return Estimate(0.0, None, UNITS[name], f"left at its default: {reason}")


def _reference_length(rows: Rows, reference: Reference) -> Estimate:
    """The length at which the drain coupling is stated."""
    if not np.isfinite(rows.length).all():
        return Estimate(None, None, "m", "the length is not known")
    return Estimate(reference.length, None, "m")


def place(name: str) -> int:
    """Where an estimate stands in the law's arrays."""
    return AT[_FITTED_AS.get(name, name)]
