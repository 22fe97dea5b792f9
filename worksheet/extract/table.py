"""A table of currents read as people have them: delimiter, header and units found, numbers in chunks of bounded memory.

The contract's own header is read without a question; anything else is guessed and the guess handed on for the user to
confirm. A long table is thinned while it is read, by a random choice that does not depend on the order of its rows.
"""

from __future__ import annotations

import csv
import itertools
import re
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from worksheet.device.arrays import Array
from worksheet.extract.data import Reading
from worksheet.extract.header import BY_NAME, REQUIRED, Match, Stated, known, match, scale, short
from worksheet.extract.source import Lines, UnreadableError
from worksheet.model.problem import Problem

CAPACITY = 60_000
"""Most rows of one file that are kept for the fit; a longer table is thinned to them."""

CHUNK = 32_768
"""Lines that are turned into numbers at a time."""

MOST_PROBLEMS = 20
"""Most problems of one file that are told one by one."""

_SEARCHED = 200
_COMMENTS = ("#", "*", "!", "%", "//", "$")
_DECIMAL_COMMA = re.compile(r"[+-]?[0-9]+,[0-9]+([eE][+-]?[0-9]+)?")
_SUFFIXED = re.compile(r"[+-]?[0-9.]+ ?[afpnumkMGTµ]?[A-Za-z]*")

Split = Callable[[list[str]], list[list[str]]]


@dataclass(frozen=True, slots=True)
class _Delimiter:
    """One way to take a line apart."""

    title: str
    split: Split


def _by(sign: str) -> Split:
    def split(lines: list[str]) -> list[list[str]]:
        rows = list(csv.reader(lines, delimiter=sign, skipinitialspace=True))
        if len(rows) == len(lines):
            return rows
        # A quote that is never closed has swallowed line ends; a point never spans lines.
        return [next(csv.reader([line], delimiter=sign, skipinitialspace=True), []) for line in lines]

    return split


def _by_pattern(pattern: str) -> Split:
    compiled = re.compile(pattern)
    return lambda lines: [compiled.split(line.strip()) for line in lines]


_DELIMITERS = (
    _Delimiter("comma", _by(",")),
    _Delimiter("semicolon", _by(";")),
    _Delimiter("tab", _by("\t")),
    _Delimiter("bar", _by("|")),
    _Delimiter("two spaces", _by_pattern(r"\s{2,}|\t")),
    _Delimiter("space", _by_pattern(r"\s+")),
)
_SPACES = _DELIMITERS[-1]


@dataclass(frozen=True, eq=False, slots=True)
class Table:
    """One file's numbers by quantity, in SI.

    Attributes:
        reading: How it was read.
        values: Quantity to its column. [SI], shape (kept rows,)
    """

    reading: Reading
    values: dict[str, Array]


@dataclass(frozen=True, slots=True)
class _Head:
    """A header that was found."""

    line: int
    cells: tuple[str, ...]
    delimiter: _Delimiter
    consumed: bool


def read_table(
    path: Path, *, shown: str, stated: Mapping[str, Stated], capacity: int = CAPACITY
) -> tuple[Table | None, list[Problem]]:
    """Read one file.

    Args:
        path: The file.
        shown: What messages call it.
        stated: Columns that the user named, by quantity.
        capacity: Most rows that are kept.

    Returns: the table and no problem, or None and every problem.
    """
    try:
        return _read(path, shown, stated, capacity)
    except UnreadableError as error:
        return None, [error.problem]
    except csv.Error as error:
        return None, [Problem(shown, None, "", f"The table cannot be taken apart: {error}.")]


