"""What the commands say of the sample is what it was when somebody last looked at it."""

from __future__ import annotations

import json
from typing import Any

import pytest

from tests.cli.golden_files import COMMANDS, GOLDEN, said

ALGEBRA = "stages_common_gate.txt"
"""Takes seconds, and is looked at stage by stage elsewhere too."""

TEXTS = [
    pytest.param(name, marks=pytest.mark.full) if name == ALGEBRA else name
    for name in COMMANDS
    if name.endswith(".txt")
]


@pytest.mark.parametrize("name", TEXTS)
def test_text_is_as_it_was(name: str) -> None:
    text = said(name)
    assert text == (GOLDEN / name).read_text("utf-8")
    assert max(len(line) for line in text.splitlines()) <= 80


@pytest.mark.parametrize("name", [name for name in COMMANDS if name.endswith(".json")])
def test_documents_are_as_they_were(name: str) -> None:
    _same(json.loads(said(name)), json.loads((GOLDEN / name).read_text("utf-8")), name)


def _same(found: Any, kept: Any, where: str) -> None:
    """Equal, numbers to nine digits: the last ones belong to the machine."""
    if isinstance(kept, dict):
        assert isinstance(found, dict), where
        assert list(found) == list(kept), where
        for key, value in kept.items():
            _same(found[key], value, f"{where}.{key}")
    elif isinstance(kept, list):
        assert isinstance(found, list), where
        assert len(found) == len(kept), where
        for number, value in enumerate(kept):
            _same(found[number], value, f"{where}[{number}]")
    elif isinstance(kept, float):
        assert found == pytest.approx(kept, rel=1e-9, abs=1e-30), where
    else:
        assert found == kept, where


SHAPE = {
    "": {"schema", "project", "met", "sheets", "budget", "problems"},
    "sheet": {
        "sheet",
        "stage",
        "state",
        "count",
        "basis",
        "choose",
        "operating_point",
        "metrics",
        "validity",
        "targets",
    },
    "target": {
        "metric",
        "unit",
        "min",
        "max",
        "at",
        "nominal",
        "worst",
        "worst_at",
        "invalid",
        "margin",
        "verdict",
        "reason",
        "evidence",
    },
    "budget": {"metric", "max", "nominal", "worst", "verdict"},
    "evidence": {"value", "found_by", "stale", "verdict"},
}
"""What the contract promises scripts, by object."""


def test_a_review_has_the_shape_of_the_contract() -> None:
    document = json.loads(said("review.json"))
    assert set(document) >= SHAPE[""]
    for sheet in document["sheets"]:
        assert set(sheet) >= SHAPE["sheet"]
        assert all(set(choice) == {"value", "unit", "origin"} for choice in sheet["choose"].values())
        assert {choice["origin"] for choice in sheet["choose"].values()} <= {"chosen", "proposed", "assumed"}
        for number in sheet["metrics"].values():
            assert ("reason" in number) is (number["value"] is None)
            assert number["value"] is None or isinstance(number["value"], float)
        for target in sheet["targets"]:
            assert set(target) >= SHAPE["target"]
            assert target["verdict"] in {"met", "missed", "unknown", "waived"}
            assert target["worst_at"] is None or set(target["worst_at"]) == {"process", "temperature", "supply"}
            assert all(set(item) >= SHAPE["evidence"] for item in target["evidence"])
    assert all(set(item) >= SHAPE["budget"] for item in document["budget"])


def test_numbers_in_json_are_numbers_or_null() -> None:
    def refuse(name: str) -> None:
        pytest.fail(f"{name} is no JSON number")

    for name in COMMANDS:
        if name.endswith(".json"):
            json.loads(said(name), parse_constant=refuse)
