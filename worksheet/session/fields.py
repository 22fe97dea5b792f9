"""What may be typed at a place of a sheet: how the text is read, what is wrong with it, how it may go on.

Driven by the key descriptions alone. Nothing here changes anything; a text that is read becomes pieces of a request.
"""

from __future__ import annotations

import datetime
import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from typing import Any

from worksheet.model import formula, metrics, operating
from worksheet.model.dimension import Dimension
from worksheet.model.formula import FormulaError
from worksheet.model.keys import ANNOTATIONS, Key, Kind, Table
from worksheet.model.project_keys import CONDITION
from worksheet.model.quantity import QuantityError, parse, parse_free
from worksheet.model.sheet_keys import OWN, PROPOSE, SHEET
from worksheet.model.text import nearest
from worksheet.project import links
from worksheet.session.edits import KeyPath, Piece, Put, TakeOut, value_at
from worksheet.session.snapshot import Snapshot
from worksheet.sheetfile.source import Written
from worksheet.stages import catalogue
from worksheet.stages.stage import Stage

_NAME_AT_END = re.compile(r"[A-Za-z_][A-Za-z0-9_]*(?:\.[A-Za-z0-9_]*)?$")
_UNIT_AT_END = re.compile(r"^\s*[-+]?[0-9.]+(?:[eE][-+]?[0-9]+)?\s*((?:[^\s*/+(-]\S*)?)$")
_PREFIXES = ("", "f", "p", "n", "u", "m", "k", "M", "G")
_MOST = 8


@dataclass(frozen=True)
class Place:
    """A place of a sheet where something may be typed.

    Attributes:
        sheet: Name of the sheet.
        path: The key, without "value" or "formula" for a value that may have notes.
        key: Its description, with the dimension that is wanted there.
        names: Names that a formula may use there.
        known: Names that a Kind.NAME may be; empty where that is open.
        required: Whether an empty text is refused.
    """

    sheet: str
    path: KeyPath
    key: Key
    names: tuple[str, ...] = ()
    known: tuple[str, ...] = ()
    required: bool = False
    proposable: bool = False


def place(snapshot: Snapshot, sheet: str, path: KeyPath) -> Place | None:
    """Describe a place; None where a sheet has none such."""
    data = snapshot.data(sheet)
    key = _key(data, path)
    if key is None:
        return None
    names: tuple[str, ...] = ()
    if key.formula or key.kind is Kind.FORMULA:
        names = formula_names(snapshot, sheet, own_metrics=path[0] == "target")
    known = _known(snapshot, data, path)
    return Place(sheet, path, key, names, known, key.required, path[0] == "choose" and len(path) == 2)


def _key(data: Mapping[str, Any], path: KeyPath) -> Key | None:
    head, rest = path[0], path[1:]
    if not rest:
        return SHEET.key(str(head))
    table = SHEET.table(str(head))
    if table is None:
        return None
    if head in ("assume", "choose", "own"):
        return _value_key(data, str(head), rest)
    if head == "target":
        return _of_metric(table.entry, data, str(rest[0]), rest[1:])
    if table.repeated:
        about = value_at(data, (str(head), rest[0], "metric" if head == "evidence" else "target"))
        return _of_metric(table, data, str(about), rest[1:])
    return table.key(str(rest[0]))


def _value_key(data: Mapping[str, Any], table: str, rest: KeyPath) -> Key | None:
    name = str(rest[0])
    key = OWN if table == "own" else stage_keys(data).get(name)
    if key is None or len(rest) == 1:
        return key
    note = ANNOTATIONS.key(str(rest[1]))
    if note is None or note.kind is not Kind.QUANTITY:
        return note
    return replace(note, dimension=key.dimension, low=None, symbol=key.symbol)


