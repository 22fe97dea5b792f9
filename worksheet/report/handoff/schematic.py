"""The drawing of a stage, from the stage's own table: as SVG, in words, and in characters.

Nothing here knows a circuit. The channels are followed from the output to both ends, as the terminal's drawing does;
a p-channel stage is the mirror image. Devices whose channel lies elsewhere stand beside the column by themselves.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field

from worksheet.model.dimension import CAPACITANCE, CURRENT, LENGTH, RESISTANCE, VOLTAGE, Dimension
from worksheet.model.quantity import format_quantity
from worksheet.report.handoff.html import escaped
from worksheet.report.handoff.material import Block
from worksheet.report.handoff.tree import Picture
from worksheet.stages.circuit import Circuit
from worksheet.stages.stage import BIAS, GROUND, IN, LINE, OUT, SUPPLY, Transistor

_DIGITS = 3
_RAILS = {SUPPLY: "V_DD", GROUND: "ground"}
_OTHER_RAIL = {SUPPLY: GROUND, GROUND: SUPPLY}
_NODE, _DEVICE, _COLUMN, _LEFT, _TOP = 34, 78, 340, 190, 28
_STYLE = (
    "text{font:13px sans-serif;fill:#1b1f23}.q{fill:#33393e}.b{font-weight:600}"
    "line,circle,polyline{stroke:#1b1f23;stroke-width:1.6;fill:none}.r{stroke-width:3}.f{fill:#1b1f23;stroke:none}"
)


def picture(found: Block) -> Picture:
    """The drawing of a block's stage at the nominal condition."""
    return Picture(
        _Sketch(found).svg(), " ".join(described(found)), "The stage at its nominal condition", tuple(_lines(found))
    )


def described(found: Block) -> Iterator[str]:
    """The drawing in words, from top to bottom."""
    circuit = found.circuit
    yield f"{circuit.stage.title} of {circuit.polarity}-channel devices, bulk on the {circuit.bulk}, top to bottom."
    for nodes, devices in _columns(circuit):
        for above, device, below in zip(nodes, devices, nodes[1:], strict=False):
            said = ", ".join(part for part in (*_said(found, device), _gate(found, device)) if part)
            yield f"Between {_stands(found, above)} and {_stands(found, below)}: {said}."
    yield f"The output drives {_choice(found, 'load_capacitance', CAPACITANCE)}."


def _lines(found: Block) -> Iterator[str]:
    """The drawing in characters."""
    for number, (nodes, devices) in enumerate(_columns(found.circuit)):
        if number:
            yield ""
        for place, node in enumerate(nodes):
            load = f", drives {_choice(found, 'load_capacitance', CAPACITANCE)}" if node == OUT else ""
            yield f"    {_stands(found, node)}{load}"
            if place == len(devices):
                break
            title, *more = _said(found, devices[place])
            yield "    |"
            yield f"   [ ] {'  '.join(part for part in (title, _gate(found, devices[place])) if part)}"
            yield from (f"    |    {part}" for part in more if part)
            yield "    |"


def _columns(circuit: Circuit) -> Iterator[tuple[list[str], list[Transistor]]]:
    """Nodes and the devices between them, top to bottom: the channels through the output, then each other device."""
    top, above = circuit.stack_above(OUT)
    bottom, below = circuit.stack_below(OUT)
    devices = [*reversed(above), *below]
    nodes = [top, *(device.lower for device in devices[:-1]), bottom]
    every = [(nodes, devices)]
    every += [([d.upper, d.lower], [d]) for d in circuit.devices if d not in devices]
    for column, passed in every:
        yield (column, passed) if circuit.polarity == "n" else (column[::-1], passed[::-1])


def _named(circuit: Circuit, node: str) -> str:
    """A node as it is shown; in a mirror image the rails change places, and a line is a bias line."""
    shown = _OTHER_RAIL.get(node, node) if circuit.polarity == "p" else node
    return _RAILS.get(shown, "a bias line" if shown == LINE else shown)


