"""Random edits of a whole book: refused ones change nothing, and undoing the rest returns every byte."""

from __future__ import annotations

import tempfile
from pathlib import Path

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.tui.book import SHEETS, write_book
from worksheet.session.edits import (
    AddEntry,
    ChangeSheet,
    DeleteSheet,
    DuplicateSheet,
    NewSheet,
    Put,
    RenameSheet,
    Request,
    TakeOut,
)
from worksheet.session.session import Session

names = st.sampled_from([*SHEETS, "copy_one", "copy_two"])
values = st.sampled_from(["1 uA", "2.5 µA", "3 mV", "10 um", "0.35 um", 4, "nonsense", "0 V", "7 pF", "propose"])
paths = st.sampled_from(
    [
        ("choose", "bias_current"),
        ("choose", "width"),
        ("choose", "fingers"),
        ("assume", "load_capacitance"),
        ("assume", "load_capacitance", "source"),
        ("assume", "load_capacitance", "formula"),
        ("target", "bandwidth", "min"),
        ("target", "slew_rate", "min"),
        ("own", "spare"),
        ("title",),
        ("evidence", 0, "value"),
        ("waiver", 0),
    ]
)
pieces = st.one_of(
    st.builds(Put, paths, values),
    st.builds(TakeOut, paths),
    st.just(AddEntry("evidence", {"metric": "bandwidth", "value": "3 MHz", "found_by": "simulation"})),
)
requests = st.one_of(
    st.builds(ChangeSheet, names, st.lists(pieces, min_size=1, max_size=3).map(tuple), st.just("change")),
    st.builds(lambda name: NewSheet(name, "source-follower", "nfet"), names),
    st.builds(DuplicateSheet, names, names),
    st.builds(RenameSheet, names, names),
    st.builds(DeleteSheet, names),
)  # fmt: skip


def _files(root: Path) -> dict[str, bytes]:
    return {path.name: path.read_bytes() for path in sorted((root / "sheets").glob("*"))}


@settings(max_examples=15, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(st.lists(requests, min_size=1, max_size=8))
def test_undoing_everything_returns_every_byte(made: list[Request]) -> None:
    with tempfile.TemporaryDirectory() as folder:
        root = write_book(Path(folder) / "p")
        session = Session(root)
        states = [_files(root)]
        for request in made:
            outcome = session.apply(request)
            if outcome.accepted:
                states.append(_files(root))
            assert _files(root) == states[-1]
            assert not session.snapshot().project.problems
        for state in reversed(states[:-1]):
            assert session.undo().accepted
            assert _files(root) == state
        assert not session.undo().accepted
        for state in states[1:]:
            assert session.redo().accepted
            assert _files(root) == state
