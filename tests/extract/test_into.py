"""A fit written into a process file: in place, with source, date, digest, errors and range; sheets beyond are told."""

import datetime
import hashlib
import tomllib
from pathlib import Path

import numpy as np
import pytest

from tests.extract.files import PROCESS, process_of, project
from tests.extract.independent import Device, grid, noisy, write
from tests.support import run
from worksheet.extract.extraction import Request
from worksheet.extract.store import Stating
from worksheet.session.extracting import ProcessText, extract, read_device, write_into
from worksheet.session.workbook import Workbook
from worksheet.sheetfile.read import read_process

TODAY = datetime.date(2026, 11, 2)
DEVICE = Device(reference_temperature=300.15)


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    return project(tmp_path / "project")


@pytest.fixture
def table(tmp_path: Path) -> Path:
    at = noisy(
        DEVICE, grid(np.arange(-0.1, 1.21, 0.025), vs=(0.0, 0.5), vds=(0.05, 0.6, 1.5), temperatures=(300.15,)), 0
    )
    return write(tmp_path / "idvg.csv", at)


def _into(folder: Path) -> ProcessText:
    found = read_device(process_of(folder), "nfet", None)
    assert isinstance(found, ProcessText)
    return found


def _write(folder: Path, table: Path, **asked: object) -> Stating:
    into = _into(folder)
    result, problems = extract([table], Request(**asked), into)  # type: ignore[arg-type]
    assert result is not None, problems
    done = write_into(result, into, dated=TODAY, trust="measured", confirmed=False)
    assert isinstance(done, Stating), done
    return done


def test_values_errors_source_and_range_are_written(folder: Path, table: Path) -> None:
    done = _write(folder, table)
    digest = hashlib.sha256(table.read_bytes()).hexdigest()
    process, problems = read_process(process_of(folder), shown="p")
    assert process is not None, problems
    device = process.devices["nfet"]
    for name in ("kappa", "threshold", "specific_current", "drain_coupling"):
        value = device.values[name]
        assert value.number is not None
        assert value.standard_error is not None
        assert abs(value.number - getattr(DEVICE, name)) < 4 * value.standard_error
        assert value.source == f"fit of 2026-11-02 to idvg.csv (sha256 {digest[:12]})"
        assert value.trust == "measured"
        assert name in done.written
    assert device.number("drain_coupling_length") == 0.5e-6
    fitted = process.fitted["nfet"]
    assert fitted["dated"] == TODAY
    assert fitted["digest"] == digest
    assert fitted["length_low"] == fitted["length_high"] == 0.5e-6
    assert fitted["source_voltage_high"] == pytest.approx(0.5)
    assert fitted["drain_voltage_high"] == pytest.approx(1.5)
    assert fitted["inversion_low"] < 1e-4
    assert fitted["inversion_high"] > 50.0


def test_everything_else_stays_as_it_was(folder: Path, table: Path) -> None:
    _write(folder, table)
    text = process_of(folder).read_text("utf-8")
    changed = ("kappa", "threshold ", "specific_current ", "drain_coupling ", "drain_coupling_length", "length_mod")
    kept = [line for line in PROCESS.splitlines() if line and not line.startswith(changed)]
    lines = text.splitlines()
    assert [line for line in lines if line in kept] == kept
    assert next(line for line in lines if line.startswith("kappa")).endswith("# gate coupling")
    before, after = tomllib.loads(PROCESS), tomllib.loads(text)
    assert after["corner"] == before["corner"]
    assert after["device"]["nfet"]["threshold_drift"] == "0.8 mV/K"


def test_a_default_replaces_what_the_fit_did_without(folder: Path, table: Path) -> None:
    """The fit stands without length modulation, so a value from elsewhere beside it would be another device."""
    _write(folder, table)
    entry = tomllib.loads(process_of(folder).read_text("utf-8"))["device"]["nfet"]["length_modulation"]
    assert entry["value"] == "0 m/V"
    assert "standard_error" not in entry
    assert "left at its default" in entry["source"]


def test_what_the_data_do_not_fix_stays_as_it_stands(folder: Path, table: Path) -> None:
    done = _write(folder, table)
    assert any("threshold_drift stays as it stands" in one for one in done.kept)
    assert tomllib.loads(process_of(folder).read_text("utf-8"))["device"]["nfet"]["drain_coupling_exponent"] == 1.0


@pytest.mark.full
def test_writing_twice_changes_nothing_more(folder: Path, table: Path) -> None:
    _write(folder, table)
    once = process_of(folder).read_bytes()
    _write(folder, table)
    assert process_of(folder).read_bytes() == once


