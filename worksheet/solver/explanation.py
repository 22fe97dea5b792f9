"""The algebra of one number, as data: what it equals, the numbers put in, where they came from, what it leaves out."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property

from worksheet.model.sheet import Condition
from worksheet.solver import algebra_print
from worksheet.solver.algebra_print import Piece
from worksheet.solver.present import Effect, Present, small
from worksheet.solver.stated import Origin


@dataclass(frozen=True, slots=True)
class Given:
    """One number put in.

    Attributes:
        symbol: As it stands in the expression.
        key: Its key, by which it has an explanation of its own at `condition_index`.
        condition_index: The condition it belongs to: the expression's own, or 0 for what was held from the nominal one.
        title: In words.
        value: None where it does not exist. [unit]
        unit: SI unit.
        origin: Where it was stated; None where it follows from other numbers.
    """

    symbol: str
    key: str
    condition_index: int
    title: str
    value: float | None
    unit: str
    origin: Origin | None = None


@dataclass(frozen=True)
class Simplified:
    """A number as a hand calculation has it.

    Attributes:
        value: None where it does not exist. [unit of the number]
        share: How far it lies from the exact one, as a share of that. [-]
        neglects: What it leaves out, each with its own effect.
        restored: Its value while the neglects are taken back one after the other: ("", with all made), then each name
            with the value after it was taken back; the last is the exact value.
        lines: The expression as lines of characters at 80 columns, in plain ASCII.
    """

    value: float | None
    share: float | None
    neglects: tuple[Effect, ...]
    restored: tuple[tuple[str, float | None], ...]
    lines: tuple[str, ...]


@dataclass(frozen=True, eq=False)
class Explanation:
    """The algebra of one number.

    Attributes:
        key, symbol, title, unit: The number's name.
        value: As the program shows it; None where it does not exist. [unit]
        reason: Why it does not exist, None where it does.
        at, condition_index: The condition.
        given: The numbers put in, in the order of the expression; empty for a number that is stated.
        evaluated: The expression with these numbers in it; None where it has no value. [unit]
        origin: Where a number that is stated came from; None for one that follows.
        relation: The published relation behind it.
        in_range: Whether the calculation holds: devices saturated, levels in range, no rating passed.
        remarks: What to know about that.
    """

    key: str
    symbol: str
    title: str
    unit: str
    value: float | None
    reason: str | None
    at: Condition
    condition_index: int
    given: tuple[Given, ...]
    evaluated: float | None
    origin: Origin | None
    relation: str
    in_range: bool
    remarks: tuple[str, ...]
    _pieces: Sequence[Piece]
    _present: Present | None

    def text(self, width: int, use_unicode: bool = True) -> list[str]:
        """The expression as lines of characters no wider than `width` columns."""
        return algebra_print.as_text(self._pieces, width, use_unicode)

    def latex(self) -> tuple[str, ...]:
        """The expression as LaTeX, an equation each."""
        return algebra_print.as_latex(self._pieces)

    def mathml(self) -> tuple[str, ...]:
        """The expression as presentation MathML, an element each."""
        return algebra_print.as_mathml(self._pieces)

    def mathml_put_in(self, shown: Mapping[str, str]) -> tuple[str, ...]:
        """The expression with numbers put in, as MathML; empty where one is missing or there is nothing to put in.

        Args:
            shown: Each number as it is to stand there, with its unit, by its symbol.
        """
        return algebra_print.put_in(self._pieces, shown)

    @cached_property
    def neglects(self) -> tuple[Effect, ...]:
        """What each neglect that concerns this number would change, at the present point."""
        return () if self._present is None else self._present.effects(self.key)

    @cached_property
    def simplified(self) -> Simplified | None:
        """The number with everything left out that is small at the present point; None where nothing is."""
        made = small(self.neglects)
        if self._present is None or not made:
            return None
        names = tuple(e.name for e in self.neglects if e.name in made)
        restored = self._present.restored(self.key, names)
        value, exact = restored[0][1], restored[-1][1]
        share = (value - exact) / abs(exact) if value is not None and exact else None
        parts = self._present.pieces(self.key, frozenset(names))
        lines = tuple(algebra_print.as_text(parts, 80, use_unicode=False))
        return Simplified(value, share, tuple(e for e in self.neglects if e.name in made), restored, lines)
