"""Revisions on any screen: one value or metric over them all, one chosen to compare with, a new one recorded."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from pathlib import Path
from typing import TYPE_CHECKING

from worksheet.model.problem import Problem
from worksheet.report import revisions_plain, tracing_text
from worksheet.review.results import SheetReview
from worksheet.session import revisions, tracing
from worksheet.session.since import Since
from worksheet.tui.dialogs.form import FormDialog, FormLine
from worksheet.tui.dialogs.pick import Item, PickDialog
from worksheet.tui.dialogs.reading import ReadingDialog
from worksheet.tui.recomputed import today

if TYPE_CHECKING:
    from worksheet.tui.screens.compare import State
    from worksheet.tui.screens.place import Place

_WIDTH = 66
"""Columns of a table in a dialog."""


def trace(screen: Place, sheet: str, key: str, *, metric: bool) -> None:
    """Show one value, or one metric, over all revisions; worked out off the event loop."""
    root = screen.snapshot.project.root

    title = f"{key} of {sheet} over the revisions"

    def work() -> None:
        lines = _metric(root, sheet, key) if metric else _value(root, sheet, key)
        screen.app.call_from_thread(_read, screen, title, lines)

    screen.say("looking through the revisions...")
    screen.run_worker(work, thread=True, exclusive=True, group="tracing", exit_on_error=True)


def moved(screen: Place, result: SheetReview) -> None:
    """Show what moved since a block was accepted and since its evidence was found; looked up off the event loop."""
    root, title = screen.snapshot.project.root, f"What moved in {result.sheet.name}"

    def work() -> None:
        found = Since(root, today()).of(result)
        lines = [f"{one.past.about}: {revisions_plain.moved_since(one.revision, one.moved)}" for one in found]
        screen.app.call_from_thread(_read, screen, title, lines)

    screen.say("looking through the revisions...")
    screen.run_worker(work, thread=True, exclusive=True, group="tracing", exit_on_error=True)


def _read(screen: Place, title: str, lines: list[str]) -> None:
    if screen.is_current:
        screen.say("")
        screen.app.push_screen(ReadingDialog(title, lines, screen.book.signs))


def _value(root: Path, sheet: str, key: str) -> list[str]:
    found = tracing.value(root, sheet, key)
    if isinstance(found, Problem):
        return [found.message]
    return list(tracing_text.value_text([(one.revision, one.value, one.unit) for one in found], _WIDTH))


def _metric(root: Path, sheet: str, key: str) -> list[str]:
    found = tracing.metric(root, sheet, key, today())
    if isinstance(found, Problem):
        return [found.message]
    points = [(one.revision, one.nominal, one.worst, one.unit, one.verdict) for one in found]
    return list(tracing_text.metric_text(key, points, _WIDTH))


def choose(screen: Place) -> None:
    """Choose a revision and lay it beside the files."""
    from worksheet.tui.screens.compare import CompareScreen, State

    def done(old: State) -> None:
        screen.app.push_screen(CompareScreen(old, State()))

    choose_state(screen, "Compare with", "", done, files_too=False)


def choose_state(
    screen: Place, title: str, present: str, done: Callable[[State], None], *, files_too: bool = True
) -> None:  # fmt: skip
    """Choose a state of the project.

    Args:
        screen: The screen that asks.
        title: Of the list.
        present: The revision under the cursor at first.
        done: Gets what was chosen.
        files_too: Whether the files as they stand may be chosen.
    """
    from worksheet.tui.screens.compare import State

    root = screen.snapshot.project.root
    listed = revisions.history(root)
    if isinstance(listed, Problem):
        screen.say(listed.message, wrong=True)
        return
    if not listed:
        screen.say("Nothing has been recorded yet.", wrong=True)
        return
    states = [State()] if files_too else []
    states += [State(one.revision, one.note) for one in listed]
    states += [State(name) for name in revisions.names(root)]
    who = {one.revision: f"{one.dated[:10]}  {one.by}: " for one in listed}
    items = [
        Item(one.revision, f"{who.get(one.revision, '')}{one.note}" if one.note else one.title, one.note, one.short)
        for one in states
    ]

    def chosen(revision: str | None) -> None:
        for one in states:
            if one.revision == revision:
                done(one)

    screen.app.push_screen(PickDialog(title, items, screen.book.signs, present), chosen)


def record(screen: Place) -> None:
    """Record a revision of the project's own files, with a note."""
    root = screen.snapshot.project.root
    lines = [FormLine("note", "Note (needed)", "What changed and why.")]

    def work(note: str) -> None:
        with screen.book.writing:
            made = revisions.record(root, note, today())
        if isinstance(made, Problem):
            screen.app.call_from_thread(lambda: screen.say(made.message, wrong=True))
            return
        said = f"recorded {made.revision[:10]}" if made.revision else "nothing has changed since the newest revision"
        screen.app.call_from_thread(lambda: screen.say("; ".join([said, *made.remarks])))

    def taken(texts: Mapping[str, str]) -> str:
        if not texts["note"]:
            return "Say what changed and why."
        screen.say("recording...")
        note = texts["note"]
        screen.run_worker(lambda: work(note), thread=True, group="recording", exit_on_error=True)
        return ""

    screen.app.push_screen(FormDialog("Record a revision", lines, taken, screen.book.signs))
