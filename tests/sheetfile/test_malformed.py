"""Malformed sheets, process files and project files: each names the file, the line and the key, and says what to do."""

from collections.abc import Callable
from typing import Any, NamedTuple

import pytest

from tests.sheetfile.texts import PROCESS, PROJECT, SHEET, line_of
from worksheet.model.problem import Problem
from worksheet.model.text import clean
from worksheet.sheetfile.read import parse_process, parse_project, parse_sheet

Parser = Callable[[str, str], tuple[Any, list[Problem]]]


class Case(NamedTuple):
    """A change of a good text, and what must be said about it: the key, and some words of the message."""

    old: str
    new: str
    key: str
    words: tuple[str, ...]
    at: str = ""  # where the line is, if not where the change begins


def case(old: str, new: str, key: str, *words: str, at: str = "") -> Case:
    return Case(old, new, key, words, at)


SHEETS = {
    "unit of another dimension": case(
        '"4 uA"', '"10 kHz"', "choose.bias_current", '"10 kHz"', "a frequency", "a current"
    ),
    "unit missing": case('"4 uA"', '"4"', "choose.bias_current", "unit is missing"),
    "unknown unit": case('"4 uA"', '"4 uX"', "choose.bias_current", '"uX" is not known'),
    "decimal comma": case('"0.5 um"', '"0,5 um"', "choose.length", "comma"),
    "quantity without quotes": case('"20 um"', "20 um", "choose.width", "valid TOML", 'in quotes: "20 um"'),
    "text without an end": case('"20 um"', '"20 um', "choose.width", "valid TOML"),
    "infinity": case('"20 um"', "inf", "choose.width", "infinity"),
    "not a number": case('"20 um"', "nan", "choose.width", "NaN"),
    "a flag for a quantity": case('"20 um"', "true", "choose.width", "true or false", "a length"),
    "a date for a quantity": case('"20 um"', "2026-01-01", "choose.width", "a date", "a length"),
    "a list for a quantity": case('"20 um"', '["20 um"]', "choose.width", "a list", "a length"),
    "below the range": case('"20 um"', '"-1 um"', "choose.width", '"-1 um"', "above 0 m"),
    "at an open end of the range": case('"20 um"', '"0 um"', "choose.width", "above 0 m"),
    "huge exponent": case('"20 um"', '"1e400 m"', "choose.width", "out of range"),
    "huge integer": case("count = 64", "count = " + "9" * 5000, "count", "thousands of digits"),
    "large integer": case("count = 64", "count = " + "9" * 400, "count", "whole number"),
    "count not whole": case("count = 64", "count = 2.5", "count", "2.5", "whole number, at least 1"),
    "count 0": case("count = 64", "count = 0", "count", "at least 1"),
    "fingers as text": case("fingers = 4", 'fingers = "4"', "choose.fingers", "whole number"),
    "unknown key": case("bias_current =", "bias_curent =", "choose.bias_curent", "did you mean bias_current?"),
    "unknown key at the top": case("owner =", "ownr =", "ownr", "did you mean owner?"),
    "unknown table": case("[choose]", "[chose]", "chose", "did you mean choose?"),
    "unknown annotation": case(
        'trust = "agreed" }\nstep',
        'trusted = "agreed" }\nstep',
        "assume.input_level.trusted",
        "did you mean trust?",
        at="input_level =",
    ),
    "unknown trust": case(
        '"agreed" }\nstep',
        '"agred" }\nstep',
        "assume.input_level.trust",
        '"agred"',
        'did you mean "agreed"',
        at="input_level =",
    ),
    "unknown metric": case(
        "bandwidth = {", "bandwith = {", "target.bandwith", "unknown metric", "did you mean bandwidth?"
    ),
    "unknown stage": case('"source-follower"', '"source-folower"', "stage", 'did you mean "source-follower"?'),
    "unknown choice": case('keep = "geometry"', 'keep = "geometri"', "solve.keep", 'did you mean "geometry"?'),
    "stage missing": case('stage = "source-follower"\n', "", "stage", "missing", "source-follower", at="schema"),
    "device missing": case('device = "nfet"\n', "", "device", "missing", at="schema"),
    "schema missing": case("schema = 1\n", "", "schema", "missing", at="title"),
    "newer schema": case("schema = 1", "schema = 2", "schema", "newer version"),
    "schema as text": case("schema = 1", 'schema = "1"', "schema", "whole number"),
    "load missing": case(
        "load_capacitance = { value", "well_capacitance = { value", "assume.load_capacitance", "missing", at="[assume]"
    ),
    "key of another table": case(
        "[choose]\n", '[choose]\nstep_size = "1 V"\n', "choose.step_size", "belongs in [assume]", at='step_size = "1 V"'
    ),
    "design variable at the top": case("count = 64", 'width = "1 um"', "width", "belongs in [choose]"),
    "level that the stage does not take": case(
        '"source-follower"', '"common-source"', "assume.input_level", "takes no input_level", at="input_level ="
    ),
    "both levels": case(
        "input_level =",
        'output_level = "0.4 V"\ninput_level =',
        "assume.input_level",
        "one of them",
        at="input_level =",
    ),
    "device of another stage": case(
        "fingers = 4", 'cascode_width = "1 um"', "choose.cascode_width", "of cascode, not of source-follower"
    ),
    "size of an ideal source": case("fingers = 4", 'bias_width = "1 um"', "choose.bias_width", "needs a transistor"),
    "fingers of an ideal source": case("fingers = 4", "bias_fingers = 2", "choose.bias_fingers", "needs a transistor"),
    "well with the bulk on the rail": case(
        "step_size =", 'well_capacitance = "1 fF"\nstep_size =', "assume.well_capacitance", 'bulk = "source"'
    ),
    "conductance of a transistor source": case(
        'device = "ideal"', 'device = "nbias"', "bias.output_conductance", "not taken here", at="output_conductance ="
    ),
    "in both tables": case(
        "[own]", 'width = "5 um"\n\n[own]', "choose.width", "[assume] on line", "one of them", at='width = "20 um"'
    ),
    "proposed assumption": case(
        'value = "0.9 V"', 'value = "propose"', "assume.input_level.value", "[choose]", at="input_level ="
    ),
    "range of a proposal": case(
        'width = "20 um"', 'width = { value = "propose", low = "1 um" }', "choose.width.low", "no range"
    ),
    "low above value": case('low = "0.9 pF"', 'low = "1.3 pF"', "assume.load_capacitance.low", "at most the value"),
    "high below value": case(
        'high = "1.6 pF"', 'high = "1.1 pF"', "assume.load_capacitance.high", "at least the value"
    ),
    "low beyond the key's range": case(
        'low = "0.9 pF"', 'low = "-1 pF"', "assume.load_capacitance.low", "at least 0 F"
    ),
    "value and formula": case(
        'formula = "2*own_step"', 'formula = "2*own_step", value = "1 V"', "assume.step_size", "both value and formula"
    ),
    "neither value nor formula": case(
        'formula = "2*own_step", note', "note", "assume.step_size", "neither value nor formula", at="step_size"
    ),
    "formula outside the grammar": case('"2*own_step"', "\"__import__('os')\"", "assume.step_size.formula", "formula"),
    "formula with an unknown name": case(
        "2*own_step", "2*own_stp", "assume.step_size", "own_stp", "did you mean own_step?"
    ),
    "formula of a value with a metric": case("2*own_step", "2*bandwidth", "assume.step_size", "metric bandwidth"),
    "formula as a number": case('formula = "2*own_step"', "formula = 2", "assume.step_size.formula", "text in quotes"),
    "own name that is a metric": case(
        "own_step = 0.1", "own_step = 0.1\npower = 1", "own.power", "shadows the metric", at="power = 1"
    ),
    "own name that is a function": case(
        "own_step = 0.1", "own_step = 0.1\nmin = 1", "own.min", "shadows a function", at="min = 1"
    ),
    "own name that is a constant": case("own_step = 0.1", "own_step = 0.1\npi = 3", "own.pi", "constant", at="pi = 3"),
    "own name that is a design variable": case(
        "own_step = 0.1", "own_step = 0.1\nwidth = 1", "own.width", "shadows the key", at="width = 1"
    ),
    "own name of another stage's design": case(
        "own_step = 0.1",
        "own_step = 0.1\ncascode_length = 1",
        "own.cascode_length",
        "shadows the key",
        at="cascode_length",
    ),
    "own name that is a keyword": case(
        "own_step = 0.1", "own_step = 0.1\nlambda = 1", "own.lambda", "keyword", at="lambda = 1"
    ),
    "own name that is no identifier": case(
        "own_step = 0.1", 'own_step = 0.1\n"a b" = 1', 'own."a b"', "letters", at='"a b"'
    ),
    "own name with an unknown unit": case('"40 kHz"', '"40 kXz"', "own.sample_rate.value", "not known"),
    "target without a limit": case('bandwidth = { min = "5 MHz", ', "bandwidth = { ", "target.bandwidth", "min or max"),
    "target as a bare value": case(
        'output_noise = { max = "80 uV", at = "nominal" }', 'output_noise = "80 uV"', "target.output_noise", "a table"
    ),
    "limits the wrong way round": case(
        "min = 0.65, max = 1.0", "min = 1.0, max = 0.65", "target.dc_gain.min", "at most the other limit"
    ),
    "limit of another dimension": case(
        'min = "5 MHz"', 'min = "5 V"', "target.bandwidth.min", "a voltage", "a frequency"
    ),
    "yield on another metric": case("guard = 0.1", "yield = 0.9", "target.bandwidth.yield", "offset_limit"),
    "yield of everything": case("yield = 0.997", "yield = 1.0", "target.offset_limit.yield", "below 1"),
    "formula on a metric": case("guard = 0.1", 'formula = "power"', "target.bandwidth.formula", "metric of its own"),
    "negative guard": case("guard = 0.1", "guard = -0.1", "target.bandwidth.guard", "at least 0"),
    "unknown condition of a target": case(
        'at = "nominal"', 'at = "nominel"', "target.output_noise.at", 'did you mean "nominal"?'
    ),
    "unit of a figure with a prefix": case(
        'unit = "Hz/W"', 'unit = "kHz/W"', "target.figure.unit", "without a prefix", '"Hz/W"'
    ),
    "unit of a figure on a scale": case('unit = "Hz/W"', 'unit = "dB"', "target.figure.unit", "without a prefix"),
    "limit of a figure in another unit": case(
        "min = 1e11, unit", 'min = "1 V", unit', "target.figure.min", "does not fit"
    ),
    "figure that shadows a design variable": case("figure = {", "width = {", "target.width", "shadows the key"),
    "figure with an unknown name": case(
        "bandwidth/power", "bandwidth/powr", "target.figure.formula", "did you mean power?"
    ),
    "evidence of nothing": case(
        'metric = "bandwidth"', 'metric = "bandwdth"', "evidence.0.metric", 'did you mean "bandwidth"?'
    ),
    "evidence without a value": case('value = "5.6 MHz"\n', "", "evidence.0.value", "missing", at="[[evidence]]"),
    "evidence of another dimension": case('"5.6 MHz"', '"5.6 V"', "evidence.0.value", "a frequency"),
    "evidence by nobody known": case('"simulation"', '"simulated"', "evidence.0.found_by", '"simulation"'),
    "evidence with a date as text": case(
        "dated = 2026-11-02", 'dated = "2026-11-02"', "evidence.0.dated", "without quotes"
    ),
    "evidence with a time": case("dated = 2026-11-02", "dated = 2026-11-02T10:00:00", "evidence.0.dated", "a day"),
    "evidence at half a condition": case(
        ', supply = "1.62 V"', "", "evidence.0.at.supply", "missing", at="at = { process"
    ),
    "spread on a scale": case(
        'metric = "figure"\nvalue = 2e11\nlow = 1e11\nhigh = 3e11\nspread = 1e9',
        'metric = "dc_gain"\nvalue = 0.7\nspread = "1 dB"',
        "evidence.1.spread",
        "a difference",
        at='spread = "1 dB"',
    ),
    "evidence that is one table": case("[[waiver]]", "[waiver]", "waiver", "[[waiver]]"),
    "waiver of no target": case(
        'target = "bandwidth"', 'target = "power"', "waiver.0.target", "a target of this sheet"
    ),
    "waiver without a reason": case('reason = "second silicon"\n', "", "waiver.0.reason", "missing", at="[[waiver]]"),
    "waiver with an empty name": case('by = "L. Marsh"', 'by = " "', "waiver.0.by", "not an empty text"),
    "invalid date": case("dated = 2026-11-03", "dated = 2026-13-03", "waiver.0.dated", "valid TOML"),
    "table for a text": case('owner = "R. Osei"', "owner = { a = 1 }", "owner", "a table", "text in quotes"),
    "number for a text": case('owner = "R. Osei"', "owner = 5", "owner", "5", "text in quotes"),
    "value for a table": case("[solve]\nkeep", "[solve.keep]\nkeep", "solve.keep", "a table"),
    "control character in a name": case('device = "nfet"', r'device = "n\u001bfet"', "device", "a name"),
    "key stated again": case(
        'length = "0.5 um"',
        'width = "1 um"\nlength = "0.5 um"',
        "choose.width",
        "again",
        "line 30",
        at='width = "1 um"',
    ),
    "table stated again": case("[own]", "[assume]\n[own]", "assume", "again", at="[assume]\n[own]"),
    "deep nesting": case("own_step = 0.1", "own_step = " + "[" * 10_000, "own", "nested", at="own_step ="),
    "deep keys": case("own_step = 0.1", "a" + ".a" * 200_000 + " = 1", "own.a", "nested"),
    "zero byte in text": case("R. Osei", "R.\0Osei", "", "zero byte"),
    "raw control character": case("R. Osei", "R.\x07Osei", "owner", "valid TOML"),
    "conflict": case(
        "count = 64", "<<<<<<< ours\ncount = 64\n=======\ncount = 32\n>>>>>>> theirs", "", "conflict marker"
    ),
    "left over marker": case("count = 64", "count = 64\n>>>>>>> theirs", "", "conflict marker", at=">>>>>>>"),
}

