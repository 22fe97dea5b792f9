"""sympy's own printers with two habits of paper added: in a sum, what is added stands before what is taken away, and
factors under a root stand under one root.

Sympy is loaded when something is printed; the printers are made once.
"""

from __future__ import annotations

from collections.abc import Mapping
from functools import lru_cache
from typing import Any

_ORDER = "rev-lex"
"""Of the terms of a sum: powers rise."""


def drawn(expression: Any, use_unicode: bool) -> list[str]:
    """An expression drawn over several lines of characters, fractions one above the other."""
    from sympy.printing.pretty.pretty_symbology import pretty_use_unicode

    settings = {"use_unicode": use_unicode, "wrap_line": False, "order": _ORDER}
    was = pretty_use_unicode(use_unicode)
    try:
        printer = _orderly("sympy.printing.pretty.pretty", "PrettyPrinter")(settings)
        return str(printer.doprint(_under_one_root(expression))).splitlines()
    finally:
        pretty_use_unicode(was)


def line(expression: Any) -> str:
    """An expression on one line of ASCII, powers rising."""
    return str(_orderly("sympy.printing.str", "StrPrinter")({"order": _ORDER}).doprint(_under_one_root(expression)))


def latex(expression: Any) -> str:
    """An expression as LaTeX."""
    return str(_orderly("sympy.printing.latex", "LatexPrinter")({"order": _ORDER}).doprint(_under_one_root(expression)))


def mathml(expression: Any, numbers: Mapping[str, str] | None = None) -> str:
    """An expression as presentation MathML, without the element around it.

    Args:
        expression: What to print.
        numbers: Stand in the place of letters, by name: "1.2 pF". Nothing is evaluated.
    """
    printer = _orderly("sympy.printing.mathml", "MathMLPresentationPrinter")({"order": _ORDER})
    if numbers is not None:
        printer = _with_numbers(printer, numbers)
    return str(printer.doprint(_under_one_root(expression)))


def _with_numbers(printer: Any, numbers: Mapping[str, str]) -> Any:
    """A printer of MathML that writes a number with its unit for every letter."""
    pow_of, symbol_of = printer._print_Pow, printer._print_Symbol  # noqa: SLF001  what sympy has to override for it

    def element(name: str, said: str) -> Any:
        made = printer.dom.createElement(name)
        made.appendChild(printer.dom.createTextNode(said))
        return made

    def row_of(*parts: Any, name: str = "mrow") -> Any:
        row = printer.dom.createElement(name)
        for part in parts:
            row.appendChild(part)
        return row

    def symbol(expr: Any, style: str = "plain") -> Any:
        if expr.name not in numbers:
            return symbol_of(expr, style)
        value, _, unit = numbers[expr.name].partition(" ")
        mantissa, _, exponent = value.partition("e")
        parts = [element("mn", mantissa)]
        if exponent:
            raised = row_of(element("mn", "10"), element("mn", str(int(exponent)).replace("-", "\u2212")), name="msup")
            parts += [element("mo", "\u00d7"), raised]
        if unit:
            parts.append(element("mtext", "\u2009" + unit.replace("^2", "\u00b2")))
        return row_of(*parts)

    def power(expr: Any) -> Any:
        if not (expr.base.is_Symbol and expr.base.name in numbers and expr.exp.is_positive and expr.exp.is_Integer):
            return pow_of(expr)
        base = row_of(element("mo", "("), symbol(expr.base), element("mo", ")"))
        return row_of(base, element("mn", str(expr.exp)), name="msup")

    printer._settings["mul_symbol"] = "times"  # noqa: SLF001  between numbers the sign has to be seen
    printer._print_Symbol, printer._print_Pow = symbol, power  # noqa: SLF001
    return printer


@lru_cache(maxsize=8)
def _orderly(module: str, name: str) -> Any:
    """A printer of sympy's that puts the terms of a sum in our order."""
    from importlib import import_module

    plain = getattr(import_module(module), name)

    def ordered(self: Any, expr: Any, order: Any = None) -> list[Any]:
        terms = plain._as_ordered_terms(self, expr, order=order)  # noqa: SLF001  what sympy has to override for it
        return sorted(terms, key=lambda term: bool(term.could_extract_minus_sign()))

    return type(f"Orderly{name}", (plain,), {"_as_ordered_terms": ordered})


def _under_one_root(expression: Any) -> Any:
    """The same expression in letters of no known sign, of which sympy leaves a product under its root."""
    import sympy

    half = sympy.Rational(1, 2)

    def rooted(e: Any) -> bool:
        return bool(e.is_Mul) and sum(1 for f in e.args if f.is_Pow and abs(f.exp) == half) > 1

    if not any(rooted(e) for e in sympy.preorder_traversal(expression)):
        return expression
    letters = {symbol: sympy.Symbol(symbol.name) for symbol in expression.free_symbols}
    return expression.xreplace(letters).replace(rooted, lambda e: sympy.powsimp(e, combine="base", force=True))
