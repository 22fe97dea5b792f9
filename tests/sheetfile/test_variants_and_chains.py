"""Variants of a sheet and chains of a project as they are read, and what is said of wrong ones."""

from pathlib import Path

import pytest

from tests.cli.books import FOLLOWER, PROCESS, PROJECT
from tests.sheetfile.texts import PROJECT as PROJECT_FILE
from tests.sheetfile.texts import SHEET, line_of
from tests.support import write_project
from worksheet.project.discover import Project, load
from worksheet.project.variants import with_variant
from worksheet.sheetfile.read import parse_project, parse_sheet

VARIANTS = """
[variant.quiet]
note = "for the noisy pump"
bias_current = { value = "8 uA", low = "7 uA", high = "9 uA", trust = "guess" }
own_step = "0.2"
load_capacitance = "2 pF"
fingers = 8
supply = ["1.3 V"]

[variant.lean]
bias_current = "propose"
drive_resistance = "1 kohm"
"""


def test_a_variant_is_read_by_plain_names() -> None:
    sheet, problems = parse_sheet(SHEET + VARIANTS, "buffer", "sheets/buffer.toml")
    assert not problems
    assert sheet is not None
    quiet, lean = sheet.variants["quiet"], sheet.variants["lean"]
    assert quiet.note == "for the noisy pump"
    assert quiet.line == line_of(SHEET + VARIANTS, "[variant.quiet]")
    assert (quiet.changes["bias_current"].number, quiet.changes["bias_current"].high) == (8e-6, 9e-6)
    assert quiet.changes["bias_current"].trust == "guess"
    assert quiet.fingers == {"main": 8}
    assert lean.changes["bias_current"].propose

    changed = with_variant(sheet, quiet)
    assert changed.choose["bias_current"].number == 8e-6
    assert changed.own["own_step"].number == 0.2
    assert changed.assume["load_capacitance"].number == 2e-12
    assert changed.assume["supply"].numbers == (1.3,)
    assert changed.fingers == {"main": 8}
    assert changed.targets == sheet.targets
    assert changed.choose["width"] is sheet.choose["width"]
    assert sheet.choose["bias_current"].number == 4e-6

    leaner = with_variant(sheet, lean)
    assert leaner.choose["bias_current"].propose
    assert leaner.assume["drive_resistance"].number == 1e3


@pytest.mark.parametrize(
    ("old", "new", "key", "words"),
    [
        ('"8 uA", low', '"8 kHz", low', "variant.quiet.bias_current.value", "a current"),
        ("bias_current = {", "bias_curent = {", "variant.quiet.bias_curent", "did you mean bias_current?"),
        ('note = "for', 'nite = "for', "variant.quiet.nite", "did you mean note?"),
        ('"2 pF"', '"-2 pF"', "variant.quiet.load_capacitance", "at least 0 F"),
        ('own_step = "0.2"', 'own_step = "0.2 V"', "variant.quiet.own_step", "number"),
        ('own_step = "0.2"', 'own_stop = "0.2"', "variant.quiet.own_stop", "did you mean own_step?"),
        ("fingers = 8", "fingers = 0", "variant.quiet.fingers", "at least 1"),
        ("[variant.lean]", '[variant."a b"]', 'variant."a b"', "letters"),
        ('"2 pF"', '{ formula = "2*own_step" }', "variant.quiet.load_capacitance.formula", "formula"),
        ('"2 pF"', '"propose"', "variant.quiet.load_capacitance", "a value"),
        ('drive_resistance = "1 kohm"', 'bias_width = "1 um"', "variant.lean.bias_width", "ideal"),
        ('bias_current = "propose"\ndrive_resistance = "1 kohm"', "", "variant.lean", "changes nothing"),
        ("[variant.lean]", "[[variant.lean]]", "variant.lean", "a table"),
    ],
)
def test_a_wrong_variant_says_where_and_why(old: str, new: str, key: str, words: str) -> None:
    text = SHEET + VARIANTS.replace(old, new)
    assert text != SHEET + VARIANTS
    sheet, problems = parse_sheet(text, "buffer", "sheets/buffer.toml")
    assert sheet is None
    assert [problem.key for problem in problems] == [key], problems
    assert words in problems[0].message
    assert problems[0].line is not None
    assert problems[0].line > SHEET.count("\n")


def test_note_is_no_own_name() -> None:
    _, problems = parse_sheet(SHEET.replace("own_step", "note"), "buffer", "sheets/buffer.toml")
    assert "shadows the key" in problems[-1].message


