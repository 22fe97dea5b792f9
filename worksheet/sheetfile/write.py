"""Files out, so that neither a crash nor a colleague's edit in the meantime can lose a line.

A new content is written beside the file, flushed to the disk and put in its place in one step; whoever reads the file
sees the old text or the new one. What changes inside the text is the business of `edit`.
"""

from __future__ import annotations

import contextlib
import errno
import os
import secrets
import stat
from collections.abc import Iterator
from pathlib import Path

from worksheet.model.problem import Problem
from worksheet.model.text import clean
from worksheet.sheetfile.document import WriteRefusedError
from worksheet.sheetfile.names import sheet_name_problem
from worksheet.sheetfile.paths import inside
from worksheet.sheetfile.source import LARGEST, load

_ORDINARY = 0o666


class ChangedOnDiskError(WriteRefusedError):
    """The file is no longer what was read; nothing was written. str() is a sentence."""


def save(path: Path, *, read: bytes, new: str, root: Path) -> bytes:
    """Put a new text in the place of the one that was read, keeping the file's mode.

    Args:
        path: The file; where it is a link, what it points to is written.
        read: Its content when it was read.
        new: Its new text, byte-order mark and line ends included.
        root: The folder that links may not lead out of.

    Returns: what was written, which is what the next `save` must be given as read.
    Raises: ChangedOnDiskError; WriteRefusedError where the path leads out of the root, the text is too long for a
        reader, or the system refuses.
    """
    content = _encoded(path, new)
    with _sentences(path):
        target = _within(path, root)
        present = load(target, str(path))
        if isinstance(present, Problem) or present != read:
            raise ChangedOnDiskError(f"{_shown(path)} was changed by something else since it was read; read it again.")
        if content != read:
            _replace(target, content, target.stat())
    return content


def create(path: Path, text: str, *, root: Path, mode: int | None = None) -> bytes:
    """Write a file that does not exist yet, and its folder where that is missing.

    Args:
        path: The file.
        text: Its text.
        root: The folder that it must lie in.
        mode: Its permissions; None for the usual ones.

    Returns: what was written.
    Raises: WriteRefusedError, where something stands there already, the path leads out of the root, or the system
        refuses.
    """
    content = _encoded(path, text)
    with _sentences(path):
        target = _within(path, root)
        target.parent.mkdir(parents=True, exist_ok=True)
        beside = _write_beside(target, content, _ORDINARY if mode is None else mode)
        try:
            if mode is not None:
                beside.chmod(mode)
            _put_new(beside, target)
        finally:
            beside.unlink(missing_ok=True)
        _flush_folder(target.parent)
    return content


def put(path: Path, content: bytes, *, root: Path) -> None:
    """Put a file that no reader of sheets will read, of any length, in its place; what stood there is replaced.

    Whether that may be is for the caller to know.

    Raises: WriteRefusedError, where the path leads out of the root or the system refuses.
    """
    with _sentences(path):
        target = _within(path, root)
        if target.exists():
            _replace(target, content, target.stat())
            return
        beside = _write_beside(target, content, _ORDINARY)
        try:
            _put_new(beside, target)
        finally:
            beside.unlink(missing_ok=True)
        _flush_folder(target.parent)


def remove(path: Path, *, read: bytes, root: Path) -> None:
    """Take a file away that is still what was read. A link is taken away, not what it points to.

    Raises: ChangedOnDiskError; WriteRefusedError as `save`.
    """
    with _sentences(path):
        _within(path, root)
        if load(path, str(path)) != read:
            raise ChangedOnDiskError(f"{_shown(path)} was changed by something else since it was read; it stays.")
        path.unlink()
        _flush_folder(path.parent)


