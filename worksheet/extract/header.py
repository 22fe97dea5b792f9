"""Which column of a table is which quantity: the contract's own names without a question, others guessed.

The quantities that can be read are described once, in QUANTITIES; what a header may be called, which unit it may carry
and what messages expect is driven from there.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from worksheet.extract.data import Column
from worksheet.model import dimension as dim
from worksheet.model.dimension import Dimension
from worksheet.model.text import clean, nearest
from worksheet.model.units import UnitError, parse_unit


@dataclass(frozen=True, slots=True)
class Quantity:
    """What a column can hold.

    Attributes:
        name: Key in a mapping.
        title: In messages.
        dimension: What it measures.
        called: Spellings of headers, lower case, letters and digits only.
        contract: Whether the contract names it, so that it is read without a question.
    """

    name: str
    title: str
    dimension: Dimension
    called: tuple[str, ...]
    contract: bool = False


QUANTITIES = (
    Quantity("vg", "gate voltage", dim.VOLTAGE, ("vg", "vgate", "gatevoltage", "gatev", "gate"), contract=True),
    Quantity("vs", "source voltage", dim.VOLTAGE, ("vs", "vsource", "sourcevoltage", "sourcev", "source"), True),
    Quantity("vd", "drain voltage", dim.VOLTAGE, ("vd", "vdrain", "drainvoltage", "drainv", "drain"), contract=True),
    Quantity(
        "vb",
        "bulk voltage",
        dim.VOLTAGE,
        ("vb", "vbulk", "vsub", "vbody", "bulkvoltage", "bodyvoltage", "bulk", "body", "substrate"),
    ),
    Quantity("vgs", "gate-source voltage", dim.VOLTAGE, ("vgs", "gatesourcevoltage", "vgatesource")),
    Quantity("vds", "drain-source voltage", dim.VOLTAGE, ("vds", "drainsourcevoltage", "vdrainsource")),
    Quantity("vbs", "bulk-source voltage", dim.VOLTAGE, ("vbs", "bulksourcevoltage", "bodysourcevoltage", "bodybias")),
    Quantity("vsb", "source-bulk voltage", dim.VOLTAGE, ("vsb", "sourcebulkvoltage")),
    Quantity("vgb", "gate-bulk voltage", dim.VOLTAGE, ("vgb", "gatebulkvoltage")),
    Quantity("vdb", "drain-bulk voltage", dim.VOLTAGE, ("vdb", "drainbulkvoltage")),
    Quantity(
        "id",
        "drain current",
        dim.CURRENT,
        ("id", "ids", "idrain", "draincurrent", "draini", "currentdrain", "current", "i"),
        contract=True,
    ),
    Quantity("w", "width", dim.LENGTH, ("w", "width", "channelwidth", "gatewidth", "wdrawn"), contract=True),
    Quantity("l", "length", dim.LENGTH, ("l", "length", "channellength", "gatelength", "ldrawn", "lg"), contract=True),
    Quantity("temperature", "temperature", dim.TEMPERATURE, ("temperature", "temp", "t", "tj", "tamb"), contract=True),
)
"""Every quantity that a column can hold; the first of `called` is the name itself."""

BY_NAME = {one.name: one for one in QUANTITIES}

REQUIRED = "vg, vs, vd and id (w, l and temperature may follow)"

_BRACKETED = re.compile(r"^(?P<name>.*?\S)\s*[\[(]\s*(?P<unit>[^\[\]()]*?)\s*[\])]$")
_AFTER_SLASH = re.compile(r"^(?P<name>[^/]+?)\s*(?:/|\bin\b)\s*(?P<unit>[^/\s]+)$")
_AFTER_UNDERSCORE = re.compile(r"^(?P<name>.+?)_(?P<unit>[A-Za-zµμ°]+)$")
_LONGEST = 60


@dataclass(frozen=True, slots=True)
class Stated:
    """A column that the user named.

    Attributes:
        header: As it stands in the file, or "#3" for the third column.
        unit: "" where the header's own, or SI.
        reversed: Whether its sign is to be turned.
    """

    header: str
    unit: str = ""
    reversed: bool = False


@dataclass(frozen=True, slots=True)
class Match:
    """The columns found in a header.

    Attributes:
        columns: What each is.
        places: Position of each in a line, counted from 0.
        exact: Whether all of them carry the contract's own names.
    """

    columns: tuple[Column, ...]
    places: tuple[int, ...]
    exact: bool


def parse_stated(text: str) -> tuple[str, Stated] | str:
    """Read one stated column, NAME=HEADER, NAME=-HEADER or NAME=HEADER:UNIT.

    Args:
        text: As typed.

    Returns: the quantity's name and its column, or what is wrong, a sentence.
    """
    name, sign, rest = (part.strip() for part in text.partition("="))
    if not sign or not rest or name not in BY_NAME:
        near = nearest(name, BY_NAME)
        hint = f"; did you mean {near}?" if near else "."
        return (
            f'Found the column "{short(text)}", expected NAME=HEADER or NAME=HEADER:UNIT with NAME one of '
            f"{', '.join(BY_NAME)}{hint}"
        )
    header, unit = rest, ""
    head, colon, tail = rest.rpartition(":")
    if colon and head and tail.strip():
        header, unit = head.strip(), tail.strip()
    reversed_sign = header.startswith("-")
    return name, Stated(header.removeprefix("-").strip(), unit, reversed_sign)


def scale(quantity: Quantity, unit: str) -> tuple[float, float] | str:
    """Factor and offset from a column's unit to SI.

    Args:
        quantity: What the column holds.
        unit: As written; "" for SI.

    Returns: value in SI = factor * number + offset, or what is wrong, a clause.
    """
    if not unit:
        return 1.0, 0.0
    try:
        found = parse_unit(unit)
    except UnitError as error:
        return str(error)
    if found.exponents != quantity.dimension.exponents or found.kind not in {"product", "celsius"}:
        return f'the unit "{short(unit)}" is not one of {quantity.dimension.phrase}'
    return found.factor, 273.15 if found.kind == "celsius" else 0.0


def match(headers: Sequence[str], stated: Mapping[str, Stated]) -> Match | list[str]:
    """Find the quantities among a table's headers.

    Args:
        headers: The cells of the header line.
        stated: Columns that the user named; these are not guessed.

    Returns: the columns, or what is wrong, a sentence each.
    """
    trouble: list[str] = []
    found: dict[str, tuple[int, Column]] = {}
    for name, wish in stated.items():
        place = _place(headers, wish.header)
        if place is None:
            shown = ", ".join(short(one) for one in headers[:20])
            trouble.append(f'Found no column "{short(wish.header)}" for {name}, expected one of: {shown}.')
            continue
        unit = wish.unit or _split(headers[place], BY_NAME[name])[1]
        found[name] = place, Column(name, headers[place].strip(), unit, wish.reversed)
    taken = {place for place, _ in found.values()}
    exact = not stated
    for place, header in enumerate(headers):
        guess = None if place in taken else _guess(header)
        if guess is None or guess[0].name in stated:
            continue
        quantity, unit = guess
        if quantity.name in found:
            trouble.append(
                f'Found two columns for the {quantity.title}, "{short(found[quantity.name][1].header)}" and '
                f'"{short(header)}", expected one: name it with {quantity.name}=HEADER.'
            )
            continue
        exact = exact and quantity.contract and header.strip() == quantity.name
        found[quantity.name] = place, Column(quantity.name, header.strip(), unit)
    ordered = [found[one.name] for one in QUANTITIES if one.name in found]
    trouble += _units(tuple(column for _, column in ordered))
    return trouble or Match(tuple(c for _, c in ordered), tuple(p for p, _ in ordered), exact)


def known(headers: Sequence[str]) -> int:
    """How many of the cells look like a header of a quantity that can be read."""
    return sum(_guess(one) is not None for one in headers)


def short(text: str) -> str:
    """Text of a file, made harmless and short for a message."""
    text = clean(text)
    return f"{text[:_LONGEST]}…" if len(text) > _LONGEST else text


def _units(columns: tuple[Column, ...]) -> list[str]:
    """What is wrong with the columns' units."""
    trouble = []
    for one in columns:
        found = scale(BY_NAME[one.name], one.unit)
        if isinstance(found, str):
            expected = f"{BY_NAME[one.name].dimension.phrase}, for example {BY_NAME[one.name].dimension.example}"
            trouble.append(f'Found the column "{short(one.header)}" for {one.name}, expected {expected}: {found}.')
    return trouble


