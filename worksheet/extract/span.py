"""Which rows one set of parameters can follow: the range of inversion and of source voltage that takes part in the fit.

Real devices leave the charge law at both ends: series resistance and falling mobility in strong inversion, a slope that
is not quite constant in deep weak inversion, a body effect that one surface potential does not describe. Rows there
would bend the parameters where designs are made. The widest range is taken that does not make the fit worse between
inversion 0.001 and 10; with data that follow the law that is all of it.
"""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.extract.choose import OPTIONAL, Choice, choose
from worksheet.extract.data import Mask, Rows
from worksheet.extract.law import Reference, log_current, log_specific
from worksheet.extract.screen import FITTED_RANGE, SERIES_RESISTANCE

CORE_LOW, CORE_HIGH = 1e-3, 10.0
"""The inversion in which designs are made and fits are judged. [-]"""

GOOD_AT_ZERO = 0.08
"""rms of ln I up to which a fit at zero source voltage is good. [-]"""

GOOD_OVER_ALL = 0.12
"""rms of ln I up to which a fit over all source voltages is good. [-]"""

CORE_SHARE = 0.15
"""Share of the rows of the core that may be given up for the others."""

NEAR_ZERO = 0.02
"""Source voltage up to which a row counts as at zero. [V]"""

_RANGES = (
    (0.0, np.inf),
    (0.0, 100.0),
    (1e-4, 100.0),
    (1e-3, 100.0),
    (1e-3, 30.0),
    (1e-3, 10.0),
    (2e-3, 30.0),
    (3e-3, 30.0),
)
_FAR = 1.25
_WORSE, _WORSE_BY = 1.10, 0.002
_ANCHORS = (1.0, 2.0, 3.0, 4.0, 5.0)
_TURNS = 3
_LEAST_ROWS = 12
_SEARCHED = 4000


@dataclass(frozen=True, eq=False, slots=True)
class Spanned:
    """A fit and the rows that took part.

    Attributes:
        choice: The fit.
        inside: Rows inside the range, shape (rows,).
        low, high: Range of inversion. [-]
        highest_source: Highest source voltage. [V]
        anchor: Weight of the rows at zero source voltage against the others. [-]
    """

    choice: Choice
    inside: Mask
    low: float
    high: float
    highest_source: float
    anchor: float

    @property
    def values(self) -> Array:
        """The fitted parameters. [see law.NAMES]"""
        return self.choice.solution.values


def inversion(values: Array, rows: Rows, reference: Reference) -> Array:
    """Measured current over fitted specific current. [-], shape (rows,)

    Args:
        values: Parameters. [see law.NAMES]
        rows: The points.
        reference: Where the parameters are stated.
    """
    return np.asarray(rows.current / np.exp(log_specific(values, rows, reference)))


def core_error(values: Array, rows: Rows, reference: Reference) -> float | None:
    """rms of ln(I_fit/I) over inversion 0.001 to 10, None where no row lies there. [-]; see inversion."""
    level = inversion(values, rows, reference)
    core = (level >= CORE_LOW) & (level <= CORE_HIGH)
    if not core.any():
        return None
    some = rows.take(core)
    return float(np.sqrt(np.mean((log_current(values, some, reference) - np.log(some.current)) ** 2)))


def span(
    rows: Rows,
    start: Array,
    reference: Reference,
    *,
    keep: Collection[str] = (),
    most: float = 1.0,
    narrowing: bool = True,
) -> Spanned:
    """Fit over the widest range that one set of parameters follows.

    Args:
        rows: The points that were not screened out, all with a current above 0.
        start: Parameters to start from. [see law.NAMES]
        reference: Where the parameters are stated.
        keep: Reasons that are overruled.
        most: Share of the rows that may be left out for series resistance. [-]
        narrowing: Whether high source voltages may be given up.
    """
    sources = np.unique(np.round(rows.source, 3))
    if len(sources) > 20:  # a sweep of the source, not a few curves: narrowed in steps
        sources = np.quantile(sources, np.linspace(0.05, 1.0, 20))
    found = None
    for highest in sources[::-1]:
        below = np.asarray(rows.source <= highest + 5e-4)
        part = rows.take(below)
        if found is not None and len(part) < _LEAST_ROWS:
            break
        found = _hopeless(part, start, reference, keep, most) or _ranged(part, start, reference, keep, most)
        inside = below.copy()
        inside[below] = found.inside
        found = Spanned(found.choice, inside, found.low, found.high, float(highest), found.anchor)
        error = core_error(found.values, rows.take(inside), reference)
        if not narrowing or FITTED_RANGE in keep or error is None or error <= GOOD_OVER_ALL:
            break
    assert found is not None  # rows are not empty
    return found


def _hopeless(part: Rows, start: Array, reference: Reference, keep: Collection[str], most: float) -> Spanned | None:
    """The fit over the core alone where even that is far from good, so that no range need be looked for; else None."""
    if FITTED_RANGE in keep or SERIES_RESISTANCE in keep or len(part) > _SEARCHED:
        return None
    found = _within(part, start, reference, (CORE_LOW, CORE_HIGH))
    error = core_error(found.values, part.take(found.inside), reference)
    if error is None or error <= _FAR * GOOD_OVER_ALL or np.mean(_above(found, part, reference)) > most:
        return None
    return found