PROCESSES = {
    "parameter missing": case('threshold = "0.45 V"\n', "", "device.nfet.threshold", "missing", at="[device.nfet]"),
    "unknown parameter": case("threshold =", "treshold =", "device.nfet.treshold", "did you mean threshold?"),
    "kappa above 1": case("value = 0.7", "value = 1.1", "device.nfet.kappa.value", "above 0 and at most 1"),
    "coupling above 1": case(
        "drain_coupling = 0.02",
        "drain_coupling = 0.4",
        "device.nfet.drain_coupling",
        "kappa + drain_coupling",
        "at most 1",
    ),
    "formula in a process file": case(
        "kappa = { value = 0.7", 'kappa = { formula = "0.7"', "device.nfet.kappa.formula", "as a number"
    ),
    "polarity": case('polarity = "n"', 'polarity = "nmos"', "device.nfet.polarity", '"n" or "p"'),
    "own well as text": case("own_well = false", 'own_well = "false"', "device.nfet.own_well", "without quotes"),
    "shortest above longest": case(
        'min_length = "0.18 um"', 'min_length = "60 um"', "device.nfet.min_length", "at most max_length"
    ),
    "no device": case(PROCESS[PROCESS.index("[device") :], "", "device", "missing", at="schema"),
    "device called ideal": case("[device.nfet]", "[device.ideal]", "device.ideal", "cannot name a device"),
    "device with a path": case("[device.nfet]", '[device."a/b"]', 'device."a/b"', "cannot name a device"),
    "corner of no device": case("[corner.slow.nfet]", "[corner.slow.nfe]", "corner.slow.nfe", "did you mean nfet?"),
    "unknown change": case(
        "threshold_shift =", "treshold_shift =", "corner.slow.nfet.treshold_shift", "did you mean threshold_shift?"
    ),
    "changed typical": case("[corner.slow.nfet]", "[corner.typical.nfet]", "corner.typical", "nothing moves"),
    "temperature in degrees without a sign": case('"27 °C"', '"27 C"', "reference_temperature", '"°C"'),
    "temperature below absolute zero": case('"27 °C"', '"-300 °C"', "reference_temperature", "absolute zero"),
    "propose in a process file": case(
        'threshold = "0.45 V"', 'threshold = "propose"', "device.nfet.threshold", "[choose]"
    ),
}

