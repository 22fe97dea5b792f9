"""A metric turned round: the formula of one unknown for a limit on the metric, found by sympy.

The metric's definition is opened level by level until the unknown stands in it. Where it is reached through one
level alone, the equation is solved for that level and goes on below it; where several lead to it they are opened,
and in a transistor whose inversion moves everything is written in its charge, in which the long channel is rational.
What is held on the way, and what is neglected, stands beside the formula.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import lru_cache
from typing import Any

from worksheet.engine.symbolic.algebra import Algebra, Setting, of
from worksheet.engine.symbolic.definition import Definition, Pick
from worksheet.engine.symbolic.neglects import NEGLECTS
from worksheet.solver import holds, solving
from worksheet.solver.holds import Hold
from worksheet.solver.solving import Solutions
from worksheet.stages.circuit import CAPACITANCES
from worksheet.stages.stage import MAIN

INVERSION = "main.inversion_coefficient"
GEOMETRY, KEEP_INVERSION = "geometry", "inversion"

_STEPS = 12
_BRANCHES = 4
_SMALL_ROOT = 12
LONGEST = 45
"""Operations beyond which a formula is none that a designer writes."""



@dataclass(frozen=True, eq=False)
class HandFormula:
    """The formula of an unknown for a limit on a metric.

    Attributes:
        metric, unknown: Their keys; `limit` is the sympy symbol that stands for the limit.
        branches: Every solution that may be physical, as sympy expressions in levels and in `shorthand`.
        shorthand: For each branch the symbol that it is written in and what that stands for, or None.
        neglects: Names of the neglects that made a difference.
        held: Names of what is held although it moves with the unknown.
        dropped: Solutions left out, with the reason.
        algebra: The levels that it is written in.
    """

    metric: str
    unknown: str
    limit: Any
    branches: tuple[Any, ...]
    shorthand: tuple[tuple[Any, Any] | None, ...]
    neglects: tuple[str, ...]
    held: tuple[str, ...]
    dropped: tuple[str, ...]
    algebra: Algebra

    @property
    def exact(self) -> bool:
        """Whether the whole metric was inverted."""
        return not self.neglects and not self.held

    def whole(self, branch: int = 0) -> Any:
        """A branch without its shorthand."""
        short = self.shorthand[branch]
        return self.branches[branch] if short is None else self.branches[branch].xreplace({short[0]: short[1]})


@dataclass(frozen=True, eq=False)
class _Branch:
    """A formula under way: the unknown's expression, its shorthand, and what was held."""

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

    def of(self, found: Definition, limit: Any) -> list[_Branch]:
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
        branches: list[_Branch] = []
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

    def _go(self, expression: Any, value: Any, steps: int) -> list[_Branch]:
        """Solve expression = value for the unknown."""
        import sympy

        moving = self._moving(expression)
        if not moving or steps == 0 or sympy.count_ops(expression) > solving.LARGEST:
            return []
        if moving == [self._unknown]:
            solved = self._solve(expression, value, self._a.symbol(self._unknown))
            direct = [_Branch(v, None) for v in solved]
            by_charge = self._by_charge(MAIN, expression, value) if self._unknown == INVERSION else []
            return min((way for way in (direct, by_charge) if way), key=_length, default=[])
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

    def _below(self, key: str, expression: Any, value: Any, steps: int) -> list[_Branch]:
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

    def _by_charge(self, device: str, expression: Any, value: Any) -> list[_Branch]:
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
        return [_Branch(by_inversion.xreplace({inversion: squares.xreplace({q: self._short})}), (self._short, s)) for s in solved]

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
            expression = expression.xreplace({self._a.symbol(k): d.expression for k, d in parts.items() if d is not None})
        solved = solving.solve(expression, inversion, self._a.symbol(self._unknown)).values
        return solved[0] if len(solved) == 1 else None

    def _solve(self, expression: Any, value: Any, symbol: Any) -> tuple[Any, ...]:
        found: Solutions = solving.solve(expression, value, symbol)
        self.dropped += [d for d in found.dropped if d not in self.dropped]
        return found.values[:_BRANCHES]


def _length(branches: list[_Branch]) -> int:
    return max(branch.operations for branch in branches)


def _in_charge(expression: Any, inversion: Any, squares: Any) -> Any:
    """An expression with the inversion coefficient written in the charge, in which its roots are whole."""
    import sympy

    half = sympy.Rational(1, 2)
    roots = {p for p in expression.atoms(sympy.Pow) if abs(p.exp) == half and p.base.has(inversion)}
    small = {p for p in roots if sympy.count_ops(p.base) <= _SMALL_ROOT}
    written = {p: sympy.sqrt(sympy.factor(p.base.xreplace({inversion: squares}))) ** (2 * p.exp) for p in small}
    return expression.xreplace(written).xreplace({inversion: squares})


_KNOWN: dict[tuple[Any, ...], HandFormula | None] = {}
_MOST_KNOWN = 2000


def hand_formula(
    setting: Setting,
    metric: str,
    unknown: str,
    keep: str = GEOMETRY,
    neglects: frozenset[str] | None = None,
    moving_parasitics: bool = False,
) -> HandFormula | None:
    """The formula that a designer writes for an unknown.

    Args:
        setting: What it is written for; its neglects are not used.
        metric: Key of the metric that is bounded.
        unknown: Key of the unknown: a design variable, "inversion_coefficient", or an assumption.
        keep: For the bias current: "geometry", or "inversion" where the width goes with it.
        neglects: What is small enough to be neglected; everything where None. frozenset() asks for the exact form.
        moving_parasitics: With the inversion kept: whether the node's parasitics go with the width.
    Returns: HandFormula, None where the metric does not depend on the unknown or has no short formula
    """
    known = (setting, metric, unknown, keep, neglects, moving_parasitics)
    if known not in _KNOWN:
        if len(_KNOWN) > _MOST_KNOWN:
            _KNOWN.clear()
        _KNOWN[known] = _found(setting, metric, unknown, keep, neglects, moving_parasitics)
    return _KNOWN[known]


