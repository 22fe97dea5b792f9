"""What a hand-off of the sample says is what it was when somebody last looked at it."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from tests.report.handoff.conftest import handed
from tests.report.handoff.golden_files import BLOCK, GOLDEN, said

NUMBER = re.compile(r"(\d+\.\d+(?:e[+-]?\d+)?|\d+e[+-]?\d+)")


@pytest.fixture(scope="module")
def now(sample: Path, folder: Path) -> dict[str, str]:
    """What is said now; the block's page is written beside the project's."""
    handed(sample, folder, BLOCK)
    return said(folder)


@pytest.mark.full
@pytest.mark.parametrize("name", ["project.md", "block.txt", "block.csv", "block-sizes.txt"])
def test_a_hand_off_of_the_sample_is_as_it_was(now: dict[str, str], name: str) -> None:
    kept = (GOLDEN / name).read_text("utf-8").splitlines()
    found = now[name].splitlines()
    for line, (here, there) in enumerate(zip(found, kept, strict=False), start=1):
        assert same(here, there), f"{name}:{line}\n  now  {here}\n  kept {there}"
    assert len(found) == len(kept)


def same(found: str, kept: str) -> bool:
    """Equal, long numbers to nine digits: the last ones belong to the machine."""
    if found == kept:
        return True
    one, other = NUMBER.split(found), NUMBER.split(kept)
    if len(one) != len(other) or one[::2] != other[::2]:
        return False
    return all(float(a) == pytest.approx(float(b), rel=1e-9) for a, b in zip(one[1::2], other[1::2], strict=True))


def test_a_change_of_one_digit_that_is_shown_is_noticed() -> None:
    assert same("C 1.2345678901234e-12 F", "C 1.2345678901235e-12 F")
    assert not same("C 1.235 pF", "C 1.236 pF")
    assert not same("C 1.235 pF", "C 1.235 nF")
    assert not same("met", "missed")