PROJECTS = {
    "process file missing": case('process = "example_180"\n', "", "process", "missing", at="schema"),
    "process file elsewhere": case('"example_180"', '"../../etc/secret"', "process", "cannot name a process file"),
    "conditions missing": case("[conditions]", "[condition]", "conditions", "missing", at="schema"),
    "no supply": case('supply = "1.8 V"\n', "supply = []\n", "conditions.supply", "at least one"),
    "supply 0": case('supply = "1.8 V"\n', 'supply = ["1.8 V", "0 V"]\n', "conditions.supply.1", "above 0 V"),
    "temperature in a list": case('"27 °C",\n]', '"27 C",\n]', "conditions.temperature.1", '"°C"'),
    "nominal missing": case("nominal = {", "nominl = {", "conditions.nominal", "missing", at="[conditions]"),
    "nominal as text": case("nominal = {", 'nominal = "typical"\nx = {', "conditions.nominal", "a table"),
    "budget of a metric that does not add up": case(
        "gate_area = {", "bandwidth = {", "budget.bandwidth", "does not add up"
    ),
    "budget of nothing": case("gate_area = {", "gate_aera = {", "budget.gate_aera", "did you mean gate_area?"),
    "budget as a bare value": case(
        'gate_area = { max = "0.02 mm^2" }', 'gate_area = "0.02 mm^2"', "budget.gate_area", "{ max ="
    ),
    "budget with a least": case('{ max = "250 uA" }', '{ min = "250 uA" }', "budget.supply_current.max", "missing"),
    "unknown table": case("[budget]", "[budgets]", "budgets", "did you mean budget?"),
}


