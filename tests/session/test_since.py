"""What moved since a block was accepted and since its evidence was found, as git remembers it."""

from __future__ import annotations

import datetime
import json
from pathlib import Path

import pytest

from tests.cli import books
from tests.history.repositories import signed
from tests.support import run
from worksheet.compare.inputs import Moved
from worksheet.model.problem import Problem
from worksheet.review.results import SheetReview
from worksheet.review.state import Past, left_behind
from worksheet.session import revisions
from worksheet.session.since import Since
from worksheet.session.workbook import Workbook

TODAY = datetime.date(2026, 12, 1)

ENTRIES = """
[[evidence]]
metric = "bandwidth"
value = "5 MHz"
found_by = "simulation"
basis = "{0}"

[[evidence]]
metric = "dc_gain"
value = 0.7
found_by = "simulation"
basis = "{0}"

[[acceptance]]
by = "M. Roe"
basis = "{0}"
"""


def reviewed(book: Path) -> SheetReview:
    return next(one for one in Workbook.read(book).review(TODAY).sheets if one.sheet.name == books.BUFFER)


def write(book: Path, *changes: tuple[str, str], entries: str = "") -> None:
    text = books.replaced(books.FOLLOWER, "[assume]", 'state = "accepted"\n\n[assume]')
    for old, new in changes:
        text = books.replaced(text, old, new)
    books.write(book, text + entries)


@pytest.fixture
def book(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A block accepted with evidence, recorded, and no revision since."""
    signed(monkeypatch, tmp_path)
    made = tmp_path / "book"
    write(made)
    write(made, entries=ENTRIES.format(reviewed(made).basis))
    assert not isinstance(revisions.record(made, "Accepted", TODAY), Problem)
    return made


def entries(book: Path) -> str:
    return (
        "\n[[evidence]]" + (book / "sheets" / f"{books.BUFFER}.toml").read_text("utf-8").split("\n[[evidence]]", 1)[1]
    )


def test_nothing_is_left_behind_while_inputs_stand(book: Path) -> None:
    assert left_behind(reviewed(book)) == ()
    write(book, ("sense line", "sense line 2"), entries=entries(book))
    assert left_behind(reviewed(book)) == (), "a note moves no result"


def test_what_moved_is_named_for_the_acceptance_and_for_evidence(book: Path) -> None:
    then = reviewed(book).basis
    write(book, ('"4 uA"', '"5 uA"'), ("sense line", "sense line 2"), entries=entries(book))
    result = reviewed(book)
    about = (Past("accepted by M. Roe", then), Past("evidence on bandwidth, dc_gain", then))
    assert left_behind(result) == about
    found = Since(book, TODAY).of(result)
    assert tuple(one.past for one in found) == about
    listed = revisions.history(book)
    assert not isinstance(listed, Problem)
    for one in found:
        assert one.revision == listed[0].revision
        assert one.moved == (Moved("choose.bias_current", 4e-6, 5e-6, "A"),)
    told = json.loads(run("agenda", str(book), "--json").out)["moved"]
    assert [(one["sheet"], one["about"], one["since"]) for one in told] == [
        (books.BUFFER, one.past.about, one.revision) for one in found
    ]
    assert told[0]["inputs"] == [{"key": "choose.bias_current", "old": 4e-6, "new": 5e-6, "unit": "A"}]
    text = " ".join(run("agenda", str(book)).out.split())
    assert f"accepted by M. Roe: since {found[0].revision[:10]} moved: choose.bias_current: 4 µA -> 5 µA" in text


def test_inputs_that_were_never_recorded_are_said_to_be_unknown(book: Path) -> None:
    write(book, ('"4 uA"', '"5 uA"'), entries=ENTRIES.format("000000000000"))
    (one, *_) = Since(book, TODAY).of(reviewed(book))
    assert (one.revision, one.moved) == ("", ())
    assert "no recorded revision has the inputs" in " ".join(run("agenda", str(book)).out.split())
