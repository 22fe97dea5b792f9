"""The nodal equations of a stage in symbols: the same terms as the numeric engine's, solved by sympy's matrices."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from functools import cached_property, lru_cache
from typing import TYPE_CHECKING, Any

from worksheet.engine.symbolic.neglects import (
    BIAS_CONDUCTANCE,
    DRAIN_CONDUCTANCE,
    FASTER_POLES,
    FEED_THROUGH,
    INNER_CAPACITANCE,
)
from worksheet.stages.circuit import IDEAL, LOAD, RESISTOR, Term
from worksheet.stages.stage import BIAS, IN, OUT, Transistor

if TYPE_CHECKING:
    from worksheet.engine.symbolic.algebra import Algebra

Coefficients = list[Any]
"""Of a polynomial in s, lowest power first."""


class Network:
    """(G + sC) v = b with symbols. Every transfer is a numerator over the one denominator."""

    def __init__(self, a: Algebra) -> None:
        """Take the algebra whose levels are the elements."""
        import sympy

        self._a = a
        self._circuit = a.circuit
        self._made = a.setting.neglects
        self._s = sympy.Symbol("s")
        self._small = sympy.Symbol("epsilon", positive=True)

    @property
    def nodes(self) -> tuple[str, ...]:
        """Nodes whose voltages are solved for, the output last."""
        return self._circuit.unknown

    def _element(self, term: Term) -> Any:
        owner, value = term.element
        static_of_bias = owner in (BIAS, IDEAL) and not term.dynamic and value != "transconductance"
        if static_of_bias and BIAS_CONDUCTANCE in self._made:
            return 0
        if owner == LOAD:
            return self._a.leaf("load_capacitance")
        if owner == IDEAL:
            return self._a.leaf({"conductance": "bias.output_conductance", "capacitance": "bias.capacitance"}[value])
        if owner == RESISTOR:
            return 1 / self._a.symbol("drive_resistance")
        device = next((d for d in self._circuit.devices if d.name == owner), None)
        return self._a.leaf("well_capacitance") if device is None else self._of_device(device, value)

    def _of_device(self, device: Transistor, value: str) -> Any:
        a = self._a
        if value == "drain_conductance":
            return self._drain_conductance(device)
        if value == "bulk_conductance" and self._circuit.bulk_node(device) == device.source:
            slopes = a.of(device, "source_conductance") - a.of(device, "transconductance")
            return slopes - self._drain_conductance(device)
        return a.of(device, value)

    def _drain_conductance(self, device: Transistor) -> Any:
        scale = self._small if DRAIN_CONDUCTANCE in self._made else 1
        coupled = self._a.has(f"{device.name}.process.drain_coupling")
        modulated = self._a.has(f"{device.name}.process.length_modulation")
        return scale * self._a.of(device, "drain_conductance") if coupled or modulated else 0

    @cached_property
    def _sums(self) -> dict[tuple[str, str], list[Any]]:
        """Sum of all terms by row and column: static, dynamic."""
        import sympy

        sums: dict[tuple[str, str], list[Any]] = {}
        for term in self._circuit.terms:
            entry = sums.setdefault((term.row, term.column), [sympy.S.Zero, sympy.S.Zero])
            entry[term.dynamic] = entry[term.dynamic] + term.sign * self._element(term)
        return sums

    def _dynamic(self, row: str, column: str) -> Any:
        """Capacitance between two nodes; what hangs on one node is a level of its own."""
        found = self._sums.get((row, column), (0, 0))[1]
        if row != column or found == 0:
            return found
        return self._a.symbol("output_capacitance" if row == OUT else f"node_capacitance.{row}")

    def node_capacitance(self, node: str) -> Any:
        """All capacitance that hangs on a node."""
        return self._sums[node, node][1]

    @cached_property
    def _matrix(self) -> Any:
        import sympy

        return sympy.ImmutableMatrix(
            [
                [self._sums.get((r, c), (0, 0))[0] + self._s * self._dynamic(r, c) for c in self.nodes]
                for r in self.nodes
            ]
        )

    def _determinant(self, matrix: Any) -> Coefficients:
        small = self._small if DRAIN_CONDUCTANCE in self._made else None
        return list(_determinant(matrix, self._s, small))

    def _numerator(self, right: Mapping[str, Any]) -> Coefficients:
        import sympy

        column = sympy.Matrix([right.get(node, sympy.S.Zero) for node in self.nodes])
        return self._determinant(sympy.ImmutableMatrix(self._matrix[:, :-1]).row_join(column))

    @cached_property
    def exact_denominator(self) -> Coefficients:
        """Coefficients of det(G + sC), no pole neglected."""
        return self._determinant(self._matrix)

    @cached_property
    def denominator(self) -> Coefficients:
        """Coefficients of det(G + sC), lowest first."""
        import sympy

        found = self.exact_denominator
        if len(self.nodes) > 1 and {FASTER_POLES, INNER_CAPACITANCE} & self._made:
            found = found[:2]
        if len(self.nodes) > 1 and INNER_CAPACITANCE in self._made:
            output = self._a.symbol("output_capacitance")
            found = [found[0], sympy.expand(found[1]).coeff(output) * output]
        return found

    @property
    def _first_order(self) -> bool:
        return len(self.nodes) > 1 and bool({FASTER_POLES, INNER_CAPACITANCE} & self._made)

    @cached_property
    def transfer(self) -> Coefficients:
        """Coefficients of the numerator of H(s)."""
        right = {r: -self._sums[r, IN][0] - self._s * self._sums[r, IN][1] for r in self.nodes if (r, IN) in self._sums}
        found = self._numerator(right)
        return found[:1] if FEED_THROUGH in self._made else found

    @cached_property
    def impedance(self) -> Any:
        """Numerator of the output resistance."""
        return self._numerator({OUT: 1})[0]

    @cached_property
    def supply_path(self) -> Any:
        """Numerator of the transfer from the supply at zero frequency, the input held to ground."""
        right: dict[str, Any] = {}
        for (row, column), (static, _) in self._sums.items():
            if column in self._circuit.moving_with_supply:
                right[row] = right.get(row, 0) - static
        return self._numerator(right)[0] if right else 0

    def noise(self, owner: str) -> Coefficients:
        """Coefficients of the numerator of the transfer from a noise current: of a channel, or at the driven node."""
        device = next((d for d in self._circuit.devices if d.name == owner), None)
        if device is None:
            right = {self._circuit.terminal: 1}
        else:
            drain, source = (self._circuit.node(device, end) for end in ("drain", "source"))
            right = {drain: -1, source: 1} if drain != source else {}
        found = self._numerator(right)
        return found[:1] if self._first_order else found

    @cached_property
    def input_capacitance(self) -> Any:
        """Of the driven terminal: with Miller for a gate; the node's own, output held, for source and drain."""
        import sympy

        terminal = self._circuit.terminal
        total = self._sums[terminal, terminal][1]
        if self._circuit.stage.drive != "gate":
            return total
        others = [n for n in self.nodes if n != terminal]
        matrix = sympy.Matrix([[self._sums.get((r, c), (0, 0))[0] for c in others] for r in others])
        right = sympy.Matrix([-self._sums.get((r, terminal), (0, 0))[0] for r in others])
        static = matrix.det(method="berkowitz")
        gains = matrix.adjugate() * right
        for node, gain in zip(others, gains, strict=True):
            coupling = self._sums.get((terminal, node), (0, 0))[1]
            if coupling != 0:
                total = total + coupling * _ratio(self._tidy(gain), self._tidy(static))
        return total

    def _tidy(self, expression: Any) -> Any:
        """An expression without the mark of what is small."""
        import sympy

        return sympy.expand(expression).subs(self._small, 1)

    def level(self, key: str) -> Any:
        """A coefficient or a node's capacitance by its key. KeyError where there is none."""
        kind, *rest = key.split(".")
        if kind == "node_capacitance":
            return self.node_capacitance(rest[0])
        coefficients = {"denominator": lambda: self.denominator, "numerator": lambda: self.transfer}.get(
            rest[0], lambda: self.noise(rest[1])
        )()
        index = int(rest[-1])
        if index >= len(coefficients):
            raise KeyError(key)
        return coefficients[index]


