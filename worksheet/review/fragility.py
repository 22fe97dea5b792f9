"""How far an input can move before a target breaks, all else held and formulas following (physics: section 6)."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import partial

import numpy as np

from worksheet.device.arrays import Array
from worksheet.engine.measured import Measured
from worksheet.model.sheet import TOLERANCE, Condition
from worksheet.project.case import Case
from worksheet.project.conditions import ConditionSet
from worksheet.project.evaluate import Evaluator
from worksheet.review import brackets
from worksheet.review.inputs import Input, inputs_of
from worksheet.review.probe import Place, Probe, Seen
from worksheet.solver import goals
from worksheet.solver.trials import Index
from worksheet.stages.circuit import Circuit

_SPAN = 10.0
_TILT = 1e-5
_FLAT = 1e-9
_BOUNDARY = 1e-9


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


@dataclass(frozen=True)
class Fragility:
    """The ranking at the nominal condition and at each target's worst one, and the inputs that stand at 0."""

    nominal: tuple[Fragile, ...]
    worst: tuple[Fragile, ...]
    not_ranked: tuple[str, ...]


def fragility(evaluator: Evaluator, worst: Mapping[str, Mapping[str, Condition]]) -> dict[str, Fragility]:
    """Rank every input of sheets against every target; sheets of one circuit are looked at together.

    Args:
        evaluator: The project.
        worst: The worst condition of each target that has one, by sheet and target.
    Returns: Fragility by sheet, least room first
    """
    circuits: dict[Circuit, list[Place]] = {}
    inputs = {}
    for name, conditions in worst.items():
        case = evaluator.case(name)
        inputs[name] = inputs_of(case)
        circuits.setdefault(case.circuit.drawn, []).extend(_places(evaluator, case, inputs[name], conditions))
    rows: dict[tuple[str, int], list[Fragile]] = {}
    for places in circuits.values():
        for place, found in zip(places, _ranked(places), strict=True):
            rows.setdefault((place.case.sheet.name, place.index), []).extend(found)
    return {name: _of_sheet(evaluator.case(name), rows, inputs[name], worst[name]) for name in worst}


def _places(
    evaluator: Evaluator, case: Case, inputs: Sequence[Input], worst: Mapping[str, Condition]
) -> Iterator[Place]:
    """The nominal condition with every target, and each worst condition with the targets that are worst there."""
    conditions, targets = case.conditions, case.sheet.targets
    for at in dict.fromkeys((conditions.nominal, *worst.values())):
        index = conditions.index[at]
        both = conditions.conditions[:1] if index == 0 else (conditions.nominal, at)
        pair = evaluator.over(case.sheet.name, ConditionSet(conditions.process, both))
        moved = tuple(_there(case, item, index) for item in inputs if item.value != 0)
        mine = targets if index == 0 else [name for name in targets if worst.get(name) == at]
        yield Place(case, index, pair, moved, tuple(targets[name] for name in mine))


def _there(case: Case, item: Input, index: int) -> Input:
    """An input with the value that it has at a condition: temperature, supply and links have one at each."""
    if index == 0 or not ("." in item.name or item.name in ("temperature", "supply")):
        return item
    if item.name in ("temperature", "supply"):
        return replace(item, value=float(getattr(case.conditions.conditions[index], item.name)))
    sheet, _, key = item.name.partition(".")
    if sheet in ("assume", "choose", "own", "bias", "process"):
        return item
    values = np.asarray(case.external(sheet, key)).reshape(-1)
    return replace(item, value=float(values[index if len(values) > 1 else 0]))


def _of_sheet(
    case: Case, rows: Mapping[tuple[str, int], list[Fragile]], inputs: Sequence[Input], worst: Mapping[str, Condition]
) -> Fragility:
    name, index = case.sheet.name, case.conditions.index
    nominal = rows.get((name, 0), [])
    at_worst = [
        row
        for place in sorted({index[at] for at in worst.values()})
        for row in rows.get((name, place), [])
        if row.target in worst and index[worst[row.target]] == place
    ]
    return Fragility(
        nominal=tuple(sorted(nominal, key=_order)),
        worst=tuple(sorted(at_worst, key=_order)),
        not_ranked=tuple(i.name for i in inputs if i.value == 0),
    )


def _order(row: Fragile) -> tuple[bool, float, float]:
    return row.room is None, row.room or 0.0, -abs(row.sensitivity or 0.0)


@dataclass(frozen=True, eq=False, slots=True)
class _Pairs:
    """Every input of every place of a probe, as arrays: its place, its number in the probe, its value and its range."""

    place: Index
    name: Index
    value: Array
    low: Array
    high: Array
    items: tuple[Input, ...]

    def at(self, logarithm: Array, which: Index) -> Array:
        """Values at a logarithm over the present value. [unit of the input]"""
        return np.asarray(self.value[which] * np.exp(logarithm))


