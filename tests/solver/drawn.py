"""Random sheets with targets that some value of some variable just meets."""

from __future__ import annotations

import random
from copy import deepcopy
from pathlib import Path

from tests.documents import Document, to_toml
from tests.precision.draw import STAGES
from tests.support import write_project
from worksheet.project.case import Case
from worksheet.session.workbook import Workbook

KINDS = [(stage, polarity, source) for stage in STAGES for polarity in "np" for source in ("ideal", "transistor")]

MAXIMA = {
    "input_capacitance", "settling_time", "noise_density", "noise_corner", "output_noise", "input_noise", "output_low",
    "supply_current", "power", "gate_area", "offset", "offset_limit", "input_low", "output_resistance",
}  # fmt: skip


def case_of(folder: Path, documents: tuple[Document, Document, Document]) -> Case | None:
    """The sheet of three documents, read from files as a user's would be; None where it cannot be evaluated."""
    project, process, sheet = documents
    write_project(folder, to_toml(project), to_toml(process), {"drawn": to_toml(sheet)})
    workbook = Workbook.read(folder)
    if workbook.project.problems or workbook.evaluator is None:
        return None
    return workbook.evaluator.case("drawn")


def with_targets(rng: random.Random, folder: Path, documents: tuple[Document, Document, Document]) -> Document | None:
    """The sheet with three targets whose limits lie within a factor of what it achieves."""
    case = case_of(folder, documents)
    if case is None:
        return None
    sheet = deepcopy(documents[2])
    values = {}
    for key in rng.sample(sorted(set(every_metric(case))), 9):
        measured = case.solution.measure(key)
        if measured.complete and float(abs(measured.values.reshape(-1)[0])) > smallest(key):
            values[key] = float(measured.values.reshape(-1)[0])
    sheet["target"] = {
        key: {"max" if key in MAXIMA else "min": value * rng.uniform(0.5, 2.0)}
        for key, value in list(values.items())[:3]
    }
    return sheet


def smallest(key: str) -> float:
    """Below this a voltage is rounding of a difference and no target to aim at."""
    return 1e-6 if key in ("input_low", "input_high", "output_low", "output_high", "output_swing") else 0.0


def every_metric(case: Case) -> list[str]:
    """Metrics that the case's stage has."""
    from worksheet.model import metrics

    return [m.key for m in metrics.all_metrics() if case.stage.absent_metric(m.key) is None]
