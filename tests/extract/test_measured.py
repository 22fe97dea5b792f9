"""Real silicon: the measured tables beside the checkout, against the published windows of their process.

Windows: process specification of the open kit the tables come from, Rev 1.2, as stated in the README beside them.
"""

import numpy as np
import pytest

from tests.extract.independent import Array, Device, Points, current
from tests.extract.tables import LONG, SHORT, needs_measured, of_file, value
from worksheet.extract.data import Extraction, Mask, Rows
from worksheet.extract.extraction import Request, extract_from_rows, read_rows

pytestmark = needs_measured

LN10 = float(np.log(10.0))
THERMAL = 1.380649e-23 * 300.0 / 1.602176634e-19


@pytest.fixture(scope="module")
def long() -> Extraction:
    return of_file(LONG)


@pytest.fixture(scope="module")
def long_at_zero() -> Extraction:
    rows, readings, _ = read_rows([LONG], [LONG.name], Request())
    assert rows is not None
    result, _ = extract_from_rows(rows.take(rows.source < 0.01), Request(), readings)
    assert result is not None
    return result


@pytest.fixture(scope="module")
def short() -> Extraction:
    return of_file(SHORT)


def _hand(result: Extraction, name: str) -> float:
    (one,) = [each for each in result.hand if each.name == name]
    assert one.value is not None
    return one.value


def _independent(result: Extraction) -> Array:
    """Current of the fitted parameters by the tests' own law."""
    names = ("kappa", "threshold", "specific_current", "drain_coupling")
    numbers = {name: value(result, name) for name in names}
    numbers |= {
        name: result.estimates[name].value or 0.0
        for name in ("surface_potential", "length_modulation", "velocity_length")
    }
    rows = result.rows
    device = Device(**numbers, drain_coupling_length=result.reference_length or 1.0)
    return current(device, Points(rows.gate, rows.source, rows.drain, rows.width, rows.length, rows.temperature))


def _core(result: Extraction, rows: Rows) -> Mask:
    level = rows.current / (value(result, "specific_current") * rows.width / rows.length)
    return np.asarray((level >= 1e-3) & (level <= 10.0))


def _rms(result: Extraction, which: Mask) -> float:
    error = np.log(_independent(result)[which] / result.rows.current[which])
    return float(np.sqrt(np.mean(error**2)))


def test_long_device_at_zero_source_voltage(long_at_zero: Extraction) -> None:
    core = _core(long_at_zero, long_at_zero.rows)
    assert _rms(long_at_zero, core) < 0.08
    assert np.mean(~long_at_zero.used[core]) <= 0.15
    assert not long_at_zero.poor


def test_long_device_over_all_source_voltages(long: Extraction) -> None:
    core = _core(long, long.rows)
    assert _rms(long, core) < 0.12
    assert _rms(long, core & long.used) < 0.12
    assert _rms(long, core & long.used & (long.rows.source < 0.01)) < 0.08
    assert np.mean(~long.used[core]) <= 0.15
    assert long.core_points == int(core.sum())
    assert long.core_left_out == int((core & ~long.used).sum())
    assert long.trust.source is not None
    assert long.trust.source.high == pytest.approx(1.2)


def test_long_device_in_its_windows(long: Extraction, long_at_zero: Extraction) -> None:
    for result in (long, long_at_zero):
        assert 0.16 <= _hand(result, "maximum_slope_threshold") <= 0.24
        assert 0.16 <= value(result, "threshold") <= 0.24


def test_kappa_of_the_long_device_at_zero_source_voltage(long_at_zero: Extraction) -> None:
    """0.831 by the weak-inversion slope (the issue's own measurement), within its error."""
    assert value(long_at_zero, "kappa") == pytest.approx(0.831, abs=0.03)


def test_short_device_in_its_windows(short: Extraction) -> None:
    """Threshold 0.43 to 0.55 V, slope 76 to 88 mV per decade, drain coupling 20 to 80 mV/V."""
    assert 0.43 <= _hand(short, "maximum_slope_threshold") <= 0.55
    assert 0.43 <= value(short, "threshold") <= 0.55
    assert 0.076 <= _hand(short, "weak_inversion_slope") <= 0.088
    assert 0.076 <= LN10 * THERMAL / value(short, "kappa") <= 0.088
    assert 0.020 <= _hand(short, "threshold_shift_per_drain_voltage") <= 0.080
    assert 0.020 <= value(short, "drain_coupling") / value(short, "kappa") <= 0.080


def test_short_device_says_how_far_up_the_source_it_holds(short: Extraction) -> None:
    assert not short.poor
    assert short.trust.source is not None
    assert short.trust.source.high < 1.2
    assert any("does not follow the source voltage" in one for one in short.warnings)


def test_leakage_is_recognised(long: Extraction, short: Extraction) -> None:
    for result in (long, short):
        left = {one.reason: one.count for one in result.left_out}
        assert 100 < left["leakage"] < 250
        assert result.points + sum(left.values()) == 570


def test_what_the_model_cannot_do_is_said(long: Extraction) -> None:
    assert any("Output conductance in strong inversion" in one for one in long.limits)


@pytest.mark.full
def test_both_lengths_together() -> None:
    result = of_file(LONG, SHORT)
    assert [round(one.length * 1e6, 2) for one in result.by_length] == [0.13, 10.0]
    assert result.reference_length == pytest.approx(0.13e-6)
    assert 0.43 <= value(result, "threshold") <= 0.55
