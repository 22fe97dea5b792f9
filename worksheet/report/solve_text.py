"""What is needed, as a designer reads it in a terminal of 80 columns."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from typing import Any

from worksheet.model import metrics
from worksheet.model.dimension import AREA
from worksheet.model.keys import Key
from worksheet.model.quantity import format_quantity
from worksheet.model.text import clean
from worksheet.report import wording
from worksheet.report.algebra_text import algebra
from worksheet.report.table import Column, Table, lines, wrapped
from worksheet.solver.holds import is_moving
from worksheet.solver.results import Bound, Conflict, Point, Region, Solved, Window
from worksheet.solver.variables import INVERSION

Hand = Callable[[Window, Bound], dict[str, Any]]
Keys = Mapping[str, Key]
_INDENT = "    "
_FAR_OFF = 1.5
_SHOWN = 5e-4


def text(
    solved: Solved, title: str, keys: Keys, hand: Hand, width: int, asked: tuple[str | None, str | None] = (None, None)
) -> Iterator[str]:
    """Lines of what solve says.

    Args:
        solved: What is needed.
        title: The sheet's title.
        keys: Design variables by name.
        hand: Gives a bound's method, formula, hand value and neglects.
        width: Columns of the terminal.
        asked: The target and the unknown that were asked for, None for all.
    """
    where = "in every condition" if solved.over == "all" else "at the nominal condition"
    yield from wrapped(f"{solved.sheet}{': ' + title if title else ''}, what is needed {where}", width)
    for window in solved.needed.values():
        yield ""
        yield from _window(window, keys[window.name], hand, width)
    yield from _unbounded(solved, asked, width)
    yield ""
    yield from _points(solved, keys, width)
    for target, enough in solved.self_loading.items():
        yield ""
        yield from _self_loading(target, enough, keys, width)
    if solved.conflict is not None:
        yield ""
        yield from _conflict(solved.conflict, keys, width)
    yield ""
    yield from wrapped(wording.STANDING, width)


def _unbounded(solved: Solved, asked: tuple[str | None, str | None], width: int) -> Iterator[str]:
    """What was asked for and sets no bound."""
    target, unknown = asked
    if unknown is None and (target is None or solved.needed):
        return
    window = solved.needed.get(unknown or "")
    if window is not None and (target is None or window.bounds):
        return
    of, by = unknown or "any design variable", target or "no target"
    if window is not None and target in window.cannot_help:
        said = f"{target} is missed at every value of {of}"
    elif target is not None:
        said = f"{by} sets no bound on {of}: moving it alone makes no difference between met and missed"
    else:
        said = f"{by} sets a bound on {of}: moving it alone makes no difference between met and missed"
    yield ""
    yield from wrapped(said, width, "  ")


def shown(key: Key, value: float | None) -> str:
    """A value of a design variable."""
    if value is None:
        return "-"
    return f"{value:.4g}" if key.dimension is None else format_quantity(value, key.dimension)


def _end(key: Key, value: float | None, side: str) -> str:
    """An end of what is needed, on the side that meets."""
    return shown(key, None if value is None else wording.safe(value, side))


def _window(window: Window, key: Key, hand: Hand, width: int) -> Iterator[str]:
    kept = f", the {window.keep} kept" if window.keep else ""
    symbol = f" {key.symbol}" if key.symbol and key.symbol not in key.title.split() else ""
    yield from wrapped(f"{key.title}{symbol}{kept}: now {shown(key, window.present)}", width, "  ")
    if window.region is None:
        yield from wrapped("no value at which all holds that this variable can help", width, _INDENT)
    else:
        yield from wrapped(f"needed {_region(window.region, key)}", width, _INDENT)
    for region in window.also:
        yield from wrapped(f"also {_region(region, key)}", width, _INDENT)
    if window.cannot_help:
        yield from wrapped(f"cannot help {', '.join(window.cannot_help)}", width, _INDENT)
    for bound in window.bounds:
        yield from _bound(window, bound, key, hand, width)


def _region(region: Region, key: Key) -> str:
    low = f"at least {_end(key, region.low, 'low')} ({region.low_set_by})" if region.low_set_by else ""
    high = f"at most {_end(key, region.high, 'high')} ({region.high_set_by})" if region.high_set_by else ""
    return ", ".join(part for part in (low, high) if part) or "any value"


def _bound(window: Window, bound: Bound, key: Key, hand: Hand, width: int) -> Iterator[str]:
    sign = "≥" if bound.side == "low" else "≤"
    place = wording.bound_place(bound.at, bound.edge, bound.valid)
    yield from wrapped(
        f"{bound.target}: {sign} {_end(key, bound.value, bound.side)} at {place}",
        width,
        _INDENT,
    )
    said = hand(window, bound)
    indent = _INDENT * 2
    if said["method"] == "closed form":
        yield from algebra(f"{key.symbol} {sign} {said['formula']}", width, indent)
        yield from _beside(said, width, indent)
        return
    estimate = said["hand"]
    if estimate is None:
        yield from wrapped("numeric, no short formula", width, indent)
        return
    off = far_off(estimate["value"], bound.value)
    yield from algebra(
        f"by hand {key.symbol} {sign} {estimate['formula']} = {shown(key, estimate['value'])}{off}", width, indent
    )
    yield from _beside(said, width, indent)
    if estimate["neglects"]:
        named = [_neglect(name, estimate.get("effects", {}).get(name)) for name in estimate["neglects"]]
        yield from wrapped(f"neglects {', '.join(named)}", width, indent)


def far_off(estimate: float, exact: float) -> str:
    """A word on a hand value that is far from the bound."""
    near = exact != 0 and 1 / _FAR_OFF < estimate / exact < _FAR_OFF
    return "" if near else ", far off here: what it neglects decides"


def _beside(said: Mapping[str, Any], width: int, indent: str) -> Iterator[str]:
    """What a formula's shorthand stands for, and the solutions that were left out."""
    for line in said.get("where", ()):
        yield from algebra(line, width, indent + "  ")
    for reason in said.get("dropped", ()):
        yield from wrapped(f"left out: {reason}", width, indent)


