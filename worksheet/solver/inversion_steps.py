"""One way through a metric's definition to the unknown, equation by equation.

The definition is opened level by level until the unknown stands in it. Where it is reached through one level alone,
the equation is solved for that level and goes on below it; where several lead to it they are opened. In a transistor
whose inversion moves everything is written in its charge, in which the long channel is rational.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from worksheet.engine.symbolic.algebra import Algebra
from worksheet.engine.symbolic.definition import Definition, Pick
from worksheet.solver import solving
from worksheet.solver.holds import Hold
from worksheet.solver.solving import Solutions
from worksheet.stages.stage import MAIN

INVERSION = "main.inversion_coefficient"

_STEPS = 12
_BRANCHES = 4
_SMALL_ROOT = 12


@dataclass(frozen=True, eq=False)
class Branch:
    """A formula: the unknown's expression, and its shorthand where it has one (the symbol, what that stands for)."""

    expression: Any
    shorthand: tuple[Any, Any] | None

    @property
    def operations(self) -> int:
        """How long it is."""
        import sympy

        short = 0 if self.shorthand is None else sympy.count_ops(self.shorthand[1])
        return int(sympy.count_ops(self.expression) + short)


class Derivation:
    """One attempt to invert a metric, with given neglects and holds."""

    def __init__(self, a: Algebra, unknown: str, held: tuple[Hold, ...]) -> None:
        """Take the algebra and what is held.

        Args:
            a: The algebra, its neglects made.
            unknown: Key of the level that is sought.
            held: What stays although it moves with the unknown.
        """
        import sympy

        self._a = a
        self._unknown = unknown
        self._held = frozenset(key for hold in held for key in hold.keys)
        self._short = sympy.Symbol("y", positive=True)
        self.dropped: list[str] = []
        self.met: set[str] = set()

    def of(self, found: Definition, limit: Any) -> list[Branch]:
        """All ways in which a metric's definition gives the unknown for a limit."""
        if found.expression is None:
            return []
        if found.root is None:
            return self._go(found.expression, limit, _STEPS)
        if found.root.pick not in (Pick.LOWEST_POSITIVE, Pick.SLOWEST):
            return []
        at = solving.solve(found.expression, limit, found.root.unknown).values
        if found.root.pick is Pick.SLOWEST:
            at = tuple(-abs(x) for x in at[:1])
        branches: list[Branch] = []
        for place in at:
            equation = (found.root.left - found.root.right).xreplace({found.root.unknown: place})
            branches += self._go(equation, 0, _STEPS)
        return branches

    def _moving(self, expression: Any) -> list[str]:
        """Levels in an expression that move with the unknown; what is held is noted."""
        moving = []
        for symbol in sorted(expression.free_symbols, key=lambda s: s.name):
            key = self._a.key(symbol)
            if key is None or not self._a.depends(key, self._unknown):
                continue
            self.met |= self._a.touched(key, self._unknown, self._held)
            if self._a.depends(key, self._unknown, self._held):
                moving.append(key)
        return moving

    def _go(self, expression: Any, value: Any, steps: int) -> list[Branch]:
        """Solve expression = value for the unknown."""
        import sympy

        moving = self._moving(expression)
        if not moving or steps == 0 or sympy.count_ops(expression) > solving.LARGEST:
            return []
        if moving == [self._unknown]:
            solved = self._solve(expression, value, self._a.symbol(self._unknown))
            direct = [Branch(v, None) for v in solved]
            by_charge = self._by_charge(MAIN, expression, value) if self._unknown == INVERSION else []
            return min((way for way in (direct, by_charge) if way), key=_length_of, default=[])
        if len(moving) == 1:
            return self._below(moving[0], expression, value, steps)
        inner = {key: self._a.definition(key) for key in moving if key != self._unknown}
        charges = {key for key in inner if key.endswith((".charge", ".inversion_coefficient"))}
        opened = {k: d for k, d in inner.items() if k not in charges}
        if any(d is None or d.root is not None or d.expression is None for d in opened.values()):
            return []
        if opened:
            written = {self._a.symbol(k): d.expression for k, d in opened.items() if d is not None}
            return self._go(expression.xreplace(written), value, steps - 1)
        owners = {key.partition(".")[0] for key in charges}
        return self._by_charge(owners.pop(), expression, value) if len(owners) == 1 else []

    def _below(self, key: str, expression: Any, value: Any, steps: int) -> list[Branch]:
        """Solve for the one level that leads to the unknown, and go on with its definition."""
        if key.endswith(".charge"):
            return self._by_charge(key.partition(".")[0], expression, value)
        found = self._a.definition(key)
        if key.endswith(".inversion_coefficient") and expression != self._a.symbol(key):
            branches = self._by_charge(key.partition(".")[0], expression, value)
            if branches:
                return branches
        if found is None or found.expression is None or found.root is not None:
            return []
        if self._a.alias(key) == self._unknown or found.expression.is_Symbol:
            return self._go(expression.xreplace({self._a.symbol(key): found.expression}), value, steps - 1)
        branches = []
        for inner in self._solve(expression, value, self._a.symbol(key)):
            branches += self._go(found.expression, inner, steps - 1)
        if branches:
            return branches
        return self._go(expression.xreplace({self._a.symbol(key): found.expression}), value, steps - 1)

    def _by_charge(self, device: str, expression: Any, value: Any) -> list[Branch]:
        """Write everything in a device's charge, solve for it, and give the unknown by it."""
        q, inversion = (self._a.symbol(f"{device}.{name}") for name in ("charge", "inversion_coefficient"))
        law = self._a.definition(f"{device}.charge")
        assert law is not None
        if len(self._moving(law.expression)) > 1:
            return []  # velocity saturation moves with the length
        of_charge = solving.solve(law.expression, q, inversion).values
        by_inversion = self._unknown_by(device)
        if len(of_charge) != 1 or by_inversion is None:
            return []
        squares = of_charge[0].expand()
        sought = by_inversion.xreplace({inversion: squares})
        unknown = self._a.symbol(self._unknown)
        written = _in_charge(expression, inversion, squares).xreplace({unknown: sought})
        solved = self._solve(written, value, q)
        return [
            Branch(by_inversion.xreplace({inversion: squares.xreplace({q: self._short})}), (self._short, s))
            for s in solved
        ]

    def _unknown_by(self, device: str) -> Any:
        """The unknown as an expression in a device's inversion coefficient; None where there is no short one."""
        inversion = self._a.symbol(f"{device}.inversion_coefficient")
        found = self._a.definition(f"{device}.inversion_coefficient")
        if found is None:
            return inversion if self._unknown == f"{device}.inversion_coefficient" else None
        expression = found.expression
        for _ in range(_STEPS):
            moving = [k for k in self._moving(expression) if k != self._unknown]
            if not moving:
                break
            parts = {key: self._a.definition(key) for key in moving}
            expression = expression.xreplace(
                {self._a.symbol(k): d.expression for k, d in parts.items() if d is not None}
            )
        solved = solving.solve(expression, inversion, self._a.symbol(self._unknown)).values
        return solved[0] if len(solved) == 1 else None

    def _solve(self, expression: Any, value: Any, symbol: Any) -> tuple[Any, ...]:
        found: Solutions = solving.solve(expression, value, symbol)
        self.dropped += [d for d in found.dropped if d not in self.dropped]
        return found.values[:_BRANCHES]


def _length_of(branches: list[Branch]) -> int:
    return max(branch.operations for branch in branches)


def _in_charge(expression: Any, inversion: Any, squares: Any) -> Any:
    """An expression with the inversion coefficient written in the charge, in which its roots are whole."""
    import sympy

    half = sympy.Rational(1, 2)
    roots = {p for p in expression.atoms(sympy.Pow) if abs(p.exp) == half and p.base.has(inversion)}
    small = {p for p in roots if sympy.count_ops(p.base) <= _SMALL_ROOT}
    written = {p: sympy.sqrt(sympy.factor(p.base.xreplace({inversion: squares}))) ** (2 * p.exp) for p in small}
    return expression.xreplace(written).xreplace({inversion: squares})
