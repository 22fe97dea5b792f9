"""What a merge left in a sheet, shown and settled in the app, with a way back."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import pytest

from tests.tui.driving import Drive, drive
from worksheet.compare.conflict import mark

BLOCK = "sun_gate"
COLLISION = """
[[collision]]
key = "choose.bias_current"
base = '"1 uA"'
ours = '"2 uA"'
theirs = '"3 uA"'
"""


def path(root: Path) -> Path:
    return root / "sheets" / f"{BLOCK}.toml"


def stated(root: Path) -> dict[str, Any]:
    return tomllib.loads(path(root).read_text("utf-8"))


def test_a_collision_is_shown_with_all_sides_and_settled_for_one(root: Path) -> None:
    path(root).write_text(path(root).read_text("utf-8") + COLLISION, "utf-8")

    async def steps(d: Drive) -> None:
        await d.sheet(BLOCK, "collision.0")
        text = "\n".join(d.rows())
        for part in ("choose.bias_current", '"1 uA"', '"2 uA"', '"3 uA"', "two people"):
            assert part in text
        await d.press("k")
        await d.type("theirs")
        await d.press("enter")
        await d.settled()
        assert not any("two people" in row for row in d.rows())

    drive(root, steps)
    assert stated(root)["choose"]["bias_current"] == "3 uA"
    assert "collision" not in stated(root)


@pytest.mark.full
def test_a_file_with_conflict_markers_is_opened_with_both_sides_and_one_is_taken(root: Path) -> None:
    ours = path(root).read_text("utf-8")
    theirs = ours.replace('bias_current = "2 uA"', 'bias_current = "5 uA"')
    assert theirs != ours
    marked = mark(ours, theirs, "HEAD", "colleague")
    path(root).write_text(marked, "utf-8")

    async def steps(d: Drive) -> None:
        await d.settled()
        assert "cannot be read" in next(row for row in d.rows() if BLOCK in row)
        await d.sheet(BLOCK)
        text = "\n".join(d.rows())
        for part in ("HEAD", "colleague", 'bias_current = "2 uA"', 'bias_current = "5 uA"'):
            assert part in text
        await d.press("k", "t")
        await d.settled()
        assert path(root).read_text("utf-8") == theirs
        await d.press("z")
        await d.settled()
        assert path(root).read_text("utf-8") == marked
        await d.press("k", "o")
        await d.settled()

    drive(root, steps)
    assert path(root).read_text("utf-8") == ours


@pytest.mark.full
def test_a_remark_is_added_where_the_cursor_stands(root: Path) -> None:
    async def steps(d: Drive) -> None:
        await d.sheet(BLOCK, "assume.input_level")
        await d.press("a")
        await d.type("remark")
        await d.press("enter")
        for text in ("A. Beispiel", "Which cell?", "", "", "", "", "", ""):
            await d.type(text)
            await d.press("enter")
        await d.settled()
        assert any("Which cell?" in row for row in d.rows())

    drive(root, steps)
    (remark,) = stated(root)["remark"]
    assert (remark["by"], remark["text"], remark["about"]) == ("A. Beispiel", "Which cell?", "assume.input_level")
