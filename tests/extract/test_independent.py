"""The tests' own law against mpmath's Lambert W and published limits, so that it can judge the package's."""

import mpmath
import numpy as np
import pytest

from tests.extract.independent import Device, charge, current, grid, inversion


@pytest.mark.parametrize("u", [-40.0, -5.0, 0.0, 1.0, 30.0, 400.0])
def test_charge_is_lambert_w(u: float) -> None:
    with mpmath.workdps(40):
        exact = mpmath.lambertw(2 * mpmath.e**u) / 2
    assert charge(np.array([u]))[0] == pytest.approx(float(exact), rel=1e-13)


def test_inversion_at_zero_drive() -> None:
    """i = 0.608 at u = 0 (Enz, OTA design report, 2025, after eq. 2.6; from checks.md)."""
    assert inversion(charge(np.zeros(1)), 0.0)[0] == pytest.approx(0.608, abs=5e-4)


def test_velocity_saturation_at_one() -> None:
    """lambda_c = 0.5 and i = 1 belong to q = (sqrt(1.5^2 + 4) - 1)/2 (Enz, Chicco and Pezzotta 2017)."""
    q = (np.sqrt(6.25) - 1) / 2
    assert inversion(np.array([q]), 0.5)[0] == pytest.approx(1.0, rel=1e-14)


def test_weak_inversion_slope() -> None:
    """ln(10) n kT/q per decade: 59.53 mV at 300 K and kappa 1 (from k and q)."""
    at = grid(np.array([-0.2, -0.1]), vds=(1.0,))
    low, high = current(Device(kappa=0.75), at)
    assert 0.1 / np.log10(high / low) == pytest.approx(59.53e-3 / 0.75, rel=1e-3)
