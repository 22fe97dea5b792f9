"""Taking turns: of two programs that have one book open, one writes at a time."""

from __future__ import annotations

import contextlib
import fcntl
import os
import time
from collections.abc import Iterator
from pathlib import Path

_TRIES = 100
_PAUSE = 0.01
"""[s]"""


@contextlib.contextmanager
def turn(root: Path) -> Iterator[bool]:
    """Wait until no other session reads and writes in this folder, a second at most; whether it is ours then.

    The lock hangs on the folder itself and leaves nothing behind. Where the disk knows no locks, or whoever holds it
    was stopped, the comparison with what was read still guards every file.
    """
    try:
        descriptor = os.open(root, os.O_RDONLY | os.O_DIRECTORY)
    except OSError:
        yield False
        return
    try:
        yield _held(descriptor)
    finally:
        os.close(descriptor)


def _held(descriptor: int) -> bool:
    for _ in range(_TRIES):
        try:
            fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except BlockingIOError:
            time.sleep(_PAUSE)
        except OSError:
            return False
        else:
            return True
    return False
