"""Devices that were fitted are drawn over the tables they were fitted to; another version of a table is not."""

from __future__ import annotations

import shutil
from pathlib import Path
from xml.etree import ElementTree

import numpy as np
import pytest

from tests.report.handoff.conftest import SAMPLE
from tests.support import run
from worksheet.project.discover import load
from worksheet.report.handoff import pictures
from worksheet.report.handoff.material import Fit
from worksheet.session.handoff_fits import fits_of

TABLE = "nfet_curves.csv"


@pytest.fixture(scope="module")
def fitted(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A copy of the sample whose nfet is fitted to curves that it implies itself."""
    root = tmp_path_factory.mktemp("fitted") / "tide_gauge"
    shutil.copytree(SAMPLE, root)
    process, table = str(root / "process" / "quay_180.toml"), root / "evidence" / TABLE
    sweep = ("--vg", "0:1.8:0.05", "--vs", "0,0.2", "--vds", "0.05,0.9,1.8")
    made = run("extract", "--curves", process, "--device", "nfet", "--width", "10 um", "--length", "1 um", *sweep)
    assert made.status == 0, made.err
    table.write_text(made.out, encoding="utf-8")
    done = run("extract", str(table), "--polarity", "n", "--into", process, "--device", "nfet")
    assert done.status in (0, 1), done.err
    return root


def only(root: Path) -> Fit:
    process = load(root).process
    assert process is not None
    (fit,) = fits_of(root, process)
    return fit


def test_curves_run_through_the_table(fitted: Path) -> None:
    fit = only(fitted)
    assert (fit.device, fit.polarity, fit.width, fit.length) == ("nfet", "n", 1e-5, 1e-6)
    assert list(fit.currents) == sorted(fit.measured) == [0.05, 0.9, 1.8]
    for across, rows in fit.measured.items():
        assert len(rows) == 37
        gates, currents = (np.array(column) for column in zip(*rows, strict=True))
        drawn = np.exp(np.interp(gates, fit.gate, np.log(fit.currents[across])))
        assert drawn == pytest.approx(currents, rel=0.1)


def test_the_picture_is_well_formed_and_says_what_it_shows(fitted: Path) -> None:
    picture = pictures.fit(only(fitted))
    tree = ElementTree.fromstring(picture.svg)
    names = {element.tag.rpartition("}")[2] for element in tree.iter()}
    assert "script" not in names
    assert "foreignObject" not in names
    assert "Drain current of nfet" in picture.alt
    assert picture.svg == pictures.fit(only(fitted)).svg


def test_another_version_of_the_table_is_not_drawn(fitted: Path, tmp_path: Path) -> None:
    root = tmp_path / "other"
    shutil.copytree(fitted, root)
    table = root / "evidence" / TABLE
    table.write_text(table.read_text("utf-8") + "\n", encoding="utf-8")
    assert not only(root).measured
    table.unlink()
    assert not only(root).measured
    assert len(only(root).currents) == 3
