"""Narration on standard error, and what a command's exit status means."""

from __future__ import annotations

import os
import sys
from collections.abc import Iterable
from enum import IntEnum

from worksheet.cli.locale import asks_for_ascii
from worksheet.model.problem import Problem
from worksheet.model.text import clean, plain_signs


class Status(IntEnum):
    """Exit status of every command."""

    FINE = 0
    NOT_MET = 1
    BAD_INPUT = 2


def say(text: str) -> None:
    """One line on standard error, control characters taken out."""
    encoding = sys.stderr.encoding or "utf-8"
    text = clean(text)
    if asks_for_ascii(os.environ) or not encoding.lower().replace("-", "").startswith("utf"):
        text = plain_signs(text)
    sys.stderr.write(text.encode(encoding, "replace").decode(encoding) + "\n")


def tell(problems: Iterable[Problem]) -> None:
    """One readable message a problem."""
    for problem in problems:
        say(f"biasbook: {problem}")
