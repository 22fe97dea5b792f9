"""The least of one quantity at which everything holds, over further free ones: a scan, then a zoom around the best.

Coordinates are logarithms. Along the first one, slack is close to a straight line between samples, so that a window
narrower than the scan is still seen; whatever is found is then refined on the true slack.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from itertools import product

import numpy as np

from worksheet.device.arrays import Array
from worksheet.solver.trials import Trials, holds

Moves = Mapping[str, Array]
_SCAN, _FINER, _LOCAL = 33, 8, 7
_COARSE = {0: 1, 1: 41, 2: 13, 3: 9}
_ZOOM_POINTS, _ZOOM_ROUNDS, _SHRINK = 5, 14, 0.5
_BISECTIONS = 60
_FARTHEST = 1e12
_WIDE_FIRST, _WIDE_REST = 61, {1: 41, 2: 9}
_CLIMB_ROUNDS, _CLIMB_SHRINK = 24, 0.6


@dataclass(frozen=True, eq=False, slots=True)
class Space:
    """Where to look.

    Attributes:
        first: (low, high) of the quantity that is to be least, as logarithms.
        rest: The same of further free coordinates.
        moves: Values by name for coordinates: (first of shape (trials,), rest of shape (trials, coordinates)).
        room: Slack of limits that no condition decides (process limits), for the same arguments; shape (trials,).
    """

    first: tuple[float, float]
    rest: tuple[tuple[float, float], ...]
    moves: Callable[[Array, Array], Moves]
    room: Callable[[Array, Array], Array]


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
        self._trials, self._space = trials, space
        self._wanted = list(range(len(trials.constraints))) if wanted is None else list(wanted)
        self._pick = [trials.constraints[k] for k in self._wanted]

    def slack(self, first: Array, rest: Array) -> Array:
        """Slack of the wanted constraints and, last, of the room; shape (constraints + 1, trials)."""
        cleared = self._trials.clear(self._space.moves(first, rest), self._wanted)
        return np.concatenate([cleared.slack, self._space.room(first, rest)[None]])

    def feasible(self, slack: Array) -> Array:
        """Where everything holds, from the slack of all of them."""
        return np.asarray(holds(self._pick, slack[:-1]).all(axis=0) & (slack[-1] >= -1e-9))

    def least(self, score: Callable[[Array, Array], Array] | None = None) -> Found:
        """The place with the least first coordinate, or with the least score.

        Args:
            score: Of (first, rest) at the least feasible first coordinate of each rest; inf to leave a place out.
        Returns: Found; where nothing holds, the place with the greatest least slack
        """
        value = score if score is not None else (lambda first, _rest: first)
        places = self._grid(self._space.rest, _COARSE.get(len(self._space.rest), 7))
        best = self._best(places, value, None)
        span = np.array(
            [(high - low) / max(_COARSE.get(len(self._space.rest), 7) - 1, 1) for low, high in self._space.rest]
        )
        for _ in range(_ZOOM_ROUNDS if self._space.rest else 0):
            around = [
                (max(c - s, low), min(c + s, high))
                for c, s, (low, high) in zip(best[1], span, self._space.rest, strict=True)
            ]
            places = np.concatenate([best[1][None], self._grid(around, _ZOOM_POINTS)])
            best = self._best(places, value, best)
            span = span * _SHRINK
        return self._polished(best)

    def greatest(self, index: int) -> Array | None:
        """The place with the most slack of one constraint among those where the wanted ones hold; None for none."""
        start = self.least()
        if not start.feasible:
            return None
        bounds = [self._space.first, *self._space.rest]
        counts = [_WIDE_FIRST, *([_WIDE_REST.get(len(self._space.rest), 5)] * len(self._space.rest))]
        places = np.array(list(product(*(np.linspace(*b, n) for b, n in zip(bounds, counts, strict=True)))))
        best = self._most(np.concatenate([start.place[None], places]), index)
        span = np.array([(b[1] - b[0]) / max(n - 1, 1) for b, n in zip(bounds, counts, strict=True)])
        for _ in range(_CLIMB_ROUNDS):
            axes = [
                np.clip(c + s * np.linspace(-1, 1, _ZOOM_POINTS), *b)
                for c, s, b in zip(best, span, bounds, strict=True)
            ]
            best = self._most(np.concatenate([best[None], np.array(list(product(*axes)))]), index)
            span = span * _CLIMB_SHRINK
        return best

    def _most(self, places: Array, index: int) -> Array:
        first, rest = places[:, 0], places[:, 1:]
        good = self.feasible(self.slack(first, rest))
        slack = self._trials.clear(self._space.moves(first, rest), [index]).slack[0]
        return np.asarray(places[int(np.argmax(np.where(good, slack, -np.inf)))])

    def _grid(self, rest: Sequence[tuple[float, float]], count: int) -> Array:
        axes = [np.linspace(low, high, count) if high > low else np.array([low]) for low, high in rest]
        points = list(product(*axes))
        return np.array(points).reshape(len(points), len(rest))

    def _best(
        self, places: Array, value: Callable[[Array, Array], Array], known: tuple[float, Array, float] | None
    ) -> tuple[float, Array, float]:
        """(first, rest, least slack) of the best of some places."""
        first, slack = self._least_first(places, None if known is None or known[2] < 0 else known[0])
        scores = np.where(slack >= 0, value(first, places), np.inf)
        if np.isfinite(scores).any():
            near = scores <= np.min(scores) + 1e-7 * (1 + abs(np.min(scores)))
            k = int(np.flatnonzero(near)[0])
        else:
            k = int(np.argmax(slack))
        return float(first[k]), places[k], float(slack[k])

    def _least_first(self, places: Array, around: float | None) -> tuple[Array, Array]:
        """For each rest the least feasible first coordinate and 0, or the best one and its negative slack."""
        low, high = self._space.first
        count = len(places)
        if around is None:
            start, step = np.full(count, low), (high - low) / (_SCAN - 1)
            first, slack, step = self._look(places, start, step, _SCAN)
        else:
            step = (high - low) / (_SCAN - 1)
            start = np.full(count, np.clip(around - 3 * step, low, high))
            first, slack, step = self._look(places, start, step, _LOCAL)
        for _ in range(4):
            start = np.clip(first - 2 * step, low, high)
            first, slack, step = self._look(places, start, 4 * step / (_LOCAL - 1), _LOCAL)
        return first, slack

    def _look(self, places: Array, start: Array, step: float, count: int) -> tuple[Array, Array, float]:
        """Sample the first coordinate and interpolate: least feasible value, slack there, and the finer step."""
        samples = np.minimum(start[:, None] + step * np.arange(count), self._space.first[1])
        slack = self.slack(samples.reshape(-1), np.repeat(places, count, axis=0)).reshape(-1, len(places), count)
        slack = np.clip(slack, -_FARTHEST, _FARTHEST)  # nothing can be interpolated towards infinity
        grid = np.linspace(0, count - 1, (count - 1) * _FINER + 1)
        base = np.minimum(grid.astype(int), count - 2)
        share = grid - base
        least = np.min(slack[..., base] * (1 - share) + slack[..., base + 1] * share, axis=0)
        fine = samples[:, base] * (1 - share) + samples[:, base + 1] * share
        good = least >= -1e-9
        any_good = good.any(axis=1)
        k = np.where(any_good, np.argmax(good, axis=1), np.argmax(least, axis=1))
        rows = np.arange(len(places))
        return fine[rows, k], np.where(any_good, 0.0, least[rows, k]), step / _FINER

    def _polished(self, best: tuple[float, Array, float]) -> Found:
        """The exact least first coordinate near the best place, on the feasible side."""
        first, rest, _ = best
        low, high = self._space.first
        reach = 1e-6
        while True:
            offsets = np.array([0.0, *(reach * np.array([-1.0, 1.0, 0.1, -0.1]))])
            tried = np.clip(first + offsets, low, high)
            slack = self.slack(tried, np.repeat(rest[None], len(tried), axis=0))
            good = self.feasible(slack)
            if good.any():
                return self._bisected(float(np.min(tried[good])), rest)
            if reach > 0.05:
                k = int(np.argmax(slack.min(axis=0)))
                return Found(np.array([tried[k], *rest]), False, float(slack[:, k].min()))
            reach *= 4.0

    def _bisected(self, good: float, rest: Array) -> Found:
        """Walk down from a feasible place to the end of its interval."""
        low = self._space.first[0]
        reach, bad = 1e-6, None
        while good > low and bad is None and reach < 1.0:
            tried = max(good - reach, low)
            if self._holds_at(tried, rest):
                good = tried
                reach *= 2.0
            else:
                bad = tried
        for _ in range(_BISECTIONS if bad is not None else 0):
            assert bad is not None
            middle = 0.5 * (good + bad)
            if good - bad < 1e-13:
                break
            if self._holds_at(middle, rest):
                good = middle
            else:
                bad = middle
        slack = self.slack(np.array([good]), rest[None])
        return Found(np.array([good, *rest]), True, float(slack.min()))

    def _holds_at(self, first: float, rest: Array) -> bool:
        return bool(self.feasible(self.slack(np.array([first]), rest[None]))[0])
