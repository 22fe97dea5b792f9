"""Targets, evidence and waivers: what is wanted of a sheet's metrics, what was found of them, and what was forgiven.

Remarks, acceptances and the collisions that a merge left are read here too, as entries of the same form.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping
from typing import Any, TypeVar, cast

from worksheet.model import dimension as dim
from worksheet.model import metrics, operating
from worksheet.model.dimension import Dimension
from worksheet.model.keys import Key, Kind, Table
from worksheet.model.sheet import Acceptance, Collision, Evidence, Remark, Target, Value, Waiver
from worksheet.model.sheet_keys import ACCEPTANCE, COLLISION, EVIDENCE, REMARK, SHEET, WAIVER
from worksheet.model.text import clean, nearest
from worksheet.model.units import UnitError, parse_unit
from worksheet.sheetfile.annotated import free_dimension, in_order
from worksheet.sheetfile.locate import below
from worksheet.sheetfile.names import own_name_problem
from worksheet.sheetfile.reader import Reader, found
from worksheet.sheetfile.values import READERS, deviation, missing, number, part_of, subtable, table
from worksheet.stages.stage import Stage

Dimensions = Mapping[str, Dimension | None]
"""What the limits of each target measure; None for a figure whose unit is a word and no product of units."""

_TARGET = cast(Table, part_of(SHEET, "target").entry)
_KEYS = {key.name: key for key in _TARGET.keys}
_RENAMED = {"min": "minimum", "max": "maximum", "yield": "yield_fraction"}
_LIMITS = ("min", "max")
_FIGURE = ("formula", "unit")  # what a figure of the user's own says besides
_YIELD = _KEYS["yield"]
_DEVIATIONS = ("spread",)
_Entry = TypeVar("_Entry", Acceptance, Collision, Remark)


def read_targets(
    reader: Reader, stage: Stage | None, own: Mapping[str, Value], raw: object
) -> tuple[dict[str, Target], dict[str, Dimension | None]]:
    """Every target, and the dimension of each one that is named, also of those with problems."""
    targets: dict[str, Target] = {}
    dimensions: dict[str, Dimension | None] = {}
    for name, entry in subtable(reader, raw, "target").items():
        where = below("target", name)
        if not isinstance(entry, dict):
            reader.refuse(
                where,
                entry,
                f"a table, for example {name} = {{ {_LIMITS[0]} = ... }}" if name.isidentifier() else "a table",
            )
            continue
        metric = metrics.find(name)
        if metric is not None:
            reason = stage and stage.absent_metric(name)
            if reason:
                reader.report(where, f"Found a target on {name}, expected none: {reason}.")
            dimensions[name] = metric.dimension
        elif not _figure(reader, name, entry, where, own):
            continue
        else:
            dimensions[name] = _unit(reader, entry, where)
        target = read_target(reader, name, entry, where, dimensions[name])
        if target is not None:
            targets[name] = target
    return targets, dimensions


def _figure(reader: Reader, name: str, entry: Mapping[str, Any], where: str, own: Mapping[str, Value]) -> bool:
    """Whether a name that is no metric may be a figure of the user's own; reports why not."""
    if "formula" not in entry:
        near = nearest(name, metrics.keys())
        hint = f"did you mean {near}?" if near else "expected a metric, or a formula for a figure of your own."
        reader.report(where, f"Found the unknown metric {clean(name)}; {hint}")
        return False
    reason = "it is an own name already" if name in own else own_name_problem(name)
    if reason:
        reader.report(where, f"Found the figure {found(name)}: {reason}.")
    return True


def _unit(reader: Reader, entry: Mapping[str, Any], where: str) -> Dimension | None:
    """What a figure measures: its unit must be one without a prefix, because its formula gives SI base units."""
    unit = entry.get("unit")
    if unit is None:
        return dim.NUMBER
    if not isinstance(unit, str):
        return None  # reported with the other keys
    try:
        known = parse_unit(unit.strip()) if unit.strip() else None
    except UnitError:
        return None  # a word of the user's own, such as "conversions/s"
    if known is None:
        return dim.NUMBER
    if known.decade or known.kind in {"celsius", "decibel"}:
        base = f', for example "{known.base}"' if known.base else ""
        reader.refuse(below(where, "unit"), unit, f"a unit without a prefix, as the formula gives SI base units{base}")
    return free_dimension(unit.strip())


def read_target(
    reader: Reader, name: str, entry: Mapping[str, Any], where: str, dimension: Dimension | None
) -> Target | None:
    """One target, or None with its problems reported. `dimension` is that of its limits."""
    before = reader.count
    metric = metrics.find(name)
    fields: dict[str, Any] = {}
    for inner, raw in entry.items():
        key = _KEYS.get(inner)
        place = below(where, inner)
        if key is None:
            reader.unknown(where, inner, _KEYS)
        elif inner in _FIGURE and metric is not None:
            reader.unknown(
                where, inner, (), lambda _: f"{name} is a metric of its own; name a figure of yours otherwise"
            )
        elif key is _YIELD and (metric is None or not metric.of_yield):
            reader.unknown(where, inner, (), _of_yield)
        elif inner in _LIMITS:
            fields[inner] = limit(reader, key, raw, place, dimension)
        else:
            fields[inner] = READERS[key.kind](reader, key, raw, place)
    low, high = (fields.get(inner) for inner in _LIMITS)
    if not any(inner in entry for inner in _LIMITS):
        reader.report(where, "Found a target without a limit, expected min or max.")
    if low is not None and high is not None and low > high:
        reader.refuse(below(where, "min"), entry["min"], f"at most the other limit, {found(entry['max'])}")
    if reader.count > before:
        return None
    if metric is not None and metric.of_yield:
        fields.setdefault(_YIELD.name, _YIELD.default)
    return Target(
        name=name,
        line=reader.places.line(where),
        **{_RENAMED.get(inner, inner): value for inner, value in fields.items()},
    )


