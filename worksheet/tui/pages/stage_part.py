"""The stage of a sheet: its drawing with live voltages and currents, and the operating point in short."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import zip_longest

from worksheet.model import operating
from worksheet.model.dimension import VOLTAGE
from worksheet.model.quantity import format_quantity
from worksheet.report import wording
from worksheet.tui import drawing, rows
from worksheet.tui.pages import words
from worksheet.tui.pages.parts import Facts
from worksheet.tui.rows import HEAD, LABEL, PLAIN, Line, Row, Span, line

_DRAWN, _LABEL, _CELL = 36, 9, 11
_SHORT = {
    "inversion_coefficient",
    "current",
    "transconductance",
    "transconductance_efficiency",
    "gate_source_voltage",
    "saturation_voltage",
    "headroom",
}


def drawn(facts: Facts) -> tuple[Line, ...]:
    """The drawing; empty while there are no results."""
    if facts.result is None:
        return ()
    process = facts.snapshot.project.process
    model = process.devices.get(facts.result.sheet.device) if process is not None else None
    file = facts.snapshot.project.file
    supply = file.nominal.supply if file is not None else None
    found = drawing.of_sheet(facts.result, model.polarity if model is not None else "n", supply)
    return () if found is None else found.lines(facts.signs)


def in_short(facts: Facts) -> Iterator[Line]:
    """What a designer looks at first of each device."""
    if facts.result is None:
        return
    devices = facts.result.operating_point
    yield line(Span("", PLAIN, _LABEL), *(facts.text(name, HEAD, _CELL) for name in devices))
    for value in operating.OPERATING_POINT:
        if value.key not in _SHORT:
            continue
        cells = [values.get(value.key) for values in devices.values()]
        cells = [
            0.0 if isinstance(c, float) and value.dimension == VOLTAGE and abs(c) < wording.NO_VOLTAGE else c
            for c in cells
        ]
        texts = [format_quantity(c, value.dimension, words.DIGITS) if isinstance(c, float) else "-" for c in cells]
        short = value.symbol if len(value.symbol) <= _LABEL else value.title.lower()
        yield line(facts.text(short, LABEL, _LABEL), *(facts.text(text, PLAIN, _CELL) for text in texts))
    regions = [str(values.get("region") or "-") for values in devices.values()]
    yield line(Span("region", LABEL, _LABEL), *(facts.text(text, PLAIN, _CELL) for text in regions))


def beside(facts: Facts) -> Iterator[Row]:
    """Both beside each other, as rows of the page that the cursor passes over."""
    for k, (left, right) in enumerate(zip_longest(drawn(facts), in_short(facts), fillvalue=())):
        fill = Span(" " * max(_DRAWN - rows.width(left), 1))
        yield Row(f"stage.{k}", ((*left, fill, *right),), stops=False)


def below(facts: Facts) -> tuple[Line, ...]:
    """One below the other, for a column of their own."""
    return (*drawn(facts), (), *in_short(facts))
