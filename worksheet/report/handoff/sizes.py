"""Sizes of a block: as a table for people, and as plain lines for layout and simulator."""

from __future__ import annotations

from collections.abc import Iterator

from worksheet.model.dimension import LENGTH
from worksheet.report.handoff.material import Block
from worksheet.report.handoff.tree import Builder, Cell, Lines, number, quantity, text

_DIGITS = 6


def sizes(found: Block, into: Builder) -> None:
    """The section of sizes."""
    into.head("Sizes", "sizes")
    columns = ("device", "model", "width W", "length L", "fingers", "width of a finger", "origin")
    rows = tuple(_row(found, device.name) for device in found.circuit.devices)
    into.table("Drawn sizes; the width is the total of all fingers", columns, rows, (2, 3, 4, 5))
    others = [
        (text(key), number(one.value, one.unit, f"review/{found.name}/choose/{key}/value", digits=_DIGITS),
         text(one.origin))
        for key, one in found.review.choices.items() if one.unit != LENGTH.unit
    ]  # fmt: skip
    into.table("Beside the sizes", ("choice", "value", "origin"), others, (1,))
    into.add(Lines("For layout and simulator, in metres, amperes and farads", tuple(lines(found))))


def _row(found: Block, name: str) -> tuple[Cell, ...]:
    device = next(d for d in found.circuit.devices if d.name == name)
    width, length = (found.review.choices.get(device.key(part)) for part in ("width", "length"))
    fingers = _fingers(found, name)
    of = f"review/{found.name}/choose/{{}}/value"
    each = None if width is None else width.value / fingers
    origins = dict.fromkeys(one.origin for one in (width, length) if one is not None)
    return (
        text(name),
        text(found.models[name]),
        quantity(None if width is None else width.value, LENGTH, of.format(device.key("width")), _DIGITS),
        quantity(None if length is None else length.value, LENGTH, of.format(device.key("length")), _DIGITS),
        text(fingers),
        quantity(each, LENGTH, digits=_DIGITS),
        text(", ".join(origins)),
    )


def _fingers(found: Block, name: str) -> int:
    return found.review.sheet.fingers.get(name, 1)


def lines(found: Block) -> Iterator[str]:
    """`name = value` lines in SI units, each name once in a project."""
    block = found.name
    for device in found.circuit.devices:
        for part in ("width", "length"):
            choice = found.review.choices.get(device.key(part))
            if choice is not None:
                yield f"{block}_{device.name}_{part} = {choice.value!r}"
        yield f"{block}_{device.name}_fingers = {_fingers(found, device.name)}"
    for key in ("bias_current", "load_capacitance"):
        if key in found.review.choices:
            yield f"{block}_{key} = {found.review.choices[key].value!r}"
    yield f"{block}_count = {found.review.sheet.count}"
