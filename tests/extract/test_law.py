"""The law that is fitted: against the tests' own, against the device layer, and its slopes against differences."""

import numpy as np
import pytest

from tests.extract.independent import Device, current, grid, noisy
from tests.extract.tables import rows_of
from worksheet.device.bulk import gate_voltage
from worksheet.device.constants import thermal_voltage
from worksheet.device.parameters import Parameters
from worksheet.device.transistor import drain_current
from worksheet.extract.curves import law_values
from worksheet.extract.data import Rows
from worksheet.extract.law import (
    AT,
    NAMES,
    Reference,
    bias_slopes,
    forward_inversion,
    log_current,
    log_current_and_slopes,
)

FULL = Device(
    kappa=0.72,
    drain_coupling=0.03,
    drain_coupling_exponent=1.2,
    length_modulation=0.03e-6,
    surface_potential=0.8,
    velocity_length=40e-9,
    threshold_drift=8e-4,
    mobility_exponent=1.4,
    length_offset=20e-9,
    width_offset=15e-9,
)
AT_POINTS = grid(
    np.arange(-0.2, 1.6, 0.1),
    vs=(0.0, 0.5, 1.1),
    vds=(0.02, 0.3, 1.5),
    sizes=((5e-6, 0.18e-6), (2e-6, 3e-6)),
    temperatures=(240.0, 300.0, 390.0),
)


def _values(device: Device) -> np.ndarray:
    values = law_values(vars(device), {})
    for name in ("length_offset", "width_offset"):
        values[AT[name]] = getattr(device, name)
    return values


def _reference(device: Device) -> Reference:
    return Reference(device.reference_temperature, device.drain_coupling_length)


@pytest.mark.parametrize("device", [Device(), Device(surface_potential=0.6), Device(velocity_length=60e-9), FULL])
def test_equals_the_independent_law(device: Device) -> None:
    rows = rows_of(noisy(device, AT_POINTS, 0, noise=0.0))
    found = np.exp(log_current(_values(device), rows, _reference(device)))
    np.testing.assert_allclose(found, current(device, AT_POINTS), rtol=1e-9)


def test_slopes_are_those_of_the_law() -> None:
    rows, values, reference = rows_of(noisy(FULL, AT_POINTS, 0)), _values(FULL), _reference(FULL)
    _, slopes = log_current_and_slopes(values, rows, reference)
    for name, place in AT.items():
        step = 1e-6 * max(abs(values[place]), 1e-9)
        up, down = values.copy(), values.copy()
        up[place] += step
        down[place] -= step
        quotient = (log_current(up, rows, reference) - log_current(down, rows, reference)) / (2 * step)
        scale = np.max(np.abs(slopes[:, place]))
        np.testing.assert_allclose(slopes[:, place] / scale, quotient / scale, atol=2e-5, err_msg=name)
    assert slopes.shape == (len(rows), len(NAMES))


@pytest.mark.parametrize(("place", "field"), [(0, "gate"), (1, "source"), (2, "drain")])
def test_slopes_over_bias_are_those_of_the_law(place: int, field: str) -> None:
    rows, values, reference = rows_of(noisy(FULL, AT_POINTS, 0)), _values(FULL), _reference(FULL)

    def moved(step: float) -> Rows:
        names = Rows.__dataclass_fields__
        return Rows(**{name: getattr(rows, name) + (step if name == field else 0.0) for name in names})

    quotient = (log_current(values, moved(1e-6), reference) - log_current(values, moved(-1e-6), reference)) / 2e-6
    np.testing.assert_allclose(bias_slopes(values, rows, reference)[place], quotient, rtol=1e-4, atol=1e-4)


def _parameters(device: Device) -> Parameters:
    unused = dict.fromkeys(Parameters.__dataclass_fields__, 0.0)
    return Parameters(
        **{
            **unused,
            "kappa": device.kappa,
            "threshold": device.threshold,
            "specific_current": device.specific_current,
            "drain_coupling": device.drain_coupling,
            "surface_potential": device.surface_potential,
            "width": 5e-6,
            "length": 0.5e-6,
        }
    )


def test_reduces_to_the_long_channel_of_the_device_layer() -> None:
    device = Device()
    at = grid(np.arange(-0.1, 1.2, 0.1), vs=(0.0, 0.4), vds=(0.05, 1.0))
    thermal = thermal_voltage(at.temperature)
    there = drain_current(_parameters(device), at.vg, at.vs, at.vd, thermal)
    here = np.exp(log_current(_values(device), rows_of(noisy(device, at, 0)), _reference(device)))
    np.testing.assert_allclose(here, there, rtol=1e-9)


def test_moves_kappa_over_source_voltage_as_the_device_layer_does() -> None:
    """Where bulk.gate_voltage puts u = 0 the law must find i = 0.608 at the source end."""
    device = Device(surface_potential=0.7)
    source, drain = np.array([0.0, 0.3, 1.2]), np.array([1.0, 1.5, 2.4])
    thermal = float(thermal_voltage(300.0))
    gate = gate_voltage(_parameters(device), 0.0, source, drain, thermal)
    full = np.ones(3)
    rows = Rows(gate, source, drain, full, 5e-6 * full, 0.5e-6 * full, 300.0 * full)
    np.testing.assert_allclose(forward_inversion(_values(device), rows, _reference(device)), 0.60806, rtol=1e-4)
