"""Pictures of a hand-off, as SVG: the window, margins over conditions, the response, curves of fitted devices.

The only module that draws with matplotlib, which is loaded on use. Everything is told apart by shape or line as well
as by colour, and said in words beside; the same data make the same bytes.
"""

from __future__ import annotations

import io
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from typing import Any

import numpy as np

from worksheet.model.dimension import CAPACITANCE, CURRENT, FREQUENCY, LENGTH, VOLTAGE, Dimension
from worksheet.model.quantity import format_quantity
from worksheet.model.text import clean
from worksheet.report import wording
from worksheet.report.handoff.material import Block, Fit
from worksheet.report.handoff.tree import Picture
from worksheet.report.table import cut
from worksheet.solver.trials import Constraint

_WIDE, _HIGH = 7.2, 3.3
_LEGEND = 0.705
"""Where the legend begins, as a share of the width."""

_COLOURS = ("#0b4f8a", "#b3450a", "#1d6131", "#7b2d75", "#6b5300", "#0e6b72", "#7a1f2b", "#3d3d3d")
_LINES: tuple[Any, ...] = ("-", "--", "-.", ":", (0, (5, 1)), (0, (3, 1, 1, 1)), (0, (1, 1)), (0, (8, 2)))
_MARKS = "osD^vP*Xh<>"
_SETTINGS: Any = {
    "svg.fonttype": "none",
    "svg.hashsalt": "biasbook",
    "font.family": "sans-serif",
    "font.size": 8.5,
    "text.parse_math": False,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.unicode_minus": True,
    "figure.dpi": 100,
}
_LONGEST = 24
"""Characters of a name in a legend."""

_LEAST, _MOST = -1.0, 2.0
"""Margins beyond these are drawn at the edge."""


@contextmanager
def _drawn(rows: int, high: float, left: float = 0.75) -> Iterator[tuple[Any, list[Any], list[str]]]:
    """A figure with axes that leave `left` inches for their labels, and a list that its SVG is put into."""
    import matplotlib as mpl
    from matplotlib.backends.backend_svg import FigureCanvasSVG
    from matplotlib.figure import Figure

    with mpl.rc_context():
        mpl.rcdefaults()
        mpl.rcParams.update(_SETTINGS)
        figure = Figure(figsize=(_WIDE, high))  # laid out by hand: a layout engine draws everything twice
        figure.subplots_adjust(left / _WIDE, 0.5 / high, _LEGEND - 0.02, 1 - 0.12 / high, hspace=0.16)
        axes = [figure.add_subplot(rows, 1, k + 1) for k in range(rows)]
        written: list[str] = []
        yield figure, axes, written
        into = io.BytesIO()
        canvas: Any = FigureCanvasSVG(figure)
        canvas.print_svg(into, metadata={"Date": None, "Creator": None})
        written.append(into.getvalue().decode())


def _axis(axis: Any, dimension: Dimension, title: str, *, logarithmic: bool = True) -> None:
    """Ticks in engineering notation, and a title."""
    from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter

    if logarithmic:
        low, high = axis.get_view_interval()
        few = np.log10(high / low) < 2
        axis.set_major_locator(LogLocator(10, subs=(1.0, 2.0, 5.0) if few else (1.0,), numticks=12))
        axis.set_minor_formatter(NullFormatter())
    axis.set_major_formatter(FuncFormatter(lambda x, _: format_quantity(float(x), dimension, 3)))
    axis.set_label_text(title)


def _legend(axes: Any, figure: Any) -> None:
    handles, labels = axes.get_legend_handles_labels()
    if handles:
        figure.legend(handles, labels, loc="upper left", bbox_to_anchor=(_LEGEND, 1.0), frameon=False, handlelength=2.3)


