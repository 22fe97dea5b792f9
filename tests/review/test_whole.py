"""Reviews of whole books: conditions, ranges, own supplies, links at the same condition, budgets, evidence."""

from __future__ import annotations

import json
from itertools import product
from pathlib import Path
from typing import Any

import pytest

from tests.cli import books
from tests.cli.books import BUFFER, FOLLOWER, OTHER, PROJECT, replaced
from tests.support import run

Document = dict[str, Any]


def reviewed(book: Path) -> Document:
    document: Document = json.loads(run("review", str(book), "--json").out)
    return document


def sheet_of(document: Document, name: str = BUFFER) -> Document:
    assert document["problems"] == [], document["problems"]
    (sheet,) = [s for s in document["sheets"] if s["sheet"] == name]
    assert isinstance(sheet, dict)
    return sheet


def target_of(document: Document, metric: str, name: str = BUFFER) -> Document:
    (target,) = [t for t in sheet_of(document, name)["targets"] if t["metric"] == metric]
    assert isinstance(target, dict)
    return target


def at_condition(process: str, temperature: str, supply: str) -> str:
    """The project with one condition alone."""
    return f"""\
schema = 1
process = "plain_180"

[conditions]
process = ["{process}"]
temperature = ["{temperature}"]
supply = ["{supply}"]
nominal = {{ process = "{process}", temperature = "{temperature}", supply = "{supply}" }}
"""


def test_the_worst_is_the_worst_of_single_conditions(tmp_path: Path) -> None:
    document = reviewed(books.write(tmp_path / "all"))
    singles = {}
    for number, at in enumerate(product(("typical", "slow"), ("0 °C", "27 °C"), ("1.7 V", "1.8 V"))):
        one = reviewed(books.write(tmp_path / str(number), project=at_condition(*at)))
        singles[at] = target_of(one, "bandwidth")["nominal"]
    target = target_of(document, "bandwidth")
    assert target["worst"] == min(singles.values())
    worst = target["worst_at"]
    key = (worst["process"], f"{worst['temperature'] - 273.15:.0f} °C", f"{worst['supply']} V")
    assert singles[key] == target["worst"]
    assert target["nominal"] == singles["typical", "27 °C", "1.8 V"]


def test_a_nominal_condition_outside_the_lists_is_reviewed_with_them(tmp_path: Path) -> None:
    project = replaced(
        PROJECT,
        'nominal = { process = "typical", temperature = "27 °C"',
        'nominal = { process = "typical", temperature = "80 °C"',
    )
    target = target_of(reviewed(books.write(tmp_path, project=project)), "bandwidth")
    assert target["worst_at"]["temperature"] == pytest.approx(353.15)  # the hottest is the slowest here
    assert target["worst"] <= target["nominal"]


def test_a_target_at_nominal_looks_nowhere_else(tmp_path: Path) -> None:
    text = replaced(FOLLOWER, 'bandwidth = { min = "5 MHz"', 'bandwidth = { at = "nominal", min = "17.2 MHz"')
    target = target_of(reviewed(books.write(tmp_path / "a", text)), "bandwidth")
    assert target["verdict"] == "met"
    assert target["worst"] == target["nominal"]
    everywhere = replaced(text, 'at = "nominal", ', "")
    assert target_of(reviewed(books.write(tmp_path / "b", everywhere)), "bandwidth")["verdict"] == "missed"


def test_a_range_is_looked_at_at_its_ends_in_every_condition(tmp_path: Path) -> None:
    ranged = replaced(FOLLOWER, 'value = "1.2 pF"', 'value = "1.2 pF", low = "0.9 pF", high = "1.6 pF"')
    heavy = replaced(FOLLOWER, 'value = "1.2 pF"', 'value = "1.6 pF"')
    with_range = target_of(reviewed(books.write(tmp_path / "a", ranged)), "bandwidth")
    at_end = target_of(reviewed(books.write(tmp_path / "b", heavy)), "bandwidth")
    stated = target_of(reviewed(books.write(tmp_path / "c")), "bandwidth")
    assert with_range["worst"] == at_end["worst"]
    assert with_range["nominal"] == stated["nominal"]
    assert with_range["worst_with"] == {"load_capacitance": 1.6e-12}


SEVEN = [f"part_{k}" for k in range(7)]


