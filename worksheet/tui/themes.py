"""Colour themes: data files of the program and of the user, read into one type; which one is on is remembered."""

from __future__ import annotations

import contextlib
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from worksheet.model.problem import Problem
from worksheet.model.resources import data_folder
from worksheet.model.text import clean, nearest
from worksheet.sheetfile import source

if TYPE_CHECKING:
    from textual.theme import Theme

ROLES = (
    "ground",
    "raised",
    "text",
    "quiet",
    "heading",
    "label",
    "value",
    "rule",
    "met",
    "missed",
    "unknown",
    "waived",
    "focus_ground",
    "focus_text",
)
"""What a theme gives a colour to; themes/README.md says where each is seen."""

DARK, LIGHT, CONTRAST, SIXTEEN = "night-bench", "day-bench", "etched", "sixteen"
"""Names of the themes that come with the program."""

_FOLDER = "themes"
_REMEMBERED = "theme"
_TRUE = re.compile(r"#[0-9a-fA-F]{6}")
_TERMINAL = re.compile(r"ansi_(?:default|(?:bright_)?(?:black|red|green|yellow|blue|magenta|cyan|white))")


@dataclass(frozen=True)
class Colours:
    """One theme.

    Attributes:
        name: Name of its file.
        title: For people.
        dark: Whether its ground is dark.
        terminal_colours: Whether it uses the terminal's own palette.
        by_role: A colour for each of ROLES.
    """

    name: str
    title: str
    dark: bool
    terminal_colours: bool
    by_role: Mapping[str, str]

    def theme(self) -> Theme:
        """As the toolkit takes it: each role a variable `book-ROLE` of the style sheet."""
        from textual.theme import Theme

        role = self.by_role
        return Theme(
            name=self.name,
            primary=role["heading"],
            secondary=role["label"],
            warning=role["waived"],
            error=role["missed"],
            success=role["met"],
            accent=role["focus_ground"],
            foreground=role["text"],
            background=role["ground"],
            surface=role["raised"],
            panel=role["raised"],
            dark=self.dark,
            ansi=self.terminal_colours,
            variables={
                **{f"book-{name.replace('_', '-')}": colour for name, colour in role.items()},
                "ansi-background": role["ground"],  # asked for by the toolkit's own style sheets, which leave them out
                "ansi-foreground": role["text"],
            },
        )


def read(configuration: Path) -> tuple[dict[str, Colours], list[Problem]]:
    """All themes by name, the user's own after the program's, and what is wrong with any of the files."""
    themes: dict[str, Colours] = {}
    problems: list[Problem] = []
    for folder in (data_folder("themes"), configuration / _FOLDER):
        for path in _files(folder):
            found = _theme(path)
            if isinstance(found, Colours):
                themes[found.name] = found
            else:
                problems += found
    return themes, problems


def _files(folder: Path) -> Iterator[Path]:
    try:
        yield from sorted(path for path in folder.iterdir() if path.suffix == ".toml")
    except OSError:
        return


def _theme(path: Path) -> Colours | list[Problem]:
    shown = clean(f"{_FOLDER}/{path.name}")
    content = source.load(path, shown)
    text = content if isinstance(content, Problem) else source.decode(content, shown)
    if isinstance(text, Problem):
        return [text]
    parsed = source.parse(text, shown)
    if not isinstance(parsed, source.Source):
        return list(parsed)
    data = parsed.data
    terminal_colours = data.get("terminal_colours") is True
    stated = data.get("colours")
    colours = stated if isinstance(stated, dict) else {}
    problems = list(_colour_problems(parsed, shown, colours, terminal_colours))
    if problems:
        return problems
    title = data.get("title")
    return Colours(
        name=path.stem,
        title=clean(title) if isinstance(title, str) else path.stem,
        dark=data.get("dark") is not False,
        terminal_colours=terminal_colours,
        by_role={role: str(colours[role]) for role in ROLES},
    )


def _colour_problems(
    parsed: source.Source, shown: str, colours: Mapping[str, object], terminal_colours: bool
) -> Iterator[Problem]:
    form = _TERMINAL if terminal_colours else _TRUE
    wanted = '"ansi_red" or the like' if terminal_colours else '"#rrggbb"'
    for role in ROLES:
        colour = colours.get(role)
        if not (isinstance(colour, str) and form.fullmatch(colour)):
            found = "nothing" if colour is None else clean(str(colour))[:40]
            line = parsed.places.line(f"colours.{role}")
            yield Problem(shown, line, f"colours.{role}", f"Found {found}, expected {wanted}.")
    for role in colours:
        if role not in ROLES:
            near = nearest(role, ROLES)
            hint = f"; did you mean {near}?" if near else "."
            yield Problem(shown, parsed.places.line(f"colours.{role}"), clean(role), f"Found no such role{hint}")


def remembered(state: Path) -> str | None:
    """The theme that was chosen last, None where none was."""
    try:
        return (state / _REMEMBERED).read_text("utf-8").strip()[:100] or None
    except (OSError, UnicodeDecodeError):
        return None


def remember(state: Path, name: str) -> None:
    """Keep a choice for the next start. Where the folder cannot be written, the choice holds for this run only."""
    with contextlib.suppress(OSError):
        state.mkdir(parents=True, exist_ok=True)
        beside = state / f"{_REMEMBERED}.part"
        beside.write_text(name + "\n", "utf-8")
        beside.replace(state / _REMEMBERED)


def luminance(colour: str) -> float:
    """Relative luminance of "#rrggbb". [-]

    Source: WCAG 2.2, definition of relative luminance.
    """
    parts = [int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5)]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: str, other: str) -> float:
    """Contrast ratio of two colours "#rrggbb", from 1 to 21. [-]

    Source: WCAG 2.2, definition of contrast ratio.
    """
    low, high = sorted((luminance(one), luminance(other)))
    return (high + 0.05) / (low + 0.05)
