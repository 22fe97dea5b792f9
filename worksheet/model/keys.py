"""How a key of a file is described: one description drives reader, checker, help, forms and documentation.

The keys themselves stand in sheet_keys, process_keys and project_keys; a key that is described there needs
no second mention anywhere.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from enum import Enum

from worksheet.model.dimension import Dimension


class Kind(Enum):
    """What a key's value is in TOML."""

    QUANTITY = "quantity"  # a number with a unit, see quantity.py
    TEXT = "text"
    CHOICE = "choice"  # one of Key.choices
    NAME = "name"  # a name that must exist elsewhere (a device, a process file, a corner)
    FLAG = "flag"
    WHOLE = "whole"  # a whole number
    DATE = "date"
    FORMULA = "formula"
    CONDITION = "condition"  # an inline table process, temperature, supply
    LIMIT = "limit"  # an inline table {max = quantity} of a budget


TRUST = ("guess", "estimate", "simulated", "measured", "agreed")
"""How far a value is to be trusted, least first."""


@dataclass(frozen=True, slots=True)
class Key:
    """One key of a file.

    Attributes:
        name: The key as written in TOML.
        title: Label on screens and in reports.
        help: One or two sentences: meaning, and what the program does with it. Different for each key.
        kind: What its value is.
        dimension: For quantities; None where it follows from the name (a target) or is free (an own name).
        symbol: As a designer writes it ("C_L"); "" where there is none.
        low, high: Closed range of the SI value; None for no limit.
        low_open, high_open: Whether that end is excluded.
        default: Taken where the key is left out; None where there is none.
        required: Whether leaving it out is an error.
        choices: For Kind.CHOICE.
        annotated: May be a table {value, low, high, source, trust, ...} (ANNOTATIONS) instead of a bare value.
        formula: May be {formula = "..."}.
        listed: May be a list of values.
        where: Where such a number is found; for process parameters.
        example: A value as typed, for forms and new projects.
        moves_results: Whether it belongs to the digest of what can change the results.
    """

    name: str
    title: str
    help: str
    kind: Kind = Kind.QUANTITY
    dimension: Dimension | None = None
    symbol: str = ""
    low: float | None = 0.0
    high: float | None = None
    low_open: bool = False
    high_open: bool = False
    default: float | str | bool | None = None
    required: bool = False
    choices: tuple[str, ...] = ()
    annotated: bool = False
    formula: bool = False
    listed: bool = False
    where: str = ""
    example: str = ""
    moves_results: bool = True

    def outside(self, value: float) -> str | None:
        """Say what range is expected where the SI value lies outside it, else None. [unit of the key]"""
        below = self.low is not None and (value <= self.low if self.low_open else value < self.low)
        above = self.high is not None and (value >= self.high if self.high_open else value > self.high)
        return self.range_text() if below or above else None

    def range_text(self) -> str:
        """The permitted range in words, in SI base units."""
        unit = f" {self.dimension.unit}" if self.dimension is not None and self.dimension.unit else ""
        parts = []
        if self.low is not None:
            parts.append(f"{'above' if self.low_open else 'at least'} {self.low:g}{unit}")
        if self.high is not None:
            parts.append(f"{'below' if self.high_open else 'at most'} {self.high:g}{unit}")
        return " and ".join(parts) if parts else "any number"


@dataclass(frozen=True, slots=True)
class Table:
    """A table of a file: its keys, and its tables.

    Attributes:
        name: As written; "" for the document itself.
        help: What belongs in it.
        keys: Keys that it may hold.
        tables: Tables that it may hold.
        entry: What a freely named entry is: a Table ([device.NAME]) or a Key ([own] NAME = ...). None: names are fixed.
        names: What names an entry may have, in words ("a metric", "a device"), for messages.
        repeated: An array of tables ([[evidence]]).
        required: Whether leaving the table out is an error.
    """

    name: str
    help: str
    keys: tuple[Key, ...] = ()
    tables: tuple[Table, ...] = ()
    entry: Table | Key | None = None
    names: str = ""
    repeated: bool = False
    required: bool = False

    def key(self, name: str) -> Key | None:
        """The key of that name, or None."""
        return next((key for key in self.keys if key.name == name), None)

    def table(self, name: str) -> Table | None:
        """The table of that name, or None."""
        return next((table for table in self.tables if table.name == name), None)

    def __iter__(self) -> Iterator[Key]:
        return iter(self.keys)


ANNOTATIONS = Table(
    "",
    "What may stand beside a value.",
    keys=(
        Key("value", "Value", "The value itself, a quantity.", required=False),
        Key(
            "formula",
            "Formula",
            "Instead of a value: an expression over this sheet's names and those of other sheets.",
            Kind.FORMULA,
        ),
        Key("low", "Low", "The least value it may turn out to have; worst cases then cover the range.", low=None),
        Key("high", "High", "The greatest value it may turn out to have; worst cases then cover the range.", low=None),
        Key(
            "source",
            "Source",
            "Where the value came from: a document, a person, a run.",
            Kind.TEXT,
            moves_results=False,
        ),
        Key(
            "trust",
            "Trust",
            "How far the value is to be trusted; hand-offs list the least trusted first.",
            Kind.CHOICE,
            choices=TRUST,
            moves_results=False,
        ),
        Key("note", "Note", "Anything a reader of this value should know.", Kind.TEXT, moves_results=False),
        Key(
            "standard_error",
            "Standard error",
            "One standard deviation of the value, from the fit that gave it.",
            moves_results=False,
        ),
        Key(
            "checked_by",
            "Checked by",
            "Who looked the value up again and stands by it, when a block changes hands.",
            Kind.TEXT,
            moves_results=False,
        ),
        Key("checked", "Checked", "The day the value was looked up again.", Kind.DATE, moves_results=False),
    ),
)
"""The one description of the table that may stand in place of a bare value."""
