"""Algebra as lines for a terminal: of one number, of a bound, of a stage's metrics."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from worksheet.model.sheet_keys import DESIGN
from worksheet.report import plain, wording
from worksheet.report.table import can_show, width_of, wrapped
from worksheet.solver import stage_algebra
from worksheet.solver.algebra_print import wrap
from worksheet.solver.explanation import Explanation, Given
from worksheet.solver.hand import HandBound
from worksheet.solver.present import Effect
from worksheet.solver.stage_algebra import MetricFormula, metric_formula
from worksheet.solver.stated import Origin
from worksheet.stages.stage import Stage

_INDENT = "  "
DRAWN = "─√⋅π₀"
"""Some of the signs that algebra is drawn with; where they can be shown, so can the others."""


def explanation(found: Explanation, width: int, use_unicode: bool | None = None) -> Iterator[str]:
    """Everything about one number.

    Args:
        found: Its algebra.
        width: Columns of the terminal.
        use_unicode: Whether Greek letters and drawn fractions may be used; None for what can be shown where it is
            written.
    """
    use_unicode = can_show(DRAWN) if use_unicode is None else use_unicode
    value = wording.number(found.value, found.unit, found.reason)
    yield from wrapped(f"{found.title} {found.symbol} = {value} at {wording.condition(found.at)}", width)
    if found.origin is not None:
        yield from wrapped(f"from {origin(found.origin)}", width, _INDENT)
    printed = found.text(width - len(_INDENT), use_unicode)
    if printed:
        yield ""
    yield from (f"{_INDENT}{line}" for line in printed)
    if found.given:
        yield ""
        yield from _given(found.given, width)
    if found.relation:
        yield ""
        yield from wrapped(f"Behind it: {found.relation}", width)
    for remark in found.remarks:
        yield from wrapped(f"{'Holds' if found.in_range else 'Out of range'}: {remark}", width)
    yield from _neglects(found, width)


def document(found: Explanation) -> dict[str, Any]:
    """Everything about one number as JSON-ready data, SI units."""
    return {
        "schema": plain.SCHEMA,
        "key": found.key,
        "symbol": found.symbol,
        "value": found.value,
        "unit": found.unit,
        "reason": found.reason,
        "at": plain.condition(found.at),
        "text": found.text(80, use_unicode=False),
        "latex": list(found.latex()),
        "mathml": list(found.mathml()),
        "given": [
            {"symbol": g.symbol, "key": g.key, "value": g.value, "unit": g.unit, "from": _origin(g.origin)}
            for g in found.given
        ],
        "from": _origin(found.origin),
        "relation": found.relation,
        "in_range": found.in_range,
        "remarks": list(found.remarks),
        "neglects": [{"name": e.name, "share": e.share} for e in found.neglects],
        "problems": [],
    }


def _origin(found: Origin | None) -> str | None:
    return None if found is None else origin(found)


def _given(given: tuple[Given, ...], width: int) -> Iterator[str]:
    """A number put in with where it came from, in full: on a line of its own where both fit, else on several."""
    room = max((width_of(g.symbol) for g in given), default=0)
    for g in given:
        name = f"{g.symbol:{room}} = {wording.number(g.value, g.unit)}"
        yield from wrapped(f"{name}, {g.title}, {_from(g)}", width, _INDENT)


def _from(given: Given) -> str:
    return f"follows: {given.key}" if given.origin is None else origin(given.origin)


def origin(found: Origin) -> str:
    """Where a number came from: "sheets/buffer.toml:12 assume.load_capacitance, floor plan, rev 3 (estimate)"."""
    place = f"{found.file}:{found.line}" if found.line is not None else found.file
    words = " ".join(part for part in (place, found.key) if part)
    if found.kind in ("constant", "proposed", "default", "moved", "linked"):
        words = f"{found.kind} {words}".rstrip()
    said = ", ".join(part for part in (words, found.source) if part)
    return f"{said} ({found.trust})" if found.trust else said


def _neglects(found: Explanation, width: int) -> Iterator[str]:
    if not found.neglects:
        return
    yield ""
    yield "What a neglect would change"
    yield from (f"{_INDENT}{effect.name}: {share(effect)}" for effect in found.neglects)
    simple = found.simplified
    if simple is None:
        return
    yield ""
    names = ", ".join(e.name for e in simple.neglects)
    off = "" if simple.share is None else f", {simple.share:+.2%} off"
    yield from wrapped(f"Without {names}: {wording.number(simple.value, found.unit)}{off}", width)
    yield from (f"{_INDENT}{line}" for line in simple.lines if len(line) + len(_INDENT) <= width)


def share(effect: Effect) -> str:
    """What a neglect changes: "+1.2 %"; of what is held, per change of the unknown."""
    if effect.share is None:
        return "no value would be left"
    number = f"{effect.share * 100:+.3g} %"
    return f"{number} of the metric for each 100 % of the unknown" if effect.moving else number


def bound(found: HandBound, symbol: str, side: str, value: str, width: int, indent: str = "") -> Iterator[str]:
    """The algebra of a bound.

    Args:
        found: The algebra.
        symbol: The unknown's symbol.
        side: "low" or "high".
        value: The hand value as text, with its unit.
        width: Columns of the terminal.
        indent: Put before every line.
    """
    sign = "≥" if side == "low" else "≤"
    said = "" if found.exact else f" = {value} by hand"
    yield from algebra(f"{symbol} {sign} {found.formula}{said}", width, indent)
    for line in found.where:
        yield from algebra(line, width, indent + _INDENT)
    shares = {e.name: f"{e.name} ({share(e)})" for e in found.effects}
    if found.neglects:
        names = "; ".join(shares.get(name, name) for name in found.neglects)
        yield from wrapped(f"neglects {names}", width, indent + _INDENT)


def stage(found: Stage, width: int, use_unicode: bool = True, every: bool = True) -> Iterator[str]:
    """The formulas of a stage, metric by metric: what it is, and what it asks of the design variables.

    Args:
        found: The stage.
        width: Columns of the terminal.
        use_unicode: Whether Greek letters and drawn fractions may be used.
        every: Whether to show what each metric asks of every design variable, or of the first that it bounds.
    """
    yield from wrapped(stage_algebra.STATED_FOR, width, _INDENT)
    for key in stage_algebra.formulas_of(found):
        yield ""
        yield from _metric(metric_formula(found, key, every=every), width, use_unicode)


def _metric(formula: MetricFormula, width: int, use_unicode: bool) -> Iterator[str]:
    symbols = {key.name: key.symbol for key in DESIGN}
    yield f"{_INDENT}{formula.key}"
    yield from (f"{_INDENT * 2}{line}" for line in formula.text(width - 2 * len(_INDENT), use_unicode))
    for turned in formula.inverted:
        tail = f", {turned.where}" if turned.where else ""
        yield from algebra(f"{symbols[turned.unknown]} = {turned.formula}{tail}", width, _INDENT * 2)
        if turned.neglects:
            yield from wrapped(f"neglects {', '.join(turned.neglects)}", width, _INDENT * 3)


def algebra(line: str, width: int, indent: str = "") -> Iterator[str]:
    """A line of algebra as lines no wider than `width` columns, broken after operators."""
    yield from (indent + part for part in wrap(line, width - len(indent), _INDENT * 2))
