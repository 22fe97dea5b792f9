"""The only writer to standard output: text in lines, or one JSON document."""

from __future__ import annotations

import json
import os
import shutil
import sys
from collections.abc import Iterable
from typing import Any

NARROWEST = 40
USUAL = 80


class Output:
    """Where a command's data goes.

    Attributes:
        as_json: Whether one JSON document is wanted and nothing else.
        width: Columns that text may take.
    """

    def __init__(self, as_json: bool) -> None:
        """Read the width of the terminal, 80 columns where there is none."""
        self.as_json = as_json
        self.width = max(shutil.get_terminal_size((USUAL, 24)).columns, NARROWEST) if sys.stdout.isatty() else USUAL

    def lines(self, lines: Iterable[str]) -> None:
        """Write lines of text; characters that the terminal cannot show are replaced."""
        encoding = sys.stdout.encoding or "utf-8"
        for line in lines:
            sys.stdout.write(line.encode(encoding, "replace").decode(encoding) + "\n")

    def document(self, document: dict[str, Any]) -> None:
        """Write one JSON document."""
        sys.stdout.write(json.dumps(document, ensure_ascii=True, allow_nan=False, indent=None) + "\n")


def close_quietly() -> None:
    """Give up standard output after its reader went away, so that leaving says nothing more."""
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
