"""How numbers are worded: told apart, rounded to the side that meets, margins with their sign."""

from __future__ import annotations

import pytest

from worksheet.report import wording


@pytest.mark.parametrize(
    ("value", "side", "digits", "shown"),
    [
        (1.0249e-6, "low", 3, 1.03e-6),
        (1.0669e-6, "high", 3, 1.06e-6),
        (2.1e-6, "low", 3, 2.1e-6),
        (2.1e-6, "high", 3, 2.1e-6),
        (9.996e-6, "low", 3, 1e-5),
        (0.0, "low", 3, 0.0),
    ],
)
def test_an_end_is_rounded_to_the_side_that_meets(value: float, side: str, digits: int, shown: float) -> None:
    assert wording.safe(value, side, digits) == pytest.approx(shown, rel=1e-12, abs=0)


def test_two_numbers_get_the_digits_that_tell_them_apart() -> None:
    assert wording.told_apart("", 4e-6, 5e-6, "A") == ("4 µA", "5 µA")
    assert wording.told_apart("bandwidth", 1.3685489e6, 1.3685491e6, "Hz") == ("1.3685489 MHz", "1.3685491 MHz")
    assert wording.told_apart("", 2.0, 2.0, "V") == ("2 V", "2 V")
    assert wording.told_apart("", 1.02491e-6, 1.1e-6, "m", "low")[0] == "1.025 µm"


@pytest.mark.parametrize(
    ("value", "said"), [(-2e-5, "-0.0%"), (-9e-10, "+0.0%"), (3e-5, "+0.0%"), (-0.021, "-2.1%"), (12.3, "+12x")]
)
def test_a_margin_a_hair_below_zero_keeps_its_sign(value: float, said: str) -> None:
    assert wording.margin(value) == said
