"""What every test of a screen needs: the invented book, and a toolkit that stands still."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.tui.book import write_book


@pytest.fixture
def root(tmp_path: Path) -> Path:
    """A project folder of the test's own."""
    return write_book(tmp_path / "project")


@pytest.fixture(autouse=True)
def still(monkeypatch: pytest.MonkeyPatch) -> None:
    """No animations, one language, one time zone."""
    for name, value in {"TEXTUAL_ANIMATIONS": "none", "LANG": "C.UTF-8", "TZ": "UTC"}.items():
        monkeypatch.setenv(name, value)
