"""The least of one quantity at which everything holds, over further free ones: a scan, then a zoom around the best.

Coordinates are logarithms. Along the first one, slack is close to a straight line between samples, so that a window
narrower than the scan is still seen; whatever is found is then refined on the true slack. Few conditions bind: only
those are solved while it looks, and whatever it comes to is then held against all of them.

Length: one search; its steps share what it knows of the conditions that bind.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from itertools import product
from typing import Any

import numpy as np

from worksheet.device.arrays import Array
from worksheet.solver import descent
from worksheet.solver.scan import FARTHEST, FINER, read
from worksheet.solver.trials import Mask, Trials, holds, tolerances

Moves = Mapping[str, Array]
_SCAN, _LOCAL = 33, 9
_COARSE = {0: 1, 1: 41, 2: 13, 3: 9}
_ZOOM = {1: (9, 12, 0.3), 2: (5, 18, 0.45), 3: (5, 18, 0.45)}
"""Points along each further coordinate, rounds, and by how much each round is closer, by the number of them."""

_BEFORE_DESCENT, _BEFORE_RAISING, _LEAST_REACH = 4, 7, 0.1
"""Rounds after which a place that holds is improved along its slopes, and one that does not is brought nearer to it."""

_DESCENTS, _LEAST_GAIN = 4, 1e-7
_WIDE_FIRST, _WIDE_REST = 61, {1: 41, 2: 9}
_CLIMB_POINTS, _CLIMB_ROUNDS, _CLIMB_SHRINK = 5, 8, 0.6
_CLOSE = 0.02
"""Of a round's span, how close the first coordinate is found."""

_LOOKS = 6
_BESIDE = 1e-9
_STEEPEST = 4.0
"""The least first coordinate is taken to change no faster than this with the others."""

_FIRST_LOOK = 64
_GROWTHS = 12
_PARTS, _DRAWN = 32, 1e-13


@dataclass(frozen=True, eq=False, slots=True)
class Space:
    """Where to look.

    Attributes:
        first: (low, high) of the quantity that is to be least, as logarithms.
        rest: The same of further free coordinates.
        moves: Values by name for coordinates: (first of shape (trials,), rest of shape (trials, coordinates)).
        rooms: Slack of each limit that no condition decides (process limits), for the same arguments; shape (limits,
            trials).
    """

    first: tuple[float, float]
    rest: tuple[tuple[float, float], ...]
    moves: Callable[[Array, Array], Moves]
    rooms: Callable[[Array, Array], Array]


@dataclass(frozen=True, eq=False, slots=True)
class Found:
    """A place: coordinates (first one first), whether all holds there, and the least slack."""

    place: Array
    feasible: bool
    slack: float


