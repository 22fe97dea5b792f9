"""A stage with its options, and the small-signal network that follows from it, as data for both engines.

The network is a list of terms. A term says: the current that leaves node `row` contains `sign` times the element
`element` (a conductance or a capacitance) times the voltage of node `column`. The numeric engine fills arrays
with it, the symbolic one sympy matrices.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property, lru_cache

from worksheet.stages.stage import GROUND, IN, LINE, OUT, SUPPLY, Stage, Transistor

DRIVE = "drive"
"""The driven terminal where a drive resistance stands between it and the input."""

LOAD, IDEAL, WELL, RESISTOR = "load", "ideal_bias", "well", "drive_resistor"
"""Names of the elements that are no transistor."""

CONDUCTANCES = (
    ("transconductance", 1, "gate"),
    ("drain_conductance", 1, "drain"),
    ("bulk_conductance", 1, "bulk"),
    ("source_conductance", -1, "source"),
)
"""i_d = g_m v_g + g_d v_d + g_b v_b - g_s v_s: operating value, sign, controlling terminal."""

CAPACITANCES = (
    ("gate_source_capacitance", "gate", "source"),
    ("gate_drain_capacitance", "gate", "drain"),
    ("gate_bulk_capacitance", "gate", "bulk"),
    ("source_bulk_capacitance", "source", "bulk"),
    ("drain_bulk_capacitance", "drain", "bulk"),
)
"""A transistor's capacitances: operating value and the two terminals that it lies between."""


@dataclass(frozen=True, slots=True)
class Term:
    """One term of the nodal equations. `element` is (owner, value), e.g. ("main", "transconductance")."""

    row: str
    column: str
    sign: int
    element: tuple[str, str]
    dynamic: bool


