"""Draws random projects and writes what the reference says about them: cases.json and cases_device.json.

    python -m tests.precision.make_cases

Deterministic: the seed is fixed and every number drawn is rounded, so a second run writes the same bytes. Inputs are
kept as the very documents that a user would write, expected values as the doubles nearest to the 50-digit result.
"""

from __future__ import annotations

import json
import math
import random
from pathlib import Path
from typing import Any

from mpmath import mp, mpf

from tests.documents import to_toml
from tests.precision import reference_device as device
from tests.precision.draw import STAGES, draw, edge_cases
from tests.precision.reference import Answer, evaluate, solve

HERE = Path(__file__).parent
SEED = 20_260_711
ROUNDS = 3
TRIES = 4000

Case = tuple[dict[str, Any], dict[str, Any], dict[str, Any]]


def conditions_of(project: dict[str, Any]) -> list[dict[str, Any]]:
    """The nominal condition, then the cross product of the lists."""
    lists = project["conditions"]
    product = [
        {"process": corner, "temperature": temperature, "supply": supply}
        for corner in lists["process"]
        for temperature in lists["temperature"]
        for supply in lists["supply"]
    ]
    return [lists["nominal"], *product]


def acceptable(case: Case, *, want_invalid: bool) -> bool:
    """Whether the case asks a clear question: nothing at an edge, and valid everywhere unless invalid is wanted."""
    project, process, sheet = case
    if not all(1e-7 <= size <= 0.1 for key, size in sheet["choose"].items() if key.endswith("width")):
        return False
    nominal, invalid = project["conditions"]["nominal"], 0
    try:
        for condition in conditions_of(project):
            solved, _ = solve(process, sheet, nominal, condition)
            for name, point in solved.devices.items():
                known = name == "main" and solved.bench.stage == "cascode"
                if not known and abs(point.headroom) < 1e-6:
                    return False
                if point.source < point.bulk - 1e-12 or point.kappa + point.device.sigma > 0.98:
                    return False
            answer = evaluate(process, sheet, nominal, [condition])[0]
            if not answer.metrics["dc_gain"][0] or any(entry["short_by"] < 1e-6 for entry in answer.validity):
                return False
            invalid += bool(answer.validity)
    except (ArithmeticError, TypeError, ValueError):  # TypeError: a source below the body potential is complex
        return False
    return (invalid > 0) == want_invalid


def recorded(value: Any) -> Any:
    if value is None or isinstance(value, str):
        return value
    number = float(value)
    if not math.isfinite(number):
        raise ValueError("a value without end is no expected value")
    return number


def expected(answer: Answer, point_keys: list[str], metric_keys: list[str]) -> dict[str, Any]:
    """One condition; a metric that does not exist is its reason, one that the stage does not have is null."""
    metrics = []
    for key in metric_keys:
        value, reason = answer.metrics.get(key, (None, None))
        metrics.append(recorded(value) if reason is None else reason)
    return {
        "at": answer.condition,
        "held": {key: recorded(value) for key, value in answer.held.items()},
        "levels": [recorded(answer.input), recorded(answer.output)],
        "current": recorded(answer.operating_point["main"]["current"]),
        "metrics": metrics,
        "operating_point": {
            name: [recorded(values[key]) for key in point_keys] for name, values in answer.operating_point.items()
        },
        "validity": [[entry["device"], entry["what"], recorded(entry["short_by"])] for entry in answer.validity],
    }


def make_cases() -> dict[str, Any]:
    rng = random.Random(SEED)
    wanted = [
        (stage, polarity, source)
        for _ in range(ROUNDS)
        for stage in STAGES
        for polarity in ("n", "p")
        for source in ("ideal", "transistor")
    ]
    drawn: list[tuple[str, Case]] = []
    for number, (stage, polarity, source) in enumerate(wanted):
        want_invalid = number % 9 == 8
        for _ in range(TRIES):
            case = draw(rng, stage, polarity, source, want_invalid=want_invalid)
            if acceptable(case, want_invalid=want_invalid):
                break
        else:
            raise RuntimeError(f"no case of {stage}, {polarity}, {source} in {TRIES} tries")
        drawn.append((f"{number:02d} {stage} {polarity} {source}", case))
    drawn.extend(edge_cases())
    answers = []
    for _, (project, process, sheet) in drawn:
        answers.append(evaluate(process, sheet, project["conditions"]["nominal"], conditions_of(project)))
    point_keys = list(answers[0][0].operating_point["main"])
    metric_keys = sorted({key for group in answers for answer in group for key in answer.metrics})
    return {
        "operating_point_keys": point_keys,
        "metric_keys": metric_keys,
        "cases": [
            {
                "name": name,
                "project": to_toml(project),
                "process": to_toml(process),
                "sheet": to_toml(sheet),
                "expected": [expected(answer, point_keys, metric_keys) for answer in group],
            }
            for (name, (project, process, sheet)), group in zip(drawn, answers, strict=True)
        ],
    }


def make_device_cases() -> dict[str, Any]:
    """Device relations from IC 1e-9 to 1e6 and drives from -700 to 1e6, at 60 working digits."""
    device.precise()
    drives = [-700.0, -300.0, -100.0, -50.0, -36.7, -20.0, -10.0, -5.0, -2.207, -1.0, -0.3, -1e-3, -1e-9, 0.0]
    drives += [1e-12, 1e-4, 0.1, 0.5, 0.999, 1.0, 1.001, 2.0, 3.7, 7.0, 10.0, 33.3, 100.0, 300.0, 709.0, 710.0, 1500.0]
    drives += [1e4, 123456.789, 1e6]
    charges = [10.0 ** (k / 2) for k in range(-40, 13)] + [0.4263027510068627, 0.5, 1e-300]
    inversions = [float(f"{10 ** (k / 2):.6g}") for k in range(-18, 13)] + [0.608, 0.75, 2.0]
    velocities = [0.0, 1e-6, 0.01, 0.3, 1.0, 5.0]

    def table(rows: list[list[Any]]) -> list[list[float]]:
        return [[float(value) for value in row] for row in rows]

    at = [(mpf(i), mpf(velocity)) for velocity in velocities for i in inversions]
    return {
        "charge_from_drive": table([[u, device.charge_from_drive(mpf(u))] for u in drives]),
        "drive_from_charge": table([[q, device.drive_from_charge(mpf(q))] for q in charges]),
        "charge_from_inversion": table([[i, v, device.charge_from_inversion(i, v)] for i, v in at]),
        "inversion_from_charge": table(
            [[q, v, device.inversion_from_charge(mpf(q), mpf(v))] for v in velocities for q in charges[:-1]]
        ),
        "slope_factor": table([[i, v, device.slope_factor(i, v)] for i, v in at]),
        "white_factor": table([[q, device.white_factor(mpf(q))] for q in charges]),
        "gate_source_factor": table([[q, device.gate_source_factor(mpf(q))] for q in charges]),
    }


def write(name: str, content: dict[str, Any]) -> None:
    text = json.dumps(content, ensure_ascii=False, separators=(",", ":"))
    (HERE / name).write_text(text + "\n", encoding="utf-8")
    print(f"{name}: {len(text)} characters at {mp.dps} digits")


if __name__ == "__main__":
    write("cases_device.json", make_device_cases())
    write("cases.json", make_cases())
