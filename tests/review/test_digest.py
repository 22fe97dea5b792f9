"""The digest of a sheet's inputs: everything that can move its results counts, and nothing else does."""

from __future__ import annotations

import json
from pathlib import Path
from tempfile import TemporaryDirectory

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.cli import books
from tests.cli.books import AMPLIFIER, BUFFER, FOLLOWER, OTHER, PROCESS, PROJECT, replaced
from tests.support import run

LOAD = 'load_capacitance = { value = "1.2 pF", source = "floor plan", trust = "estimate", note = "" }'
LINKED = replaced(FOLLOWER, LOAD, 'load_capacitance = { formula = "1e-12 + line + amplifier.input_capacitance" }')
OPEN = replaced(FOLLOWER, 'width = "20 um"', 'width = "propose"')


def basis(
    folder: Path, follower: str = FOLLOWER, process: str = PROCESS, project: str = PROJECT, amplifier: str = AMPLIFIER
) -> str:
    """The digest of the follower."""
    book = books.write(folder, follower, process, project)
    (book / f"sheets/{OTHER}.toml").write_text(amplifier, encoding="utf-8")
    document = json.loads(run("review", str(book), "--json").out)
    assert document["problems"] == [], document["problems"]
    (found,) = [sheet["basis"] for sheet in document["sheets"] if sheet["sheet"] == BUFFER]
    assert isinstance(found, str)
    assert len(found) == 12
    assert set(found) <= set("0123456789abcdef")
    return found


SHEET_MOVES = {
    "assumption": ('value = "1.1 V"', 'value = "1.101 V"'),
    "low of a range": ('value = "1.1 V"', 'value = "1.1 V", low = "1 V"'),
    "high of a range": ('value = "1.1 V"', 'value = "1.1 V", high = "1.2 V"'),
    "another assumption": ("[own]", "bias_overhead = 0.1\n\n[own]"),
    "own name": ('line = { value = "0.4 pF"', 'line = { value = "0.5 pF"'),
    "current": ('"4 uA"', '"4.0001 uA"'),
    "width": ('"20 um"', '"20.01 um"'),
    "length": ('"0.5 um"', '"0.51 um"'),
    "a choice left open": ('width = "20 um"', 'width = "propose"'),
    "imposed instead of chosen": ('width = "20 um"\n', ""),
    "device": ('device = "nfet"', 'device = "pfet"'),
    "bulk": ('device = "nfet"', 'device = "pfet"\nbulk = "source"'),
    "stage": ('stage = "source-follower"', 'stage = "drain-follower"'),
    "transistor as current source": ("[assume]", '[bias]\ndevice = "nfet"\n\n[assume]'),
    "conductance of the current source": ("[assume]", '[bias]\noutput_conductance = "1 nS"\n\n[assume]'),
    "formula": (LOAD, 'load_capacitance = { formula = "3*line" }'),
    "what is kept": ("[target]", '[solve]\nkeep = "inversion"\n\n[target]'),
    "where a bound must hold": ("[target]", '[solve]\nover = "nominal"\n\n[target]'),
    "allowance": ("[target]", "[solve]\ncurrent_allowance = 0.1\n\n[target]"),
    "supply of its own": ("[own]", 'supply = "1.8 V"\n\n[own]'),
    "temperature of its own": ("[own]", 'temperature = "27 °C"\n\n[own]'),
}
ALSO = {"imposed instead of chosen": ("[own]", 'width = "20 um"\n\n[own]')}


@pytest.mark.parametrize("name", SHEET_MOVES)
def test_what_moves_results_moves_the_digest(name: str, tmp_path: Path) -> None:
    text = replaced(FOLLOWER, *SHEET_MOVES[name])
    if name in ALSO:
        text = replaced(text, *ALSO[name])
    assert basis(tmp_path / "a", text) != basis(tmp_path / "b")


ELSEWHERE_MOVES = {
    "parameter of the device": ("process", "kappa = 0.7", "kappa = 0.701"),
    "limit of the device": ("process", 'min_length = "0.18 um"', 'min_length = "0.2 um"'),
    "corner of the device": ("process", 'threshold_shift = "40 mV"', 'threshold_shift = "41 mV"'),
    "reference temperature": ("process", '"27 °C"', '"26 °C"'),
    "conditions": ("project", '["0 °C", "27 °C"]', '["1 °C", "27 °C"]'),
    "order of conditions that makes another nominal": (
        "project",
        'nominal = { process = "typical", temperature = "27 °C", supply = "1.8 V" }',
        'nominal = { process = "typical", temperature = "27 °C", supply = "1.7 V" }',
    ),
}


