"""`biasbook extract`: its document, its text, its exit status."""

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from tests.extract.files import process_of, project
from tests.extract.independent import Device, grid, noisy, write
from tests.support import run

GATE = np.arange(-0.1, 1.21, 0.025)


@pytest.fixture
def table(tmp_path: Path) -> Path:
    return write(tmp_path / "idvg.csv", noisy(Device(), grid(GATE), 0))


def _document(*arguments: str, status: int = 0) -> dict[str, Any]:
    done = run("extract", *arguments, "--json")
    assert done.status == status, done.err
    document: dict[str, Any] = json.loads(done.out)
    return document


def test_document_has_the_shape_of_the_contract(table: Path) -> None:
    document = _document(str(table))
    assert document["schema"] == 1
    names = ("kappa", "threshold", "specific_current", "drain_coupling", "velocity_length", "surface_potential")
    for name, unit in zip((*names, "length_modulation"), ("", "V", "A", "", "m", "V", "m/V"), strict=True):
        entry = document["device"][name]
        assert entry["unit"] == unit
        assert {"value", "standard_error"} <= entry.keys()
    fit = document["fit"]
    assert fit["points"] + fit["left_out"] == 3 * len(GATE)
    assert fit["rms_log_error"] == pytest.approx(0.01, rel=0.2)
    assert 0 < fit["inversion_low"] < 1e-3
    assert fit["inversion_high"] > 10
    assert all(isinstance(one, str) for one in document["warnings"])
    assert document["problems"] == []


def test_document_holds_no_infinity_and_no_nan(tmp_path: Path) -> None:
    at = noisy(Device(), grid(GATE, vds=(1.0,)), 0)
    path = write(tmp_path / "bare.csv", at, ("vg", "vs", "vd", "id"))
    document = _document(str(path))
    assert document["device"]["drain_coupling"]["value"] is None
    assert document["device"]["drain_coupling"]["reason"]
    assert any(one.startswith("drain_coupling: ") for one in document["warnings"])


def test_sizes_and_temperature_from_the_command_line(tmp_path: Path) -> None:
    at = noisy(Device(), grid(GATE), 0)
    path = write(tmp_path / "bare.csv", at, ("vg", "vs", "vd", "id"))
    document = _document(
        str(path), "--polarity", "n", "--width", "5 um", "--length", "0.5 um", "--temperature", "300 K"
    )
    assert document["device"]["specific_current"]["value"] == pytest.approx(0.6e-6, rel=0.05)
    assert document["reference_temperature"] == 300.0


def test_a_poor_fit_exits_1(tmp_path: Path) -> None:
    at = grid(GATE)
    at.id = 1e-6 * np.exp(3 * np.sin(25 * at.vg) + 2 * at.vg)
    document = _document(str(write(tmp_path / "wild.csv", at)), status=1)
    assert document["fit"]["poor"] is True


@pytest.mark.parametrize(
    ("arguments", "word"),
    [
        ((), "Found no table"),
        (("none.csv",), "does not exist"),
        (("{table}", "--width", "5 V"), "a voltage"),
        (("{table}", "--column", "temperatur=a"), "did you mean temperature?"),
        (("{table}", "--column", "vg=gate"), 'no column "gate"'),
        (("{table}", "--keep", "dirt"), "noise-floor"),
        (("{table}", "--most-left-out", "2"), "0 to 1"),
        (("{table}", "--fixed", "id=1 uA"), "NAME=VALUE"),
        (("{table}", "--into", "none.toml"), "none.toml"),
        (("{table}", "--polarity", "x"), "polarity"),
    ],
)
def test_bad_input_exits_2_and_says_what(table: Path, arguments: tuple[str, ...], word: str) -> None:
    given = [one.format(table=table) for one in arguments]
    text = run("extract", *given)
    assert text.status == 2
    assert text.out == ""
    assert word in text.err
    assert "Traceback" not in text.err
    document = _document(*given, status=2)
    assert any(word in " ".join(map(str, one.values())) for one in document["problems"])


def test_text_names_parameters_errors_and_reservations(table: Path) -> None:
    done = run("extract", str(table))
    assert done.status == 0
    assert all(len(line) <= 80 for line in done.out.splitlines())
    words = " ".join(done.out.split())
    for word in (
        "kappa",
        "standard error",
        "Trusted",
        "threshold at maximum slope",
        "one temperature only",
        "sign-off",
    ):
        assert word in words


def test_a_guess_is_shown_and_can_be_stated(table: Path) -> None:
    table.write_text(table.read_text().replace("vg,vs,vd,id", "Vgate,Vsource,Vdrain,Idrain", 1))
    guessed = _document(str(table))
    assert guessed["reading"][0]["guessed"] is True
    columns = [part for one in guessed["reading"][0]["columns"] for part in ("--column", one)]
    stated = _document(str(table), *columns)
    assert stated["reading"][0]["guessed"] is False
    assert stated["device"] == guessed["device"]


def test_into_writes_and_says_what(table: Path, tmp_path: Path) -> None:
    folder = project(tmp_path / "project")
    done = run("extract", str(table), "--into", str(process_of(folder)), "--device", "nfet", "--json")
    assert done.status == 0, done.err
    assert "wrote kappa, threshold, specific_current, drain_coupling" in done.err
    assert json.loads(done.out)["problems"] == []
    assert "fit of " in process_of(folder).read_text("utf-8")


def test_into_that_is_refused_exits_2_and_leaves_the_file(table: Path, tmp_path: Path) -> None:
    folder = project(tmp_path / "project")
    before = process_of(folder).read_bytes()
    table.write_text(table.read_text().replace("vg,vs,vd,id", "Vgate,Vsource,Vdrain,Idrain", 1))
    document = _document(str(table), "--into", str(process_of(folder)), "--device", "nfet", status=2)
    assert "confirmed" in document["problems"][0]["message"]
    assert document["device"]["kappa"]["value"] is not None
    assert process_of(folder).read_bytes() == before
