"""Windows: along the axis of one variable, where every target that it can meet holds, and what sets each end."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.solver import roots
from worksheet.solver.results import Bound, Region, Window
from worksheet.solver.subject import scalar
from worksheet.solver.trials import PROCESS, Index, Mask, Trials, holds, tolerances
from worksheet.solver.variables import Variable

Line = Callable[[Array], Mapping[str, Array]]
"""Gives all moves (the variable and what goes with it) for values of the variable."""

_A_DECADE = 12
_LEAST, _MOST = 40, 120
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


def windows(trials: Trials, axes: Sequence[Axis]) -> list[Window | None]:
    """The windows of several variables, each with the others held, looked for in one batch.

    Args:
        trials: The sheet's constraints.
        axes: The variables. Where there are several, none of them may follow a formula.
    Returns: a Window each, None where no target bounds the variable
    """
    line = _Lines(trials, axes)
    places = [axis.places() for axis in axes]
    owner = np.repeat(np.arange(len(axes)), [len(xs) for xs in places])
    met = holds(trials.constraints, trials.clear(line(owner, np.concatenate(places))).slack)
    parts = [np.asarray(met[:, owner == k]) for k in range(len(axes))]
    crossings = _crossings(trials, line, places, parts)
    return [_window(trials, axis, mask, found) for axis, mask, found in zip(axes, parts, crossings, strict=True)]


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


def _crossings(trials: Trials, line: _Lines, places: Sequence[Array], met: Sequence[Mask]) -> list[list[Crossing]]:
    """Every change of every constraint along every axis, refined all at once."""
    changes = [np.nonzero(mask[:, 1:] != mask[:, :-1]) for mask in met]
    owner = np.repeat(np.arange(len(met)), [len(rows) for rows, _ in changes])
    found: list[list[Crossing]] = [[] for _ in met]
    if not len(owner):
        return found
    rows = np.concatenate([rows for rows, _ in changes])
    low = np.log(np.concatenate([xs[at] for xs, (_, at) in zip(places, changes, strict=True)]))
    high = np.log(np.concatenate([xs[at + 1] for xs, (_, at) in zip(places, changes, strict=True)]))
    rising: Mask = np.concatenate([mask[which, at + 1] for mask, (which, at) in zip(met, changes, strict=True)])
    needed = sorted(set(rows.tolist()))
    index = np.searchsorted(needed, rows)
    allowed = tolerances(trials.constraints)[rows]

    def look(x: Array) -> tuple[Array, Index]:
        cleared = trials.clear(line(owner, np.exp(x)), needed)
        at = np.arange(len(x))
        return cleared.slack[index, at] + allowed, np.asarray(cleared.worst[index, at])

    low, high, gap_low, gap_high = roots.refined(look, low, high, rising)
    chosen = np.where(rising, high, low)
    _, point = look(chosen)
    edge = np.abs(np.where(rising, gap_high, gap_low)) > _JUMP
    for k, axis in enumerate(owner):
        item = Crossing(int(rows[k]), float(np.exp(chosen[k])), int(point[k]), bool(rising[k]), bool(edge[k]))
        found[int(axis)].append(item)
    return found


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