def _of_yield(_key: str) -> str:
    takes = ", ".join(metric.key for metric in metrics.all_metrics() if metric.of_yield)
    return f"it is a share of parts, for {takes}"


def limit(reader: Reader, key: Key, raw: object, where: str, dimension: Dimension | None) -> float | None:
    """A value of a metric or of a figure; a figure whose unit is a word takes bare numbers."""
    if dimension is not None:
        return number(reader, key, raw, where, dimension)
    if isinstance(raw, str):
        reader.refuse(where, raw, "a number without a unit, as the unit of this figure is a word of its own")
        return None
    return number(reader, key, raw, where, dim.NUMBER)


def _entries(reader: Reader, part: Table, data: Mapping[str, Any]) -> Iterable[tuple[dict[str, Any], str]]:
    """The entries of an array of tables, with the dotted key of each."""
    raw = data.get(part.name, [])
    if not isinstance(raw, list):
        reader.refuse(part.name, raw, f"entries that begin with [[{part.name}]]")
        return
    for index, entry in enumerate(raw):
        where = f"{part.name}.{index}"
        if isinstance(entry, dict):
            yield entry, where
        else:
            reader.refuse(where, entry, f"entries that begin with [[{part.name}]]")


def read_evidence(
    reader: Reader, stage: Stage | None, ideal_bias: bool, targets: Dimensions, data: Mapping[str, Any]
) -> tuple[Evidence, ...]:
    """Every [[evidence]]: of a metric, a target, or a value of a device's operating point (DEVICE.VALUE)."""
    evidence = []
    devices = () if stage is None else tuple(device.name for device in stage.devices(ideal_bias))
    known = {
        **{metric.key: metric.dimension for metric in metrics.all_metrics()},
        **operating.named(devices),
        **targets,
    }
    for entry, where in _entries(reader, EVIDENCE, data):
        subject = entry.get("metric")
        reason = stage.absent_metric(subject) if stage and isinstance(subject, str) and subject not in targets else None
        if reason:
            reader.report(below(where, "metric"), f"Found evidence for {clean(str(subject))}, expected none: {reason}.")
        fields = _read(reader, EVIDENCE, entry, where, "metric", known, "a metric, a target or DEVICE.VALUE")
        if fields is not None:
            value = fields["value"]
            in_order(reader, where, entry, fields.get("low"), (value,), fields.get("high"))
            evidence.append(Evidence(line=reader.places.line(where), **fields))
    return tuple(evidence)


def read_waivers(reader: Reader, targets: Dimensions, data: Mapping[str, Any]) -> tuple[Waiver, ...]:
    """Every [[waiver]]."""
    waivers = []
    for entry, where in _entries(reader, WAIVER, data):
        fields = _read(reader, WAIVER, entry, where, "target", targets, "a target of this sheet")
        if fields is not None:
            waivers.append(Waiver(line=reader.places.line(where), **fields))
    return tuple(waivers)


def read_collisions(reader: Reader, data: Mapping[str, Any]) -> tuple[Collision, ...]:
    """Every [[collision]]."""
    return tuple(_plain(reader, COLLISION, Collision, data))


def read_remarks(reader: Reader, data: Mapping[str, Any]) -> tuple[Remark, ...]:
    """Every [[remark]]."""
    return tuple(_plain(reader, REMARK, Remark, data))


def read_acceptances(reader: Reader, data: Mapping[str, Any]) -> tuple[Acceptance, ...]:
    """Every [[acceptance]]."""
    return tuple(_plain(reader, ACCEPTANCE, Acceptance, data))


def _plain(reader: Reader, part: Table, kind: Callable[..., _Entry], data: Mapping[str, Any]) -> Iterator[_Entry]:
    """The entries of an array of tables without quantities."""
    for entry, where in _entries(reader, part, data):
        before = reader.count
        fields = table(reader, part, entry, where)
        if reader.count == before:
            yield kind(line=reader.places.line(where), **fields)


def _read(
    reader: Reader, part: Table, entry: Mapping[str, Any], where: str, subject_key: str, known: Dimensions, what: str
) -> dict[str, Any] | None:
    """One entry whose quantities take the dimension of the metric or target that it is about."""
    before = reader.count
    keys = {key.name: key for key in part.keys}
    subject = entry.get(subject_key)
    about = isinstance(subject, str) and subject in known
    if isinstance(subject, str) and subject and not about:
        near = nearest(subject, known)
        hint = f'; did you mean "{near}"?' if near else "."
        reader.report(below(where, subject_key), f"Found {found(subject)}, expected {what}{hint}")
    dimension = known[subject] if isinstance(subject, str) and about else None
    fields: dict[str, Any] = {}
    for inner, raw in entry.items():
        key = keys.get(inner)
        place = below(where, inner)
        if key is None:
            reader.unknown(where, inner, keys)
        elif key.kind is not Kind.QUANTITY:
            fields[inner] = READERS[key.kind](reader, key, raw, place)
        elif not about:
            continue  # without its metric a number has no unit to be checked against
        elif inner in _DEVIATIONS and dimension is not None:
            fields[inner] = deviation(reader, key, raw, place, dimension)
        else:
            fields[inner] = limit(reader, key, raw, place, dimension)
    missing(reader, part, entry, where)
    return None if reader.count > before else fields
