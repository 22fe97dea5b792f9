"""Verdicts by the contract's rule, written down here a second time and slowly: every condition, one after the other."""

from __future__ import annotations

import datetime
import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from worksheet.engine.measured import Measured
from worksheet.model.metric import Reason
from worksheet.model.sheet import Target, Waiver
from worksheet.review.judge import judge, margins
from worksheet.review.waivers import waived

TODAY = datetime.date(2026, 12, 1)

MISSING = {
    ("feed-through", "min"): "missed",
    ("feed-through", "max"): "missed",
    ("gain below 1", "min"): "missed",
    ("gain below 1", "max"): "met",
    ("unlimited", "min"): "met",
    ("unlimited", "max"): "missed",
}
"""What a number that does not exist means for a target: the table at the end of section 3 of the formula sheet."""


@pytest.mark.parametrize("side", ["min", "max"])
@pytest.mark.parametrize("reason", [reason for reason in Reason if reason is not Reason.NONE])
def test_a_missing_number_means_what_the_table_says(reason: Reason, side: str) -> None:
    target = Target("bandwidth", minimum=1.0 if side == "min" else None, maximum=1.0 if side == "max" else None)
    found = judge(target, Measured(np.array([math.nan]), np.array([reason], dtype=np.int8)), np.array([True]))
    assert found.verdict == MISSING.get((reason.text, side), "unknown")
    if found.verdict != "met":
        assert found.reason == reason.text


@pytest.mark.parametrize("reason", [reason for reason in Reason if reason is not Reason.NONE])
def test_a_figure_over_a_missing_number_is_unknown(reason: Reason) -> None:
    from worksheet.model.formula import parse

    target = Target("figure", minimum=1.0, formula=parse("bandwidth/power"), unit="Hz/W")
    found = judge(target, Measured(np.array([math.nan]), np.array([reason], dtype=np.int8)), np.array([True]))
    assert found.verdict == "unknown"


NUMBERS = st.one_of(
    st.floats(-10, 10),
    st.sampled_from([0.0, 1.0, -1.0, 1.0 + 5e-10, 1.0 - 5e-10, 1.0 + 2e-9, 1.0 - 2e-9, -1.0 - 5e-10, -1.0 + 2e-9]),
    st.none(),
)
LIMITS = st.one_of(st.none(), st.floats(-3, 3), st.sampled_from([0.0, 1.0, -1.0]))


@given(
    points=st.lists(st.tuples(NUMBERS, st.sampled_from(list(Reason)[1:]), st.booleans()), min_size=1, max_size=6),
    minimum=LIMITS,
    maximum=LIMITS,
    guard=st.sampled_from([0.0, 0.1, 0.5]),
)
def test_every_condition_counts_as_the_contract_says(
    points: list[tuple[float | None, Reason, bool]], minimum: float | None, maximum: float | None, guard: float
) -> None:
    if minimum is None and maximum is None:
        minimum = 1.0
    if minimum is not None and maximum is not None and minimum > maximum:
        minimum, maximum = maximum, minimum
    target = Target("bandwidth", minimum, maximum, guard=guard)
    values = np.array([math.nan if value is None else value for value, _, _ in points])
    reasons = np.array([reason if value is None else Reason.NONE for value, reason, _ in points], dtype=np.int8)
    valid = np.array([good for _, _, good in points])
    found = judge(target, Measured(values, reasons), valid)

    each = [_one(value, reason, minimum, maximum, guard) for value, reason, good in points if good]
    if "missed" in each:
        expected = "missed"
    elif "unknown" in each or not valid.all():
        expected = "unknown"
    else:
        expected = "met"
    assert found.verdict == expected
    assert found.invalid == int((~valid).sum())
    if found.worst is None:
        assert not valid.any()
    else:
        assert valid[found.worst]
    if found.worst is not None and all(value is not None for value, _, _ in points):
        margin = margins(target, values)
        if np.isfinite(margin[valid]).all() and minimum != 0 and maximum != 0:
            assert margin[found.worst] == np.min(margin[valid])


