"""The only writer to standard output: text in lines, or one JSON document."""

from __future__ import annotations

import json
import os
import sys
from collections.abc import Iterable
from typing import Any

from worksheet.cli.locale import asks_for_ascii
from worksheet.model.text import plain_signs

NARROWEST = 40
USUAL = 80

_TONES = {"missed": ("\x1b[1;31m", "\x1b[0m"), "unknown": ("\x1b[33m", "\x1b[0m"), "waived": ("\x1b[36m", "\x1b[0m")}
"""Colours of verdicts that want a look (ECMA-48 SGR); the words beside them say the same."""


class Output:
    """Where a command's data goes.

    Attributes:
        as_json: Whether one JSON document is wanted and nothing else.
        width: Columns that text may take.
    """

    def __init__(self, as_json: bool) -> None:
        """Read the width of the terminal, 80 columns where there is none."""
        self.as_json = as_json
        self.width = USUAL
        if sys.stdout.isatty():
            import shutil

            self.width = max(shutil.get_terminal_size((USUAL, 24)).columns, NARROWEST)

    def lines(self, lines: Iterable[str]) -> None:
        """Write lines of text; characters that the terminal cannot show are replaced."""
        from worksheet.report.table import on, paper_for

        encoding = sys.stdout.encoding or "utf-8"
        coloured = sys.stdout.isatty() and not os.environ.get("NO_COLOR") and os.environ.get("TERM") != "dumb"
        paper = paper_for(encoding, asks_for_ascii(os.environ), _TONES if coloured else None)
        with on(paper):
            for line in lines:
                text = plain_signs(line) if paper.plain else line
                sys.stdout.write(text.encode(encoding, "replace").decode(encoding) + "\n")

    def document(self, document: dict[str, Any]) -> None:
        """Write one JSON document."""
        sys.stdout.write(json.dumps(document, ensure_ascii=True, allow_nan=False, indent=None) + "\n")


def close_quietly() -> None:
    """Give up standard output after its reader went away, so that leaving says nothing more."""
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
