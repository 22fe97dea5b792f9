"""Windows: along the axis of one variable, where every target that it can meet holds, and what sets each end."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.solver import roots
from worksheet.solver.results import Bound, Region, Window
from worksheet.solver.subject import scalar
from worksheet.solver.trials import PROCESS, Cleared, Index, Mask, Trials, holds, tolerances
from worksheet.solver.variables import Variable

Line = Callable[[Array], Mapping[str, Array]]
"""Gives all moves (the variable and what goes with it) for values of the variable."""

_A_DECADE = 12
_LEAST, _MOST = 40, 120
_GROWTHS = 4
_CLOSER = 6
_NEIGHBOURS = (((1, 0), slice(0, -1)), ((0, 1), slice(1, None)))
_JUMP = 1e-7
"""More slack than this at the last value that meets: the metric jumps or stops existing there."""


@dataclass(frozen=True, eq=False, slots=True)
class Axis:
    """One variable's axis.

    Attributes:
        variable: The variable.
        line: The moves that go with its values.
        ends: How far it can go. [unit of the variable]
        keep: For the bias current, what is kept; "" else.
    """

    variable: Variable
    line: Line
    ends: tuple[float, float]
    keep: str = ""

    def places(self) -> Array:
        """Values to look at: even in the logarithm, the present one among them."""
        low, high = self.ends
        count = int(np.clip(_A_DECADE * np.log10(high / low), _LEAST, _MOST))
        xs = np.geomspace(low, high, count)
        if low < self.variable.present < high:
            xs = np.unique(np.append(xs, self.variable.present))
        return xs


@dataclass(frozen=True, eq=False, slots=True)
class Crossing:
    """A place where one constraint changes between met and not met."""

    constraint: int
    value: float
    point: int
    met_above: bool
    edge: bool
    valid: bool


def windows(trials: Trials, axes: Sequence[Axis]) -> list[Window | None]:
    """The windows of several variables, each with the others held, looked for in one batch.

    Args:
        trials: The sheet's constraints.
        axes: The variables. Where there are several, none of them may follow a formula.
    Returns: a Window each, None where no target bounds the variable
    """
    line = _Lines(trials, axes)
    places, cleared = _scanned(trials, line, [axis.places() for axis in axes])
    turning = [_turning(xs, found.slack) for xs, found in zip(places, cleared, strict=True)]
    if any(len(xs) for xs in turning):
        more, closer = _scanned(trials, line, turning)
        places, cleared = zip(*map(_merged, places, cleared, more, closer), strict=True)
    met = [holds(trials.constraints, found.slack) for found in cleared]
    crossings = _crossings(trials, line, places, met, cleared)
    return [_window(trials, axis, mask, found) for axis, mask, found in zip(axes, met, crossings, strict=True)]


def _scanned(trials: Trials, line: _Lines, places: Sequence[Array]) -> tuple[Sequence[Array], Sequence[Cleared]]:
    """All constraints at places of each axis, in one batch."""
    owner = np.repeat(np.arange(len(places)), [len(xs) for xs in places])
    cleared = trials.clear(line(owner, np.concatenate(places)))
    return places, [Cleared(cleared.slack[:, owner == k], cleared.worst[:, owner == k]) for k in range(len(places))]


def _turning(xs: Array, slack: Array) -> Array:
    """Places between those of a scan where a constraint turns round so near its limit that it may cross it twice."""
    change = np.diff(slack, axis=1)
    before, after = (np.pad(change, ((0, 0), pad), mode="edge")[:, cut] for pad, cut in _NEIGHBOURS)
    turns = (before * change < 0) | (change * after < 0)
    reach = np.maximum(np.maximum(np.abs(before), np.abs(after)), np.abs(change))
    same = (slack[:, 1:] >= 0) == (slack[:, :-1] >= 0)
    near = np.minimum(np.abs(slack[:, 1:]), np.abs(slack[:, :-1])) <= reach
    at = np.flatnonzero((turns & same & near).any(axis=0))
    shares = np.arange(1, _CLOSER + 1) / (_CLOSER + 1)
    return np.asarray((xs[at, None] * (xs[at + 1] / xs[at])[:, None] ** shares).reshape(-1))


def _merged(xs: Array, cleared: Cleared, more: Array, closer: Cleared) -> tuple[Array, Cleared]:
    """The places of two scans in rising order, and what was found there."""
    every = np.concatenate([xs, more])
    order = np.argsort(every, kind="stable")
    slack = np.hstack([cleared.slack, closer.slack])[:, order]
    worst = np.hstack([cleared.worst, closer.worst])[:, order]
    return every[order], Cleared(slack, worst)


class _Lines:
    """Moves for places on several axes: what one axis moves stands still on the others."""

    def __init__(self, trials: Trials, axes: Sequence[Axis]) -> None:
        self._axes = axes
        names = dict.fromkeys(name for axis in axes for name in axis.line(np.array([axis.ends[0]])))
        self._still = {name: scalar(trials.subject.value(name)) for name in names} if len(axes) > 1 else {}

    def __call__(self, owner: Index, values: Array) -> dict[str, Array]:
        moves = {name: np.full(len(values), present) for name, present in self._still.items()}
        for k, axis in enumerate(self._axes):
            mine = owner == k
            for name, moved in axis.line(values[mine]).items():
                moves.setdefault(name, np.zeros(len(values)))[mine] = moved
        return moves


def _window(trials: Trials, axis: Axis, met: Mask, crossings: list[Crossing]) -> Window | None:
    variable = axis.variable
    bounds = tuple(_bound(trials, axis, c) for c in crossings if trials.constraints[c.constraint].target is not None)
    if not bounds:
        return None
    reachable: Mask = np.asarray(met.any(axis=1))
    never = [k for k in range(trials.target_count) if not reachable[k]]
    helped = [k for k in range(len(trials.constraints)) if reachable[k]]
    regions = _regions(trials, axis, met, helped, crossings) if reachable[trials.target_count :].all() else []
    nearest = min(regions, key=lambda r: _distance(r, variable.present), default=None)
    return Window(
        name=variable.name,
        unit=variable.key.dimension.unit if variable.key.dimension is not None else "",
        present=variable.present,
        region=nearest,
        also=tuple(r for r in regions if r is not nearest),
        bounds=bounds,
        cannot_help=tuple(dict.fromkeys(trials.constraints[k].name for k in never)),
        keep=axis.keep,
    )


@dataclass(frozen=True, eq=False, slots=True)
class _Brackets:
    """Changes of constraints between neighbouring places.

    Attributes:
        rows: The constraint of each.
        owner: The axis of each.
        places: Logarithms of the neighbour below, the low end, the high end and the neighbour above, shape (4,
            brackets); NaN where there is no neighbour.
        gaps: Slack there, tolerance included.
        points: Points that were the worst at the ends.
    """

    rows: Index
    owner: Index
    places: Array
    gaps: Array
    points: frozenset[int]


def _brackets(trials: Trials, places: Sequence[Array], met: Sequence[Mask], cleared: Sequence[Cleared]) -> _Brackets:
    changes = [np.nonzero(mask[:, 1:] != mask[:, :-1]) for mask in met]
    rows = np.concatenate([rows for rows, _ in changes])
    xs, gaps, points = [], [], set[int]()
    for values, found, (which, at) in zip(places, cleared, changes, strict=True):
        padded = np.concatenate([[np.nan], np.log(values), [np.nan]])
        slack = np.pad(found.slack, ((0, 0), (1, 1)), constant_values=np.nan)
        xs.append(np.array([padded[at + k] for k in range(4)]).reshape(4, -1))
        gaps.append(np.array([slack[which, at + k] for k in range(4)]).reshape(4, -1))
        points |= set(found.worst[which, at].tolist()) | set(found.worst[which, at + 1].tolist())
    owner = np.repeat(np.arange(len(met)), [len(rows) for rows, _ in changes])
    allowed = tolerances(trials.constraints)[rows]
    return _Brackets(rows, owner, np.hstack(xs), np.hstack(gaps) + allowed, frozenset(points))


def _crossings(
    trials: Trials, line: _Lines, places: Sequence[Array], met: Sequence[Mask], cleared: Sequence[Cleared]
) -> list[list[Crossing]]:
    """Every change of every constraint along every axis, refined all at once at the points that bind there."""
    found: list[list[Crossing]] = [[] for _ in met]
    brackets = _brackets(trials, places, met, cleared)
    if not len(brackets.rows):
        return found
    rising: Mask = np.asarray(brackets.gaps[2] >= 0)
    every = _Looking(trials, line, brackets)
    at, gaps, points = brackets.places, brackets.gaps, set(brackets.points)
    for growth in range(_GROWTHS + 1):
        near = _Looking(trials.at_points(points), line, brackets) if growth < _GROWTHS else every
        at, gaps = roots.refined(near.gap, at, gaps)
        chosen = np.where(rising, at[2], at[1])
        gap, worst = every.look(np.arange(len(chosen)), chosen)
        missed: Mask = np.asarray(gap < 0)
        if not missed.any():
            break
        points |= set(worst[missed].tolist())
        at, gaps = _widened(brackets, at, gaps, missed, gap)
    edge, valid = np.abs(gap) > _JUMP, _valid(trials, line(brackets.owner, np.exp(chosen)))
    for k, axis in enumerate(brackets.owner):
        value = float(np.exp(chosen[k]))
        item = Crossing(int(brackets.rows[k]), value, int(worst[k]), bool(rising[k]), bool(edge[k]), bool(valid[k]))
        found[int(axis)].append(item)
    return found


def _valid(trials: Trials, moves: Mapping[str, Array]) -> Mask:
    """Where every device is saturated and no voltage passes its rating."""
    slack = trials.clear(moves, range(trials.target_count, len(trials.constraints))).slack
    return np.asarray((slack >= 0).all(axis=0), dtype=np.bool_)


def _widened(brackets: _Brackets, at: Array, gaps: Array, missed: Mask, gap: Array) -> tuple[Array, Array]:
    """Brackets of which some turned out to be missed at the end that was thought to be met: these reach back to it."""
    at, gaps = at.copy(), gaps.copy()
    for k in np.flatnonzero(missed):
        met, unmet, beyond, behind = (2, 1, 3, 0) if brackets.gaps[2, k] >= 0 else (1, 2, 0, 3)
        at[unmet, k], gaps[unmet, k] = at[met, k], gap[k]
        at[[met, beyond], k], gaps[[met, beyond], k] = (
            brackets.places[[met, beyond], k],
            brackets.gaps[[met, beyond], k],
        )
        at[behind, k] = gaps[behind, k] = np.nan
    return at, gaps


class _Looking:
    """Slack of each bracket's constraint at places of its axis."""

    def __init__(self, trials: Trials, line: _Lines, brackets: _Brackets) -> None:
        self._trials, self._line, self._brackets = trials, line, brackets
        self._allowed = tolerances(trials.constraints)[brackets.rows]

    def look(self, which: Index, x: Array) -> tuple[Array, Index]:
        """Slack with its tolerance and worst point, for brackets by number at places."""
        rows = self._brackets.rows[which]
        needed = np.unique(rows)
        cleared = self._trials.clear(self._line(self._brackets.owner[which], np.exp(x)), needed.tolist())
        row, at = np.searchsorted(needed, rows), np.arange(len(x))
        return cleared.slack[row, at] + self._allowed[which], np.asarray(cleared.worst[row, at])

    def gap(self, which: Index, x: Array) -> Array:
        """As look, the slack alone."""
        return self.look(which, x)[0]


