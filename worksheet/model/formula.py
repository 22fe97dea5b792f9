"""Formulas of a sheet: a small grammar, read into a tree of tuples that cannot do anything but arithmetic.

Here belongs the way from the text of a formula to its tree and from the tree to a value. A sheet is foreign text, so
nothing here hands text to an interpreter, size and nesting are bounded, and parts that are constant are evaluated while
reading, so that no exact arithmetic over the tree can grow without bound.

    sum     = product {("+" | "-") product}
    product = signed {("*" | "/") signed}
    signed  = ("+" | "-") signed | power
    power   = atom ["**" signed]                        binds to the right; -x**2 is -(x**2)
    atom    = number | "pi" | name | name "." name | function "(" sum {"," sum} ")" | "(" sum ")"

The nodes of the tree are described in `arithmetic`.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any, Literal

from worksheet.model.arithmetic import (
    FLOAT_FUNCTIONS,
    FUNCTIONS,
    RESERVED,
    FormulaError,
    Node,
    apply,
    tree_value,
)
from worksheet.model.text import clean, nearest

__all__ = [
    "FLOAT_FUNCTIONS",
    "FUNCTIONS",
    "LONGEST_FORMULA",
    "RESERVED",
    "Formula",
    "FormulaError",
    "Node",
    "evaluate",
    "parse",
    "rename",
]

LONGEST_FORMULA = 1000
MOST_NODES = 300
DEEPEST = 40
LARGEST_EXPONENT = 64
LARGEST_MAGNITUDE = 1e60
SMALLEST_MAGNITUDE = 1e-60

_TOKEN = re.compile(
    r"(?P<space>[ \t\r\n]+)"
    r"|(?P<number>(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?)"
    r"|(?P<name>[A-Za-z_][A-Za-z0-9_]*(?:\.[A-Za-z_][A-Za-z0-9_]*)?)"
    r"|(?P<mark>\*\*|[-+*/(),])"
)
_INSTEAD = {
    "^": 'write "**" for a power',
    "×": 'write "*" for a product',
    "·": 'write "*" for a product',
    "÷": 'write "/" for a quotient',
    "\u2212": 'write "-" for the minus sign',
    "²": 'write "**2" for a square',
    "√": "write sqrt(...) for a root",
    "<": "comparisons are not read",
    ">": "comparisons are not read",
    "=": "comparisons and assignments are not read",
    "%": 'write a percentage as a number, 5 % as "0.05"',
    ".": "a dot stands once, between a sheet and one of its names",
}


@dataclass(frozen=True, slots=True)
class Formula:
    """A formula that was read.

    Attributes:
        text: As it stands in the sheet.
        tree: Its nodes; `arithmetic` says what they are.
        names: The names in it, each once, in the order of their first use; "sheet.name" with its dot.
    """

    text: str
    tree: Node
    names: tuple[str, ...]


def parse(text: str) -> Formula:
    """Read a formula.

    Raises: FormulaError, with the column, for anything outside the grammar or beyond its bounds.
    """
    if len(text) > LONGEST_FORMULA:
        raise FormulaError(f"The formula is longer than {LONGEST_FORMULA} characters.", LONGEST_FORMULA)
    reader = _Reader(_tokens(text), len(text))
    tree = reader.formula()
    return Formula(text, tree, tuple(reader.names))


def evaluate(
    formula: Formula,
    lookup: Callable[[str], Any],
    functions: Mapping[str, Callable[..., Any]] = FLOAT_FUNCTIONS,
    *,
    number: Callable[[float], Any] = float,
    pi: Any = math.pi,
) -> Any:
    """The value of a formula over floats, arrays or symbols.

    Args:
        formula: From `parse`.
        lookup: Gives the value of a name, in SI base units; asked once for each name. Its exceptions pass through.
        functions: The functions of `FUNCTIONS` for these values.
        number: Turns a number of the formula into such a value (for symbols, an exact one).
        pi: The constant as such a value.

    Returns: what the operators of the looked-up values make of it; arrays keep their broadcast shape, and the caller
        checks that they are finite. A float is finite.
    Raises: FormulaError where plain numbers have no real, finite value.
    """
    values = {name: _as_float(lookup(name)) for name in formula.names}
    return tree_value(formula.tree, values, functions, number, pi)


def rename(formula_text: str, old: str, new: str, *, what: Literal["sheet", "name"] = "sheet") -> str:
    """Replace one name in the text of a formula and leave every other character as it is.

    Args:
        formula_text: Any text; what cannot be read is kept.
        old: The name that goes. For a sheet the part before the dot; else the whole name, dotted or not.
        new: The name that comes, of the same form.
        what: "sheet": `old.metric` becomes `new.metric`. "name": the name itself, functions and pi excepted.
    """
    pieces: list[str] = []
    place = 0
    while place < len(formula_text):
        token = _TOKEN.match(formula_text, place)
        piece = token[0] if token else formula_text[place]
        place += len(piece)
        if token and token["name"]:
            sheet, dot, member = piece.partition(".")
            if what == "sheet" and dot and sheet == old:
                piece = f"{new}.{member}"
            elif what == "name" and piece == old and old not in RESERVED:
                piece = new
        pieces.append(piece)
    return "".join(pieces)


# Reading


@dataclass(frozen=True, slots=True)
class _Token:
    kind: str
    text: str
    column: int


@dataclass(frozen=True, slots=True)
class _Part:
    """A piece of the tree with what the bounds need to know about it.

    Attributes:
        node: Its tree.
        constant: Its value where no name is in it.
        raised: The largest product of the constant exponents inside one another.
        column: Where it begins.
    """

    node: Node
    constant: float | None
    raised: float
    column: int


def _tokens(text: str) -> list[_Token]:
    """The words of a formula, without the spaces."""
    found = []
    place = 0
    while place < len(text):
        token = _TOKEN.match(text, place)
        if token is None:
            character = text[place]
            hint = _INSTEAD.get(character)
            shown = clean(character)
            raise FormulaError(f'"{shown}" has no meaning in a formula{f": {hint}" if hint else ""}.', place)
        if not token["space"]:
            found.append(_Token(token.lastgroup or "", token[0], place))
        place = token.end()
    return found


class _Reader:
    """Recursive descent over the words; every nesting passes `_deeper`, so the depth of calls is bounded."""

    def __init__(self, tokens: list[_Token], end: int) -> None:
        self.names: dict[str, None] = {}
        self._tokens = tokens
        self._end = _Token("end", "", end)
        self._place = 0
        self._depth = 0
        self._nodes = 0

    def formula(self) -> Node:
        """The whole text."""
        if not self._tokens:
            raise FormulaError("The formula is empty.", 0)
        part = self._sum()
        rest = self._peek()
        if rest.text == ")":
            raise FormulaError("This parenthesis closes nothing.", rest.column)
        if rest.text == ",":
            raise FormulaError("A comma stands only between the arguments of a function.", rest.column)
        if rest.kind != "end":
            raise FormulaError(f'An operator is missing before "{rest.text}".', rest.column)
        return part.node

    def _peek(self) -> _Token:
        return self._tokens[self._place] if self._place < len(self._tokens) else self._end

    def _take(self, *marks: str) -> _Token | None:
        """The next word if it is one of these marks."""
        token = self._peek()
        if token.kind != "mark" or token.text not in marks:
            return None
        self._place += 1
        return token

    def _deeper(self, token: _Token, step: Callable[[], _Part]) -> _Part:
        """One level further in."""
        self._depth += 1
        if self._depth > DEEPEST:
            raise FormulaError(f"The formula is nested deeper than {DEEPEST} levels.", token.column)
        part = step()
        self._depth -= 1
        return part

    def _sum(self) -> _Part:
        left = self._product()
        while mark := self._take("+", "-"):
            left = self._join(mark, left, self._product())
        return left

    def _product(self) -> _Part:
        left = self._signed()
        while mark := self._take("*", "/"):
            left = self._join(mark, left, self._signed())
        return left

    def _signed(self) -> _Part:
        mark = self._take("+", "-")
        if mark is None:
            return self._power()
        inner = self._deeper(mark, self._signed)
        return inner if mark.text == "+" else self._grow(("neg", inner.node), [inner], mark.column)

    def _power(self) -> _Part:
        base = self._atom()
        mark = self._take("**")
        return self._join(mark, base, self._deeper(mark, self._signed)) if mark else base

    def _atom(self) -> _Part:
        token = self._peek()
        self._place += 1
        if token.kind == "number":
            return self._grow(("number", float(token.text)), [], token.column, written=token.text)
        if token.kind == "name":
            return self._named(token)
        if token.text == "(":
            part = self._deeper(token, self._sum)
            self._close(token)
            return part
        found = f'"{token.text}"' if token.text else "the end"
        raise FormulaError(f"A number, a name or a parenthesis should stand here, not {found}.", token.column)

    def _named(self, token: _Token) -> _Part:
        """A constant, a function with its arguments, or a name."""
        name, opening = token.text, self._take("(")
        if opening is None and name in FUNCTIONS:
            raise FormulaError(f"{name} is a function; its arguments are missing.", token.column)
        if opening is None and name == "pi":
            return self._grow(("pi",), [], token.column)
        if opening is None:
            self.names.setdefault(name)
            return self._grow(("name", name), [], token.column)
        if name not in FUNCTIONS:
            near = nearest(name, FUNCTIONS)
            hint = f"did you mean {near}?" if near else f"the functions are {', '.join(FUNCTIONS)}."
            raise FormulaError(f'"{clean(name)}" is not a function; {hint}', token.column)
        arguments = [self._deeper(opening, self._sum)]
        while self._take(","):
            arguments.append(self._deeper(opening, self._sum))
        self._close(opening)
        least, most = FUNCTIONS[name]
        if not least <= len(arguments) <= most:
            wanted = "one argument" if most == 1 else "at least two arguments"
            raise FormulaError(f"{name} takes {wanted}, not {len(arguments)}.", token.column)
        return self._grow(("call", name, *(part.node for part in arguments)), arguments, token.column)

    def _close(self, opening: _Token) -> None:
        if self._take(")") is None:
            if self._peek().kind == "end":
                raise FormulaError("A parenthesis is not closed.", opening.column)
            raise FormulaError(f'An operator is missing before "{self._peek().text}".', self._peek().column)

    def _join(self, mark: _Token, left: _Part, right: _Part) -> _Part:
        """Two operands of one operator."""
        raised = 1.0
        if mark.text == "**" and right.constant is not None:
            raised = max(1.0, abs(right.constant))
            if left.raised * raised > LARGEST_EXPONENT:
                raise FormulaError(f"The exponent is larger than {LARGEST_EXPONENT}.", right.column)
        return self._grow((mark.text, left.node, right.node), [left, right], mark.column, raised=raised)

    def _grow(self, node: Node, inner: list[_Part], column: int, *, raised: float = 1.0, written: str = "") -> _Part:
        """A new node over its parts, within the bounds of size and, where constant, of magnitude."""
        self._nodes += 1
        if self._nodes > MOST_NODES:
            raise FormulaError(f"The formula has more than {MOST_NODES} numbers, names and operators.", column)
        constant = self._constant(node, inner, column)
        if constant is not None and (_vanished(node, inner, written) if constant == 0.0 else not _within(constant)):
            raise FormulaError("A constant lies outside 1e-60 to 1e60.", column)
        start = inner[0].column if inner and node[0] not in {"neg", "call"} else column
        return _Part(node, constant, raised * max((part.raised for part in inner), default=1.0), start)

    def _constant(self, node: Node, inner: list[_Part], column: int) -> float | None:
        """The value of a node without names; evaluated from its parts' values."""
        if node[0] == "name":
            return None
        if not inner:
            return math.pi if node[0] == "pi" else float(node[1])
        known = [part.constant for part in inner if part.constant is not None]
        if len(known) < len(inner):
            return None
        try:
            return float(apply(node, known, FLOAT_FUNCTIONS))
        except FormulaError as error:
            raise FormulaError(str(error), column) from None


def _within(constant: float) -> bool:
    return SMALLEST_MAGNITUDE <= abs(constant) <= LARGEST_MAGNITUDE


def _vanished(node: Node, inner: list[_Part], written: str) -> bool:
    """Whether a constant of 0 is not truly 0 but too small for a double."""
    if node[0] == "number":
        return re.search("[1-9]", written.lower().partition("e")[0]) is not None
    can_be_zero = node[0] in {"+", "-", "neg"} or node[1] == "log"
    return not can_be_zero and all(part.constant for part in inner)


def _as_float(value: Any) -> Any:
    """Plain numbers, numpy's scalars among them, as float: their faults are raised instead of warned about."""
    return float(value) if isinstance(value, int | float) else value
