"""Proposals: the recommended and the compact point, and numbers for what a sheet leaves open."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.solver import bias_size, ranges
from worksheet.solver.bias_size import BiasSize
from worksheet.solver.results import Point
from worksheet.solver.search import Found, Search, Space
from worksheet.solver.subject import Subject, scalar
from worksheet.solver.trials import Trials
from worksheet.solver.variables import Variable, inversion, square_current, variables
from worksheet.stages.stage import BIAS

INVERSION_RANGE = (0.01, 100.0)
"""Inversion coefficients over which a recommended point is looked for."""

_ROUNDS, _SETTLED = 6, 1e-9
"""A current source whose size is left out is sized anew for each current that a search comes to, until it settles."""

_ROUNDING = 1e-8
"""Relative: as far beyond a limit a search may end."""

_CURRENT_RANGE = (1e-15, 1.0)
_CAPACITANCE_RANGE = (1e-18, 1e-6)


@dataclass(frozen=True, eq=False)
class Free:
    """What a search may move, and how its coordinates turn into values.

    The first coordinate is what is to be least: the bias current, else the gate area, else the load capacitance.

    Attributes:
        subject: The sheet.
        variables: Its design variables.
        names: What may move.
        bias: What goes with that of the current source's transistor, None where nothing does.
        apart: Whether width and length are coordinates of their own also where the current is not free.
    """

    subject: Subject
    variables: Mapping[str, Variable]
    names: tuple[str, ...]
    bias: BiasSize | None = None
    apart: bool = False

    @property
    def followers(self) -> Mapping[str, str]:
        """Open sizes of stacked devices that go with a free size of the main device."""
        return {k: v for k, v in bias_size.followers(self.subject).items() if v in self.names}

    @property
    def by_inversion(self) -> bool:
        """Whether current and width are both free: then the inversion coefficient is a coordinate."""
        return "bias_current" in self.names and "width" in self.names

    @property
    def by_area(self) -> bool:
        """Whether width and length are free and the current is not: then gate area and aspect ratio are coordinates."""
        return not self.apart and {"width", "length"} <= set(self.names) and "bias_current" not in self.names

    def space(self) -> Space:
        """The search space of these freedoms."""
        return Space(self._first(), self._rest(), self.moves, self.rooms)

    def _span(self, name: str) -> tuple[float, float]:
        if name == "bias_current":
            return float(np.log(_CURRENT_RANGE[0])), float(np.log(_CURRENT_RANGE[1]))
        if name == "load_capacitance":
            return float(np.log(_CAPACITANCE_RANGE[0])), float(np.log(_CAPACITANCE_RANGE[1]))
        variable = self.variables[name]
        return float(np.log(variable.low)), float(np.log(variable.high))

    def _first(self) -> tuple[float, float]:
        if self.by_inversion:
            width, length = self.variables["width"], self._length_span()
            squares = square_current(self.subject)
            low = squares * width.low / np.exp(length[1]) * INVERSION_RANGE[0]
            high = squares * width.high / np.exp(length[0]) * INVERSION_RANGE[1]
            return float(np.log(low)), float(np.log(high))
        if self.by_area:
            (w0, w1), (l0, l1) = self._span("width"), self._span("length")
            return w0 + l0, w1 + l1
        return self._span(self.names[0])

    def _length_span(self) -> tuple[float, float]:
        if "length" in self.names:
            return self._span("length")
        present = float(np.log(scalar(self.subject.value("length"))))
        return present, present

    def _rest(self) -> tuple[tuple[float, float], ...]:
        rest: list[tuple[float, float]] = []
        if self.by_inversion:
            rest.append((float(np.log(INVERSION_RANGE[0])), float(np.log(INVERSION_RANGE[1]))))
        if self.by_area:
            (w0, w1), (l0, l1) = self._span("width"), self._span("length")
            rest.append((w0 - l1, w1 - l0))
        rest += [self._span(name) for name in self._others()]
        return tuple(rest)

    def _others(self) -> list[str]:
        """Free variables that are coordinates of their own, after the first and the inversion or aspect ratio."""
        taken = (
            {"bias_current", "width"} if self.by_inversion else {"width", "length"} if self.by_area else {self.names[0]}
        )
        return [name for name in self.names if name not in taken]

    def moves(self, first: Array, rest: Array) -> dict[str, Array]:
        """Values of the free variables for coordinates. [unit of each key]"""
        own = 1 if self.by_inversion or self.by_area else 0
        moved = {name: np.exp(rest[:, own + k]) for k, name in enumerate(self._others())}
        if self.by_inversion:
            current, ic = np.exp(first), np.exp(rest[:, 0])
            length = moved.get("length", np.full(len(first), scalar(self.subject.value("length"))))
            moved["bias_current"] = current
            moved["width"] = current * length / (square_current(self.subject) * ic)
        elif self.by_area:
            moved["width"], moved["length"] = np.exp((first + rest[:, 0]) / 2.0), np.exp((first - rest[:, 0]) / 2.0)
        else:
            moved[self.names[0]] = np.exp(first)
        moved |= {name: moved[leader] for name, leader in self.followers.items()}
        return moved | self._bias_sizes(moved)

    def _bias_sizes(self, moved: Mapping[str, Array]) -> dict[str, Array]:
        if self.bias is None:
            return {}
        current, length = (moved.get(n, scalar(self.subject.value(n))) for n in ("bias_current", "length"))
        count = len(next(iter(moved.values())))
        return {name: np.broadcast_to(v, (count,)) for name, v in self.bias.sizes(current, length).items()}

    def rooms(self, first: Array, rest: Array) -> Array:
        """Slack of each process limit, shape (limits, trials). [-]"""
        limits = []
        for name, values in self.moves(first, rest).items():
            variable = self.variables[name]
            if variable.bounded and not (self.bias is not None and name in (self.bias.length_key, self.bias.width_key)):
                limits += [np.log(values / variable.low), np.log(variable.high / values)]
        return np.array(limits).reshape(len(limits), len(first))

    def turned(self, name: str, sign: float, span: tuple[float, float]) -> Space:
        """The same freedoms with another variable as what is to be least (sign 1) or greatest (sign -1).

        Args:
            name: A free variable that is a coordinate of its own, after the first.
            sign: Which way.
            span: Logarithms of its values between which it may lie.
        """
        own = 1 if self.by_inversion or self.by_area else 0
        place = own + self._others().index(name)
        plain = self._rest()

        def back(first: Array, rest: Array) -> tuple[Array, Array]:
            inner = np.insert(rest[:, 1:], place, sign * first, axis=1)
            return rest[:, 0], inner

        rest = (self._first(), *(r for k, r in enumerate(plain) if k != place))
        low, high = sorted(sign * s for s in span)
        return Space(
            (low, high),
            rest,
            lambda first, rest: self.moves(*back(first, rest)),
            lambda first, rest: self.rooms(*back(first, rest)),
        )

    def room(self, first: Array, rest: Array) -> Array:
        """Slack of the process limits together. [-]"""
        return np.asarray(np.min(self.rooms(first, rest), axis=0, initial=np.inf))

    def place(self, found: Found) -> dict[str, float]:
        """Values of the free variables at a place, inside the process limits to the last digit."""
        moved = self.moves(found.place[:1], found.place[None, 1:])
        return {name: self._inside(name, float(values[0])) for name, values in moved.items()}

    def _inside(self, name: str, value: float) -> float:
        """A value that logarithms left by rounding beyond a limit, at the limit."""
        variable = self.variables.get(name)
        if variable is None or not variable.bounded:
            return value
        inside = min(max(value, variable.low), variable.high)
        return inside if abs(inside - value) <= _ROUNDING * inside else value


def freedoms(subject: Subject) -> tuple[str, ...]:
    """What the recommended point is free in: current, width, and length and load where open, less what is assumed."""
    wanted = ["bias_current", "width"]
    wanted += [name for name in ("length", "load_capacitance") if name in subject.open_keys]
    return tuple(name for name in wanted if name not in subject.sheet.assume)


def gate_area(subject: Subject, values: Mapping[str, Array]) -> Array:
    """Sum of W L over all transistors for moved values. [m^2], shape (trials,)"""
    total = np.zeros(())
    for device in subject.circuit.devices:
        width, length = (values.get(device.key(n), scalar(subject.value(device.key(n)))) for n in ("width", "length"))
        total = total + np.asarray(width) * length
    return total


def point(subject: Subject, values: Mapping[str, float]) -> Point:
    """A point with everything that a designer reads off it."""
    moved = subject.moved(values)
    every = {name: scalar(moved.value(name)) for name in ("bias_current", "width", "length", "load_capacitance")}
    area = float(np.ravel(gate_area(moved, {}))[0])
    return Point({**every, **values}, inversion(moved), area)


@dataclass(frozen=True, eq=False)
class Optimum:
    """What the search for the recommended point came to: the two points, or why there are none.

    `place` is where it ended, all holding there or not: values by key, none where nothing is free.
    """

    recommended: Point | None
    compact: Point | None
    reason: str | None
    free: Free
    place: Mapping[str, float]


NOTHING_FREE = "bias current and width are both assumed"
NO_BOUND = "no target bounds the bias current from below"


def optimum(subject: Subject, trials: Trials) -> Optimum:
    """The recommended and the compact point of a sheet that has a number for everything.

    Sizes that the sheet leaves out of its current source's transistor go with the point, as they will once it is taken.
    """
    bias = bias_size.of(subject)
    for _ in range(_ROUNDS):
        found = _steady(subject, trials, bias)
        if bias is None or not found.place:
            break
        bias, settled = _sized(bias, subject.moved(found.place))
        if settled:
            break
    return found


def following(subject: Subject, place: Mapping[str, float]) -> BiasSize | None:
    """What sizes that are left out of the current source's transistor go by at a place; None where none are."""
    bias = bias_size.of(subject)
    return None if bias is None else bias.allowed(subject.moved(place))


