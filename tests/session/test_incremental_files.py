"""Incremental and full results to the bit over sequences in which everything moves: sheets, links, ranges, proposals,
the process file, the conditions and the budgets, from inside and from another editor."""

from __future__ import annotations

import dataclasses
import random
import tempfile
from pathlib import Path

from hypothesis import given, settings
from hypothesis import strategies as st

from tests.session.opened import TODAY
from tests.support import write_project
from tests.tui.book import PROJECT, SHEETS
from worksheet.review.results import Review
from worksheet.session.edits import ChangeSheet, Piece, Put, TakeOut
from worksheet.session.session import Session
from worksheet.session.starter import process_text
from worksheet.session.workbook import Workbook

FEW = ("bucket_buffer", "drip_amplifier", "supply_sense", "level_divider")
LOAD = ("assume", "load_capacitance")

INSIDE = {
    "size": (("choose", "width"), ("6 um", "25 um", "31 um")),
    "current": (("choose", "bias_current"), ("3 uA", "20 uA", "propose")),
    "load": (LOAD, ("0.7 pF", "2 pF")),
    "range": ((*LOAD, "high"), ("9 pF", "12 pF")),
    "link": (
        (*LOAD, "formula"),
        (
            "2*drip_amplifier.input_capacitance + 1e-13",
            "bucket_buffer.load_capacitance/2",
            "supply_sense.slew_rate*1e-18",
        ),
    ),
    "target": (("target", "bandwidth"), ({"min": "4 MHz"}, {"min": "40 kHz", "guard": 0.1})),
    "count": (("count",), (1, 7)),
}
"""Changes of a sheet by kind: where, and to what."""

OUTSIDE = {
    "process/my_process.toml": (
        ('threshold = "0.45 V"', 'threshold = "0.43 V"'),
        ("drain_coupling = 0.02", 'drain_coupling = { value = 0.025, source = "again", trust = "guess" }'),
        ("threshold_shift", "# moved\nthreshold_shift"),
    ),
    "biasbook.toml": (
        ('["27 °C", "85 °C"]', '["-40 °C", "27 °C", "95 °C"]'),
        ('["typical", "slow"]', '["typical", "fast"]'),
        ('supply = "1.8 V"', 'supply = ["1.7 V", "1.8 V"]'),
        ('max = "0.01 mm^2"', 'max = "1 um^2"'),
    ),
}
"""Changes of another editor: each text there and back again."""


def book(folder: Path) -> Path:
    project = PROJECT
    for many, few in (
        ('["-40 °C", "27 °C", "85 °C"]', '["27 °C", "85 °C"]'),
        ('["1.71 V", "1.8 V", "1.89 V"]', '"1.8 V"'),
        ('["typical", "slow", "fast"]', '["typical", "slow"]'),
    ):
        assert many in project
        project = project.replace(many, few)
    return write_project(folder, project, process_text(), {name: SHEETS[name] for name in FEW})


def change(session: Session, rng: random.Random) -> bool:
    """One change of a random kind; whether anything came of it."""
    if rng.random() < 0.3:
        file = rng.choice(sorted(OUTSIDE))
        old, new = rng.choice(OUTSIDE[file])
        path = session.root / file
        text = path.read_text("utf-8")
        old, new = (new, old) if new in text else (old, new)
        path.write_text(text.replace(old, new, 1), "utf-8")
        return session.refresh()
    if rng.random() < 0.15:
        return session.undo().accepted
    place, values = INSIDE[rng.choice(sorted(INSIDE))]
    return session.apply(ChangeSheet(rng.choice(FEW), pieces(place, rng.choice(values)), "")).accepted


def pieces(place: tuple[str, ...], value: object) -> tuple[Piece, ...]:
    """A change of one value; a load that was stated in another form goes first."""
    if place[:2] != LOAD:
        return (Put(place, value),)
    plain = (Put((*LOAD, "value"), "2 pF"),) if place[-1] == "high" else ()
    return (TakeOut(LOAD), *plain, Put(place, value))


def comparable(review: Review) -> Review:
    """Without the order of problems that different sheets have."""
    return dataclasses.replace(review, problems=tuple(sorted(review.problems, key=str)))


def everything_is_there(review: Review) -> bool:
    """What is compared: every metric, verdict, choice and budget, not their absence."""
    return bool(review.budgets) and all(one.metrics and one.choices and one.targets for one in review.sheets)


@settings(max_examples=15)
@given(st.integers(0, 10**9))
def test_every_kind_of_change_in_any_order(seed: int) -> None:
    rng = random.Random(seed)
    with tempfile.TemporaryDirectory() as folder:
        session = Session(book(Path(folder) / "book"))
        for _ in range(8):
            if change(session, rng):
                incremental = session.review(session.snapshot(), TODAY)
                whole = Workbook.read(session.root).review(TODAY)
                assert everything_is_there(whole)
                assert comparable(incremental) == comparable(whole)


def test_the_changes_are_accepted_and_move_results(tmp_path: Path) -> None:
    """A check that nothing above is refused each time."""
    for file, changes in OUTSIDE.items():
        for old, new in changes:
            root = book(tmp_path / f"{abs(hash((old, new)))}")
            assert old in (root / file).read_text("utf-8"), old
    accepted: dict[str, int] = {}
    for kind, (place, values) in INSIDE.items():
        for number, value in enumerate(values):
            for sheet in FEW:
                session = Session(book(tmp_path / f"{kind}_{number}_{sheet}"))
                outcome = session.apply(ChangeSheet(sheet, pieces(place, value), ""))
                accepted[kind] = accepted.get(kind, 0) + outcome.accepted
    assert all(accepted.values()), accepted
