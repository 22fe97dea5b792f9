"""The bytes of a table as lines of text, whatever the file is, with its digest; bounded memory.

A table comes from a bench, a simulator or a spreadsheet, so each way in which a file can fail to be one is told apart
here: missing, a folder, a device, empty, binary, UTF-16, a line without end.
"""

from __future__ import annotations

import hashlib
import os
import stat
from collections.abc import Iterator
from pathlib import Path
from typing import BinaryIO

from worksheet.model.problem import Problem
from worksheet.model.text import clean

LONGEST_LINE = 65_536
"""Longest line that is read. [bytes]"""

_MARK = b"\xef\xbb\xbf"
_UTF16 = (b"\xff\xfe", b"\xfe\xff")


class UnreadableError(Exception):
    """The file is no table of text; `problem` says why."""

    def __init__(self, problem: Problem) -> None:
        self.problem = problem
        super().__init__(str(problem))


class Lines:
    """The numbered lines of a file, read once.

    Args:
        path: The file.
        shown: What messages call it.

    Raises: UnreadableError, on opening or while reading.
    """

    def __init__(self, path: Path, shown: str) -> None:
        self.shown = shown
        self._hash = hashlib.sha256()
        self._file = _open(path, shown)

    def __iter__(self) -> Iterator[tuple[int, str]]:
        """Line number from 1, and the line without its end."""
        number = 0
        with self._file as file:
            while raw := self._read(file, number + 1):
                if number == 0:
                    raw = self._start(raw)
                for part in raw.rstrip(b"\r\n").split(b"\r"):
                    number += 1
                    yield number, self._decoded(part, number)

    @property
    def digest(self) -> str:
        """SHA-256 of what was read so far, all of the file after the last line."""
        return self._hash.hexdigest()

    def _read(self, file: BinaryIO, number: int) -> bytes:
        try:
            raw = file.readline(LONGEST_LINE + 1)
        except OSError as error:
            message = f"The file cannot be read: {_reason(error)}."
            raise UnreadableError(Problem(self.shown, None, "", message)) from None
        self._hash.update(raw)
        if b"\0" in raw and not raw.startswith(_UTF16):
            self._refuse(number, "Found binary data, expected a table of text with one line a point")
        if len(raw) > LONGEST_LINE:
            self._refuse(number, f"Found a line of more than {LONGEST_LINE} bytes, expected a table of text")
        return raw

    def _start(self, raw: bytes) -> bytes:
        if raw.startswith(_UTF16):
            self._refuse(1, "Found UTF-16 text, expected UTF-8: save the table as UTF-8 or plain CSV")
        return raw.removeprefix(_MARK)

    def _decoded(self, raw: bytes, number: int) -> str:
        try:
            return raw.decode("utf-8")
        except UnicodeDecodeError:
            text = raw.decode("latin-1")
        if any((ord(one) < 32 and one != "\t") or 127 <= ord(one) < 160 for one in text):
            self._refuse(number, "Found bytes that are not text, expected a table of text with one line a point")
        return text

    def _refuse(self, number: int, message: str) -> None:
        raise UnreadableError(Problem(self.shown, number, "", f"{message}."))


def _open(path: Path, shown: str) -> BinaryIO:
    """The file, known to be an ordinary one with something in it."""
    try:
        kind = path.stat()
        if stat.S_ISDIR(kind.st_mode):
            raise UnreadableError(Problem(shown, None, "", "Found a folder, expected a table of currents."))
        if not stat.S_ISREG(kind.st_mode):
            raise UnreadableError(Problem(shown, None, "", "Found a pipe or a device, expected an ordinary file."))
        if kind.st_size == 0:
            raise UnreadableError(Problem(shown, None, "", "Found an empty file, expected a table of currents."))
        return open(os.fspath(path), "rb")  # noqa: PTH123 - closed by __iter__; Path.open would say no more
    except FileNotFoundError:
        raise UnreadableError(Problem(shown, None, "", "The file does not exist.")) from None
    except (OSError, ValueError) as error:
        raise UnreadableError(Problem(shown, None, "", f"The file cannot be read: {_reason(error)}.")) from None


def _reason(error: Exception) -> str:
    return clean(getattr(error, "strerror", None) or str(error)).rstrip(".").lower()
