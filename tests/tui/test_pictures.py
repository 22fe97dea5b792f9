"""Whole screens of the sample as a real terminal shows them, kept as text. Run this module to draw them anew.

    python -m tests.tui.test_pictures

Read the difference before it is committed: these files are what a user sees.
"""

from __future__ import annotations

import shutil
import tempfile
from pathlib import Path

import pytest

from tests.paths import TOP
from tests.tui.term import running

FOLDER = Path(__file__).parent / "pictures"
SIZES = ((80, 24), (120, 40))
SCREENS: dict[str, tuple[tuple[str, ...], str, str]] = {
    "project": ((), "wake_comparator", "wake_comparator"),
    "sheet": (("down", "enter"), "step 5 %", "by hand"),
    "map": (("down", "enter", "m"), "Closer", "where all targets hold in"),
    "meeting": (("g",), "to decide in", "to decide in"),
    "help": (("?",), "esc goes back", "esc goes back"),
}
"""Keys that lead to a screen, and what it shows when it is complete, narrow and wide."""


def drawn(folder: Path, name: str, size: tuple[int, int]) -> str:
    """A screen of a copy of the sample."""
    root = folder / "tide_gauge"
    if not root.exists():
        shutil.copytree(TOP / "sample_projects" / "tide_gauge", root)
    keys, *complete = SCREENS[name]
    with running(root, home=folder, size=size) as term:
        term.until("wake_comparator")
        term.read(quiet=1.0)
        term.keys(*keys)
        term.until(complete[SIZES.index(size)])
        term.read(quiet=2.5)
        return term.text.rstrip() + "\n"


def path(name: str, size: tuple[int, int]) -> Path:
    """Where a picture is kept."""
    return FOLDER / f"{name}_{size[0]}x{size[1]}.txt"


@pytest.mark.full
@pytest.mark.parametrize("size", SIZES)
@pytest.mark.parametrize("name", list(SCREENS))
def test_a_screen_is_as_it_was(tmp_path: Path, name: str, size: tuple[int, int]) -> None:
    assert drawn(tmp_path, name, size) == path(name, size).read_text("utf-8")


def test_every_picture_is_of_a_screen_that_is_drawn() -> None:
    kept = {one.name for one in FOLDER.iterdir()}
    assert kept == {path(name, size).name for name in SCREENS for size in SIZES}


if __name__ == "__main__":
    FOLDER.mkdir(exist_ok=True)
    with tempfile.TemporaryDirectory() as home:
        for screen in SCREENS:
            for each in SIZES:
                path(screen, each).write_text(drawn(Path(home), screen, each), "utf-8")
