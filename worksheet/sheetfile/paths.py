"""Whether a path stays inside a folder once its links are followed."""

from __future__ import annotations

from pathlib import Path


def inside(root: Path, path: Path) -> bool:
    """Whether `path`, its links followed, lies in `root`; a loop of links does not."""
    try:
        return path.resolve().is_relative_to(root.resolve())
    except (OSError, RuntimeError, ValueError):  # ValueError: a zero byte in the path
        return False
