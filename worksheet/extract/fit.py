"""Least squares of ln I_D with a robust loss, exact slopes, and the covariance that goes with it.

Here belongs the minimisation for a given set of free parameters; which parameters earn their place is decided in
choose, which rows take part in span. scipy is imported inside `minimise` alone.

Errors: the covariance is that of Huber's estimator, scaled by the residuals themselves. Where residuals of neighbours
on a curve hang together the law misses the curve's shape, and so many points tell less than as many independent ones;
the covariance is then widened by (1 + r)/(1 - r), r the correlation of neighbours.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.extract.data import Index, Rows
from worksheet.extract.law import AT, NAMES, OFF, Reference, log_current_and_slopes, sizes

HUBER = 2.0
"""Residuals beyond this many standard deviations count linearly."""

_FIRST_LOSS = 0.1
_LEAST_SCALE = 1e-9
_ROUNDS, _MOST_STEPS = 3, 50
_RANK = 1e-7
_NORMAL_MAD = 1.4826


@dataclass(frozen=True, eq=False, slots=True)
class Solution:
    """The minimum for one set of free parameters.

    Attributes:
        values: Parameters in the order of law.NAMES. [see law.NAMES]
        free: Which of them were free.
        covariance: Of the free ones, in their order, shape (free, free).
        residuals: ln I_fit - ln I of every row, shape (rows,).
        scale: Standard deviation of the residuals, robust. [-]
        independent: How many independent points the rows are worth.
        undetermined: Free parameters that some direction of the data leaves open.
    """

    values: Array
    free: tuple[str, ...]
    covariance: Array
    residuals: Array
    scale: float
    independent: float
    undetermined: frozenset[str]

    def value(self, name: str) -> float:
        """One parameter. [see law.NAMES]"""
        return float(self.values[AT[name]])

    def error(self, name: str) -> float | None:
        """Standard error of a parameter, None where it was not free. [unit of the parameter]"""
        if name not in self.free:
            return None
        place = self.free.index(name)
        return float(np.sqrt(max(self.covariance[place, place], 0.0)))


def minimise(
    rows: Rows,
    start: Array,
    free: tuple[str, ...],
    reference: Reference,
    *,
    weights: Array | None = None,
    neighbours: Index | None = None,
) -> Solution:
    """Fit the free parameters.

    Args:
        rows: The points, all with a current above 0.
        start: Parameters in the order of NAMES to start from; those that are not free stay. [see law.NAMES]
        free: Names of the free ones.
        reference: Where the parameters are stated.
        weights: Of the residuals. [-], shape (rows,); None for 1
        neighbours: Rows in the order of their curves, for the correlation of neighbours; None to take them as they are.

    Returns: the minimum.
    """
    from scipy.optimize import least_squares

    places = [AT[name] for name in free]
    unit, low, high = _box(rows)
    unit, low, high = unit[places], low[places], high[places]
    measured = np.log(rows.current)
    weight = np.ones(len(rows)) if weights is None else weights

    def evaluate(scaled: Array) -> tuple[Array, Array]:
        values = start.copy()
        values[places] = scaled * unit
        level, slopes = log_current_and_slopes(values, rows, reference)
        return (level - measured) * weight, slopes[:, places] * unit * weight[:, None]

    memory = _Memory(evaluate)
    point = np.clip(start[places] / unit, low / unit + 1e-12, high / unit - 1e-12)
    scale = _FIRST_LOSS / HUBER
    for turn in range(_ROUNDS):
        found = least_squares(
            memory.residuals,
            point,
            jac=memory.slopes,
            bounds=(low / unit, high / unit),
            loss="soft_l1" if turn == 0 else "huber",
            f_scale=_FIRST_LOSS if turn == 0 else HUBER * scale,
            ftol=1e-10,
            xtol=1e-10,
            gtol=1e-10,
            max_nfev=_MOST_STEPS,
        )
        point = np.asarray(found.x, dtype=np.float64)
        scale = _scale(memory.residuals(point), len(free))
    values = start.copy()
    values[places] = point * unit
    return _solution(values, free, memory, point, unit, weight, scale, neighbours)


class _Memory:
    """The last evaluation, so that residuals and slopes at one point cost one."""

    def __init__(self, evaluate: object) -> None:
        self._evaluate = evaluate
        self._at: Array | None = None
        self._last: tuple[Array, Array] = (np.empty(0), np.empty((0, 0)))

    def residuals(self, point: Array) -> Array:
        """Weighted residuals. [-], shape (rows,)"""
        return self._look(point)[0]

    def slopes(self, point: Array) -> Array:
        """Their derivatives, shape (rows, free)."""
        return self._look(point)[1]

    def _look(self, point: Array) -> tuple[Array, Array]:
        if self._at is None or not np.array_equal(self._at, point):
            self._last = self._evaluate(point)  # type: ignore[operator]
            self._at = point.copy()
        return self._last


def _solution(
    values: Array,
    free: tuple[str, ...],
    memory: _Memory,
    point: Array,
    unit: Array,
    weight: Array,
    scale: float,
    neighbours: Index | None,
) -> Solution:
    """Covariance and the rest at the minimum."""
    residuals, slopes = memory.residuals(point), memory.slopes(point)
    count, width = slopes.shape
    bent = np.clip(residuals / scale, -HUBER, HUBER)
    straight = max(float(np.mean(np.abs(residuals) <= HUBER * scale)), 0.05)
    variance = scale**2 * float(np.sum(bent**2)) / max(count - width, 1) / straight**2
    inverse, undetermined = _inverse(slopes, free)
    widened = _widening(residuals, neighbours)
    covariance = inverse * variance * widened * np.outer(unit, unit)
    return Solution(
        values=values,
        free=free,
        covariance=covariance,
        residuals=residuals / weight,
        scale=scale,
        independent=max(count / widened, width + 2.0),
        undetermined=undetermined,
    )


def _inverse(slopes: Array, free: tuple[str, ...]) -> tuple[Array, frozenset[str]]:
    """(J^T J)^-1 on the directions that the data fix, and the parameters that lie in one that they do not."""
    if not free:
        return np.empty((0, 0)), frozenset()
    size = np.maximum(np.linalg.norm(slopes, axis=0), 1e-300)
    _, singular, directions = np.linalg.svd(slopes / size, full_matrices=False)
    sound = singular > _RANK * singular[0]
    loose = np.abs(directions[~sound]).max(axis=0, initial=0.0) > 1e-3
    loose |= size < 1e-200
    kept = directions[sound] / singular[sound][:, None]
    inverse = kept.T @ kept / np.outer(size, size)
    return inverse, frozenset(name for name, open_end in zip(free, loose, strict=True) if open_end)


def _scale(residuals: Array, width: int) -> float:
    """Standard deviation of residuals from their median absolute value, or from all where few stand out."""
    count = max(len(residuals) - width, 1)
    freedom = np.sqrt(len(residuals) / count)
    middle = _NORMAL_MAD * float(np.median(np.abs(residuals))) * freedom
    clipped = np.clip(residuals, -3.0 * middle, 3.0 * middle)
    return max(float(np.sqrt(np.sum(clipped**2) / count)), _LEAST_SCALE)


def _widening(residuals: Array, neighbours: Index | None) -> float:
    """(1 + r)/(1 - r) of the correlation of neighbours, 1 where it is no more than chance."""
    count = len(residuals)
    if count < 20:
        return 1.0
    chain = residuals if neighbours is None else residuals[neighbours]
    chain = chain - np.mean(chain)
    power = float(np.sum(chain**2))
    if power <= 0.0:
        return 1.0
    together = float(np.sum(chain[1:] * chain[:-1])) / power
    if together < 3.0 / np.sqrt(count):
        return 1.0
    together = min(together, 0.95)
    return (1.0 + together) / (1.0 - together)


def _box(rows: Rows) -> tuple[Array, Array, Array]:
    """Typical size, least and greatest value of every parameter for these rows. [see law.NAMES], shape (names,) each"""
    width, length = sizes(rows)
    short, narrow = float(length.min()), float(width.min())
    deepest = max(float(np.max(np.abs(rows.drain))), 1e-3)
    table = {
        "kappa": (0.05, 0.05, 1.0),
        "threshold": (0.05, -10.0, 20.0),
        "log_current": (0.3, -80.0, 30.0),
        "drain_coupling": (0.01, -0.2, 0.9),
        "inverse_potential": (0.5, -0.5 / deepest, 50.0),
        "length_modulation": (0.05 * short, -0.1 * short, 5.0 * short),
        "velocity_length": (0.1 * short, 0.0, 10.0 * short),
        "drain_coupling_exponent": (0.3, -4.0, 6.0),
        "threshold_drift": (5e-4, -0.02, 0.02),
        "mobility_exponent": (0.3, -5.0, 8.0),
        "length_offset": (0.02 * short, -0.5 * short, 0.5 * short),
        "width_offset": (0.02 * narrow, -0.5 * narrow, 0.5 * narrow),
    }
    stacked = np.array([table[name] for name in NAMES])
    return stacked[:, 0], stacked[:, 1], stacked[:, 2]


def starting(rows: Rows, reference: Reference) -> Array:
    """Values to start from, from the physics: the slope of weak inversion and the current where it ends.

    Args:
        rows: The points, all with a current above 0.
        reference: Where the parameters are stated.
    Returns: parameters in the order of NAMES, optional ones off. [see law.NAMES]

    For each of a few kappa and specific currents the threshold follows from the rows through u = 2 q + ln q; the set
    that comes nearest to the table, in the mean absolute error of ln I, is taken.
    """
    some = rows.take(_spread_out(rows, 1500))
    width, length = sizes(some)
    measured = np.log(some.current)
    per_square = measured - np.log(width / length)
    best, least = OFF.copy(), np.inf
    for kappa in (0.65, 0.75, 0.85):
        for level in np.arange(float(per_square.max()) - 14.0, float(per_square.max()) + 4.0):
            values = OFF.copy()
            values[AT["kappa"]], values[AT["log_current"]], values[AT["drain_coupling"]] = kappa, level, 0.01
            values[AT["threshold"]] = _threshold(some, np.exp(per_square - level), kappa)
            missed = np.abs(log_current_and_slopes(values, some, reference)[0] - measured)
            error = float(np.mean(np.minimum(missed, 5.0)))
            if error < least:
                best, least = values, error
    return best


def _threshold(rows: Rows, inversion: Array, kappa: float) -> float:
    """Median threshold of the rows at a given kappa and inversion, as if all were saturated. [V]"""
    q = 0.5 * (np.sqrt(1.0 + 4.0 * inversion) - 1.0)
    drive = 2.0 * q + np.log(np.maximum(q, 1e-30))
    away = 1.0 - np.exp(-rows.across / rows.thermal)
    drive = drive - np.where(inversion < 1.0, np.log(np.maximum(away, 1e-9)), 0.0)
    each = rows.gate - (rows.source + rows.thermal * drive) / kappa
    middle = (inversion > 1e-2) & (inversion < 10.0)
    return float(np.median(each[middle])) if middle.any() else float(np.median(each))


def _spread_out(rows: Rows, most: int) -> Index:
    """At most so many rows, evenly over the currents."""
    order = np.argsort(rows.current, kind="stable")
    return order if len(order) <= most else order[np.linspace(0, len(order) - 1, most).astype(np.intp)]
