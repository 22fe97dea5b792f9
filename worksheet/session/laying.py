"""A revision laid out as a folder, so that it is read like any project."""

from __future__ import annotations

import tempfile
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path


@contextmanager
def laid(files: Mapping[str, bytes]) -> Iterator[Path]:
    """A temporary folder with the files of a project, by path; it goes at the end."""
    with tempfile.TemporaryDirectory(prefix="biasbook-") as folder:
        root = Path(folder)
        for path, content in files.items():
            (root / path).parent.mkdir(parents=True, exist_ok=True)
            (root / path).write_bytes(content)
        yield root
