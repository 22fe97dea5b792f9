"""The drawing of a stage, from the stage's own table: as SVG, in words, and as a table of connections in characters.

Nothing here knows a circuit. The channels are followed from the output to both ends, as the terminal's drawing does;
a p-channel stage is the mirror image. Devices whose channel lies elsewhere stand beside the column by themselves.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field

from worksheet.model.dimension import CAPACITANCE, CURRENT, LENGTH, VOLTAGE, Dimension
from worksheet.model.quantity import format_quantity
from worksheet.model.text import clean
from worksheet.report.handoff.material import Block
from worksheet.report.handoff.tree import Picture
from worksheet.stages.circuit import Circuit
from worksheet.stages.stage import BIAS, GROUND, OUT, SUPPLY, Transistor

_RAILS = {SUPPLY: "V_DD", GROUND: "ground"}
_OTHER_RAIL = {SUPPLY: GROUND, GROUND: SUPPLY}
_NODE, _DEVICE, _COLUMN, _LEFT, _TOP = 34, 84, 330, 150, 26
_SPECIAL = str.maketrans({"&": "&amp;", "<": "&lt;", ">": "&gt;", '"': "&quot;", "'": "&#39;"})
_STYLE = (
    "text{font:13px 'DejaVu Sans',Arial,sans-serif;fill:#1b1f23}.q{fill:#4a5258;font-size:12px}.b{font-weight:700}"
    "line,circle,polyline{stroke:#1b1f23;stroke-width:1.8;fill:none}.f{fill:#1b1f23;stroke:none}"
)


def picture(found: Block) -> Picture:
    """The drawing of a block's stage at the nominal condition."""
    kind = f"{found.circuit.stage.title}, {found.circuit.polarity}-channel"
    return Picture(
        _Sketch(found).svg(),
        " ".join(described(found)),
        f"{kind}, at the nominal condition",
        tuple(connections(found)),
    )


def described(found: Block) -> Iterator[str]:
    """The drawing in words, device by device."""
    circuit = found.circuit
    yield f"{circuit.stage.title} of {circuit.polarity}-channel devices, bulk on the {circuit.bulk}."
    for device in circuit.devices:
        ends = ", ".join(f"{end} at {_named(circuit, getattr(device, end))}" for end in ("gate", "drain", "source"))
        known = [part for part in (_sized(found, device), _flows(found, device)) if part]
        yield f"{device.name}: {ends}{''.join(f'; {part}' for part in known)}."
    if circuit.ideal_bias:
        yield f"An ideal source of {_choice(found, 'bias_current', CURRENT)} holds the current."
    yield f"Load {_choice(found, 'load_capacitance', CAPACITANCE)} at out."


def connections(found: Block) -> Iterator[str]:
    """Which node every terminal touches, as lines of characters."""
    circuit = found.circuit
    heads = ("device", "gate", "drain", "source", "bulk")
    rows = [
        (d.name, *(_named(circuit, n) for n in (d.gate, d.drain, d.source, circuit.bulk_node(d))))
        for d in circuit.devices
    ]
    widths = [max(len(row[k]) for row in (heads, *rows)) for k in range(len(heads))]
    for row in (heads, *rows):
        yield "  ".join(f"{cell:<{width}}" for cell, width in zip(row, widths, strict=True)).rstrip()


def _named(circuit: Circuit, node: str) -> str:
    """A node as it is shown; in a mirror image the rails change places, and a line is a bias line."""
    shown = _OTHER_RAIL.get(node, node) if circuit.polarity == "p" else node
    return _RAILS.get(shown, shown)


def _choice(found: Block, key: str, dimension: Dimension) -> str:
    one = found.review.choices.get(key)
    return "unknown" if one is None else format_quantity(one.value, dimension, 4)


def _sized(found: Block, device: Transistor) -> str:
    choices = found.review.choices
    width, length = (choices.get(device.key(part)) for part in ("width", "length"))
    if width is None or length is None:
        return ""
    sized = (format_quantity(one.value, LENGTH, 4) for one in (width, length))
    return f"{found.models[device.name]} {' / '.join(sized)}"


def _flows(found: Block, device: Transistor) -> str:
    known = found.review.operating_point.get(device.name, {})
    current, inversion, region = (known.get(k) for k in ("current", "inversion_coefficient", "region"))
    parts = [format_quantity(current, CURRENT, 4)] if isinstance(current, float) else []
    parts += [f"IC {inversion:.3g}"] if isinstance(inversion, float) else []
    return ", ".join([*parts, str(region)] if region else parts)