def _read(path: Path, shown: str, stated: Mapping[str, Stated], capacity: int) -> tuple[Table | None, list[Problem]]:
    source = Lines(path, shown)
    lines = iter(source)
    head, seen = _find(lines, stated)
    if head is None and stated:  # then match() can say which of the stated columns is not there
        head, _ = _find(iter(seen), {})
    if head is None:
        return None, [_headless(shown, seen)]
    found = match(head.cells, stated)
    if isinstance(found, list):
        return None, [Problem(shown, head.line, "", one) for one in found]
    rest = lines if head.consumed else itertools.chain([(head.line, seen[-1][1])], lines)
    keeper = _Keeper(len(found.columns), capacity)
    problems = _numbers(rest, shown, head, found, keeper)
    if not problems and not keeper.seen:
        problems = [Problem(shown, None, "", "Found a header and no rows, expected one line a point.")]
    if problems:
        return None, problems
    factors = [scale(BY_NAME[one.name], one.unit) for one in found.columns]
    values = {}
    for place, (column, factor) in enumerate(zip(found.columns, factors, strict=True)):
        assert not isinstance(factor, str)  # match() refused what has no scale
        number = factor[0] * keeper.kept[:, place] + factor[1]
        values[column.name] = -number if column.reversed else number
    read = {one.header for one in found.columns}
    reading = Reading(
        file=shown,
        digest=source.digest,
        rows=keeper.seen,
        kept=len(keeper.kept),
        delimiter=head.delimiter.title,
        columns=found.columns,
        ignored=tuple(one.strip() for one in head.cells if one.strip() and one.strip() not in read),
        guessed=not (found.exact and head.delimiter.title == "comma") and not _pinned(found, stated),
    )
    return Table(reading, values), []


def _pinned(found: Match, stated: Mapping[str, Stated]) -> bool:
    """Whether the user named every column himself, or it carries the contract's name."""
    return bool(stated) and all(
        one.name in stated or (one.header == one.name and BY_NAME[one.name].contract) for one in found.columns
    )


def _find(lines: Iterator[tuple[int, str]], stated: Mapping[str, Stated]) -> tuple[_Head | None, list[tuple[int, str]]]:
    """The header, and the lines that were looked at."""
    seen: list[tuple[int, str]] = []
    wanted = [one.header for one in stated.values()]
    for number, line in lines:
        bare = line.strip()
        if not bare:
            continue
        seen.append((number, line))
        for sign in _COMMENTS:
            bare = bare.removeprefix(sign).strip()
        enough = len(wanted) if wanted else 3
        best = next((one for one in _DELIMITERS if _score(one, bare, wanted) >= enough), None)
        if best is not None:
            return _Head(number, tuple(best.split([bare])[0]), best, consumed=True), seen
        if wanted and all(one.startswith("#") for one in wanted) and (way := _numeric(line)) is not None:
            cells = tuple(f"#{place + 1}" for place in range(len(way.split([line])[0])))
            return _Head(number, cells, way, consumed=False), seen
        if len(seen) == _SEARCHED:
            break
    return None, seen


def _score(delimiter: _Delimiter, line: str, wanted: Sequence[str]) -> int:
    """How many wanted headers, or else known ones, a line holds when taken apart this way."""
    try:
        cells = delimiter.split([line])[0]
    except csv.Error:
        return 0
    if not wanted:
        return known(cells)
    if _all_numbers(cells):
        return 0
    folded = {one.strip().casefold() for one in cells}
    numbered = sum(re.fullmatch(r"#[0-9]{1,5}", one) is not None and int(one[1:]) <= len(cells) for one in wanted)
    return sum(one.casefold() in folded for one in wanted) + (numbered if len(cells) > 1 else 0)


def _numeric(line: str) -> _Delimiter | None:
    """The delimiter with which the line is nothing but numbers."""
    for one in _DELIMITERS:
        cells = one.split([line.strip()])[0]
        if len(cells) > 1 and _all_numbers(cells):
            return one
    return None


def _all_numbers(cells: Sequence[str]) -> bool:
    return all(_number(one) is not None for one in cells if one.strip())


def _headless(shown: str, seen: list[tuple[int, str]]) -> Problem:
    """What a file without a header that can be read is told."""
    if not seen:
        return Problem(shown, None, "", "Found nothing but blank lines, expected a table of currents.")
    number, line = next((one for one in seen if not one[1].lstrip().startswith(_COMMENTS)), seen[0])
    found = "numbers and no header" if _numeric(line) else f'"{short(line.strip())}"'
    return Problem(
        shown,
        number,
        "",
        f"Found {found}, expected a header with the columns {REQUIRED}; where yours are called otherwise, name them "
        "with NAME=HEADER (or NAME=#3 for the third column).",
    )