def rename_sheet(path: Path, name: str, *, read: bytes, root: Path) -> Path:
    """Give a sheet another name. Formulas of other sheets that name it are for the caller to change.

    Args:
        path: The sheet.
        name: Its new name.
        read: Its content when it was read.
        root: The project.

    Returns: the new path.
    Raises: ChangedOnDiskError; WriteRefusedError where the name cannot be one, or another sheet has it.
    """
    wrong = sheet_name_problem(name)
    if wrong:
        raise WriteRefusedError(wrong)
    target = path.with_name(f"{name}{path.suffix}")
    with _sentences(path):
        _within(path, root)
        if load(path, str(path)) != read:
            raise ChangedOnDiskError(f"{_shown(path)} was changed by something else since it was read; it stays.")
        if target.exists() and target.samefile(path) and target.name != path.name:
            path.rename(target)  # only the case of letters changes, on a disk that does not tell them apart
        else:
            _put_new(path, target)
            path.unlink()
        _flush_folder(path.parent)
    return target


def _encoded(path: Path, text: str) -> bytes:
    try:
        content = text.encode("utf-8")
    except UnicodeEncodeError:
        raise WriteRefusedError(f"{_shown(path)} would hold characters that UTF-8 cannot write.") from None
    if len(content) > LARGEST:
        raise WriteRefusedError(f"{_shown(path)} would hold {len(content)} bytes, and at most {LARGEST} are read.")
    return content


def _within(path: Path, root: Path) -> Path:
    """The file that a path stands for, known to lie in the root."""
    if not inside(root, path):
        raise WriteRefusedError(f"{_shown(path)} leads out of the project; it is not written.")
    return path.resolve()


def _replace(target: Path, content: bytes, status: os.stat_result) -> None:
    """Put content in the place of a file, with its mode and, where the system lets us, its owner and group."""
    beside = _write_beside(target, content, stat.S_IMODE(status.st_mode))
    try:
        with contextlib.suppress(OSError):
            os.chown(beside, status.st_uid, status.st_gid)
        beside.chmod(stat.S_IMODE(status.st_mode))
        beside.replace(target)
    except BaseException:
        beside.unlink(missing_ok=True)
        raise
    _flush_folder(target.parent)


def _put_new(source: Path, target: Path) -> None:
    """Give a file a second name, without ever taking the place of another one."""
    try:
        os.link(source, target, follow_symlinks=False)
    except OSError as error:
        if error.errno not in {errno.EPERM, errno.EOPNOTSUPP, errno.ENOSYS, errno.EXDEV, errno.EMLINK}:
            raise
        _put_new_without_links(source, target)


def _put_new_without_links(source: Path, target: Path) -> None:
    """As _put_new, on a disk that knows no second names: an empty file holds the place until it is filled."""
    os.close(os.open(target, os.O_CREAT | os.O_EXCL | os.O_WRONLY, _ORDINARY))
    try:
        _replace(target, source.read_bytes(), target.stat())
    except BaseException:
        target.unlink(missing_ok=True)
        raise


def _write_beside(target: Path, content: bytes, mode: int) -> Path:
    """A file in the same folder, so that one step can move it; flushed to the disk."""
    beside = target.with_name(f".{target.name[:100]}.{secrets.token_hex(6)}.part")
    descriptor = os.open(beside, os.O_CREAT | os.O_EXCL | os.O_WRONLY, mode)
    try:
        with os.fdopen(descriptor, "wb") as file:
            file.write(content)
            file.flush()
            os.fsync(file.fileno())
    except BaseException:
        beside.unlink(missing_ok=True)
        raise
    return beside


def _flush_folder(folder: Path) -> None:
    """Flush the names in a folder, where the system has a way to."""
    with contextlib.suppress(OSError):
        descriptor = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(descriptor)
        finally:
            os.close(descriptor)


@contextlib.contextmanager
def _sentences(path: Path) -> Iterator[None]:
    """Turn what the system refuses into a sentence."""
    try:
        yield
    except FileExistsError:
        raise WriteRefusedError(f"{_shown(path)} cannot be written: something of that name exists already.") from None
    except OSError as error:
        reason = clean(error.strerror or str(error)).lower()
        raise WriteRefusedError(f"{_shown(path)} cannot be written: {reason}.") from error


def _shown(path: Path) -> str:
    return clean(path.name)