def _place(headers: Sequence[str], wanted: str) -> int | None:
    """Position of a header, by its text, by its text without the unit, or by "#3"."""
    numbered = re.fullmatch(r"#([1-9][0-9]{0,4})", wanted)
    if numbered:
        place = int(numbered[1]) - 1
        return place if place < len(headers) else None
    plain = [one.strip() for one in headers]
    if wanted in plain:
        return plain.index(wanted)
    folded = [one.casefold() for one in plain]
    if folded.count(wanted.casefold()) == 1:
        return folded.index(wanted.casefold())
    return None


def _guess(header: str) -> tuple[Quantity, str] | None:
    """The quantity that a header names, and its unit; None where it names none."""
    for quantity in QUANTITIES:
        name, unit = _split(header, quantity)
        if _folded(name) in quantity.called:
            return quantity, unit
    return None


def _split(header: str, quantity: Quantity) -> tuple[str, str]:
    """A header's name and unit; the unit is split off only where it fits the quantity."""
    header = header.strip().strip('"').strip()
    for pattern in (_BRACKETED, _AFTER_SLASH, _AFTER_UNDERSCORE):
        parts = pattern.match(header)
        if parts and parts["unit"]:
            unit = _spelled(parts["unit"], quantity.dimension)
            if unit and not isinstance(scale(quantity, unit), str):
                return parts["name"], unit
    return header, ""


def _spelled(unit: str, dimension: Dimension) -> str:
    """A unit as the table of units spells it, where a header wrote "ua", "v" or "c" in its own way."""
    if dimension == dim.TEMPERATURE:
        return {"c": "°C", "°c": "°C", "degc": "°C", "celsius": "°C", "k": "K", "kelvin": "K"}.get(unit.lower(), unit)
    folded = unit.strip()
    if dimension.unit in {"V", "A"} and folded[-1:] in {"v", "a"}:
        return folded[:-1] + folded[-1].upper()
    return folded


def _folded(name: str) -> str:
    """A header's letters and digits in lower case."""
    return re.sub(r"[^a-z0-9]", "", name.casefold())
