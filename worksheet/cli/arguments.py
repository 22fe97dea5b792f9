"""Kinds of arguments that several commands take."""

from __future__ import annotations

import argparse
from collections.abc import Callable

_LONGEST = 18


def count(most: int, what: str) -> Callable[[str], int]:
    """Reads a whole number from 1 on.

    Args:
        most: The greatest.
        what: Of what, for the message.
    """

    def read(text: str) -> int:
        if not (text.isascii() and text.isdecimal() and len(text) <= _LONGEST and 1 <= int(text) <= most):
            raise argparse.ArgumentTypeError(f"found {text!r}, expected 1 to {most} {what}")
        return int(text)

    return read
