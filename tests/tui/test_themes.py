"""Themes as data: complete, with the contrast of WCAG 2.2 AA, the user's own beside them, the choice remembered.

Contrast: W3C, Web Content Accessibility Guidelines 2.2, success criteria 1.4.3 (4.5 to 1 for text) and 1.4.11 (3 to 1
for what is needed to understand a picture). The extremes of the ratio, 1 and 21, are the standard's own.
"""

import itertools
from pathlib import Path

import pytest

from worksheet.tui import themes
from worksheet.tui.themes import Colours

PALETTE = {
    "black": "#000000",
    "red": "#cd0000",
    "green": "#00cd00",
    "yellow": "#cdcd00",
    "blue": "#0000ee",
    "magenta": "#cd00cd",
    "cyan": "#00cdcd",
    "white": "#e5e5e5",
    "bright_black": "#7f7f7f",
    "bright_red": "#ff0000",
    "bright_green": "#00ff00",
    "bright_yellow": "#ffff00",
    "bright_blue": "#5c5cff",
    "bright_magenta": "#ff00ff",
    "bright_cyan": "#00ffff",
    "bright_white": "#ffffff",
}
"""The sixteen colours as X11 terminals have them by default (XFree86 xterm resources)."""

OWN, PROBLEMS = themes.read(Path("/nonexistent"))
TEXTS = [role for role in themes.ROLES if role not in ("ground", "raised", "rule", "focus_ground", "focus_text")]


def colour(one: Colours, role: str) -> str:
    stated = one.by_role[role]
    return PALETTE[stated.removeprefix("ansi_")] if one.terminal_colours else stated


def test_the_program_brings_four_without_a_fault() -> None:
    assert PROBLEMS == []
    assert set(OWN) == {themes.DARK, themes.LIGHT, themes.CONTRAST, themes.SIXTEEN}
    assert [one.dark for one in OWN.values() if one.name == themes.LIGHT] == [False]


@pytest.mark.parametrize("name", OWN)
def test_every_text_reads_on_every_ground(name: str) -> None:
    one = OWN[name]
    least = 7.0 if name == themes.CONTRAST else 4.5
    for role, ground in itertools.product(TEXTS, ("ground", "raised")):
        ratio = themes.contrast(colour(one, role), colour(one, ground))
        assert ratio >= least, f"{role} on {ground}: {ratio:.2f}"
    assert themes.contrast(colour(one, "focus_text"), colour(one, "focus_ground")) >= least


@pytest.mark.parametrize("name", OWN)
def test_lines_and_the_focus_stand_out(name: str) -> None:
    one = OWN[name]
    for role in ("rule", "focus_ground"):
        assert themes.contrast(colour(one, role), colour(one, "ground")) >= 3.0


def test_contrast_is_that_of_the_standard() -> None:
    assert themes.contrast("#000000", "#ffffff") == pytest.approx(21.0)
    assert themes.contrast("#777777", "#777777") == 1.0
    assert themes.contrast("#767676", "#ffffff") == pytest.approx(4.54, abs=0.005)  # the lightest grey that passes AA


def write(folder: Path, name: str, text: str) -> None:
    (folder / "themes").mkdir(exist_ok=True)
    (folder / "themes" / f"{name}.toml").write_text(text, "utf-8")


def test_the_users_own_stands_beside_them(tmp_path: Path) -> None:
    colours = "\n".join(f'{role} = "#{k:02x}ffff"' for k, role in enumerate(themes.ROLES))
    write(tmp_path, "mine", f'title = "Mine"\n[colours]\n{colours}\n')
    found, problems = themes.read(tmp_path)
    assert problems == []
    assert found["mine"].title == "Mine"
    assert found["mine"].theme().variables["book-focus-text"] == f"#{len(themes.ROLES) - 1:02x}ffff"


def test_a_bad_file_is_told_by_line_and_role_and_hides_no_other(tmp_path: Path) -> None:
    write(tmp_path, "half", '[colours]\nground = "blue"\nheadng = "#000000"\n')
    write(tmp_path, "broken", "[colours\n")
    found, problems = themes.read(tmp_path)
    assert set(found) == set(OWN)
    told = [str(problem) for problem in problems]
    assert any(one.startswith("themes/half.toml:2: colours.ground: Found blue") for one in told)
    assert any("did you mean heading?" in one for one in told)
    assert any(one.startswith("themes/broken.toml:1") for one in told)


def test_a_choice_is_remembered(tmp_path: Path) -> None:
    state = tmp_path / "not" / "yet"
    assert themes.remembered(state) is None
    themes.remember(state, themes.LIGHT)
    assert themes.remembered(state) == themes.LIGHT


def test_a_folder_that_cannot_be_written_bars_nothing(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("", "utf-8")
    themes.remember(tmp_path / "file", themes.LIGHT)
    assert themes.remembered(tmp_path / "file") is None
