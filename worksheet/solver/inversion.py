"""A metric turned round: the formula of one unknown for a limit on the metric, found by sympy.

The whole metric is tried first; where that gives no short formula, neglects are made and levels held, from little to
much, and those that make a difference stand beside the formula. Formulas are kept in memory.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import lru_cache
from typing import Any

from worksheet.engine.symbolic.algebra import Algebra, Setting, of
from worksheet.engine.symbolic.neglects import NEGLECTS
from worksheet.engine.symbolic.vocabulary import PER_WIDTH
from worksheet.solver import holds
from worksheet.solver.holds import Hold
from worksheet.solver.inversion_steps import INVERSION, Derivation
from worksheet.stages.circuit import CAPACITANCES
from worksheet.stages.stage import OUT, Transistor

GEOMETRY, KEEP_INVERSION = "geometry", "inversion"

_MOST_TRIED = 14
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
        held: What is held although it moves with the unknown.
        dropped: Solutions left out, with the reason.
        algebra: The levels that it is written in.
    """

    metric: str
    unknown: str
    limit: Any
    branches: tuple[Any, ...]
    shorthand: tuple[tuple[Any, Any] | None, ...]
    neglects: tuple[str, ...]
    held: tuple[Hold, ...]
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
        moving_parasitics: Whether a device's capacitances go with its width, where that is the unknown or follows it.
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
    tried = 0
    for made in _restored(frozenset(relevant(setting, metric, names))):
        a = algebra_for(setting.neglecting(made), unknown, keep, moving)
        for held in holds.ladder(setting.circuit):
            if not a.depends(metric, _key(unknown), frozenset(k for h in held for k in h.keys)):
                continue
            found = _attempt(setting, metric, unknown, keep, made, held, moving)
            tried += 1
            if found is not None or tried == _MOST_TRIED:
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
    if found is None:
        return None
    limit = sympy.Symbol(metric, **({"positive": True} if a.word(metric).positive else {"real": True}))
    derivation = Derivation(a, _key(unknown), held)
    branches = [b for b in derivation.of(found, limit) if b.operations <= LONGEST]
    if not branches:
        return None
    kept = [hold for hold in held if hold.keys & derivation.met]
    if moving and keep != KEEP_INVERSION:
        kept += [
            h for h in holds.inversions(a.circuit) if h not in kept and f"{h.device}.width_capacitance" in a.stated
        ]
    return HandFormula(
        metric,
        unknown,
        limit,
        tuple(b.expression for b in branches),
        tuple(b.shorthand for b in branches),
        _reported(setting, metric, made),
        tuple(kept),
        tuple(derivation.dropped),
        a,
    )


_ALGEBRAS: dict[tuple[Any, ...], Algebra] = {}


def algebra_for(setting: Setting, unknown: str, keep: str, moving_parasitics: bool) -> Algebra:
    """The algebra in which an unknown is sought: what follows it is defined by it."""
    inverted = keep == KEEP_INVERSION or unknown == "inversion_coefficient"
    wide = next((d for d in setting.circuit.devices if d.key("width") == unknown), None)
    if inverted:
        wide = setting.circuit.stage.transistors[0]
    if not inverted and not (moving_parasitics and wide is not None):
        return of(setting)
    known = (setting, inverted, wide if moving_parasitics else None)
    if known not in _ALGEBRAS:
        if len(_ALGEBRAS) > _MOST_KNOWN:
            _ALGEBRAS.clear()
        _ALGEBRAS[known] = Algebra(setting, _followed(*known[1:]))
    return _ALGEBRAS[known]


def _followed(inverted: bool, wide: Transistor | None) -> Any:
    """Definitions of what follows: the width a stated inversion and current, a device's capacitances its width."""

    def stated(a: Algebra) -> Mapping[str, Any]:
        definitions: dict[str, Any] = {}
        if inverted:
            main = a.circuit.stage.transistors[0]
            square = a.of(main, "square_current") * a.of(main, "inversion_coefficient")
            definitions = {INVERSION: None, "width": a.symbol("current") * a.symbol("length") / square}
        if wide is not None:
            node, width = a.network.node_capacitance(OUT), a.of(wide, "width")
            own = [a.of(wide, name) for name, _, _ in CAPACITANCES]
            rest = node.xreplace(dict.fromkeys(own, 0))
            definitions[f"{wide.name}.width_capacitance"] = None
            if rest != node:
                definitions["output_capacitance"] = rest + a.of(wide, "width_capacitance") * width
            for name, _, _ in CAPACITANCES:
                per_width = f"{wide.name}.{name}{PER_WIDTH}"
                definitions[per_width] = None
                definitions[f"{wide.name}.{name}"] = a.symbol(per_width) * width
        return definitions

    return stated


def _reported(setting: Setting, metric: str, made: frozenset[str]) -> tuple[str, ...]:
    """The fewest of the neglects made that make the metric's definition what it is.

    One may say what another says already (without inner capacitances there are no further poles either), so each that
    changes nothing is taken back before the next is looked at. With all that are left taken back it is the exact one.
    """
    whole, left = of(setting.neglecting(made)).signature(metric), made
    for neglect in NEGLECTS:
        fewer = left - {neglect.name}
        if fewer != left and of(setting.neglecting(fewer)).signature(metric) == whole:
            left = fewer
    return tuple(n.name for n in NEGLECTS if n.name in left)


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
