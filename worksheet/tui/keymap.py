"""The user's own keys: keys.toml in his configuration folder, one line a command.

    find = "g"
    undo = ["u", "f3"]

What cannot be used is told, line by line, and the keys of the program stay for those commands.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from worksheet.model.problem import Problem
from worksheet.model.text import clean, nearest
from worksheet.sheetfile import source
from worksheet.tui.commands import COMMANDS, Command

FILE = "keys.toml"

_KEY = re.compile(r"(?:(?:ctrl|shift)\+)*(?:[a-z_]+|f[0-9]{1,2}|[!-~])")
_SIGNS = {
    "?": "question_mark",
    "!": "exclamation_mark",
    "+": "plus",
    "-": "minus",
    ">": "greater_than_sign",
    "<": "less_than_sign",
    "]": "right_square_bracket",
    "[": "left_square_bracket",
    ".": "full_stop",
    ",": "comma",
    ";": "semicolon",
    ":": "colon",
    "/": "slash",
    "=": "equals_sign",
    "*": "asterisk",
    "#": "number_sign",
    "del": "delete",
    "ins": "insert",
    "esc": "escape",
}


@dataclass(frozen=True)
class Keys:
    """The keys of every command, first one first.

    Attributes:
        by_name: Keys by command.
        problems: What the user's file has that cannot be used.
    """

    by_name: Mapping[str, tuple[str, ...]]
    problems: tuple[Problem, ...] = field(default=())

    def of(self, command: Command) -> tuple[str, ...]:
        """Keys of a command."""
        return self.by_name[command.name]

    def changed(self) -> dict[str, str]:
        """Commands whose keys are the user's, with all their keys, as a binding takes them."""
        return {
            command.name: ",".join(self.of(command))
            for command in COMMANDS
            if self.of(command) != (command.key, command.second)
        }


def own_keys() -> Keys:
    """The keys that the program comes with."""
    return Keys({command.name: (command.key, command.second) for command in COMMANDS})


def read(folder: Path) -> Keys:
    """The keys of the program with those of the user's file in their places.

    Args:
        folder: The user's configuration folder; the file need not be there.
    """
    path = folder / FILE
    if not path.exists():
        return own_keys()
    content = source.load(path, FILE)
    if isinstance(content, Problem):
        return Keys(own_keys().by_name, (content,))
    text = source.decode(content, FILE)
    if isinstance(text, Problem):
        return Keys(own_keys().by_name, (text,))
    parsed = source.parse(text, FILE)
    if not isinstance(parsed, source.Source):
        return Keys(own_keys().by_name, tuple(parsed))
    return _with(parsed)


def _with(parsed: source.Source) -> Keys:
    keys = dict(own_keys().by_name)
    problems: list[Problem] = []
    for name, value in parsed.data.items():
        message = None
        if name not in keys:
            near = nearest(name, keys)
            message = f"Found no command of this name{f'; did you mean {near}?' if near else '.'}"
        else:
            found = _keys(value)
            message = found if isinstance(found, str) else None
            if not isinstance(found, str):
                keys[name] = found
        if message is not None:
            problems.append(Problem(FILE, parsed.places.line(name), clean(name), message))
    return Keys(keys, (*problems, *_clashes(keys, own_keys().by_name)))


def _keys(value: Any) -> tuple[str, ...] | str:
    """Keys as the toolkit names them, or what is wrong."""
    stated = value if isinstance(value, list) else [value]
    listed = [one for one in stated if isinstance(one, str) and one]
    if not listed or len(listed) != len(stated):
        return 'Found no key, expected a key or a list of keys, for example "g" or ["g", "ctrl+g"].'
    out = []
    for one in listed:
        key = _SIGNS.get(one, one)
        if not _KEY.fullmatch(key):
            return f'Found "{clean(one)}", expected a letter, a sign, "f5", "ctrl+g" or a name such as "enter".'
        out.append(key)
    return tuple(out)


def _clashes(keys: dict[str, tuple[str, ...]], before: Mapping[str, tuple[str, ...]]) -> list[Problem]:
    """Two commands of one screen on one key: the user's own change gives way."""
    problems = []
    for command in COMMANDS:
        if keys[command.name] == before[command.name]:
            continue
        for other in COMMANDS:
            shared = set(keys[command.name]) & set(keys[other.name])
            if other is not command and shared and set(command.places) & set(other.places):
                message = f"{min(shared)} is the key of {other.name} already; {command.name} keeps its own keys."
                problems.append(Problem(FILE, None, command.name, message))
                keys[command.name] = before[command.name]
                break
    return problems
