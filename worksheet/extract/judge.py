"""How far a fit may be trusted: ranges, errors of current and conductances by region, what the model cannot do here.

Nothing here changes the fit. Conductances are compared as difference quotients of the same two rows, measured and
fitted, so that no smoothing stands between the data and the judgement.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from worksheet.device.arrays import Array
from worksheet.extract.data import Index, Mask, RegionError, Rows, Span, Trust
from worksheet.extract.screen import groups

REGIONS = (("weak", 0.0, 0.1), ("moderate", 0.1, 10.0), ("strong", 10.0, np.inf))
"""Regions of inversion with the inversion coefficients they lie between. [-]"""

TRUSTED = 0.15
"""rms of ln I of half a decade of inversion up to which it is within the trusted range. [-]"""

MISLEADING = 0.25
"""rms of ln of a conductance from which on the model is said not to give it. [-]"""

_GATE_STEP = 0.045
_DRAIN_STEP = 0.04
_ABOVE_NOISE = 3.0
_HALF_DECADES = 2
_LEAST_IN_BIN = 3


def trust(rows: Rows, inversion: Array, log_error: Array) -> Trust:
    """Where the fit may be trusted.

    Args:
        rows: The rows that the fit used.
        inversion: I_D/I_spec of each. [-], shape (rows,)
        log_error: ln(I/I_fit) of each. [-], shape (rows,)
    """
    if not len(rows):
        return Trust(None, None, None, None, None, None)
    return Trust(
        inversion=_trusted_inversion(inversion, log_error),
        length=_span(rows.length),
        width=_span(rows.width),
        source=_span(rows.source),
        drain=_span(rows.across),
        temperature=_span(rows.temperature),
    )


def regions(rows: Rows, fitted: Array, inversion: Array, saturated: Mask, noise: float) -> tuple[RegionError, ...]:
    """Errors by region, saturated rows and others.

    Args:
        rows: The rows that the fit used.
        fitted: Current of the law at each. [A], shape (rows,)
        inversion: I_D/I_spec of each; of rows out of saturation that of the source end. [-], shape (rows,)
        saturated: Which of them are saturated.
        noise: Standard deviation of a current's logarithm that is not the law's; smaller steps are not judged. [-]
    """
    error = np.log(fitted / rows.current)
    along_gate = list(_pairs(rows, rows.gate, (rows.source, rows.drain), _GATE_STEP))
    along_drain = list(_pairs(rows, rows.drain, (rows.gate, rows.source), _DRAIN_STEP))
    gate = _quotients(rows, fitted, rows.gate, along_gate, noise)
    drain = _quotients(rows, fitted, rows.drain, along_drain, noise)
    found = []
    for name, low, high in REGIONS:
        for side in (True, False):
            inside = (inversion >= low) & (inversion < high) & (saturated == side)
            found.append(
                RegionError(
                    name,
                    side,
                    int(inside.sum()),
                    _rms(error[inside]),
                    _rms(_within(gate, inside)),
                    _rms(_within(drain, inside)),
                )
            )
    return tuple(found)


def limits(found: tuple[RegionError, ...], *, velocity: bool) -> tuple[str, ...]:
    """Sentences on what the model cannot do here.

    Args:
        found: Errors by region.
        velocity: Whether velocity saturation was fitted.
    """
    said = []
    for one in found:
        where = f"{one.region} inversion, {'saturated' if one.saturated else 'out of saturation'}"
        if one.drain_conductance is not None and one.drain_conductance > MISLEADING:
            said.append(
                f"Output conductance in {where}, is off by {_percent(one.drain_conductance)} rms: gain and output "
                "resistance there need a simulation."
            )
        if one.transconductance is not None and one.transconductance > MISLEADING:
            said.append(f"Transconductance in {where}, is off by {_percent(one.transconductance)} rms.")
    if velocity:
        said.append("With velocity saturation the law holds in saturation; below it is a smooth continuation.")
    return tuple(said)


def _trusted_inversion(inversion: Array, error: Array) -> Span | None:
    """The run of half decades around the best one in which the rms error stays good."""
    place = np.floor(_HALF_DECADES * np.log10(inversion)).astype(np.intp)
    bins = {int(one): error[place == one] for one in np.unique(place)}
    good = {
        one: float(np.sqrt(np.mean(each**2))) <= TRUSTED for one, each in bins.items() if len(each) >= _LEAST_IN_BIN
    }
    if not any(good.values()):
        return None
    runs: list[list[int]] = []
    for one in sorted(good):
        if good[one]:
            if runs and one - runs[-1][-1] == 1:
                runs[-1].append(one)
            else:
                runs.append([one])
    longest = max(runs, key=lambda run: (len(run), -abs(run[0])))
    inside = np.isin(place, longest)
    return Span(float(inversion[inside].min()), float(inversion[inside].max()))


def _pairs(rows: Rows, along: Array, held: tuple[Array, ...], step: float) -> Iterator[tuple[int, int]]:
    """Rows of one curve that lie a step apart along one voltage."""
    for group in groups((*held, rows.width, rows.length, rows.temperature)):
        curve: Index = group[np.argsort(along[group], kind="stable")]
        for place, low in enumerate(curve):
            later = curve[place + 1 :]
            far = later[along[later] - along[low] >= step]
            if len(far):
                yield int(low), int(far[0])


def _quotients(
    rows: Rows, fitted: Array, along: Array, pairs: list[tuple[int, int]], noise: float
) -> list[tuple[int, int, float]]:
    """ln of the fitted over the measured difference quotient of each pair whose step stands above the noise."""
    found = []
    for low, high in pairs:
        measured = rows.current[high] - rows.current[low]
        drawn = fitted[high] - fitted[low]
        clear = abs(float(np.log(rows.current[high] / rows.current[low]))) > _ABOVE_NOISE * noise
        if along[high] > along[low] and clear and measured > 0.0 and drawn > 0.0:
            found.append((low, high, float(np.log(drawn / measured))))
    return found


def _within(quotients: list[tuple[int, int, float]], inside: Mask) -> Array:
    """The quotients of which both rows lie inside."""
    return np.array([error for low, high, error in quotients if inside[low] and inside[high]])


def _rms(error: Array) -> float | None:
    return float(np.sqrt(np.mean(error**2))) if len(error) else None


def _span(values: Array) -> Span | None:
    known = values[np.isfinite(values)]
    return Span(float(known.min()), float(known.max())) if len(known) else None


def _percent(log_error: float) -> str:
    return f"{100.0 * np.expm1(log_error):.0f} %"
