"""One change at a time: what is on disk when it is made, what is refused, and what follows it in other sheets."""

from __future__ import annotations

import stat
from pathlib import Path

import pytest

from tests.session.opened import contents, messages, opened, put, stated, typed
from worksheet.session.edits import (
    AddEntry,
    ChangeSheet,
    DeleteSheet,
    DuplicateSheet,
    NewSheet,
    Put,
    RenameSheet,
    Request,
    SettleCollision,
    TakeOut,
    TakeSide,
)
from worksheet.session.session import READ_ONLY, Session
from worksheet.stages import catalogue

BUCKET = "sheets/bucket_buffer.toml"


def test_a_change_is_on_disk_when_made_and_touches_no_other_byte(tmp_path: Path) -> None:
    session = opened(tmp_path)
    before = contents(session.root)
    done = typed(session, "bucket_buffer", ("choose", "bias_current"), "5 uA")
    assert done.accepted
    after = contents(session.root)
    wanted = before[BUCKET].replace(b'bias_current = "4 uA"    # to be', b'bias_current = "5 uA"    # to be')
    assert after == {**before, BUCKET: wanted}
    assert session.snapshot().project.sheets["bucket_buffer"].choose["bias_current"].number == 5e-6


@pytest.mark.parametrize(
    ("path", "text", "said"),
    [
        (("choose", "bias_current"), "10 kHz", "current"),
        (("choose", "bias_current"), "4", "unit is missing"),
        (("choose", "width"), "0.1 um", "process limits"),
        (("choose", "length"), "drip_amplifier.nothing", "no name"),
        (("assume", "load_capacitance", "low"), "2 pF", "at most the value"),
        (("assume", "input_level"), "-1 V", "at least 0"),
        (("target", "dc_gain", "min"), "2", "at most the other limit"),
        (("target", "bandwidth", "guard"), "some", "does not begin with a number"),
        (("device",), "nfett", "did you mean nfet"),
        (("bias", "device"), "pfet", "ideal"),
        (("bulk",), "source", "no well"),
        (("state",), "done", "for-review"),
        (("count",), "0", "at least 1"),
        (("stage",), "", "cannot be left out"),
        (("evidence", 0, "dated"), "yesterday", "2026"),
        (("evidence", 0, "value"), "5 V", "frequency"),
    ],
)
def test_what_is_wrong_never_enters_the_sheet(tmp_path: Path, path: tuple[str, ...], text: str, said: str) -> None:
    session = opened(tmp_path)
    before, revision = contents(session.root), session.snapshot().revision
    refused = typed(session, "bucket_buffer", path, text)
    assert not refused.accepted
    assert said in messages(refused)
    assert contents(session.root) == before
    assert session.snapshot().revision == revision
    assert session.snapshot().undo == ""


def test_what_would_break_another_sheet_is_refused_with_its_name(tmp_path: Path) -> None:
    session = opened(tmp_path)
    before = contents(session.root)
    for request in (
        DeleteSheet("drip_amplifier"),
        ChangeSheet("drip_amplifier", (Put(("assume", "load_capacitance", "formula"), "supply_sense.gate_area"),), ""),
    ):
        refused = session.apply(request)
        assert not refused.accepted
        assert "drip_amplifier" in messages(refused)
        assert "supply_sense" in messages(refused)
    assert contents(session.root) == before


def test_own_names_come_with_their_formula_and_go_with_it(tmp_path: Path) -> None:
    session = opened(tmp_path)
    assert put(session, "wind_cascode", TakeOut(("target", "rate_margin"))).unused == ("sample_rate",)
    assert put(session, "wind_cascode", TakeOut(("target", "rate_margin")), TakeOut(("own", "sample_rate"))).accepted
    assert put(session, "wind_cascode", Put(("own", "pitch"), "3 um")).unused == ("pitch",)
    both = (Put(("own", "pitch"), "3 um"), Put(("choose", "width", "formula"), "4*pitch"))
    assert put(session, "wind_cascode", *both).accepted
    assert session.snapshot().project.problems == ()