class _Keeper:
    """A random choice of at most `capacity` rows of any number, the same for the same rows in the same order."""

    def __init__(self, width: int, capacity: int) -> None:
        self.seen = 0
        self.kept = np.empty((0, width))
        self._keys = np.empty(0)
        self._capacity = capacity
        self._draw = np.random.default_rng(0)

    def add(self, rows: Array) -> None:
        """Take rows in, shape (rows, width)."""
        self.seen += len(rows)
        self._keys = np.concatenate([self._keys, self._draw.random(len(rows))])
        self.kept = np.concatenate([self.kept, rows])
        if len(self.kept) > self._capacity:
            lowest = np.sort(np.argpartition(self._keys, self._capacity)[: self._capacity])
            self._keys, self.kept = self._keys[lowest], self.kept[lowest]


def _numbers(lines: Iterator[tuple[int, str]], shown: str, head: _Head, found: Match, keeper: _Keeper) -> list[Problem]:
    """Turn all lines into numbers; every problem, at most MOST_PROBLEMS of them."""
    problems: list[Problem] = []
    split = _SPACES.split if head.delimiter.title == "two spaces" else head.delimiter.split
    while chunk := list(itertools.islice(lines, CHUNK)):
        filled = [one for one in chunk if one[1].strip() and not one[1].lstrip().startswith(_COMMENTS)]
        if not filled:
            continue
        cells = split([line for _, line in filled])
        try:
            rows = np.array([[row[place] for place in found.places] for row in cells], dtype=np.float64)
        except (ValueError, IndexError):
            rows = None
        wrong_width = any(len(row) != len(head.cells) for row in cells)
        if rows is not None and not wrong_width and np.isfinite(rows).all():
            keeper.add(rows)
            continue
        good = []
        for (number, line), row in zip(filled, cells, strict=True):
            trouble = _row_problem(shown, number, line, row, head, found)
            if trouble is not None:
                problems.append(trouble)
            else:
                good.append([float(row[place]) for place in found.places])
            if len(problems) == MOST_PROBLEMS:
                last = Problem(shown, None, "", "There may be more; the rest of the table was not looked at.")
                return [*problems, last]
        keeper.add(np.array(good, dtype=np.float64).reshape(len(good), len(found.places)))
    return problems


def _row_problem(shown: str, number: int, line: str, row: list[str], head: _Head, found: Match) -> Problem | None:
    """What is wrong with one line, or None."""
    extra = len(row) - len(head.cells)
    if extra and not (extra > 0 and all(not one.strip() for one in row[len(head.cells) :])):
        comma = "; decimal commas are not read, write decimal points" if extra > 0 and "," in line else ""
        message = f"Found {len(row)} cells, expected {len(head.cells)} as in the header{comma}."
        return Problem(shown, number, "", message)
    for place, column in zip(found.places, found.columns, strict=True):
        text = row[place].strip()
        if _number(text) is None:
            return Problem(
                shown, number, column.name, f"Found {_found(text)}, expected {_expected(column.name, text)}."
            )
    return None


def _number(text: str) -> float | None:
    """The finite number that a cell holds, or None."""
    try:
        value = float(text)
    except ValueError:
        return None
    return value if np.isfinite(value) else None


def _found(text: str) -> str:
    return f'"{short(text)}"' if text else "an empty cell"


def _expected(name: str, text: str) -> str:
    """What should stand in a cell, with the likely cause of what does."""
    base = f"a plain number, {BY_NAME[name].dimension.phrase}"
    if _DECIMAL_COMMA.fullmatch(text):
        return f"{base} with a decimal point: decimal commas are not read"
    if _number(text) is None and text[:1].isdigit() and _SUFFIXED.fullmatch(text):
        return f"{base} without prefix or unit; state the unit of the column with {name}=HEADER:UNIT"
    return f"{base} that is finite"
