"""Variants and chains in comparisons and merges: changed values by key, both sides' variants kept."""

from __future__ import annotations

from tests.cli.books import FOLLOWER, PROJECT
from worksheet.compare import inputs
from worksheet.compare.merge import Merged, merge
from worksheet.sheetfile.read import parse_project, parse_sheet

VARIANT = '\n[variant.lean]\nbias_current = "2 uA"\n'
CHAIN = '\n[chain.path]\nsheets = ["lamp"]\nbandwidth = { min = "1 MHz" }\n'


def _stated(text: str) -> inputs.Stated:
    sheet, problems = parse_sheet(text, "lamp", "sheets/lamp.toml")
    assert sheet is not None, problems
    return inputs.of_sheet(sheet)


def test_a_changed_variant_is_an_input_by_its_key() -> None:
    (one,) = inputs.moved(_stated(FOLLOWER + VARIANT), _stated(FOLLOWER + VARIANT.replace("2 uA", "3 uA")))
    assert (one.key, one.old, one.new, one.unit) == ("variant.lean.bias_current", 2e-6, 3e-6, "A")
    (one,) = inputs.moved(_stated(FOLLOWER), _stated(FOLLOWER + VARIANT))
    assert (one.key, one.old) == ("variant.lean.bias_current", None)


def test_a_changed_chain_is_an_input_by_its_key() -> None:
    def stated(text: str) -> inputs.Stated:
        file, problems = parse_project(text, "biasbook.toml")
        assert file is not None, problems
        return inputs.of_project(file)

    changed = CHAIN.replace("1 MHz", "2 MHz").replace('["lamp"]', '["lamp", "eye"]')
    found = {one.key: (one.old, one.new) for one in inputs.moved(stated(PROJECT + CHAIN), stated(PROJECT + changed))}
    assert found == {"chain.path.sheets": (["lamp"], ["lamp", "eye"]), "chain.path.bandwidth.min": (1e6, 2e6)}


def test_variants_of_two_people_are_both_kept() -> None:
    ours, theirs = FOLLOWER + VARIANT, FOLLOWER + VARIANT.replace("lean", "quiet").replace("2 uA", "9 uA")
    merged = merge(FOLLOWER, ours, theirs, "sheets/lamp.toml")
    assert isinstance(merged, Merged)
    assert not merged.collisions
    sheet, problems = parse_sheet(merged.text, "lamp", "sheets/lamp.toml")
    assert sheet is not None, problems
    assert {name: one.changes["bias_current"].number for name, one in sheet.variants.items()} == {
        "lean": 2e-6,
        "quiet": 9e-6,
    }


def test_one_variant_written_in_two_ways_is_no_collision() -> None:
    other = VARIANT.replace("[variant.lean]\nbias_current = ", "[variant]\nlean.bias_current = ").replace(
        "2 uA", "2.0 µA"
    )
    merged = merge(FOLLOWER, FOLLOWER + VARIANT, FOLLOWER + other, "sheets/lamp.toml")
    assert isinstance(merged, Merged)
    assert not merged.collisions