def test_a_formula_out_of_its_range_is_refused(tmp_path: Path) -> None:
    session = opened(tmp_path)
    refused = typed(session, "supply_sense", ("assume", "load_capacitance"), "drip_amplifier.input_capacitance - 1")
    assert "at least 0" in messages(refused)


def test_a_sheet_with_problems_is_put_right_one_by_one(tmp_path: Path) -> None:
    session = opened(tmp_path)
    path = session.root / BUCKET
    text = path.read_text("utf-8").replace('"nfet"', '"nfett"').replace('width = "20 um"', 'width = "0.1 um"')
    path.write_text(text.replace("min = 0.65", "mim = 0.65"), "utf-8")
    assert session.refresh()
    assert session.snapshot().project.bad == ("bucket_buffer",)
    assert put(session, "bucket_buffer", TakeOut(("target", "dc_gain", "mim"))).accepted
    assert typed(session, "bucket_buffer", ("device",), "nfet").accepted, "the width that comes to light is older"
    assert not typed(session, "bucket_buffer", ("choose", "width"), "0.2 um").accepted
    assert typed(session, "bucket_buffer", ("choose", "width"), "20 um").accepted
    assert session.snapshot().project.problems == ()
    assert session.apply(RenameSheet("bucket_buffer", "pail_buffer")).accepted


def test_a_sheet_with_problems_can_be_renamed_copied_and_taken_out(tmp_path: Path) -> None:
    session = opened(tmp_path)
    (session.root / BUCKET).write_text("schema = 1\n", "utf-8")
    for request in (
        RenameSheet("bucket_buffer", "pail"),
        DuplicateSheet("pail", "tub"),
        DeleteSheet("pail"),
        DeleteSheet("tub"),
    ):
        assert session.apply(request).accepted, request
    assert session.snapshot().project.problems == ()


def test_a_new_sheet_is_right_for_every_stage(tmp_path: Path) -> None:
    session = opened(tmp_path)
    for number, stage in enumerate(catalogue.keys()):
        assert session.apply(NewSheet(f"block_{number}", stage, "pfet", 'Block "one"\n\x1b[31m')).accepted
    assert session.snapshot().project.problems == ()
    assert stated(session.snapshot(), "block_0", "title") == 'Block "one"\n\x1b[31m'


@pytest.mark.parametrize(
    "name", ["", "../out", "a/b", "a b", "class", "sqrt", "ä" * 200, "bucket_buffer", "x.y", "\x1b[2J"]
)
def test_a_name_that_cannot_be_one_is_refused(tmp_path: Path, name: str) -> None:
    session = opened(tmp_path)
    before = contents(session.root)
    for request in (
        NewSheet(name, "cascode", "nfet"),
        DuplicateSheet("drip_amplifier", name),
        RenameSheet("drip_amplifier", name),
    ):
        refused = session.apply(request)
        assert refused.problems
        assert "\x1b" not in messages(refused)
    assert contents(session.root) == before


def test_a_request_about_no_sheet_is_a_problem(tmp_path: Path) -> None:
    session = opened(tmp_path)
    requests: tuple[Request, ...] = (
        DeleteSheet("none"),
        RenameSheet("none", "some"),
        DuplicateSheet("none", "some"),
        ChangeSheet("none", (Put(("title",), "x"),), ""),
        SettleCollision("none", 0, "ours"),
        TakeSide("none", "ours"),
        NewSheet("some", "no-stage", "nfet"),
        NewSheet("some", "cascode", "no_device"),
    )
    for request in requests:
        assert session.apply(request).problems, request


