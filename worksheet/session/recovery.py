"""What is being typed, kept outside the project character by character, so that a lost line costs nothing.

One file a running program, locked by it: a file that nobody holds any more is what somebody was typing when the end
came. It holds one JSON line for each state of the text; the last whole line counts.
"""

from __future__ import annotations

import contextlib
import fcntl
import hashlib
import json
import os
import secrets
from dataclasses import asdict, dataclass
from pathlib import Path

_SUFFIX = ".typing"
_LARGEST = 4_000_000


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


class Journal:
    """Keeps the text being typed in one project."""

    def __init__(self, folder: Path, root: Path) -> None:
        """Take the folder for such files and the project; nothing is written before something is typed."""
        self._folder = folder
        self._mark = hashlib.blake2b(str(root.resolve()).encode("utf-8", "replace"), digest_size=8).hexdigest()
        self._descriptor: int | None = None
        self._path: Path | None = None

    def keep(self, typing: Typing) -> bool:
        """Keep a state of the text. False where it could not be kept, which bars nothing."""
        line = (json.dumps(asdict(typing), ensure_ascii=True) + "\n").encode()
        try:
            if self._descriptor is None:
                self._open()
            assert self._descriptor is not None
            os.write(self._descriptor, line)
            os.fdatasync(self._descriptor)
        except OSError:
            return False
        return True

    def _open(self) -> None:
        self._folder.mkdir(parents=True, exist_ok=True, mode=0o700)
        self._path = self._folder / f"{self._mark}-{secrets.token_hex(6)}{_SUFFIX}"
        self._descriptor = os.open(self._path, os.O_CREAT | os.O_EXCL | os.O_WRONLY | os.O_APPEND, 0o600)
        fcntl.flock(self._descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)

    def done(self) -> None:
        """The text was accepted or given up."""
        if self._descriptor is None or self._path is None:
            return
        with contextlib.suppress(OSError):
            self._path.unlink()
        with contextlib.suppress(OSError):
            os.close(self._descriptor)
        self._descriptor = self._path = None

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
        """It was taken over or given up."""
        with contextlib.suppress(OSError):
            self.path.unlink()


def _held_by_nobody(path: Path) -> list[Typing]:
    """The last whole line of a file that no running program holds."""
    try:
        with path.open("rb") as file:
            fcntl.flock(file, fcntl.LOCK_EX | fcntl.LOCK_NB)
            content = file.read(_LARGEST)
    except OSError:
        return []
    for line in reversed(content.split(b"\n")):
        with contextlib.suppress(ValueError, TypeError):
            data = json.loads(line)
            if isinstance(data, dict) and all(isinstance(value, str) for value in data.values()):
                return [Typing(**data)]
    return []
