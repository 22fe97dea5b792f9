"""What a sheet gets from a batch is to the bit what it gets alone, whoever its neighbours are."""

from __future__ import annotations

import random
from pathlib import Path

import pytest

from tests.bench.many_sheets import write
from tests.cli.books import TODAY
from tests.documents import to_toml
from tests.precision.draw import STAGES, draw, draw_sheet
from tests.support import write_project
from worksheet.project import batch
from worksheet.review.review import Reviewed, reviewed
from worksheet.session.workbook import Workbook


def whole(folder: Path) -> dict[str, Reviewed]:
    """Every sheet, in as few batches as there are."""
    workbook = Workbook.read(folder)
    assert workbook.evaluator is not None
    assert not workbook.project.problems
    return reviewed(workbook.evaluator, tuple(workbook.project.sheets), TODAY)


def alone(folder: Path, name: str) -> Reviewed:
    """One sheet, by an evaluator that has seen no other."""
    workbook = Workbook.read(folder)
    assert workbook.evaluator is not None
    return reviewed(workbook.evaluator, (name,), TODAY)[name]


def same(one: Reviewed, other: Reviewed) -> bool:
    return (one.result, one.spent, one.problems) == (other.result, other.spent, other.problems)


def drawn(folder: Path, seed: int, sheets: int) -> Path:
    """A project of one drawn process and sheets of every kind: kappa that moves, saturating carriers, two poles."""
    rng = random.Random(seed)
    project, process, _ = draw(rng, "cascode", "n", "transistor", want_invalid=False)
    for device in process["device"].values():
        device["surface_potential"] = rng.choice((0.0, 0.7))
        device["velocity_length"] = rng.choice((0.0, 2e-8))
        device["flicker_exponent"] = rng.choice((1.0, 0.9))
    supply = project["conditions"]["nominal"]["supply"]
    documents = {}
    for number in range(sheets):
        stage, polarity = rng.choice(STAGES), rng.choice("np")
        source = rng.choice(("ideal", "transistor"))
        sheet = draw_sheet(rng, process, stage, polarity, source, 10 ** rng.uniform(-3, 2), supply)
        sheet["target"] = {"bandwidth": {"min": 1e5}, "dc_gain": {"min": 2.0}, "settling_time": {"max": 1e-6}}
        if rng.random() < 0.4:
            sheet["assume"]["drive_resistance"] = 10 ** rng.uniform(2, 6)
        if rng.random() < 0.4:
            sheet["assume"]["step_size"] = 0.01
        if rng.random() < 0.4:
            low, value = (f * sheet["choose"].pop("load_capacitance", 1e-12) for f in (0.7, 1.0))
            sheet["assume"]["load_capacitance"] = {"value": value, "low": low}
        documents[f"drawn_{number}"] = to_toml(sheet)
    return write_project(folder, to_toml(project), to_toml(process), documents)


@pytest.mark.parametrize("points", [batch.MOST_POINTS, 60])
def test_sheets_of_a_book_are_the_same_alone(points: int, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    folder = write(tmp_path / "many", 40, 27)
    together = whole(folder)
    monkeypatch.setattr(batch, "MOST_POINTS", points)
    for name in random.Random(points).sample(sorted(together), 20):
        assert same(together[name], alone(folder, name)), name
    assert all(same(one, together[name]) for name, one in whole(folder).items())


@pytest.mark.parametrize("seed", range(4))
def test_drawn_sheets_of_every_kind_are_the_same_alone(seed: int, tmp_path: Path) -> None:
    folder = drawn(tmp_path / "drawn", seed, 24)
    workbook = Workbook.read(folder)
    assert workbook.evaluator is not None
    names = tuple(workbook.project.sheets)
    assert len(names) > 8, workbook.project.problems
    together = reviewed(workbook.evaluator, names, TODAY)
    assert sum(one.result is not None for one in together.values()) > 8
    for name in names:
        assert same(together[name], alone(folder, name)), name
    backwards = reviewed(Workbook.read(folder).evaluator, names[::-1], TODAY)  # type: ignore[arg-type]
    assert all(same(together[name], backwards[name]) for name in names)


def test_the_batches_are_batches(tmp_path: Path) -> None:
    """The check above would hold of sheets that are solved one by one, too."""
    workbook = Workbook.read(write(tmp_path / "many", 40, 27))
    assert workbook.evaluator is not None
    cases = [workbook.evaluator.case(name) for name in workbook.project.sheets]
    made = list(batch.batches(cases))
    assert sum(len(one.cases) for one in made) == 40
    assert len(made) < 25
    assert any({case.circuit.polarity for case in one.cases} == {"n", "p"} for one in made)