def window_map(found: Block) -> Picture | None:
    """Where all targets hold over bias current and load capacitance."""
    land = found.relief
    if land is None or found.solved is None:
        return None
    x, y = land.across, land.up
    every = land.met.all(axis=0)
    lowest = land.slack.min(axis=0)
    shown = [k for k in range(len(land.constraints)) if land.met[k].any() and not land.met[k].all()]
    with _drawn(1, _HIGH) as (figure, (axes,), written):
        axes.set_xscale("log")
        axes.set_yscale("log")
        axes.set_xlim(x[0], x[-1])
        axes.set_ylim(y[0], y[-1])
        if every.any():
            axes.contourf(x, y, lowest, levels=[0.0, 1.0], colors=["#cfe3d4"])
        for order, k in enumerate(shown):
            colour, line = _COLOURS[order % len(_COLOURS)], _LINES[order % len(_LINES)]
            axes.contour(x, y, land.slack[k], levels=[0.0], colors=[colour], linestyles=[line])
            axes.plot([], [], color=colour, linestyle=line, label=_edge(land.constraints[k]))
        axes.plot([land.x.present], [land.y.present], "k+", markersize=12, label="present point")
        best = found.solved.recommended
        if best is not None:
            here = [best.values.get(v.name, v.present) for v in (land.x, land.y)]
            axes.plot([here[0]], [here[1]], "ko", markersize=6, fillstyle="none", label="recommended")
        _axis(axes.xaxis, CURRENT, "bias current")
        _axis(axes.yaxis, CAPACITANCE, "load capacitance")
        _legend(axes, figure)
    names = ", ".join(dict.fromkeys(land.constraints[k].name for k in shown)) or "nothing"
    share = f"{every.mean():.0%} of what is shown" if every.any() else "nowhere in what is shown"
    alt = (
        f"Map of bias current from {format_quantity(x[0], CURRENT, 3)} to {format_quantity(x[-1], CURRENT, 3)} and "
        f"load capacitance from {format_quantity(y[0], CAPACITANCE, 3)} to {format_quantity(y[-1], CAPACITANCE, 3)}. "
        f"Everything holds in {share}. Boundaries are drawn of {names}. The present point is at "
        f"{format_quantity(land.x.present, CURRENT, 3)} and {format_quantity(land.y.present, CAPACITANCE, 3)}."
    )
    shade = "shaded where every target holds" if every.any() else "nowhere here does every target hold"
    return Picture(written[0], clean(alt), f"Window: {shade}; a line where one just does")


def _edge(one: Constraint) -> str:
    """A boundary's name; what begins with an underscore would be left out of a legend."""
    side = "" if one.target is None else " min" if one.side == "low" else " max"
    return cut(clean(one.name).lstrip("_"), _LONGEST) + side


def margins(found: Block) -> Picture | None:
    """Every target's margin at every condition."""
    made = found.margins
    names = list(made.by_target)
    if not names:
        return None
    corners = list(dict.fromkeys(c.process for c in made.conditions))
    left = 0.25 + 0.068 * max(len(name) for name in names)
    with _drawn(1, 0.75 + 0.4 * len(names), min(left, 2.5)) as (figure, (axes,), written):
        for place, corner in enumerate(corners):
            at = [k for k, c in enumerate(made.conditions) if c.process == corner]
            points = [(v, r) for r, n in enumerate(names) for v in _of(made.by_target[n], at)]
            lift = (place - (len(corners) - 1) / 2) * 0.6 / max(len(corners), 1)
            axes.plot(
                [np.clip(v, _LEAST, _MOST) for v, _ in points],
                [r + lift for _, r in points],
                linestyle="none", marker=_MARKS[place % len(_MARKS)], markersize=4, fillstyle="none",
                color=_COLOURS[place % len(_COLOURS)], label=cut(clean(corner).lstrip("_"), _LONGEST),
            )  # fmt: skip
        axes.axvline(0.0, color="#a3131b", linewidth=1.2)
        axes.set_yticks(range(len(names)), [cut(clean(name), 34) for name in names])
        axes.set_ylim(len(names) - 0.5, -0.5)
        axes.set_xlim(_LEAST * 1.03, _MOST * 1.03)
        axes.xaxis.set_major_formatter(_per_cent())
        axes.set_xlabel("margin to the limit; left of the line the target is missed")
        axes.grid(axis="y", color="#d3d8dc", linewidth=0.6)
        _legend(axes, figure)
    least = ", ".join(f"{name} {wording.margin(_least(made.by_target[name]))}" for name in names)
    alt = f"Margins of {len(names)} targets over {len(made.conditions)} conditions. The least of each: {least}."
    return Picture(
        written[0],
        clean(alt),
        "Margins over all conditions, one mark a condition, its shape the corner; beyond the ends at the ends",
    )