def _of_metric(table: object, data: Mapping[str, Any], name: str, rest: KeyPath) -> Key | None:
    """A key of a target or of evidence: plain quantities take the dimension of the metric."""
    if not isinstance(table, Table) or len(rest) != 1:
        return None
    key = table.key(str(rest[0]))
    if key is None or key.kind is not Kind.QUANTITY or key.dimension is not None:
        return key
    if name in (point := _operating(data)):
        return replace(key, dimension=point[name])
    metric = metrics.find(name)
    own = value_at(data, ("target", name, "formula")) is not None
    return replace(key, dimension=None if own or metric is None else metric.dimension)


def _operating(data: Mapping[str, Any]) -> dict[str, Dimension]:
    """Values of the sheet's operating point, of which there can be evidence."""
    stage = catalogue.find(str(data.get("stage")))
    return {} if stage is None else operating.named(device.name for device in stage.devices(_ideal(data)))


def stage_keys(data: Mapping[str, Any]) -> dict[str, Key]:
    """Everything that a sheet may assume or choose, by name."""
    stage = catalogue.find(str(data.get("stage")))
    if stage is None:
        return {}
    return {key.name: key for key in (*stage.assumption_keys(_bulk(data)), *stage.design_keys(_ideal(data)))}


def _bulk(data: Mapping[str, Any]) -> str:
    return str(data.get("bulk", "rail"))


def _ideal(data: Mapping[str, Any]) -> bool:
    return str(value_at(data, ("bias", "device")) or "ideal") == "ideal"


def formula_names(snapshot: Snapshot, sheet: str, *, own_metrics: bool) -> tuple[str, ...]:
    """Names that a formula of a sheet may use, its own first."""
    found: list[str] = []
    for name, other in snapshot.project.sheets.items():
        known = [*links.names(other), *metrics.keys()]
        if name == sheet:
            found = [*links.names(other), *(metrics.keys() if own_metrics else ()), *found]
        else:
            found += [f"{name}.{one}" for one in known]
    return tuple(dict.fromkeys([*found, *formula.FUNCTIONS]))


def _known(snapshot: Snapshot, data: Mapping[str, Any], path: KeyPath) -> tuple[str, ...]:
    process = snapshot.project.process
    devices = tuple(process.devices) if process is not None else ()
    if path == ("stage",):
        return catalogue.keys()
    if path == ("device",):
        return devices
    if path == ("bias", "device"):
        return ("ideal", *_bias_devices(snapshot, data))
    if path[0] == "evidence" and path[-1] == "at":
        return () if process is None else tuple(dict.fromkeys(("typical", *process.corners)))
    if path[0] == "evidence" and path[-1] == "metric":
        return tuple(dict.fromkeys([*_targets(data), *metrics.keys(), *_operating(data)]))
    if path[0] == "waiver" and path[-1] == "target":
        return tuple(_targets(data))
    return ()


def _bias_devices(snapshot: Snapshot, data: Mapping[str, Any]) -> tuple[str, ...]:
    process, stage = snapshot.project.process, catalogue.find(str(data.get("stage")))
    if process is None or not isinstance(stage, Stage):
        return ()
    main = process.devices.get(str(data.get("device")))
    wanted = stage.bias_polarity(main.polarity) if main is not None else None
    return tuple(name for name, device in process.devices.items() if wanted in (None, device.polarity))


def _targets(data: Mapping[str, Any]) -> list[str]:
    table = data.get("target")
    return list(table) if isinstance(table, Mapping) else []


# Reading what was typed


def read(place: Place, text: str) -> tuple[Piece, ...] | str:
    """What a text asks for, or a sentence that says what is wrong with it.

    An empty text takes the key out. A number or a formula is told by its form; each takes the other's place.
    """
    text = text if place.key.kind is Kind.TEXT else text.strip()
    if not text:
        return f"{place.key.title} cannot be left out." if place.required else (TakeOut(place.path),)
    if place.key.kind is Kind.QUANTITY:
        return _quantity(place, text)
    value = _plain(place, text)
    return value if isinstance(value, str) else (Put(place.path, value[0]),)


