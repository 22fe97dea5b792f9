"""Two states of a project side by side: project, process file, then sheets with what was stated and what came of it.

A part can be closed, so that one goes from the project to a sheet to a value. The same rows in one list, the weightiest
first, are made by compare_list.
"""

from __future__ import annotations

from collections.abc import Collection, Iterator
from dataclasses import dataclass

from worksheet.compare.compared import Comparison, Need, Result, SheetChange
from worksheet.compare.inputs import Moved
from worksheet.report import revisions_plain, wording
from worksheet.report.table import wrapped
from worksheet.tui import rows
from worksheet.tui.pages import words
from worksheet.tui.rows import LABEL, PLAIN, QUIET, Line, Page, Row, Span, heading, line
from worksheet.tui.signs import Signs

PART, INPUT, RESULT, NEED, OTHER = "part", "input", "result", "need", "other"
"""What a row is about."""

MOST_OPEN = 6
"""Sheets up to which every part is open at first."""

_KEY = 32


@dataclass(frozen=True, slots=True)
class Look:
    """What rows are made for: the room there is, and the signs that can be shown."""

    columns: int
    signs: Signs

    @property
    def width(self) -> int:
        """Columns of one of the two states."""
        return max((self.columns - _KEY - 2) // 2, 10)


def parts(found: Comparison) -> tuple[str, ...]:
    """Names of the parts there are: the project's file, the process file, the sheets."""
    own = [title for title, moved in _own(found) if moved]
    return (*own, *(change.sheet for change in found.sheets))


def _own(found: Comparison) -> tuple[tuple[str, tuple[Moved, ...]], ...]:
    return ("Project", found.project), ("Process file", found.process)


def page(found: Comparison, closed: Collection[str], look: Look) -> Page:
    """One part a file; a row a value. Of a closed part only the heading stands."""
    made: list[Row] = []
    for title, moved in _own(found):
        if moved:
            made.append(_heading(title, title, "stated differently", (len(moved), 0), closed, look))
            if title not in closed:
                made += [stated(OTHER, title, one, look) for one in moved]
    for change in found.sheets:
        made.append(_of_sheet(change, closed, look))
        if change.sheet not in closed:
            made += _sheet(change, look)
    return Page(tuple(made) or (nothing(),), tuple(row.key for row in made if row.subject[0] == PART))


def nothing() -> Row:
    """What stands where two states are one."""
    return Row("none", (line(Span("Nothing differs.", QUIET)),), stops=False)


def _of_sheet(change: SheetChange, closed: Collection[str], look: Look) -> Row:
    through = f" through {', '.join(change.through)}" if change.through else ""
    turned = sum(one.old_verdict != one.new_verdict for one in change.results)
    count = (len(change.inputs) + len(change.results) + len(change.needed), turned)
    return _heading(change.sheet, change.sheet, change.status + through, count, closed, look)


def _heading(
    name: str, title: str, status: str, count: tuple[int, int], closed: Collection[str], look: Look
) -> Row:  # fmt: skip
    """The head of a part, which opens and closes it."""
    values, turned = count
    said = [status]
    if name in closed:
        said.append("1 value" if values == 1 else f"{values} values")
    if turned:
        said.append("1 verdict turned" if turned == 1 else f"{turned} verdicts turned")
    sign = "+" if name in closed else "-"
    made = heading(
        f"{PART}.{name}",
        look.signs.text(f"{sign} {title}"),
        look.columns,
        look.signs.across,
        look.signs.text(", ".join(said)),
    )
    return Row(made.key, made.lines, subject=(PART, name), copied=(title, ", ".join(said)))


def _sheet(change: SheetChange, look: Look) -> Iterator[Row]:
    for moved in change.inputs:
        yield stated(INPUT, change.sheet, moved, look)
    for result in change.results:
        yield _result(change.sheet, result, look)
    for need in change.needed:
        yield _need(change.sheet, need, look)


def _need(name: str, need: Need, look: Look) -> Row:
    lines = wrapped(look.signs.text(revisions_plain.needed(need)), look.columns)
    return Row(
        need_key(name, need),
        tuple(line(Span(part, QUIET)) for part in lines),
        subject=(NEED, f"{name}:{need.variable}"),
        copied=revisions_plain.need_ends(need),
    )


def need_key(name: str, need: Need) -> str:
    """The row of one end of a need."""
    return f"{NEED}.{name}.{need.variable}.{need.side}"


def stated(kind: str, name: str, moved: Moved, look: Look) -> Row:
    """What a file states differently."""
    old, new = revisions_plain.stated_ends(moved)
    text = look.signs.text
    spans = line(
        Span(text(moved.key), LABEL, _KEY), Span(text(old), QUIET, look.width), Span(text(new), PLAIN, look.width)
    )
    return Row(
        f"{kind}.{name}.{moved.key}", (spans,), subject=(kind, f"{name}:{moved.key}"), copied=(moved.key, old, new)
    )


def ends(result: Result) -> tuple[str, str]:
    """A metric before and after, in words: afterwards with its verdict, before too where that was another one.

    Where the nominal number stays, the margin says what moved.
    """
    old, new = revisions_plain.result_ends(result)
    before, after = ("" if one is None else words.verdict(one) for one in (result.old_verdict, result.new_verdict))
    room = [wording.margin(one) for one in (result.old_margin, result.new_margin)]
    if old != new or room[0] == room[1]:
        room = ["", ""]
    said = (old, before if before != after else "", room[0]), (new, after, room[1])
    return " ".join(filter(None, said[0])), " ".join(filter(None, said[1]))


def role(result: Result) -> str:
    """How the later state of a metric is set off: by its verdict, where that turned."""
    turned = result.old_verdict != result.new_verdict
    return words.VERDICT_ROLES.get(result.new_verdict or "", PLAIN) if turned else PLAIN


def copied(result: Result) -> tuple[str, ...]:
    """A metric before and after, cell by cell."""
    return result.metric, *revisions_plain.result_ends(result), result.old_verdict or "", result.new_verdict or ""


def _result(name: str, result: Result, look: Look) -> Row:
    old, new = (look.signs.text(text) for text in ends(result))
    first = line(
        Span(look.signs.text(result.metric), LABEL, _KEY),
        Span(old, QUIET, look.width),
        Span(new, role(result), look.width),
    )
    key, subject = f"{RESULT}.{name}.{result.metric}", (RESULT, f"{name}:{result.metric}")
    return Row(key, (first, *why(result, look)), subject=subject, copied=copied(result))


def why(result: Result, look: Look) -> Iterator[Line]:
    """What each input did to a target, where more than one did."""
    if result.cause is None or result.new_verdict is None or not (said := revisions_plain.caused(result)):
        return
    for part in wrapped(look.signs.text(said), look.columns - 2):
        yield Span("  "), Span(part, QUIET)


def counted(found: Comparison) -> str:
    """How much differs, in words."""
    turned = [r for sheet in found.sheets for r in sheet.results if r.old_verdict != r.new_verdict]
    worse = sum(r.new_verdict in (rows.MISSED, rows.UNKNOWN) for r in turned)
    if found.same:
        return "nothing differs"
    sheets = "1 sheet" if len(found.sheets) == 1 else f"{len(found.sheets)} sheets"
    verdicts = "1 verdict" if len(turned) == 1 else f"{len(turned)} verdicts"
    return f"{sheets}, {verdicts} turned, {worse} for the worse"


def lead(subject: tuple[str, str]) -> tuple[str, str]:
    """The sheet and the key, metric or variable that a row is about; ("", "") where it is about none."""
    kind, text = subject
    name, _, key = text.partition(":")
    return (name, key) if kind in (INPUT, RESULT, NEED) else ("", "")


def place(subject: tuple[str, str]) -> str:
    """The row of the sheet's own page that a row is about."""
    _, key = lead(subject)
    if subject[0] == NEED:
        return f"needed.{key}.0"
    return f"target.{key}" if subject[0] == RESULT else ".".join(key.split(".")[:2])
