"""The text of one TOML document as lines and statements, and the few ways in which a statement is changed.

Values are changed by tomlkit, one statement at a time; lines are put in and taken out by number. What the text says
before and after is the business of `edit`.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from typing import Any

import tomlkit

from worksheet.sheetfile import inline, render
from worksheet.sheetfile.locate import BASIC, DOTTED, LITERAL, Statement, dotted, locate, split
from worksheet.sheetfile.render import Stated

_TEXT = re.compile(
    rf"""(?P<before>[ \t]*+{DOTTED}[ \t]*+=[ \t]*+)
        (?P<old>\"\"\"(?:[^"\\]|\\[\s\S]|"(?!""))*+\"{{3,5}}|'''(?:[^']|'(?!''))*+'{{3,5}}|{BASIC}(?!")|{LITERAL}(?!'))
        (?P<after>[ \t]*+(?:\#[^\n]*+)?\r?\n?)""",
    re.VERBOSE,
)
"""A statement whose value is a text."""

KeyPath = tuple[str | int, ...]
"""Where something stands: table, key, key of an inline table; a number for an entry of a list."""


class WriteRefusedError(ValueError):
    """An edit that cannot be made in place without a doubt; nothing was changed. str() is a sentence."""


class Document:
    """One text. Every method gives the text after one change and leaves the document as it was.

    Raises: NestedTooDeeplyError.
    """

    def __init__(self, text: str) -> None:
        self.lines = text.split("\n")
        self.lines = [f"{line}\n" for line in self.lines[:-1]] + ([self.lines[-1]] if self.lines[-1] else [])
        self.statements = locate(text).statements

    def stands(self, path: KeyPath) -> bool:
        """Whether a header or a key of exactly this path is written."""
        key = dotted(path)
        return any(own == key or (not own and table == key) for _, _, table, own in self.statements)

    def replace(self, path: KeyPath, value: Stated) -> str:
        """Another value for what exists."""
        (first, last, _, _), inside = self._statement(path)
        text = _TEXT.fullmatch("".join(self.lines[first - 1 : last])) if not inside else None
        if text is not None:  # tomlkit takes time that grows with the square of a long note
            return self._with(first - 1, last, [text["before"] + render.like(text["old"], value) + text["after"]])
        return self._through_tomlkit(path, lambda old: render.like(old, value))

    def wrap(self, path: KeyPath, key: str, beside: Mapping[str, Any]) -> str:
        """Make a bare value an inline table: the value as written at `key`, and something beside it."""
        return self._through_tomlkit(path, lambda old: inline.join(f"{{ {key} = {old} }}", beside))

    def swap(self, path: KeyPath, key: str, value: Stated) -> str:
        """Another key and another value for what exists."""
        statement, inside = self._statement(path)
        if inside:
            old = str(path[-1])
            return self._through_tomlkit(path[:-1], lambda table: inline.swap(table, old, key, render.flat(value)))
        first, last, _, _ = statement
        line = self.lines[first - 1]
        indent = line[: len(line) - len(line.lstrip())]
        return self._with(first - 1, last, [f"{indent}{key} = {render.stated(value)}\n"])

    def add(self, path: KeyPath, value: Stated) -> str:
        """A new key in a table that exists."""
        key, table = dotted(path[-1:]), dotted(path[:-1])
        found = self._find(path)
        if found is not None:
            return self._through_tomlkit(path[:-1], lambda old: inline.add(old, key, render.flat(value)))
        same = [one for one in self.statements if one[2] == table]
        if not same:  # the table is written as dotted keys of another one
            same = [
                one
                for one in self.statements
                if one[3].startswith(f"{table}.") and not f"{one[2]}.".startswith(f"{table}.")  # not below [table.x]
            ]
            if not same:
                return self.add_table(tuple(map(str, path[:-1])), {str(path[-1]): value})
            above = same[-1][2]
            key = dotted(path[len(split(above)) if above else 0 :])
        return self._insert(self._after(same[-1]), [f"{self._indent(same[-1])}{key} = {render.stated(value)}\n"])

    def add_table(self, path: tuple[str, ...], values: Mapping[str, Any], *, array: bool = False) -> str:
        """A new table at the end of those of its kind, else before the arrays of tables, else at the end."""
        name = dotted(path)
        top = dotted(path[:1])
        kin = [one for one in self.statements if one[2] == top or one[2].startswith(f"{top}.")]
        header = f"[[{name}]]\n" if array else f"[{name}]\n"
        block = ["\n", header, *(f"{dotted([key])} = {render.stated(value)}\n" for key, value in values.items())]
        if kin:
            place = self._after(kin[-1])
        elif array:
            place = len(self.lines)
        else:
            single = [one for one in self.statements if not self._in_array(one)]
            place = self._after(single[-1]) if single and len(single) < len(self.statements) else len(self.lines)
        if not self.lines or not self.lines[place - 1].strip():
            del block[0]
        if place < len(self.lines) and self.lines[place].strip():
            block.append("\n")
        return self._insert(place, block)

    def remove(self, path: KeyPath) -> str:
        """Take out a key with its line, a key of an inline table, an entry of a list, or a table with all in it."""
        found = self._find(path)
        if found is not None:
            statement, inside = found
            if not inside:
                return self._with(statement[0] - 1, statement[1], [])
            if isinstance(inside[-1], int):
                return self._through_tomlkit(path, None)
            return self._through_tomlkit(path[:-1], lambda old: inline.remove(old, str(path[-1])))
        name = dotted(path)
        kept = self.lines.copy()
        for start, end in reversed(self._runs([_is_in(one, name) for one in self.statements])):
            blank = end
            if start == 0 or not kept[start - 1].strip():
                while blank < len(kept) and not kept[blank].strip():
                    blank += 1
            del kept[start:blank]
        return "".join(kept)

    def _runs(self, gone: list[bool]) -> list[tuple[int, int]]:
        """The stretches of lines that marked statements fill, with the comments between neighbours."""
        runs: list[tuple[int, int]] = []
        for number, statement in enumerate(self.statements):
            if gone[number]:
                joined = number > 0 and gone[number - 1]
                runs.append((runs.pop()[0] if joined else statement[0] - 1, statement[1]))
        return runs

    def _in_array(self, statement: Statement) -> bool:
        return any(part.isdigit() for part in statement[2].split("."))

    def _find(self, path: KeyPath) -> tuple[Statement, KeyPath] | None:
        """The statement that holds a path, and the path inside its value; None where no statement does."""
        for end in range(len(path), 0, -1):
            key = dotted(path[:end])
            for statement in self.statements:
                if statement[3] == key:
                    return statement, path[end:]
        return None

    def _statement(self, path: KeyPath) -> tuple[Statement, KeyPath]:
        found = self._find(path)
        if found is None:
            raise WriteRefusedError("it is written in a way that cannot be changed here")
        return found

    def _through_tomlkit(self, path: KeyPath, change: Callable[[str], str] | None) -> str:
        """Change the text of one value, and let tomlkit put it into its statement; None takes a list's entry out."""
        (first, last, table, own), inside = self._statement(path)
        relative = split(own)[len(split(table)) if table else 0 :]
        fragment = tomlkit.parse("".join(self.lines[first - 1 : last]))
        holder: Any = fragment
        steps: KeyPath = (*relative, *inside)
        for part in steps[:-1]:
            holder = holder[part]
        key = steps[-1]
        if change is None:
            del holder[key]
        else:
            holder[key] = tomlkit.parse(f"x = {change(holder[key].as_string())}")["x"]
        return self._with(first - 1, last, [fragment.as_string()])

    def _after(self, statement: Statement) -> int:
        """Where a line may follow a statement: behind comments that hang on to it, before those of the next one."""
        place = end = statement[1]
        while end < len(self.lines) and self.lines[end].lstrip().startswith("#"):
            end += 1
        return end if end == len(self.lines) or not self.lines[end].strip() else place

    def _indent(self, statement: Statement) -> str:
        line = self.lines[statement[0] - 1]
        return "" if not statement[3] else line[: len(line) - len(line.lstrip())]

    def _insert(self, place: int, lines: list[str]) -> str:
        before = self.lines[:place]
        if before and not before[-1].endswith("\n"):
            before[-1] += "\n"
        return "".join([*before, *lines, *self.lines[place:]])

    def _with(self, start: int, end: int, lines: list[str]) -> str:
        return "".join([*self.lines[:start], *lines, *self.lines[end:]])


def _is_in(statement: Statement, name: str) -> bool:
    """Whether a statement is part of the table of that name."""
    _, _, table, own = statement
    return any(key == name or key.startswith(f"{name}.") for key in (table, own))