class Search:
    """Looks for the least first coordinate at which all wanted constraints of `trials` hold."""

    def __init__(self, trials: Trials, space: Space, wanted: Sequence[int] | None = None) -> None:
        """Take the constraints (`wanted`: indices that count, all where None) and the space."""
        self._all, self._space = trials, space
        self._wanted = list(range(len(trials.constraints))) if wanted is None else list(wanted)
        self._pick = [trials.constraints[k] for k in self._wanted]
        self._allowed = np.append(0.5 * tolerances(self._pick), 1e-9)[:, None]
        self._trials = trials
        self._coarse: dict[Any, tuple[Array, Array]] = {}

    def slack(self, first: Array, rest: Array) -> Array:
        """Slack of the wanted constraints and, last, of the room; shape (constraints + 1, trials)."""
        cleared = self._trials.clear(self._space.moves(first, rest), self._wanted)
        return np.concatenate([cleared.slack, self._room(first, rest)[None]])

    def _room(self, first: Array, rest: Array) -> Array:
        return np.asarray(np.min(self._space.rooms(first, rest), axis=0, initial=np.inf))

    def feasible(self, slack: Array) -> Array:
        """Where everything holds, from the slack of all of them."""
        return np.asarray(holds(self._pick, slack[:-1]).all(axis=0) & (slack[-1] >= -1e-9))

    def least(
        self, score: Callable[[Array, Array], Array] | None = None, cap: float = np.inf, near: Array | None = None
    ) -> Found:
        """The place with the least first coordinate, or with the least score.

        Args:
            score: Of (first, rest); grows with the first coordinate.
            cap: What the first coordinate may come to at the most.
            near: A place to look at besides those of the scan, first coordinate first.
        Returns: Found; where nothing holds, the place with the greatest least slack
        """
        value = score if score is not None else (lambda first, _rest: first)
        for _ in range(_GROWTHS):
            self._trials = self._binding()
            found = self._zoomed(value, cap, near)
            if not self._learned(found.place[None], found.slack):
                return found
        self._trials = self._all
        return self._zoomed(value, cap, near)

    def possible(self) -> bool:
        """Whether everything wanted holds anywhere."""
        self._trials = self._binding()
        places = self._coarse_places()
        samples, slack = self._scanned(places)
        good = self.feasible(slack)
        if good.any():
            k = int(np.argmax(np.where(good, slack.min(axis=0), -np.inf)))
            place = np.array([samples.reshape(-1)[k], *places[k // samples.shape[1]]])
            if not self._learned(place[None], 0.0):
                return True
        return self.least().feasible

    def greatest(self, index: int) -> Array | None:
        """The place with the most slack of one constraint among those where the wanted ones hold; None for none."""
        start = self.least()
        if not start.feasible:
            return None
        for _ in range(_GROWTHS):
            best, slack = self._climbed(start.place, index)
            if not self._learned(best[None], slack, index):
                return best
            self._trials = self._binding()
        self._trials = self._all
        return self._climbed(start.place, index)[0]

    def _binding(self) -> Trials:
        """The constraints at the points that are known to bind somewhere; at first those that do at random places."""
        known = self._all.binding
        if not known:
            spans = [self._space.first, *self._space.rest]
            low, high = np.array(spans).T
            lots = low + (high - low) * np.random.default_rng(0).random((_FIRST_LOOK, len(spans)))
            self._learn(lots)
        return self._all.at_points(known)

    def _learn(self, places: Array) -> Array:
        """Take in the points that bind at some places; the slack there, as `slack`."""
        moves, room = self._space.moves(places[:, 0], places[:, 1:]), self._room(places[:, 0], places[:, 1:])
        cleared = self._all.clear(moves)
        self._all.binding.update(np.unique(cleared.worst).tolist())
        return np.concatenate([cleared.slack, room[None]])

    def _learned(self, place: Array, slack: float, index: int | None = None) -> bool:
        """Whether over all points less is cleared at a place than was thought; these are then taken in."""
        if self._trials is self._all:
            return False
        full = self._learn(place)
        wanted = [*self._wanted, -1] if index is None else [index]
        if index is not None and not self.feasible(full[[*self._wanted, -1]])[0]:
            return True
        short = full[wanted, 0].min() < slack - 1e-9 * (1.0 + abs(slack))
        return bool(short and not (index is None and slack >= 0 and self.feasible(full[wanted])[0]))

    def _coarse_places(self) -> Array:
        return self._grid(self._space.rest, _COARSE.get(len(self._space.rest), 7))

    def _zoomed(self, value: Callable[[Array, Array], Array], cap: float, near: Array | None) -> Found:
        dimensions = len(self._space.rest)
        count = _COARSE.get(dimensions, 7)
        points, rounds, shrink = _ZOOM.get(dimensions, (5, 0, 0.5))
        span = np.array([(high - low) / max(count - 1, 1) for low, high in self._space.rest])
        best = self._best(self._coarse_places(), value, cap, None, float(np.max(span, initial=0.0)))
        for k in range(rounds):
            if k >= (_BEFORE_DESCENT if best[2] >= 0 else _BEFORE_RAISING):
                break
            around = [
                (max(c - s, low), min(c + s, high))
                for c, s, (low, high) in zip(best[1], span, self._space.rest, strict=True)
            ]
            places = np.concatenate([best[1][None], self._grid(around, points)])
            best = self._best(places, value, cap, best, float(span.max()))
            span = span * shrink
        reach = float(np.max(span, initial=_LEAST_REACH))
        best = best if best[2] >= 0 else self._raised(best, reach)
        starts = [best, *([] if near is None else [(float(near[0]), near[1:], 0.0)])]
        starts.sort(key=lambda b: (b[2] < 0 or b[0] > cap + 1e-6, float(value(*_one(b))[0])))
        found = self._finished(starts[0], value, cap, reach)
        if near is not None and _rank(found, value, cap) > (False, float(value(near[:1], near[None, 1:])[0])):
            found = min(found, self._finished(starts[1], value, cap, reach), key=lambda f: _rank(f, value, cap))
        if not found.feasible and (other := self._scan_least(value, cap)) is not None:
            found = min(found, self._finished(other, value, cap, reach), key=lambda f: _rank(f, value, cap))
        return found

    def _finished(
        self, best: tuple[float, Array, float], value: Callable[[Array, Array], Array], cap: float, reach: float
    ) -> Found:
        for _ in range(_DESCENTS if best[2] >= 0 and self._space.rest else 0):
            again = self._descended(best, value, cap, reach)
            gained = value(*_one(best))[0] - value(*_one(again))[0]
            best, reach = again, _LEAST_REACH
            if abs(gained) < _LEAST_GAIN:
                break
        return self._polished(best)

    def _scan_least(self, value: Callable[[Array, Array], Array], cap: float) -> tuple[float, Array, float] | None:
        """The sample of the scan with the least score among those where all that is wanted does hold, if any does."""
        places = self._coarse_places()
        samples, scanned = self._scanned(places)
        first, rest = samples.reshape(-1), np.repeat(places, _SCAN, axis=0)
        good = np.logical_and(self.feasible(scanned), first <= cap + 1e-9)
        scores = np.where(good, value(first, rest), np.inf)
        k = int(np.argmin(scores))
        return (float(first[k]), rest[k], 0.0) if np.isfinite(scores[k]) else None

    def _every(self, places: Array) -> Array:
        """Slack of the wanted constraints at every point, and of every limit; shape (slacks, places)."""
        first, rest = places[:, 0], places[:, 1:]
        every = self._trials.every(self._space.moves(first, rest), self._wanted)
        return np.concatenate([every, self._space.rooms(first, rest)])

    def _raised(self, best: tuple[float, Array, float], reach: float) -> tuple[float, Array, float]:
        """A place near the best of the zoom at which the least slack is greater, where nothing holds there."""

        def every(places: Array) -> Array:
            return self._every(places[:, 1:])

        def restored(places: Array, _reach: float) -> tuple[Array, Mask]:
            least = np.min(every(places), axis=0)
            return np.column_stack([least, places[:, 1:]]), np.isfinite(least)

        spans = np.array([(-FARTHEST, FARTHEST), self._space.first, *self._space.rest])
        start = np.array([0.0, best[0], *best[1]])
        start[0] = float(np.min(every(start[None])))
        slope = descent.Slope(lambda places: every(places) - places[:, 0], lambda places: -places[:, 0], restored)
        end = descent.improved(slope, start, spans, reach)
        if end[0] <= best[2]:
            return best
        return float(end[1]), end[2:], 0.0 if end[0] >= 0 else float(end[0])

    def _descended(
        self, best: tuple[float, Array, float], value: Callable[[Array, Array], Array], cap: float, reach: float
    ) -> tuple[float, Array, float]:
        """A place that the score falls to from the best of the zoom."""

        def slack(places: Array) -> Array:
            capped = (cap - places[:, 0])[None] if np.isfinite(cap) else np.zeros((0, len(places)))
            return np.concatenate([self._every(places), capped])

        def restored(places: Array, reach: float) -> tuple[Array, Mask]:
            known = (float(np.median(places[:, 0])), places[0, 1:], 0.0)
            first, _ = self._least_first(places[:, 1:], known, max(reach, 1e-9))
            tried = np.stack([first, first + _BESIDE, places[:, 0]])
            rest = np.tile(places[:, 1:], (len(tried), 1))
            holding = self.feasible(self.slack(tried.reshape(-1), rest)).reshape(tried.shape)
            good = np.logical_and(holding, tried <= cap + 1e-9)
            least = np.min(np.where(good, tried, np.inf), axis=0)
            found: Mask = np.asarray(np.isfinite(least))
            return np.column_stack([np.where(found, least, places[:, 0]), places[:, 1:]]), found

        slope = descent.Slope(slack, lambda places: value(places[:, 0], places[:, 1:]), restored)
        start = np.array([best[0], *best[1]])
        end = descent.improved(slope, start, np.array([self._space.first, *self._space.rest]), reach)
        return float(end[0]), end[1:], 0.0

    def _climbed(self, start: Array, index: int) -> tuple[Array, float]:
        """The place with the most slack of one constraint, and that slack."""
        bounds = [self._space.first, *self._space.rest]
        counts = [_WIDE_FIRST, *([_WIDE_REST.get(len(self._space.rest), 5)] * len(self._space.rest))]
        places = np.array(list(product(*(np.linspace(*b, n) for b, n in zip(bounds, counts, strict=True)))))
        best, most = self._most(np.concatenate([start[None], self._scan_best(index), places]), index)
        span = np.array([(b[1] - b[0]) / max(n - 1, 1) for b, n in zip(bounds, counts, strict=True)])
        for _ in range(_CLIMB_ROUNDS):
            axes = [
                np.clip(c + s * np.linspace(-1, 1, _CLIMB_POINTS), *b)
                for c, s, b in zip(best, span, bounds, strict=True)
            ]
            best, most = self._most(np.concatenate([best[None], np.array(list(product(*axes)))]), index)
            span = span * _CLIMB_SHRINK

        def score(places: Array) -> Array:
            return np.asarray(-self._trials.clear(self._space.moves(places[:, 0], places[:, 1:]), [index]).slack[0])

        def restored(places: Array, _reach: float) -> tuple[Array, Mask]:
            good: Mask = np.asarray(self.feasible(self.slack(places[:, 0], places[:, 1:])), dtype=np.bool_)
            return places, good

        end = descent.improved(descent.Slope(self._every, score, restored), best, np.array(bounds), float(span.max()))
        gained = -float(score(end[None])[0])
        return (end, gained) if gained > most else (best, most)

    def _scan_best(self, index: int) -> Array:
        """The place of the scan where the wanted hold with the most slack of one constraint, if there is one."""
        places = self._coarse_places()
        samples, scanned = self._scanned(places)
        good = self.feasible(scanned)
        if not good.any():
            return np.zeros((0, 1 + len(self._space.rest)))
        k = int(np.argmax(np.where(good, self._survey(places)[index], -np.inf)))
        return np.array([[samples.reshape(-1)[k], *places[k // _SCAN]]])

    def _most(self, places: Array, index: int) -> tuple[Array, float]:
        first, rest = places[:, 0], places[:, 1:]
        cleared = self._trials.clear(self._space.moves(first, rest), [*self._wanted, index]).slack
        good = self.feasible(np.concatenate([cleared[:-1], self._room(first, rest)[None]]))
        k = int(np.argmax(np.where(good, cleared[-1], -np.inf)))
        return np.asarray(places[k]), float(cleared[-1, k])

    def _grid(self, rest: Sequence[tuple[float, float]], count: int) -> Array:
        axes = [np.linspace(low, high, count) if high > low else np.array([low]) for low, high in rest]
        points = list(product(*axes))
        return np.array(points).reshape(len(points), len(rest))

    def _best(
        self,
        places: Array,
        value: Callable[[Array, Array], Array],
        cap: float,
        known: tuple[float, Array, float] | None,
        span: float,
    ) -> tuple[float, Array, float]:
        """(first, rest, least slack) of the best of some places, which lie within a span of the known one."""
        first, slack = self._least_first(places, known, span)
        scores = np.where((slack >= 0) & (first <= cap + 1e-9), value(first, places), np.inf)
        if np.isfinite(scores).any():
            tied = scores <= np.min(scores) + 1e-7 * (1 + abs(np.min(scores)))
            k = int(np.flatnonzero(tied)[0])
        else:
            k = int(np.argmax(slack))
        return float(first[k]), places[k], float(slack[k])

    def _least_first(self, places: Array, known: tuple[float, Array, float] | None, span: float) -> tuple[Array, Array]:
        """For each rest the least feasible first coordinate and 0, or the best one and its negative slack."""
        key = None if known is not None else (frozenset(self._all.binding), places.tobytes(), span)
        if key is None or key not in self._coarse:
            found = self._looked_for(places, known, span)
            if key is None:
                return found
            self._coarse[key] = found
        return self._coarse[key]

    def _looked_for(self, places: Array, known: tuple[float, Array, float] | None, span: float) -> tuple[Array, Array]:
        low, high = self._space.first
        whole = (high - low) / (_SCAN - 1)
        reach = _STEEPEST * span
        if known is None or reach > 3 * whole:
            samples, scanned = self._scanned(places)
            seen = read(samples, scanned + self._allowed)
            step = np.full(len(places), whole)
        else:
            step = np.full(len(places), max(2 * reach / (_LOCAL - 1), 1e-9))
            seen = self._look(places, np.full(len(places), known[0] - reach), step)
        first, slack, missed = seen
        step = step / FINER
        enough = max(_CLOSE * span, 1e-10)
        for _ in range(_LOOKS):
            if np.all(step <= enough):
                break
            thought = slack >= 0
            first, slack, missed = self._look(places, first - 2 * step, 4 * step / (_LOCAL - 1))
            astray = missed | (thought & (slack < 0))
            step = np.where(astray, 2.0 * step, 4 * step / (_LOCAL - 1) / FINER)
        return first, slack

    def _scanned(self, places: Array) -> tuple[Array, Array]:
        """Samples over the whole first coordinate at each place, and the slack of what is wanted at them, flat.

        The coarse places are looked at once for all searches over the same freedoms.
        """
        samples = np.broadcast_to(np.linspace(*self._space.first, _SCAN), (len(places), _SCAN))
        return samples, self._survey(places)[[*self._wanted, -1]]

    def _survey(self, places: Array) -> Array:
        """Slack of all constraints and of the room over the whole first coordinate at each place."""
        key = (self._space.first, self._space.rest, frozenset(self._all.binding), places.tobytes())
        if key not in self._all.surveys:
            first, rest = np.tile(np.linspace(*self._space.first, _SCAN), len(places)), np.repeat(places, _SCAN, axis=0)
            cleared = self._trials.clear(self._space.moves(first, rest))
            self._all.surveys[key] = np.concatenate([cleared.slack, self._room(first, rest)[None]])
        return self._all.surveys[key]

    def _look(self, places: Array, start: Array, step: Array) -> tuple[Array, Array, Mask]:
        """Sample the first coordinate around each place; what _read says of it."""
        low, high = self._space.first
        samples = np.minimum(np.maximum(start, low)[:, None] + step[:, None] * np.arange(_LOCAL), high)
        slack = self.slack(samples.reshape(-1), np.repeat(places, _LOCAL, axis=0))
        first, least, at_end = read(samples, slack + self._allowed)
        return first, least, at_end & (first > low)

    def _polished(self, best: tuple[float, Array, float]) -> Found:
        """The exact least first coordinate near the best place, on the feasible side."""
        first, rest, _ = best
        low, high = self._space.first
        reaches = 1e-6 * 4.0 ** np.arange(9)
        offsets = np.concatenate([[0.0], *(r * np.array([-1.0, 1.0, 0.1, -0.1]) for r in reaches)])
        tried = np.clip(first + offsets, low, high)
        slack = self._along(tried, rest)
        good = self.feasible(slack)
        for k in range(len(reaches)):
            so_far = slice(0, 5 + 4 * k)
            if good[so_far].any():
                return self._drawn(float(np.min(tried[so_far][good[so_far]])), rest)
        k = int(np.argmax(slack.min(axis=0)))
        return Found(np.array([tried[k], *rest]), False, float(slack[:, k].min()))

    def _along(self, first: Array, rest: Array) -> Array:
        """Slack at several values of the first coordinate."""
        return self.slack(first, np.repeat(rest[None], len(first), axis=0))

    def _drawn(self, good: float, rest: Array) -> Found:
        """Walk down from a feasible place to the end of its interval."""
        low = self._space.first[0]
        below = np.maximum(good - 1e-9 * 2.0 ** np.arange(30), low)
        while True:
            held = self.feasible(self._along(below, rest))
            missed = np.flatnonzero(np.logical_not(held))
            if not len(missed):
                good = float(below[-1])
                break
            bad = float(below[missed[0]])
            good = float(below[missed[0] - 1]) if missed[0] > 0 else good
            if good - bad < _DRAWN * max(1.0, abs(good)):
                break
            below = np.linspace(good, bad, _PARTS + 2)[1:-1]
            if below[0] >= good or below[-1] <= bad:
                break
        slack = self._along(np.array([good]), rest)
        return Found(np.array([good, *rest]), True, float(slack.min()))


def _one(place: tuple[float, Array, float]) -> tuple[Array, Array]:
    """A place as (first, rest) over one trial."""
    return np.array([place[0]]), place[1][None]


def _rank(found: Found, value: Callable[[Array, Array], Array], cap: float) -> tuple[bool, float]:
    """Whether a place does not hold, and its score or by how much it is missed; the least is the best."""
    if not found.feasible:
        return True, -found.slack
    return bool(found.place[0] > cap + 1e-6), float(value(found.place[:1], found.place[None, 1:])[0])
