"""The formula beside a bound: what a designer would write for it, its value at the present point, what it neglects.

What is small at the present point is neglected, what is not stays where a short formula is left. A formula of the
whole metric counts as exact only if its value, put back into the numeric metric, meets the limit.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from worksheet.engine.symbolic.algebra import Setting, of
from worksheet.engine.symbolic.neglects import LINEAR, NEGLECTS, SLEWING
from worksheet.engine.symbolic.point import Point
from worksheet.model import metrics
from worksheet.solver.inversion import GEOMETRY, KEEP_INVERSION, HandFormula, hand_formula, relevant
from worksheet.solver.stated import Case, Stated, at
from worksheet.stages.circuit import CAPACITANCES
from worksheet.stages.stage import MAIN

SMALL = 0.3
"""Share of the metric up to which a neglect is made without being asked for."""

_JUST_MET = 1e-7
_NOTHING = 1e-12


@dataclass(frozen=True, slots=True)
class Effect:
    """One neglect at the present point: by what share of its value the metric changes when it alone is made.

    `share` is None where the metric has no value without what is neglected.
    """

    name: str
    share: float | None


@dataclass(frozen=True)
class HandBound:
    """The algebra of one bound.

    Attributes:
        formula: In the trade's symbols; the limit stands by the metric's key, the supply by "supply".
        where: What its shorthand stands for, "y = ..."; empty where there is none.
        value: Its value at the present point. [unit of the unknown]
        neglects: What it leaves out or holds, by name.
        exact: Whether it inverts the whole metric, so that `value` is the bound.
        dropped: Solutions that are not physical, with the reason.
        effects: What each neglect does to the metric at the present point.
    """

    formula: str
    where: tuple[str, ...]
    value: float
    neglects: tuple[str, ...]
    exact: bool
    dropped: tuple[str, ...]
    effects: tuple[Effect, ...]


class Present:
    """One case at one condition: its point of the exact algebra, and what every neglect does there."""

    def __init__(self, case: Case, index: int) -> None:
        """Take the case and the condition's index."""
        self.case, self.index = case, index
        self.stated = Stated(case, index)
        self.setting: Setting = self.stated.setting(keep_stated=False)

    @cached_property
    def point(self) -> Point:
        """The exact algebra with this condition's numbers."""
        return self._point(self.setting)

    @cached_property
    def _nominal(self) -> Point | None:
        return None if self.index == 0 else Present(self.case, 0).point

    def _point(self, setting: Setting) -> Point:
        return Point(of(setting), self.stated.number, self._nominal)

    def effects(self, metric: str) -> tuple[Effect, ...]:
        """What each neglect that changes a metric at all does to its value."""
        exact = self.point.number(metric)
        if exact is None or exact == 0:
            return ()
        found = []
        for name in relevant(self.setting, metric, frozenset(n.name for n in NEGLECTS)):
            value = self._point(self.setting.neglecting(frozenset({name}))).number(metric)
            share = None if value is None else (value - exact) / abs(exact)
            if share is None or abs(share) > _NOTHING:
                found.append(Effect(name, share))
        return tuple(found)

    def neglecting(self, metric: str, names: frozenset[str]) -> float | None:
        """A metric's value when several neglects are made at once. [unit of the metric]"""
        return self._point(self.setting.neglecting(names)).number(metric)


def small(effects: tuple[Effect, ...]) -> frozenset[str]:
    """Neglects that may be made: those with a small effect, and of slewing and settling the one that says less."""
    shares = {e.name: abs(e.share) for e in effects if e.share is not None}
    chosen = {name for name, share in shares.items() if share < SMALL}
    if SLEWING in shares and LINEAR in shares:
        chosen -= {SLEWING, LINEAR}
        chosen.add(min((SLEWING, LINEAR), key=lambda name: shares[name]))
    return frozenset(chosen)


def hand_bound(
    case: Case, target_metric: str, side: str, limit: float, unknown: str, condition_index: int = 0
) -> HandBound | None:
    """The algebra of a bound.

    Args:
        case: The sheet at its present point.
        target_metric: The target's name; a metric's key.
        side: "low" where the target needs more of the unknown, "high" where less; both have one formula.
        limit: The limit that is just met. [unit of the metric]
        unknown: The variable that is bounded: a design variable, "inversion_coefficient" or an assumption.
        condition_index: The condition in which it binds, 0 being the nominal one.
    Returns: HandBound; None where there is no short formula, or none with a value at this point
    """
    assert side in ("low", "high")
    target = case.sheet.targets.get(target_metric)
    if metrics.find(target_metric) is None or (target is not None and target.formula is not None):
        return None
    keep = case.sheet.solve.keep if unknown == "bias_current" else GEOMETRY
    present = Present(_at_kept_inversion(case) if keep == KEEP_INVERSION else case, condition_index)
    numbers = {target_metric: limit}
    if target is not None and target.yield_fraction is not None:
        numbers["deviations"] = metrics.deviations(target.yield_fraction)
    effects = present.effects(target_metric)
    made = small(effects)
    every = frozenset(n.name for n in NEGLECTS)
    tries: list[tuple[frozenset[str] | None, bool]] = [(made, False), (made | {e.name for e in effects}, False), (every, False)]
    if keep == KEEP_INVERSION:
        tries = [(made, True), *tries]
    for neglects, moving in dict.fromkeys(tries):
        found = _Bound(present, target_metric, unknown, keep, neglects, moving, numbers).found(effects, limit)
        if found is not None:
            return found
    return None