def _check(one: Case, good: str, shown: str, parse: Callable[[str], tuple[Any, list[Problem]]]) -> None:
    assert one.old in good
    bad = good.replace(one.old, one.new, 1)
    line = line_of(bad, one.at) if one.at else line_of(good, one.old)
    result, problems = parse(bad)
    assert result is None
    assert all(problem.file == shown for problem in problems)
    texts = [str(problem) for problem in problems]
    assert all(text == clean(text) for text in texts)
    match = [p for p in problems if p.key == one.key and all(word in p.message for word in one.words)]
    assert match, texts
    assert match[0].line == line, texts
    assert str(match[0]).startswith(f"{shown}:{line}: {one.key}")


@pytest.mark.parametrize("one", SHEETS.values(), ids=SHEETS.keys())
def test_sheet(one: Case) -> None:
    _check(one, SHEET, "sheets/buffer.toml", lambda text: parse_sheet(text, "buffer", "sheets/buffer.toml"))


@pytest.mark.parametrize("one", PROCESSES.values(), ids=PROCESSES.keys())
def test_process(one: Case) -> None:
    _check(one, PROCESS, "process/a.toml", lambda text: parse_process(text, "a", "process/a.toml"))


@pytest.mark.parametrize("one", PROJECTS.values(), ids=PROJECTS.keys())
def test_project(one: Case) -> None:
    _check(one, PROJECT, "biasbook.toml", lambda text: parse_project(text, "biasbook.toml"))


