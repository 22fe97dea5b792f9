"""Which keys a sheet may hold: what its stage takes, what other stages take, and in which table a key belongs."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from types import MappingProxyType

from worksheet.model.keys import Key, Kind
from worksheet.model.sheet_keys import SHEET
from worksheet.sheetfile.names import stage_keys
from worksheet.stages import catalogue
from worksheet.stages.stage import Stage

ASSUME, BIAS, CHOOSE, OWN, SOLVE, TARGET = "assume", "bias", "choose", "own", "solve", "target"
"""The tables of a sheet, as they are called in files."""

LOAD = "load_capacitance"
"""The one design variable that a sheet must state."""

PARTS = {part.name: part for part in SHEET.tables}
"""The tables of a sheet by name."""

_BULKS = next(key.choices for key in SHEET.keys if key.name == "bulk")


@dataclass(frozen=True)
class Taken:
    """What a sheet of one stage may hold, as far as the stage and its options are known.

    Attributes:
        stage: None where the sheet names none that exists; every key of every stage is then let through.
        bulk: None where the sheet's is not valid.
        ideal: Whether the current source is ideal; None where that cannot be told.
        design, assumptions: The keys, by name.
    """

    stage: Stage | None
    bulk: str | None
    ideal: bool | None
    design: Mapping[str, Key]
    assumptions: Mapping[str, Key]


_taken: dict[tuple[str, str | None, bool | None], Taken] = {}


def taken(stage: Stage | None, bulk: str | None, ideal: bool | None) -> Taken:
    """The keys of a stage with its options; those of all where an option is not known."""
    key = (stage.key if stage else "", bulk, ideal)
    known = _taken.get(key)
    if known is not None and known.stage is stage and stage is not None:
        return known
    stages = (stage,) if stage else catalogue.stages()
    design = {k.name: k for one in stages for k in one.design_keys(bool(ideal))}
    assumptions = {
        k.name: k for one in stages for way in ((bulk,) if bulk else _BULKS) for k in one.assumption_keys(way)
    }
    _taken[key] = Taken(stage, bulk, ideal, MappingProxyType(design), MappingProxyType(assumptions))
    return _taken[key]


def homes() -> Iterable[tuple[str, frozenset[str]]]:
    """Every table with fixed keys and what it holds, the most likely first."""
    yield CHOOSE, frozenset(key for keys in stage_keys().values() for key in keys)
    for part in SHEET.tables:
        if part.keys and not part.repeated:
            yield part.name, frozenset(key.name for key in part.keys)


def elsewhere(name: str) -> str:
    """Where a key of another table belongs, as a clause; "" for a key that does not exist."""
    home = next((home for home, keys in homes() if name in keys), None)
    return f"it belongs in [{home}]" if home else ""


def refusal(keys: Taken, name: str, part: str) -> str:
    """Why a key that exists is not taken in [assume] or [choose], as a clause; "" for a key that does not exist.

    Args:
        keys: What the sheet may hold.
        name: The key.
        part: The table in which it stands.
    """
    if keys.stage is None:
        return elsewhere(name)
    if part == CHOOSE and name in keys.assumptions:
        return f"it is an assumption and belongs in [{ASSUME}]"
    designs = stage_keys()
    reason = keys.stage.refusal(name, keys.bulk or _BULKS[0], bool(keys.ideal))
    if reason:
        return reason
    others = [stage for stage, design in designs.items() if name in design]
    if others and keys.stage.key not in others:
        return f"it is a design variable of {' and '.join(others)}, not of {keys.stage.key}"
    return elsewhere(name)


def numbers(keys: Taken) -> Iterable[str]:
    """The keys of a stage that stand for a number in a formula."""
    yield from keys.assumptions
    yield from (key.name for key in keys.design.values() if key.kind is Kind.QUANTITY)
