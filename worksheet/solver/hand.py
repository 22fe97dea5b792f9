"""The formula beside a bound: what a designer would write for it, its value at the present point, what it neglects.

What is small at the present point is neglected, what is not stays where a short formula is left. A formula of the
whole metric counts as exact only if its value, put back into the numeric metric, meets the limit; a formula that runs
the other way than the bound is none for it.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from worksheet.engine.symbolic.neglects import NEGLECTS
from worksheet.engine.symbolic.point import evaluated_float
from worksheet.engine.symbolic.vocabulary import PER_WIDTH
from worksheet.model import metrics
from worksheet.model.sheet import Target
from worksheet.solver.algebra_print import as_line
from worksheet.solver.inversion import GEOMETRY, KEEP_INVERSION, HandFormula, hand_formula
from worksheet.solver.present import Effect, Present, small
from worksheet.solver.stated import Case, at
from worksheet.stages.circuit import CAPACITANCES
from worksheet.stages.stage import MAIN, OUT

FOLLOWS = "what follows the unknown through formulas and held levels"

_JUST_MET = 1e-7
_NOTHING = 1e-12
_STEP = 1e-6


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


def hand_bound(
    case: Case, target_metric: str, side: str, limit: float, unknown: str, condition_index: int = 0
) -> HandBound | None:
    """The algebra of a bound.

    Args:
        case: The sheet at its present point.
        target_metric: The target's name; a metric's key.
        side: "low" where the target needs more of the unknown, "high" where less.
        limit: The limit that is just met. [unit of the metric]
        unknown: The variable that is bounded: a design variable, "inversion_coefficient" or an assumption.
        condition_index: The condition in which it binds, 0 being the nominal one.
    Returns: HandBound; None where there is no short formula, or none with a value at this point
    """
    target = case.sheet.targets.get(target_metric)
    if metrics.find(target_metric) is None or (target is not None and target.formula is not None):
        return None
    keep = case.sheet.solve.keep if unknown == "bias_current" else GEOMETRY
    present = Present(_at_kept_inversion(case) if keep == KEEP_INVERSION else case, condition_index)
    sought = _Sought(present, target_metric, unknown, keep, limit, side, target)
    effects = present.effects(target_metric)
    made = small(effects)
    tries = [(made, False), (made | {e.name for e in effects}, False), (frozenset(n.name for n in NEGLECTS), False)]
    if keep == KEEP_INVERSION:
        tries = [(made, True), *tries]
    elif unknown.endswith("width"):
        tries += [(made, True), (made | {e.name for e in effects}, True)]
    for neglects, moving in dict.fromkeys(tries):
        formula = hand_formula(present.setting, target_metric, unknown, keep, neglects, moving)
        found = None if formula is None else sought.bound(formula, effects)
        if found is not None:
            return found
    return None


def _at_kept_inversion(case: Case) -> Case:
    """The case with the width that its present current has at the inversion coefficient that is kept."""
    inversion = case.sheet.solve.inversion_coefficient
    if inversion is None:
        return case
    square = at(case.inputs.devices[MAIN].specific_current, 0)
    width = at(case.value("bias_current"), 0) * at(case.value("length"), 0) / (square * inversion)
    moved: Case = case.moved({"width": width})
    return moved


@dataclass(frozen=True, eq=False)
class _Sought:
    """What is sought: the unknown that makes a metric meet a limit at the present point."""

    present: Present
    metric: str
    unknown: str
    keep: str
    limit: float
    side: str
    target: Target | None

    def bound(self, formula: HandFormula, effects: tuple[Effect, ...]) -> HandBound | None:
        """The first branch of a formula that has a physical value and runs as the bound does."""
        values = [self._value(formula, branch, self.limit) for branch in range(len(formula.branches))]
        real = [k for k, v in enumerate(values) if v is not None and v > 0 and self._runs(formula, k, v)]
        exact = [k for k in real if formula.exact and self._meets(values[k])]
        if not real:
            return None
        chosen = (exact or real)[0]
        value, short = values[chosen], formula.shorthand[chosen]
        assert value is not None
        held = tuple(self.present.held_effect(self.metric, h, self.unknown, self._follow()) for h in formula.held)
        neglects = (*formula.neglects, *(e.name for e in held))
        if formula.exact and not exact:
            neglects = (FOLLOWS,)
        return HandBound(
            formula=_text(formula.branches[chosen], formula),
            where=() if short is None else (f"{short[0]} = {_text(short[1], formula)}",),
            value=value,
            neglects=neglects,
            exact=bool(exact),
            dropped=(*formula.dropped, *(_why(v) for k, v in enumerate(values) if k not in real)),
            effects=(*(e for e in effects if e.name in neglects), *held),
        )

    def _value(self, formula: HandFormula, branch: int, limit: float) -> float | None:
        whole = formula.whole(branch)
        numbers: dict[Any, float] = {}
        for symbol in whole.free_symbols:
            number = limit if symbol == formula.limit else self._number(formula, symbol)
            if number is None:
                return None
            numbers[symbol] = number
        short = formula.shorthand[branch]
        if short is not None and (evaluated_float(short[1], numbers) or 0.0) <= 0:
            return None
        return evaluated_float(whole, numbers)

    def _number(self, formula: HandFormula, symbol: Any) -> float | None:
        key = formula.algebra.key(symbol)
        assert key is not None  # every symbol of a formula but its limit is a level
        if key == "deviations" and self.target is not None and self.target.yield_fraction is not None:
            return metrics.deviations(self.target.yield_fraction)
        point, device = self.present.point, key.partition(".")[0]
        if key.endswith(PER_WIDTH):
            whole, width = point.number(key.removesuffix(PER_WIDTH)), point.number(f"{device}.width")
            return None if whole is None or not width else whole / width
        return self._width_capacitance(device) if key.endswith(".width_capacitance") else point.number(key)

    def _width_capacitance(self, name: str) -> float:
        """Capacitance of the output node per metre of a device's width. [F/m]"""
        point = self.present.point
        device = next(d for d in point.algebra.circuit.devices if d.name == name)
        node, width = point.algebra.network.node_capacitance(OUT), point.number(f"{name}.width")
        own = [point.algebra.of(device, c) for c, _, _ in CAPACITANCES if node.has(point.algebra.of(device, c))]
        assert width  # a transistor has one
        return (point.value(sum(own)) or 0.0) / width if own else 0.0

    def _runs(self, formula: HandFormula, branch: int, value: float) -> bool:
        """Whether the formula rises or falls with the limit as the bound does on its side."""
        more = self._value(formula, branch, self.limit * (1.0 + _STEP))
        minimum = None if self.target is None else self.target.minimum
        maximum = None if self.target is None else self.target.maximum
        if more is None or more == value or (minimum is None) == (maximum is None):
            return True
        needs_more_of_it = (more > value) == ((minimum is not None) == (self.limit >= 0))
        return self.side == ("low" if needs_more_of_it else "high")

    def _meets(self, value: float | None) -> bool:
        """Whether a value of the unknown, put into the numeric metric, meets the limit."""
        assert value is not None
        metric = metrics.find(self.metric)
        assert metric is not None
        scaled = metric.of_yield and self.target is not None and self.target.yield_fraction is not None
        scale = metrics.deviations(self.target.yield_fraction) if scaled else 1.0  # type: ignore[union-attr,arg-type]
        case = self.present.case.moved({name: np.asarray([v]) for name, v in self._moves(value).items()})
        with np.errstate(all="ignore"):
            measured = case.solution.measure(metric.of_yield if scaled else metric.key)
        found = at(
            np.broadcast_to(measured.values, np.broadcast_shapes(measured.values.shape, (1,))), self.present.index
        )
        return bool(abs(found * scale - self.limit) <= _JUST_MET * max(abs(self.limit), _NOTHING))

    def _follow(self) -> dict[str, float]:
        """Leaves that move with the unknown, with their relative change per relative change of it."""
        if self.unknown == "inversion_coefficient":
            return {"width": -1.0}
        return {self.unknown: 1.0, "width": 1.0} if self.keep == KEEP_INVERSION else {self.unknown: 1.0}

    def _moves(self, value: float) -> Mapping[str, float]:
        case, index = self.present.case, self.present.index
        if self.unknown == "inversion_coefficient":
            square = at(case.inputs.devices[MAIN].specific_current, index)
            return {"width": at(case.inputs.current, index) * at(case.value("length"), index) / (square * value)}
        moves = {self.unknown: value}
        if self.keep == KEEP_INVERSION:
            moves["width"] = at(case.value("width"), 0) * value / at(case.value("bias_current"), 0)
        return moves


def _why(value: float | None) -> str:
    if value is None:
        return "another solution has no real value or a negative charge"
    return (
        f"another solution, {value:.4g}, is negative"
        if value <= 0
        else f"another solution, {value:.4g}, runs the other way"
    )


def _text(expression: Any, formula: HandFormula) -> str:
    """A formula as text, the supply by its key."""
    import sympy

    supply = sympy.Symbol("supply", positive=True)
    named = {s: supply for s in expression.free_symbols if formula.algebra.key(s) == "supply"}
    return as_line(expression.xreplace(named))
