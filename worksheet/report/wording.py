"""How numbers, limits, conditions and verdicts are worded, the same in every format."""

from __future__ import annotations

import math
from functools import lru_cache

from worksheet.model import metrics
from worksheet.model.dimension import DIMENSIONS, TEMPERATURE, VOLTAGE, Dimension
from worksheet.model.quantity import format_quantity
from worksheet.model.sheet import TOLERANCE, Condition, Target
from worksheet.model.units import UnitError, parse_unit

STANDING = (
    "First-order hand calculation, to be confirmed with the foundry's qualified models and the design's own sign-off."
)
"""What every report says of its numbers."""

CAUTION = (
    "A voltage past max_voltage endangers the device: the foundry's reliability rules, local codes and licensed "
    "practice have the last word."
)
"""Said wherever a rating is passed."""

NO_VOLTAGE = 1e-13
"""Differences of voltages below this are rounding. [V]"""

_USUAL_DIGITS, _MORE_DIGITS = 4, (6, 8, 10, 12)
_DUST = 1e-6
"""Of the last digit shown: nearer to it than this, an end is that number."""


def number(value: float | None, unit: str, reason: str | None = None, digits: int = 4) -> str:
    """A number with its unit in engineering notation, or why there is none.

    Args:
        value: In SI base units.
        unit: SI, or as an own name was written ("pF"); the number is then shown in what that stands for.
        reason: Why there is no number.
        digits: Significant digits.
    """
    if value is None:
        return reason or "-"
    unit = _base(unit)
    dimension = _dimension(unit)
    if dimension is not None:
        return format_quantity(value, dimension, digits)
    return f"{value:.{digits}g} {unit}".rstrip()


@lru_cache(maxsize=256)
def _base(unit: str) -> str:
    """The SI unit behind a written one; a word of the user's own stays."""
    try:
        return parse_unit(unit).base if unit else ""
    except UnitError:
        return unit


def _dimension(unit: str) -> Dimension | None:
    return next((d for d in DIMENSIONS if d.unit == unit), None)


def metric_number(key: str, value: float | None, unit: str, reason: str | None = None, digits: int = 4) -> str:
    """As number, with the dimension that the metric is described with."""
    metric = metrics.find(key)
    if value is None or metric is None:
        return number(value, unit, reason, digits)
    return format_quantity(value, metric.dimension, digits)


def told_apart(key: str, old: float | None, new: float | None, unit: str, side: str = "") -> tuple[str, str]:
    """Two numbers of a metric, or of anything else with a unit, with as many digits as it takes to tell them apart.

    Args:
        key: The metric; "" for anything else.
        old, new: In SI base units, None where there is none.
        unit: See number.
        side: "low" or "high" for ends of what is needed, which are rounded to be safe.
    """

    def texts(digits: int) -> tuple[str, str]:
        ends = (x if x is None or not side else safe(x, side, digits) for x in (old, new))
        first, second = (metric_number(key, x, unit, digits=digits) for x in ends)
        return first, second

    found = texts(_USUAL_DIGITS)
    for digits in _MORE_DIGITS:
        if old == new or found[0] != found[1]:
            break
        found = texts(digits)
    return found


def safe(value: float, side: str, digits: int = 4) -> float:
    """An end of what is needed, rounded so that what is shown still meets.

    Args:
        value: The end. [its unit]
        side: "low" for what must at least be, rounded up; "high" for what may at most be, rounded down.
        digits: Significant digits.
    """
    if value == 0 or not math.isfinite(value):
        return value
    unit = 10.0 ** (math.floor(math.log10(abs(value))) - digits + 1)
    share = value / unit
    whole = math.ceil(share - _DUST) if side == "low" else math.floor(share + _DUST)
    return float(f"{whole * unit:.{digits - 1}e}")


def limits(target: Target, unit: str) -> str:
    """What a target wants: "≥ 5 MHz", "0.65 to 1 V/V" (the unit once where both ends share it), with its guard band."""
    low = None if target.minimum is None else metric_number(target.name, target.minimum, unit)
    high = None if target.maximum is None else metric_number(target.name, target.maximum, unit)
    if low and high:
        number_low, _, unit_low = low.partition(" ")
        text = f"{number_low if unit_low == high.partition(' ')[2] else low} to {high}"
    else:
        text = f"≥ {low}" if low else f"≤ {high}"
    return f"{text} +{target.guard:.0%}" if target.guard else text


def condition(at: Condition | None) -> str:
    """A condition: "slow 125 °C 1.62 V"."""
    if at is None:
        return "-"
    return f"{at.process} {format_quantity(at.temperature, TEMPERATURE)} {format_quantity(at.supply, VOLTAGE)}"


def bound_place(at: Condition | None, edge: bool, valid: bool) -> str:
    """Where a bound binds, and what else is to be known of the place."""
    ends = ", where the metric ends" if edge else ""
    beyond = "" if valid else ", beyond what saturation or ratings allow"
    return f"{condition(at)}{ends}{beyond}"


def margin(value: float | None) -> str:
    """A relative margin with its sign."""
    if value is None:
        return "-"
    if abs(value) < 5e-4:
        return "-0.0%" if value < -TOLERANCE else "+0.0%"
    if abs(value) < 1:
        return f"{value:+.1%}"
    return f"{value:+.0%}" if abs(value) < 10 else f"{value:+.0f}x"
