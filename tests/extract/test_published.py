"""Published parameter sets come back from curves made of them by the tests' own law."""

import numpy as np
import pytest

from tests.extract.independent import Device, grid
from tests.extract.tables import fitted, value

SETS = {
    "generic 180 nm n-channel (Enz, Improved voltage followers, 2026)": (
        Device(kappa=1 / 1.27136, specific_current=715e-9, threshold=0.455, drain_coupling=0.012),
        (4.677e-6, 1e-6),
        300.27,  # U_T = 25.875 mV
    ),
    "130 nm n-channel (Enz, Cascode gain stage, 2025), sizes as drawn": (
        Device(
            kappa=1 / 1.22,
            specific_current=708.3e-9,
            threshold=0.2,
            drain_coupling=0.04,
            length_offset=58.8e-9,
            width_offset=20e-9,
        ),
        (4.40e-6, 0.25e-6),
        300.15,  # U_T = 25.865 mV
    ),
}
"""Slope factor, specific current and offsets as published (checks.md); threshold and drain coupling are ours."""


@pytest.mark.parametrize("name", SETS)
def test_slope_factor_and_specific_current_come_back(name: str) -> None:
    device, size, temperature = SETS[name]
    here = Device(**{**vars(device), "reference_temperature": temperature, "drain_coupling_length": size[1]})
    result = fitted(here, grid(np.arange(-0.1, 1.2, 0.025), sizes=(size,), temperatures=(temperature,)), seed=7)
    effective = (size[0] + device.width_offset) / (size[1] - device.length_offset) / (size[0] / size[1])
    assert 1 / value(result, "kappa") == pytest.approx(1 / device.kappa, rel=0.01)
    assert value(result, "specific_current") == pytest.approx(device.specific_current * effective, rel=0.05)
    assert value(result, "threshold") == pytest.approx(device.threshold, rel=0.01)
    assert value(result, "drain_coupling") == pytest.approx(device.drain_coupling, rel=0.05)


def test_offset_of_length_from_several_lengths() -> None:
    """L_eff = L - 58.8 nm of the 130 nm set (Enz, Cascode gain stage, 2025)."""
    device = Device(
        kappa=1 / 1.22, specific_current=708.3e-9, threshold=0.2, length_offset=58.8e-9, drain_coupling_length=0.25e-6
    )
    sizes = ((4.4e-6, 0.25e-6), (4.4e-6, 0.5e-6), (4.4e-6, 2e-6))
    result = fitted(device, grid(np.arange(-0.1, 1.2, 0.025), sizes=sizes))
    assert value(result, "length_offset") == pytest.approx(58.8e-9, rel=0.05)
    assert value(result, "specific_current") == pytest.approx(708.3e-9, rel=0.02)
    assert any("shorter than drawn" in one for one in result.warnings)