@pytest.mark.parametrize("count", [6, 7])
def test_the_worst_of_many_ranges_is_at_the_end_of_all_of_them(count: int, tmp_path: Path) -> None:
    """Seven loads in parallel: the slowest is where all are at their high end, whatever is done to find that."""
    names = SEVEN[:count]

    def text(value: str) -> str:
        own = "\n".join(f"{name} = {value}" for name in names)
        return replaced(
            replaced(FOLLOWER, "[own]", f"[own]\n{own}"),
            'load_capacitance = { value = "1.2 pF", source = "floor plan", trust = "estimate", note = "" }',
            f'load_capacitance = {{ formula = "{"+".join(names)}" }}',
        )

    ranged = text('{ value = "0.2 pF", low = "0.1 pF", high = "0.3 pF" }')
    found = target_of(reviewed(books.write(tmp_path / "a", ranged)), "bandwidth")
    expected = target_of(reviewed(books.write(tmp_path / "b", text('"0.3 pF"'))), "bandwidth")
    assert found["worst"] == pytest.approx(expected["worst"], rel=1e-12)
    assert set(found["worst_with"]) == set(names)


def test_a_formula_that_leaves_its_range_at_the_end_of_a_range_is_bad_input(tmp_path: Path) -> None:
    text = replaced(FOLLOWER, 'line = { value = "0.4 pF"', 'line = { value = "0.4 pF", low = "0.1 pF"')
    text = replaced(
        text,
        '{ value = "1.2 pF", source = "floor plan", trust = "estimate", note = "" }',
        '{ formula = "line - 0.2e-12" }',
    )
    done = run("review", str(books.write(tmp_path, text)))
    assert done.status == 2
    assert "assume.load_capacitance" in done.err
    assert "-1e-13" in done.err
    assert "end of a range" in done.err


def linked(more: str = "") -> str:
    """The follower, loaded by the amplifier."""
    return replaced(
        FOLLOWER,
        '{ value = "1.2 pF", source = "floor plan", trust = "estimate", note = "" }',
        f'{{ formula = "1e-12 + amplifier.input_capacitance" }}{more}',
    )


def test_a_link_takes_the_other_sheet_at_the_same_condition(tmp_path: Path) -> None:
    document = reviewed(books.write(tmp_path / "all", linked()))
    worst = target_of(document, "bandwidth")
    for number, at in enumerate(product(("typical", "slow"), ("0 °C", "27 °C"), ("1.7 V", "1.8 V"))):
        one = reviewed(books.write(tmp_path / str(number), linked(), project=at_condition(*at)))
        load = sheet_of(one, OTHER)["metrics"]["input_capacitance"]["value"]
        plain = replaced(linked(), "1e-12 + amplifier.input_capacitance", f"1e-12 + {load!r}")
        direct = reviewed(books.write(tmp_path / f"{number}d", plain, project=at_condition(*at)))
        value = target_of(direct, "bandwidth")["nominal"]
        assert target_of(one, "bandwidth")["nominal"] == pytest.approx(value, rel=1e-12)
        assert worst["worst"] <= value * (1 + 1e-6)  # levels are taken at the nominal condition, which moves here
    assert worst["verdict"] == "met"


def test_a_sheet_with_its_own_supply_takes_the_nominal_one_of_the_other(tmp_path: Path) -> None:
    """Every condition of the sheet itself; process and temperature matched, the other's supply nominal."""
    own = linked('\nsupply = ["1.5 V", "1.6 V"]')
    own = replaced(
        own,
        'share = { formula = "line/load_capacitance", max = 0.5, unit = "F/F" }',
        'share = { formula = "amplifier.supply + 0*line", min = 0, unit = "V" }',
    )
    target = target_of(reviewed(books.write(tmp_path / "a", own)), "share")
    assert (target["nominal"], target["worst"]) == (1.8, 1.8)
    shared = replaced(own, '\nsupply = ["1.5 V", "1.6 V"]', "")
    target = target_of(reviewed(books.write(tmp_path / "b", shared)), "share")
    assert (target["nominal"], target["worst"]) == (1.8, 1.7)


def test_a_link_the_other_way_takes_the_nominal_supply_of_a_sheet_on_its_own(tmp_path: Path) -> None:
    text = replaced(FOLLOWER, "[own]", 'supply = ["1.5 V", "1.6 V", "1.7 V"]\n\n[own]')
    book = books.write(tmp_path, text)
    other = book / f"sheets/{OTHER}.toml"
    other.write_text(
        books.AMPLIFIER + 'seen = { formula = "buffer.supply", min = "0 V", unit = "V" }\n', encoding="utf-8"
    )
    target = target_of(reviewed(book), "seen", OTHER)
    assert (target["nominal"], target["worst"]) == (1.6, 1.6)


