"""One value and one metric over revisions: who, when, why, what it was, against what the files said then."""

from __future__ import annotations

import csv
import datetime
import io
import json
from pathlib import Path

import pytest

from tests.cli import books
from tests.history.repositories import git
from tests.support import run
from worksheet.model.problem import Problem
from worksheet.session import revisions, tracing
from worksheet.session.workbook import Workbook

TODAY = datetime.date(2026, 12, 1)
CURRENTS = ("4 uA", "5 uA", "5 uA", "6 uA")


@pytest.fixture
def book(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Four revisions: the current moves twice, the third changes a note alone."""
    monkeypatch.setenv("HOME", str(tmp_path))
    monkeypatch.setenv("GIT_CEILING_DIRECTORIES", str(tmp_path))
    made = tmp_path / "book"
    for number, current in enumerate(CURRENTS):
        for who in ("AUTHOR", "COMMITTER"):
            monkeypatch.setenv(f"GIT_{who}_NAME", f"Person {number}")
            monkeypatch.setenv(f"GIT_{who}_EMAIL", "person@example.org")
        sheet = books.replaced(books.FOLLOWER, '"4 uA"', f'"{current}"')
        sheet = books.replaced(sheet, "sense line", f"sense line {number}")
        if made.exists():
            (made / "sheets" / f"{books.BUFFER}.toml").write_text(sheet, "utf-8")
        else:
            books.write(made, sheet)
        assert not isinstance(revisions.record(made, f"Step {number}", TODAY), Problem)
    return made


def test_a_value_is_followed_through_its_changes(book: Path) -> None:
    found = tracing.value(book, books.BUFFER, "choose.bias_current")
    assert not isinstance(found, Problem)
    assert [(one.value, one.revision.by, one.revision.note) for one in found] == [
        (6e-6, "Person 3", "Step 3"),
        (5e-6, "Person 1", "Step 1"),
        (4e-6, "Person 0", "Step 0"),
    ]
    assert {one.unit for one in found} == {"A"}
    for one in found:
        text = git(book, "show", f"{one.revision.revision}:sheets/{books.BUFFER}.toml")
        assert f'bias_current = "{one.value * 1e6:.0f} uA"' in text


def test_a_value_that_never_was_is_told_with_a_suggestion(book: Path) -> None:
    found = tracing.value(book, books.BUFFER, "choose.bias_curent")
    assert isinstance(found, Problem)
    assert "did you mean choose.bias_current?" in found.message


def test_a_metric_is_what_each_revision_gives_by_itself(book: Path, tmp_path: Path) -> None:
    found = tracing.metric(book, books.BUFFER, "bandwidth", TODAY)
    assert not isinstance(found, Problem)
    assert len(found) == len(CURRENTS)
    for one, current in zip(found, reversed(CURRENTS), strict=True):
        sheet = books.replaced(books.FOLLOWER, '"4 uA"', f'"{current}"')
        alone = Workbook.read(books.write(tmp_path / one.revision.revision, sheet)).review(TODAY)
        result = next(s for s in alone.sheets if s.sheet.name == books.BUFFER)
        assert one.nominal == result.metrics["bandwidth"].value
        assert one.worst == result.targets[0].worst
        assert one.verdict == result.targets[0].verdict


def test_the_command_tells_both_in_every_format(book: Path) -> None:
    document = json.loads(run("history", str(book), books.BUFFER, "--value", "choose.bias_current", "--json").out)
    assert [row["value"] for row in document["history"]] == [6e-6, 5e-6, 4e-6]
    rows = list(
        csv.DictReader(io.StringIO(run("history", str(book), books.BUFFER, "--metric", "bandwidth", "--csv").out))
    )
    assert len(rows) == len(CURRENTS)
    assert float(rows[0]["nominal"]) > float(rows[-1]["nominal"])
    text = run("history", str(book), books.BUFFER, "--metric", "bandwidth").out
    assert "Step 3" in text
    assert max(map(len, text.splitlines())) <= 80
    limited = json.loads(run("history", str(book), books.BUFFER, "--metric", "share", "--most", "2", "--json").out)
    assert len(limited["history"]) == 2
    for wrong in (["--metric", "bandwidht"], ["--value", "x", "--metric", "y"]):
        assert run("history", str(book), books.BUFFER, *wrong).status == 2
    assert run("history", str(book), "--value", "choose.width").status == 2


def test_stale_evidence_says_what_moved_since_it_was_found(book: Path) -> None:
    assert run("evidence", str(book), "--add", books.BUFFER, "bandwidth", "7 MHz").status == 0
    assert not isinstance(revisions.record(book, "With evidence", TODAY), Problem)
    path = book / "sheets" / f"{books.BUFFER}.toml"
    path.write_text(books.replaced(path.read_text("utf-8"), 'width = "20 um"', 'width = "25 um"'), "utf-8")
    said = " ".join(run("evidence", str(book)).out.split())
    assert "stale" in said
    assert "moved: choose.width: 20 µm -> 25 µm" in said
