"""What an extraction looks like: measured and fitted points of its curves, residuals, efficiency over inversion.

Everything is as for an n-channel device, bulk-referred; points that do not exist are left out.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.extract.data import Extraction, Mask

MEASURED, FITTED, LEFT_OUT = "measured", "fitted", "left out"
"""What a set of points is."""

_TOLERANCE = 1e-6


@dataclass(frozen=True, eq=False, slots=True)
class Points:
    """Points of one kind, each array of shape (points,)."""

    kind: str
    x: Array
    y: Array


@dataclass(frozen=True, slots=True)
class Family:
    """Curves that share a length [m, NaN where unknown], a source voltage [V] and a temperature [K]."""

    length: float
    source: float
    temperature: float


@dataclass(frozen=True, slots=True)
class Axis:
    """What runs along an axis, its SI unit, and whether over the logarithm."""

    title: str
    unit: str
    logarithmic: bool = False


@dataclass(frozen=True, slots=True)
class View:
    """One way to look at an extraction.

    Attributes:
        key, title: Its name.
        x, y: The axes.
        points: The points of a family.
    """

    key: str
    title: str
    x: Axis
    y: Axis
    points: Callable[[Extraction, Family], tuple[Points, ...]]


def families(result: Extraction) -> tuple[Family, ...]:
    """Families in the order of length, temperature and source voltage."""
    rows = result.rows
    found = {
        (float(np.round(l, 12)), float(np.round(t, 3)), float(np.round(s, 6)))
        for l, s, t in zip(rows.length, rows.source, rows.temperature, strict=True)  # noqa: E741 - L is the length
    }
    return tuple(Family(length, source, temperature) for length, temperature, source in sorted(found, key=_nan_last))


def _nan_last(key: tuple[float, float, float]) -> tuple[float, ...]:
    return tuple(np.inf if np.isnan(one) else one for one in key)


def member(result: Extraction, family: Family) -> Mask:
    """The rows of a family."""
    rows = result.rows
    same_length = np.isclose(rows.length, family.length, rtol=1e-6, equal_nan=True)
    near = (np.abs(rows.source - family.source) < _TOLERANCE) & (np.abs(rows.temperature - family.temperature) < 1e-2)
    return np.asarray(same_length & near)


def _over(result: Extraction, which: Mask, x: Array) -> tuple[Points, ...]:
    """Measured, fitted and left-out currents over something."""
    current = result.rows.current
    seen = np.abs(current[which & result.used])
    low, high = (0.3 * seen.min(), 2.0 * seen.max()) if len(seen) else (0.0, 0.0)
    near = (result.fitted >= low) & (result.fitted <= high)  # a fit drawn far beyond the table would only stretch it
    return (
        _points(LEFT_OUT, x, current, which & ~result.used),
        _points(FITTED, x, result.fitted, which & near),
        _points(MEASURED, x, current, which & result.used),
    )


def _points(kind: str, x: Array, y: Array, which: Mask) -> Points:
    there = which & np.isfinite(x) & np.isfinite(y)
    return Points(kind, x[there], y[there])


def _transfer(result: Extraction, family: Family) -> tuple[Points, ...]:
    """Over gate voltage, at the lowest and the highest drain voltage that has a curve."""
    which = member(result, family)
    return _over(result, which & _ends(result.rows.drain, result.rows.gate, which), result.rows.gate)


def _output(result: Extraction, family: Family) -> tuple[Points, ...]:
    """Over drain-source voltage, at up to four gate voltages."""
    which = member(result, family)
    rows = result.rows
    gates = [g for g in np.unique(np.round(rows.gate[which], 6)) if _steps(rows.drain[which & _at(rows.gate, g)]) > 2]
    chosen = [gates[k] for k in sorted({round(x) for x in np.linspace(0, len(gates) - 1, 4)})] if gates else []
    shown = np.zeros(len(rows), dtype=bool)
    for gate in chosen:
        shown |= which & _at(rows.gate, gate)
    return _over(result, shown, rows.across)


def _ends(held: Array, swept: Array, which: Mask) -> Mask:
    values = [v for v in np.unique(np.round(held[which], 6)) if _steps(swept[which & _at(held, v)]) > 2]
    shown = np.zeros(len(held), dtype=bool)
    for value in {values[0], values[-1]} if values else ():
        shown |= _at(held, value)
    return shown


def _at(values: Array, value: float) -> Mask:
    return np.asarray(np.abs(values - value) < _TOLERANCE)


def _steps(values: Array) -> int:
    return len(np.unique(np.round(values, 6)))


def _residuals(result: Extraction, family: Family) -> tuple[Points, ...]:
    """ln(I/I_fit) in per cent over inversion, of the rows that were used."""
    which = member(result, family) & result.used
    return (_points(MEASURED, result.inversion, 100.0 * result.residuals, which & (result.inversion > 0)),)


def _efficiency(result: Extraction, family: Family) -> tuple[Points, ...]:
    """g_m/I from differences along curves at the highest drain voltage, over inversion: of the table and of the fit."""
    rows = result.rows
    which = member(result, family) & result.used & (rows.current > 0)
    if not which.any():
        return ()
    drains = np.unique(np.round(rows.drain[which], 6))
    top = max((v for v in drains if _steps(rows.gate[which & _at(rows.drain, v)]) > 2), default=None)
    if top is None:
        return ()
    which &= _at(rows.drain, float(top))
    order = np.flatnonzero(which)[np.argsort(rows.gate[which], kind="stable")]
    gate = rows.gate[order]
    apart = np.concatenate([[True], np.diff(gate) > _TOLERANCE])
    order, gate = order[apart], gate[apart]
    middle = np.sqrt(result.inversion[order][1:] * result.inversion[order][:-1])
    found = []
    for kind, current in ((FITTED, result.fitted), (MEASURED, rows.current)):
        slope = np.diff(np.log(current[order])) / np.diff(gate)
        found.append(_points(kind, middle, slope, np.isfinite(middle) & (middle > 0)))
    return tuple(found)


_GATE, _ACROSS = Axis("V_G", "V"), Axis("V_DS", "V")
_CURRENT, _INVERSION = Axis("I_D", "A"), Axis("IC", "", logarithmic=True)
VIEWS = (
    View("transfer_log", "Current over gate voltage", _GATE, Axis("I_D", "A", logarithmic=True), _transfer),
    View("transfer", "Current over gate voltage", _GATE, _CURRENT, _transfer),
    View("output", "Current over drain voltage", _ACROSS, _CURRENT, _output),
    View("residuals", "Residuals over inversion", _INVERSION, Axis("ln(I/I_fit) in per cent", ""), _residuals),
    View("efficiency", "Transconductance efficiency over inversion", _INVERSION, Axis("g_m/I", "1/V"), _efficiency),
)
"""Every way to look at an extraction."""
