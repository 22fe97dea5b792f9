"""Three texts of one file merged by value: what either side changed is taken, and what both changed is said.

Texts are compared as data, so that a reformatted line is no change and two ways of writing one quantity are no
collision. The merged text is `ours` with edits in place, so that its comments and its order stay; comments that only
the other side has are not carried over.

A number, its range, its source and how far it is trusted belong together: half of each would state what nobody gave.
So they are merged as one, and only the note beside them on its own. Evidence and waivers are sets of entries.

What both sides changed differently stays as it is in ours and is entered as [[collision]] with both values. Sheets
alone have that table; any other file gets git's markers around those values and nothing else.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import PurePosixPath
from typing import Any

from worksheet.compare import conflict
from worksheet.compare.entry_sets import Clash, Take, merge_entries
from worksheet.compare.same import NOTE, core, same, stated
from worksheet.compare.settle import settle
from worksheet.compare.taking import edits, is_entries, settling
from worksheet.model.problem import Problem
from worksheet.model.sheet import Collision
from worksheet.model.sheet_keys import COLLISION
from worksheet.model.text import clean
from worksheet.sheetfile import source
from worksheet.sheetfile.document import KeyPath, WriteRefusedError
from worksheet.sheetfile.edit import AddEntry, apply
from worksheet.sheetfile.locate import dotted
from worksheet.sheetfile.read import parse_process, parse_project, parse_sheet
from worksheet.sheetfile.render import flat
from worksheet.sheetfile.source import Source

_SHEETS, _PROCESS = "sheets", "process"


@dataclass(frozen=True, slots=True)
class Merged:
    """A merge by value.

    Attributes:
        text: Ours with everything that the other side alone changed.
        collisions: What both changed differently; `text` holds ours.
        marked: The same with the collisions entered; None where that cannot be done in place.
        theirs: The same with every collision settled for the other side; None where that cannot be done in place.
    """

    text: str
    collisions: tuple[Collision, ...]
    marked: str | None
    theirs: str | None


@dataclass(frozen=True, slots=True)
class Driven:
    """What a merge driver writes and tells.

    Attributes:
        content: For the file.
        clean: Whether nothing is left to settle.
        collisions: What both sides changed differently.
        problems: Why the sides could not be read, or what is wrong with the merge although both sides were right.
    """

    content: bytes
    clean: bool
    collisions: tuple[Collision, ...] = ()
    problems: tuple[Problem, ...] = ()


def merge_bytes(base: bytes, ours: bytes, theirs: bytes, name: str) -> Driven:
    """Merge three contents of one file, as a merge driver for git does.

    Args:
        base: What both started from; empty where there was nothing.
        ours, theirs: The sides.
        name: The file's path; in a folder "sheets" its collisions are entered, in any other one marked.

    Returns: what to write. Sides that cannot be read by value are both kept, between markers; bytes that are no text
    are left as they are in ours.
    """
    texts = [source.decode(content, f"{name} ({side})") for content, side in _sides(base, ours, theirs)]
    failed = tuple(text for text in texts if isinstance(text, Problem))
    if failed:
        return Driven(ours, clean=False, problems=failed)
    before, mine, other = (str(text) for text in texts)
    merged = merge(before, mine, other, name)
    if not isinstance(merged, Merged):
        return Driven(conflict.mark(mine, other).encode(), clean=False, problems=merged)
    if not merged.collisions:
        problems = _new_problems(merged.text, mine, other, name)
        return Driven(merged.text.encode(), clean=not problems, problems=problems)
    text = merged.marked if PurePosixPath(name).parent.name == _SHEETS else None
    if text is None:
        text = conflict.mark(merged.text, other if merged.theirs is None else merged.theirs)
    return Driven(text.encode(), clean=False, collisions=merged.collisions)


def merge(base: str, ours: str, theirs: str, name: str) -> Merged | tuple[Problem, ...]:
    """Merge three texts of one file.

    Args:
        base: What both started from; empty where there was nothing.
        ours, theirs: The sides.
        name: What messages call the file.

    Returns: the merge, or why a text cannot be read.
    """
    trees, problems = [], []
    for text, side in _sides(_before_collisions(base, ours, theirs, name), ours, theirs):
        read = source.parse(text, f"{name} ({side})")
        if isinstance(read, Source):
            trees.append(read.data)
        else:
            problems += read
    if problems:
        return tuple(problems)
    text, clashes = ours, []
    for step in _steps((), *trees):
        changed = _applied(text, step) if isinstance(step, Take) else None
        if changed is not None:
            text = changed
        else:
            clashes.append(step.instead if isinstance(step, Take) else step)
    collisions = tuple(map(_told, clashes))
    return Merged(text, collisions, _marked(text, collisions), _settled(text, clashes))


def _before_collisions(base: str, ours: str, theirs: str, name: str) -> str:
    """The base with what both sides have settled since put back to what stood before it collided.

    Where histories cross, git merges two bases into one, which then holds one side's value and says so. Whoever kept
    that value would seem to have changed nothing, and would lose without a word.
    """
    here, mine, other = (_collisions(text) for text in (base, ours, theirs))
    for number in range(len(here) - 1, -1, -1):
        if here[number] not in mine and here[number] not in other:
            settled = settle(base, number, "base", name)
            base = settled if isinstance(settled, str) else base
    return base


def _collisions(text: str) -> list[Any]:
    if COLLISION.name not in text:
        return []
    read = source.parse(text, "")
    found = read.data.get(COLLISION.name) if isinstance(read, Source) else None
    return found if isinstance(found, list) else []


def entry(collision: Collision) -> AddEntry:
    """The edit that enters a collision in a sheet."""
    values = {key.name: getattr(collision, key.name) for key in COLLISION.keys}
    return AddEntry(COLLISION.name, {name: value for name, value in values.items() if value})


def _sides(base: Any, ours: Any, theirs: Any) -> tuple[tuple[Any, str], ...]:
    return (base, "base"), (ours, "ours"), (theirs, "theirs")


def _steps(path: KeyPath, base: Any, ours: Any, theirs: Any) -> Iterator[Take | Clash]:
    """What to take from the other side and what collides, below a path."""
    sides = (base, ours, theirs)
    if same(path, ours, theirs) or same(path, base, theirs):
        return
    value = (
        len(path) > 1 and any(isinstance(side, dict) for side in sides) and all(stated(path, side) for side in sides)
    )
    if len(path) == 1 and all(side is None or is_entries(side) for side in sides):
        yield from merge_entries(str(path[0]), base or [], ours or [], theirs or [])
    elif not value and isinstance(ours, dict) and isinstance(theirs, dict) and isinstance(base, dict | None):
        for key in dict.fromkeys([*ours, *theirs, *(base or {})]):
            yield from _steps((*path, key), (base or {}).get(key), ours.get(key), theirs.get(key))
    elif same(path, base, ours):
        yield _take(path, base, ours, theirs)
    elif value:
        yield from _merge_value(path, *sides)
    else:
        yield Clash(path, base, ours, theirs)


def _take(path: KeyPath, base: Any, ours: Any, theirs: Any) -> Take:
    return Take(tuple(edits(path, ours, theirs)), Clash(path, base, ours, theirs))


def _merge_value(path: KeyPath, base: Any, ours: Any, theirs: Any) -> Iterator[Take | Clash]:
    """A value with what stands beside it: as one, but for the note."""
    if ours is None or theirs is None:
        yield Clash(path, base, ours, theirs)
        return
    before, mine, other = (None if side is None else core(side) for side in (base, ours, theirs))
    if same(path, before, mine):
        chosen = other
    elif same(path, before, other) or same(path, mine, other):
        chosen = mine
    else:
        yield Clash(path, base, ours, theirs)
        return
    notes = [side.get(NOTE) if isinstance(side, dict) else None for side in (base, ours, theirs)]
    note = notes[2] if notes[0] == notes[1] else notes[1]
    merged = {**(chosen or {}), **({} if note is None else {NOTE: note})}
    if not same(path, merged, ours):
        yield _take(path, base, ours, merged)
    if notes[0] not in notes[1:] and notes[1] != notes[2]:
        yield Clash((*path, NOTE), *notes)


def _applied(text: str, step: Take) -> str | None:
    """The text with a step taken; None where it is written in a way that cannot be changed without a doubt."""
    try:
        return apply(text, step.edits)
    except WriteRefusedError:
        return None


def _told(clash: Clash) -> Collision:
    """A collision as the sheet says it, with values as TOML."""
    base, ours, theirs = (_toml(value) for value in (clash.base, clash.ours, clash.theirs))
    return Collision(dotted(clash.path), base, ours, theirs)


def _toml(value: Any) -> str:
    if value is None:
        return ""
    try:
        return flat(value)
    except (TypeError, ValueError):  # a time of day, a number that does not exist: nothing that a sheet may hold
        return clean(str(value))


def _marked(text: str, collisions: tuple[Collision, ...]) -> str | None:
    try:
        return apply(text, map(entry, collisions))
    except WriteRefusedError:
        return None


def _settled(text: str, clashes: list[Clash]) -> str | None:
    """The text with every collision settled for the other side."""
    for clash in clashes:
        read = source.parse(text, "")
        if not isinstance(read, Source):
            return None
        try:
            text = apply(text, settling(read.data, clash.path, clash.ours, clash.theirs))
        except WriteRefusedError:
            return None
    return text


def _new_problems(merged: str, ours: str, theirs: str, name: str) -> tuple[Problem, ...]:
    """What is wrong with a merge of two sides that were right, such as a key that each put into another table."""
    found = _problems(merged, name)
    return found if found and not _problems(ours, name) and not _problems(theirs, name) else ()


def _problems(text: str, name: str) -> tuple[Problem, ...]:
    """Everything that is wrong with a file of the kind that its folder says."""
    path = PurePosixPath(name)
    if path.parent.name == _SHEETS:
        return tuple(parse_sheet(text, path.stem, name)[1])
    if path.parent.name == _PROCESS:
        return tuple(parse_process(text, path.stem, name)[1])
    return tuple(parse_project(text, name)[1])
