"""sympy's own printers with two habits of paper added: in a sum, what is added stands before what is taken away, and
factors under a root stand under one root.

Sympy is loaded when something is printed; the printers are made once.
"""

from __future__ import annotations

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


def mathml(expression: Any) -> str:
    """An expression as presentation MathML, without the element around it."""
    return str(
        _orderly("sympy.printing.mathml", "MathMLPresentationPrinter")({"order": _ORDER}).doprint(
            _under_one_root(expression)
        )
    )


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
