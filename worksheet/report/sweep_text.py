"""A sweep drawn for a terminal, and as rows of a table in SI units."""

from __future__ import annotations

from collections.abc import Iterator
from math import isfinite
from typing import Any

from worksheet.model.quantity import format_quantity
from worksheet.report import wording
from worksheet.report.chart import Marks, chart, scale_of
from worksheet.report.table import wrapped
from worksheet.review.sweep import Curve, Sweep
from worksheet.review.swept import Axis
from worksheet.solver.goals import limits

HEIGHT = 14
_DIGITS = 3
NOMINAL, WORST = "*", "o"


def text(found: Sweep, title: str, width: int, height: int = HEIGHT) -> Iterator[str]:
    """Lines of a sweep, one drawing a metric.

    Args:
        found: The sweep.
        title: The sheet's name.
        width: Columns of the terminal.
        height: Rows of each drawing.
    """
    axis = found.axis
    ends = f"{value(axis, float(found.values[0]))} to {value(axis, float(found.values[-1]))}"
    scale = "equal ratios" if found.logarithmic else "equal steps"
    yield from wrapped(f"{title}: {axis.name} from {ends}, {len(found.values)} points, {scale}", width)
    yield from wrapped(f"present: {value(axis, axis.present)}", width)
    for curve in found.curves:
        yield ""
        yield from drawing(found, curve, width, height)
    if found.invalid.any():
        yield ""
        count = int((found.invalid > 0).sum())
        yield from wrapped(
            f"not valid somewhere at {count} of {len(found.values)} points; least, greatest and worst leave those "
            "conditions out",
            width,
        )
    yield ""
    yield from wrapped(wording.STANDING, width)


def drawing(found: Sweep, curve: Curve, width: int, height: int) -> Iterator[str]:
    """One metric along the sweep, with its target as a line and the present value as another."""
    yield from wrapped(heading(curve), width)
    sides = [curve.worst] if curve.target is not None else [curve.low, curve.high]
    wanted = [] if curve.target is None else [limit for limit in limits(curve.target) if limit is not None]
    every = [float(v) for values in (curve.nominal, *sides) for v in values if isfinite(v)]
    if not every:
        yield f"  no number: {curve.reasons[0] or 'not a number'}"
        return
    x, xs = scale_of(found.values.tolist(), logarithmic=found.logarithmic, margin=0.0), found.values.tolist()
    marks = [Marks(WORST, "worst", xs, side.tolist(), joined=True) for side in sides]
    marks.append(Marks(NOMINAL, "nominal", xs, curve.nominal.tolist(), joined=True))
    words = (lambda v: value(found.axis, v), lambda v: number(curve, v))
    yield from chart(marks, x, scale_of([*every, *wanted]), words, (width, height), wanted, found.axis.present)
    yield from wrapped(signs(curve), width)
    said = passage(found, curve)
    if said:
        yield from wrapped(said, width)


def heading(curve: Curve) -> str:
    """What a drawing shows: the metric, and what is wanted of it."""
    return curve.name if curve.target is None else f"{curve.name}, wanted {wording.limits(curve.target, curve.unit)}"


def signs(curve: Curve) -> str:
    """What the signs of a drawing mean."""
    worst = "least and greatest of all conditions" if curve.target is None else "worst of all conditions"
    if curve.target is not None and curve.target.at == "nominal":
        worst = "the same, as the target asks for the nominal condition alone"
    line = "" if curve.target is None else "; - the target"
    return f"{NOMINAL} nominal; {WORST} {worst}{line}; | present"


def passage(found: Sweep, curve: Curve) -> str:
    """Where along the sweep the target is met, by its points; "" without a target."""
    if curve.met is None:
        return ""
    met = curve.met.tolist()
    if all(met):
        return "met at every point"
    if not any(met):
        return "met at no point"
    runs, start = [], None
    for k, good in enumerate([*met, False]):
        if good and start is None:
            start = k
        elif not good and start is not None:
            first, last = (value(found.axis, float(found.values[place])) for place in (start, k - 1))
            runs.append(first if first == last else f"{first} to {last}")
            start = None
    return f"met at the points {', '.join(runs)}"


def value(axis: Axis, number: float) -> str:
    """A value of the axis as it is written."""
    if axis.key.dimension is not None:
        return format_quantity(number, axis.key.dimension, _DIGITS)
    return wording.number(number, axis.unit, digits=_DIGITS)


def number(curve: Curve, number: float) -> str:
    """A value of a curve as it is written."""
    return wording.metric_number(curve.name, number, curve.unit, digits=_DIGITS)


def rows(found: Sweep) -> Iterator[list[Any]]:
    """Heading and rows of a table in SI units; None for a number that does not exist."""
    head = [_titled(found.axis.name, found.axis.unit)]
    for curve in found.curves:
        head += [_titled(f"{curve.name} {part}", curve.unit) for part in ("nominal", "low", "high")]
        if curve.target is not None:
            head += [_titled(f"{curve.name} worst", curve.unit), f"{curve.name} met"]
            head += [_titled(f"{curve.name} {side}", curve.unit) for side in ("min", "max")]
    yield [*head, "points not valid"]
    for k, here in enumerate(found.values.tolist()):
        row: list[Any] = [here]
        for curve in found.curves:
            row += [finite(values[k]) for values in (curve.nominal, curve.low, curve.high)]
            if curve.target is not None and curve.met is not None:
                row += [finite(curve.worst[k]), "yes" if curve.met[k] else "no"]
                row += [curve.target.minimum, curve.target.maximum]
        yield [*row, int(found.invalid[k])]


def _titled(name: str, unit: str) -> str:
    return f"{name} [{unit}]" if unit else name


def finite(number: float) -> float | None:
    """A number for JSON and CSV: None where there is none."""
    return float(number) if isfinite(number) else None


def document(found: Sweep, sheet: str) -> dict[str, Any]:
    """A sweep as data, in SI units."""
    axis = found.axis
    return {
        "schema": 1,
        "sheet": sheet,
        "of": {"name": axis.name, "unit": axis.unit, "present": axis.present},
        "logarithmic": found.logarithmic,
        "values": found.values.tolist(),
        "conditions": found.every,
        "not_valid": found.invalid.tolist(),
        "curves": [_plain(curve) for curve in found.curves],
        "problems": [],
    }


def _plain(curve: Curve) -> dict[str, Any]:
    target = curve.target
    plain: dict[str, Any] = {
        "metric": curve.name,
        "unit": curve.unit,
        "min": None if target is None else target.minimum,
        "max": None if target is None else target.maximum,
        **{part: [finite(v) for v in getattr(curve, part)] for part in ("nominal", "low", "high")},
        "worst": None if target is None else [finite(v) for v in curve.worst],
        "met": None if curve.met is None else curve.met.tolist(),
    }
    if any(curve.reasons):
        plain["reasons"] = list(curve.reasons)
    return plain