def settled_bias(subject: Subject, trials: Trials) -> BiasSize | None:
    """As following, where the recommended point is sought; nothing is sought where no size is left out."""
    return None if bias_size.of(subject) is None else optimum(subject, trials).free.bias


def _sized(bias: BiasSize, subject: Subject) -> tuple[BiasSize, bool]:
    """The current source as the ranges allow it at a subject's values, and whether it was that already."""
    sized = bias.allowed(subject)
    return sized, abs(sized.inversion - bias.inversion) <= _SETTLED * bias.inversion


def _steady(subject: Subject, trials: Trials, bias: BiasSize | None) -> Optimum:
    """Both points with the ends of ranges to which their own signs point among the trials."""
    for _ in range(_ROUNDS):
        found = _optimum(subject, trials, bias)
        points = [p.values for p in (found.recommended, found.compact) if p is not None]
        moved = [{n: p[n] for n in found.place} for p in points]
        wider = [w for w in (_steered(trials, place) for place in moved) if w is not None]
        if not wider:
            break
        trials = wider[0]
    return found


def _optimum(subject: Subject, trials: Trials, bias: BiasSize | None) -> Optimum:
    free = Free(subject, variables(subject), freedoms(subject), bias)
    if not free.names:
        return Optimum(None, None, NOTHING_FREE, free, {})
    search = Search(trials, free.space())
    found = search.least()
    place = free.place(found)
    if not found.feasible:
        return Optimum(None, None, "no point meets every target", free, place)
    if "bias_current" in free.names and not _bounded_below(free, trials, found):
        return Optimum(None, None, NO_BOUND, free, place)
    if free.by_inversion:
        tied = _compact(free, search, found, 1e-6)
        place = tied if tied is not None else place
        smallest = _compact(free, search, found, subject.sheet.solve.current_allowance)
    else:
        smallest = None
    recommended = point(subject, place)
    compact = point(subject, smallest) if smallest is not None else recommended
    return Optimum(recommended, compact, None, free, place)