def test_a_budget_sums_every_sheet_times_its_count(tmp_path: Path) -> None:
    text = replaced(FOLLOWER, 'owner = "T. Vik"', 'owner = "T. Vik"\ncount = 7')
    text = replaced(text, "[own]", "bias_temperature_exponent = 1\nbias_overhead = 0.25\n\n[own]")
    project = replaced(PROJECT, "[budget]", '[budget]\npower = { max = "80 uW" }')
    document = reviewed(books.write(tmp_path, text, project=project))
    budgets = {b["metric"]: b for b in document["budget"]}
    current = (
        7 * 4e-6 * 1.25 + 4e-6
    )  # bias_temperature_exponent 1 is 1 at the nominal temperature, which is the hottest
    assert budgets["supply_current"]["nominal"] == pytest.approx(current, rel=1e-12)
    assert budgets["supply_current"]["worst"] == pytest.approx(current, rel=1e-12)
    assert budgets["power"]["nominal"] == pytest.approx(current * 1.8, rel=1e-12)
    assert (budgets["supply_current"]["verdict"], budgets["power"]["verdict"]) == ("met", "met")
    assert document["met"] is True


def test_a_missed_budget_is_not_met_by_anything(tmp_path: Path) -> None:
    book = books.write(tmp_path, project=replaced(PROJECT, '"100 uA"', '"7.9 uA"'))
    document = reviewed(book)
    assert [b["verdict"] for b in document["budget"]] == ["missed"]
    assert document["met"] is False
    assert run("review", str(book)).status == 1


@pytest.mark.parametrize(("limit", "verdict"), [("100 uA", "unknown"), ("3 uA", "missed")])
def test_a_budget_with_a_bad_sheet_is_unknown_unless_missed_already(limit: str, verdict: str, tmp_path: Path) -> None:
    book = books.write(tmp_path, FOLLOWER + "bandwith = 1\n", project=replaced(PROJECT, '"100 uA"', f'"{limit}"'))
    document = reviewed(book)
    assert [b["verdict"] for b in document["budget"]] == [verdict]
    assert document["met"] is False


EVIDENCE = '\n[[evidence]]\nmetric = "bandwidth"\nvalue = "{value}"\nfound_by = "simulation"\nbasis = "{basis}"\n{more}'


@pytest.mark.parametrize(
    ("value", "more", "verdict"),
    [
        ("5.6 MHz", "", "met"),
        ("4.6 MHz", "", "missed"),
        ("5.6 MHz", 'low = "4.9 MHz"\n', "missed"),
        ("5.6 MHz", 'low = "5.1 MHz"\nhigh = "6 MHz"\n', "met"),
    ],
)
def test_evidence_is_judged_and_never_changes_the_verdict(value: str, more: str, verdict: str, tmp_path: Path) -> None:
    basis = sheet_of(reviewed(books.write(tmp_path / "a")))["basis"]
    for number, (digits, stale) in enumerate(((basis, False), ("0" * 12, True), ("", True))):
        text = FOLLOWER + EVIDENCE.format(value=value, basis=digits, more=more)
        target = target_of(reviewed(books.write(tmp_path / f"b{number}", text)), "bandwidth")
        (item,) = target["evidence"]
        assert item["stale"] is stale
        assert item["verdict"] == verdict
        assert target["verdict"] == "met"


def test_evidence_without_a_basis_is_stale(tmp_path: Path) -> None:
    text = FOLLOWER + EVIDENCE.format(value="5.6 MHz", basis="", more="").replace('basis = ""\n', "")
    (item,) = target_of(reviewed(books.write(tmp_path, text)), "bandwidth")["evidence"]
    assert item["stale"] is True


def test_invalid_conditions_leave_a_target_unknown_but_not_a_miss(tmp_path: Path) -> None:
    """The main device leaves saturation at the lower supply alone: there the numbers do not count."""
    level = replaced(FOLLOWER, 'input_level = { value = "1.1 V", source = "sensor" }', 'output_level = "0.95 V"')
    document = reviewed(books.write(tmp_path / "a", level))
    sheet = sheet_of(document)
    target = target_of(document, "bandwidth")
    invalid = {(v["at"]["process"], v["at"]["temperature"], v["at"]["supply"]) for v in sheet["validity"]}
    assert 0 < len(invalid) < 8
    assert target["invalid"] == len(invalid)
    assert target["verdict"] == "unknown"
    worst = target["worst_at"]
    assert (worst["process"], worst["temperature"], worst["supply"]) not in invalid
    slow = replaced(level, 'min = "5 MHz"', 'min = "500 MHz"')
    assert target_of(reviewed(books.write(tmp_path / "b", slow)), "bandwidth")["verdict"] == "missed"