@lru_cache(maxsize=4096)
def _determinant(matrix: Any, s: Any, small: Any) -> tuple[Any, ...]:
    """Coefficients of s in a determinant, in each only the leading power of what is small, if anything is."""
    import sympy

    powers = sympy.Poly(sympy.expand(matrix.det(method="berkowitz")), s).all_coeffs()[::-1]
    if small is not None:
        powers = [_leading(c, small) for c in powers]
    return tuple(sympy.factor_terms(c) for c in powers)


def _ratio(top: Any, bottom: Any) -> Any:
    import sympy

    return sympy.cancel(top / bottom)


def _leading(expression: Any, small: Any) -> Any:
    """The terms of an expression with the lowest power of what is small."""
    import sympy

    if not expression.has(small):
        return expression
    lowest = min(sympy.Poly(expression, small).monoms())[0]
    return sympy.expand(expression).coeff(small, lowest)


def squared_magnitude(coefficients: Sequence[Any], x: Any) -> Any:
    """abs(P(j omega))^2 for x = omega^2, as an expression in x."""
    import sympy

    s = sympy.Symbol("s")
    forward = sum(c * s**k for k, c in enumerate(coefficients))
    backward = sum(c * (-s) ** k for k, c in enumerate(coefficients))
    powers = sympy.Poly(forward * backward, s).all_coeffs()[::-1]
    return sum((c * (-x) ** (k // 2) for k, c in enumerate(powers) if k % 2 == 0), sympy.S.Zero)


@lru_cache(maxsize=16)
def noise_integral(order: int) -> tuple[tuple[Any, ...], tuple[Any, ...], Any]:
    """Integral of abs(c/d)^2 over all angular frequencies, over 2 pi, for polynomials in s with symbols.

    Args:
        order: Degree of d; c has a lower one.
    Returns: the symbols c_0..., d_0... and the expression in them, d having its roots in the left half-plane
    Source: c(s) c(-s) = d(s) q(-s) + d(-s) q(s), integral q_(n-1)/d_n (James, Nichols and Phillips 1947).
    """
    import sympy

    s = sympy.Symbol("s")
    c = sympy.symbols(f"c_:{order}")
    d = sympy.symbols(f"d_:{order + 1}")
    q = sympy.symbols(f"q_:{order}")
    top, bottom, part = (sum(x * s**k for k, x in enumerate(of)) for of in (c, d, q))
    mirrored = bottom.subs(s, -s) * part + bottom * part.subs(s, -s)
    equations = sympy.Poly(sympy.expand(top * top.subs(s, -s) - mirrored), s).all_coeffs()
    found = sympy.solve([e for e in equations if e != 0], q, dict=True)[0]
    return c, d, sympy.cancel(found[q[order - 1]] / d[order])
