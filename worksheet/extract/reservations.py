"""What a user should know before the numbers are used: guesses, parameters without a number, ranges, correlations."""

from __future__ import annotations

from collections.abc import Iterator

from worksheet.extract.data import Estimate, Extraction, Reading
from worksheet.extract.estimates import OFFSETS
from worksheet.extract.screen import BREAKDOWN, FITTED_RANGE, LEAKAGE, NOISE_FLOOR, SERIES_RESISTANCE
from worksheet.extract.span import Spanned

CLOSE = 0.97
"""Correlation of two parameters' errors from which on it is said. [-]"""


def reservations(
    result: Extraction, found: Spanned, told: tuple[str, ...], *, capped: int, most: float
) -> tuple[str, ...]:
    """Every warning of an extraction, a sentence each.

    Args:
        result: The extraction, all but its warnings.
        found: Its fit.
        told: What was noticed on the way.
        capped: How many recognised rows stay because no more may be left out.
        most: The share of the rows that may be left out. [-]
    """
    return (
        *_about_reading(result.readings),
        *told,
        *_about_parameters(result),
        *_about_range(result, found),
        *_about_share(capped, most),
        *([f"The fit is poor: the current is off by {100 * result.rms_log_error:.0f} % rms."] if result.poor else []),
        *result.limits,
    )


def _about_reading(readings: tuple[Reading, ...]) -> Iterator[str]:
    for one in readings:
        for note in one.notes:
            yield f"{one.file}: {note}"
        if one.kept < one.rows:
            yield f"{one.file}: of {one.rows} rows {one.kept}, drawn at random, were kept for the fit."
        if one.guessed:
            yield f"{one.file}: columns were guessed; confirm them, or state them: {', '.join(one.mapping)}."


def _about_parameters(result: Extraction) -> Iterator[str]:
    found = result.estimates
    for name, one in found.items():
        if one.reason and not (name in OFFSETS and one.value is None):
            yield f"{name}: {one.reason}."
    if found["drain_coupling"].value is None and found["threshold"].value is not None:
        yield "threshold: it holds at the table's drain voltage, drain coupling included."
    if not result.rows.sized:
        yield "specific_current: it is that of the whole device, since width and length are not known."
    for name in OFFSETS:
        if found[name].fitted:
            yield f"{name}: the table's sizes are drawn ones; the channel is {_offset(name, found[name])}."
    for (first, second), value in result.correlations.items():
        if abs(value) > CLOSE:
            yield f"{first} and {second}: their errors are correlated by {value:.3f}; take both or neither."


def _about_range(result: Extraction, found: Spanned) -> Iterator[str]:
    """What rows outside the fitted range mean."""
    reasons = {one.reason for one in result.left_out}
    highest = float(result.rows.source.max())
    if found.highest_source < highest - 1e-3:
        yield (
            "One set of parameters does not follow the source voltage: it was fitted up to "
            f"{found.highest_source:.3g} V of {highest:.3g} V."
        )
    if found.anchor > 1.0:
        yield (
            "One set of parameters follows the source voltage only roughly; rows at zero source voltage, where the "
            f"parameters are stated, count {found.anchor:.0f} times in the residual."
        )
    if SERIES_RESISTANCE in reasons or FITTED_RANGE in reasons:
        span = result.inversion_span
        yield f"Fitted over inversion {span.low:.2g} to {span.high:.2g}; beyond, the law misses the table."


def _about_share(capped: int, most: float) -> Iterator[str]:
    if capped:
        yield (
            f"{capped} more rows look like {NOISE_FLOOR}, {LEAKAGE} or {BREAKDOWN}; they take part, since at most "
            f"{100.0 * most:.0f} % of the rows may be left out."
        )


def _offset(name: str, one: Estimate) -> str:
    """An offset in words."""
    value = one.value or 0.0
    more, less = ("longer", "shorter") if name == "length_offset" else ("narrower", "wider")
    return f"{abs(value):.3g} m {more if value < 0.0 else less} than drawn"
