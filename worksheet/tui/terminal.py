"""What the terminal can do, read once before the app starts: whether it can show the app at all, signs, colours.

The only module that reads the environment for the screens; everything else is handed the frozen result.
"""

from __future__ import annotations

import os
import sys
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

_CANNOT = {"", "dumb", "unknown"}
_HEADLESS = "`biasbook review` prints the same results without one"


@dataclass(frozen=True, slots=True)
class Terminal:
    """What there is to show things on.

    Attributes:
        plain_signs: Nothing beyond ASCII can be shown.
        few_colours: At most sixteen.
        no_colour: The user wants none (NO_COLOR).
        configuration: Folder of the user's own settings.
        state: Folder of what is remembered between runs.
        cell_driver: Whether only changed cells are to be sent (BIASBOOK_CELLS=1).
    """

    plain_signs: bool
    few_colours: bool
    no_colour: bool
    configuration: Path
    state: Path
    cell_driver: bool = False


def refusal(environment: Mapping[str, str] | None = None) -> str | None:
    """Say why the app cannot be shown here and which command does without, or None where it can."""
    found = os.environ if environment is None else environment
    term = found.get("TERM", "")
    if term in _CANNOT:
        return f"the terminal (TERM={term or 'unset'}) cannot show the app; {_HEADLESS}"
    if environment is None and not (os.isatty(0) and sys.__stderr__ is not None and sys.__stderr__.isatty()):
        return f"the app needs a terminal for its input and its screen; {_HEADLESS}"
    return None


def terminal(environment: Mapping[str, str] | None = None) -> Terminal:
    """Read what the environment says of the terminal and of the user's folders."""
    found = os.environ if environment is None else environment
    term = found.get("TERM", "")
    true_colour = found.get("COLORTERM", "").lower() in {"truecolor", "24bit"}
    home = Path(found.get("HOME") or "~").expanduser()
    return Terminal(
        plain_signs=not _says_unicode(found),
        few_colours=not (true_colour or "256color" in term or "direct" in term or "kitty" in term),
        no_colour=bool(found.get("NO_COLOR")),
        configuration=_folder(found.get("XDG_CONFIG_HOME"), home / ".config"),
        state=_folder(found.get("XDG_STATE_HOME"), home / ".local" / "state"),
        cell_driver=found.get("BIASBOOK_CELLS", "") not in {"", "0"},
    )


def _says_unicode(environment: Mapping[str, str]) -> bool:
    """Whether the locale's character set is UTF-8, by the order of precedence that POSIX gives."""
    locale = environment.get("LC_ALL") or environment.get("LC_CTYPE") or environment.get("LANG") or ""
    return "utf-8" in locale.lower() or "utf8" in locale.lower()


def _folder(stated: str | None, default: Path) -> Path:
    """A folder of the user's by the XDG base directory specification: a relative one is ignored."""
    base = Path(stated) if stated and Path(stated).is_absolute() else default
    return base / "biasbook"
