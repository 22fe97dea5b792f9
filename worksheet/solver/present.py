"""One sheet at one condition in the algebra: the numbers of every level, and what every neglect does there."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

from worksheet.engine.symbolic.algebra import Setting, of
from worksheet.engine.symbolic.neglects import LINEAR, NEGLECTS, SLEWING
from worksheet.engine.symbolic.point import Leaf, Point
from worksheet.solver.algebra_print import Piece, pieces
from worksheet.solver.holds import Hold
from worksheet.solver.inversion import relevant
from worksheet.solver.stated import Case, Stated

SMALL = 0.3
"""Share of the metric up to which a neglect is made without being asked for."""

_NOTHING = 1e-12
_STEP = 1e-5


@dataclass(frozen=True, slots=True)
class Effect:
    """What one neglect does at the present point.

    Attributes:
        name: The neglect.
        share: By what share of its value the metric changes when it alone is made; None where no value is left. Of
            what a formula holds: how much of the metric's relative change it leaves out, per relative change of the
            unknown. [-]
        moving: Whether it is something that is held although it moves with the unknown.
    """

    name: str
    share: float | None
    moving: bool = False


class Present:
    """One case at one condition: its point of the exact algebra, and what every neglect does there."""

    def __init__(self, case: Case, index: int, keep_stated: bool = False) -> None:
        """Take the case and the condition.

        Args:
            case: The sheet.
            index: Index of the condition, 0 being the nominal one.
            keep_stated: Whether what the sheet states stays in the algebra even where it does nothing.
        """
        self.case, self.index = case, index
        self.stated = Stated(case, index)
        self._keep_stated = keep_stated
        self.setting: Setting = self.stated.setting(keep_stated)

    @cached_property
    def point(self) -> Point:
        """The exact algebra with this condition's numbers."""
        return self._point(self.setting)

    @cached_property
    def _nominal(self) -> Present | None:
        return None if self.index == 0 else Present(self.case, 0, self._keep_stated)

    def _point(self, setting: Setting) -> Point:
        return Point(of(setting), self.stated.number, None if self._nominal is None else self._nominal.point)

    def pieces(self, key: str, names: frozenset[str]) -> list[Piece]:
        """What is printed of a level's definition when some neglects are made."""
        algebra = of(self.setting.neglecting(names))
        found = algebra.definition(key)
        return [] if found is None else pieces(algebra.symbol(key), found)

    def effects(self, metric: str) -> tuple[Effect, ...]:
        """What each neglect that changes a metric at all does to its value."""
        exact = self.point.number(metric)
        if exact is None or exact == 0:
            return ()
        found = []
        for name in relevant(self.setting, metric, frozenset(n.name for n in NEGLECTS)):
            value = self.neglecting(metric, frozenset({name}))
            share = None if value is None else (value - exact) / abs(exact)
            if share is None or abs(share) > _NOTHING:
                found.append(Effect(name, share))
        return tuple(found)

    def neglecting(self, metric: str, names: frozenset[str]) -> float | None:
        """A metric's value when several neglects are made at once. [unit of the metric]"""
        return self._point(self.setting.neglecting(names)).number(metric)

    def restored(self, metric: str, names: tuple[str, ...]) -> tuple[tuple[str, float | None], ...]:
        """A metric's value while neglects are taken back one after the other. [unit of the metric]

        Args:
            metric: Its key.
            names: The neglects, the first to be taken back first.
        Returns: ("", value with all of them made), then each name with the value after it was taken back; the last
            one is the exact value
        """
        made = frozenset(names)
        values = [("", self.neglecting(metric, made))]
        for name in names:
            made -= {name}
            values.append((name, self.neglecting(metric, made)))
        return tuple(values)

    def held_effect(self, metric: str, hold: Hold, unknown: str, moves: dict[str, float]) -> Effect:
        """What holding some levels leaves out of a metric's change when the unknown moves.

        Args:
            metric: Its key.
            hold: What is held.
            unknown: What moves.
            moves: The leaves that move with it, each with its relative change per relative change of the unknown.
        """
        held = {key: number for key in hold.keys if (number := self.point.number(key)) is not None}
        exact = self.point.number(metric)
        moved, without = (self.moved_point(moves, h).number(metric) for h in ({}, held))
        missing = exact is None or exact == 0 or moved is None or without is None
        share = None if missing else (without - moved) / abs(exact) / _STEP  # type: ignore[operator,arg-type]
        return Effect(hold.moving_with(unknown), share, moving=True)

    def moved_point(self, moves: dict[str, float], held: dict[str, float]) -> Point:
        """The point with leaves moved by a small step each and levels held at given numbers. [unit of the level]"""
        nominal = None if self._nominal is None else self._nominal.moved_point(moves, {})
        return Point(of(self.setting), _leaf(self.stated, moves), nominal, held)


def _leaf(stated: Stated, moves: dict[str, float]) -> Leaf:
    return lambda key: stated.number(key) * (1.0 + moves.get(key, 0.0) * _STEP)


def small(effects: tuple[Effect, ...]) -> frozenset[str]:
    """Neglects that may be made: those with a small effect, and of slewing and settling the one that says less."""
    shares = {e.name: abs(e.share) for e in effects if e.share is not None}
    chosen = {name for name, share in shares.items() if share < SMALL}
    if SLEWING in shares and LINEAR in shares:
        chosen -= {SLEWING, LINEAR}
        chosen.add(min((SLEWING, LINEAR), key=lambda name: shares[name]))
    return frozenset(chosen)
