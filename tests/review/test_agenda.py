"""What a meeting has to decide: everything that does not speak for itself, and nothing else."""

from __future__ import annotations

import datetime
from pathlib import Path

from tests.cli import books
from worksheet.review.agenda import Item, Why, agenda
from worksheet.session.workbook import Workbook

TODAY = datetime.date(2026, 12, 1)
MISSES = books.replaced(books.FOLLOWER, 'min = "5 MHz"', 'min = "500 MHz"')


def found(folder: Path, sheet: str, project: str = books.PROJECT) -> list[Item]:
    book = books.write(folder, sheet, project=project)
    return [item for item in agenda(Workbook.read(book).review(TODAY), TODAY) if item.sheet in (books.BUFFER, "")]


def whys(items: list[Item], about: str) -> list[Why]:
    return [item.why for item in items if item.about == about]


def waiver(**stated: str) -> str:
    lines = "".join(f"{key} = {value}\n" for key, value in stated.items())
    return f'\n[[waiver]]\ntarget = "bandwidth"\nby = "M. Roe"\nreason = "bench"\n{lines}'


def test_a_missed_target_and_what_became_of_its_waiver(tmp_path: Path) -> None:
    assert whys(found(tmp_path / "1", MISSES), "bandwidth") == [Why.MISSED]
    assert whys(found(tmp_path / "2", MISSES + waiver()), "bandwidth") == [Why.WAIVED]
    assert whys(found(tmp_path / "3", MISSES + waiver(until="2026-11-30")), "bandwidth") == [Why.PAST]
    assert whys(found(tmp_path / "4", MISSES + waiver(value='"400 MHz"')), "bandwidth") == [Why.WORSE]
    assert whys(found(tmp_path / "5", books.FOLLOWER), "bandwidth") == []


def test_evidence_that_is_stale_or_absent(tmp_path: Path) -> None:
    items = found(tmp_path / "1", books.FOLLOWER)
    assert [item.why for item in items] == [Why.NOT_REVIEWED, Why.NO_EVIDENCE]
    evidence = (
        '\n[[evidence]]\nmetric = "bandwidth"\nvalue = "6 MHz"\nfound_by = "simulation"\nbasis = "000000000000"\n'
    )
    items = found(tmp_path / "2", books.FOLLOWER + evidence)
    assert whys(items, "bandwidth") == [Why.STALE]
    assert Why.NO_EVIDENCE not in [item.why for item in items]


def test_an_accepted_block_without_open_remarks_is_silent_but_for_evidence(tmp_path: Path) -> None:
    basis = Workbook.read(books.write(tmp_path / "1")).review(TODAY).sheets[1].basis
    stated = books.replaced(books.FOLLOWER, "schema = 1\n", 'schema = 1\nstate = "accepted"\n')
    stated += f'\n[[acceptance]]\nby = "M. Roe"\nbasis = "{basis}"\n'
    assert [item.why for item in found(tmp_path / "2", stated)] == [Why.NO_EVIDENCE]
    remarks = '\n[[remark]]\nby = "A"\ntext = "one"\nsettled = 2026-11-01\n\n[[remark]]\nby = "A"\ntext = "two"\n'
    items = found(tmp_path / "3", stated + remarks)
    assert [(item.why, item.number) for item in items] == [(Why.REMARK, 1), (Why.NO_EVIDENCE, None)]


def test_the_project_s_own_budgets_and_requirements(tmp_path: Path) -> None:
    project = books.replaced(books.PROJECT, '"100 uA"', '"1 nA"') + '\n[requirement]\n"L-1" = "speed"\n"L-2" = "life"\n'
    items = [item for item in found(tmp_path, books.FOLLOWER, project) if not item.sheet]
    assert [(item.why, item.about) for item in items] == [(Why.BUDGET, "supply_current"), (Why.UNCOVERED, "L-2")]


def test_a_block_that_cannot_be_read_is_on_the_agenda(tmp_path: Path) -> None:
    (item,) = (one for one in found(tmp_path, "stage = 3\n") if one.sheet)
    assert (item.why, item.sheet) == (Why.UNKNOWN, books.BUFFER)