def _at_kept_inversion(case: Case) -> Case:
    """The case with the width that its present current has at the inversion coefficient that is kept."""
    inversion = case.sheet.solve.inversion_coefficient
    if inversion is None:
        return case
    main = case.stage.transistors[0]
    square = at(case.inputs.devices[main.name].specific_current, 0)
    width = at(case.value("bias_current"), 0) * at(case.value("length"), 0) / (square * inversion)
    moved: Case = case.moved({"width": width})
    return moved


class _Bound:
    """One formula evaluated at the present point."""

    def __init__(
        self,
        present: Present,
        metric: str,
        unknown: str,
        keep: str,
        made: frozenset[str] | None,
        moving: bool,
        numbers: Mapping[str, float],
    ) -> None:
        self._present, self._metric, self._unknown, self._keep = present, metric, unknown, keep
        self._numbers = numbers
        self._formula = hand_formula(present.setting, metric, unknown, keep, made, moving)

    def found(self, effects: tuple[Effect, ...], limit: float) -> HandBound | None:
        formula = self._formula
        if formula is None:
            return None
        values = [self._value(formula, branch) for branch in range(len(formula.branches))]
        real = [(k, v) for k, v in enumerate(values) if v is not None and v > 0]
        if not real:
            return None
        exact = [(k, v) for k, v in real if formula.exact and self._meets(v, limit)]
        if formula.exact and not exact:
            return self._moved_besides(formula, *real[0], effects)
        branch, value = (exact or real)[0]
        dropped = [*formula.dropped]
        dropped += [f"another solution is not physical: {v:.4g}" if v is not None else "another solution is not real"
                    for k, v in enumerate(values) if k not in dict(real)]  # fmt: skip
        return self._written(formula, branch, value, (*formula.neglects, *formula.held), bool(exact), dropped, effects)

    def _moved_besides(
        self, formula: HandFormula, branch: int, value: float, effects: tuple[Effect, ...]
    ) -> HandBound | None:
        """An inverted metric whose value does not meet the limit: something else follows the unknown on this sheet."""
        follows = "what follows the unknown through formulas and held levels"
        return self._written(formula, branch, value, (follows,), False, list(formula.dropped), effects)

    def _written(
        self,
        formula: HandFormula,
        branch: int,
        value: float,
        neglects: tuple[str, ...],
        exact: bool,
        dropped: list[str],
        effects: tuple[Effect, ...],
    ) -> HandBound:
        short = formula.shorthand[branch]
        where = () if short is None else (f"{short[0]} = {_text(short[1], formula)}",)
        shown = tuple(e for e in effects if e.name in neglects)
        return HandBound(
            _text(formula.branches[branch], formula), where, value, neglects, exact, tuple(dict.fromkeys(dropped)), shown
        )

    def _value(self, formula: HandFormula, branch: int) -> float | None:
        whole = formula.whole(branch)
        numbers = {}
        for symbol in whole.free_symbols:
            number = self._numbers[self._metric] if symbol == formula.limit else self._number(formula, symbol)
            if number is None:
                return None
            numbers[symbol] = number
        return _evaluated(whole, numbers)

    def _number(self, formula: HandFormula, symbol: Any) -> float | None:
        key = formula.algebra.key(symbol)
        assert key is not None  # every symbol of a formula but its limit is a level
        if key in self._numbers:
            return self._numbers[key]
        if key == f"{MAIN}.width_capacitance":
            return self._width_capacitance()
        return self._present.point.number(key)

    def _width_capacitance(self) -> float:
        """Capacitance of the output node per metre of the main device's width. [F/m]"""
        point = self._present.point
        main = point.algebra.circuit.stage.transistors[0]
        node = point.algebra.network.node_capacitance("out")
        own = [point.algebra.of(main, name) for name, _, _ in CAPACITANCES if node.has(point.algebra.of(main, name))]
        total = point.value(sum(own)) if own else 0.0
        width = point.number("width")
        assert total is not None
        assert width
        return total / width

    def _meets(self, value: float, limit: float) -> bool:
        """Whether a value of the unknown, put into the numeric metric, meets the limit."""
        moves = self._moves(value)
        case = self._present.case.moved({name: np.asarray([v]) for name, v in moves.items()})
        base = metrics.find(self._metric)
        assert base is not None
        scale = self._numbers.get("deviations", 1.0) if base.of_yield else 1.0
        with np.errstate(all="ignore"):
            measured = case.solution.measure(base.of_yield if base.of_yield and "deviations" in self._numbers else base.key)
        found = at(np.broadcast_to(measured.values, np.broadcast_shapes(measured.values.shape, (1,))), self._present.index)
        return bool(abs(found * scale - limit) <= _JUST_MET * max(abs(limit), _NOTHING))

    def _moves(self, value: float) -> dict[str, float]:
        if self._unknown == "inversion_coefficient":
            case = self._present.case
            square = at(case.inputs.devices[MAIN].specific_current, self._present.index)
            current, length = at(case.inputs.current, self._present.index), at(case.value("length"), 0)
            return {"width": current * length / (square * value)}
        moves = {self._unknown: value}
        if self._keep == KEEP_INVERSION:
            case = self._present.case
            moves["width"] = at(case.value("width"), 0) * value / at(case.value("bias_current"), 0)
        return moves


def _evaluated(expression: Any, numbers: Mapping[Any, float]) -> float | None:
    import sympy

    from worksheet.engine.symbolic.point import evaluated, real

    return real(evaluated(expression, None, {s: sympy.Float(v, 25) for s, v in numbers.items()}))


def _text(expression: Any, formula: HandFormula) -> str:
    """A formula as text, the supply by its key."""
    import sympy

    supply = sympy.Symbol("supply", positive=True)
    named = {s: supply for s in expression.free_symbols if formula.algebra.key(s) == "supply"}
    return str(sympy.sstr(expression.xreplace(named), order="rev-lex"))



