"""The merge driver as a user has it: installed by its one command, called by git in real merges."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest

from tests.cli import books
from tests.history.repositories import git
from tests.paths import TOP
from tests.support import run
from worksheet.report import plain
from worksheet.session.workbook import Workbook

PLACES = ("book", "chip/a b [1]", "#odd")


@pytest.fixture(params=PLACES)
def book(request: pytest.FixtureRequest, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A project on two branches, in folders whose names a pattern could misread."""
    monkeypatch.setenv("HOME", str(tmp_path))
    monkeypatch.setenv("GIT_CONFIG_NOSYSTEM", "1")
    monkeypatch.setenv("PATH", "/usr/bin:/bin")
    monkeypatch.setenv("PYTHONPATH", str(TOP))
    monkeypatch.setenv("GIT_CEILING_DIRECTORIES", str(tmp_path))
    for who in ("AUTHOR", "COMMITTER"):
        monkeypatch.setenv(f"GIT_{who}_NAME", "M. Roe")
        monkeypatch.setenv(f"GIT_{who}_EMAIL", "roe@example.org")
    top = tmp_path / "top"
    made = books.write(top / str(request.param))
    git(top, "init", "-q", "-b", "main")
    commit(made)
    assert run("merge", "--install", str(made)).out == "git merges this project's files by value now\n"
    git(top, "branch", "side")
    return made


def commit(book: Path) -> None:
    git(book, "add", ".")
    git(book, "commit", "-q", "-m", "step")


def change(book: Path, *pairs: tuple[str, str]) -> None:
    path = book / "sheets" / f"{books.BUFFER}.toml"
    text = path.read_text("utf-8")
    for old, new in pairs:
        text = books.replaced(text, old, new)
    path.write_text(text, "utf-8")
    commit(book)


def sides(book: Path, ours: tuple[str, str], theirs: tuple[str, str]) -> None:
    change(book, ours)
    git(book, "checkout", "-q", "side")
    change(book, theirs)
    git(book, "checkout", "-q", "main")


def test_neighbouring_values_of_two_people_merge(book: Path) -> None:
    sides(book, ('bias_current = "4 uA"', 'bias_current = "5 uA"'), ('width = "20 um"', 'width = "21 um"'))
    git(book, "merge", "-q", "-m", "both", "side")
    chosen = tomllib.loads((book / "sheets" / f"{books.BUFFER}.toml").read_text("utf-8"))["choose"]
    assert (chosen["bias_current"], chosen["width"]) == ("5 uA", "21 um")
    assert git(book, "status", "--porcelain") == ""


def test_a_true_collision_stops_the_merge_and_the_review_shows_both(book: Path) -> None:
    sides(book, ('"4 uA"', '"5 uA"'), ('"4 uA"', '"6 uA"'))
    git(book, "merge", "-q", "-m", "both", "side", check=False)
    assert git(book, "ls-files", "-u"), "git holds the file as unmerged"
    said = run("review", str(book))
    assert 'choose.bias_current: ours "5 uA", theirs "6 uA"' in " ".join(said.out.split())
    (collision,) = next(
        plain.sheet(one)["collisions"]
        for one in Workbook.read(book).review(books.TODAY).sheets
        if one.sheet.name == books.BUFFER
    )
    assert collision == {"key": "choose.bias_current", "base": '"4 uA"', "ours": '"5 uA"', "theirs": '"6 uA"'}


def test_installing_again_changes_nothing_and_keeps_what_others_wrote(book: Path) -> None:
    place = book / git(book, "rev-parse", "--git-path", "info/attributes")
    place.write_text("*.png binary\n" + place.read_text("utf-8"), "utf-8")
    before = place.read_text("utf-8")
    assert run("merge", "--install", str(book)).out == "it was installed already\n"
    assert place.read_text("utf-8") == before


def test_what_cannot_be_done_is_said(tmp_path: Path) -> None:
    assert run("merge", str(tmp_path / "a"), str(tmp_path / "b"), str(tmp_path / "c")).status == 2
    assert run("merge", str(tmp_path)).status == 2
    lonely = books.write(tmp_path / "book")
    found = run("merge", "--install", str(lonely))
    assert found.status == 2
    assert "git" in found.err