CHAINS = """
[chain.signal]
title = "Float to converter"
sheets = ["lamp", "lamp", "driver"]
settling_tolerance = "1 %"
bandwidth = { min = "1 MHz", guard = 0.1, id = "S-3" }
input_noise = { max = "100 uV", at = "nominal" }
"""


def test_a_chain_is_read_with_its_limits() -> None:
    file, problems = parse_project(PROJECT_FILE + CHAINS, "biasbook.toml")
    assert not problems
    assert file is not None
    chain = file.chains["signal"]
    assert chain.sheets == ("lamp", "lamp", "driver")
    assert chain.settling_tolerance == 0.01
    assert chain.targets["bandwidth"].minimum == 1e6
    assert chain.targets["bandwidth"].guard == 0.1
    assert chain.targets["input_noise"].at == "nominal"
    assert chain.line == line_of(PROJECT_FILE + CHAINS, "[chain.signal]")


@pytest.mark.parametrize(
    ("old", "new", "key", "words"),
    [
        ('["lamp", "lamp", "driver"]', "[]", "chain.signal.sheets", "a list of sheets"),
        ('["lamp", "lamp", "driver"]', '"lamp"', "chain.signal.sheets", "a list of sheets"),
        ('["lamp", "lamp", "driver"]', "[1]", "chain.signal.sheets.0", "Found 1"),
        ('["lamp", "lamp", "driver"]', str(["a"] * 13).replace("'", '"'), "chain.signal.sheets", "at most 12"),
        ('sheets = ["lamp", "lamp", "driver"]', "", "chain.signal.sheets", "missing"),
        ("bandwidth =", "bandwith =", "chain.signal.bandwith", "did you mean bandwidth?"),
        ("bandwidth =", "slew_rate =", "chain.signal.slew_rate", "expected one of"),
        ('"1 MHz"', '"1 V"', "chain.signal.bandwidth.min", "a frequency"),
        ("guard =", "gard =", "chain.signal.bandwidth.gard", "did you mean guard?"),
        ('{ max = "100 uV", at = "nominal" }', '"100 uV"', "chain.signal.input_noise", "a table"),
        ('{ max = "100 uV", at = "nominal" }', '{ at = "nominal" }', "chain.signal.input_noise", "without a limit"),
        ('"1 %"', "0.7", "chain.signal.settling_tolerance", "below 0.5"),
        ("[chain.signal]", '[chain."to-adc"]', "chain.to-adc", "letters"),
    ],
)
def test_a_wrong_chain_says_where_and_why(old: str, new: str, key: str, words: str) -> None:
    text = PROJECT_FILE + CHAINS.replace(old, new)
    assert text != PROJECT_FILE + CHAINS
    file, problems = parse_project(text, "biasbook.toml")
    assert file is None
    assert [problem.key for problem in problems] == [key], problems
    assert words in problems[0].message
    assert (problems[0].line or 0) > PROJECT_FILE.count("\n")


def _loaded(folder: Path, chain: str, sheet: str) -> Project:
    return load(write_project(folder, PROJECT + chain, PROCESS, {"lamp": sheet}))


def test_a_chain_names_sheets_that_exist_and_often_enough(tmp_path: Path) -> None:
    project = _loaded(tmp_path, '\n[chain.one]\nsheets = ["lamp", "lamb"]\n', FOLLOWER)
    (problem,) = project.problems
    assert (problem.file, problem.key) == ("biasbook.toml", "chain.one.sheets.1")
    assert problem.line == line_of(PROJECT + "\n[chain.one]\nsheets", "sheets")
    assert 'did you mean "lamp"?' in problem.message

    project = _loaded(tmp_path, '\n[chain.one]\nsheets = ["lamp", "lamp"]\n', FOLLOWER)
    (problem,) = project.problems
    assert problem.key == "chain.one.sheets"
    assert "at most 1" in problem.message
    project = _loaded(
        tmp_path, '\n[chain.one]\nsheets = ["lamp", "lamp"]\n', FOLLOWER.replace("owner", "count = 2\nowner")
    )
    assert not project.problems


def test_a_variant_stays_within_the_process(tmp_path: Path) -> None:
    sheet = FOLLOWER + '\n[variant.tiny]\nwidth = "0.1 um"\n'
    project = _loaded(tmp_path, "", sheet)
    (problem,) = project.problems
    assert (problem.file, problem.key) == ("sheets/lamp.toml", "variant.tiny.width")
    assert problem.line == line_of(sheet, "0.1 um")
    project = _loaded(tmp_path, "", FOLLOWER + '\n[variant.both]\noutput_level = "0.5 V"\n')
    assert [one.key for one in project.problems] == ["variant.both.output_level"]
