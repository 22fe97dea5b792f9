"""Parameters from synthetic curves of the tests' own law with 1 % noise: values, coverage, errors against the bound."""

from collections.abc import Callable

import numpy as np
import pytest

from tests.extract.independent import Array, Device, Points, current, grid, noisy
from tests.extract.tables import error, fitted, rows_of, value
from worksheet.extract.extraction import Request, extract_from_rows

GATE = np.arange(-0.1, 1.21, 0.025)
MAIN = {"kappa": 0.01, "threshold": 0.01, "specific_current": 0.05, "drain_coupling": 0.05}
"""Relative error that is allowed."""

CASES = {
    "plain": (Device(), grid(GATE)),
    "long and leaky to the source": (
        Device(kappa=0.85, threshold=0.2, drain_coupling=0.01, drain_coupling_length=5e-6, surface_potential=0.8),
        grid(GATE, vs=(0.0, 0.4, 0.8), sizes=((1e-5, 5e-6),)),
    ),
    "modulated": (Device(length_modulation=0.03e-6), grid(GATE)),
    "short": (
        Device(velocity_length=40e-9, drain_coupling_length=0.18e-6, drain_coupling=0.04),
        grid(GATE, sizes=((5e-6, 0.18e-6),)),
    ),
    "several temperatures": (
        Device(threshold_drift=8e-4, mobility_exponent=1.5),
        grid(GATE, temperatures=(233.15, 300.0, 398.15)),
    ),
    "several lengths": (
        Device(drain_coupling_exponent=1.3, drain_coupling_length=0.18e-6, velocity_length=30e-9),
        grid(GATE, vds=(0.05, 0.4, 1.2), sizes=((5e-6, 0.18e-6), (5e-6, 0.5e-6), (5e-6, 5e-6))),
    ),
    "offset lengths": (
        Device(length_offset=30e-9, drain_coupling_length=0.18e-6),
        grid(GATE, sizes=((5e-6, 0.18e-6), (5e-6, 0.5e-6), (5e-6, 5e-6))),
    ),
}


@pytest.mark.parametrize("name", CASES)
def test_parameters_come_back(name: str) -> None:
    device, at = CASES[name]
    result = fitted(device, at)
    for parameter, allowed in MAIN.items():
        assert value(result, parameter) == pytest.approx(getattr(device, parameter), rel=allowed), parameter
    assert not result.poor
    assert result.rms_log_error == pytest.approx(0.01, rel=0.15)
    assert result.points == len(at.vg)


@pytest.mark.parametrize(
    ("name", "parameter", "allowed"),
    [
        ("long and leaky to the source", "surface_potential", 0.05),
        ("modulated", "length_modulation", 0.15),
        ("short", "velocity_length", 0.05),
        ("several temperatures", "threshold_drift", 0.02),
        ("several temperatures", "mobility_exponent", 0.02),
        ("several lengths", "drain_coupling_exponent", 0.05),
        ("several lengths", "velocity_length", 0.1),
        ("offset lengths", "length_offset", 0.1),
    ],
)
@pytest.mark.full
def test_what_the_data_carry_comes_back(name: str, parameter: str, allowed: float) -> None:
    device, at = CASES[name]
    result = fitted(device, at)
    assert value(result, parameter) == pytest.approx(getattr(device, parameter), rel=allowed)
    assert abs(value(result, parameter) - getattr(device, parameter)) < 4 * error(result, parameter)


def _bound(device: Device, at: Points) -> Array:
    """Cramer-Rao bound of the four main parameters for 1 % noise, from differences of the tests' own law."""
    steps = {
        "kappa": 1e-5,
        "threshold": 1e-5,
        "specific_current": 1e-5 * device.specific_current,
        "drain_coupling": 1e-6,
    }
    slopes = []
    for name, step in steps.items():
        up = Device(**{**vars(device), name: getattr(device, name) + step})
        down = Device(**{**vars(device), name: getattr(device, name) - step})
        slopes.append(np.log(current(up, at) / current(down, at)) / (2 * step))
    information = np.array(slopes) @ np.array(slopes).T / 0.01**2
    return np.sqrt(np.diag(np.linalg.inv(information)))


def _covered(device: Device, at: Points, seeds: range) -> tuple[dict[str, float], dict[str, float]]:
    """Share of 95 % intervals that hold the truth, and the largest standard error over the bound."""
    bound = dict(zip(MAIN, _bound(device, at), strict=True))
    inside, widest = dict.fromkeys(MAIN, 0), dict.fromkeys(MAIN, 0.0)
    for seed in seeds:
        result = fitted(device, at, seed)
        for name in MAIN:
            off = abs(value(result, name) - getattr(device, name))
            inside[name] += off < 1.96 * error(result, name)
            widest[name] = max(widest[name], error(result, name) / bound[name])
    return {name: count / len(seeds) for name, count in inside.items()}, widest


COVERED: dict[str, tuple[Device, Callable[[], Points]]] = {
    "fine": (Device(), lambda: grid(GATE)),
    "coarse": (Device(), lambda: grid(np.arange(0.1, 1.21, 0.05), vds=(0.1, 1.2))),
}


@pytest.mark.full
@pytest.mark.parametrize("name", COVERED)
def test_intervals_cover_and_errors_are_near_the_bound(name: str) -> None:
    """200 seeds: between 90 and 98 % covered, and every error within twice the bound."""
    device, make = COVERED[name]
    share, widest = _covered(device, make(), range(200))
    for parameter in MAIN:
        assert 0.90 <= share[parameter] <= 0.98, (parameter, share)
        assert widest[parameter] < 2.0, (parameter, widest)


@pytest.mark.full
def test_intervals_cover_in_a_few() -> None:
    device, make = COVERED["coarse"]
    share, widest = _covered(device, make(), range(20))
    assert all(0.8 <= one <= 1.0 for one in share.values()), share
    assert all(one < 2.0 for one in widest.values()), widest


def test_outliers_do_not_carry_the_fit_away() -> None:
    device, at = Device(), grid(GATE)
    wild = noisy(device, at, 3)
    wild.id[np.random.default_rng(3).choice(len(wild.id), 8, replace=False)] *= 3.0
    result, _ = extract_from_rows(rows_of(wild), Request())
    assert result is not None
    for parameter, allowed in MAIN.items():
        assert value(result, parameter) == pytest.approx(getattr(device, parameter), rel=allowed), parameter