def test_every_problem_at_once_in_the_order_of_the_file() -> None:
    changes = ("count = 64", "count = 0"), ('"20 um"', '"20 V"'), ("keep =", "kep ="), ("bandwidth = {", "bandwith = {")
    bad = SHEET
    for old, new in changes:
        bad = bad.replace(old, new)
    _, problems = parse_sheet(bad, "buffer", "buffer.toml")
    keys = [problem.key for problem in problems]
    assert keys == ["count", "choose.width", "solve.kep", "target.bandwith", "waiver.0.target"]
    assert [p.line for p in problems] == sorted(p.line or 0 for p in problems)


def test_a_wrong_stage_does_not_cast_doubt_on_good_keys() -> None:
    bad = SHEET.replace('"source-follower"', '"source-folower"').replace('"4 uA"', '"4 V"')
    _, problems = parse_sheet(bad, "buffer", "buffer.toml")
    assert [problem.key for problem in problems] == ["stage", "choose.bias_current"]


def test_a_metric_that_the_stage_has_not_is_no_target_and_no_evidence() -> None:
    bad = SHEET.replace('"source-follower"', '"common-source"').replace("input_level =", "output_level =")
    bad = bad.replace("dc_gain = { min = 0.65, max = 1.0", 'input_low = { max = "1 V"')
    bad = bad.replace(
        'metric = "figure"\nvalue = 2e11\nlow = 1e11\nhigh = 3e11', 'metric = "input_high"\nvalue = "1 V"'
    )
    _, problems = parse_sheet(bad, "buffer", "buffer.toml")
    assert [problem.key for problem in problems] == ["target.input_low", "evidence.1.metric"]
    assert all("not defined for a common source" in problem.message for problem in problems)