def _pairs(probe: Probe) -> _Pairs:
    items = tuple(item for place in probe.places for item in place.inputs)
    counts = [len(place.inputs) for place in probe.places]
    spans = np.array([_span(item) for item in items]).reshape(-1, 2)
    return _Pairs(
        place=np.repeat(np.arange(len(counts)), counts),
        name=np.concatenate(probe.name_of).astype(np.intp),
        value=np.array([item.value for item in items]),
        low=spans[:, 0],
        high=spans[:, 1],
        items=items,
    )


def _span(item: Input) -> tuple[float, float]:
    """Logarithms over the present value between which it is moved: a tenth to ten times, within its own limits."""
    low, high, size = 1.0 / _SPAN, _SPAN, abs(item.value)
    if item.value > 0:
        low = max(low, (item.low or 0.0) / size)
        high = min(high, np.inf if item.high is None else item.high / size)
    if item.name.endswith((".kappa", ".drain_coupling")):
        high = min(high, 1.0 / size)
    return float(np.log(min(low, 1.0))), float(np.log(max(high, 1.0)))


def _ranked(places: Sequence[Place]) -> list[list[Fragile]]:
    """Rows of each place: the inputs that move a target of it, at its condition."""
    probe = Probe(places)
    pairs = _pairs(probe)
    if not len(pairs.place) or not probe.targets:
        return [[] for _ in places]
    pairs = _within_existence(probe, pairs)
    slopes, moving = _sensitivities(probe, pairs)
    breaks = _breaks(probe, pairs, moving)
    found: list[list[Fragile]] = []
    starts = np.searchsorted(pairs.place, np.arange(len(places) + 1)).tolist()
    for number, place in enumerate(places):
        mine = range(starts[number], starts[number + 1])
        found.append([row for t in place.targets for row in _rows(t.name, mine, pairs, slopes[t.name], breaks[t.name])])
    return found


def _within_existence(probe: Probe, pairs: _Pairs) -> _Pairs:
    """The same with ranges that end where kappa and drain coupling come to 1: beyond it there is no device."""

    def room(which: Index, logarithm: Array) -> Array:
        return probe.room(pairs.place[which], pairs.name[which], pairs.at(logarithm, which))

    def among(some: Index, which: Index, logarithm: Array) -> Array:
        return room(some[which], logarithm)

    every = np.arange(len(pairs.place))
    ends = []
    for end in (pairs.low, pairs.high):
        beyond = np.flatnonzero(room(every, end) < 0)
        shorter = end.copy()
        if len(beyond):
            none = np.zeros(len(beyond))
            shorter[beyond] = brackets.drawn(partial(among, beyond), none, end[beyond], _BOUNDARY)
        ends.append(shorter)
    return replace(pairs, low=ends[0], high=ends[1])


def _rows(
    target: str, mine: range, pairs: _Pairs, slopes: Sequence[float], breaks: Sequence[float]
) -> Iterator[Fragile]:
    for k in mine:
        item, slope, near = pairs.items[k], slopes[k], breaks[k]
        broken = near == near  # noqa: PLR0124  not a number where nothing breaks
        known = abs(slope) < np.inf
        if broken or (known and abs(slope) >= _FLAT):
            room = abs(near - item.value) / abs(item.value) if broken else None
            yield Fragile(
                target,
                item.name,
                item.value,
                item.unit,
                item.trust,
                item.standard_error,
                slope if known else None,
                near if broken else None,
                room,
            )


def _sensitivities(probe: Probe, pairs: _Pairs) -> tuple[dict[str, list[float]], Index]:
    """d ln(target)/d ln(input) by central differences, by target over pairs; and the pairs that move anything at all.

    An input that changes no bit of any target, neither a little to either side nor at the ends of its range, is none
    of theirs.
    """
    count = len(pairs.place)
    every = np.arange(count)
    ways = [np.full(count, _TILT), np.full(count, -_TILT), pairs.low, pairs.high, np.zeros(count)]
    which = np.tile(every, len(ways))
    order = np.argsort(pairs.place[which], kind="stable")
    seen = _look(probe, pairs, which[order], np.concatenate(ways)[order])
    back = np.empty_like(order)
    back[order] = np.arange(len(order))
    slopes, moves = {}, np.zeros(count, dtype=np.bool_)
    for name, measured in seen.targets.items():
        up, down, low, high, here = measured.values[back].reshape(len(ways), count)
        with np.errstate(all="ignore"):
            slopes[name] = (np.log(up / down) / (2.0 * _TILT)).tolist()
        for there in (up, down, low, high):
            moves |= ~((there == here) | (np.isnan(there) & np.isnan(here)))
        if measured.reasons is not None:
            reasons = measured.reasons[back].reshape(len(ways), count)
            moves |= (reasons != reasons[-1]).any(axis=0)
    return slopes, every[moves]