def _quantity(place: Place, text: str) -> tuple[Piece, ...] | str:
    if place.proposable and text == PROPOSE:
        return (Put(place.path, PROPOSE),)
    if place.key.listed and "," in text:
        return _list(place, text)
    try:
        wrong = _number(place.key, text)
    except QuantityError as error:
        return _formula(place, text, str(error)) if place.key.formula else str(error)
    if wrong is not None:
        return wrong
    return (Put(place.path, _stated(text, place.key.dimension)),)


def _list(place: Place, text: str) -> tuple[Piece, ...] | str:
    parts = [part.strip() for part in text.split(",")]
    try:
        wrong = next((found for part in parts if (found := _number(place.key, part)) is not None), None)
    except QuantityError as error:
        return str(error)
    return wrong if wrong is not None else (Put(place.path, parts),)


def _number(key: Key, text: str) -> str | None:
    """Say what is wrong with a number's size, None where nothing is. QuantityError where it is none."""
    bare = _bare(text)
    if key.dimension is None:
        parse_free(text if bare is None else bare)
        return None
    plain = key.dimension.plain or not key.dimension.unit
    wanted = key.outside(parse(bare if plain and bare is not None else text, key.dimension))
    return None if wanted is None else f"{key.title}: found {text}, expected {wanted}."


def _bare(text: str) -> int | float | None:
    try:
        return int(text) if re.fullmatch(r"[-+]?[0-9]+", text) else Written(text) if _is_float(text) else None
    except ValueError:
        return None


def _is_float(text: str) -> bool:
    return re.fullmatch(r"[-+]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][-+]?[0-9]+)?", text) is not None


def _stated(text: str, dimension: Dimension | None) -> Any:
    """The TOML value for a number: a bare one where it has no unit, else the text as typed."""
    bare = _bare(text)
    if bare is not None and (dimension is None or dimension.plain or not dimension.unit):
        return bare
    return text


def _formula(place: Place, text: str, wrong_number: str) -> tuple[Piece, ...] | str:
    """A text that is no number, read as a formula; where it is none either, the likelier complaint."""
    looks = re.search(r"[-+*/(]", text.lstrip("+-")) or re.fullmatch(r"[A-Za-z_][\w.]*", text)
    try:
        parsed = formula.parse(text)
    except FormulaError as error:
        return f"The formula: {error}" if looks and re.search(r"[A-Za-z_(]", text) else wrong_number
    if not parsed.names and not looks:
        return wrong_number
    unknown = next((name for name in parsed.names if name not in place.names), None)
    if unknown is not None:
        near = nearest(unknown, place.names)
        hint = f"; did you mean {near}?" if near else "."
        return f"{unknown} is no name that a formula can use here{hint}"
    return (Put((*place.path, "formula"), text),)


def _plain(place: Place, text: str) -> tuple[Any] | str:
    """A value of any other kind in a tuple, or what is wrong."""
    key = place.key
    match key.kind:
        case Kind.WHOLE:
            whole = _bare(text)
            if not isinstance(whole, int):
                return f"{key.title}: found {text}, expected a whole number."
            wanted = key.outside(float(whole))
            return (whole,) if wanted is None else f"{key.title}: found {text}, expected {wanted}."
        case Kind.CHOICE:
            return _one_of(key, text, key.choices)
        case Kind.NAME:
            return _one_of(key, text, place.known) if place.known else (text,)
        case Kind.DATE:
            try:
                return (datetime.date.fromisoformat(text),)
            except ValueError:
                return f"{key.title}: found {text}, expected a date such as 2026-11-03."
        case Kind.CONDITION:
            return _condition(place, text)
        case Kind.FORMULA:
            try:
                parsed = formula.parse(text)
            except FormulaError as error:
                return str(error)
            unknown = next((name for name in parsed.names if place.names and name not in place.names), None)
            if unknown is None:
                return (text,)
            near = nearest(unknown, place.names)
            return f"{unknown} is no name that a formula can use here{f'; did you mean {near}?' if near else '.'}"
        case _:
            return (text,)


