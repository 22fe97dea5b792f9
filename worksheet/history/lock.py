"""The lock on the user's index, and what a record has in hand while it holds it.

git locks its index by making `index.lock`; whoever finds it there gives up. A record holds that lock until the branch
has moved, since otherwise a commit made at the same moment would carry the old index and undo what was recorded. The
lock says whose it is and is kept under a lock of the operating system, which ends with its holder: so one that was left
behind by a killed program is told from one that is in use, and whatever the killed program had half done is settled.

The order is: the new index, then the branch. Killed in between, the record is simply staged; the other way round the
next commit would silently take it back.
"""

from __future__ import annotations

import fcntl
import hashlib
import os
import re
import shutil
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from types import TracebackType
from typing import Self

from worksheet.history.outcome import RefusedError, Why
from worksheet.model.text import clean

_TRIES = 50
_PAUSE = 0.01  # [s]
_LINGER = 60.0  # a folder in hand that is younger may be in the making [s]
_MAGIC = b"biasbook record\n"
_FOLDER = "biasbook-record-"
_LEFT_BEHIND = re.compile(rb"biasbook record\n(biasbook-record-[\w-]+)\n")
_LONGEST = 200  # what is read of a lock that may be anything [bytes]


class Work:
    """One record's folder beside the index, gone when it is left, and the lock that it may take.

    Args:
        index: The user's index; need not exist.
        head: Tells the present revision; decides whether a record that was cut off had been made.

    Attributes:
        folder: For whatever the record needs in files.
        remarks: What was settled of others that were cut off, for people.
    """

    def __init__(self, index: Path, head: Callable[[], str | None]) -> None:
        self.index = index
        self.remarks: list[str] = []
        self._head = head
        self._place = index.with_name(f"{index.name}.lock")
        self._held = False

    def __enter__(self) -> Self:
        """Make the folder and what will be the lock."""
        try:
            self.folder = Path(tempfile.mkdtemp(prefix=_FOLDER, dir=self.index.parent))
            self._ticket = self.folder / "lock"
            self.descriptor = os.open(self._ticket, os.O_RDWR | os.O_CREAT | os.O_EXCL | os.O_CLOEXEC, 0o666)
            os.write(self.descriptor, _MAGIC + self.folder.name.encode() + b"\n")
        except OSError as error:
            message = f"Nothing can be written beside the index of the repository: {(error.strerror or '').lower()}."
            raise RefusedError(Why.FAILED, message) from None
        _claim(self.descriptor)
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Settle what was begun, give the lock back and remove the folder.

        Raises: RefusedError, where git does not answer; lock and folder then stay for the next record to settle.
        """
        try:
            if self._held and self.holds():
                _settle(self.folder, self.index, self._head)
                self._place.unlink(missing_ok=True)
        finally:
            os.close(self.descriptor)
        shutil.rmtree(self.folder, ignore_errors=True)

    def take(self) -> None:
        """Take the lock, waiting a little for another program.

        Raises: RefusedError, where it stays taken.
        """
        for attempt in range(_TRIES):
            try:
                os.link(self._ticket, self._place)
            except FileExistsError:
                if not self._recover():
                    time.sleep(_PAUSE if attempt + 1 < _TRIES else 0.0)
                continue
            except OSError:
                if not self._take_without_links():
                    time.sleep(_PAUSE)
                    continue
            self._held = True
            self._sweep()
            return
        message = (
            f"Another program is at work in this repository: it holds {clean(str(self._place))}. Try again when it has"
            " finished; if none is running, it was cut off, and that file may be deleted."
        )
        raise RefusedError(Why.LOCKED, message)

    def _take_without_links(self) -> bool:
        """Take the lock on a file system that knows no second name for a file."""
        try:
            descriptor = os.open(self._place, os.O_RDWR | os.O_CREAT | os.O_EXCL | os.O_CLOEXEC, 0o666)
        except FileExistsError:
            return self._recover() and False
        os.write(descriptor, _MAGIC + self.folder.name.encode() + b"\n")
        _claim(descriptor)
        os.close(self.descriptor)
        self.descriptor = descriptor
        return True

    def holds(self) -> bool:
        """Whether the lock is still there and ours; somebody may have deleted it by hand."""
        try:
            found, own = self._place.stat(), os.fstat(self.descriptor)
        except OSError:
            return False
        return (found.st_dev, found.st_ino) == (own.st_dev, own.st_ino)

    def switch(self, new: Path, commit: str) -> None:
        """Put a new index in place of the user's; taken back on the way out unless the branch reached the commit.

        Args:
            new: The new index, in the folder.
            commit: What the branch is about to be moved to.

        Raises: RefusedError, where the lock is no longer ours.
        """
        if not self.holds():
            message = "The lock on the repository's index was removed by somebody else; nothing was recorded."
            raise RefusedError(Why.LOCKED, message)
        descriptor = os.open(new, os.O_RDONLY)
        try:
            os.fsync(descriptor)
        finally:
            os.close(descriptor)
        old = self.folder / "old"
        if self.index.exists() and not old.exists():
            shutil.copy2(self.index, old)
            new.chmod(self.index.stat().st_mode & 0o777)
        (self.folder / "commit").write_text(f"{commit} {_digest(new)}\n", "ascii")
        new.replace(self.index)

    def _recover(self) -> bool:
        """Settle and remove a lock that a killed record left behind; whether there was one."""
        try:
            descriptor = os.open(self._place, os.O_RDWR | os.O_NOFOLLOW | os.O_CLOEXEC | os.O_NONBLOCK)
        except OSError:
            return False
        try:
            found = _LEFT_BEHIND.fullmatch(os.read(descriptor, _LONGEST))
            if found is None or not _claim(descriptor):
                return False
            here, held = self._place.stat(), os.fstat(descriptor)
            if (here.st_dev, here.st_ino) != (held.st_dev, held.st_ino):
                return False
            folder = self.index.parent / found[1].decode()
            _settle(folder, self.index, self._head)
            self._place.unlink()
            shutil.rmtree(folder, ignore_errors=True)
        except OSError:
            return False
        finally:
            os.close(descriptor)
        self.remarks.append("A record that had been cut off earlier was cleared away.")
        return True

    def _sweep(self) -> None:
        """Remove the folders of killed records whose lock somebody deleted by hand."""
        now = self.folder.stat().st_mtime
        for folder in self.index.parent.glob(f"{_FOLDER}*"):
            try:
                if folder == self.folder or now - folder.stat().st_mtime < _LINGER:
                    continue
                descriptor = os.open(folder / "lock", os.O_RDWR | os.O_NOFOLLOW | os.O_CLOEXEC)
            except FileNotFoundError:
                shutil.rmtree(folder, ignore_errors=True)
                continue
            except OSError:
                continue
            try:
                if _claim(descriptor):
                    shutil.rmtree(folder, ignore_errors=True)
            finally:
                os.close(descriptor)


def _settle(folder: Path, index: Path, head: Callable[[], str | None]) -> None:
    """Put the user's index back where a new one was put in its place and the branch never moved."""
    try:
        commit, digest = (folder / "commit").read_text("ascii").split()
    except (OSError, ValueError):
        return
    if head() == commit or _digest(index) != digest:
        return
    old = folder / "old"
    if old.exists():
        old.replace(index)
    else:
        index.unlink(missing_ok=True)


def _digest(file: Path) -> str:
    try:
        return hashlib.sha256(file.read_bytes()).hexdigest()
    except FileNotFoundError:
        return ""


def _claim(descriptor: int) -> bool:
    """Take the operating system's lock on an open file; False where somebody has it, or where there are none."""
    try:
        fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError:
        return False
    return True