def _compact(free: Free, search: Search, least: Found, allowance: float) -> dict[str, float] | None:
    """The smallest gate area whose current is within the allowance of the least one."""
    cap = least.place[0] + np.log1p(allowance)

    def score(first: Array, rest: Array) -> Array:
        return np.asarray(np.log(gate_area(free.subject, free.moves(first, rest))))

    found = search.least(score, cap, least.place)
    return free.place(found) if found.feasible and found.place[0] <= cap + 1e-6 else None


def _bounded_below(free: Free, trials: Trials, found: Found) -> bool:
    """Whether some target is missed at a current far below the least one, the other coordinates held."""
    low = np.array([found.place[0] - np.log(1e6)])
    slack = trials.clear(free.moves(low, found.place[None, 1:]), range(trials.target_count)).slack
    return bool(len(slack)) and bool((slack < 0).any())


def propose(subject: Subject) -> Mapping[str, float]:
    """Numbers for what a sheet leaves open, found over the conditions of its own `over`.

    Args:
        subject: The sheet, with nothing filled in.
    Returns: values by key. [unit of the key]
    Raises: the subject's error where nothing bounds an open value
    """
    following = bias_size.followers(subject)
    searched = tuple(
        n for n in subject.open_keys if (n not in following and not n.startswith(f"{BIAS}_")) or n == "bias_current"
    )
    filled = bias_size.starting_values(subject, searched)
    filled |= {name: _led(subject, filled, leader) for name, leader in following.items()}
    bias = bias_size.of(subject.with_filled(filled))
    for _ in range(_ROUNDS):
        if searched:
            filled |= {} if bias is None else bias.at(subject.with_filled(filled))
            filled |= _fill(subject.with_filled(filled), searched, bias)
            filled |= {name: _led(subject, filled, leader) for name, leader in following.items()}
        if bias is None:
            break
        known = subject.with_filled({**filled, **bias.at(subject.with_filled(filled))})
        bias, settled = _sized(bias, known)
        filled |= bias.at(known)
        if settled or not searched:
            break
    return {name: value for name, value in filled.items() if name in subject.open_keys}


