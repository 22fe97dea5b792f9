"""Commits that are made while records are made: nobody takes back what the other did."""

from pathlib import Path

import pytest

from tests.history import loops
from tests.history.repositories import git, make_repository


@pytest.mark.full
def test_records_and_commits_at_the_same_time_lose_nothing(tmp_path: Path) -> None:
    outcome = loops.run(tmp_path, seconds=20.0)
    assert outcome.fallen == []
    assert outcome.staged == []
    assert outcome.fsck == ""
    assert outcome.records["recorded"] > 20
    assert outcome.commits["committed"] > 20
    assert set(outcome.records) <= {"recorded", "LOCKED"}


def test_a_number_that_is_taken_back_is_seen(tmp_path: Path) -> None:
    top = make_repository(tmp_path / "chip")
    for number in (9, 12, 11):
        (top / "foreign-0").write_text(f"{number}\n", "utf-8")
        git(top, "add", ".")
        git(top, "commit", "-q", "-m", str(number))
    assert [one.split(": ")[1] for one in loops.fallen(top)] == ["12 to 11"]