@dataclass(frozen=True)
class Circuit:
    """A stage, its polarity, where its bulks are tied, its current source and whether its drive has a resistance.

    Two sheets with equal circuits differ in numbers only, so they are solved in one batch.
    """

    stage: Stage
    polarity: str = "n"
    bulk: str = "rail"
    ideal_bias: bool = True
    driven_through_resistance: bool = False

    @cached_property
    def devices(self) -> tuple[Transistor, ...]:
        """All transistors, the current source's last where it is not ideal."""
        return self.stage.devices(self.ideal_bias)

    @cached_property
    def terminal(self) -> str:
        """The node that the input drives: IN, or DRIVE behind a drive resistance."""
        return DRIVE if self.driven_through_resistance else IN

    @cached_property
    def unknown(self) -> tuple[str, ...]:
        """Nodes whose voltages are solved for; the output last."""
        driven = (DRIVE,) if self.driven_through_resistance else ()
        return (*driven, *self.stage.internal_nodes, OUT)

    def bulk_node(self, device: Transistor) -> str:
        """The node of a device's bulk."""
        if self.bulk == "source" and device in self.stage.transistors:
            return device.source
        return SUPPLY if device.upside_down else GROUND

    def node(self, device: Transistor, terminal: str) -> str:
        """The network node of a device's "gate", "drain", "source" or "bulk"; lines are told apart by device."""
        name = self.bulk_node(device) if terminal == "bulk" else getattr(device, terminal)
        if name == LINE:
            return f"{LINE}:{device.name}"
        return self.terminal if name == IN else str(name)

    def line_rail(self, device: Transistor) -> str:
        """The rail that a held gate moves with: that of its source, or of its bulk where the source stands on none."""
        if device.source in (GROUND, SUPPLY):
            return device.source
        return SUPPLY if device.upside_down else GROUND

    @cached_property
    def moving_with_supply(self) -> frozenset[str]:
        """Known nodes that move when the supply does; in a p-channel stage's mirror image that is the ground node."""
        return self.moved_by_supply(self.polarity)

    def moved_by_supply(self, polarity: str) -> frozenset[str]:
        """As moving_with_supply, were the stage of that polarity."""
        if polarity not in self._moved_by_supply:
            rail = SUPPLY if polarity == "n" else GROUND
            lines = {f"{LINE}:{d.name}" for d in self.devices if d.gate == LINE and self.line_rail(d) == rail}
            self._moved_by_supply[polarity] = frozenset({rail} | lines)
        return self._moved_by_supply[polarity]

    @cached_property
    def _moved_by_supply(self) -> dict[str, frozenset[str]]:
        return {}

    @cached_property
    def drawn(self) -> Circuit:
        """The same of n-channel devices, as it is drawn: circuits that differ in polarity alone are solved as one."""
        if self.polarity == "n":
            return self
        return circuit_of(self.stage, "n", self.bulk, self.ideal_bias, self.driven_through_resistance)

    @cached_property
    def terms(self) -> tuple[Term, ...]:
        """All terms of the nodal equations."""
        terms: list[Term] = []
        for device in self.devices:
            terms += self._transistor(device)
        terms += _between((LOAD, "capacitance"), OUT, GROUND, dynamic=True)
        if self.ideal_bias:
            rail = self.stage.bias.source
            terms += _between((IDEAL, "conductance"), OUT, rail, dynamic=False)
            terms += _between((IDEAL, "capacitance"), OUT, rail, dynamic=True)
        if self.bulk == "source":
            for device in self.stage.transistors:
                terms += _between((WELL, "capacitance"), self.node(device, "source"), GROUND, dynamic=True)
        if self.driven_through_resistance:
            terms += _between((RESISTOR, "conductance"), DRIVE, IN, dynamic=False)
        return tuple(t for t in terms if t.row not in (GROUND, SUPPLY))

    def _transistor(self, device: Transistor) -> list[Term]:
        drain, source = self.node(device, "drain"), self.node(device, "source")
        terms = []
        for value, sign, terminal in CONDUCTANCES:
            column = self.node(device, terminal)
            element = (device.name, value)
            terms += [Term(drain, column, sign, element, False), Term(source, column, -sign, element, False)]
        for value, first, second in CAPACITANCES:
            terms += _between((device.name, value), self.node(device, first), self.node(device, second), dynamic=True)
        return terms

    def stack_below(self, node: str) -> tuple[str, tuple[Transistor, ...]]:
        """Follow the channels from a node towards ground: the fixed node where that ends, and the devices passed."""
        return self._stack(node, "upper", "lower")

    def stack_above(self, node: str) -> tuple[str, tuple[Transistor, ...]]:
        """Follow the channels from a node towards the supply: the fixed node at the end, and the devices passed."""
        return self._stack(node, "lower", "upper")

    def _stack(self, node: str, near: str, far: str) -> tuple[str, tuple[Transistor, ...]]:
        devices: list[Transistor] = []
        while node not in (IN, GROUND, SUPPLY):
            device = next((d for d in self._channels if getattr(d, near) == node), None)
            if device is None or device in devices:
                raise ValueError(f"stage {self.stage.key}: no channel leads on from node {node!r}")
            devices.append(device)
            node = getattr(device, far)
        return node, tuple(devices)

    @cached_property
    def _channels(self) -> tuple[Transistor, ...]:
        return (*self.stage.transistors, self.stage.bias)


@lru_cache(maxsize=256)
def circuit_of(stage: Stage, polarity: str, bulk: str, ideal_bias: bool, driven_through_resistance: bool) -> Circuit:
    """The circuit of that kind, the same object each time: what follows from its table is worked out once."""
    return Circuit(stage, polarity, bulk, ideal_bias, driven_through_resistance)


def _between(element: tuple[str, str], first: str, second: str, dynamic: bool) -> list[Term]:
    if first == second:
        return []
    return [
        Term(first, first, 1, element, dynamic),
        Term(first, second, -1, element, dynamic),
        Term(second, second, 1, element, dynamic),
        Term(second, first, -1, element, dynamic),
    ]