def _of(values: Sequence[float] | Any, places: Sequence[int]) -> list[float]:
    return [float(values[k]) for k in places if k < len(values) and np.isfinite(values[k])]


def _least(values: Any) -> float | None:
    finite = values[np.isfinite(values)]
    return float(finite.min()) if len(finite) else None


def _per_cent() -> Any:
    from matplotlib.ticker import FuncFormatter

    return FuncFormatter(lambda x, _: f"{x:+.0%}".replace("+0%", "0%"))


def response(found: Block) -> Picture | None:
    """Gain and phase over frequency, the nominal condition over the band of all."""
    made = found.response
    if made is None:
        return None
    decibels = 20 * np.log10(made.magnitude)
    with _drawn(2, 3.7) as (figure, (upper, lower), written):
        for axes, table, title in ((upper, decibels, "gain in dB"), (lower, made.phase, "phase in degrees")):
            axes.set_xscale("log")
            axes.set_xlim(made.frequency[0], made.frequency[-1])
            low, high = table.min(axis=0), table.max(axis=0)
            axes.fill_between(made.frequency, low, high, color="#c9d7e3", linewidth=0, label="all conditions")
            axes.plot(made.frequency, table[0], color=_COLOURS[0], linewidth=1.6, label="nominal")
            axes.set_ylabel(title)
            axes.grid(color="#d3d8dc", linewidth=0.5)
            _axis(axes.xaxis, FREQUENCY, "frequency" if axes is lower else "")
        upper.tick_params(labelbottom=False)
        _legend(upper, figure)
    still = wording.metric_number("dc_gain", float(made.magnitude[0, 0]), "V/V", digits=3)
    ends = [f"{float(decibels[0, k]):.3g} dB" for k in (0, -1)]
    alt = (
        f"Gain and phase from {format_quantity(made.frequency[0], FREQUENCY, 3)} to "
        f"{format_quantity(made.frequency[-1], FREQUENCY, 3)}. At the nominal condition the gain is {still} "
        f"({ends[0]}) at the low end and {ends[1]} at the high end; the phase goes from "
        f"{float(made.phase[0, 0]):.3g} to {float(made.phase[0, -1]):.3g} degrees."
    )
    return Picture(written[0], clean(alt), "Frequency response from the input to the output")


def fit(found: Fit) -> Picture:
    """Currents of a fitted device over the gate voltage, the tables they were fitted to beside them."""
    with _drawn(1, _HIGH) as (figure, (axes,), written):
        axes.set_yscale("log")
        for place, (across, current) in enumerate(found.currents.items()):
            colour = _COLOURS[place % len(_COLOURS)]
            label = f"V_DS {format_quantity(across, VOLTAGE, 3)}"
            axes.plot(found.gate, current, color=colour, linestyle=_LINES[place % len(_LINES)], label=label)
            rows = found.measured.get(across, ())
            if rows:
                mark = _MARKS[place % len(_MARKS)]
                axes.plot(*zip(*rows, strict=True), linestyle="none", marker=mark, markersize=3, fillstyle="none",
                          color=colour, label=f"{label}, table")  # fmt: skip
        _axis(axes.xaxis, VOLTAGE, "gate-source voltage", logarithmic=False)
        _axis(axes.yaxis, CURRENT, "drain current")
        axes.grid(color="#d3d8dc", linewidth=0.5)
        _legend(axes, figure)
    error = found.stated.get("rms_log_error")
    off = f"; the fit is off by {error:.2%} (root mean square)" if isinstance(error, float) else ""
    span = [format_quantity(float(v), VOLTAGE, 3) for v in (found.gate[0], found.gate[-1])]
    alt = (
        f"Drain current of {found.device} over the gate-source voltage from {span[0]} to {span[1]}, at "
        f"{len(found.currents)} drain-source voltages{off}. Tables are drawn for {len(found.measured)} of them."
    )
    width, length = (format_quantity(x, LENGTH, 3) for x in (found.width, found.length))
    return Picture(written[0], clean(alt), clean(f"{found.device}: curves of its parameters, W {width}, L {length}"))
