"""Rows that say nothing about the channel: noise floor, leakage, breakdown, recognised by the shape of their curve.

No model of the device is needed here. A subthreshold current falls by one decade in 60 mV or a little more as the gate
falls; where a curve stops falling while it still should, what remains is the instrument's floor or a leakage. Along the
drain a saturated current rises ever more slowly; where it turns up again the junction or the channel breaks down. What
only a fit can tell (series resistance, a range that one set of parameters does not follow) is recognised in span.
"""

from __future__ import annotations

from collections.abc import Collection, Iterator
from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.extract.data import Index, LeftOut, Mask, Rows

NOISE_FLOOR = "noise floor"
LEAKAGE = "leakage"
BREAKDOWN = "breakdown"
SERIES_RESISTANCE = "series resistance"
FITTED_RANGE = "outside the fitted range"

REASONS = {
    NOISE_FLOOR: "a current at or below 0, or one that no longer falls with the gate, the same at every drain voltage",
    LEAKAGE: "a current that no longer falls with the gate and grows with the drain voltage or towards lower gates",
    BREAKDOWN: "a current that turns up again at high drain voltage",
    SERIES_RESISTANCE: "strong inversion where the current stays behind the law: series resistance or falling mobility",
    FITTED_RANGE: "an inversion, source voltage or length to which one set of parameters does not reach",
}
"""Why a row can be left out, and what it is recognised by."""

DEFECTS = (NOISE_FLOOR, LEAKAGE, BREAKDOWN, SERIES_RESISTANCE)
"""Reasons that are faults of a row and count against the share that may be left out."""

MOST_LEFT_OUT = 0.8
"""Share of the rows that may be left out for DEFECTS, unless stated otherwise."""

CONTAMINATION = 20.0
"""Rows whose current is less than this many times the floor below them are left out with it: 5 % of theirs is floor."""

_APART = 0.04
_LEAST_POINTS = 6
_FALLEN, _MOSTLY = 0.5, 0.7
_WEAK_SLOPE = 0.3
_UPTURN, _UPTURN_LEAST, _SURE = 3.0, 0.3, 4.0
_SECOND_DIFFERENCE = 1.4826 / np.sqrt(6.0)


@dataclass(frozen=True, eq=False, slots=True)
class Screened:
    """Which rows are left out, and why.

    Attributes:
        reason: Position in REASONS plus 1 for a row that is left out, 0 for one that is kept, shape (rows,).
        capped: How many more were recognised than may be left out.
    """

    reason: Index
    capped: int = 0

    @property
    def kept(self) -> Mask:
        """The rows that remain."""
        return np.asarray(self.reason == 0)


