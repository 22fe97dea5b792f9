"""The nodal equations of a stage solved for polynomials in s: transfers, output impedance, supply path."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property

import numpy as np

from worksheet.device.arrays import Number
from worksheet.engine import polynomial as poly
from worksheet.engine.inputs import Inputs
from worksheet.engine.operating import Operating
from worksheet.stages.circuit import IDEAL, LOAD, RESISTOR, WELL, Term
from worksheet.stages.stage import IN, OUT, Transistor


class Network:
    """(G + sC) v = b of one circuit. Every transfer is a numerator over the one denominator.

    A numerator comes from Cramer's rule with the cofactors of the output's column, so that ratios of two transfers
    exist even where the denominator vanishes at zero frequency.
    """

    def __init__(self, inputs: Inputs, devices: Mapping[str, Operating]) -> None:
        """Take the element values; nothing is computed yet."""
        self._circuit = inputs.circuit
        self._devices = devices
        self._mirrored = inputs.mirrored
        self._elements: dict[str, dict[str, Number]] = {
            LOAD: {"capacitance": inputs.load_capacitance},
            IDEAL: {"conductance": inputs.ideal_conductance, "capacitance": inputs.ideal_capacitance},
            WELL: {"capacitance": inputs.well_capacitance},
        }
        if inputs.circuit.driven_through_resistance:
            self._elements[RESISTOR] = {"conductance": 1.0 / inputs.resistance}

    def _value(self, term: Term) -> Number:
        owner, name = term.element
        if owner in self._devices:
            value: Number = getattr(self._devices[owner].slopes, name)
            return value
        return self._elements[owner][name]

    @cached_property
    def _sums(self) -> dict[tuple[str, str], poly.Poly]:
        """Sum of all terms by row and column, as polynomials of degree one."""
        sums: dict[tuple[str, str], list[Number]] = {}
        for term in self._circuit.terms:
            entry = sums.setdefault((term.row, term.column), [0.0, 0.0])
            before, value = entry[term.dynamic], self._value(term)
            entry[term.dynamic] = before + value if term.sign > 0 else before - value
        return {place: list(entry) for place, entry in sums.items()}

    @cached_property
    def _matrix(self) -> poly.Matrix:
        unknown = self._circuit.unknown
        return [[self._sums.get((row, column), []) for column in unknown] for row in unknown]

    @cached_property
    def cofactors(self) -> list[poly.Poly]:
        """Cofactors of the output's column, one polynomial a node."""
        return poly.column_cofactors(self._matrix, self._circuit.unknown.index(OUT))

    @cached_property
    def denominator(self) -> poly.Poly:
        """det(G + sC), one coefficient more than there are nodes at the most."""
        out = self._circuit.unknown.index(OUT)
        total: poly.Poly = []
        for row, cofactor in zip(self._matrix, self.cofactors, strict=True):
            if row[out]:
                total = poly.add(total, poly.multiply(row[out], cofactor))
        return poly.padded(total, len(self._circuit.unknown) + 1)

    def _numerator(self, right: Mapping[str, poly.Poly]) -> poly.Poly:
        total: poly.Poly = []
        for node, cofactor in zip(self._circuit.unknown, self.cofactors, strict=True):
            if right.get(node):
                total = poly.add(total, poly.multiply(right[node], cofactor))
        return poly.padded(total, len(self._circuit.unknown) + 1)

    @cached_property
    def transfer(self) -> poly.Poly:
        """Numerator of H(s), from the input to the output."""
        return self._numerator({row: poly.scale(self._sums.get((row, IN), []), -1.0) for row in self._circuit.unknown})

    @cached_property
    def impedance(self) -> poly.Poly:
        """Numerator of the output impedance."""
        return self._numerator({OUT: [1.0]})

    @cached_property
    def supply_transfer(self) -> Number:
        """Numerator at zero frequency of the transfer from the supply, the input held to ground."""
        mirrored = self._mirrored
        found = [self._from_supply(p) for p, some in (("n", not mirrored.all()), ("p", mirrored.any())) if some]
        return found[0] if len(found) == 1 else np.where(mirrored, found[1], found[0])

    def _from_supply(self, polarity: str) -> Number:
        right: dict[str, poly.Poly] = {}
        for (row, column), entry in self._sums.items():
            if column in self._circuit.moved_by_supply(polarity):
                right[row] = poly.add(right.get(row, []), [-entry[0]])
        return self._numerator(right)[0]

    def channel_transfer(self, device: Transistor) -> poly.Poly:
        """Numerator of the transfer from a current that flows from a device's drain to its source."""
        drain, source = self._circuit.node(device, "drain"), self._circuit.node(device, "source")
        return self._numerator({drain: [-1.0], source: [1.0]} if drain != source else {})

    def drive_transfer(self) -> poly.Poly:
        """Numerator of the transfer from a current into the driven terminal."""
        return self._numerator({self._circuit.terminal: [1.0]})

    @cached_property
    def output_capacitance(self) -> Number:
        """All capacitance that hangs on the output node. [F]"""
        return self._sums[(OUT, OUT)][1]

    @cached_property
    def input_capacitance(self) -> Number:
        """At the device's terminal: with Miller for a gate; the node's own, output held, for source and drain. [F]"""
        terminal = self._circuit.terminal
        total = self._sums[(terminal, terminal)][1]
        if self._circuit.stage.drive != "gate":
            return total
        for node, gain in self._gains_from_terminal().items():
            total = total + self._sums.get((terminal, node), [0.0, 0.0])[1] * gain
        return total

    def _gains_from_terminal(self) -> dict[str, Number]:
        """DC voltage of every node other than the terminal for one volt at it."""
        terminal = self._circuit.terminal
        nodes = [n for n in self._circuit.unknown if n != terminal]
        matrix: poly.Matrix = [[self._sums.get((r, c), [])[:1] for c in nodes] for r in nodes]
        static = poly.determinant(matrix)[0]
        gains: dict[str, Number] = {}
        for k, node in enumerate(nodes):
            cofactors = poly.column_cofactors(matrix, k)
            total: Number = 0.0
            for row, cofactor in zip(nodes, cofactors, strict=True):
                drive = self._sums.get((row, terminal), [0.0])[0]
                if cofactor:
                    total = total - drive * cofactor[0]
            with np.errstate(all="ignore"):
                gains[node] = total / np.asarray(static)
        return gains
