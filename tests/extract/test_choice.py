"""A parameter that the data cannot fix is None with its reason; one that does not earn its place is left and said."""

import numpy as np
import pytest

from tests.extract.independent import Device, Points, grid, noisy
from tests.extract.tables import fitted, rows_of, value
from worksheet.extract.data import Extraction
from worksheet.extract.extraction import Request, extract_from_rows

GATE = np.arange(-0.1, 1.21, 0.025)


def _none(result: Extraction, name: str, word: str) -> None:
    estimate = result.estimates[name]
    assert estimate.value is None
    assert estimate.standard_error is None
    assert word in estimate.reason
    assert any(one.startswith(f"{name}: ") and word in one for one in result.warnings)


def test_one_drain_voltage_only() -> None:
    result = fitted(Device(), grid(GATE, vds=(1.0,)))
    _none(result, "drain_coupling", "one drain-source voltage only")
    _none(result, "length_modulation", "one drain-source voltage only")
    assert value(result, "kappa") == pytest.approx(0.72, rel=0.01)
    assert any("holds at the table's drain voltage" in one for one in result.warnings)
    # What the threshold then holds is kappa V_T0 less sigma V_D.
    assert value(result, "threshold") == pytest.approx(0.42 - 0.02 * 1.0 / 0.72, abs=2e-3)


def test_no_moderate_inversion() -> None:
    result = fitted(Device(), grid(np.arange(0.0, 0.3, 0.01)))
    _none(result, "threshold", "no moderate inversion")
    _none(result, "specific_current", "no moderate inversion")
    assert value(result, "kappa") == pytest.approx(0.72, rel=0.01)


def test_strong_inversion_only() -> None:
    result = fitted(Device(), grid(np.arange(0.9, 1.6, 0.02)))
    _none(result, "kappa", "")
    _none(result, "specific_current", "")


def test_one_gate_voltage_only() -> None:
    at = grid(np.array([0.6]), vds=tuple(np.arange(0.05, 1.2, 0.02)))
    result = fitted(Device(), at)
    for name in ("kappa", "threshold"):
        _none(result, name, "")


def test_sizes_that_are_not_known() -> None:
    at = noisy(Device(length_modulation=0.05e-6), grid(GATE), 0)
    unknown = np.full_like(at.vg, np.nan)
    result, _ = extract_from_rows(
        rows_of(Points(at.vg, at.vs, at.vd, unknown, unknown, at.temperature, at.id)), Request()
    )
    assert result is not None
    assert value(result, "specific_current") == pytest.approx(0.6e-6 * 10, rel=0.05)
    _none(result, "length_modulation", "length is not known")
    _none(result, "velocity_length", "length is not known")
    assert any("whole device" in one for one in result.warnings)
    assert result.reference_length is None


@pytest.mark.parametrize("name", ["surface_potential", "length_modulation", "velocity_length"])
def test_what_is_not_there_is_left_at_its_default(name: str) -> None:
    result = fitted(Device(), grid(GATE, vs=(0.0, 0.5)))
    estimate = result.estimates[name]
    assert estimate.value == 0.0
    assert estimate.standard_error is None
    assert "does not earn its place" in estimate.reason
    assert any(one.startswith(f"{name}: ") for one in result.warnings)


def test_what_the_data_could_not_tell_is_none_and_not_0() -> None:
    """Without strong inversion nothing is known of velocity saturation."""
    result = fitted(Device(), grid(np.arange(0.1, 0.55, 0.02), sizes=((5e-6, 1e-6),)))
    _none(result, "velocity_length", "cannot tell")


def test_a_bend_that_is_no_velocity_saturation_is_not_called_so() -> None:
    """Mobility falling with the gate voltage bends a long device more than L_sat of some tens of nanometres can."""
    device = Device(drain_coupling_length=5e-6)
    at = noisy(device, grid(GATE, sizes=((5e-6, 5e-6),)), 0)
    at.id /= 1 + 0.4 * np.maximum(at.vg - device.threshold, 0.0)
    result, _ = extract_from_rows(rows_of(at), Request())
    assert result is not None
    assert result.estimates["velocity_length"].value == 0.0
    assert value(result, "kappa") == pytest.approx(device.kappa, rel=0.05)
    assert result.inversion_span.high < 110.0
    assert any(one.reason == "series resistance" for one in result.left_out)


def test_a_correlation_is_told() -> None:
    result = fitted(Device(), grid(np.arange(0.0, 0.46, 0.01)))
    assert abs(result.correlations["threshold", "specific_current"]) > 0.97
    assert any("correlated" in one and "threshold" in one for one in result.warnings)


def test_lengths_that_one_set_does_not_describe() -> None:
    """Thresholds of two lengths 0.2 V apart, as halo implants make them."""
    parts = [
        noisy(Device(threshold=threshold, drain_coupling_length=0.2e-6), grid(GATE, sizes=((5e-6, length),)), 0)
        for threshold, length in ((0.45, 0.2e-6), (0.25, 2e-6))
    ]
    names = ("vg", "vs", "vd", "w", "l", "temperature", "id")
    both = Points(*(np.concatenate([getattr(one, name) for one in parts]) for name in names))
    result, _ = extract_from_rows(rows_of(both), Request(reference_length=2e-6))
    assert result is not None
    assert value(result, "threshold") == pytest.approx(0.25, rel=0.01)
    assert [one.length for one in result.by_length] == [0.2e-6, 2e-6]
    assert result.by_length[0].estimates["threshold"].value == pytest.approx(0.45, rel=0.01)
    assert value(result, "drain_coupling_exponent") == pytest.approx(1.0, abs=0.1)
    assert result.trust.length is not None
    assert result.trust.length.low == 2e-6
    assert any("does not describe all lengths" in one for one in result.warnings)


def test_a_table_that_follows_no_transistor_is_poor() -> None:
    at = grid(GATE)
    at.id = 1e-6 * np.exp(3 * np.sin(25 * at.vg) + 2 * at.vg)
    result, _ = extract_from_rows(rows_of(at), Request())
    assert result is not None
    assert result.poor
    assert any("fit is poor" in one for one in result.warnings)