@pytest.mark.parametrize("name", ELSEWHERE_MOVES)
def test_what_moves_results_from_elsewhere_moves_the_digest(name: str, tmp_path: Path) -> None:
    file, old, new = ELSEWHERE_MOVES[name]
    changed = (
        basis(tmp_path / "a", process=replaced(PROCESS, old, new))
        if file == "process"
        else basis(tmp_path / "a", project=replaced(PROJECT, old, new))
    )
    assert changed != basis(tmp_path / "b")


SHEET_STANDS = {
    "title": ('title = "Lamp buffer"', 'title = "Lamp"'),
    "owner": ('owner = "T. Vik"', 'owner = ""'),
    "notes": ("sense line", "line"),
    "state": ('owner = "T. Vik"', 'owner = "T. Vik"\nstate = "accepted"'),
    "count": ('owner = "T. Vik"', 'owner = "T. Vik"\ncount = 3'),
    "fingers": ('width = "20 um"', 'width = "20 um"\nfingers = 4'),
    "source": ('source = "floor plan", trust', 'source = "layout", trust'),
    "trust": ('trust = "estimate"', 'trust = "agreed"'),
    "note": ('note = ""', 'note = "x"'),
    "target": ('min = "5 MHz"', 'min = "6 MHz", guard = 0.2'),
    "target taken out": ('bandwidth = { min = "5 MHz", id = "L-1", source = "plan", why = "speed" }', ""),
    "figure": ('"line/load_capacitance"', '"2*line/load_capacitance"'),
    "another target": ("[target]", '[target]\npower = { max = "1 mW" }'),
    "waiver": ("[choose]", '[[waiver]]\ntarget = "bandwidth"\nby = "X"\nreason = "Y"\n\n[choose]'),
    "evidence": (
        "[choose]",
        '[[evidence]]\nmetric = "bandwidth"\nvalue = "1 MHz"\nfound_by = "simulation"\n\n[choose]',
    ),
    "unit as written": ('"0.5 um"', '"500 nm"'),
    "bare number": ('"4 uA"', "4e-6"),
    "comment": ("[choose]", "# decided in March\n[choose]   # all of it"),
    "order": ('width = "20 um"\nlength = "0.5 um"', 'length = "0.5 um"\nwidth = "20 um"'),
    "value as a table": ('width = "20 um"', 'width = { value = "20 um", source = "here" }'),
    "stated default": ('device = "nfet"', 'device = "nfet"\nbulk = "rail"'),
}


@pytest.mark.parametrize("name", SHEET_STANDS)
def test_what_moves_no_result_leaves_the_digest(name: str, tmp_path: Path) -> None:
    assert basis(tmp_path / "a", replaced(FOLLOWER, *SHEET_STANDS[name])) == basis(tmp_path / "b")


ELSEWHERE_STANDS = {
    "title of the project": ("project", '"Harbour light"', '"Light"'),
    "owner of the project": ("project", '"T. Vik"', '"U. Vik"'),
    "budget": ("project", '"100 uA"', '"1 uA"'),
    "order of conditions": ("project", '["0 °C", "27 °C"]', '["27 °C", "0 °C"]'),
    "standard error": ("process", "kappa = 0.7", "kappa = { value = 0.7, standard_error = 0.01 }"),
    "title of the process": ("process", '"Plain process"', '"Process"'),
    "trust in a parameter": ("process", "kappa = 0.7", 'kappa = { value = 0.7, trust = "guess", source = "x" }'),
    "a device that is not used": ("process", "[device.pfet]\npolarity", "[device.pfet]\n# lp\npolarity"),
    "a corner that is not reviewed": (
        "process",
        "[corner.slow.pfet]",
        "[corner.odd.nfet]\nkappa_shift = 0.01\n\n[corner.slow.pfet]",
    ),
}


@pytest.mark.parametrize("name", ELSEWHERE_STANDS)
def test_what_moves_no_result_from_elsewhere_leaves_the_digest(name: str, tmp_path: Path) -> None:
    file, old, new = ELSEWHERE_STANDS[name]
    changed = (
        basis(tmp_path / "a", process=replaced(PROCESS, old, new))
        if file == "process"
        else basis(tmp_path / "a", project=replaced(PROJECT, old, new))
    )
    assert changed == basis(tmp_path / "b")


def test_a_device_that_the_sheet_does_not_use_does_not_count(tmp_path: Path) -> None:
    before, after = PROCESS.split("[device.pfet]")
    changed = before + "[device.pfet]" + after.replace("kappa = 0.7", "kappa = 0.6").replace("40 mV", "30 mV", 2)
    changed = changed.replace(
        '[corner.slow.nfet]\nthreshold_shift = "30 mV"', '[corner.slow.nfet]\nthreshold_shift = "40 mV"'
    )
    assert basis(tmp_path / "a", process=changed) == basis(tmp_path / "b")


