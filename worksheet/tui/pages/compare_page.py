"""Two states of a project side by side: project, process file, then sheets with what was stated and what came of it."""

from __future__ import annotations

from collections.abc import Iterator

from worksheet.compare.compared import Comparison, Result, SheetChange
from worksheet.compare.inputs import Moved
from worksheet.report import revisions_plain, wording
from worksheet.report.table import wrapped
from worksheet.tui import rows
from worksheet.tui.pages import words
from worksheet.tui.rows import LABEL, PLAIN, QUIET, Line, Page, Row, Span, heading, line
from worksheet.tui.signs import Signs

_KEY = 32
_INPUT, _RESULT, _OTHER = "input", "result", "other"


def page(found: Comparison, columns: int, signs: Signs) -> Page:
    """One section a file; a row a value."""
    made: list[Row] = []
    width = max((columns - _KEY - 2) // 2, 10)
    for title, moved in (("Project", found.project), ("Process file", found.process)):
        if moved:
            made.append(heading(f"part.{title}", title, columns, signs.across))
            made += [_stated(_OTHER, title, one, width, signs) for one in moved]
    for change in found.sheets:
        made += _sheet(change, columns, width, signs)
    if not made:
        made = [Row("none", (line(Span("Nothing differs.", QUIET)),), stops=False)]
    return Page(tuple(made), tuple(row.key for row in made if not row.stops))


def _sheet(change: SheetChange, columns: int, width: int, signs: Signs) -> Iterator[Row]:
    through = f" through {', '.join(change.through)}" if change.through else ""
    note = signs.text(change.status + through)
    yield heading(f"part.{change.sheet}", signs.text(change.sheet), columns, signs.across, note)
    for moved in change.inputs:
        yield _stated(_INPUT, change.sheet, moved, width, signs)
    for result in change.results:
        yield _result(change.sheet, result, columns, width, signs)
    for need in change.needed:
        text = signs.text(revisions_plain.needed(need))
        yield Row(f"need.{change.sheet}.{need.variable}.{need.side}", (line(Span(text, QUIET)),), copied=(text,))


def _stated(kind: str, name: str, moved: Moved, width: int, signs: Signs) -> Row:
    old, new = (revisions_plain.shown(value, moved.unit) for value in (moved.old, moved.new))
    cells = (moved.key, old, new)
    spans = line(Span(signs.text(moved.key), LABEL, _KEY), *_pair(old, new, width, signs))
    return Row(f"{kind}.{name}.{moved.key}", (spans,), subject=(kind, f"{name}:{moved.key}"), copied=cells)


def _pair(old: str, new: str, width: int, signs: Signs) -> tuple[Span, ...]:
    return Span(signs.text(old), QUIET, width), Span(signs.text(new), PLAIN, width)


def _result(name: str, result: Result, columns: int, width: int, signs: Signs) -> Row:
    old, new = (wording.metric_number(result.metric, value, result.unit) for value in (result.old, result.new))
    turned = result.old_verdict != result.new_verdict
    cells = (result.metric, old, new, result.old_verdict or "", result.new_verdict or "")
    verdicts = [
        Span("" if one is None else words.verdict(one), words.VERDICT_ROLES.get(one or "", PLAIN))
        for one in (result.old_verdict, result.new_verdict)
    ]
    first = line(
        Span(signs.text(result.metric), LABEL, _KEY),
        Span(signs.text(f"{old} {verdicts[0].text}" if turned else old), QUIET, width),
        Span(signs.text(f"{new} {verdicts[1].text}"), verdicts[1].role if turned else PLAIN, width),
    )
    lines: list[Line] = [first]
    if result.cause is not None and result.new_verdict is not None:
        said = revisions_plain.caused(result)
        lines += [(Span("  "), Span(part, QUIET)) for part in wrapped(signs.text(said), columns - 2)] if said else []
    return Row(
        f"{_RESULT}.{name}.{result.metric}", tuple(lines), subject=(_RESULT, f"{name}:{result.metric}"), copied=cells
    )


def counted(found: Comparison) -> str:
    """How much differs, in words."""
    turned = [r for sheet in found.sheets for r in sheet.results if r.old_verdict != r.new_verdict]
    worse = sum(r.new_verdict in (rows.MISSED, rows.UNKNOWN) for r in turned)
    sheets = "1 sheet differs" if len(found.sheets) == 1 else f"{len(found.sheets)} sheets differ"
    verdicts = "1 verdict" if len(turned) == 1 else f"{len(turned)} verdicts"
    return f"{sheets}, {verdicts} turned, {worse} of them for the worse"


def lead(subject: tuple[str, str]) -> tuple[str, str]:
    """The sheet and the key or metric that a row is about; ("", "") where it is about none."""
    kind, text = subject
    name, _, key = text.partition(":")
    return (name, key) if kind in (_INPUT, _RESULT) else ("", "")
