"""Conflicts: the target that cannot be met, or the targets that exclude each other, and how much each must give way."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from worksheet.solver import goals
from worksheet.solver.propose import Free
from worksheet.solver.results import Conflict, Window
from worksheet.solver.search import Search
from worksheet.solver.subject import scalar
from worksheet.solver.trials import Trials, holds
from worksheet.solver.variables import variables
from worksheet.stages.stage import BIAS

_HELPERS = ("length", "load_capacitance", "bias_current", "width", "bias_length", "bias_width")


def conflict(trials: Trials, free: Free) -> Conflict:
    """Find what excludes what over the free variables of the recommended point.

    Args:
        trials: The sheet's constraints; no point meets them all.
        free: What may move.
    Returns: Conflict
    """
    limits = list(range(trials.target_count, len(trials.constraints)))
    targets = list(range(trials.target_count))
    names = [c.name for c in trials.constraints]
    alone = [k for k in targets if not _possible(trials, free, [k, *limits])]
    excluding = alone[:1] if alone else _minimal(trials, free, targets, limits)
    involved = tuple(dict.fromkeys(names[k] for k in excluding))
    own = {name: next(k for k in excluding if names[k] == name) for name in involved}
    gives = {name: _best(trials, free, k, [i for i in targets if names[i] != name], limits) for name, k in own.items()}
    return Conflict(
        variable="bias_current" if free.by_inversion or not free.names else free.names[0],
        targets=involved,
        gives_way=gives,
        reachable_with=_reachable(trials, free),
        explain=_explain(involved, bool(alone)),
        wanted={name: _limit(trials, k) for name, k in own.items()},
    )


def at_present(trials: Trials, free: Free, windows: Mapping[str, Window]) -> Conflict:
    """What the sheet as it stands misses, where there is no recommended point to look for.

    Args:
        trials: The sheet's constraints.
        free: What a recommended point would be free in.
        windows: What is needed of each variable.
    """
    current = np.array([scalar(trials.subject.value("bias_current"))])
    met = holds(trials.constraints, trials.clear({"bias_current": current}).slack)[:, 0]
    missed = [k for k, good in enumerate(met) if not good]
    names = tuple(dict.fromkeys(trials.constraints[k].name for k in missed))
    limits = list(range(trials.target_count, len(trials.constraints)))
    targets = [k for k in missed if k < trials.target_count]
    others = {k: [i for i in range(trials.target_count) if trials.constraints[i].name != trials.constraints[k].name]
              for k in targets}  # fmt: skip
    return Conflict(
        variable="bias_current",
        targets=tuple(dict.fromkeys(trials.constraints[k].name for k in targets)),
        gives_way={
            trials.constraints[k].name: _best(trials, free, k, others[k], limits) if free.names else None
            for k in reversed(targets)
        },
        reachable_with=_alone(windows),
        explain=f"the present point misses {', '.join(names)}",
        wanted={trials.constraints[k].name: _limit(trials, k) for k in reversed(targets)},
    )


def _alone(windows: Mapping[str, Window]) -> dict[str, float]:
    """The nearest value of one variable at which, moved alone, everything holds."""
    for name, window in windows.items():
        region = window.region
        if region is None or window.cannot_help:
            continue
        nearest = region.low if region.low is not None and window.present < region.low else region.high
        if nearest is not None:
            return {name: nearest}
    return {}


def _possible(trials: Trials, free: Free, wanted: Sequence[int]) -> bool:
    return Search(trials, free.space(), wanted).possible()


def _minimal(trials: Trials, free: Free, targets: list[int], limits: list[int]) -> list[int]:
    """Targets of which none can be left out without the rest becoming possible."""
    kept = list(targets)
    for k in targets:
        fewer = [other for other in kept if other != k]
        if fewer and not _possible(trials, free, [*fewer, *limits]):
            kept = fewer
    return kept


def _limit(trials: Trials, index: int) -> float:
    """The limit of a target's constraint, guard band counted. [its unit]"""
    constraint = trials.constraints[index]
    assert constraint.target is not None  # only targets are asked to give way
    low, high = goals.limits(constraint.target)
    limit = low if constraint.side == "low" else high
    assert limit is not None  # a constraint is made for limits that exist only
    return limit


def _best(trials: Trials, free: Free, own: int, others: list[int], limits: list[int]) -> float | None:
    """Best reachable value of one side of a target with others held, None where those exclude each other. [its unit]"""
    place = Search(trials, free.space(), [*others, *limits]).greatest(own)
    if place is None:
        return None
    moves = free.moves(place[:1], place[None, 1:])
    constraint = trials.constraints[own]
    target = constraint.target
    assert target is not None  # only targets are asked to give way
    moved, solution = trials.solve(moves)
    values = np.broadcast_to(goals.measure(moved, target, solution).values, (1, *trials.points())).reshape(-1)
    if trials.over == "nominal" or target.at == "nominal":
        values = values[:1]
    worst = np.min(values) if constraint.side == "low" else np.max(values)
    return float(worst) if np.isfinite(worst) else None


def _reachable(trials: Trials, free: Free) -> dict[str, float]:
    """A value of one further variable, nearest to where it stands, with which everything becomes possible."""
    every = variables(free.subject)
    for name in _HELPERS:
        if name in free.names or name not in every or name in free.subject.sheet.assume:
            continue
        bias = None if name.startswith(f"{BIAS}_") and name != "bias_current" else free.bias
        wider = Free(free.subject, every, (*free.names, name), bias, apart=True)
        found = Search(trials, wider.space()).least()
        if found.feasible:
            return {name: _nearest(trials, wider, name, wider.place(found)[name])}
    return {}


def _nearest(trials: Trials, wider: Free, name: str, known: float) -> float:
    """The value of a variable nearest to where it stands that makes everything possible, on the side of a known one."""
    present = wider.variables[name].present
    sign = 1.0 if known >= present else -1.0
    space = wider.turned(name, sign, (float(np.log(present)), float(np.log(known))))
    found = Search(trials, space).least()
    return float(np.exp(sign * found.place[0])) if found.feasible else known


def _explain(names: tuple[str, ...], alone: bool) -> str:
    if alone:
        return f"{names[0]} cannot be met at any current and width that the process allows"
    if len(names) > 1:
        return f"{', '.join(names[:-1])} and {names[-1]} exclude each other"
    return f"{', '.join(names)} is not met together with saturation and ratings" if names else "no point is saturated"
