"""Curves and points drawn in characters: a frame with numbers at its edges, for terminals and for the app.

Signs are ASCII, so that every terminal shows them; which sign is what stands in the key below the frame.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from math import floor, isfinite, log10

Wording = Callable[[float], str]
_LOG_FROM = 20.0
"""Values that are all above 0 and span more than this are drawn over their logarithm."""

_LEAST_SPAN = 1e-9
_MARGIN = 0.04
LIMIT, HERE = "-", "|"
"""Signs of a limit and of where the sheet stands."""


@dataclass(frozen=True, slots=True)
class Marks:
    """Points with one sign; later ones are drawn over earlier ones. `joined` fills gaps between neighbours."""

    sign: str
    title: str
    x: Sequence[float]
    y: Sequence[float]
    joined: bool = False


@dataclass(frozen=True, eq=False)
class Scale:
    """One axis: its ends, and whether it runs over the logarithm."""

    low: float
    high: float
    logarithmic: bool

    def share(self, value: float) -> float | None:
        """Where a value lies between the ends, from 0 to 1; None outside or where there is none."""
        if not isfinite(value) or (self.logarithmic and value <= 0):
            return None
        low, high, here = (log10(v) if self.logarithmic else v for v in (self.low, self.high, value))
        share = (here - low) / (high - low)
        return share if -_LEAST_SPAN <= share <= 1 + _LEAST_SPAN else None

    def at(self, share: float) -> float:
        """The value at a share of the way."""
        if self.logarithmic:
            return float(10 ** (log10(self.low) + share * (log10(self.high) - log10(self.low))))
        return self.low + share * (self.high - self.low)


def scale_of(values: Sequence[float], *, logarithmic: bool | None = None, margin: float = _MARGIN) -> Scale:
    """A scale that shows all values; over the logarithm where that is asked for, or where they span much."""
    found = [value for value in values if isfinite(value)] or [0.0, 1.0]
    low, high = min(found), max(found)
    log = low > 0 and high / low > _LOG_FROM if logarithmic is None else logarithmic and low > 0
    if log:
        span = max(log10(high / low), 1e-3)
        return Scale(low / 10 ** (margin * span), high * 10 ** (margin * span), logarithmic=True)
    span = (high - low) or abs(high) * 0.1 or 1.0
    return Scale(low - margin * span, high + margin * span, logarithmic=False)


def chart(
    marks: Sequence[Marks],
    x: Scale,
    y: Scale,
    words: tuple[Wording, Wording],
    size: tuple[int, int],
    lines: Sequence[float] = (),
    here: float | None = None,
) -> list[str]:
    """Draw marks in a frame.

    Args:
        marks: What to draw; those further on cover the ones before.
        x, y: The axes.
        words: How values of x and of y are written at the edges.
        size: (columns, rows) of the whole, edges and numbers included.
        lines: Limits, as level lines.
        here: Where the sheet stands along x, as an upright line.
    Returns: rows of text of at most that many columns
    """
    edge = max(len(words[1](y.at(share))) for share in (0.0, 0.5, 1.0))
    width, height = max(size[0] - edge - 3, 10), max(size[1] - 2, 3)
    cells = [[" "] * width for _ in range(height)]
    column = None if here is None else _cell(x.share(here), width)
    for row in cells if column is not None else ():
        row[column or 0] = HERE
    for limit in lines:
        place = _cell(y.share(limit), height)
        if place is not None:
            cells[height - 1 - place] = [LIMIT if sign != HERE else "+" for sign in cells[height - 1 - place]]
    for one in marks:
        _mark(cells, one, x, y)
    labels = {0: words[1](y.at(1.0)), height // 2: words[1](y.at(1 - (height // 2 + 0.5) / height))}
    labels[height - 1] = words[1](y.at(0.0))
    drawn = [f"{labels.get(k, ''):>{edge}} |{''.join(row)}".rstrip() for k, row in enumerate(cells)]
    left, right = words[0](x.at(0.0)), words[0](x.at(1.0))
    gap = max(width - len(left) - len(right), 1)
    return [*drawn, f"{'':{edge}} +{'-' * width}", f"{'':{edge}}  {left}{'':{gap}}{right}".rstrip()]


def _cell(share: float | None, count: int) -> int | None:
    return None if share is None else min(max(floor(share * count), 0), count - 1)


def _mark(cells: list[list[str]], marks: Marks, x: Scale, y: Scale) -> None:
    before: tuple[int, int] | None = None
    for value_x, value_y in zip(marks.x, marks.y, strict=True):
        column, row = _cell(x.share(value_x), len(cells[0])), _cell(y.share(value_y), len(cells))
        if column is None or row is None:
            before = None
            continue
        for c, r in _between(before, (column, row)) if marks.joined and before is not None else [(column, row)]:
            cells[len(cells) - 1 - r][c] = marks.sign
        before = (column, row)


def _between(first: tuple[int, int] | None, last: tuple[int, int]) -> list[tuple[int, int]]:
    assert first is not None
    steps = max(abs(last[0] - first[0]), abs(last[1] - first[1]), 1)
    return [
        (round(first[0] + (last[0] - first[0]) * k / steps), round(first[1] + (last[1] - first[1]) * k / steps))
        for k in range(steps + 1)
    ]