def _stands(found: Block, node: str) -> str:
    """A node with its voltage, "in 100 mV through 2 kΩ"."""
    shown = _named(found.circuit, node)
    volts = found.nominal.supply if shown == _RAILS[SUPPLY] else _voltage(found, node)
    if volts is None or shown == _RAILS[GROUND]:
        return shown
    return f"{shown} {format_quantity(volts, VOLTAGE, _DIGITS)}{_through(found, node)}"


def _through(found: Block, node: str) -> str:
    """What the input drives its node through."""
    if node != IN or not found.circuit.driven_through_resistance:
        return ""
    stated = found.review.sheet.assume.get("drive_resistance")
    if stated is None or stated.number is None:
        return " through a resistance"
    return f" through {format_quantity(stated.number, RESISTANCE, _DIGITS)}"


def _voltage(found: Block, node: str) -> float | None:
    """A node's voltage from any terminal that touches it. [V]"""
    for device in found.circuit.devices:
        known: Mapping[str, object] = found.review.operating_point.get(device.name, {})
        for end in ("gate", "drain", "source"):
            value = known.get(f"{end}_voltage")
            if getattr(device, end) == node and node != LINE and isinstance(value, float):
                return value
    return None


def _choice(found: Block, key: str, dimension: Dimension) -> str:
    one = found.review.choices.get(key)
    return "unknown" if one is None else format_quantity(one.value, dimension, _DIGITS)


def _ideal(found: Block, device: Transistor) -> bool:
    return device.name == BIAS and found.circuit.ideal_bias


def _gate(found: Block, device: Transistor) -> str:
    """Where a gate is and its voltage, "gate: in 300 mV"."""
    return "" if _ideal(found, device) else f"gate: {' '.join(_gate_parts(found, device)).strip()}"


def _gate_parts(found: Block, device: Transistor) -> tuple[str, str]:
    volts = found.review.operating_point.get(device.name, {}).get("gate_voltage")
    shown = format_quantity(volts, VOLTAGE, _DIGITS) if isinstance(volts, float) else ""
    return _named(found.circuit, device.gate), shown + _through(found, device.gate)


def _said(found: Block, device: Transistor) -> tuple[str, str, str]:
    """A device's name, its sizes and what flows."""
    if _ideal(found, device):
        return "ideal current source", _choice(found, "bias_current", CURRENT), ""
    return f"{device.name} ({found.models[device.name]})", _sized(found, device), _flows(found, device)


def _sized(found: Block, device: Transistor) -> str:
    sizes = ((sign, found.review.choices.get(device.key(part))) for sign, part in (("W", "width"), ("L", "length")))
    parts = [f"{sign} {format_quantity(one.value, LENGTH, 4)}" for sign, one in sizes if one is not None]
    fingers = found.review.sheet.fingers.get(device.name, 1)
    return " ".join([*parts, f"{fingers} fingers"] if fingers > 1 else parts)


def _flows(found: Block, device: Transistor) -> str:
    known = found.review.operating_point.get(device.name, {})
    current, inversion, region = (known.get(k) for k in ("current", "inversion_coefficient", "region"))
    parts = [format_quantity(current, CURRENT, _DIGITS)] if isinstance(current, float) else []
    parts += [f"IC {inversion:.{_DIGITS}g}"] if isinstance(inversion, float) else []
    return ", ".join([*parts, str(region)] if region else parts)