def screen(rows: Rows, *, keep: Collection[str] = (), most: float = MOST_LEFT_OUT) -> Screened:
    """Recognise noise floor, leakage and breakdown by the shape of the curves.

    Args:
        rows: The points.
        keep: Reasons that are overruled.
        most: Share of the rows that may be left out.

    Returns: the reason of each row; where more than the share was recognised, the largest currents stay.
    """
    reason = np.zeros(len(rows), dtype=np.intp)
    if BREAKDOWN not in keep:
        for curve in _curves(rows, (rows.gate, rows.source), rows.drain):
            reason[curve[_breaking(rows.across[curve], rows.current[curve])]] = code(BREAKDOWN)
    floors = _floors(rows)
    for curve, bottom, level in floors:
        below = np.zeros(len(curve), dtype=bool)
        below[:bottom] = True
        below |= (rows.current[curve] < CONTAMINATION * level) & (np.arange(len(curve)) < bottom + len(curve) // 2)
        name = LEAKAGE if _is_leakage(rows, curve, bottom, level, floors) else NOISE_FLOOR
        if name not in keep:
            reason[curve[below]] = code(name)
    if NOISE_FLOOR not in keep:
        reason[(rows.current <= 0.0) & (rows.across > 0.0)] = code(NOISE_FLOOR)
    # The law has nothing to say on these, whatever was overruled.
    reason[(rows.across <= 0.0) | (rows.current <= 0.0) & (reason == 0)] = code(NOISE_FLOOR)
    return cap(rows, reason, most)


def cap(rows: Rows, reason: Index, most: float) -> Screened:
    """Take the largest currents back where more defects were recognised than may be left out.

    Args:
        rows: The points.
        reason: As of Screened.
        most: Share of the rows that may be left out for defects.
    """
    defect = np.isin(reason, [code(one) for one in DEFECTS])
    faulty = np.flatnonzero(defect & (rows.current > 0.0) & (rows.across > 0.0))
    excess = len(faulty) - int(most * len(rows))
    if excess <= 0:
        return Screened(reason)
    reason = reason.copy()
    reason[faulty[np.argsort(-rows.current[faulty], kind="stable")[:excess]]] = 0
    return Screened(reason, excess)


def code(name: str) -> int:
    """The number that stands for a reason in Screened.reason."""
    return list(REASONS).index(name) + 1


def counts(rows: Rows, screened: Screened) -> tuple[LeftOut, ...]:
    """What was left out, by reason, with the gate voltages and currents it lies at."""
    found = []
    for name, meaning in REASONS.items():
        which = screened.reason == code(name)
        if which.any():
            gate, current = rows.gate[which], rows.current[which]
            detail = (
                f"{meaning}; vg {gate.min():.3g} to {gate.max():.3g} V, id {current.min():.3g} to {current.max():.3g} A"
            )
            found.append(LeftOut(name, int(which.sum()), detail))
    return tuple(found)


def groups(keys: tuple[Array, ...]) -> Iterator[Index]:
    """Positions of the rows that agree in all keys, group by group; nanovolts and relative 1e-9 do not tell them apart.

    Args:
        keys: Columns of shape (rows,). [any]
    """
    if not len(keys[0]):
        return
    rounded = [_rounded(one) for one in keys]
    order = np.lexsort(rounded)
    changed = np.zeros(len(order) - 1, dtype=bool)
    for one in rounded:
        changed |= one[order][1:] != one[order][:-1]
    yield from np.split(order, np.flatnonzero(changed) + 1)


def _rounded(column: Array) -> Array:
    """A column in steps that no supply or ruler resolves, unknown ones all alike."""
    small = np.max(np.abs(column[np.isfinite(column)]), initial=0.0) < 1e-2
    return np.nan_to_num(np.round(column, 12 if small else 6), nan=-1.0)


def _curves(rows: Rows, held: tuple[Array, ...], along: Array) -> Iterator[Index]:
    """Curves of enough points along one voltage, everything else held, each in rising order."""
    for group in groups((*held, rows.width, rows.length, rows.temperature)):
        curve = group[np.argsort(along[group], kind="stable")]
        if len(curve) >= _LEAST_POINTS and np.ptp(along[curve]) > 0.0:
            yield curve


def _floors(rows: Rows) -> list[tuple[Index, int, float]]:
    """Curves along the gate that have a floor: positions in rising order, how many rows are floor, its level. [A]"""
    found = []
    for curve in _curves(rows, (rows.source, rows.drain), rows.gate):
        bottom = _bottom(rows.gate[curve], rows.current[curve], float(rows.thermal[curve[0]]))
        if bottom:
            level = float(np.median(np.abs(rows.current[curve[max(bottom - 3, 0) : bottom]])))
            found.append((curve, bottom, level))
    return found


def _bottom(gate: Array, current: Array, thermal: float) -> int:
    """How many rows from the lowest gate up are floor: 0 where the curve still falls at its low end.

    Followed from the top down, the slope of ln I rises to its weak-inversion value and stays; once it has fallen below
    half of the greatest value met so far, what follows is floor. A curve that never comes near weak inversion has none.
    """
    level = np.log(np.maximum(np.abs(current), 1e-30))
    greatest = 0.0
    top = len(gate) - 1
    while top > 0:
        low = min(int(np.searchsorted(gate, gate[top] - _APART, side="right")) - 1, top - 1)
        if low < 0:
            return _sunk(current, top)
        slope = (level[top] - level[low]) / max(gate[top] - gate[low], 1e-9)
        if current[low] <= 0.0:
            return top
        if greatest > _WEAK_SLOPE / thermal and slope < _FALLEN * greatest:
            line = level[top] - _FALLEN * greatest * (gate[top] - gate[:top])
            # One row that stands out is no floor: most of what lies below must have stopped falling.
            if top > 1 and np.mean(level[:top] > line) > _MOSTLY:
                return top
        greatest = max(greatest, min(slope, 1.0 / thermal))
        top -= 1
    return 0


def _sunk(current: Array, top: int) -> int:
    """Rows at or below 0 at the low end, where no slope can be taken any more."""
    return int(np.count_nonzero(current[: top + 1] <= 0.0))


def _is_leakage(rows: Rows, curve: Index, bottom: int, level: float, floors: list[tuple[Index, int, float]]) -> bool:
    """Whether a floor rises towards lower gates, or with the drain voltage at the same source voltage."""
    lowest = float(np.median(np.abs(rows.current[curve[: max(bottom // 3, 1)]])))
    if bottom >= 4 and lowest > 1.5 * level:
        return True
    source, across = rows.source[curve[0]], rows.across[curve[0]]
    others = [
        one for other, _, one in floors if rows.source[other[0]] == source and rows.across[other[0]] < 0.9 * across
    ]
    return bool(others) and level > 3.0 * min(others)


def _breaking(across: Array, current: Array) -> Mask:
    """Rows at the high end of a curve along the drain where the current turns up again."""
    none = np.zeros(len(across), dtype=bool)
    if len(across) < 2 * _LEAST_POINTS or (current[len(current) // 2 :] <= 0.0).any():
        return none
    level = np.log(np.maximum(current, 1e-30))
    third = len(across) // 3
    span = max(len(across) // 10, 2)
    apart = np.maximum(across[span:] - across[:-span], 1e-9)
    slope = (level[span:] - level[:-span]) / apart
    quiet = max(float(np.median(slope[third : 2 * third])), 0.0)
    noise = float(np.median(np.abs(np.diff(level, n=2)))) * _SECOND_DIFFERENCE * np.sqrt(2.0) / apart
    calm = np.flatnonzero(slope <= _UPTURN * quiet + _UPTURN_LEAST + _SURE * noise)
    first = int(calm[-1]) + 1 if len(calm) else len(slope)
    if first < max(third, 1) or first > len(slope) - 2:
        return none
    none[first + span // 2 :] = True
    return none
