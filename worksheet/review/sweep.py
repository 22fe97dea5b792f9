"""One quantity of a sheet swept over a grid: metrics at the nominal condition and over all conditions and ranges.

Everything else is held, formulas follow. Sizes and assumptions are swept as if the sheet stated the value: a level that
is not assumed is taken anew. Temperature and supply are swept as conditions: the levels of the sheet's own nominal
condition stay, and all other conditions run over the rest of theirs.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from worksheet.device.arrays import Array
from worksheet.engine.measured import Measured
from worksheet.engine.solution import NumericSolution
from worksheet.engine.validity import shortfalls
from worksheet.model import metrics
from worksheet.model.metrics import Reason
from worksheet.model.sheet import Target
from worksheet.model.text import clean, nearest
from worksheet.project.case import Case
from worksheet.review import judge
from worksheet.review.results import MET
from worksheet.review.swept import Axis
from worksheet.solver import goals, ranges

MOST_POINTS = 2001
DEFAULT_POINTS = 41
_AT_ONCE = 32_768
"""Points times ends of ranges times conditions that are solved in one evaluation."""

_OF_CONDITION = ("temperature", "supply")
_DECADE = 10.0

Mask = NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class Curve:
    """One metric or figure along a sweep; arrays of shape (points,), NaN where there is no number. [unit]

    Attributes:
        name: Of the metric or of the figure.
        unit: SI unit.
        target: The target on it, None where there is none.
        nominal: At the nominal condition and the stated values.
        low, high: Least and greatest over the valid conditions and ends of ranges.
        worst: Of these the one nearer to missing the target, or beyond it; NaN without a target.
        met: Where the target's verdict is met; None without a target.
        reasons: Why there is no nominal number, by point; "" where there is one.
    """

    name: str
    unit: str
    target: Target | None
    nominal: Array
    low: Array
    high: Array
    worst: Array
    met: Mask | None
    reasons: tuple[str, ...]


@dataclass(frozen=True, eq=False)
class Sweep:
    """Curves along one axis.

    Attributes:
        axis: What is swept.
        values: Where, shape (points,). [unit of the axis]
        logarithmic: Whether the points keep their ratio.
        curves: One a metric.
        invalid: Points of conditions and ranges that are not valid, of `every`; shape (points,).
        every: Conditions times ends of ranges.
    """

    axis: Axis
    values: Array
    logarithmic: bool
    curves: tuple[Curve, ...]
    invalid: NDArray[np.intp]
    every: int


def grid(
    axis: Axis, low: float | None, high: float | None, points: int, *, logarithmic: bool, decades: float = 1.0
) -> Array:
    """Where to look. [unit of the axis]

    Args:
        axis: What is swept.
        low, high: Ends; where left out, a decade either way of the present value within the axis's limits (a tenth for
            temperature and supply).
        points: How many.
        logarithmic: Equal ratios instead of equal steps.
        decades: What either way of the present value is taken instead of one decade.
    Raises: ValueError with what is wrong.
    """
    if not 2 <= points <= MOST_POINTS:
        raise ValueError(f"Found {points} points, expected 2 to {MOST_POINTS}.")
    around = (1.1 if axis.move in _OF_CONDITION else _DECADE) ** decades
    if (low is None or high is None) and axis.present == 0:
        raise ValueError(f"{axis.name} stands at 0, so both ends are wanted.")
    first = _within(axis, axis.present / around) if low is None else low
    last = _within(axis, axis.present * around) if high is None else high
    if first == last:
        raise ValueError("Found two equal ends, expected a span.")
    if not logarithmic:
        return np.linspace(first, last, points)
    if first <= 0 or last <= 0:
        raise ValueError("Found an end at or below 0, expected both above it for a logarithmic sweep.")
    return np.geomspace(first, last, points)


def _within(axis: Axis, value: float) -> float:
    ends = [end for end in (axis.key.low, axis.low) if end is not None]
    value = max([value, *ends])
    return min([value, *(end for end in (axis.key.high, axis.high) if end is not None)])


def wanted(case: Case, names: Sequence[str]) -> dict[str, Target | None]:
    """Metrics and figures by name with their targets; every target of the sheet where none is named.

    Raises: LookupError with what is wrong.
    """
    targets = case.sheet.targets
    if not names:
        return dict(targets) or {"supply_current": None}
    found: dict[str, Target | None] = {}
    for name in names:
        reason = case.stage.absent_metric(name) if metrics.find(name) is not None else None
        if reason:
            raise LookupError(f"Found the metric {clean(name)}: {reason}.")
        if name not in targets and metrics.find(name) is None:
            near = nearest(name, [*targets, *metrics.keys()])
            hint = f"did you mean {near}?" if near else "expected a metric or a target of this sheet."
            raise LookupError(f"Found the unknown metric {clean(name)}; {hint}")
        found[name] = targets.get(name)
    return found


def sweep(case: Case, axis: Axis, values: Array, asked: Mapping[str, Target | None], *, logarithmic: bool) -> Sweep:
    """Sweep a sheet.

    Args:
        case: The sheet, with a number for everything it leaves open; these are held.
        axis: What is swept.
        values: Where. [unit of the axis]
        asked: Metrics and figures, see wanted.
        logarithmic: Whether the values keep their ratio.
    """
    ends = {name: v for name, v in ranges.worst_points(case).items() if name != axis.move}
    every = max((len(v) for v in ends.values()), default=1) * len(case.conditions)
    step = max(1, _AT_ONCE // every)
    parts = [
        _Part(case.moved(ends), case, axis, values[rows][start : start + step])
        for rows in _alike(axis, values)
        for start in range(0, len(rows), step)
    ]
    valid = np.concatenate([part.valid for part in parts])
    curves = []
    for name, target in asked.items():
        found = [part.measured(name, target) for part in parts]
        numbers = np.concatenate([values for values, _ in found])
        reasons = np.concatenate([why for _, why in found])
        curves.append(_curve(name, target, numbers, reasons, valid))
    return Sweep(axis, values, logarithmic, tuple(curves), np.count_nonzero(~valid, axis=1), every)


def _alike(axis: Axis, values: Array) -> list[NDArray[np.intp]]:
    """Runs of points with one circuit: a drive resistance of 0 is no node."""
    if axis.move != "drive_resistance":
        return [np.arange(len(values))]
    return list(np.split(np.arange(len(values)), np.flatnonzero(np.diff(values == 0)) + 1))


class _Part:
    """Some points of a sweep, solved."""

    def __init__(self, ranged: Case, stated: Case, axis: Axis, values: Array) -> None:
        self._case = ranged.moved({axis.move: values[:, None, None]})
        held = axis.move in _OF_CONDITION
        with np.errstate(all="ignore"):
            at_nominal = (lambda: NumericSolution(ranged.inputs).levels) if held else None
            self._solution = NumericSolution(self._case.inputs, at_nominal)
        ends = max((len(v) for v in ranged.moves.values() if isinstance(v, np.ndarray)), default=1)
        self._shape = (len(values), ends, len(stated.conditions))

    @property
    def valid(self) -> Mask:
        """Shape (points, ends times conditions)."""
        valid = np.ones(self._shape, dtype=np.bool_)
        with np.errstate(all="ignore"):
            for shortfall in shortfalls(self._solution):
                valid &= ~np.broadcast_to(shortfall.broken, self._shape)
        return valid.reshape(self._shape[0], -1)

    def measured(self, name: str, target: Target | None) -> tuple[Array, NDArray[np.int8]]:
        """Values and reasons, shape (points, ends times conditions)."""
        with np.errstate(all="ignore"):
            found = (
                self._solution.measure(name) if target is None else goals.measure(self._case, target, self._solution)
            )
        reasons = np.zeros((), dtype=np.int8) if found.reasons is None else found.reasons
        count = self._shape[0]
        return (
            np.broadcast_to(found.values, self._shape).reshape(count, -1),
            np.broadcast_to(reasons, self._shape).reshape(count, -1),
        )


def _curve(name: str, target: Target | None, values: Array, reasons: NDArray[np.int8], valid: Mask) -> Curve:
    metric = metrics.find(name)
    unit = (
        target.unit
        if target is not None and target.formula is not None
        else ""
        if metric is None
        else metric.dimension.unit
    )
    if target is not None and target.at == "nominal":
        values, reasons, valid = values[:, :1], reasons[:, :1], valid[:, :1]
    held = np.where(valid & np.isfinite(values), values, np.nan)
    none = np.isnan(held).all(axis=1)
    low = np.where(none, np.nan, np.min(np.where(np.isnan(held), np.inf, held), axis=1))
    high = np.where(none, np.nan, np.max(np.where(np.isnan(held), -np.inf, held), axis=1))
    worst, met = np.full(len(values), np.nan), None
    if target is not None:
        met = np.zeros(len(values), dtype=np.bool_)
        for k in range(len(values)):
            judgement = judge.judge(target, Measured(values[k], reasons[k]), valid[k])
            met[k] = judgement.verdict == MET
            worst[k] = np.nan if judgement.worst is None else values[k][judgement.worst]
    why = tuple(
        "" if np.isfinite(number) else Reason(int(reason or Reason.NOT_A_NUMBER)).text
        for number, reason in zip(values[:, 0].tolist(), reasons[:, 0].tolist(), strict=True)
    )
    return Curve(name, unit, target, values[:, 0], low, high, worst, met, why)