def test_values_are_moved_to_the_reference_temperature(folder: Path, tmp_path: Path) -> None:
    device = Device(threshold_drift=0.8e-3, mobility_exponent=1.5, reference_temperature=300.15)
    at = noisy(device, grid(np.arange(-0.1, 1.21, 0.025), temperatures=(350.0,)), 0)
    done = _write(folder, write(tmp_path / "hot.csv", at))
    process, _ = read_process(process_of(folder), shown="p")
    assert process is not None
    assert process.devices["nfet"].number("threshold") == pytest.approx(device.threshold, rel=5e-3)
    assert process.devices["nfet"].number("specific_current") == pytest.approx(device.specific_current, rel=0.03)
    assert any("moved from 350.00 K" in one for one in done.kept)


def test_guessed_columns_must_be_confirmed(folder: Path, table: Path) -> None:
    table.write_text(table.read_text().replace("vg,vs,vd,id", "Vgate,Vsource,Vdrain,Idrain", 1))
    into = _into(folder)
    result, _ = extract([table], Request(), into)
    assert result is not None
    refused = write_into(result, into, dated=TODAY, trust="measured", confirmed=False)
    assert isinstance(refused, list)
    assert "vg=Vgate" in refused[0].message
    assert process_of(folder).read_text("utf-8") == PROCESS
    assert isinstance(write_into(result, into, dated=TODAY, trust="measured", confirmed=True), Stating)


def test_another_polarity_a_poor_fit_and_unknown_sizes_are_refused(folder: Path, table: Path, tmp_path: Path) -> None:
    into = _into(folder)
    at = noisy(DEVICE, grid(np.arange(-0.1, 1.21, 0.025)), 0)
    bare = write(tmp_path / "bare.csv", at, ("vg", "vs", "vd", "id"))
    wild = grid(np.arange(-0.1, 1.21, 0.025))
    wild.id = 1e-6 * np.exp(3 * np.sin(25 * wild.vg) + 2 * wild.vg)
    cases = (
        (table, "p", "of polarity n"),
        (bare, "n", "without width and length"),
        (write(tmp_path / "wild.csv", wild), "n", "poor fit"),
    )
    for path, polarity, word in cases:
        result, problems = extract([path], Request(polarity=polarity), into)
        assert result is not None, problems
        refused = write_into(result, into, dated=TODAY, trust="measured", confirmed=True)
        assert isinstance(refused, list)
        assert any(word in one.message for one in refused)
    assert process_of(folder).read_text("utf-8") == PROCESS


def test_a_file_changed_in_the_meantime_is_not_overwritten(folder: Path, table: Path) -> None:
    into = _into(folder)
    result, _ = extract([table], Request(), into)
    assert result is not None
    changed = PROCESS.replace("0.45 V", "0.46 V")
    process_of(folder).write_text(changed, "utf-8")
    refused = write_into(result, into, dated=TODAY, trust="measured", confirmed=True)
    assert isinstance(refused, list)
    assert process_of(folder).read_text("utf-8") == changed


def test_a_value_that_the_file_cannot_hold_is_refused(folder: Path, table: Path) -> None:
    """A stated range that excludes the fitted value is the user's to change."""
    text = PROCESS.replace("value = 0.7, source", "value = 0.7, low = 0.69, high = 0.705, source")
    process_of(folder).write_text(text, "utf-8")
    into = _into(folder)
    result, _ = extract([table], Request(), into)
    assert result is not None
    refused = write_into(result, into, dated=TODAY, trust="measured", confirmed=True)
    assert isinstance(refused, list)
    assert "kappa" in refused[0].key
    assert process_of(folder).read_text("utf-8") == text


def test_a_sheet_inside_the_fitted_range_is_not_remarked_on(folder: Path, table: Path) -> None:
    _write(folder, table)
    (sheet,) = Workbook.read(folder).review(TODAY).sheets
    assert not [note for note in sheet.notes if "fitted" in note.text]


@pytest.mark.parametrize(
    ("old", "new", "about", "word"),
    [
        ('"100 uA"', '"2 mA"', "main.inversion", "inversion coefficient"),
        ('length = "0.5 um"', 'length = "2 um"', "main.length", "fitted up to 500 nm"),
        ("[assume]", '[assume]\ninput_level = "1.7 V"', "main.source_voltage", "source-bulk voltage"),
        ("[assume]", '[assume]\ntemperature = "85 °C"', "main.temperature", "temperature 85 °C"),
    ],
)
def test_a_sheet_outside_the_fitted_range_says_so(
    folder: Path, table: Path, old: str, new: str, about: str, word: str
) -> None:
    _write(folder, table)
    sheet = folder / "sheets" / "buffer.toml"
    sheet.write_text(sheet.read_text("utf-8").replace(old, new), "utf-8")
    (review,) = Workbook.read(folder).review(TODAY).sheets
    assert any(note.about == about and word in note.text for note in review.notes), review.notes
    shown = run("review", str(folder))
    assert "was fitted over" in " ".join(shown.out.split())