@dataclass
class _Sketch:
    """Marks put down from the top rail to the bottom one, column by column."""

    found: Block
    marks: list[str] = field(default_factory=list)
    x: int = _LEFT
    y: int = _TOP
    lowest: int = _TOP

    def svg(self) -> str:
        """The whole drawing."""
        for nodes, devices in _columns(self.found.circuit):
            for place, node in enumerate(nodes):
                self._node(node, top=place == 0, bottom=place == len(devices))
                if place < len(devices):
                    self._device(devices[place])
            self.lowest = max(self.lowest, self.y)
            self.x, self.y = self.x + _COLUMN + _LEFT, _TOP
        width, height = self.x - _LEFT, self.lowest + 20
        return (
            f'<svg xmlns="http://www.w3.org/2000/svg" width="{width}" height="{height}" '
            f'viewBox="0 0 {width} {height}"><style>{_STYLE}</style>{"".join(self.marks)}</svg>'
        )

    def _node(self, node: str, *, top: bool, bottom: bool) -> None:
        x, said = self.x, _stands(self.found, node)
        if _named(self.found.circuit, node) in _RAILS.values():
            self._line(x - 34, self.y, x + 34, self.y, "r")
            self._text(x + 44, self.y + 5, said)
        else:
            load = f", drives {_choice(self.found, 'load_capacitance', CAPACITANCE)}" if node == OUT else ""
            self.marks.append(f'<circle class="f" cx="{x}" cy="{self.y}" r="3.2"/>')
            self._line(x, self.y, x + 48, self.y)
            self._text(x + 54, self.y + 5, said + load, "b")
        if not top:
            self._line(x, self.y - _NODE // 2, x, self.y)
        if not bottom:
            self._line(x, self.y, x, self.y + _NODE // 2)
            self.y += _NODE // 2

    def _device(self, device: Transistor) -> None:
        x, middle = self.x, self.y + _DEVICE // 2
        if _ideal(self.found, device):
            self._line(x, self.y, x, middle - 16)
            self.marks.append(f'<circle cx="{x}" cy="{middle}" r="16"/>')
            self._line(x, middle - 9, x, middle + 9)
            self._arrow((x - 4, middle + 3), (x, middle + 9), (x + 4, middle + 3))
            self._line(x, middle + 16, x, self.y + _DEVICE)
        else:
            self._transistor(device, middle)
        for k, (words, kind) in enumerate(zip(_said(self.found, device), ("b", "q", "q"), strict=True)):
            self._text(x + 24, middle - 12 + 17 * k, words, kind)
        self.y += _DEVICE + _NODE // 2

    def _transistor(self, device: Transistor, middle: int) -> None:
        x, channel, gate = self.x, self.x - 18, self.x - 25
        top, bottom = middle - 22, middle + 22
        self._line(x, middle - _DEVICE // 2, x, top)
        self._line(x, top, channel, top)
        self._line(channel, top - 6, channel, bottom + 6)
        self._line(channel, bottom, x, bottom)
        self._line(x, bottom, x, middle + _DEVICE // 2)
        self._line(gate, top, gate, bottom)
        self._line(gate, middle, gate - 55, middle)
        if device.upside_down == (self.found.circuit.polarity == "p"):  # n-channel: out of the source, which is below
            self._arrow((x - 9, bottom - 4), (x - 2, bottom), (x - 9, bottom + 4))
        else:  # p-channel: into the source, which is above
            self._arrow((x - 8, top - 4), (x - 15, top), (x - 8, top + 4))
        name, volts = _gate_parts(self.found, device)
        self._text(gate - 62, middle - 2, name, end=True)
        self._text(gate - 62, middle + 14, volts, end=True)

    def _line(self, x1: int, y1: int, x2: int, y2: int, kind: str = "") -> None:
        style = f' class="{kind}"' if kind else ""
        self.marks.append(f'<line{style} x1="{x1}" y1="{y1}" x2="{x2}" y2="{y2}"/>')

    def _arrow(self, *points: tuple[int, int]) -> None:
        shown = " ".join(f"{x},{y}" for x, y in points)
        self.marks.append(f'<polyline points="{shown}"/>')

    def _text(self, x: int, y: int, said: str, kind: str = "", *, end: bool = False) -> None:
        anchor = ' text-anchor="end"' if end else ""
        style = f' class="{kind}"' if kind else ""
        if said:
            self.marks.append(f'<text x="{x}" y="{y}"{style}{anchor}>{escaped(said)}</text>')