def _found(
    setting: Setting, metric: str, unknown: str, keep: str, neglects: frozenset[str] | None, moving: bool
) -> HandFormula | None:
    setting = _with_unknown(setting, unknown)
    if not algebra_for(setting, unknown, keep, moving).depends(metric, _key(unknown)):
        return None
    exact = _attempt(setting, metric, unknown, keep, frozenset(), (), moving)
    if exact is not None or neglects == frozenset():
        return exact
    names = frozenset(n.name for n in NEGLECTS) if neglects is None else neglects
    for made in _restored(frozenset(relevant(setting, metric, names))):
        for held in holds.ladder(setting.circuit):
            found = _attempt(setting, metric, unknown, keep, made, held, moving)
            if found is not None:
                return found
    return None


def _key(unknown: str) -> str:
    """The level that an unknown is."""
    return INVERSION if unknown == "inversion_coefficient" else unknown


def _with_unknown(setting: Setting, unknown: str) -> Setting:
    circuit = setting.circuit
    if unknown == "drive_resistance":
        circuit = replace(circuit, driven_through_resistance=True)
    return replace(setting, circuit=circuit, absent=setting.absent - {unknown})


def _restored(every: frozenset[str]) -> list[frozenset[str]]:
    """Sets of neglects: all, then with one taken back, then with more and more."""
    ordered = [n.name for n in NEGLECTS if n.name in every]
    single = [every - {name} for name in ordered]
    growing = [every - set(ordered[: k + 1]) for k in range(1, len(ordered))]
    return list(dict.fromkeys([every, *single, *growing]))


def _attempt(
    setting: Setting, metric: str, unknown: str, keep: str, made: frozenset[str], held: tuple[Hold, ...], moving: bool
) -> HandFormula | None:
    import sympy

    a = algebra_for(setting.neglecting(made), unknown, keep, moving)
    found = a.definition(metric)
    if found is None or not a.depends(metric, _key(unknown), frozenset(k for h in held for k in h.keys)):
        return None
    limit = sympy.Symbol(metric, **({"positive": True} if a.word(metric).positive else {"real": True}))
    derivation = Derivation(a, _key(unknown), held)
    branches = [b for b in derivation.of(found, limit) if b.operations <= LONGEST]
    if not branches:
        return None
    kept = [hold for hold in held if hold.keys & derivation.met]
    return HandFormula(
        metric,
        unknown,
        limit,
        tuple(b.expression for b in branches),
        tuple(b.shorthand for b in branches),
        _reported(setting, metric, made),
        tuple(hold.moving_with(unknown) for hold in kept),
        tuple(derivation.dropped),
        a,
    )


_ALGEBRAS: dict[tuple[Any, ...], Algebra] = {}


def algebra_for(setting: Setting, unknown: str, keep: str, moving_parasitics: bool) -> Algebra:
    """The algebra in which an unknown is sought: what follows it is defined by it."""
    if keep != KEEP_INVERSION and unknown != "inversion_coefficient":
        return of(setting)
    known = (setting, moving_parasitics)
    if known not in _ALGEBRAS:
        if len(_ALGEBRAS) > _MOST_KNOWN:
            _ALGEBRAS.clear()
        _ALGEBRAS[known] = Algebra(setting, _kept_inversion(moving_parasitics))
    return _ALGEBRAS[known]


def _kept_inversion(moving_parasitics: bool) -> Any:
    """Definitions where the inversion is stated: the width follows current and inversion."""

    def stated(a: Algebra) -> Mapping[str, Any]:
        main = a.circuit.stage.transistors[0]
        inversion, width = a.of(main, "inversion_coefficient"), a.symbol("width")
        by_inversion = a.symbol("current") * a.symbol("length") / (a.of(main, "square_current") * inversion)
        definitions = {INVERSION: None, "width": by_inversion}
        if moving_parasitics:
            node = a.network.node_capacitance("out")
            own = [a.of(main, name) for name, _, _ in CAPACITANCES if node.has(a.of(main, name))]
            rest = node.xreplace({symbol: 0 for symbol in own})
            definitions[f"{MAIN}.width_capacitance"] = None
            definitions["output_capacitance"] = rest + a.of(main, "width_capacitance") * width
        return definitions

    return stated


def _reported(setting: Setting, metric: str, made: frozenset[str]) -> tuple[str, ...]:
    """Those of the neglects made without which the metric's definition would be another one."""
    whole = of(setting.neglecting(made)).signature(metric)
    return tuple(
        n.name
        for n in NEGLECTS
        if n.name in made and of(setting.neglecting(made - {n.name})).signature(metric) != whole
    )


def relevant(setting: Setting, metric: str, names: frozenset[str]) -> tuple[str, ...]:
    """Those of some neglects that change a metric's definition at all, in the order of NEGLECTS."""
    reached = of(setting.neglecting(frozenset())).reached(metric)
    nodes = len(setting.circuit.unknown)
    possible = [
        n.name
        for n in NEGLECTS
        if n.name in names and nodes >= n.nodes and (not n.of or any(key.endswith(n.of) for key in reached))
    ]
    return tuple(name for name in possible if _changes(setting, metric, name))


@lru_cache(maxsize=2000)
def _changes(setting: Setting, metric: str, name: str) -> bool:
    exact, without = of(setting.neglecting(frozenset())), of(setting.neglecting(frozenset({name})))
    return exact.signature(metric) != without.signature(metric)
