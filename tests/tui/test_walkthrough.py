"""README's walk through a sheet, typed word for word in a real terminal. Run this module to draw its picture anew.

    python -m tests.tui.test_walkthrough

A row of the walk's table holds the keys to press in code spans, and what the screen must then show in italics; the row
with the picture says so.
"""

from __future__ import annotations

import re
import tempfile
from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.paths import TOP
from tests.tui.term import KEYS, Term

README = TOP / "README.md"
_PART = re.compile(r"## A walk through a sheet\n(.*?)\n## ", re.DOTALL)
_PICTURE = re.compile(r"```text\n(.*?)\n```", re.DOTALL)
_PICTURED = "the picture below"


def walk() -> str:
    """The part of README that is typed."""
    found = _PART.search(README.read_text("utf-8"))
    assert found is not None
    return found[1]


def steps() -> list[tuple[list[str], list[str], bool]]:
    """Keys, what is then seen, and whether the picture shows it."""
    rows = [line.strip("|").split(" | ") for line in walk().splitlines() if line.startswith("| `")]
    return [
        (re.findall(r"`([^`]+)`", keys), re.findall(r"(?<!\*)\*([^*]+)\*", seen), _PICTURED in seen)
        for keys, seen in rows
    ]


def typed(home: Path) -> Iterator[tuple[list[str], bool, Term]]:
    """Take every step; what must be seen then, and the terminal."""
    term = Term(["demo", str(home / "gauge")], home, (80, 24), {})
    term.until("Tide gauge readout")
    term.until("wake_comparator")
    term.read(quiet=1.0)
    for keys, seen, pictured in steps():
        for key in keys:
            term.keys(key) if key in KEYS or len(key) == 1 else term.type(key)
        for text in seen:
            term.until(text)
        term.read(quiet=0.8)
        yield seen, pictured, term
    assert term.ended() == 0


def lines(term: Term) -> str:
    """The screen as README holds it."""
    return term.text.rstrip()


@pytest.mark.full
def test_readme_s_walk_does_what_it_says(tmp_path: Path) -> None:
    found = _PICTURE.search(walk())
    assert found is not None
    count = 0
    for seen, pictured, term in typed(tmp_path):
        assert all(text in term.text for text in seen)
        if pictured:
            assert lines(term) == found[1]
        count += 1
    assert count == len(steps()) > 8
    assert '"1.04 um"' in (tmp_path / "gauge" / "sheets" / "pressure_input.toml").read_text("utf-8")


def test_the_walk_has_keys_and_something_to_see_in_every_row() -> None:
    found = steps()
    assert sum(pictured for _, _, pictured in found) == 1
    assert all(keys for keys, _, _ in found)
    assert all(seen for _, seen, _ in found[:-1])


if __name__ == "__main__":
    with tempfile.TemporaryDirectory() as folder:
        for _, drawn, terminal in typed(Path(folder)):
            if drawn:
                text = README.read_text("utf-8")
                README.write_text(text.replace(_PICTURE.findall(walk())[0], lines(terminal)), "utf-8")
