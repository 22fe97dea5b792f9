"""What may be typed at a place: every described key has one, its example is taken, a slip is named."""

from __future__ import annotations

import datetime
from pathlib import Path

import pytest

from tests.session.opened import messages, opened, stated, typed
from worksheet.model.keys import ANNOTATIONS, Key, Kind
from worksheet.model.sheet_keys import EVIDENCE, SHEET, TARGET_KEYS, WAIVER
from worksheet.session import fields
from worksheet.session.edits import KeyPath
from worksheet.session.fields import Place
from worksheet.session.session import Session


def _place(session: Session, sheet: str, *path: str | int) -> Place:
    found = fields.place(session.snapshot(), sheet, path)
    assert found is not None, path
    return found


def _paths(session: Session, sheet: str) -> list[KeyPath]:
    """Every place of a sheet that the descriptions know."""
    data = session.snapshot().data(sheet)
    known: list[KeyPath] = [(key.name,) for key in SHEET.keys]
    for name, key in fields.stage_keys(data).items():
        table = "choose" if name in session.snapshot().project.sheets[sheet].choose else "assume"
        known.append((table, name))
        if key.annotated:
            known += [(table, name, note.name) for note in ANNOTATIONS.keys if note.name not in ("value", "formula")]
    known += [("target", "bandwidth", key.name) for key in TARGET_KEYS]
    known += [("evidence", 0, key.name) for key in EVIDENCE.keys]
    known += [(table.name, key.name) for table in SHEET.tables if table.name in ("bias", "solve") for key in table.keys]
    return known


def test_every_described_key_has_a_place_with_help_of_its_own(tmp_path: Path) -> None:
    session = opened(tmp_path)
    seen: dict[str, str] = {}
    for path in _paths(session, "bucket_buffer"):
        place = _place(session, "bucket_buffer", *path)
        assert place.key.help
        assert place.key.title
        assert isinstance(fields.read(place, "?!"), str | tuple)
        fields.complete(place, "")
        if len(path) == 2 and path[0] in ("assume", "choose"):
            assert seen.setdefault(place.key.help, place.key.name) == place.key.name
    assert len(seen) > 10


def _examples() -> list[tuple[KeyPath, str]]:
    found: list[tuple[KeyPath, str]] = []
    for table in (*SHEET.tables, SHEET):
        if not table.repeated and table.name not in ("target", "own"):
            prefix = (table.name,) if table.name else ()
            found += [((*prefix, key.name), key.example) for key in table.keys if key.example and key.name != "schema"]
    return found


@pytest.mark.parametrize(("path", "text"), _examples(), ids=str)
def test_the_example_of_every_key_is_taken_as_typed(tmp_path: Path, path: KeyPath, text: str) -> None:
    session = opened(tmp_path)
    place = fields.place(session.snapshot(), "bucket_buffer", path)
    if place is None:
        assert path[-1] in ("output_level", "well_capacitance"), "what its stage does not take"
        return
    read = fields.read(place, text)
    assert isinstance(read, tuple), read


def test_numbers_stand_in_the_file_as_typed(tmp_path: Path) -> None:
    session = opened(tmp_path)
    for path, text, stands in (
        (("choose", "width"), "20.0 µm", "20.0 µm"),
        (("choose", "fingers"), "2", 2),
        (("target", "bandwidth", "guard"), "10 %", "10 %"),
        (("target", "dc_gain", "min"), "-6 dB", "-6 dB"),
        (("assume", "settling_tolerance"), "1e-3", 1e-3),
        (("assume", "supply"), "1.7 V, 1.8 V", ["1.7 V", "1.8 V"]),
        (("evidence", 0, "dated"), "2026-11-02", datetime.date(2026, 11, 2)),
        (("evidence", 0, "at"), "slow, 85 °C, 1.71 V", {"process": "slow", "temperature": "85 °C", "supply": "1.71 V"}),
    ):
        done = typed(session, "bucket_buffer", path, text)
        assert done.accepted, messages(done)
        assert stated(session.snapshot(), "bucket_buffer", *path) == stands
    text = (session.root / "sheets" / "bucket_buffer.toml").read_text("utf-8")
    assert "settling_tolerance = 1e-3\n" in text
    again = typed(session, "bucket_buffer", ("evidence", 0, "at"), "fast, 27 °C, 1.8 V")
    assert again.accepted, messages(again)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("slow", "3 values"),
        ("slowly, 27 °C, 1.8 V", "did you mean slow"),
        ("slow, 27 V, 1.8 V", "does not fit"),
        ("slow, 27 °C, 0 V", "above 0"),
    ],
)
def test_a_condition_with_a_slip_is_named(tmp_path: Path, text: str, said: str) -> None:
    session = opened(tmp_path)
    read = fields.read(_place(session, "bucket_buffer", "evidence", 0, "at"), text)
    assert isinstance(read, str)
    assert said in read


