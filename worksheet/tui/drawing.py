"""A stage drawn in characters from its table, with live voltages and currents.

Nothing here knows a circuit: the channels are followed from the output to both ends through the stage's own table, so
a stage that is entered in the catalogue is drawn like the others. A p-channel stage is its mirror image.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field

from worksheet.model.dimension import CAPACITANCE, CURRENT, VOLTAGE
from worksheet.model.quantity import format_quantity
from worksheet.report.table import width_of
from worksheet.review.results import SheetReview
from worksheet.stages import catalogue
from worksheet.stages.circuit import Circuit
from worksheet.stages.stage import BIAS, GROUND, IN, LINE, OUT, SUPPLY, Transistor
from worksheet.tui.rows import HEAD, LABEL, PLAIN, QUIET, RULE, VALUE, Line, Span
from worksheet.tui.signs import Signs

Operating = Mapping[str, Mapping[str, float | str | None]]

_BAR, _CHANNEL, _TEXT = 10, 13, 16
_RAILS = {SUPPLY: "V_DD", GROUND: "ground"}
_OTHER_RAIL = {SUPPLY: GROUND, GROUND: SUPPLY}
_TERMINALS = ("gate", "drain", "source")


@dataclass
class _Canvas:
    """Characters and what they are, put at places."""

    lines: list[dict[int, Span]] = field(default_factory=list)

    def row(self) -> int:
        """One more line; its number."""
        self.lines.append({})
        return len(self.lines) - 1

    def put(self, column: int, text: str, role: str = RULE) -> None:
        """Text on the last line."""
        if text:
            self.lines[-1][column] = Span(text, role)

    def spans(self) -> Iterator[Line]:
        """The lines with the room between the pieces filled."""
        for pieces in self.lines:
            out: list[Span] = []
            at = 0
            for column in sorted(pieces):
                if column > at:
                    out.append(Span(" " * (column - at)))
                    at = column
                out.append(pieces[column])
                at += width_of(pieces[column].text)
            yield tuple(out)


@dataclass(frozen=True)
class Drawing:
    """One stage with its options and what is known of it.

    Attributes:
        circuit: The stage, its polarity and its current source.
        operating: Operating values by device, SI units; empty before anything is solved.
        load: Load capacitance, None where unknown. [F]
        current: Current of the source. [A]
        supply: Nominal supply. [V]
    """

    circuit: Circuit
    operating: Operating = field(default_factory=dict)
    load: float | None = None
    current: float | None = None
    supply: float | None = None

    def lines(self, signs: Signs) -> tuple[Line, ...]:
        """The drawing, top rail first."""
        canvas = _Canvas()
        nodes, devices = self._column()
        for k, node in enumerate(nodes):
            first, last = k == 0, k == len(nodes) - 1
            self._node(canvas, signs, node, first=first, last=last)
            if not last:
                under = f"C_L {_quantity(self.load, CAPACITANCE)}" if node == OUT and self.load is not None else ""
                self._device(canvas, signs, devices[k], under)
        for device in self._beside(devices):
            canvas.row()
            self._alone(canvas, signs, device)
        return tuple(tuple(Span(signs.text(s.text), s.role) for s in line) for line in canvas.spans())

    def _column(self) -> tuple[list[str], list[Transistor]]:
        """Nodes and the devices between them along the channels through the output, from top to bottom."""
        top, above = self.circuit.stack_above(OUT)
        bottom, below = self.circuit.stack_below(OUT)
        devices = [*reversed(above), *below]
        nodes = [top, *(device.lower for device in devices)]
        nodes[-1] = bottom
        if self.circuit.polarity == "p":
            nodes.reverse()
            devices.reverse()
        return nodes, devices

    def _beside(self, drawn: list[Transistor]) -> list[Transistor]:
        """Devices whose channel does not lie in the column."""
        return [device for device in self.circuit.devices if device not in drawn and device.name != BIAS]

    def _rail(self, node: str) -> str | None:
        """The name of a rail as the drawing shows it; in a mirror image the two change places."""
        shown = _OTHER_RAIL.get(node, node) if self.circuit.polarity == "p" else node
        return _RAILS.get(shown)

    def _voltage(self, node: str) -> float | None:
        """A node's voltage from any terminal that touches it. [V]"""
        for device in self.circuit.devices:
            for terminal in _TERMINALS:
                if getattr(device, terminal) == node and node != LINE:
                    found = self.operating.get(device.name, {}).get(f"{terminal}_voltage")
                    if isinstance(found, float):
                        return found
        return None

    def _node(self, canvas: _Canvas, signs: Signs, node: str, *, first: bool, last: bool) -> None:
        canvas.row()
        rail = self._rail(node)
        if rail is not None:
            value = self.supply if rail == _RAILS[SUPPLY] else None
            canvas.put(_CHANNEL - 2, f"{rail} {_quantity(value, VOLTAGE)}".strip(), LABEL)
            return
        if not (first or last):
            canvas.put(_CHANNEL, signs.tee_right + signs.across)
            canvas.put(_TEXT, node, LABEL)
        else:
            canvas.put(_CHANNEL - 2, node, LABEL)
        start = (_TEXT if not (first or last) else _CHANNEL - 2) + width_of(node) + 1
        canvas.put(start, _quantity(self._voltage(node), VOLTAGE), VALUE)

    def _device(self, canvas: _Canvas, signs: Signs, device: Transistor, under: str) -> None:
        if device.name == BIAS and self.circuit.ideal_bias:
            self._ideal(canvas, signs, under)
            return
        source_on_top = device.upside_down == (self.circuit.polarity == "n")
        known = self.operating.get(device.name, {})
        canvas.row()
        arrow = signs.arrow_left if source_on_top else signs.across
        canvas.put(_BAR, signs.top + arrow + signs.across + signs.turn_up)
        canvas.put(_TEXT, under, QUIET)
        canvas.row()
        self._gate(canvas, signs, device)
        canvas.put(_TEXT - 3, device.name, HEAD)
        inversion = known.get("inversion_coefficient")
        if isinstance(inversion, float):
            canvas.put(_TEXT - 3 + width_of(device.name) + 1, f"IC {inversion:.3g}", PLAIN)
        canvas.row()
        arrow = signs.across if source_on_top else signs.arrow_right
        canvas.put(_BAR, signs.bottom + signs.across + arrow + signs.turn_down)
        region, current = known.get("region"), known.get("current")
        if isinstance(current, float):
            canvas.put(_TEXT - 1, f"{_quantity(current, CURRENT)} {region or ''}".strip(), QUIET)
        gate = known.get("gate_voltage")
        if isinstance(gate, float):
            canvas.put(0, f"{_quantity(gate, VOLTAGE):>8}", VALUE)

    def _gate(self, canvas: _Canvas, signs: Signs, device: Transistor) -> None:
        name = self._rail(device.gate) or device.gate
        canvas.put(0, f"{name:>6}", LABEL)
        canvas.put(7, signs.across * (_BAR - 7) + signs.gate)

    def _ideal(self, canvas: _Canvas, signs: Signs, under: str) -> None:
        canvas.row()
        canvas.put(_CHANNEL, signs.down)
        canvas.put(_TEXT, under, QUIET)
        canvas.row()
        canvas.put(_CHANNEL - 1, "(v)" if signs.plain else "(↓)", RULE)
        canvas.put(_TEXT + 1, f"{_quantity(self.current, CURRENT)} ideal", PLAIN)
        canvas.row()
        canvas.put(_CHANNEL, signs.down)

    def _alone(self, canvas: _Canvas, signs: Signs, device: Transistor) -> None:
        """A device beside the column, with the names of the nodes at its channel."""
        top, bottom = (device.upper, device.lower) if self.circuit.polarity == "n" else (device.lower, device.upper)
        self._node(canvas, signs, top, first=True, last=False)
        self._device(canvas, signs, device, "")
        self._node(canvas, signs, bottom, first=False, last=True)


def _quantity(value: float | None, dimension: object) -> str:
    from worksheet.model.dimension import Dimension

    assert isinstance(dimension, Dimension)
    return "" if value is None else format_quantity(value, dimension, 3)


def of_sheet(result: SheetReview, polarity: str, supply: float | None) -> Drawing | None:
    """The drawing of a reviewed sheet; None where the catalogue has lost its stage.

    Args:
        result: The sheet's results.
        polarity: Of the sheet's device, "n" or "p".
        supply: Nominal supply. [V]
    """
    sheet = result.sheet
    stage = catalogue.find(sheet.stage)
    if stage is None:
        return None
    choice = {name: one.value for name, one in result.choices.items()}
    circuit = Circuit(stage, polarity, sheet.bulk, sheet.bias.ideal)
    return Drawing(circuit, result.operating_point, choice.get("load_capacitance"), choice.get("bias_current"), supply)


__all__ = ["IN", "Drawing", "of_sheet"]
