"""The stages as a designer reads them in a terminal."""

from __future__ import annotations

from collections.abc import Iterator

from worksheet.model import metrics
from worksheet.report import algebra_text, stages_plain
from worksheet.report.table import Column, Table, can_show, lines, wrapped
from worksheet.stages.stage import Stage

_INDENT = "  "


def listed(stages: tuple[Stage, ...], width: int) -> Iterator[str]:
    """Every stage in a few lines."""
    for stage in stages:
        held = ", ".join(stages_plain.held(stage))
        yield from wrapped(
            f"{stage.key}: {stage.drive} driven, {stages_plain.watched(stage)} watched, {held} held", width
        )
        yield from wrapped(stage.purpose, width, _INDENT)
    yield ""
    yield from wrapped("`biasbook stages STAGE` shows one with its metrics and formulas.", width)


def one(stage: Stage, width: int) -> Iterator[str]:
    """Everything about one stage."""
    yield f"{stage.title} ({stage.key})"
    yield from wrapped(stage.purpose, width, _INDENT)
    yield ""
    yield from wrapped("Drawn with n-channel devices; a p-channel stage is the mirror image about the supply.", width)
    for device in stage.transistors:
        yield from wrapped(stages_plain.line_of(device), width, _INDENT)
    polarity = "the same polarity" if stage.source_output else "the other polarity"
    yield from wrapped(
        f"bias: ideal, or a transistor of {polarity} from the output to {stage.bias.source}", width, _INDENT
    )
    yield ""
    yield "Its sheet"
    for title, names in (
        ("[choose]", [key.name for key in stage.design_keys(ideal_bias=False)]),
        ("[assume]", [key.name for key in stage.assumption_keys("source")]),
    ):
        yield from wrapped(f"{title} {', '.join(names)}", width, _INDENT)
    if stage.one_level:
        yield from wrapped(f"of {' and '.join(stage.levels)} one at the most", width, _INDENT)
    yield ""
    yield "Its metrics"
    columns = (Column("metric"), Column("unit"), Column("symbol"), Column("relation", wraps=True))
    found = [m for m in metrics.all_metrics() if stage.absent_metric(m.key) is None]
    rows = tuple((m.key, m.dimension.unit or "-", m.symbol, m.relation) for m in found)
    yield from lines(Table(columns, rows), width, _INDENT)
    for absent in dict.fromkeys(stage.absent_metric(m.key) for m in metrics.all_metrics()):
        if absent is not None:
            yield from wrapped(f"not here: {absent}", width, _INDENT)
    yield ""
    yield "Its formulas"
    yield from algebra_text.stage(stage, width, use_unicode=can_show(algebra_text.DRAWN))