def _look(probe: Probe, pairs: _Pairs, which: Index, logarithm: Array, targets: Collection[str] | None = None) -> Seen:
    """Targets where pairs are moved, each to a logarithm over its present value; all targets, or some."""
    return probe.see(pairs.place[which], pairs.name[which], pairs.at(logarithm, which), targets)


def _breaks(probe: Probe, pairs: _Pairs, moving: Index) -> dict[str, list[float]]:
    """The nearest break value of each target, over pairs; NaN where there is none."""
    nearest = {name: np.full(len(pairs.place), np.nan) for name in probe.targets}
    if len(moving):
        found = _Brackets(probe, pairs, _sides(probe))
        found.search(moving)
        for name, pair, value in found.values():
            distance = np.abs(value - pairs.value[pair])
            known = np.abs(nearest[name][pair] - pairs.value[pair])
            nearer = ~(known <= distance)
            np.putmask(value, ~nearer, nearest[name][pair])
            nearest[name][pair] = value
    return {name: values.tolist() for name, values in nearest.items()}


@dataclass(frozen=True, eq=False, slots=True)
class _Side:
    """One side of the targets of one name: its limit in each place, NaN where the place has none."""

    target: str
    side: str
    limit: Array

    def slack(self, measured: Measured, place: Index) -> Array:
        """Slack with the verdict's tolerance added; met where zero or more."""
        limit = self.limit[place]
        return goals.slack(measured, limit, self.side) + np.where(limit == 0, 0.0, TOLERANCE)


def _sides(probe: Probe) -> list[_Side]:
    sides = []
    for name in probe.targets:
        for number, side in enumerate(goals.SIDES):
            targets = [next((t for t in place.targets if t.name == name), None) for place in probe.places]
            limits = [None if target is None else goals.limits(target)[number] for target in targets]
            if any(limit is not None for limit in limits):
                sides.append(_Side(name, side, np.array([np.nan if x is None else x for x in limits])))
    return sides


class _Brackets:
    """Brackets of all sides, pairs and directions, found on one grid and drawn together."""

    def __init__(self, probe: Probe, pairs: _Pairs, sides: Sequence[_Side]) -> None:
        self.probe, self.pairs, self.sides = probe, pairs, sides
        none = np.zeros(0, dtype=np.intp)
        self.side, self.pair, self.low, self.high = none, none, np.zeros(0), np.zeros(0)

    def search(self, moving: Index) -> None:
        """Look along the ranges of the pairs that move something."""
        ends = np.stack([self.pairs.low[moving], self.pairs.high[moving]], axis=1)
        places = ends[:, :, None] * brackets.STEPS  # (pairs, directions, steps)
        shape = places.shape
        seen = _look(self.probe, self.pairs, np.repeat(moving, shape[1] * shape[2]), places.reshape(-1))
        exists = (seen.room >= 0).reshape(shape)
        place = self.pairs.place[np.repeat(moving, shape[1] * shape[2])]
        for number, side in enumerate(self.sides):
            mine = np.flatnonzero(~np.isnan(side.limit[self.pairs.place[moving]]))
            if len(mine):
                met = (side.slack(seen.targets[side.target], place) >= 0).reshape(shape)
                for way in (0, 1):
                    self._enter(number, moving[mine], places[mine, way], met[mine, way], exists[mine, way])

    def _enter(self, side: int, pair: Index, places: Array, met: Array, exists: Array) -> None:
        first = brackets.first_change(met, exists)  # type: ignore[arg-type]
        has = np.flatnonzero(first >= 0)
        step = first[has]
        self.side = np.concatenate([self.side, np.full(len(has), side)])
        self.pair = np.concatenate([self.pair, pair[has]])
        self.low = np.concatenate([self.low, places[has, step]])
        self.high = np.concatenate([self.high, places[has, step + 1]])

    def values(self) -> Iterator[tuple[str, Index, Array]]:
        """Break values by side and direction: the target's name, the pairs and where each breaks."""
        if not len(self.pair):
            return
        order = np.argsort(self.pair, kind="stable")
        side, pair = self.side[order], self.pair[order]

        def look(which: Index, logarithm: Array) -> Array:
            place, of_side = self.pairs.place[pair[which]], side[which]
            sides = [
                (self.sides[number], of_side == number) for number in np.flatnonzero(np.bincount(of_side)).tolist()
            ]
            seen = _look(self.probe, self.pairs, pair[which], logarithm, {one.target for one, _ in sides})
            found = np.empty(len(which))
            for one, mine in sides:
                measured = seen.targets[one.target]
                reasons = None if measured.reasons is None else measured.reasons[mine]
                found[mine] = one.slack(Measured(measured.values[mine], reasons), place[mine])
            return found

        edges = brackets.drawn(look, self.low[order], self.high[order])
        breaks = self.pairs.at(edges, pair)
        down = edges < 0
        for number, one in enumerate(self.sides):
            for way in (down, ~down):
                mine = (side == number) & way
                if mine.any():
                    yield one.target, pair[mine], breaks[mine]
