"""`review --json` against the independent reference: every metric, operating point, level and validity entry.

cases.json holds whole projects as a user would write them, and what the reference says of them at three conditions.
The nominal condition is read directly. The two others are read twice: through targets that pick one condition by its
temperature, which keeps the levels that the nominal condition fixed; and by a second project in which that condition
is the nominal one and those levels are stated, which shows its operating points and its validity too.
"""

from __future__ import annotations

import json
import tomllib
from pathlib import Path
from typing import Any

import pytest

from tests.documents import to_toml
from tests.support import only_sheet, review

STORED = json.loads((Path(__file__).parent / "cases.json").read_text(encoding="utf-8"))
METRICS, POINTS = STORED["metric_keys"], STORED["operating_point_keys"]
CASES = {case["name"]: case for case in STORED["cases"]}

RELATIVE = 1e-9
VOLTAGES = {"output_low", "output_high", "output_swing", "input_low", "input_high"}
POINT_VOLTAGES = {"headroom", "gate_voltage", "source_voltage", "drain_voltage", "gate_source_voltage"}
VOLT = 1e-9
"""Voltages are differences that may come out near zero: held to a nanovolt."""

NAMED = {"feed-through", "gain below 1", "unlimited"}
"""Reasons that the definitions name; any other must only be there."""

SILENT = {"reverse_share"}
"""Where kappa moves with source voltage the definitions do not say at which end the drain's charge takes it. The file
holds both readings: reverse_share with kappa at the drain, reverse_share_kappa_held with the operating point's, which
is the program's. Without a surface potential they are one."""


def close(found: Any, wanted: float, key: str) -> bool:
    absolute = VOLT if key in VOLTAGES | POINT_VOLTAGES else 0.0
    return bool(found == pytest.approx(wanted, rel=RELATIVE, abs=absolute))


def compare_metrics(found: dict[str, Any], wanted: list[Any], stage: str) -> list[str]:
    """Every difference, as a line each."""
    wrong = []
    for key, value in zip(METRICS, wanted, strict=True):
        if value is None:
            continue
        entry = found.get(key)
        if entry is None:
            wrong.append(f"{key}: not there")
        elif isinstance(value, str):
            if entry["value"] is not None or not entry.get("reason"):
                wrong.append(f"{key}: {entry}, expected none ({value})")
            elif value in NAMED and entry["reason"] != value:
                wrong.append(f"{key}: reason {entry['reason']}, expected {value}")
        elif entry["value"] is None or not close(entry["value"], value, key):
            wrong.append(f"{key}: {entry}, expected {value!r}")
    strangers = [key for key in found if wanted[METRICS.index(key)] is None and found[key]["value"] is not None]
    return wrong + [f"{key}: {stage} has none" for key in strangers]


def compare_points(found: dict[str, Any], wanted: dict[str, list[Any]]) -> list[str]:
    wrong = []
    for device, values in wanted.items():
        for key, value in zip(POINTS, values, strict=True):
            if key in SILENT:
                continue
            entry = found[device].get(key.removesuffix("_kappa_held"), "not there")
            if value is None or isinstance(value, str):
                good = entry == value
            else:
                good = entry not in ("not there", None) and close(entry, value, key)
            if not good:
                wrong.append(f"{device}.{key}: {entry}, expected {value!r}")
    return wrong


def compare_validity(found: list[dict[str, Any]], expected: dict[str, Any]) -> list[str]:
    """Entries of one condition: which device or level, what, and by how much."""
    here = {(entry["device"], entry["what"]): entry["short_by"] for entry in matching(found, expected["at"])}
    wanted = {(device, what): short for device, what, short in expected["validity"]}
    if here.keys() != wanted.keys() or any(abs(here[key] - wanted[key]) > VOLT for key in here):
        return [f"validity at {expected['at']}: {here}, expected {wanted}"]
    return []


def matching(found: list[dict[str, Any]], at: dict[str, Any]) -> list[dict[str, Any]]:
    return [entry for entry in found if all(entry["at"][key] == value for key, value in at.items())]


@pytest.mark.parametrize("name", CASES)
def test_nominal_condition(name: str, tmp_path: Path) -> None:
    case = CASES[name]
    expected = case["expected"][0]
    sheet = only_sheet(review(tmp_path, case["project"], case["process"], {"drawn": case["sheet"]}))
    wrong = compare_metrics(sheet["metrics"], expected["metrics"], sheet["stage"])
    wrong += compare_points(sheet["operating_point"], expected["operating_point"])
    for condition in case["expected"]:
        wrong += compare_validity(sheet["validity"], condition)
    assert not wrong, "\n".join(wrong)


def missing_somewhere(case: dict[str, Any], key: str) -> bool:
    """A formula over a metric that is missing in one valid condition is unknown as a whole."""
    index = METRICS.index(key)
    return any(not isinstance(e["metrics"][index], float) for e in case["expected"] if not e["validity"])


def picking(case: dict[str, Any]) -> tuple[str, dict[str, tuple[str, float]]]:
    """Targets whose worst value is a metric at one condition: zero at any other temperature."""
    lines, wanted = [], {}
    for number, expected in enumerate(case["expected"]):
        if expected["validity"]:
            continue
        for key, value in zip(METRICS, expected["metrics"], strict=True):
            if not isinstance(value, float) or value == 0 or missing_somewhere(case, key):
                continue
            chosen = f"{key}*(1-min(1,1e9*abs(temperature-{expected['at']['temperature']!r})))"
            side = "max" if value > 0 else "min"
            lines.append(f'\n[target.at{number}_{key}]\nformula = "{chosen}"\n{side} = {value!r}\n')
            wanted[f"at{number}_{key}"] = (key, value)
    return "".join(lines), wanted


@pytest.mark.parametrize("name", CASES)
def test_every_condition_through_targets(name: str, tmp_path: Path) -> None:
    case = CASES[name]
    targets, wanted = picking(case)
    sheet = only_sheet(review(tmp_path, case["project"], case["process"], {"drawn": case["sheet"] + targets}))
    invalid = sum(bool(expected["validity"]) for expected in case["expected"])
    found = {target["metric"]: target for target in sheet["targets"]}
    assert found.keys() == wanted.keys()
    wrong = []
    for target, (key, value) in wanted.items():
        if found[target]["worst"] is None or not close(found[target]["worst"], value, key):
            wrong.append(f"{target}: {found[target]['worst']}, expected {value!r}")
        if found[target]["invalid"] != invalid:
            wrong.append(f"{target}: {found[target]['invalid']} invalid, expected {invalid}")
    assert not wrong, "\n".join(wrong)


@pytest.mark.parametrize("index", [1, 2])
@pytest.mark.parametrize("name", CASES)
def test_other_conditions_as_nominal(name: str, index: int, tmp_path: Path) -> None:
    case = CASES[name]
    expected = case["expected"][index]
    project, sheet = tomllib.loads(case["project"]), tomllib.loads(case["sheet"])
    at = expected["at"]
    project["conditions"] = {key: [value] for key, value in at.items()} | {"nominal": at}
    sheet["choose"]["bias_current"] = expected["current"]
    sheet["assume"].pop("bias_temperature_exponent", None)
    sheet["assume"].update({f"{key}_level": value for key, value in expected["held"].items()})
    found = only_sheet(review(tmp_path, to_toml(project), case["process"], {"drawn": to_toml(sheet)}))
    wrong = compare_metrics(found["metrics"], expected["metrics"], found["stage"])
    wrong += compare_points(found["operating_point"], expected["operating_point"])
    wrong += compare_validity(found["validity"], expected)
    assert not wrong, "\n".join(wrong)