def _led(subject: Subject, filled: Mapping[str, float], leader: str) -> float:
    return filled[leader] if leader in filled else scalar(subject.value(leader))


def _fill(subject: Subject, names: tuple[str, ...], bias: BiasSize | None) -> dict[str, float]:
    trials = Trials(
        subject, subject.sheet.solve.over, ranges.worst_points(subject), ranges.waived_targets(subject.sheet)
    )
    order: list[str] = [n for n in ("bias_current", "width", "length", "load_capacitance") if n in names]
    order += [n for n in names if n not in order]
    free = Free(subject, variables(subject), tuple(order), bias)
    for _ in range(_ROUNDS):
        place, feasible = _filled(free, trials)
        wider = _steered(trials, place)
        if wider is None or not feasible:
            break
        trials = wider
    return place


def _filled(free: Free, trials: Trials) -> tuple[dict[str, float], bool]:
    """Values for what is free, and whether everything holds there."""
    search = Search(trials, free.space())
    found = search.least()
    if not found.feasible:
        return free.place(found), False
    if not _bound_by_target(free, trials, found):
        name = free.names[0]
        message = f"{name} is left open and no target bounds it from below; choose it, or add a target that does"
        raise free.subject.fail(name, message)
    tied = _compact(free, search, found, 1e-6) if free.by_inversion else None
    return tied if tied is not None else free.place(found), True


def _steered(trials: Trials, place: Mapping[str, float]) -> Trials | None:
    """The same trials with the ends of many ranges to which a place's own signs point; None where it has them all.

    Up to six ranges every end is among them. Beyond that a review looks at those that the signs at its point ask for,
    which may be others than at the point where a search began.
    """
    if trials.over == "nominal" or len(trials.vertices) <= ranges.FULL_UP_TO:
        return None
    wider = ranges.merged(trials.vertices, ranges.worst_points(trials.subject.moved(place)))
    many = {len(v) for v in wider.values()} != {len(v) for v in trials.vertices.values()}
    return Trials(trials.subject, trials.over, wider, trials.waived) if many else None


def _bound_by_target(free: Free, trials: Trials, found: Found) -> bool:
    if free.names[0] in ("bias_current", "load_capacitance"):
        return _bounded_below(free, trials, found)
    return trials.target_count > 0