def test_a_linked_sheet_counts_by_the_values_taken_from_it_alone(tmp_path: Path) -> None:
    plain = basis(tmp_path / "a", LINKED)
    wider = replaced(AMPLIFIER, 'width = "20 um"', 'width = "21 um"')
    assert basis(tmp_path / "b", LINKED, amplifier=wider) != plain
    renamed = replaced(AMPLIFIER, '"Lamp amplifier"', '"Amplifier"')
    assert basis(tmp_path / "c", LINKED, amplifier=renamed) == plain
    assert basis(tmp_path / "d", amplifier=wider) == basis(tmp_path / "e")


def test_the_order_of_conditions_does_not_count_for_links_either(tmp_path: Path) -> None:
    turned = replaced(PROJECT, '["0 °C", "27 °C"]', '["27 °C", "0 °C"]')
    turned = replaced(turned, '["typical", "slow"]', '["slow", "typical"]')
    assert basis(tmp_path / "a", LINKED, project=turned) == basis(tmp_path / "b", LINKED)


def test_a_value_that_only_a_target_takes_from_elsewhere_does_not_count(tmp_path: Path) -> None:
    figure = replaced(FOLLOWER, '"line/load_capacitance"', '"line/amplifier.input_capacitance"')
    figure = replaced(figure, "max = 0.5", "max = 50")
    wider = replaced(AMPLIFIER, 'width = "20 um"', 'width = "21 um"')
    assert basis(tmp_path / "a", figure, amplifier=wider) == basis(tmp_path / "b", figure)


def test_a_proposal_counts_by_its_value(tmp_path: Path) -> None:
    plain = basis(tmp_path / "a", OPEN)
    assert basis(tmp_path / "b", replaced(OPEN, '"5 MHz"', '"25 MHz"')) != plain
    assert basis(tmp_path / "c", replaced(OPEN, 'why = "speed"', 'why = "haste"')) == plain


TEXT = st.text(st.characters(codec="utf-8", exclude_categories=("Cc", "Cs")), max_size=30)


@given(title=TEXT, notes=TEXT, source=TEXT, comment=TEXT)
@settings(max_examples=25)
def test_no_text_counts(title: str, notes: str, source: str, comment: str) -> None:
    text = replaced(FOLLOWER, '"Lamp buffer"', json.dumps(title, ensure_ascii=False))
    text = replaced(text, '"Drives the lamp\'s sense line."', json.dumps(notes, ensure_ascii=False))
    text = replaced(text, '"sensor"', json.dumps(source, ensure_ascii=False))
    text = replaced(text, "[choose]\n", f"[choose] # {comment}\n")
    with TemporaryDirectory() as folder:
        assert basis(Path(folder) / "a", text) == basis(Path(folder) / "b")


VALUES = {"bias_current": 4e-6, "width": 20e-6, "length": 0.5e-6}


@given(
    name=st.sampled_from(list(VALUES)),
    factor=st.floats(0.5, 2.0).filter(lambda x: x != 1.0),
)
@settings(max_examples=25)
def test_every_other_number_counts_and_the_same_number_does_not(name: str, factor: float) -> None:
    stated = {"bias_current": '"4 uA"', "width": '"20 um"', "length": '"0.5 um"'}[name]
    number = VALUES[name] * factor
    with TemporaryDirectory() as folder:
        plain = basis(Path(folder) / "a")
        moved = basis(Path(folder) / "b", replaced(FOLLOWER, f"{name} = {stated}", f"{name} = {number!r}"))
        same = basis(Path(folder) / "c", replaced(FOLLOWER, f"{name} = {stated}", f"{name} = {VALUES[name]!r}"))
    assert (moved == plain) is (number == VALUES[name])
    assert same == plain


@pytest.mark.parametrize(
    "written",
    [
        "settling_tolerance = 0.001",
        'noise_from = "1 Hz"',
        'drive_resistance = "0 ohm"',
        "bias_overhead = 0",
        "bias_temperature_exponent = 0.0",
        'saturation_margin = "0 V"',
        'temperature = ["0 °C", "27 °C"]',
    ],
)
def test_what_holds_without_being_written_counts_for_nothing(written: str, tmp_path: Path) -> None:
    assert basis(tmp_path / "a", replaced(FOLLOWER, "[own]", f"{written}\n\n[own]")) == basis(tmp_path / "b")


def test_an_ideal_source_written_out_counts_for_nothing(tmp_path: Path) -> None:
    written = '[bias]\ndevice = "ideal"\noutput_conductance = "0 S"\ncapacitance = "0 F"\n\n[assume]'
    assert basis(tmp_path / "a", replaced(FOLLOWER, "[assume]", written)) == basis(tmp_path / "b")
