"""The device layer against values computed at 60 digits (cases_device.json, made by make_cases.py).

IC from 1e-9 to 1e6 and drives from -700 to 1e6. Tolerances are a few units in the last place of what the argument
itself allows: q(u) turns a rounding of u by abs(u) 1e-16 into a relative one of q.
"""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from worksheet.device import charge, noise

CASES = json.loads((Path(__file__).parent / "cases_device.json").read_text(encoding="utf-8"))
ULP = 2.220446049250313e-16


@pytest.mark.parametrize(("u", "q"), CASES["charge_from_drive"])
def test_charge_from_drive(u: float, q: float) -> None:
    assert float(charge.charge_from_drive(u)) == pytest.approx(q, rel=ULP * (8 + abs(u) / (1 + 2 * q)), abs=0)


@pytest.mark.parametrize(("q", "u"), CASES["drive_from_charge"])
def test_drive_from_charge(q: float, u: float) -> None:
    # Near u = 0 the two terms cancel: the bound is absolute, of their size.
    assert float(charge.drive_from_charge(q)) == pytest.approx(u, rel=0, abs=4 * ULP * (2 * q + abs(u - 2 * q)))


@pytest.mark.parametrize(("i", "velocity", "q"), CASES["charge_from_inversion"])
def test_charge_from_inversion(i: float, velocity: float, q: float) -> None:
    assert float(charge.charge_from_inversion(i, velocity)) == pytest.approx(q, rel=16 * ULP, abs=0)


@pytest.mark.parametrize(("q", "velocity", "i"), CASES["inversion_from_charge"])
def test_inversion_from_charge(q: float, velocity: float, i: float) -> None:
    assert float(charge.inversion_from_charge(q, velocity)) == pytest.approx(i, rel=16 * ULP, abs=0)


@pytest.mark.parametrize(("i", "velocity", "wanted"), CASES["slope_factor"])
def test_slope_factor(i: float, velocity: float, wanted: float) -> None:
    assert float(charge.slope_factor(i, velocity)) == pytest.approx(wanted, rel=16 * ULP, abs=0)


@pytest.mark.parametrize(("q", "wanted"), CASES["white_factor"])
def test_white_factor(q: float, wanted: float) -> None:
    assert float(noise.white_factor(q)) == pytest.approx(wanted, rel=8 * ULP, abs=0)


def test_whole_arrays_give_what_single_values_give() -> None:
    rows = np.array(CASES["slope_factor"])
    found = np.asarray(charge.slope_factor(rows[:, 0], rows[:, 1]))
    np.testing.assert_allclose(found, rows[:, 2], rtol=16 * ULP)
    rows = np.array(CASES["charge_from_drive"])
    found = np.asarray(charge.charge_from_drive(rows[:, 0]))
    np.testing.assert_allclose(found, rows[:, 1], rtol=1e-12)


def test_limits_of_the_slope() -> None:
    """G -> 1 in weak inversion; 1/(lambda_c i) in strong inversion with velocity saturation."""
    assert float(charge.slope_factor(1e-15)) == pytest.approx(1.0, rel=1e-14)
    assert float(charge.slope_factor(1e9, 0.5)) == pytest.approx(1 / (0.5 * 1e9), rel=1e-8)
