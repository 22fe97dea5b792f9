"""Copying out: through the terminal (OSC 52, which also works over SSH) or into a file beside the user's settings."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from worksheet.model.text import clean
from worksheet.tui.rows import Page, Row

if TYPE_CHECKING:
    from worksheet.tui.screens.place import Place

FILE = "copied.tsv"
"""In the folder of what is remembered between runs; holds what was copied last."""


def row_text(row: Row) -> str:
    """A row's cells between tabs."""
    return "\t".join(clean(cell) for cell in row.copied)


def page_text(page: Page) -> str:
    """All rows that have cells."""
    return "\n".join(row_text(row) for row in page.rows if row.copied)


def ask(screen: Place) -> None:
    """Ask what to copy and where to, and do it."""
    from worksheet.tui.dialogs.ask import AskDialog

    ledger = screen.ledger
    row, field, page = ledger.row, ledger.field, ledger.page
    texts = {"t": page_text(page)}
    answers = {"t": "the table, to the clipboard", "f": f"the table, into {screen.book.terminal.state / FILE}"}
    if row is not None and row.copied:
        texts["r"], answers["r"] = row_text(row), "the row, to the clipboard"
        number = field.text if field is not None and field.text else row.copied[min(1, len(row.copied) - 1)]
        texts["n"], answers["n"] = number, f"the value: {number}"
    texts["f"] = texts["t"]

    def done(letter: str | None) -> None:
        if letter == "f":
            screen.say(into_file(screen.book.terminal.state / FILE, texts["f"]))
        elif letter is not None:
            screen.app.copy_to_clipboard(texts[letter])
            screen.say(f"copied: {' '.join(texts[letter].split())[:60]}")

    screen.app.push_screen(AskDialog("Copy", "What is to be copied?", answers, screen.book.signs), done)


def into_file(path: Path, text: str) -> str:
    """Write what was copied; says where it lies, or why it does not."""
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text + "\n", "utf-8")
    except OSError as error:
        return f"{path} cannot be written: {error.strerror}"
    return f"written to {path}"
