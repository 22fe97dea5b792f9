"""How far an input can move before a target breaks, all else held and formulas following (physics: section 6)."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.engine.measured import Measured
from worksheet.model.sheet import Condition, Target
from worksheet.project.case import Case
from worksheet.project.conditions import ConditionSet
from worksheet.project.evaluate import Evaluator
from worksheet.review.inputs import Input, inputs_of
from worksheet.solver import goals, roots
from worksheet.solver.trials import Index, Mask

_SPAN = 10.0
_STEPS = 24
_TILT = 1e-5
_FLAT = 1e-9


@dataclass(frozen=True, slots=True)
class Fragile:
    """How one input bears on one target.

    Attributes:
        target: The target's name.
        name, value, unit, trust, standard_error: The input, see Input.
        sensitivity: d ln(metric)/d ln(input), None where the metric has no number. [-]
        break_value: The nearest value at which the target is just missed, or just met again. [unit]
        room: abs(break_value - value)/abs(value), None without a break value. [-]
    """

    target: str
    name: str
    value: float
    unit: str
    trust: str
    standard_error: float | None
    sensitivity: float | None
    break_value: float | None
    room: float | None


@dataclass(frozen=True, slots=True)
class Side:
    """One limit of one target."""

    target: Target
    side: str
    limit: float


@dataclass(frozen=True)
class Fragility:
    """The ranking at the nominal condition and at each target's worst one, and the inputs that stand at 0."""

    nominal: tuple[Fragile, ...]
    worst: tuple[Fragile, ...]
    not_ranked: tuple[str, ...]


def fragility(evaluator: Evaluator, name: str, worst: dict[str, Condition]) -> Fragility:
    """Rank every input of a sheet against every target.

    Args:
        evaluator: The project.
        name: The sheet.
        worst: The worst condition of each target, by its name.
    Returns: Fragility, least room first
    """
    case = evaluator.case(name)
    inputs = inputs_of(case)
    nominal = case.conditions.only_nominal()
    targets = tuple(case.sheet.targets.values())
    at_worst: list[Fragile] = []
    for at in dict.fromkeys(worst.values()):
        mine = tuple(t for t in targets if worst.get(t.name) == at)
        conditions = ConditionSet(nominal.process, (*nominal.conditions, at)) if at != nominal.nominal else nominal
        at_worst += _ranked(evaluator.over(name, conditions), inputs, mine)
    return Fragility(
        nominal=tuple(sorted(_ranked(evaluator.over(name, nominal), inputs, targets), key=_order)),
        worst=tuple(sorted(at_worst, key=_order)),
        not_ranked=tuple(i.name for i in inputs if i.value == 0),
    )


def _order(row: Fragile) -> tuple[bool, float, float]:
    return row.room is None, row.room or 0.0, -abs(row.sensitivity or 0.0)


def _ranked(case: Case, inputs: Sequence[Input], targets: Sequence[Target]) -> list[Fragile]:
    """Rows of the inputs that move a target, at the case's last condition."""
    ranked = [_at(case, i) for i in inputs if i.value != 0]
    if not targets or not ranked:
        return []
    probe = _Probe(case, ranked)
    slopes = _sensitivities(probe, targets)
    sides = [
        Side(t, side, limit)
        for t in targets
        for side, limit in zip(goals.SIDES, goals.limits(t), strict=True)
        if limit is not None
    ]
    breaks = _breaks(probe, sides)
    rows = []
    for t, target in enumerate(targets):
        for k, item in enumerate(ranked):
            found = [breaks[s][k] for s, side in enumerate(sides) if side.target is target]
            near = min((b for b in found if b is not None), key=lambda b: abs(b - item.value), default=None)
            slope = float(slopes[t, k]) if np.isfinite(slopes[t, k]) else None
            if near is None and (slope is None or abs(slope) < _FLAT):
                continue
            room = None if near is None else abs(near - item.value) / abs(item.value)
            rows.append(
                Fragile(
                    target.name, item.name, item.value, item.unit, item.trust, item.standard_error, slope, near, room
                )
            )
    return rows


def _at(case: Case, item: Input) -> Input:
    """An input with the value that it has at the case's last condition."""
    at = case.conditions.conditions[-1]
    value = {"temperature": at.temperature, "supply": at.supply}.get(item.name, item.value)
    return Input(item.name, item.move, value, item.unit, item.trust, item.standard_error, item.low, item.high)


class _Probe:
    """Targets at the case's last condition for single inputs moved to single values."""

    def __init__(self, case: Case, inputs: Sequence[Input]) -> None:
        self.case, self.inputs = case, inputs
        self._values = np.array([i.value for i in inputs])

    def measure(self, which: Index, values: Array, targets: Sequence[Target]) -> tuple[list[Measured], Mask]:
        """Targets for trials that each move input `which` to `values`, and where such a device can exist."""
        moves: dict[str, Array] = {}
        for k, item in enumerate(self.inputs):
            column = np.full((len(values), 1), self._values[k])
            column[which == k, 0] = values[which == k]
            if (which == k).any():
                moves[item.move] = self._per_condition(item, column)
        moved = self.case.moved(moves)
        solution = moved.solution
        found = []
        for target in targets:
            measured = goals.measure(moved, target, solution)
            shape = (len(values), len(self.case.conditions))
            reasons = None if measured.reasons is None else np.broadcast_to(measured.reasons, shape)[:, -1]
            found.append(Measured(np.broadcast_to(measured.values, shape)[:, -1], reasons))
        exists = np.ones(len(values), dtype=bool)
        for p in moved.inputs.devices.values():
            coupled = np.broadcast_to(np.asarray(p.kappa + p.drain_coupling), (len(values), len(self.case.conditions)))
            exists &= coupled[:, -1] <= 1.0 + 1e-12
        return found, exists

    def _per_condition(self, item: Input, column: Array) -> Array:
        """Temperature and supply move at the last condition alone; the nominal one keeps its own."""
        count = len(self.case.conditions)
        if item.name not in ("temperature", "supply") or count == 1:
            return column
        first = self.case.conditions.conditions[0]
        own = first.temperature if item.name == "temperature" else first.supply
        return np.concatenate([np.full_like(column, own), column], axis=1)


