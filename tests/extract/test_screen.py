"""Noise floor, leakage, series resistance and breakdown: recognised, counted, at most a share, and overruled."""

import numpy as np
import pytest

from tests.extract.independent import Array, Device, Points, grid, noisy
from tests.extract.tables import rows_of, value
from worksheet.extract.data import Extraction
from worksheet.extract.extraction import Request, extract_from_rows
from worksheet.extract.screen import REASONS, screen

GATE = np.arange(-0.5, 1.21, 0.025)
DEVICE = Device()


def _extracted(at: Points, **asked: object) -> Extraction:
    result, problems = extract_from_rows(rows_of(at), Request(**asked))  # type: ignore[arg-type]
    assert result is not None, problems
    return result


def _with(extra: Array, at: Points) -> Points:
    return Points(at.vg, at.vs, at.vd, at.w, at.l, at.temperature, at.id + extra)


def _left(result: Extraction) -> dict[str, int]:
    return {one.reason: one.count for one in result.left_out}


def test_good_rows_are_not_touched() -> None:
    at = noisy(DEVICE, grid(GATE, vs=(0.0, 0.5)), 2)
    assert screen(rows_of(at)).kept.all()


@pytest.mark.parametrize("seed", range(5))
def test_good_output_curves_are_not_touched(seed: int) -> None:
    at = noisy(DEVICE, grid(np.array([0.3, 0.45, 0.6, 0.9]), vds=tuple(np.arange(0.02, 1.5, 0.02))), seed)
    assert screen(rows_of(at)).kept.all()


def test_noise_floor() -> None:
    at = noisy(DEVICE, grid(GATE), 2)
    noise = 1e-12 * (1 + 0.5 * np.random.default_rng(5).standard_normal(len(at.vg)))
    result = _extracted(_with(noise, at))
    below = int(np.count_nonzero(at.id < 1e-12))
    assert below * 0.9 <= _left(result)["noise floor"] <= below * 1.6
    assert value(result, "kappa") == pytest.approx(DEVICE.kappa, rel=0.01)
    assert value(result, "threshold") == pytest.approx(DEVICE.threshold, rel=0.01)


def test_currents_at_and_below_0_are_noise() -> None:
    at = noisy(DEVICE, grid(GATE), 2)
    at.id[at.id < 1e-13] = 0.0
    at.id[3] = -1e-14
    result = _extracted(at)
    assert set(_left(result)) == {"noise floor"}
    assert value(result, "kappa") == pytest.approx(DEVICE.kappa, rel=0.01)


def test_leakage_that_rises_as_the_gate_falls_and_with_the_drain() -> None:
    """Gate-induced drain leakage: exponential towards negative gates, larger at higher drain voltage."""
    at = noisy(DEVICE, grid(GATE), 2)
    result = _extracted(_with(1e-12 * np.exp(-6 * at.vg + 3 * (at.vd - at.vs)), at))
    assert _left(result)["leakage"] > 30
    assert value(result, "kappa") == pytest.approx(DEVICE.kappa, rel=0.015)
    assert any("leakage" in one.reason and "vg" in one.detail for one in result.left_out)


def test_series_resistance() -> None:
    at = noisy(Device(), grid(np.arange(-0.1, 1.81, 0.025)), 2)
    at.id /= 1 + 1000.0 * at.id / 0.3
    result = _extracted(at)
    assert _left(result)["series resistance"] > 20
    assert value(result, "kappa") == pytest.approx(DEVICE.kappa, rel=0.03)
    assert value(result, "threshold") == pytest.approx(DEVICE.threshold, rel=0.03)


def test_breakdown() -> None:
    at = noisy(DEVICE, grid(np.arange(0.2, 1.0, 0.1), vds=tuple(np.arange(0.05, 3.0, 0.05))), 2, 0.002)
    at.id *= 1 + 1e-6 * np.exp(6 * (at.vd - at.vs))
    result = _extracted(at)
    assert _left(result)["breakdown"] > 20
    gone = ~result.used
    assert (at.vd - at.vs)[gone].min() > 1.5
    assert value(result, "drain_coupling") == pytest.approx(DEVICE.drain_coupling, rel=0.1)


def test_at_most_a_share_is_left_out_and_said() -> None:
    at = noisy(DEVICE, grid(GATE), 2)
    floor = _with(np.full(len(at.vg), 1e-10), at)
    free, bound = screen(rows_of(floor)), screen(rows_of(floor), most=0.1)
    assert np.count_nonzero(~free.kept) > 0.2 * len(at.vg)
    assert np.count_nonzero(~bound.kept) == int(0.1 * len(at.vg))
    assert bound.capped == np.count_nonzero(~free.kept) - np.count_nonzero(~bound.kept)
    result = _extracted(floor, most_left_out=0.1)
    assert any("take part, since at most 10 %" in one for one in result.warnings)


def test_every_reason_can_be_overruled() -> None:
    at = noisy(DEVICE, grid(GATE), 2)
    result = _extracted(_with(np.full(len(at.vg), 1e-11), at), keep=tuple(REASONS))
    assert result.left_out == ()
    assert result.points == len(at.vg)


def test_points_and_left_out_add_up() -> None:
    at = noisy(DEVICE, grid(GATE), 2)
    result = _extracted(_with(np.full(len(at.vg), 1e-11), at))
    assert result.points + sum(_left(result).values()) == len(at.vg)
    assert result.points == np.count_nonzero(result.used)
