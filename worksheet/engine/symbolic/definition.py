"""What a level of the algebra is: an expression in further levels, or the root of an equation in them."""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum
from typing import Any

from worksheet.model.metrics import Reason


class AbsentError(Exception):
    """A level that does not exist for a circuit, with the reason."""

    def __init__(self, reason: Reason) -> None:
        """Keep the reason."""
        super().__init__(reason.text)
        self.reason = reason


class Pick(Enum):
    """Which root of an equation is meant."""

    LOWEST_POSITIVE = "the lowest positive root"
    LARGEST = "the largest real root"
    SLOWEST = "the root nearest to zero"
    ONLY = "the positive root"
    LAST = "the last time at which both sides are equal"
    GREATEST = "the positive root, or 0, or the limit, where the value is greatest,"


@dataclass(frozen=True, eq=False, slots=True)
class Root:
    """An equation that has no short solution.

    Attributes:
        unknown: The sympy symbol that it is solved for.
        left, right: Its two sides, in `unknown` and levels. A polynomial, except for Pick.ONLY and Pick.LAST.
        pick: Which root.
    """

    unknown: Any
    left: Any
    right: Any
    pick: Pick


@dataclass(frozen=True, eq=False, slots=True)
class Definition:
    """One level.

    Attributes:
        key: Its name.
        expression: sympy expression in the symbols of further levels, and in the root's unknown; None where missing.
        root: The equation behind that unknown.
        source: The published relation or work behind it.
        missing: Why there is no value at all for this circuit.
        holds: sympy condition without which there is no value; None for none.
    """

    key: str
    expression: Any
    root: Root | None = None
    source: str = ""
    missing: Reason = Reason.NONE
    holds: Any = None
