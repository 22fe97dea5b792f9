"""The other way: curves that a device implies, against the tests' own law, and read back by a fit."""

import csv
import io
from pathlib import Path

import numpy as np
import pytest

from tests.extract.files import process_of, project
from tests.extract.independent import Device, current, grid, noisy, write
from tests.extract.tables import of_file, value
from tests.support import run

GATE = np.linspace(0.0, 1.2, 13)

NFET = Device(
    kappa=0.7,
    threshold=0.45,
    specific_current=0.5e-6,
    drain_coupling=0.02,
    drain_coupling_length=0.18e-6,
    length_modulation=0.1e-6,
    threshold_drift=0.8e-3,
    mobility_exponent=1.5,
    reference_temperature=300.15,
)


def _table(text: str) -> dict[str, np.ndarray]:
    rows = list(csv.DictReader(io.StringIO(text)))
    return {name: np.array([float(row[name]) for row in rows]) for name in rows[0]}


def _curves(folder: Path, *more: str) -> dict[str, np.ndarray]:
    done = run("extract", "--curves", str(process_of(folder)), *more)
    assert done.status == 0, done.err
    return _table(done.out)


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    return project(tmp_path / "project")


GRID = ("--width", "5 um", "--length", "1 um", "--vg", "0:1.2:0.1", "--vs", "0, 0.3", "--vds", "0.05,1.0")


def test_current_is_that_of_the_law(folder: Path) -> None:
    found = _curves(folder, *GRID)
    at = grid(GATE, vs=(0.0, 0.3), vds=(0.05, 1.0), sizes=((5e-6, 1e-6),), temperatures=(300.15,))
    np.testing.assert_allclose(found["vg"], at.vg, atol=1e-12)
    np.testing.assert_allclose(found["id"], current(NFET, at), rtol=1e-8)
    np.testing.assert_allclose(found["inversion_coefficient"], found["id"] / 2.5e-6, rtol=1e-9)


def test_conductances_are_slopes_of_the_current(folder: Path) -> None:
    found = _curves(folder, *GRID)

    def moved(**by: float) -> np.ndarray:
        at = grid(GATE, vs=(0.0, 0.3), vds=(0.05, 1.0), sizes=((5e-6, 1e-6),), temperatures=(300.15,))
        for name, step in by.items():
            setattr(at, name, getattr(at, name) + step)
        return current(NFET, at)

    step = 1e-5
    for name, column, sign in (
        ("vg", "transconductance", 1.0),
        ("vd", "drain_conductance", 1.0),
        ("vs", "source_conductance", -1.0),
    ):
        slope = sign * (moved(**{name: step}) - moved(**{name: -step})) / (2 * step)
        np.testing.assert_allclose(found[column], slope, rtol=2e-5, err_msg=column)
    np.testing.assert_allclose(found["transconductance_efficiency"], found["transconductance"] / found["id"], rtol=1e-9)


def test_a_corner_moves_the_curves(folder: Path) -> None:
    found = _curves(folder, *GRID, "--corner", "slow")
    slow = Device(**{**vars(NFET), "threshold": 0.49, "specific_current": 0.85 * 0.5e-6})
    at = grid(GATE, vs=(0.0, 0.3), vds=(0.05, 1.0), sizes=((5e-6, 1e-6),), temperatures=(300.15,))
    np.testing.assert_allclose(found["id"], current(slow, at), rtol=1e-8)


def test_at_the_biases_of_a_table(folder: Path, tmp_path: Path) -> None:
    at = noisy(NFET, grid(np.arange(0.0, 1.2, 0.1), sizes=((5e-6, 0.4e-6),), temperatures=(260.0,)), 0)
    found = _curves(folder, str(write(tmp_path / "t.csv", at)))
    np.testing.assert_allclose(found["id"], current(NFET, at), rtol=1e-8)


def test_a_fit_of_the_curves_gives_the_device_back(folder: Path, tmp_path: Path) -> None:
    wide = ("--width", "5 um", "--length", "1 um", "--vg=-0.1:1.2:0.02", "--vds", "0.05,0.6,1.2")
    path = tmp_path / "curves.csv"
    done = run("extract", "--curves", str(process_of(folder)), *wide)
    path.write_text(done.out)
    result = of_file(path)
    for name in ("kappa", "threshold", "specific_current", "length_modulation"):
        assert value(result, name) == pytest.approx(getattr(NFET, name), rel=1e-3)
    assert value(result, "drain_coupling") == pytest.approx(0.02 * 0.18, rel=1e-3)
    assert not result.readings[0].guessed


@pytest.mark.parametrize(
    ("more", "word"),
    [
        (("--width", "5 um"), "no length"),
        ((*GRID, "--corner", "slwo"), "did you mean slow?"),
        ((*GRID, "--device", "pfet"), "did you mean nfet?"),
        ((*GRID[:4], "--vg", "0:1"), "FROM:TO:STEP"),
        ((*GRID[:4], "--vg", "0:1:-0.1"), "FROM:TO:STEP"),
        ((*GRID[:4], "--vds", "1 A"), "a current"),
        ((*GRID, "--json"), "curves are CSV"),
    ],
)
def test_bad_arguments(folder: Path, more: tuple[str, ...], word: str) -> None:
    done = run("extract", "--curves", str(process_of(folder)), *more)
    assert done.status == 2
    assert word in done.out + done.err