@dataclass
class _Sketch:
    """Marks put down from the top rail to the bottom one."""

    found: Block
    marks: list[str] = field(default_factory=list)
    x: int = _LEFT
    y: int = _TOP
    lowest: int = _TOP

    @property
    def circuit(self) -> Circuit:
        return self.found.circuit

    def svg(self) -> str:
        """The whole drawing."""
        nodes, devices = self._column()
        self._run(nodes, devices)
        for device in (d for d in self.circuit.devices if d not in devices and d.name != BIAS):
            self.x, self.y = self.x + _COLUMN, _TOP
            ends = [device.upper, device.lower]
            self._run(ends if self.circuit.polarity == "n" else ends[::-1], [device])
        width, height = self.x + _COLUMN, self.lowest + 22
        return (
            f'<svg xmlns="http://www.w3.org/2000/svg" width="{width}" height="{height}" '
            f'viewBox="0 0 {width} {height}"><style>{_STYLE}</style>{"".join(self.marks)}</svg>'
        )

    def _column(self) -> tuple[list[str], list[Transistor]]:
        top, above = self.circuit.stack_above(OUT)
        bottom, below = self.circuit.stack_below(OUT)
        devices = [*reversed(above), *below]
        nodes = [top, *(device.lower for device in devices)]
        nodes[-1] = bottom
        if self.circuit.polarity == "p":
            return nodes[::-1], devices[::-1]
        return nodes, devices

    def _run(self, nodes: list[str], devices: list[Transistor]) -> None:
        for k, node in enumerate(nodes):
            self._node(node, top=k == 0, bottom=k == len(nodes) - 1)
            if k < len(devices):
                self._device(devices[k])
        self.lowest = max(self.lowest, self.y)

    def _node(self, node: str, *, top: bool, bottom: bool) -> None:
        x, shown = self.x, _named(self.circuit, node)
        if shown in _RAILS.values():
            self._line(x - 34, self.y, x + 34, self.y)
            value = format_quantity(self.found.nominal.supply, VOLTAGE, 4) if shown == _RAILS[SUPPLY] else ""
            self._text(x + 42, self.y + 4, f"{shown} {value}".strip())
        else:
            self.marks.append(f'<circle class="f" cx="{x}" cy="{self.y}" r="3.2"/>')
            self._line(x, self.y, x + 34, self.y)
            volts = self._voltage(node)
            said = "" if volts is None else format_quantity(volts, VOLTAGE, 4)
            self._text(x + 42, self.y + 4, f"{shown} {said}".strip(), "b")
            if node == OUT:
                self._load(x + 180)
        if not top:
            self._line(x, self.y - _NODE // 2, x, self.y)
        if not bottom:
            self._line(x, self.y, x, self.y + _NODE // 2)
            self.y += _NODE // 2

    def _load(self, x: int) -> None:
        """The load from the output to ground."""
        y = self.y
        self._line(self.x + 125, y, x, y)
        self._line(x, y, x, y + 12)
        self._line(x - 11, y + 12, x + 11, y + 12)
        self._line(x - 11, y + 17, x + 11, y + 17)
        self._line(x, y + 17, x, y + 29)
        self._line(x - 8, y + 29, x + 8, y + 29)
        self._text(x + 17, y + 19, f"C_L {_choice(self.found, 'load_capacitance', CAPACITANCE)}", "q")
        self.lowest = max(self.lowest, y + 29)

    def _device(self, device: Transistor) -> None:
        x, y, ideal = self.x, self.y, device.name == BIAS and self.circuit.ideal_bias
        middle = y + _DEVICE // 2
        if ideal:
            self._line(x, y, x, middle - 16)
            self.marks.append(f'<circle cx="{x}" cy="{middle}" r="16"/>')
            self._line(x, middle - 9, x, middle + 9)
            self.marks.append(_arrow(x, middle + 10, "down"))
            self._line(x, middle + 16, x, y + _DEVICE)
            said = ("ideal source", _choice(self.found, "bias_current", CURRENT), "")
        else:
            self._transistor(device, middle)
            said = (device.name, _sized(self.found, device), _flows(self.found, device))
        for k, (words, kind) in enumerate(zip(said, ("b", "q", "q"), strict=True)):
            self._text(x + 42, middle - 12 + 17 * k, words, kind)
        self.y += _DEVICE + _NODE // 2

    def _transistor(self, device: Transistor, middle: int) -> None:
        x, channel, gate = self.x, self.x - 22, self.x - 29
        top, bottom = middle - 18, middle + 18
        self._line(x, middle - _DEVICE // 2, x, top)
        self._line(x, top, channel, top)
        self._line(channel, top - 6, channel, bottom + 6)
        self._line(channel, bottom, x, bottom)
        self._line(x, bottom, x, middle + _DEVICE // 2)
        self._line(gate, top, gate, bottom)
        self._line(gate, middle, gate - 24, middle)
        n_channel = device.upside_down == (self.circuit.polarity == "p")
        self.marks.append(_arrow(x - 6, bottom, "right") if n_channel else _arrow(channel + 6, top, "left"))
        volts = self.found.review.operating_point.get(device.name, {}).get("gate_voltage")
        name = _named(self.circuit, device.gate)
        self._text(gate - 30, middle - 1, name, "b", end=True)
        if isinstance(volts, float):
            self._text(gate - 30, middle + 14, format_quantity(volts, VOLTAGE, 4), "q", end=True)

    def _voltage(self, node: str) -> float | None:
        """A node's voltage from any terminal that touches it. [V]"""
        for device in self.circuit.devices:
            known: Mapping[str, object] = self.found.review.operating_point.get(device.name, {})
            for end in ("gate", "drain", "source"):
                value = known.get(f"{end}_voltage")
                if getattr(device, end) == node and isinstance(value, float):
                    return value
        return None

    def _line(self, x1: int, y1: int, x2: int, y2: int) -> None:
        self.marks.append(f'<line x1="{x1}" y1="{y1}" x2="{x2}" y2="{y2}"/>')

    def _text(self, x: int, y: int, said: str, kind: str = "", *, end: bool = False) -> None:
        anchor = ' text-anchor="end"' if end else ""
        style = f' class="{kind}"' if kind else ""
        if said:
            self.marks.append(f'<text x="{x}" y="{y}"{style}{anchor}>{clean(said).translate(_SPECIAL)}</text>')


def _arrow(x: int, y: int, way: str) -> str:
    """A full arrow head whose point, or for "left" and "right" whose middle, is at a place."""
    points = {
        "right": f"{x + 5},{y} {x - 6},{y - 5} {x - 6},{y + 5}",
        "left": f"{x - 5},{y} {x + 6},{y - 5} {x + 6},{y + 5}",
        "down": f"{x},{y + 3} {x - 5},{y - 7} {x + 5},{y - 7}",
    }[way]
    return f'<polygon class="f" points="{points}"/>'


