"""The algebra of any number of a sheet: metrics, operating-point values, every level below them, figures, formulas.

Each number put in has a key of its own, so that whoever reads can follow it down to what the sheet states, and back.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from worksheet.engine.symbolic.definition import Definition
from worksheet.engine.symbolic.point import evaluated_definition, evaluated_float
from worksheet.engine.symbolic.vocabulary import AT_NOMINAL, canonical
from worksheet.engine.validity import REVERSE_SHARE_LIMIT, shortfalls
from worksheet.model import formula as formulas
from worksheet.model import metrics, operating
from worksheet.model.dimension import VOLTAGE
from worksheet.model.formula import Formula
from worksheet.model.metrics import Reason
from worksheet.model.quantity import format_quantity
from worksheet.solver.algebra_print import pieces
from worksheet.solver.explanation import Explanation, Given
from worksheet.solver.present import Present
from worksheet.solver.stated import Case, Origin, at
from worksheet.solver.subject import own_unit

_WHAT = {
    "saturation": "{name} is not saturated: its drain-source voltage falls short by {short}",
    "max_voltage": "{name} passes max_voltage by {short}",
    "range": "{name} lies outside its range by {short}",
}


def explainable(case: Case) -> tuple[str, ...]:
    """Keys of the metrics, figures and operating-point values of a sheet, each of which has an explanation."""
    figures = [t.name for t in case.sheet.targets.values() if t.formula is not None]
    defined = [m.key for m in metrics.all_metrics() if case.stage.absent_metric(m.key) is None]
    points = [f"{d.name}.{value.key}" for d in case.circuit.devices for value in operating.OPERATING_POINT]
    return (*defined, *figures, *points)


def explain(case: Case, key: str, condition_index: int = 0) -> Explanation:
    """The algebra of one number.

    Args:
        case: The sheet, with a number for everything it leaves open.
        key: A metric ("bandwidth"), a figure of the sheet, an operating-point value ("main.transconductance"), or the
            key of any number put into another explanation.
        condition_index: The condition, 0 being the nominal one.
    Raises: KeyError where there is no number of that key
    """
    present = Present(case, condition_index, keep_stated=True)
    target = case.sheet.targets.get(key)
    if target is not None and target.formula is not None:
        return _formula(present, key, target.formula, target.unit)
    owner = key.partition(".")[0]
    if _linked(present, key):
        return _leaf(present, key, key, key, "")
    if key in case.sheet.own:
        unit = own_unit(case.sheet.own[key])
        stated = case.sheet.own[key].formula
        return _formula(present, key, stated, unit) if stated is not None else _leaf(present, key, key, key, unit)
    if metrics.find(key) is not None and case.stage.absent_metric(key) is not None:
        raise KeyError(key)
    algebra = present.point.algebra
    found, word = algebra.definition(key), algebra.word(key)
    if found is not None:
        return _defined(present, key, found)
    value = None if owner in {d.name for d in case.circuit.devices} else case.stated(canonical(case.circuit, key))
    if value is not None and value.formula is not None and canonical(case.circuit, key) not in case.moves:
        return _formula(present, canonical(case.circuit, key), value.formula, word.unit, word.title)
    return _leaf(present, canonical(case.circuit, key), word.symbol, word.title, word.unit)


def _linked(present: Present, key: str) -> bool:
    """Whether a key names a number of another sheet that one of this sheet's formulas takes."""
    if "." not in key:
        return False
    values = (
        *present.case.sheet.assume.values(),
        *present.case.sheet.choose.values(),
        *present.case.sheet.own.values(),
    )
    stated = [v.formula for v in values] + [t.formula for t in present.case.sheet.targets.values()]
    return any(key in f.names for f in stated if f is not None)


def _defined(present: Present, key: str, found: Definition) -> Explanation:
    algebra = present.point.algebra
    word = algebra.word(key)
    given = tuple(_given(present, inner) for inner in algebra.inputs(found))
    numbers = {algebra.symbol(g.symbol_key): g.given.value for g in given}
    value, reason = _shown(present, key)
    in_range, remarks = _range(present, key)
    complete = all(v is not None for v in numbers.values())
    return Explanation(
        key=key,
        symbol=word.symbol,
        title=word.title,
        unit=word.unit,
        value=value,
        reason=(found.missing.text or reason) if value is None else None,
        at=present.case.conditions.conditions[present.index],
        condition_index=present.index,
        given=tuple(g.given for g in given),
        evaluated=evaluated_definition(found, numbers) if complete else None,
        origin=None,
        relation=found.source,
        in_range=in_range,
        remarks=remarks,
        _pieces=pieces(algebra.symbol(key), found),
        _present=present,
    )


class _Inner:
    """A number put in, and the key of its symbol."""

    def __init__(self, given: Given, symbol_key: str) -> None:
        self.given, self.symbol_key = given, symbol_key


def _given(present: Present, key: str) -> _Inner:
    algebra = present.point.algebra
    word, plain = algebra.word(key), key.removesuffix(AT_NOMINAL)
    stated = algebra.alias(key)
    origin = None
    if algebra.definition(stated) is None and not stated.endswith(AT_NOMINAL):
        origin = present.stated.origin(stated)
    index = 0 if plain != key else present.index
    return _Inner(Given(word.symbol, plain, index, word.title, present.point.number(key), word.unit, origin), key)


