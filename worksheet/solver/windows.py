"""Windows: along the axis of one variable, where every target that it can meet holds, and what sets each end."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.solver import goals
from worksheet.solver.results import Bound, Region, Window
from worksheet.solver.trials import PROCESS, Mask, Trials, holds
from worksheet.solver.variables import Variable

Line = Callable[[Array], Mapping[str, Array]]
"""Gives all moves (the variable and what goes with it) for values of the variable."""

_A_DECADE = 12
_LEAST, _MOST = 40, 120
_ROUNDS = 60
_CLOSE = 1e-13


@dataclass(frozen=True, eq=False, slots=True)
class Crossing:
    """A place where one constraint changes between met and not met."""

    constraint: int
    value: float
    point: int
    met_above: bool
    edge: bool


def window(trials: Trials, variable: Variable, line: Line, ends: tuple[float, float], keep: str = "") -> Window | None:
    """The window of one variable with the others held.

    Args:
        trials: The sheet's constraints.
        variable: The variable.
        line: The moves that go with its values.
        ends: How far it can go, in its own unit.
        keep: For the bias current, what is kept.
    Returns: Window, None where no target bounds this variable
    """
    xs = _axis(variable, ends)
    met = holds(trials.constraints, trials.clear(line(xs)).slack)
    crossings = _crossings(trials, line, xs, met)
    bounds = tuple(
        _bound(trials, variable, line, c) for c in crossings if trials.constraints[c.constraint].target is not None
    )
    if not bounds:
        return None
    reachable: Mask = np.asarray(met.any(axis=1))
    helped = [k for k in range(len(trials.constraints)) if reachable[k]]
    never = [k for k in range(trials.target_count) if not reachable[k]]
    regions = _regions(trials, variable, xs, met, helped, crossings, ends)
    if not all(reachable[trials.target_count :]):
        regions = []
    nearest = min(regions, key=lambda r: _distance(r, variable.present), default=None)
    return Window(
        name=variable.name,
        unit=variable.key.dimension.unit if variable.key.dimension is not None else "",
        present=variable.present,
        region=nearest,
        also=tuple(r for r in regions if r is not nearest),
        bounds=bounds,
        cannot_help=tuple(dict.fromkeys(trials.constraints[k].name for k in never)),
        keep=keep,
    )


def _axis(variable: Variable, ends: tuple[float, float]) -> Array:
    """Values to look at: even in the logarithm, the present one among them."""
    low, high = ends
    count = int(np.clip(_A_DECADE * np.log10(high / low), _LEAST, _MOST))
    xs = np.geomspace(low, high, count)
    if low < variable.present < high:
        xs = np.unique(np.append(xs, variable.present))
    return xs


def _crossings(trials: Trials, line: Line, xs: Array, met: Mask) -> list[Crossing]:
    """Every change of every constraint along the axis, refined all at once by bisection in the logarithm."""
    rows, places = np.nonzero(met[:, 1:] != met[:, :-1])
    if not len(rows):
        return []
    low, high = np.log(xs[places]), np.log(xs[places + 1])
    met_high = met[rows, places + 1]
    needed = sorted(set(rows.tolist()))
    index = np.searchsorted(needed, rows)
    pick = [trials.constraints[k] for k in needed]

    def look(x: Array) -> tuple[Array, Mask, Array]:
        cleared = trials.clear(line(np.exp(x)), needed)
        at = np.arange(len(x))
        return cleared.slack[index, at], holds(pick, cleared.slack)[index, at], cleared.worst[index, at]

    ends = _refined(look, low, high, met_high)
    value = np.where(met_high, np.exp(ends[1]), np.exp(ends[0]))
    slack, _, point = look(np.log(value))
    edge = np.abs(np.where(met_high, look(ends[0])[0], look(ends[1])[0])) >= goals.FAR
    edge |= np.abs(slack) >= goals.FAR
    return [
        Crossing(int(rows[k]), float(value[k]), int(point[k]), bool(met_high[k]), bool(edge[k]))
        for k in range(len(rows))
    ]


def _refined(
    look: Callable[[Array], tuple[Array, Mask, Array]], low: Array, high: Array, met_high: Mask
) -> tuple[Array, Array]:
    """Both ends of every bracket drawn together: false position on the slack (Illinois), bisection where it stalls."""
    f_low, f_high = look(low)[0], look(high)[0]
    last = np.zeros(len(low))
    for k in range(_ROUNDS):
        if np.all(high - low <= _CLOSE * np.maximum(1.0, np.abs(low))):
            break
        with np.errstate(all="ignore"):
            middle = (low * f_high - high * f_low) / (f_high - f_low)
        plain = ~np.isfinite(middle) | (middle <= low) | (middle >= high) | (k % 4 == 3)
        plain |= (np.abs(f_low) >= goals.FAR) | (np.abs(f_high) >= goals.FAR)
        middle = np.where(plain, 0.5 * (low + high), middle)
        slack, met, _ = look(middle)
        above = met == met_high
        f_low = np.where(above, np.where(last > 0, f_low / 2, f_low), slack)
        f_high = np.where(above, slack, np.where(last < 0, f_high / 2, f_high))
        low, high = np.where(above, low, middle), np.where(above, middle, high)
        last = np.where(above, 1.0, -1.0)
    return low, high


def _bound(trials: Trials, variable: Variable, line: Line, crossing: Crossing) -> Bound:
    constraint = trials.constraints[crossing.constraint]
    moves = {name: float(v[0]) for name, v in line(np.array([crossing.value])).items() if name != variable.name}
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


def _regions(
    trials: Trials,
    variable: Variable,
    xs: Array,
    met: Mask,
    helped: list[int],
    crossings: list[Crossing],
    ends: tuple[float, float],
) -> list[Region]:
    """Intervals where all of `helped` hold, built from the refined crossings."""
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
