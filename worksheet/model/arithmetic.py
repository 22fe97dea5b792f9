"""Arithmetic over the tree of a formula: what a node means for floats, arrays and symbols alike.

Here belongs the tree, the functions that exist, and the walk that turns a tree into a value. How text becomes a tree
is the job of `formula`.

A node is ("number", float), ("pi",), ("name", "a" or "sheet.a"), ("neg", x), ("call", function, x, ...) or
(operator, x, y) with "+", "-", "*", "/", "**".
"""

from __future__ import annotations

import math
import operator
from collections.abc import Callable, Mapping
from types import MappingProxyType
from typing import Any

__all__ = ["FLOAT_FUNCTIONS", "FUNCTIONS", "RESERVED", "FormulaError", "Node", "apply", "finite", "tree_value"]

Node = tuple[Any, ...]
"""A node of the tree: a tag, then its children, or a number or name."""

_ANY_NUMBER = 10_000

FUNCTIONS: Mapping[str, tuple[int, int]] = MappingProxyType(
    {
        "sqrt": (1, 1),
        "log": (1, 1),
        "exp": (1, 1),
        "min": (2, _ANY_NUMBER),
        "max": (2, _ANY_NUMBER),
        "abs": (1, 1),
    }
)
"""Every function with the least and the largest number of its arguments; log is the natural one."""

RESERVED = frozenset({*FUNCTIONS, "pi"})
"""What a name without a dot cannot be."""

FLOAT_FUNCTIONS: Mapping[str, Callable[..., Any]] = MappingProxyType(
    {"sqrt": math.sqrt, "log": math.log, "exp": math.exp, "min": min, "max": max, "abs": abs}
)
"""The functions for plain numbers, the default of `evaluate`."""

_OPERATORS: Mapping[str, Callable[[Any, Any], Any]] = MappingProxyType(
    {"+": operator.add, "-": operator.sub, "*": operator.mul, "/": operator.truediv, "**": operator.pow}
)


class FormulaError(ValueError):
    """A formula that cannot be read or has no value. str() is a sentence.

    Attributes:
        column: Where in the text, from 0; 0 for a formula that was read but has no value.
    """

    def __init__(self, message: str, column: int = 0) -> None:
        self.column = column
        super().__init__(message)


def tree_value(
    tree: Node,
    values: Mapping[str, Any],
    functions: Mapping[str, Callable[..., Any]],
    number: Callable[[float], Any],
    pi: Any,
) -> Any:
    """The value of a tree.

    Args:
        tree: Its top node.
        values: A value for each name in it.
        functions: The functions of `FUNCTIONS` for such values.
        number: Turns a number of the tree into such a value.
        pi: The constant as such a value.

    Raises: FormulaError where plain numbers have no real, finite value.
    """
    results: list[Any] = []
    pending: list[tuple[Node, bool]] = [(tree, False)]
    while pending:  # a stack of our own: a sum of 150 terms is 150 levels deep
        node, ready = pending.pop()
        tag = node[0]
        if tag == "number":
            results.append(number(node[1]))
        elif tag == "pi":
            results.append(pi)
        elif tag == "name":
            results.append(finite(values[node[1]]))
        else:
            children = node[2:] if tag == "call" else node[1:]
            if ready:
                arguments = results[len(results) - len(children) :]
                del results[len(results) - len(children) :]
                results.append(apply(node, arguments, functions))
            else:
                pending.append((node, True))
                pending.extend((child, False) for child in reversed(children))
    return results[0]


def finite(value: Any) -> Any:
    """The value itself, unless it is a plain number that is complex, infinite or NaN."""
    if isinstance(value, complex) or (isinstance(value, float) and not math.isfinite(value)):
        raise FormulaError("The formula has no real, finite value here.")
    return value


def apply(node: Node, arguments: list[Any], functions: Mapping[str, Callable[..., Any]]) -> Any:
    """One operation on evaluated operands; every step is checked, as 1/(1e200*1e200) would pass for 0."""
    tag = node[0]
    try:
        if tag == "neg":
            result = -arguments[0]
        elif tag == "call":
            result = functions[node[1]](*arguments)
        else:
            result = _OPERATORS[tag](arguments[0], arguments[1])
    except ZeroDivisionError:
        raise FormulaError("The formula divides by zero.") from None
    except OverflowError:
        raise FormulaError("A value in the formula is out of range.") from None
    except ValueError:
        raise FormulaError(f"{node[1] if tag == 'call' else tag} has no real value there.") from None
    return finite(result)
