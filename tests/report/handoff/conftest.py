"""One hand-off of the whole sample for all tests that read it: it takes the better part of ten seconds."""

from __future__ import annotations

import datetime
import shutil
from pathlib import Path

import pytest

from tests.paths import TOP
from tests.report.handoff.reading import Page
from worksheet.session.handoff import hand_off
from worksheet.session.handoff_folder import Written

SAMPLE = TOP / "sample_projects" / "tide_gauge"
DAY = datetime.date(2026, 12, 1)


def handed(root: Path, folder: Path, *sheets: str, since: str | None = None, day: datetime.date = DAY) -> Written:
    """A hand-off that succeeds."""
    made = hand_off(root, folder, sheets, day, since)
    assert isinstance(made, Written), made
    return made


@pytest.fixture(scope="session")
def sample(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A copy of the sample that no revision holds."""
    root = tmp_path_factory.mktemp("sample") / "tide_gauge"
    shutil.copytree(SAMPLE, root)
    return root


@pytest.fixture(scope="session")
def folder(sample: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The hand-off of the sample: a page of the project."""
    into = tmp_path_factory.mktemp("handed")
    handed(sample, into)
    return into


@pytest.fixture(scope="session")
def page(folder: Path) -> Page:
    """The project's page, read back."""
    return Page((folder / "handoff.html").read_text("utf-8"))
