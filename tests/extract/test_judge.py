"""The judgement beside a fit: textbook values, trusted ranges, errors by region."""

import numpy as np
import pytest

from tests.extract.independent import Device, current, grid, noisy
from tests.extract.tables import fitted, rows_of
from worksheet.extract.data import Extraction, Hand
from worksheet.extract.extraction import Request, extract_from_rows
from worksheet.extract.hand import CONSTANT_CURRENT, hand_values

GATE = np.arange(-0.1, 1.41, 0.01)
DEVICE = Device(kappa=0.75, threshold=0.4, drain_coupling=0.03)
THERMAL = 1.380649e-23 * 300.0 / 1.602176634e-19


@pytest.fixture(scope="module")
def clean() -> Extraction:
    return fitted(DEVICE, grid(GATE), noise=1e-4)


def _hand(result: Extraction, name: str) -> Hand:
    (one,) = [each for each in result.hand if each.name == name]
    return one


def test_constant_current_threshold_is_where_the_current_is_100_na_w_over_l(clean: Extraction) -> None:
    threshold = _hand(clean, "constant_current_threshold").value
    assert threshold is not None
    at = grid(np.array([threshold]), vds=(0.05,))
    assert current(DEVICE, at)[0] == pytest.approx(CONSTANT_CURRENT * 10, rel=5e-3)


def test_weak_inversion_slope_is_ln10_n_thermal_voltages(clean: Extraction) -> None:
    slope = _hand(clean, "weak_inversion_slope").value
    assert slope == pytest.approx(np.log(10) * THERMAL / 0.75, rel=5e-3)


def test_peak_efficiency_is_kappa_over_the_thermal_voltage(clean: Extraction) -> None:
    """g_m/I = kappa G/U_T, G = 1 in weak inversion."""
    assert _hand(clean, "peak_transconductance_efficiency").value == pytest.approx(0.75 / THERMAL, rel=5e-3)


def test_threshold_shift_per_drain_voltage_is_sigma_over_kappa(clean: Extraction) -> None:
    """At constant weak-inversion current kappa dV_G = -sigma dV_D; 50 mV leaves a little of the drain end."""
    level = np.log(1 - np.exp(-0.05 / THERMAL)) * THERMAL / 0.75 / 1.15
    found = _hand(clean, "threshold_shift_per_drain_voltage").value
    assert found == pytest.approx(0.03 / 0.75 - level, rel=0.03)


def test_maximum_slope_threshold_of_the_square_law() -> None:
    """I = beta (V_G - V_T - V_DS/2) V_DS in the linear region (Tsividis and McAndrew 2011): V_T comes back exactly."""
    at = grid(np.arange(0.3, 1.4, 0.02), vds=(0.1,))
    at.id = np.maximum(1e-4 * (at.vg - 0.4 - 0.05) * 0.1, 1e-9)
    rows = rows_of(at)
    found = hand_values(rows, rows.current, np.ones(len(rows), dtype=bool))
    (one,) = [each for each in found if each.name == "maximum_slope_threshold"]
    assert one.value == pytest.approx(0.4, abs=1e-3)
    assert one.fitted == one.value


def test_hand_values_of_the_fit_agree_with_those_of_a_table_that_follows_it(clean: Extraction) -> None:
    for one in clean.hand:
        assert one.value is not None
        assert one.fitted == pytest.approx(one.value, rel=0.01)


def test_hand_values_say_why_they_are_not_there() -> None:
    result = fitted(DEVICE, grid(GATE, vds=(1.0,)))
    for name in ("maximum_slope_threshold", "threshold_shift_per_drain_voltage"):
        one = _hand(result, name)
        assert one.value is None
        assert one.method


def test_trusted_ranges_are_those_of_the_rows(clean: Extraction) -> None:
    trust = clean.trust
    assert trust.inversion is not None
    assert trust.drain is not None
    assert trust.inversion.low == pytest.approx(clean.inversion_span.low)
    assert trust.inversion.high == pytest.approx(clean.inversion_span.high)
    assert trust.drain.low == pytest.approx(0.05)
    assert trust.drain.high == pytest.approx(1.2)


def test_trust_ends_where_the_fit_misses() -> None:
    """Overruled, a floor stays in the fit; the trusted range leaves it out."""
    at = noisy(DEVICE, grid(np.arange(-0.3, 1.2, 0.02)), 1)
    at.id = at.id + 3e-10
    result, _ = extract_from_rows(rows_of(at), Request(keep=("noise floor", "leakage", "outside the fitted range")))
    assert result is not None
    assert result.trust.inversion is not None
    assert result.inversion_span.low < 1e-4
    assert result.trust.inversion.low > 1e-4


def test_errors_by_region_see_what_is_wrong_there() -> None:
    """A conductance that the law does not have, in saturation and strong inversion only."""
    at = grid(np.arange(0.0, 1.2, 0.05), vds=(0.05, 0.5, 0.8, 1.1))
    exact = current(Device(), at)
    at.id = exact * (1 + 0.2 * (at.vd > 0.3) * (at.vd - 0.5) * (exact > 3e-5))
    result, _ = extract_from_rows(rows_of(at), Request())
    assert result is not None
    found = {(one.region, one.saturated): one.drain_conductance for one in result.regions}
    weak, strong = found["weak", True], found["strong", True]
    assert weak is not None
    assert strong is not None
    assert strong > 2 * weak
    assert any("Output conductance in strong inversion" in one for one in result.limits)


def test_a_good_fit_has_small_errors_everywhere(clean: Extraction) -> None:
    for one in clean.regions:
        for error in (one.current, one.transconductance, one.drain_conductance):
            assert error is None or error < 0.02
    assert clean.limits == ()


def test_curves_that_do_not_rise_have_no_hand_values() -> None:
    at = grid(np.arange(0.0, 1.2, 0.1), vds=(0.05, 1.0))
    at.id = np.full(len(at.vg), 1e-6)
    rows = rows_of(at)
    found = hand_values(rows, rows.current, np.ones(len(rows), dtype=bool))
    assert len(found) == 5
    assert all(one.value is None and one.method for one in found)