def _one(value: float | None, reason: Reason, minimum: float | None, maximum: float | None, guard: float) -> str:
    """One valid condition by itself: guard band beyond the limit, tolerance 1e-9 of it, exact for a limit of 0."""
    said = []
    if minimum is not None:
        limit = minimum + guard * abs(minimum)
        said.append(_side(value, reason, "min", lambda x: x < limit - 1e-9 * abs(limit)))
    if maximum is not None:
        bound = maximum - guard * abs(maximum)
        said.append(_side(value, reason, "max", lambda x: x > bound + 1e-9 * abs(bound)))
    return "missed" if "missed" in said else "unknown" if "unknown" in said else "met"


def _side(value: float | None, reason: Reason, side: str, misses: object) -> str:
    if value is None:
        return MISSING.get((reason.text, side), "unknown")
    assert callable(misses)
    return "missed" if misses(value) else "met"


@pytest.mark.parametrize(
    ("target", "value", "margin"),
    [
        (Target("power", minimum=5.0), 4.7, -0.06),
        (Target("power", maximum=5.0), 4.0, 0.2),
        (Target("power", minimum=2.0, maximum=4.0), 2.5, 0.25),
        (Target("power", minimum=2.0, maximum=4.0), 3.9, 0.025),
        (Target("power", minimum=-2.0), -3.0, -0.5),
        (Target("power", minimum=5.0, guard=0.1), 5.2, 0.04),
        (Target("power", minimum=0.0, maximum=4.0), 3.0, 0.25),
        (Target("power", minimum=0.0), 3.0, None),
    ],
)
def test_margin_is_the_smaller_relative_distance_that_exists(
    target: Target, value: float, margin: float | None
) -> None:
    (found,) = margins(target, np.array([value]))
    assert math.isnan(found) if margin is None else found == pytest.approx(margin)


def waiver(**more: object) -> Waiver:
    return Waiver("bandwidth", "L. Marsh", "second silicon", **more)  # type: ignore[arg-type]


LOW = Target("bandwidth", minimum=5.0)
HIGH = Target("bandwidth", maximum=5.0)
BOTH = Target("bandwidth", minimum=4.0, maximum=6.0)


@pytest.mark.parametrize(
    ("given_waiver", "target", "verdict", "worst", "expected"),
    [
        (waiver(), LOW, "missed", 4.0, "waived"),
        (waiver(), LOW, "unknown", None, "waived"),
        (waiver(), LOW, "met", 6.0, "met"),
        (waiver(value=4.0), LOW, "missed", 4.0, "waived"),
        (waiver(value=4.0), LOW, "missed", 4.0 * (1 - 5e-10), "waived"),
        (waiver(value=4.0), LOW, "missed", 4.0 * (1 - 5e-9), "missed"),
        (waiver(value=4.0), LOW, "missed", 4.5, "waived"),
        (waiver(value=6.0), HIGH, "missed", 5.5, "waived"),
        (waiver(value=6.0), HIGH, "missed", 6.1, "missed"),
        (waiver(value=4.0), LOW, "unknown", None, "unknown"),
        (waiver(value=3.0), BOTH, "missed", 3.5, "waived"),
        (waiver(value=3.0), BOTH, "missed", 2.5, "missed"),
        (waiver(until=TODAY), LOW, "missed", 4.0, "waived"),
        (waiver(until=TODAY - datetime.timedelta(days=1)), LOW, "missed", 4.0, "missed"),
        (waiver(until=TODAY + datetime.timedelta(days=1)), LOW, "missed", 4.0, "waived"),
        (Waiver("power", "L. Marsh", "x"), LOW, "missed", 4.0, "missed"),
    ],
)
def test_a_waiver_holds_to_its_day_and_its_value(
    given_waiver: Waiver, target: Target, verdict: str, worst: float | None, expected: str
) -> None:
    found, reason = waived([given_waiver], target, verdict, worst, TODAY)
    assert found == expected
    if expected == "waived":
        assert reason is not None
        assert "L. Marsh" in reason


def test_any_waiver_that_holds_is_enough() -> None:
    ended = waiver(until=datetime.date(2026, 1, 1))
    assert waived([ended, waiver(value=4.0)], LOW, "missed", 4.5, TODAY)[0] == "waived"
    verdict, reason = waived([ended], LOW, "missed", 4.5, TODAY)
    assert verdict == "missed"
    assert reason == "the waiver by L. Marsh ended on 2026-01-01"
