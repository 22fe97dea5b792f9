"""The device's law against its own slopes, its inverses and its limits."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.special import lambertw

from worksheet.device import bulk, charge, mismatch, transistor
from worksheet.device.constants import thermal_voltage
from worksheet.device.parameters import Parameters

THERMAL = float(thermal_voltage(300.0))

DEVICE = Parameters(
    kappa=0.72,
    threshold=0.42,
    specific_current=5e-7,
    drain_coupling=0.015,
    length_modulation=0.0,
    surface_potential=0.0,
    velocity=0.0,
    gate_capacitance=8e-3,
    overlap_capacitance=3e-10,
    junction_capacitance=8e-10,
    flicker=3e-24,
    flicker_exponent=1.0,
    matching_threshold=4e-9,
    matching_factor=1e-8,
    max_voltage=1.98,
    width=10e-6,
    length=1e-6,
)
BODY = dataclasses.replace(DEVICE, surface_potential=0.8)

voltages = st.floats(0.0, 1.5)


def current(gate: float, source: float, drain: float) -> float:
    return float(transistor.drain_current(DEVICE, gate, source, drain, THERMAL))


@given(gate=voltages, source=st.floats(0.0, 0.6), drain=st.floats(0.0, 0.6))
def test_slopes_out_of_saturation_are_the_law_s_own(gate: float, source: float, drain: float) -> None:
    pinch = DEVICE.kappa * (gate - DEVICE.threshold)
    forward = charge.charge_from_drive((pinch - source + DEVICE.drain_coupling * drain) / THERMAL)
    reverse = charge.charge_from_drive((pinch - drain + DEVICE.drain_coupling * source) / THERMAL)
    g_m, g_s, g_d = transistor.triode_conductances(DEVICE, forward, reverse, THERMAL)
    step = 1e-6
    scale = float(g_s + g_d) + 1e-18
    by_gate = (current(gate + step, source, drain) - current(gate - step, source, drain)) / (2 * step)
    by_source = (current(gate, source + step, drain) - current(gate, source - step, drain)) / (2 * step)
    by_drain = (current(gate, source, drain + step) - current(gate, source, drain - step)) / (2 * step)
    assert float(g_m) == pytest.approx(by_gate, abs=1e-6 * scale)
    assert float(g_s) == pytest.approx(-by_source, abs=1e-6 * scale)
    assert float(g_d) == pytest.approx(by_drain, abs=1e-6 * scale)


@given(gate=voltages, source=st.floats(0.0, 0.6), drain=st.floats(0.0, 0.6))
def test_current_changes_sign_when_source_and_drain_are_exchanged(gate: float, source: float, drain: float) -> None:
    assert current(gate, source, drain) == pytest.approx(-current(gate, drain, source), rel=1e-12, abs=1e-30)


@given(source=st.floats(0.0, 1.0), excess=st.floats(0.3, 1.0), inversion=st.floats(1e-6, 1e2))
def test_gate_and_source_voltage_are_inverses(source: float, excess: float, inversion: float) -> None:
    drive = charge.drive_from_charge(charge.charge_from_inversion(inversion))
    for device in (DEVICE, BODY):
        gate = bulk.gate_voltage(device, drive, source, source + excess, THERMAL)
        assert float(bulk.source_voltage(device, drive, gate, source + excess, THERMAL)) == pytest.approx(
            source, abs=1e-9
        )


def test_gate_voltage_gives_the_current_back() -> None:
    drive = charge.drive_from_charge(charge.charge_from_inversion(0.7))
    gate = float(bulk.gate_voltage(DEVICE, drive, 0.2, 1.6, THERMAL))
    assert current(gate, 0.2, 1.6) == pytest.approx(0.7 * DEVICE.specific, rel=1e-9)


def test_kappa_over_source_voltage_follows_the_slope_of_the_turning_voltage() -> None:
    """dV_TB/dV_SB is n(V_SB) (Enz and Vittoz 2006): the two laws belong together."""
    step = 1e-5
    for source in (0.0, 0.3, 1.2):
        low, high = (float(bulk.gate_voltage(BODY, 0.0, source + s, 0.0, 0.0)) for s in (-step, step))
        assert (high - low) / (2 * step) == pytest.approx(1 / float(bulk.coupling(BODY, source)), rel=1e-6)


def test_charge_is_lambert_s_w() -> None:
    """scipy.special.lambertw as the outside reference: q = W(2 e^u)/2."""
    u = np.linspace(-600, 600, 4001)
    assert charge.charge_from_drive(u) == pytest.approx(lambertw(2 * np.exp(u)).real / 2, rel=1e-13)


@given(i=st.floats(1e-9, 1e6), velocity=st.floats(0.0, 2.0))
def test_charge_and_inversion_are_inverses(i: float, velocity: float) -> None:
    q = charge.charge_from_inversion(i, velocity)
    assert float(charge.inversion_from_charge(q, velocity)) == pytest.approx(i, rel=1e-12)


def test_log_of_the_charge_where_it_underflows() -> None:
    assert float(charge.log_charge_from_drive(-900.0)) == pytest.approx(-900.0, rel=1e-15)


def test_one_device_has_less_spread_than_a_pair_by_the_root_of_two() -> None:
    pair, single = mismatch.pair_deviation(4e-9, 1e-5, 1e-6), mismatch.single_deviation(4e-9, 1e-5, 1e-6)
    assert float(pair) == pytest.approx(4e-9 / np.sqrt(1e-11), rel=1e-12)
    assert float(single) == pytest.approx(float(pair) / np.sqrt(2), rel=1e-12)