def test_references_follow_a_rename_wherever_they_stand(tmp_path: Path) -> None:
    session = opened(tmp_path)
    more = (
        Put(("target", "share"), {"formula": "drip_amplifier.power/power + drip_amplifier.width", "max": 100}),
        AddEntry("waiver", {"target": "bandwidth", "by": "drip_amplifier.power", "reason": "drip_amplifier.power"}),
        Put(("notes",), "see drip_amplifier.power"),
    )
    assert put(session, "supply_sense", *more).accepted
    broken = session.root / "sheets" / "broken.toml"
    broken.write_text(
        'schema = 1\nstage = "cascode"\n[own]\nx = { formula = "2*drip_amplifier.power" } # kept\n', "utf-8"
    )
    (session.root / "sheets" / "drip_amplifier.toml").chmod(0o640)
    assert session.apply(RenameSheet("drip_amplifier", "drop_amplifier")).accepted
    text = (session.root / "sheets" / "supply_sense.toml").read_text("utf-8")
    assert 'formula = "2*drop_amplifier.input_capacitance + 200e-15"' in text
    assert 'formula = "drop_amplifier.power/power + drop_amplifier.width"' in text
    assert text.count("drip_amplifier.power") == 3, "evidence, waivers and notes are people's words"
    assert '"2*drop_amplifier.power" } # kept' in broken.read_text("utf-8")
    assert not (session.root / "sheets" / "drip_amplifier.toml").exists()
    moved = session.root / "sheets" / "drop_amplifier.toml"
    assert stat.S_IMODE(moved.stat().st_mode) == 0o640
    assert {p.file for p in session.snapshot().project.problems} == {"sheets/broken.toml"}
    assert session.undo().accepted
    assert stat.S_IMODE((session.root / "sheets" / "drip_amplifier.toml").stat().st_mode) == 0o640


def test_a_copy_refers_to_itself_where_the_original_did(tmp_path: Path) -> None:
    session = opened(tmp_path)
    target = {"formula": "drip_amplifier.width/drip_amplifier.length", "max": 100}
    assert put(session, "drip_amplifier", Put(("target", "aspect"), target)).accepted
    assert session.apply(DuplicateSheet("drip_amplifier", "second")).accepted
    assert stated(session.snapshot(), "second", "target", "aspect", "formula") == "second.width/second.length"


def test_collisions_of_a_merge_are_settled(tmp_path: Path) -> None:
    session = opened(tmp_path)
    before = contents(session.root)
    collision = {"key": "choose.width", "base": '"20 um"', "ours": '"20 um"', "theirs": '"24 um"'}
    assert put(session, "bucket_buffer", AddEntry("collision", collision)).accepted
    assert session.apply(SettleCollision("bucket_buffer", 0, "theirs")).accepted
    assert stated(session.snapshot(), "bucket_buffer", "choose", "width") == "24 um"
    assert stated(session.snapshot(), "bucket_buffer", "collision") is None
    assert session.undo().accepted
    assert session.apply(SettleCollision("bucket_buffer", 0, "standing")).accepted
    assert (session.root / BUCKET).read_bytes().rstrip() == before[BUCKET].rstrip()
    assert session.apply(SettleCollision("bucket_buffer", 0, "theirs")).problems


def test_conflict_markers_are_a_problem_with_two_sides(tmp_path: Path) -> None:
    session = opened(tmp_path)
    path = session.root / BUCKET
    text = path.read_text("utf-8")
    marked = text.replace(
        'width = "20 um"\n', '<<<<<<< HEAD\nwidth = "20 um"\n=======\nwidth = "24 um"\n>>>>>>> floor-plan\n'
    )
    path.write_text(marked, "utf-8")
    session.refresh()
    assert "conflict marker" in session.snapshot().problems_of("bucket_buffer")[0].message
    sides = session.snapshot().sides("bucket_buffer")
    assert sides is not None
    assert (sides.our_label, sides.their_label) == ("HEAD", "floor-plan")
    assert session.apply(TakeSide("bucket_buffer", "theirs")).accepted
    assert stated(session.snapshot(), "bucket_buffer", "choose", "width") == "24 um"
    assert session.undo().accepted
    assert path.read_text("utf-8") == marked
    assert session.apply(TakeSide("bucket_buffer", "ours")).accepted
    assert path.read_text("utf-8") == text
    assert session.snapshot().sides("bucket_buffer") is None


def test_nothing_is_written_when_opened_for_reading(tmp_path: Path) -> None:
    root = opened(tmp_path).root
    session = Session(root, read_only=True)
    before = contents(root)
    for outcome in (typed(session, "bucket_buffer", ("title",), "x"), session.undo(), session.redo()):
        assert messages(outcome) == READ_ONLY
    assert contents(root) == before
    assert session.snapshot().read_only
