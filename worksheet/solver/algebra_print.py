"""Algebra as characters for a terminal, as LaTeX and as presentation MathML, all by sympy's own printers.

A definition is a few pieces: what the level equals, and where it is a root, the equation behind it. A piece is a
caption in words and a sympy expression.
"""

from __future__ import annotations

import html
import re
import textwrap
from collections.abc import Iterator, Mapping, Sequence
from typing import Any

from worksheet.engine.symbolic.definition import Definition, Pick, Root
from worksheet.solver import algebra_printers

Piece = tuple[str, Any]
"""A caption ("" for none) and a sympy expression or relation."""

_INDENT = "    "
_BREAKABLE = re.compile(r"(?:\*\*|[^*/ ])*(?:\*(?!\*)|/| +|$)")
_ENTITY = re.compile(r"&(\w+);")
_MATHML = '<math xmlns="http://www.w3.org/1998/Math/MathML" display="block">{}</math>'


def pieces(symbol: Any, found: Definition) -> list[Piece]:
    """What is printed of a definition.

    Args:
        symbol: The level's symbol.
        found: Its definition; one without an expression prints nothing.
    """
    import sympy

    if found.expression is None:
        return []
    parts: list[Piece] = [("", sympy.Eq(symbol, found.expression, evaluate=False))]
    if found.root is not None:
        parts += _of_last(found.root) if found.root.pick is Pick.LAST else [_of_root(found.root)]
    if found.holds is not None and found.holds not in (sympy.true, sympy.false):
        parts.append(("only where", found.holds))
    return parts


def _of_root(root: Root) -> Piece:
    import sympy

    return f"{root.unknown.name} is {root.pick.value} of", sympy.Eq(root.left, root.right, evaluate=False)


def _of_last(root: Root) -> list[Piece]:
    """The sum of exponentials of a step response in parts that can be read."""
    import sympy

    summed = next(iter(root.left.atoms(sympy.RootSum)))
    outside = root.left.xreplace({summed: sympy.S.One})
    error = sympy.Symbol("e", real=True)
    term = outside * summed.fun.expr.xreplace({summed.fun.variables[0]: summed.poly.gen})
    poles = sympy.Eq(summed.poly.as_expr(), 0, evaluate=False)
    return [
        (f"{root.unknown.name} is {root.pick.value} of", sympy.Eq(abs(error), root.right, evaluate=False)),
        (f"e is the sum, over all {summed.poly.gen}, of", term),
        (f"{summed.poly.gen} is every root of", poles),
    ]


def as_text(parts: Sequence[Piece], width: int, use_unicode: bool = True) -> list[str]:
    """Pieces as lines of characters no wider than a terminal.

    Args:
        parts: What to print.
        width: Columns.
        use_unicode: Whether Greek letters and drawn fractions may be used; else plain ASCII.
    """
    return [line for part in parts for line in _lines(part, width, use_unicode)]


def _lines(part: Piece, width: int, use_unicode: bool) -> Iterator[str]:
    caption, expression = part
    if caption:
        yield from textwrap.wrap(caption, width)
    drawn = algebra_printers.drawn(expression, use_unicode)
    if max(len(line) for line in drawn) <= width:
        yield from (line.rstrip() for line in drawn)
    else:  # a fraction that is torn apart cannot be read
        yield from wrap(as_line(expression), width, _INDENT)


def as_line(expression: Any) -> str:
    """An expression or equation on one line of ASCII, powers rising: "I_spec*(y + y**2)"."""
    import sympy

    if isinstance(expression, sympy.Eq):
        return " = ".join(as_line(side) for side in expression.args)
    return algebra_printers.line(expression)


def wrap(text: str, width: int, hanging: str = "") -> list[str]:
    """One line of algebra as several, broken at spaces and after operators.

    Args:
        text: The line.
        width: Columns.
        hanging: Put before every line but the first.
    """
    found, line = [], ""
    for part in _BREAKABLE.findall(text):
        if line.strip() and len(line) + len(part.rstrip()) > width:
            found.append(line.rstrip())
            line = hanging + part.lstrip()
        else:
            line += part
    return [*found, line.rstrip()]


def as_latex(parts: Sequence[Piece]) -> tuple[str, ...]:
    """Pieces as LaTeX, captions as text in it."""
    written = ((caption, algebra_printers.latex(e)) for caption, e in parts)
    return tuple(rf"\text{{{caption} }} {e}" if caption else e for caption, e in written)


def as_mathml(parts: Sequence[Piece]) -> tuple[str, ...]:
    """Pieces as presentation MathML, one element each, captions as text in it."""
    printed = []
    for caption, expression in parts:
        words = f"<mtext>{caption}&#xA0;</mtext>" if caption else ""
        written = algebra_printers.mathml(expression)
        printed.append(_MATHML.format(f"<mrow>{words}{_ENTITY.sub(_character, written)}</mrow>"))
    return tuple(printed)


def put_in(parts: Sequence[Piece], numbers: Mapping[str, str]) -> tuple[str, ...]:
    """Pieces with numbers in the place of letters, as MathML; nothing is evaluated.

    Args:
        parts: What is printed of a definition.
        numbers: Each letter's number with its unit, by the letter's name; a letter without one stays.
    Returns: an element a piece, of the first its right side; none for a piece without a letter that has a number
    """
    import sympy

    printed = []
    for number, (caption, expression) in enumerate(parts):
        shown = expression.rhs if number == 0 and isinstance(expression, sympy.Eq) else expression
        if not any(symbol.name in numbers for symbol in shown.free_symbols) or shown.has(sympy.RootSum):
            continue
        words = "<mo>=</mo>" if number == 0 else f"<mtext>{caption}&#xA0;</mtext>" if caption else ""
        written = _ENTITY.sub(_character, algebra_printers.mathml(shown, numbers))
        printed.append(_MATHML.format(f"<mrow>{words}{written}</mrow>"))
    return tuple(printed)


def _character(entity: re.Match[str]) -> str:
    """The character of an entity that is known to HTML alone; those of XML stay."""
    return entity[0] if entity[1] in ("amp", "lt", "gt", "quot", "apos") else html.unescape(entity[0])
