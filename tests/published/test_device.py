"""Published values of the device layer. Each check names where its number was printed.

Sources by short name:
    CODATA 2018: exact constants k and q.
    EKV v2.6: M. Bucher et al., "The EPFL-EKV MOSFET model equations for simulation, version 2.6", EPFL, 1998.
    Enz 1995: C. C. Enz, F. Krummenacher, E. A. Vittoz, Analog Integrated Circuits and Signal Processing 8, 83-114.
    Enz, OTA report 2025, and Enz, follower report 2026: design reports with worked numbers.
    Enz 2017: C. Enz, F. Chicco, A. Pezzotta, IEEE Solid-State Circuits Magazine 9(3), 26-35.
    Pelgrom 1989: M. J. M. Pelgrom et al., IEEE J. Solid-State Circuits 24, 1433-1439.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from worksheet.device.charge import (
    charge_from_drive,
    charge_from_inversion,
    drive_from_charge,
    inversion_from_charge,
    slope_factor,
)
from worksheet.device.constants import BOLTZMANN, ELEMENTARY_CHARGE, thermal_voltage
from worksheet.device.mismatch import threshold_deviation
from worksheet.device.noise import white_factor
from worksheet.device.transistor import saturation_voltage


def test_constants_are_those_of_codata_2018() -> None:
    assert BOLTZMANN == 1.380649e-23
    assert ELEMENTARY_CHARGE == 1.602176634e-19


def test_constants_agree_with_a_reference_library() -> None:
    """scipy.constants carries the CODATA tables."""
    constants = pytest.importorskip("scipy.constants")
    assert constants.k == BOLTZMANN
    assert constants.e == ELEMENTARY_CHARGE


@pytest.mark.parametrize(("temperature", "millivolts"), [(298.15, 25.6926), (300.0, 25.8520), (300.15, 25.8649)])
def test_thermal_voltage(temperature: float, millivolts: float) -> None:
    """kT/q from the exact constants, to the six digits printed in tables."""
    assert float(thermal_voltage(temperature)) == pytest.approx(millivolts * 1e-3, rel=2e-6)


def test_weak_inversion_slope_at_300_k_is_59_5_mv_per_decade() -> None:
    """ln(10) kT/q, kappa 1: the textbook limit of 59.53 mV per decade."""
    low, high = (float(drive_from_charge(charge_from_inversion(i))) for i in (1e-7, 1e-6))
    assert (high - low) * float(thermal_voltage(300.0)) == pytest.approx(59.53e-3, rel=2e-4)


@pytest.mark.parametrize(
    ("inversion", "slope"), [(0.01, 0.990195), (0.1, 0.916080), (1, 0.618034), (10, 0.270156), (100, 0.0951249)]
)
def test_slope_over_inversion(inversion: float, slope: float) -> None:
    """EKV v2.6 eq. 40, evaluated: normalised transconductance over current."""
    assert float(slope_factor(inversion)) == pytest.approx(slope, rel=1e-6)


@pytest.mark.parametrize(("inversion", "slope"), [(2.0, 1 / 2), (0.75, 2 / 3)])
def test_slope_is_a_plain_fraction_where_the_root_is_whole(inversion: float, slope: float) -> None:
    """EKV v2.6 eq. 40: exact values."""
    assert float(slope_factor(inversion)) == pytest.approx(slope, rel=1e-15)


def test_slope_stays_near_the_interpolation_of_1995() -> None:
    """Enz 1995 eq. 39, 1/sqrt(IC + sqrt(IC)/2 + 1): it differs from the charge form by at most 4.4 % of itself."""
    inversion = np.logspace(-6, 6, 2401)
    early = 1 / np.sqrt(inversion + np.sqrt(inversion) / 2 + 1)
    furthest = np.max(np.abs(np.asarray(slope_factor(inversion)) - early) / early)
    assert furthest == pytest.approx(0.044, abs=0.0005)
    of_slope = np.max(np.abs(np.asarray(slope_factor(inversion)) - early) / np.asarray(slope_factor(inversion)))
    assert of_slope == pytest.approx(0.046, abs=0.0005)


def test_slope_with_velocity_saturation_at_a_whole_point() -> None:
    """Enz 2017 (form from memory): lambda_c 0.5 at IC 1 gives 6/11 exactly."""
    assert float(slope_factor(1.0, 0.5)) == pytest.approx(6 / 11, rel=1e-15)


def test_drive_is_zero_at_inversion_0_608() -> None:
    """Enz, OTA report 2025, after eq. 2.6: the threshold convention of this model."""
    charge = charge_from_drive(0.0)
    assert float(inversion_from_charge(charge)) == pytest.approx(0.608, abs=0.0005)


def test_drive_at_inversion_0_1() -> None:
    """Enz, OTA report 2025, after eq. 2.6: -2.207."""
    assert float(drive_from_charge(charge_from_inversion(0.1))) == pytest.approx(-2.207, abs=0.0005)


@pytest.mark.parametrize(
    ("inversion", "factor"), [(0.1, 0.653), (0.269, 0.674), (1.0, 0.717), (10.0, 0.790), (20.0, 0.805)]
)
def test_noise_factor_over_inversion(inversion: float, factor: float) -> None:
    """Enz, OTA report 2025 and follower report 2026: n gamma for n = 1.27136."""
    found = 1.27136 * float(white_factor(charge_from_inversion(inversion)))
    assert found == pytest.approx(factor, abs=0.00055)


def test_noise_factor_ends_at_shot_noise_and_at_two_thirds() -> None:
    """van der Ziel's two thirds in strong inversion; 2 q I in weak: one half of 4 k T g_s (textbook limits)."""
    assert float(white_factor(charge_from_inversion(1e-9))) == pytest.approx(1 / 2, rel=1e-8)
    assert float(white_factor(charge_from_inversion(1e12))) == pytest.approx(2 / 3, rel=1e-5)


def test_saturation_voltage_at_inversion_0_1() -> None:
    """Three published forms give 120, 108 and 105 mV; this model's, U_T (2 sqrt(IC + 1/4) + 3), is the 108."""
    assert float(saturation_voltage(0.1, 25.865e-3)) == pytest.approx(108e-3, abs=0.5e-3)


def test_saturation_voltage_in_strong_inversion_is_the_square_law_overdrive() -> None:
    """Textbook limit: V_DSsat -> V_GS - V_T = 2 U_T sqrt(IC) at n 1."""
    assert float(saturation_voltage(1e6, 1e-3)) == pytest.approx(2.0, rel=2e-3)


def test_threshold_mismatch_of_a_pair() -> None:
    """Pelgrom 1989; 5 mV um, a 12.55/3.59 um pair: 0.7449 mV."""
    assert float(threshold_deviation(5e-9, 12.55e-6, 3.59e-6)) == pytest.approx(0.7449e-3, rel=1e-4)


def test_threshold_mismatch_goes_with_one_over_the_root_of_area() -> None:
    """Pelgrom 1989: four times the area halves the deviation, whichever side grows."""
    whole = float(threshold_deviation(4e-9, 2e-6, 3e-6))
    assert float(threshold_deviation(4e-9, 8e-6, 3e-6)) == pytest.approx(whole / 2, rel=1e-14)
    assert float(threshold_deviation(4e-9, 4e-6, 6e-6)) == pytest.approx(whole / 2, rel=1e-14)
    assert whole == pytest.approx(4e-9 / math.sqrt(6e-12), rel=1e-14)