def _condition(place: Place, text: str) -> tuple[Any] | str:
    """Process, temperature and supply, with commas between them."""
    parts = [part.strip() for part in text.split(",")]
    keys = CONDITION.keys
    if len(parts) != len(keys):
        example = ", ".join(key.example for key in keys)
        return f"{place.key.title}: found {text}, expected {len(keys)} values with commas, for example {example}."
    for key, part in zip(keys, parts, strict=True):
        if key.kind is not Kind.QUANTITY:
            found = _one_of(key, part, place.known) if place.known else (part,)
            wrong = found if isinstance(found, str) else None
        else:
            try:
                wrong = _number(key, part)
            except QuantityError as error:
                wrong = str(error)
        if wrong is not None:
            return wrong
    return ({key.name: part for key, part in zip(keys, parts, strict=True)},)


def _one_of(key: Key, text: str, choices: Iterable[str]) -> tuple[str] | str:
    known = list(choices)
    if text in known:
        return (text,)
    near = nearest(text, known)
    hint = f"; did you mean {near}?" if near else "."
    return f"{key.title}: found {text}, expected one of {', '.join(known)}{hint}"


# How it may go on


def complete(place: Place, text: str) -> tuple[str, ...]:
    """Whole texts that the typed one may become, likeliest first: names, choices, units."""
    key = place.key
    if key.kind in (Kind.CHOICE, Kind.NAME):
        known = key.choices or place.known
        return _matching(known, text, lambda one: one)
    if key.kind is Kind.CONDITION and "," not in text:
        return _matching(place.known, text, lambda one: f"{one}, ")
    if key.kind is Kind.FORMULA:
        return _names(place, text)
    if key.kind is not Kind.QUANTITY:
        return ()
    number = _UNIT_AT_END.match(text)
    if number is None:
        found = _names(place, text) if key.formula else ()
        return (PROPOSE, *found) if place.proposable and text and PROPOSE.startswith(text) else found
    return _units(key, text, number[1])


def _units(key: Key, text: str, typed: str) -> tuple[str, ...]:
    if key.dimension is None or not key.dimension.unit or key.dimension.plain:
        return ()
    unit = key.dimension.shown or key.dimension.unit
    shown = "°C" if unit == "K" else unit
    prefixes = _PREFIXES if key.dimension.prefixed and unit != "K" else ("",)
    stem = text[: len(text) - len(typed)].rstrip()
    units = [f"{prefix}{shown}" for prefix in prefixes]
    return tuple(f"{stem} {one}" for one in units if one.startswith(typed) and one != typed)[:_MOST]


def _names(place: Place, text: str) -> tuple[str, ...]:
    found = _NAME_AT_END.search(text)
    if found is None:
        return ()
    stem = text[: found.start()]
    return _matching(place.names, found[0], lambda one: stem + one)


def _matching(known: Iterable[str], typed: str, whole: Any) -> tuple[str, ...]:
    names = list(known)
    first = [one for one in names if one.startswith(typed) and one != typed]
    rest = [one for one in names if typed and typed in one and one not in first and one != typed]
    return tuple(whole(one) for one in (*first, *rest)[:_MOST])


# What is to be added


def coming(snapshot: Snapshot, sheet: str, path: KeyPath, about: str) -> Place | None:
    """Describe a place of an entry that is not in the sheet yet.

    Args:
        snapshot: The book.
        sheet: Name of the sheet.
        path: Where it will stand; an array's entry by any number.
        about: The metric or target that a number there is of; "" for none.
    """
    table = SHEET.table(str(path[0]))
    if table is None or not table.repeated:
        return place(snapshot, sheet, path)
    data = snapshot.data(sheet)
    key = _of_metric(table, data, about, path[1:][1:])
    return None if key is None else Place(sheet, path, key, (), _known(snapshot, data, path), key.required)