def test_a_number_and_a_formula_take_each_others_place_and_keep_what_is_beside(tmp_path: Path) -> None:
    session = opened(tmp_path)
    path = session.root / "sheets" / "supply_sense.toml"
    before = path.read_bytes()
    assert typed(session, "supply_sense", ("assume", "load_capacitance"), "1.5 pF").accepted
    assert b'{ value = "1.5 pF", source = "two of them", trust = "estimate" }' in path.read_bytes()
    text = "2*drip_amplifier.input_capacitance + 200e-15"
    assert typed(session, "supply_sense", ("assume", "load_capacitance"), text).accepted
    assert path.read_bytes() == before


def test_nothing_typed_takes_a_key_out_and_leaves_it_to_the_solver(tmp_path: Path) -> None:
    session = opened(tmp_path)
    for text in ("", "propose"):
        assert typed(session, "bucket_buffer", ("choose", "bias_current"), text).accepted
        sheet = session.snapshot().project.sheets["bucket_buffer"]
        assert "bias_current" not in sheet.choose or sheet.choose["bias_current"].propose
    assert not typed(session, "bucket_buffer", ("assume", "load_capacitance"), "").accepted
    assert not typed(session, "bucket_buffer", ("assume", "input_level"), "propose").accepted


@pytest.mark.parametrize(
    ("path", "text", "wanted"),
    [
        (("choose", "bias_current"), "4 u", "4 uA"),
        (("choose", "bias_current"), "4", "4 mA"),
        (("choose", "bias_current"), "pro", "propose"),
        (("assume", "load_capacitance"), "2*drip_amplifier.input_c", "2*drip_amplifier.input_capacitance"),
        (("assume", "load_capacitance"), "sqrt(drip", "sqrt(drip_amplifier.input_capacitance"),
        (("assume", "load_capacitance", "trust"), "me", "measured"),
        (("stage",), "casc", "cascode"),
        (("device",), "n", "nfet"),
        (("bias", "device"), "", "ideal"),
        (("state",), "acc", "accepted"),
        (("evidence", 0, "metric"), "bandw", "bandwidth"),
        (("evidence", 0, "at"), "sl", "slow, "),
        (("target", "bandwidth", "min"), "3 M", "3 MHz"),
        (("assume", "temperature"), "27", "27 °C"),
    ],
)
def test_completion_knows_units_devices_sheets_and_names(tmp_path: Path, path: KeyPath, text: str, wanted: str) -> None:
    session = opened(tmp_path)
    found = fields.complete(_place(session, "bucket_buffer", *path), text)
    assert wanted in found or any(one.startswith("sqrt(drip_amplifier.") for one in found if wanted.startswith("sqrt"))


def test_what_is_completed_is_never_refused_for_its_form(tmp_path: Path) -> None:
    session = opened(tmp_path)
    for path in _paths(session, "bucket_buffer"):
        place = _place(session, "bucket_buffer", *path)
        if place.key.kind in (Kind.CHOICE, Kind.NAME):
            for text in fields.complete(place, ""):
                assert isinstance(fields.read(place, text), tuple)


def test_waivers_name_targets_only(tmp_path: Path) -> None:
    session = opened(tmp_path)
    place = fields.coming(session.snapshot(), "bucket_buffer", ("waiver", 0, "target"), "")
    assert place is not None
    assert set(place.known) == {"bandwidth", "dc_gain", "power", "output_noise"}
    assert isinstance(fields.read(place, "slew_rate"), str)
    keys = [fields.coming(session.snapshot(), "bucket_buffer", ("waiver", 0, key.name), "bandwidth") for key in WAIVER]
    value: Key = next(one.key for one in keys if one is not None and one.key.name == "value")
    assert value.dimension is not None
    assert value.dimension.unit == "Hz"
