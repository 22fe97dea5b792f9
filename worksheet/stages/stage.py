"""What a stage declares: its transistors, which node each terminal touches, what is driven and what is watched.

Everything else (which current source it takes, its ranges, its small-signal network, the keys of its sheet) is
derived from this table, here and in circuit.py. Stages are drawn for n-channel devices; a p-channel stage is the
mirror image about the supply.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property
from types import MappingProxyType

from worksheet.model import metrics
from worksheet.model.keys import Key
from worksheet.model.sheet_keys import ASSUMPTIONS, DESIGN, FINGERS, GEOMETRY, OWN_CONDITIONS

IN, OUT, GROUND, SUPPLY, LINE = "in", "out", "ground", "supply", "line"
"""Nodes that every stage may touch; a LINE is a gate held by a bias line. Any other name is an internal node."""

MAIN, BIAS = "main", "bias"
"""Names of the first transistor and of the current source's."""

_LEVELS = ("input_level", "output_level")


@dataclass(frozen=True, slots=True)
class Transistor:
    """One transistor of a stage and the nodes that its terminals touch.

    Attributes:
        name: "main", "bias" or a name of the stage's own; goes before its keys in the sheet, except for "main".
        gate, drain, source: Node names.
        upside_down: Whether it is of the other polarity and its bulk rail is the supply.
    """

    name: str
    gate: str
    drain: str
    source: str
    upside_down: bool = False

    @property
    def lower(self) -> str:
        """The channel end nearer to ground."""
        return self.drain if self.upside_down else self.source

    @property
    def upper(self) -> str:
        """The channel end nearer to the supply."""
        return self.source if self.upside_down else self.drain

    def key(self, name: str) -> str:
        """The sheet's key for one of this device's own design variables ("cascode_width")."""
        return name if self.name == MAIN else f"{self.name}_{name}"


@dataclass(frozen=True)
class Stage:
    """One circuit, as data.

    Attributes:
        key: Name in sheet files.
        title, purpose: For people: what it is called, what one takes it for.
        transistors: Its transistors, the main one first; the current source is added by circuit.py.
        levels: Which of input_level and output_level may be assumed.
        one_level: Whether only one of them may be assumed at a time.
        undefined: Metrics that have no meaning for it, with the reason.
    """

    key: str
    title: str
    purpose: str
    transistors: tuple[Transistor, ...]
    levels: tuple[str, ...]
    one_level: bool = False
    undefined: Mapping[str, str] = field(default_factory=lambda: MappingProxyType({}), hash=False)

    @property
    def drive(self) -> str:
        """Terminal of the main device that the input drives: "gate", "source" or "drain"."""
        main = self.transistors[0]
        return {main.gate: "gate", main.source: "source", main.drain: "drain"}[IN]

    @property
    def source_output(self) -> bool:
        """Whether the output is the source of a device (its current source then stands on ground)."""
        return any(device.source == OUT for device in self.transistors)

    @property
    def holds_input(self) -> bool:
        """Whether the input is what stays put over conditions, and the output follows it."""
        return self.drive == "gate" and self.source_output

    @property
    def internal_nodes(self) -> tuple[str, ...]:
        """Nodes that are neither input, output, rail nor line, in the order of the table."""
        named = [node for device in self.transistors for node in (device.gate, device.drain, device.source)]
        return tuple(dict.fromkeys(n for n in named if n not in (IN, OUT, GROUND, SUPPLY, LINE)))

    @property
    def bias(self) -> Transistor:
        """The current source's transistor: same polarity under a source output, the other over a drain output."""
        if self.source_output:
            return Transistor(BIAS, LINE, OUT, GROUND)
        return Transistor(BIAS, LINE, OUT, SUPPLY, upside_down=True)

    def bias_polarity(self, polarity: str) -> str:
        """Polarity that the current source's transistor must have for a stage of `polarity` devices."""
        return polarity if self.source_output else {"n": "p", "p": "n"}[polarity]

    def devices(self, ideal_bias: bool) -> tuple[Transistor, ...]:
        """All transistors, the current source's last where it is not ideal."""
        return self.transistors if ideal_bias else (*self.transistors, self.bias)

    def design_keys(self, ideal_bias: bool) -> tuple[Key, ...]:
        """The design variables that a sheet of this stage may hold, in the order of a form."""
        if ideal_bias not in self._design:
            self._design[ideal_bias] = self._design_keys(ideal_bias)
        return self._design[ideal_bias]

    @cached_property
    def _design(self) -> dict[bool, tuple[Key, ...]]:
        return {}

    def _design_keys(self, ideal_bias: bool) -> tuple[Key, ...]:
        keys = [key for key in DESIGN if key.name not in GEOMETRY]
        for device in self.devices(ideal_bias):
            own = [key for key in DESIGN if key.name in GEOMETRY] + [FINGERS]
            keys += [_of_device(key, device) for key in own]
        return tuple(keys)

    def assumption_keys(self, bulk: str) -> tuple[Key, ...]:
        """What a sheet of this stage may assume besides its design variables."""
        return tuple(k for k in ASSUMPTIONS + OWN_CONDITIONS if self.refusal(k.name, bulk, ideal_bias=False) is None)

    def refusal(self, name: str, bulk: str, ideal_bias: bool) -> str | None:
        """Say why a key that exists is not taken by this stage, or None where it is taken."""
        if name in _LEVELS and name not in self.levels:
            return f"a {self.title.lower()} takes no {name}: it follows from the other levels"
        if name == "well_capacitance" and bulk != "source":
            return 'well_capacitance needs bulk = "source": with the bulk on the rail there is no well of its own'
        if ideal_bias and name in {self.bias.key(key) for key in (*GEOMETRY, FINGERS.name)}:
            return f"{name} needs a transistor as the current source; this one is ideal"
        return None

    def absent_metric(self, name: str) -> str | None:
        """Say why a metric is not defined for this stage, or None where it is."""
        if name in self.undefined:
            return self.undefined[name]
        metric = metrics.find(name)
        needed = metric.needs_level if metric is not None else None
        if needed and needed not in self.levels:
            return f"{name} is not defined for a {self.title.lower()}: its input follows from the output"
        return None


def _of_device(key: Key, device: Transistor) -> Key:
    if device.name == MAIN:
        return key
    title = f"{device.name.capitalize()} {key.title.lower()}"
    return replace(
        key,
        name=device.key(key.name),
        title=title,
        symbol=f"{key.symbol}_{device.name}" if key.symbol else "",
        help=f"Of the {device.name} device. {key.help}",
    )