def _ranged(part: Rows, start: Array, reference: Reference, keep: Collection[str], most: float) -> Spanned:
    """The widest range of inversion that leaves the core as good as the narrowest does.

    Where zero source voltage and the others do not come together over all of the core, a little of its weak end is
    given up, at most CORE_SHARE of its rows.
    """
    ranges = [
        one
        for one in _RANGES
        if not (one[0] and FITTED_RANGE in keep) and not (np.isfinite(one[1]) and SERIES_RESISTANCE in keep)
    ]
    some = part
    if len(part) > _SEARCHED:
        draw = np.random.default_rng(0)
        some = part.take(np.sort(draw.choice(len(part), _SEARCHED, replace=False)))
    trials = [_within(some, start, reference, one) for one in ranges if one[0] <= CORE_LOW]
    trials = [one for one in trials if np.mean(_above(one, some, reference)) <= most] or trials[:1]
    best = _errors(trials[-1], some, reference)
    place = 0
    if best is not None:
        place = next(
            (
                place
                for place, trial in enumerate(trials)
                if (errors := _errors(trial, some, reference)) is not None
                and all(a <= _WORSE * b + _WORSE_BY for a, b in zip(errors, best, strict=True))
            ),
            len(trials) - 1,
        )
    first = _anchored(some, trials[place], reference)
    chosen = first
    if not _good(first, some, reference):
        narrower = [
            *trials[place + 1 :],
            *(_within(some, first.values, reference, one) for one in ranges if one[0] > CORE_LOW),
        ]
        for trial in narrower:
            core = _core(trial, some, reference)
            if np.count_nonzero(core & ~trial.inside) > CORE_SHARE * np.count_nonzero(core):
                continue
            if np.mean(_above(trial, some, reference)) > most:
                continue
            anchored = _anchored(some, trial, reference)
            if _good(anchored, some, reference):
                chosen = anchored
                break
    if some is part:
        return chosen
    return _anchored(part, _within(part, chosen.values, reference, (chosen.low, chosen.high)), reference)


def _above(found: Spanned, rows: Rows, reference: Reference) -> Mask:
    """Rows above the range of inversion."""
    return np.asarray(inversion(found.values, rows, reference) > found.high)


def _core(found: Spanned, rows: Rows, reference: Reference) -> Mask:
    """Rows in the core."""
    level = inversion(found.values, rows, reference)
    return np.asarray((level >= CORE_LOW) & (level <= CORE_HIGH))


def _good(found: Spanned, rows: Rows, reference: Reference) -> bool:
    """Whether the fit is good in the core, at zero source voltage and over all; so it is where nothing can be said."""
    inside = rows.take(found.inside)
    over_all = core_error(found.values, inside, reference)
    zero = core_error(found.values, inside.take(np.abs(inside.source) <= NEAR_ZERO), reference)
    return (over_all is None or over_all <= GOOD_OVER_ALL) and (zero is None or zero <= GOOD_AT_ZERO)


def _errors(found: Spanned, rows: Rows, reference: Reference) -> tuple[float, float] | None:
    """Core error over all rows and at the lowest source voltage; None where there are too few."""
    values = found.values
    level = inversion(values, rows, reference)
    core = (level >= CORE_LOW) & (level <= CORE_HIGH)
    if np.count_nonzero(core) < _LEAST_ROWS:
        return None
    lowest = rows.take(core & (rows.source <= rows.source.min() + NEAR_ZERO))
    over_all, at_lowest = core_error(values, rows, reference), core_error(values, lowest, reference)
    return None if over_all is None else (over_all, over_all if at_lowest is None else at_lowest)


def _within(part: Rows, start: Array, reference: Reference, bounds: tuple[float, float]) -> Spanned:
    """The fit over one range of inversion, which moves a little with the specific current it is measured by."""
    low, high = bounds
    values, inside = start, np.ones(len(part), dtype=bool)
    choice = None
    for turn in range(_TURNS):
        if bounds != (0.0, np.inf):
            level = inversion(values, part, reference)
            now = np.asarray((level >= low) & (level <= high))
            if np.count_nonzero(now) < _LEAST_ROWS:
                now = np.ones(len(part), dtype=bool)
            if choice is not None and np.array_equal(now, inside):
                break
            inside = now
        elif turn:
            break
        choice = choose(part.take(inside), values, reference)
        values = choice.solution.values
    assert choice is not None  # the first turn makes one
    return Spanned(choice, inside, low, high, float(part.source.max()), 1.0)


def _anchored(part: Rows, found: Spanned, reference: Reference) -> Spanned:
    """The fit with rows at zero source voltage weighted up, where the parameters, which are stated there, need it.

    Only where one set of parameters does not follow every source voltage, and only as far as the error over all stays
    good.
    """
    inside = part.take(found.inside)
    at_zero = np.asarray(np.abs(inside.source) <= NEAR_ZERO)
    if not at_zero.any() or at_zero.all():
        return found
    offered = tuple(one for one in OPTIONAL if one in found.choice.solution.free)
    best = found
    for anchor in _ANCHORS:
        trial = found
        if anchor > 1.0:
            weights = np.where(at_zero, anchor, 1.0)
            weights = weights / np.sqrt(np.mean(weights**2))
            choice = choose(inside, best.values, reference, weights=weights, offered=offered)
            reasons = {**choice.reasons, **_unoffered(found.choice.reasons, offered)}
            choice = Choice(choice.solution, reasons, found.choice.tried | choice.tried)
            trial = Spanned(choice, found.inside, found.low, found.high, found.highest_source, anchor)
        over_all = core_error(trial.values, inside, reference)
        zero = core_error(trial.values, inside.take(at_zero), reference)
        if over_all is None or zero is None or over_all > GOOD_OVER_ALL:
            break
        best = trial
        if zero <= GOOD_AT_ZERO:
            break
    return best


def _unoffered(reasons: dict[str, str], offered: tuple[str, ...]) -> dict[str, str]:
    """The reasons of the parameters that were not offered again."""
    return {name: reason for name, reason in reasons.items() if name not in offered}