def _shown(present: Present, key: str) -> tuple[float | None, str | None]:
    """The number as the rest of the program has it, or the reason why there is none."""
    solution, index = present.case.solution, present.index
    owner, _, value = key.partition(".")
    if metrics.find(key) is not None:
        measured = solution.measure(key)
        number = at(measured.values, index)
        if np.isfinite(number):
            return number, None
        place = () if measured.values.ndim == 0 else (min(index, measured.values.shape[-1] - 1),)
        return None, measured.reason((0,) * (measured.values.ndim - 1) + place).text
    if owner in solution.devices and operating.find(value) is not None:
        number = at(getattr(solution.devices[owner], value), index)
    else:
        found = present.point.number(key)
        number = np.nan if found is None else found
    return (number, None) if np.isfinite(number) else (None, Reason.NOT_A_NUMBER.text)


def _range(present: Present, key: str) -> tuple[bool, tuple[str, ...]]:
    """Whether the calculation holds at this condition, and what to know about that."""
    broken = []
    for shortfall in shortfalls(present.case.solution):
        if at(shortfall.broken, present.index):
            short = format_quantity(at(shortfall.short_by, present.index), VOLTAGE)
            broken.append(_WHAT[shortfall.what].format(name=shortfall.device, short=short))
    if broken:
        return False, tuple(broken)
    remarks = ["every device is saturated, every level in its range, no voltage past its rating"]
    for name, device in present.case.solution.devices.items():
        share = at(device.reverse_share, present.index)
        touched = any(k == f"{name}.drain_conductance" for k in present.point.algebra.reached(key))
        if touched and np.isfinite(share) and share > REVERSE_SHARE_LIMIT:
            remarks.append(
                f"the drain conductance of {name} is understated by {share:.0%} so near its saturation voltage"
            )
    return True, tuple(remarks)


def _leaf(present: Present, key: str, symbol: str, title: str, unit: str) -> Explanation:
    """A number that is stated."""
    linked = _linked(present, key)
    number = _external(present, key) if linked else present.stated.number(key)
    origin = Origin("linked", key=key) if linked else present.stated.origin(key)
    return _plain(present, key, symbol, title, unit, number, origin)


def _plain(
    present: Present,
    key: str,
    symbol: str,
    title: str,
    unit: str,
    value: float,
    origin: Origin,
    given: tuple[Given, ...] = (),
    evaluated: float | None = None,
    parts: tuple[tuple[str, Any], ...] = (),
) -> Explanation:
    return Explanation(
        key=key,
        symbol=symbol,
        title=title,
        unit=unit,
        value=value if np.isfinite(value) else None,
        reason=None if np.isfinite(value) else Reason.NOT_A_NUMBER.text,
        at=present.case.conditions.conditions[present.index],
        condition_index=present.index,
        given=given,
        evaluated=value if not parts else evaluated,
        origin=origin,
        relation="the sheet's own formula" if parts else "",
        in_range=True,
        remarks=(),
        _pieces=parts,
        _present=None,
    )


def _formula(present: Present, key: str, formula: Formula, unit: str, title: str = "") -> Explanation:
    """A number that a formula of the sheet gives: a figure, an assumption, a choice, an own name."""
    import sympy

    figure = key in present.case.sheet.targets
    names = {name: sympy.Symbol(name, real=True) for name in formula.names}
    functions = {"sqrt": sympy.sqrt, "log": sympy.log, "exp": sympy.exp, "min": sympy.Min, "max": sympy.Max, "abs": abs}
    expression = sympy.S.Zero + formulas.evaluate(formula, names.__getitem__, functions, number=_number, pi=sympy.pi)
    given = tuple(_named(present, name, figure) for name in formula.names)
    numbers = {names[g.symbol]: g.value for g in given if g.value is not None}
    complete = len(numbers) == len(given)
    target = present.case.sheet.targets.get(key) if figure else None
    if target is not None:
        value = at(present.case.figure(target), present.index)
        sheet = present.case.sheet
        origin = Origin("sheet", sheet.file, target.line, f"target.{key}", target.source, "", formula.text)
    else:
        value, origin = present.stated.number(key), present.stated.origin(key)
    symbol = sympy.Symbol(key, real=True)
    parts = (("", sympy.Eq(symbol, expression, evaluate=False)),)
    evaluated = evaluated_float(expression, numbers) if complete else None
    return _plain(present, key, key, title or key, unit, value, origin, given, evaluated, parts)


def _number(value: float) -> Any:
    import sympy

    return sympy.Integer(int(value)) if value == int(value) and abs(value) < 1e6 else sympy.Float(value)


def _named(present: Present, name: str, figure: bool) -> Given:
    """A name in a formula of the sheet: a metric in a figure, a value of the sheet, or a number of another one."""
    index, case = present.index, present.case
    metric = metrics.find(name) if figure else None
    if metric is not None:
        value, _ = _shown(present, name)
        return Given(name, name, index, metric.title, value, metric.dimension.unit)
    if "." in name:
        return Given(name, name, index, name, _external(present, name), "", Origin("linked", key=name))
    number, origin = present.stated.number(name), present.stated.origin(name)
    if name in case.sheet.own:
        return Given(name, name, index, name, number, own_unit(case.sheet.own[name]), origin)
    word = present.point.algebra.word(name)
    return Given(name, name, index, word.title, number, word.unit, origin)


def _external(present: Present, name: str) -> float:
    sheet, _, part = name.partition(".")
    moved = present.case.moves.get(name)
    return at(present.case.external(sheet, part) if moved is None else moved, present.index)
