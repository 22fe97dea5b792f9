"""Arrays of tables, such as evidence and waivers, merged as sets of entries.

The place of an entry means nothing, so an entry is known by what it is about: that tells one that was changed from one
that was taken out while another was put in.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from worksheet.compare.same import same
from worksheet.compare.taking import edits
from worksheet.model.sheet_keys import ACCEPTANCE, COLLISION, EVIDENCE, REMARK, WAIVER
from worksheet.sheetfile.document import KeyPath
from worksheet.sheetfile.edit import AddEntry, Edit

_ABOUT = {
    EVIDENCE.name: ("metric", "found_by", "at", "reference"),
    WAIVER.name: ("target",),
    REMARK.name: ("by", "text", "about"),
    ACCEPTANCE.name: ("by", "basis"),
    COLLISION.name: ("key",),
}
_ONCE = {WAIVER.name}  # two sides that each add one for the same thing contradict each other


@dataclass(frozen=True, slots=True)
class Clash:
    """What both sides changed differently: plain data, None where a side has nothing."""

    path: KeyPath
    base: Any
    ours: Any
    theirs: Any


@dataclass(frozen=True, slots=True)
class Take:
    """Edits that bring in what the other side changed, and what it is instead where they cannot be made in place."""

    edits: tuple[Edit, ...]
    instead: Clash


def merge_entries(name: str, base: list[Any], ours: list[Any], theirs: list[Any]) -> Iterator[Take | Clash]:
    """What to take from the other side and what collides.

    Args:
        name: Of the array.
        base, ours, theirs: Its entries.
    """
    came, mine_came = _less(theirs, base), _less(ours, base)
    changes: list[tuple[int, Any, Any]] = []
    clashes: list[Clash] = []
    for one in _less(base, theirs):
        after = _take_out(came, _about(name, one))
        place = next((number for number, other in enumerate(ours) if same((), other, one)), None)
        if place is not None:
            changes.append((place, one, after))
            continue
        mine = _take_out(mine_came, _about(name, one))
        if not same((), mine, after):
            clashes.append(Clash((name,), one, mine, after))
    for new in came:
        rival = _take_out(mine_came, _about(name, new)) if name in _ONCE else None
        if rival is not None and not same((), rival, new):
            clashes.append(Clash((name,), None, rival, new))
        elif not any(same((), new, other) for other in ours):
            yield Take((AddEntry(name, new),), Clash((name,), None, None, new))
    # From the last to the first, so that one that goes does not move those that are still to be changed.
    for place, one, after in sorted(changes, key=lambda change: -change[0]):
        yield Take(tuple(edits((name, place), one, after)), Clash((name,), one, one, after))
    yield from clashes


def _less(some: Sequence[Any], others: Sequence[Any]) -> list[Any]:
    """The entries of the first that the second does not have."""
    return [one for one in some if not any(same((), one, other) for other in others)]


def _about(name: str, one: Mapping[str, Any]) -> Callable[[Mapping[str, Any]], bool]:
    """Tells whether an entry is about the same as one that is known."""
    keys = _ABOUT.get(name, ())
    return lambda other: bool(keys) and all(same((), one.get(key), other.get(key)) for key in keys)


def _take_out(entries: list[Any], wanted: Callable[[Any], bool]) -> Any:
    """Take the first entry that is wanted out of a list; None where there is none."""
    for number, one in enumerate(entries):
        if wanted(one):
            return entries.pop(number)
    return None
