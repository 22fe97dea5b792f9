"""Chains in an open book: after every edit what a fresh reading of the files says, to the bit."""

from __future__ import annotations

from pathlib import Path

from tests.cli.books import AMPLIFIER, FOLLOWER, PROCESS, PROJECT, TODAY
from tests.support import write_project
from worksheet.report import plain
from worksheet.session.alternatives import dropping, keeping, taking
from worksheet.session.edits import ChangeSheet, DeleteSheet, Put, RenameSheet, Request
from worksheet.session.session import Session
from worksheet.session.workbook import Workbook

CHAINS = """
[chain.both]
sheets = ["first", "second"]
bandwidth = { min = "1 MHz" }

[chain.one]
sheets = ["second"]
"""
LINKED = FOLLOWER.replace('value = "1.2 pF", source', 'formula = "3*second.input_capacitance + 5e-13", source')
EDITS: tuple[Request, ...] = (
    ChangeSheet("first", (Put(("choose", "bias_current"), "6 uA"),), "more current"),
    ChangeSheet("second", (Put(("choose", "width"), "30 um"),), "wider"),
    ChangeSheet("second", (Put(("title",), "another title"),), "title"),
    ChangeSheet("first", (Put(("variant", "more", "bias_current"), "9 uA"),), "variant"),
)


def _same(session: Session, root: Path) -> list[plain.Plain]:
    found = [plain.chain(chain) for chain in session.review(session.snapshot(), TODAY).chains]
    assert found == [plain.chain(chain) for chain in Workbook.read(root).review(TODAY).chains]
    return found


def test_chains_follow_every_edit(tmp_path: Path) -> None:
    root = write_project(tmp_path, PROJECT + CHAINS, PROCESS, {"first": LINKED, "second": AMPLIFIER})
    session = Session(root)
    before = _same(session, root)
    for edit in EDITS:
        assert session.apply(edit).accepted
        now = _same(session, root)
        moves = edit in EDITS[:2]
        assert (now[0]["metrics"] != before[0]["metrics"]) is moves
        before = now
    while session.snapshot().undo:
        assert session.undo().accepted
        _same(session, root)


def test_a_chain_follows_a_sheet_that_is_renamed_and_keeps_one_from_going(tmp_path: Path) -> None:
    root = write_project(tmp_path, PROJECT + CHAINS, PROCESS, {"first": LINKED, "second": AMPLIFIER})
    before = (root / "biasbook.toml").read_bytes()
    session = Session(root)
    assert session.apply(RenameSheet("second", "third")).accepted
    file = session.snapshot().project.file
    assert file is not None
    assert {name: chain.sheets for name, chain in file.chains.items()} == {
        "both": ("first", "third"),
        "one": ("third",),
    }
    _same(session, root)
    assert session.undo().accepted
    assert (root / "biasbook.toml").read_bytes() == before
    outcome = session.apply(DeleteSheet("second"))
    assert not outcome.accepted
    assert outcome.problems
    assert (root / "sheets" / "second.toml").exists()


def test_what_is_kept_is_what_is_taken(tmp_path: Path) -> None:
    root = write_project(tmp_path, PROJECT, PROCESS, {"first": FOLLOWER})
    session = Session(root)
    stated = session.snapshot().project.sheets["first"]
    assert session.apply(keeping(stated, "before", "as it was")).accepted
    assert session.apply(ChangeSheet("first", (Put(("choose", "width"), "9 um"),), "narrower")).accepted
    changed = session.snapshot().project.sheets["first"]
    assert changed.variants["before"].note == "as it was"
    assert session.apply(taking(changed, changed.variants["before"])).accepted
    back = session.snapshot().project.sheets["first"]
    assert {name: value.number for name, value in back.choose.items()} == {
        name: value.number for name, value in stated.choose.items()
    }
    assert session.apply(dropping(back, "before")).accepted
    assert not session.snapshot().project.sheets["first"].variants