def test_every_repeated_key_is_named() -> None:
    bad = SHEET.replace("count = 64", "count = 64\ncount = 32").replace("fingers = 4", "fingers = 4\nfingers = 5")
    _, problems = parse_sheet(bad, "buffer", "buffer.toml")
    assert [problem.key for problem in problems] == ["count", "choose.fingers"]


def test_every_conflict_is_named() -> None:
    conflict = "<<<<<<< ours\n{0}\n=======\n{0}\n>>>>>>> theirs"
    bad = SHEET.replace("count = 64", conflict.format("count = 64")).replace(
        "fingers = 4", conflict.format("fingers = 4")
    )
    _, problems = parse_sheet(bad.replace("\n", "\r\n"), "buffer", "buffer.toml")
    assert [problem.line for problem in problems] == [
        line_of(bad, "<<<<<<<"),
        bad.count("\n", 0, bad.rindex("<<<<<<<")) + 1,
    ]


def test_an_underline_in_notes_is_no_conflict() -> None:
    good = SHEET.replace("Second line.", "=======\n>>>>>>> quoted text")
    sheet, problems = parse_sheet(good, "buffer", "buffer.toml")
    assert problems == []
    assert sheet is not None


@pytest.mark.parametrize(
    "name", ["pi", "min", "max", "sqrt", "log", "exp", "abs", "class", "lambda", "1st", "a-b", "a b", "", "x" * 200]
)
def test_names_that_no_sheet_can_have(name: str) -> None:
    sheet, problems = parse_sheet(SHEET, name, "sheets/odd.toml")
    assert sheet is None
    assert "sheet name" in problems[0].message
    assert problems[0].file == "sheets/odd.toml"


def test_messages_are_harmless() -> None:
    bad = SHEET.replace('device = "nfet"', r'device = "\u001b]0;x\u0007\u202e"').replace(
        "[own]", '[own]\n"\\u001b[31m" = 1'
    )
    _, problems = parse_sheet(bad, "buffer", "buffer.toml")
    assert len(problems) == 2
    for problem in problems:
        assert str(problem) == clean(str(problem))


def test_a_file_of_slips_is_cut_short() -> None:
    bad = SHEET + "\n[assume.extra]\n" + "".join(f"k{i} = 1\n" for i in range(5000))
    bad = bad.replace("[own]", "[own]\n" + "".join(f'"k {i}" = 1\n' for i in range(5000)))
    _, problems = parse_sheet(bad, "buffer", "buffer.toml")
    assert len(problems) == 101
    assert "further problems" in problems[-1].message