def _sensitivities(probe: _Probe, targets: Sequence[Target]) -> Array:
    """d ln(metric)/d ln(input) by central differences, shape (targets, inputs)."""
    count = len(probe.inputs)
    which = np.tile(np.arange(count), 2)
    base = np.array([i.value for i in probe.inputs])
    found, _ = probe.measure(which, np.concatenate([base * np.exp(_TILT), base * np.exp(-_TILT)]), targets)
    slopes = []
    with np.errstate(all="ignore"):
        for measured in found:
            up, down = measured.values[:count], measured.values[count:]
            slopes.append(np.log(up / down) / (2.0 * _TILT))
    return np.array(slopes)


def _breaks(probe: _Probe, sides: Sequence[Side]) -> list[list[float | None]]:
    """For each side of a target and each input the nearest break value, None where there is none in the range."""
    grids = [_grid(item) for item in probe.inputs]
    which = np.repeat(np.arange(len(grids)), [len(g) for g in grids])
    values = np.concatenate(grids)
    slack, exists = _slacks(probe, which, values, sides)
    found: list[list[float | None]] = [[None] * len(grids) for _ in sides]
    brackets = [
        (s, k, near, far)
        for s in range(len(sides))
        for k, grid in enumerate(grids)
        for near, far in _changes(grid, slack[s, which == k], exists[which == k], probe.inputs[k].value)
    ]
    if not brackets:
        return found
    side_of, input_of = np.array([b[0] for b in brackets]), np.array([b[1] for b in brackets])
    ends = np.sort(np.array([[b[2], b[3]] for b in brackets]), axis=1)
    scale = np.array([probe.inputs[k].value for k in input_of])
    low, high = ends[:, 0] / np.abs(scale), ends[:, 1] / np.abs(scale)
    rows = np.arange(len(brackets))

    def look(x: Array) -> tuple[Array, Index]:
        gaps, _ = _slacks(probe, input_of, x * np.abs(scale), sides)
        return gaps[side_of, rows], np.zeros(len(x), dtype=np.intp)

    rising: Mask = np.asarray(look(high)[0] >= 0, dtype=np.bool_)
    low, high, _, _ = roots.refined(look, low, high, rising)
    edges = np.where(rising, high, low) * np.abs(scale)
    for k, (s, i, _, _) in enumerate(brackets):
        known, value = found[s][i], float(edges[k])
        if known is None or abs(value - probe.inputs[i].value) < abs(known - probe.inputs[i].value):
            found[s][i] = value
    return found


def _slacks(probe: _Probe, which: Index, values: Array, sides: Sequence[Side]) -> tuple[Array, Mask]:
    """Slack of each side with the verdict's tolerance added, shape (sides, trials), and where a device exists."""
    targets = list(dict.fromkeys(side.target.name for side in sides))
    by_name = {side.target.name: side.target for side in sides}
    found, exists = probe.measure(which, values, [by_name[n] for n in targets])
    measured = dict(zip(targets, found, strict=True))
    return np.array(
        [goals.slack(measured[s.target.name], s.limit, s.side) + (goals.TOLERANCE if s.limit else 0.0) for s in sides]
    ), exists


def _grid(item: Input) -> Array:
    """Values to look at, the present one among them, a tenth to ten times of it within its limits."""
    size = np.abs(item.value)
    low, high = size / _SPAN, size * _SPAN
    if item.value > 0:
        low = max(low, item.low or 0.0)
        high = min(high, item.high if item.high is not None else np.inf)
    if item.name.endswith((".kappa", ".drain_coupling")):
        high = min(high, 1.0)
    down = np.geomspace(size, max(low, 1e-300), _STEPS + 1)[::-1] if low < size else np.array([size])
    up = np.geomspace(size, high, _STEPS + 1)[1:] if high > size else np.array([])
    return np.asarray(np.sign(item.value) * np.concatenate([down, up]))


def _changes(grid: Array, slack: Array, exists: Mask, present: float) -> list[tuple[float, float]]:
    """The nearest change of met to either side of the present value, as brackets."""
    here = int(np.argmin(np.abs(grid - present)))
    brackets = []
    for direction in (1, -1):
        k = here
        while 0 <= k + direction < len(grid) and exists[k + direction]:
            if (slack[k] >= 0) != (slack[k + direction] >= 0):
                brackets.append((float(grid[k]), float(grid[k + direction])))
                break
            k += direction
    return brackets
