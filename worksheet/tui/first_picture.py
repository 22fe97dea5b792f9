"""The first picture: every block with its verdict, worked out beside the start of the toolkit.

The toolkit and the engine take about as long to load, so the picture is made by a forked copy of the process while this
one loads the toolkit; it is handed over as lines of text. A picture that was made before of the same bytes, on the same
day, at the same size is kept in the folder of what is remembered, and then there is nothing to wait for. The screens
proper take its place as soon as they are loaded; until then keys are kept for them.

Nothing here imports the toolkit or the engine at its top, which is the point of it.
"""

from __future__ import annotations

import contextlib
import datetime
import hashlib
import json
import os
import threading
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet import __version__

if TYPE_CHECKING:
    from worksheet.tui.rows import Line
    from worksheet.tui.terminal import Terminal

Picture = Mapping[str, list[list[tuple[str, str]]]]
"""By part of the screen: its lines, each as pieces of text with their role."""

_LARGEST = 4_000_000
_END_OF_WAIVER = b"until"
"""What a file must hold for the day to matter to a verdict."""
_PARTS = ("title", "heading", "blocks", "detail", "budgets")


@dataclass(frozen=True)
class Wanted:
    """What picture is wanted.

    Attributes:
        root: The project.
        size: Columns and lines of the terminal.
        read_only: Whether nothing may be changed.
        terminal: What can be shown.
    """

    root: Path
    size: tuple[int, int]
    read_only: bool
    terminal: Terminal

    @property
    def kept(self) -> Path:
        """Where the picture of this project is kept."""
        name = hashlib.blake2b(os.fsencode(self.root.resolve()), digest_size=8).hexdigest()
        return self.terminal.state / "pictures" / f"{name}.json"

    def key(self, contents: Mapping[str, bytes] | None = None) -> str:
        """A digest of everything that the picture depends on.

        Args:
            contents: The project's files by path within it; those on the disk where None.
        """
        files = self._files() if contents is None else contents
        waived = any(_END_OF_WAIVER in content for content in files.values())
        day = _today().isoformat() if waived else ""
        about = (__version__, _program(), *self.size, self.read_only, self.terminal.plain_signs, day)
        whole = hashlib.blake2b(repr(about).encode(), digest_size=16)
        for path, content in sorted(files.items()):
            whole.update(f"\0{path}\0{len(content)}\0".encode("utf-8", "surrogateescape"))
            whole.update(content)
        return whole.hexdigest()

    def _files(self) -> dict[str, bytes]:
        folders = ("", "process", "sheets")
        paths = [path for folder in folders for path in (self.root / folder).glob("*.toml")]
        return {path.relative_to(self.root).as_posix(): path.read_bytes() for path in paths}


def _today() -> datetime.date:
    return datetime.datetime.now().astimezone().date()


def _program() -> str:
    """Tells one state of the program's own files from another, by names, sizes and times."""
    whole = hashlib.blake2b(digest_size=8)
    folders = [Path(__file__).parents[1]]
    while folders:
        for entry in sorted(os.scandir(folders.pop()), key=lambda one: one.name):
            if entry.is_dir(follow_symlinks=False):
                folders.append(Path(entry.path))
            elif entry.name.endswith(".py"):
                status = entry.stat()
                whole.update(f"{entry.path}\0{status.st_size}\0{status.st_mtime_ns}".encode("utf-8", "surrogateescape"))
    return whole.hexdigest()


def begin(wanted: Wanted, tell: Callable[[Picture], None]) -> None:
    """Have the picture made, or take the one that is kept; `tell` is called with it, from another thread.

    To be called while the process has one thread: it is copied.
    """
    with contextlib.suppress(OSError):
        kept = _kept(wanted, wanted.key())
        if kept is not None:
            tell(kept)
            return
        source, sink = os.pipe()
        copy = os.fork()
        if copy == 0:
            os.close(source)
            _make(wanted, sink)
        os.close(sink)
        threading.Thread(target=_take, args=(source, copy, tell), name="first-picture", daemon=True).start()


def _kept(wanted: Wanted, key: str) -> Picture | None:
    try:
        content = wanted.kept.read_bytes()
        data = json.loads(content) if len(content) <= _LARGEST else None
    except (OSError, ValueError):
        return None
    return _read(data.get("picture")) if isinstance(data, dict) and data.get("key") == key else None


def _read(data: Any) -> Picture | None:
    """A picture from what was read; None where it is none."""
    try:
        return {part: [[(str(t), str(r)) for t, r in line] for line in data[part]] for part in _PARTS}
    except (KeyError, TypeError, ValueError):
        return None


def _make(wanted: Wanted, sink: int) -> None:
    """In the copy: make the picture, hand it over, keep it, end."""
    try:
        key = wanted.key()
        picture = make(wanted)
        with os.fdopen(sink, "w", encoding="utf-8") as pipe:
            json.dump(picture, pipe)
        _write(wanted, key, picture)
    finally:
        os._exit(0)  # the copy has nothing to clean up: what it shares belongs to the process itself


def keep(wanted: Wanted, contents: Mapping[str, bytes], parts: Mapping[str, Sequence[Line]]) -> None:
    """Keep a picture for the next start, where the files on the disk are those that it shows.

    Args:
        wanted: What picture it is.
        contents: The files that it shows, by path within the project.
        parts: Its lines, by part of the screen.
    """
    with contextlib.suppress(OSError):
        key = wanted.key(contents)
        if key != wanted.key():
            return
        _write(wanted, key, {part: [_plain(line) for line in parts[part]] for part in _PARTS})


def _write(wanted: Wanted, key: str, picture: Picture) -> None:
    """Put a picture where the next start looks for it, if the files are still those that it was made of."""
    with contextlib.suppress(OSError):
        wanted.kept.parent.mkdir(parents=True, exist_ok=True, mode=0o700)
        beside = wanted.kept.with_suffix(f".{os.getpid()}")
        try:
            beside.write_text(json.dumps({"key": key, "picture": picture}), "utf-8")
            if wanted.key() == key:
                beside.replace(wanted.kept)
        finally:
            beside.unlink(missing_ok=True)


def make(wanted: Wanted) -> Picture:
    """The picture of a project as it stands."""
    from worksheet.project.discover import load
    from worksheet.session.reading import FileReading, Shelf
    from worksheet.session.snapshot import Snapshot
    from worksheet.session.workbook import Workbook
    from worksheet.tui.pages import book_page
    from worksheet.tui.signs import signs_for

    reading = FileReading(Shelf())  # without a session, which also knows how to change things and takes longer to load
    project = load(wanted.root, reading)
    snapshot = Snapshot(0, project, reading.contents, read_only=wanted.read_only)
    review = Workbook(project).review(_today())
    parts = book_page.parts(snapshot, review, wanted.size, signs_for(wanted.terminal.plain_signs))
    return {part: [_plain(line) for line in parts[part]] for part in _PARTS}


def _plain(line: Line) -> list[tuple[str, str]]:
    return [(span.shown, span.role) for span in line]


def _take(source: int, copy: int, tell: Callable[[Picture], None]) -> None:
    """Take the picture from the copy."""
    with contextlib.suppress(OSError, ValueError), os.fdopen(source, encoding="utf-8") as pipe:
        picture = _read(json.loads(pipe.read(_LARGEST)))
        if picture is not None:
            tell(picture)
    with contextlib.suppress(ChildProcessError):
        os.waitpid(copy, 0)