def _bound(trials: Trials, axis: Axis, crossing: Crossing) -> Bound:
    constraint = trials.constraints[crossing.constraint]
    moved = axis.line(np.array([crossing.value]))
    moves = {name: float(v[0]) for name, v in moved.items() if name != axis.variable.name}
    return Bound(
        target=constraint.name,
        side="low" if crossing.met_above else "high",
        limit="min" if constraint.side == "low" else "max",
        value=crossing.value,
        at=trials.condition(crossing.point),
        point=crossing.point % len(trials.subject.conditions),
        edge=crossing.edge,
        moves_with=moves,
        valid=crossing.valid,
    )


def _regions(trials: Trials, axis: Axis, met: Mask, helped: list[int], crossings: list[Crossing]) -> list[Region]:
    """Intervals where all of `helped` hold, built from the refined crossings."""
    variable, ends = axis.variable, axis.ends
    changes = sorted((c for c in crossings if c.constraint in helped), key=lambda c: c.value)
    unmet = {k for k in helped if not met[k, 0]}
    process = PROCESS if variable.bounded or ends != (variable.low, variable.high) else None
    regions: list[Region] = []
    start: tuple[float | None, str | None] | None = None if unmet else (ends[0] if process else None, process)
    for change in changes:
        name = trials.constraints[change.constraint].name
        if change.met_above:
            unmet.discard(change.constraint)
            if not unmet:
                start = (change.value, name)
        else:
            if not unmet and start is not None:
                regions.append(Region(start[0], start[1], change.value, name))
                start = None
            unmet.add(change.constraint)
    if start is not None and not unmet:
        regions.append(Region(start[0], start[1], ends[1] if process else None, process))
    return regions


def _distance(region: Region, present: float) -> float:
    """How far the present value lies outside a region, in decades. [-]"""
    if region.low is not None and present < region.low:
        return float(np.log10(region.low / present)) if present > 0 else np.inf
    if region.high is not None and present > region.high:
        return float(np.log10(present / region.high))
    return 0.0
