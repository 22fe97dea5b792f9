"""Which parameters a table carries, and which of them earn their place.

A parameter that the table cannot show at all (one drain voltage, one length) is not tried, and the reason is kept. Of
the others the optional ones are taken in one by one as long as the evidence, Akaike's criterion corrected for small
samples, asks for it; one that comes out beyond what it stands for is put back to its default, and that is said too.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.extract.data import Index, Rows
from worksheet.extract.fit import Solution, minimise
from worksheet.extract.law import AT, OFF, Reference
from worksheet.extract.screen import groups

CORE = ("kappa", "threshold", "log_current")
"""What every fit has."""

LAWS = ("drain_coupling_exponent", "threshold_drift", "mobility_exponent")
"""What several lengths or temperatures fix; taken wherever the table has them, since nothing else can state them."""

OPTIONAL = ("inverse_potential", "length_modulation", "velocity_length", "length_offset", "width_offset")
"""What has to earn its place."""

EVIDENCE = 10.0
"""By how much Akaike's criterion must fall for an optional parameter: beyond 10 the poorer law has essentially no
support (Burnham and Anderson, Model Selection and Multimodel Inference, 2002), so that chance does not add one."""

SEEN = 0.15
"""ln of the mean square error by which a parameter must mend a misfit for every point to count."""

LONGEST_VELOCITY = 0.3e-6
"""L_sat = 2 mu U_T/v_sat is some tens of nanometres in silicon; beyond this the bend is of another kind. [m]"""

_APART_VOLTAGE = 0.02


@dataclass(frozen=True, eq=False, slots=True)
class Choice:
    """A fit with the parameters that earned their place.

    Attributes:
        solution: The fit.
        reasons: Why a parameter is not in it, by name in law.NAMES.
        tried: Optional parameters that were tried and left out.
    """

    solution: Solution
    reasons: dict[str, str]
    tried: frozenset[str]


def distinct(values: Array, apart: float) -> int:
    """How many values there are that differ by more than `apart`. [unit of the values]"""
    rising = np.unique(values[np.isfinite(values)])
    return int(np.count_nonzero(np.diff(rising) > apart)) + 1 if len(rising) else 0


def ratios(values: Array) -> int:
    """How many values there are that differ by more than 1 %, 0 where they are unknown. [any]"""
    known = values[np.isfinite(values)]
    return distinct(np.log(known), 0.01) if len(known) == len(values) and len(known) else 0


def not_carried(rows: Rows) -> dict[str, str]:
    """Parameters that the rows cannot show, each with the reason."""
    reasons = {}
    lengths, widths = ratios(rows.length), ratios(rows.width)
    if not _several_drains(rows):
        reasons["drain_coupling"] = "the fitted rows have one drain-source voltage only"
        reasons["length_modulation"] = reasons["drain_coupling"]
    if distinct(rows.source, _APART_VOLTAGE) < 2:
        reasons["inverse_potential"] = "the fitted rows have one source voltage only"
    if not np.isfinite(rows.length).all():
        reasons["velocity_length"] = "the length is not known"
    if lengths < 2:
        reasons["drain_coupling_exponent"] = "the fitted rows have one length only"
    if "drain_coupling" in reasons:
        reasons["drain_coupling_exponent"] = reasons["drain_coupling"]
    if distinct(rows.temperature, 2.0) < 2:
        reasons["threshold_drift"] = reasons["mobility_exponent"] = "the fitted rows have one temperature only"
    if lengths < 3:
        reasons["length_offset"] = "the fitted rows have fewer than three lengths"
    if widths < 3:
        reasons["width_offset"] = "the fitted rows have fewer than three widths"
    return reasons


def _several_drains(rows: Rows) -> bool:
    """Whether any device was measured at two drain-source voltages at one source voltage."""
    held = (rows.source, rows.width, rows.length, rows.temperature)
    return any(distinct(rows.across[group], _APART_VOLTAGE) >= 2 for group in groups(held))


def neighbours(rows: Rows) -> Index:
    """The rows curve by curve along the gate, for the correlation of neighbours."""
    keys = (rows.gate, rows.drain, rows.source, rows.temperature, rows.length, rows.width)
    return np.lexsort(tuple(np.nan_to_num(one, nan=-1.0) for one in keys))


def choose(
    rows: Rows, start: Array, reference: Reference, *, weights: Array | None = None, offered: tuple[str, ...] = OPTIONAL
) -> Choice:
    """Fit, taking in what earns its place.

    Args:
        rows: The points, all with a current above 0.
        start: Parameters to start from. [see law.NAMES]
        reference: Where the parameters are stated.
        weights: Of the residuals. [-], shape (rows,); None for 1
        offered: Optional parameters that may be taken in.
    """
    reasons = not_carried(rows)
    free = tuple(one for one in (*CORE, "drain_coupling", *LAWS) if one not in reasons)
    start = start.copy()
    for name in OFF_UNLESS_FREE:
        if name not in free:
            start[AT[name]] = OFF[AT[name]]
    if "drain_coupling_exponent" in free:
        start[AT["drain_coupling_exponent"]] = 1.0
    if "mobility_exponent" in free:
        start[AT["mobility_exponent"]] = 1.5
    order = neighbours(rows)
    best = _settled(minimise(rows, start, free, reference, weights=weights, neighbours=order), rows, reference, reasons)
    waiting = [one for one in offered if one not in reasons]
    tried: set[str] = set()
    while waiting:
        trials = [_with(rows, best, name, reference, weights, order) for name in waiting]
        gains = [_gain(best, trial) for trial in trials]
        wrong = {name: _unphysical(trial, name) for name, trial in zip(waiting, trials, strict=True)}
        able = [place for place, name in enumerate(waiting) if not wrong[name] and gains[place] > EVIDENCE]
        if not able:
            for place, name in enumerate(waiting):
                earned = wrong[name] if gains[place] > EVIDENCE else ""
                reasons[name] = earned or "it does not earn its place: the fit is as good without it"
                tried.add(name)
            break
        winner = max(able, key=lambda place: gains[place])
        best = trials[winner]
        del waiting[winner]
    return Choice(_final(rows, best, reference, weights, order, reasons, tried), reasons, frozenset(tried))


def unseen(rows: Rows, choice: Choice, reference: Reference) -> frozenset[str]:
    """Parameters that were tried and left out, of which the data would not show a value that matters either.

    Each is put to such a value and the rest fitted again; where the fit is hardly worse, nothing is known of it.

    Args:
        rows: The rows that were fitted.
        choice: The fit.
        reference: Where the parameters are stated.
    """
    found = set()
    best = choice.solution
    length = float(np.nanmin(rows.length)) if np.isfinite(rows.length).all() else 1.0
    matters = {"inverse_potential": 1.0, "length_modulation": 0.2 * length, "velocity_length": 0.1e-6}
    for name in choice.tried & matters.keys():
        start = best.values.copy()
        start[AT[name]] = matters[name]
        trial = minimise(rows, start, best.free, reference)
        worse = _spread(trial, best.scale) / max(_spread(best, best.scale), 1e-30)
        if best.independent * np.log(max(worse, 1e-30)) < EVIDENCE:
            found.add(name)
    return frozenset(found)


OFF_UNLESS_FREE = ("drain_coupling", *LAWS, *OPTIONAL)
"""Parameters that stand at their default where they are not fitted."""


def _with(rows: Rows, best: Solution, name: str, reference: Reference, weights: Array | None, order: Index) -> Solution:
    """The fit with one more parameter."""
    start = best.values.copy()
    if name == "velocity_length":
        start[AT[name]] = 0.02 * float(np.nanmin(rows.length))
    return minimise(rows, start, (*best.free, name), reference, weights=weights, neighbours=order)


def _settled(solution: Solution, rows: Rows, reference: Reference, reasons: dict[str, str]) -> Solution:
    """The fit without a drain coupling that came out below 0, which is none."""
    if "drain_coupling" not in solution.free or solution.value("drain_coupling") >= 0.0:
        return solution
    error = solution.error("drain_coupling") or 0.0
    reasons["drain_coupling"] = f"it is not above 0 (standard error {error:.2g})"
    free = tuple(one for one in solution.free if one not in {"drain_coupling", "drain_coupling_exponent"})
    if "drain_coupling_exponent" in solution.free:
        reasons["drain_coupling_exponent"] = "there is no drain coupling"
    start = solution.values.copy()
    for name in ("drain_coupling", "drain_coupling_exponent"):
        start[AT[name]] = OFF[AT[name]]
    return minimise(rows, start, free, reference, neighbours=neighbours(rows))


def _final(
    rows: Rows,
    best: Solution,
    reference: Reference,
    weights: Array | None,
    order: Index,
    reasons: dict[str, str],
    tried: set[str],
) -> Solution:
    """The fit without optional parameters that later ones have made idle."""
    for name in [one for one in best.free if one in OPTIONAL]:
        error = best.error(name) or 0.0
        wrong = _unphysical(best, name)
        if wrong or abs(best.value(name)) < error:
            start = best.values.copy()
            start[AT[name]] = OFF[AT[name]]
            free = tuple(one for one in best.free if one != name)
            best = minimise(rows, start, free, reference, weights=weights, neighbours=order)
            reasons[name] = wrong or "it does not earn its place beside the others"
            tried.add(name)
    return _settled(best, rows, reference, reasons)


def _unphysical(solution: Solution, name: str) -> str:
    """Why a value is beyond what its parameter stands for; "" where it is not."""
    value = solution.value(name)
    if name in {"inverse_potential", "length_modulation", "velocity_length"} and value <= 0.0:
        return "the data call for a value below 0"
    if name == "velocity_length" and value > LONGEST_VELOCITY:
        return (
            f"the data call for {value:.2g} m, longer than velocity saturation can be: the current falls behind in "
            "strong inversion for another reason"
        )
    if name == "inverse_potential" and value > 20.0:
        return "the data call for a surface potential below 50 mV"
    return ""


def _gain(best: Solution, trial: Solution) -> float:
    """By how much Akaike's criterion falls from one fit to one with more parameters.

    Residuals are clipped at three standard deviations. Points that hang together count as fewer, except where the error
    falls so much that a designer would see it: the law's own misfit is no reason to leave out what mends it.
    """
    before, after = _spread(best, best.scale), _spread(trial, best.scale)
    ratio = np.log(max(before, 1e-30) / max(after, 1e-30))
    count = float(len(best.residuals)) if ratio > SEEN else best.independent

    def penalty(solution: Solution) -> float:
        width = len(solution.free) + 1
        return 2.0 * width + 2.0 * width * (width + 1) / max(count - width - 1.0, 1.0)

    return float(count * ratio - penalty(trial) + penalty(best))


def _spread(solution: Solution, scale: float) -> float:
    """Mean square of the residuals, clipped at three standard deviations. [-]"""
    return float(np.mean(np.clip(solution.residuals, -3.0 * scale, 3.0 * scale) ** 2))
