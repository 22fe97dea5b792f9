"""Sizes of the current source that a sheet leaves out: what is proposed is recommended, and holds once it is taken."""

from __future__ import annotations

import datetime
import random
from copy import deepcopy
from pathlib import Path

import numpy as np
import pytest

from tests.documents import Document, to_toml
from tests.precision.draw import draw
from tests.solver.drawn import KINDS, MAXIMA, case_of
from tests.support import write_project
from worksheet.project.case import CaseError
from worksheet.session.workbook import Workbook
from worksheet.solver import needed
from worksheet.solver.bias_size import RANGE_METRICS

TODAY = datetime.date(2026, 12, 1)
TRANSISTOR = [kind for kind in KINDS if kind[2] != "ideal"]


def opened(folder: Path, documents: tuple[Document, Document, Document], **choose: float) -> Workbook:
    sheet = deepcopy(documents[2])
    sheet["choose"] |= choose
    write_project(folder, to_toml(documents[0]), to_toml(documents[1]), {"drawn": to_toml(sheet)})
    return Workbook.read(folder)


def left_open(folder: Path, kind: tuple[str, str, str], seed: int) -> tuple[Document, Document, Document] | None:
    """A sheet whose targets are met where it stood, with current, width and the current source's sizes left open."""
    rng = random.Random(f"{kind}{seed}")
    documents = draw(rng, *kind, want_invalid=False)
    sheet = deepcopy(documents[2])
    sheet["choose"] = {k: v for k, v in sheet["choose"].items() if not k.startswith("bias_") and "finger" not in k}
    sheet["choose"]["bias_current"] = documents[2]["choose"]["bias_current"]
    case = case_of(folder, (documents[0], documents[1], sheet))
    if case is None:
        return None
    sheet["target"] = {}
    ranges = [key for key in RANGE_METRICS if case.stage.absent_metric(key) is None]
    for key in (rng.choice(["slew_rate", "pole_frequency"]), rng.choice(ranges), rng.choice(["dc_gain", "offset"])):
        values = case.solution.measure(key).values.reshape(-1)
        if not np.isfinite(values).all() or np.max(np.abs(values)) < 1e-6:
            continue
        worst, side = (values.max(), "max") if key in MAXIMA else (values.min(), "min")
        sheet["target"][key] = {side: float(worst + rng.uniform(0.02, 0.5) * abs(worst) * (1 if side == "max" else -1))}
    for key in ("bias_current", "width"):
        sheet["choose"].pop(key)
    return documents[0], documents[1], sheet


def check(kind: tuple[str, str, str], seed: int, folder: Path) -> bool:
    """Whether there was a recommended point to look at."""
    documents = left_open(folder / "drawn", kind, seed)
    if documents is None:
        return False
    try:
        case = case_of(folder / "open", documents)
    except CaseError:  # no target bounds the current
        return False
    if case is None:
        return False
    solved = needed.solve(case)
    if solved.recommended is None:
        return False
    point = solved.recommended.values
    for key in ("bias_current", "width", *(k for k in ("bias_width", "bias_length") if k in case.open_keys)):
        assert solved.proposed[key] == pytest.approx(point[key], rel=2e-3), key
    if documents[2].get("solve", {}).get("over") != "nominal":
        taken = opened(folder / "put", documents, bias_current=point["bias_current"], width=point["width"])
        (result,) = taken.review(TODAY).sheets
        assert {t.verdict for t in result.targets} == {"met"}, [(t.target.name, t.margin) for t in result.targets]
    return True


@pytest.mark.parametrize("kind", TRANSISTOR[::5], ids="-".join)
def test_what_is_proposed_is_recommended_and_passes_review(kind: tuple[str, str, str], tmp_path: Path) -> None:
    assert sum(check(kind, seed, tmp_path / str(seed)) for seed in range(4)) >= 1


@pytest.mark.full
@pytest.mark.parametrize("kind", TRANSISTOR, ids="-".join)
def test_of_every_stage(kind: tuple[str, str, str], tmp_path: Path) -> None:
    assert sum(check(kind, seed, tmp_path / str(seed)) for seed in range(2, 12)) >= 3