def _neglect(name: str, share: float | None) -> str:
    """A neglect with what it does to the metric at the present point; of what is held, to a change of the metric."""
    if share is None:
        return name
    part = f"{abs(share):.1%}" if abs(share) >= _SHOWN else "under 0.1%"
    return f"{name} ({part} of its change)" if is_moving(name) else f"{name} ({part})"


def _self_loading(target: str, enough: Mapping[str, float], keys: Keys, width: int) -> Iterator[str]:
    ways = []
    if INVERSION.name in enough:
        ways.append(f"from an inversion coefficient of {enough[INVERSION.name]:.4g}")
    if "length" in enough:
        ways.append(f"up to a length of {shown(keys['length'], enough['length'])}")
    yield from wrapped(
        f"At the inversion that is kept no current is enough for {target}: the width grows with the current and loads "
        f"the stage. One is {' or '.join(ways)}.",
        width,
    )


def _points(solved: Solved, keys: Keys, width: int) -> Iterator[str]:
    if solved.recommended is None:
        yield from wrapped(f"No recommended point: {solved.reason}.", width)
        return
    columns = [Column("point"), *(Column(keys[n].symbol, right=True) for n in _order(solved.recommended, keys))]
    columns += [Column("IC", right=True), Column("gate area", right=True)]
    rows = [_point("recommended", solved.recommended, keys)]
    if solved.compact is not None:
        rows.append(_point("compact", solved.compact, keys))
    yield from lines(Table(tuple(columns), tuple(rows)), width, "  ")


def _order(point: Point, keys: Keys) -> list[str]:
    return [name for name in keys if name in point.values]


def _point(title: str, point: Point, keys: Keys) -> tuple[str, ...]:
    values = [shown(keys[name], point.values[name]) for name in _order(point, keys)]
    return (title, *values, f"{point.inversion_coefficient:.3g}", format_quantity(point.gate_area, AREA))


def _conflict(found: Conflict, keys: Keys, width: int) -> Iterator[str]:
    yield from wrapped(f"Conflict: {clean(found.explain)}.", width)
    for name, value in found.gives_way.items():
        metric = metrics.find(name)
        unit = metric.dimension.unit if metric is not None else ""
        wanted = found.wanted.get(name)
        want = "" if wanted is None else f", wanted {wording.metric_number(name, wanted, unit)}"
        if value is None:
            yield from wrapped(f"{name}{want}: no value can be reached with the others held", width, "  ")
            continue
        by = f" ({value / wanted - 1:+.1%})" if wanted else ""
        reached = wording.metric_number(name, value, unit)
        yield from wrapped(f"{name}{want}: {reached} at the best with the others held{by}", width, "  ")
    for name, value in found.reachable_with.items():
        yield from wrapped(f"reachable with {keys[name].title.lower()} {shown(keys[name], value)}", width, "  ")
    if not found.reachable_with and found.gives_way:
        yield from wrapped("no further variable that is left to choose makes it reachable", width, "  ")
