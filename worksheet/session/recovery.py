"""What is being typed, kept outside the project character by character, so that a lost line costs nothing.

One file a running program, locked by it: a file that nobody holds any more is what somebody was typing when the end
came. It holds a JSON line for each state of a text; the last whole line of each place counts. Nothing but calls of the
operating system stands between a text and the disk, so that a handler of signals may keep one too.
"""

from __future__ import annotations

import contextlib
import fcntl
import hashlib
import json
import os
import secrets
from collections.abc import Iterable
from dataclasses import asdict, dataclass
from pathlib import Path

_SUFFIX = ".typing"
_PART = ".part"
_LARGEST = 64_000_000
_ROOM = 65_536
"""Bytes beyond four times the texts themselves that earlier states may take before the file is written anew."""


@dataclass(frozen=True, slots=True)
class Typing:
    """A text that was being typed.

    Attributes:
        sheet: In which sheet.
        path: At which key, dotted.
        title: What the key is called.
        text: As far as it was typed.
    """

    sheet: str
    path: str
    title: str
    text: str

    @property
    def place(self) -> tuple[str, str]:
        """Where it was typed: of each place the last text counts."""
        return self.sheet, self.path


class Journal:
    """Keeps the texts being typed in one project: of one field, or of every line of a form."""

    def __init__(self, folder: Path, root: Path) -> None:
        """Take the folder for such files and the project; nothing is written before something is typed."""
        self._folder = folder
        self._mark = hashlib.blake2b(os.fsencode(root.resolve()), digest_size=8).hexdigest()
        self._path = folder / f"{self._mark}-{secrets.token_hex(6)}{_SUFFIX}"
        self._descriptor: int | None = None
        self._lines: dict[tuple[str, str], bytes] = {}
        self._size = 0

    def keep(self, typing: Typing) -> bool:
        """Keep a state of a text. False where it could not be kept, which bars nothing."""
        line = _line(typing)
        self._lines[typing.place] = line
        try:
            if self._descriptor is None:
                self._folder.mkdir(parents=True, exist_ok=True, mode=0o700)
                self._descriptor = _locked(self._path)
            elif self._size > _ROOM + 4 * sum(map(len, self._lines.values())):
                self._anew()
                return True
            self._size += _append(self._descriptor, line)
        except OSError:
            return False
        return True

    def _anew(self) -> None:
        """Only the last state of each text, in one step."""
        assert self._descriptor is not None
        beside = self._path.with_suffix(_PART)
        descriptor = _locked(beside)
        try:
            size = _append(descriptor, b"".join(self._lines.values()))
            beside.replace(self._path)
        except OSError:
            os.close(descriptor)
            beside.unlink(missing_ok=True)
            raise
        os.close(self._descriptor)
        self._descriptor, self._size = descriptor, size

    def done(self) -> None:
        """The texts were accepted or given up."""
        self._lines.clear()
        self._size = 0
        if self._descriptor is None:
            return
        with contextlib.suppress(OSError):
            self._path.unlink()
        with contextlib.suppress(OSError):
            os.close(self._descriptor)
        self._descriptor = None

    def left(self) -> tuple[Left, ...]:
        """Texts that other runs left behind in this project; they stay until they are forgotten."""
        try:
            paths = sorted(self._folder.glob(f"{self._mark}-*{_SUFFIX}"))
        except OSError:
            return ()
        found = [Left(typing, path) for path in paths if path != self._path for typing in _held_by_nobody(path)]
        return tuple(one for one in found if one.typing.text)


@dataclass(frozen=True, slots=True)
class Left:
    """A text that was left behind, and the file that keeps it."""

    typing: Typing
    path: Path

    def forget(self) -> None:
        """It was taken over or given up; other texts of the same file stay."""
        others = [one for one in _held_by_nobody(self.path) if one.text and one.place != self.typing.place]
        with contextlib.suppress(OSError):
            if not others:
                self.path.unlink()
                return
            beside = self.path.with_suffix(_PART)
            descriptor = _locked(beside)
            try:
                _append(descriptor, b"".join(map(_line, others)))
                beside.replace(self.path)
            finally:
                os.close(descriptor)


def _line(typing: Typing) -> bytes:
    """A state on a line of its own, also after one that was cut off."""
    return f"\n{json.dumps(asdict(typing), ensure_ascii=True)}\n".encode()


def _locked(path: Path) -> int:
    """A new file that is held as long as it is open."""
    descriptor = os.open(path, os.O_CREAT | os.O_TRUNC | os.O_WRONLY | os.O_APPEND, 0o600)
    try:
        fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError:
        os.close(descriptor)
        raise
    return descriptor


def _append(descriptor: int, content: bytes) -> int:
    """Write all of it through to the disk; how much that was."""
    rest = memoryview(content)
    while rest:
        rest = rest[os.write(descriptor, rest) :]
    os.fdatasync(descriptor)
    return len(content)


def _held_by_nobody(path: Path) -> list[Typing]:
    """The last whole state of each text in a file that no running program holds."""
    try:
        with path.open("rb") as file:
            fcntl.flock(file, fcntl.LOCK_EX | fcntl.LOCK_NB)
            content = file.read(_LARGEST)
    except OSError:
        return []
    return list({one.place: one for one in _whole(content.split(b"\n"))}.values())


def _whole(lines: Iterable[bytes]) -> Iterable[Typing]:
    for line in lines:
        with contextlib.suppress(ValueError, TypeError, RecursionError):
            data = json.loads(line)
            if isinstance(data, dict) and all(isinstance(value, str) for value in data.values()):
                yield Typing(**data)
