"""Malformed and hostile books through the real command: each ends with status 2 and a message that names file and key,
never with a traceback, and whatever else is in the book is reviewed all the same."""

from __future__ import annotations

import json
import os
import signal
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import NamedTuple

import pytest

from tests.cli import books
from tests.cli.books import BUFFER, FOLLOWER, OTHER, PROCESS, PROJECT, replaced
from tests.support import Run, run

SHEET_FILE = f"sheets/{BUFFER}.toml"
PROCESS_FILE = "process/plain_180.toml"
PROJECT_FILE = "biasbook.toml"


class Case(NamedTuple):
    """A change of a good text: the key that the message must name, and words that it must hold."""

    old: str
    new: str
    key: str
    words: tuple[str, ...]


def case(old: str, new: str, key: str, *words: str) -> Case:
    return Case(old, new, key, words)


OWN = 'line = { value = "0.4 pF", source = "floor plan" }'
LOAD = '{ value = "1.2 pF", source = "floor plan", trust = "estimate", note = "" }'
WIDTH, LENGTH = 'width = "20 um"', 'length = "0.5 um"'
LEVEL = 'input_level = { value = "1.1 V", source = "sensor" }'


def load(formula: str) -> Case:
    """A load given by a formula that cannot be had."""
    return case(LOAD, f'{{ formula = "{formula}" }}', "assume.load_capacitance")


SHEETS = {
    "wrong unit": case('"4 uA"', '"10 kHz"', "choose.bias_current", '"10 kHz"', "a frequency", "a current"),
    "no unit": case('"4 uA"', '"4"', "choose.bias_current", "unit"),
    "unknown key": case("bias_current =", "bias_curent =", "choose.bias_curent", "did you mean bias_current"),
    "unknown table": case("[target]", "[targets]", "targets", "did you mean target"),
    "unknown metric": case("bandwidth =", "bandwith =", "target.bandwith", "did you mean bandwidth"),
    "unknown stage": case('"source-follower"', '"source-folower"', "stage", "did you mean"),
    "unknown device": case('"nfet"', '"nfett"', "device", "nfett", "nfet, pfet"),
    "unknown bias device": case(
        "[assume]", '[bias]\ndevice = "nfex"\n\n[assume]', "bias.device", "nfex", "did you mean"
    ),
    "bias device of the other polarity": case(
        "[assume]", '[bias]\ndevice = "pfet"\n\n[assume]', "bias.device", "p-channel", "same polarity"
    ),
    "no well of its own": case('device = "nfet"', 'device = "nfet"\nbulk = "source"', "bulk", "no well of its own"),
    "width beyond the process": case(WIDTH, 'width = "20 mm"', "choose.width", "20 mm", "process limits"),
    "length below the process": case(LENGTH, 'length = "0.1 um"', "choose.length", "100 nm", "180 nm"),
    "length by a formula below the process": case(
        LENGTH, 'length = { formula = "1e-7*min(1, line/line)" }', "choose.length", "1e-07", "limits of nfet"
    ),
    "negative load": case('"1.2 pF"', '"-1.2 pF"', "assume.load_capacitance", "at least 0"),
    "infinity": case('"4 uA"', "inf", "choose.bias_current", "infinity"),
    "not a number": case('"4 uA"', "nan", "choose.bias_current", "NaN"),
    "a flag": case('"4 uA"', "true", "choose.bias_current", "true or false"),
    "out of the range of numbers": case('"4 uA"', '"4e400 A"', "choose.bias_current", "range"),
    "count of nothing": case('owner = "T. Vik"', "count = 0", "count", "at least 1"),
    "both levels": case(LEVEL, f'{LEVEL}\noutput_level = "0.5 V"', "assume", "one of them"),
    "level that the stage does not take": case(
        'stage = "source-follower"', 'stage = "cascode"', "assume.input_level", "takes no input_level"
    ),
    "well without a well": case(
        LEVEL, f'{LEVEL}\nwell_capacitance = "1 fF"', "assume.well_capacitance", 'bulk = "source"'
    ),
    "size of an ideal source": case(LENGTH, f'{LENGTH}\nbias_width = "1 um"', "choose.bias_width", "ideal"),
    "in both tables": case(LEVEL, f"{LEVEL}\n{WIDTH}", "choose.width", "[assume]"),
    "rejection of a stage that has none": case(
        'stage = "source-follower"', 'stage = "drain-follower"', "target.supply_rejection", "no meaning"
    ),
    "own name of a metric": case(OWN, f"{OWN}\nbandwidth = 1", "own.bandwidth", "shadows the metric"),
    "own name of a function": case(OWN, f"{OWN}\nmin = 1", "own.min", "shadows"),
    "own name of a constant": case(OWN, f"{OWN}\npi = 3", "own.pi", "constant"),
    "own name that is a keyword": case(OWN, f"{OWN}\nclass = 3", "own.class", "keyword"),
    "own name that nothing uses": case(OWN, f"{OWN}\nspare = 3", "own.spare", "used by no formula"),
    "formula that is code": load("__import__('os').system('true')"),
    "formula of an attribute": load("line.__class__"),
    "formula of an unknown name": load("lin*2"),
    "formula of a metric of its own": load("bandwidth*1e-20"),
    "formula without a result": load("line/(width-width)"),
    "formula of a root of less than nothing": load("sqrt(-line)"),
    "formula out of range": load("-line"),
    "formula beyond all numbers": load("line*exp(10000)"),
    "formula of a huge power": load("line*9^9^9^9"),
    "formula that is too deep": load("(" * 500 + "line" + ")" * 500),
    "formula that is too long": load("line+" * 5_000 + "line"),
    "formula of a missing sheet": load("nobody.input_capacitance"),
    "formula of a missing name of a sheet": load("amplifier.input_capacitanse"),
    "formula of itself": load("load_capacitance*2"),
    "formula in a circle over a sheet's whole": load("buffer.input_capacitance"),
    "figure out of reach": case('"line/load_capacitance"', '"line/nothing.power"', "target.share", "nothing"),
    "waiver of no target": case(
        "[choose]", '[[waiver]]\ntarget = "power"\nby = "X"\nreason = "Y"\n\n[choose]', "waiver.0.target", "power"
    ),
    "evidence in an unknown corner": case(
        "[choose]",
        '[[evidence]]\nmetric = "bandwidth"\nvalue = "5 MHz"\nfound_by = "simulation"\n'
        'at = { process = "slwo", temperature = "27 °C", supply = "1.8 V" }\n\n[choose]',
        "evidence.0.at",
        "slwo",
        "did you mean 'slow'",
    ),
    "conflict": case(WIDTH, f'<<<<<<< ours\n{WIDTH}\n=======\nwidth = "30 um"\n>>>>>>> theirs', "", "conflict marker"),
    "half a conflict": case(WIDTH, f"{WIDTH}\n>>>>>>> theirs", "", "conflict marker"),
    "text without an end": case(WIDTH, 'width = "20 um', "choose.width", "valid TOML"),
    "key stated again": case(WIDTH, f"{WIDTH}\n{WIDTH}", "choose.width", "again"),
    "deep nesting": case(OWN, "line = " + "[" * 100_000, "own", "nested"),
    "deep keys": case(OWN, "line" + ".a" * 100_000 + " = 1", "own.line", "nested"),
    "deep tables": case(OWN, OWN + "\n[own" + ".a" * 50_000 + "]", "own.a", "nested"),
    "zero byte": case("T. Vik", "T.\0Vik", "", "zero byte"),
    "nothing bounds an open choice": case('bias_current = "4 uA"', 'bias_current = "propose"', "choose.bias_current"),
    "empty saturation range": case(
        "[assume]", '[assume]\nsupply = "0.15 V"', "assume", "empty by", "assume input_level or output_level"
    ),
}
_ALSO = {
    "rejection of a stage that has none": ("[target]\n", '[target]\nsupply_rejection = { min = "20 dB" }\n'),
    "empty saturation range": (LEVEL, ""),
    "nothing bounds an open choice": ('bandwidth = { min = "5 MHz", id = "L-1", source = "plan", why = "speed" }', ""),
}
"""A second change that a case needs."""


@pytest.fixture(autouse=True)
def hang() -> Iterator[None]:
    """A command that waits for ever is stopped, and fails."""
    signal.alarm(20)
    yield
    signal.alarm(0)


def refused(book: Path, file: str, key: str, *words: str) -> Run:
    """Review a book with one thing wrong, as text and as JSON, and check what is said of it."""
    done = run("review", str(book))
    assert done.status == 2, done
    assert "Traceback" not in done.err + done.out
    about = [line for line in done.err.splitlines() if file in line]
    assert about, done.err
    if key:
        about = [line for line in about if f": {key}" in line]
        assert about, done.err
    for word in words:
        assert word in " ".join(about), (word, done.err)
    assert all(len(line) < 600 for line in done.err.splitlines())
    as_json = run("review", str(book), "--json")
    assert as_json.status == 2
    problems = json.loads(as_json.out)["problems"]
    assert any(p["file"] == file and p["key"].startswith(key) and p["message"] for p in problems), problems
    assert all(set(p) == {"file", "line", "key", "message"} for p in problems)
    return done


def others_reviewed(done: Run, book: Path) -> None:
    """The sheet that nobody touched is judged, in text and in JSON."""
    assert "Lamp amplifier" in done.out
    sheets = json.loads(run("review", str(book), "--json").out)["sheets"]
    (other,) = [sheet for sheet in sheets if sheet["sheet"] == OTHER]
    assert [target["verdict"] for target in other["targets"]] == ["met"]


@pytest.mark.parametrize("name", SHEETS)
def test_a_spoilt_sheet_is_named_and_hides_no_other(name: str, tmp_path: Path) -> None:
    change = SHEETS[name]
    text = replaced(FOLLOWER, change.old, change.new)
    if name in _ALSO:
        text = replaced(text, *_ALSO[name])
    book = books.write(tmp_path, text)
    others_reviewed(refused(book, SHEET_FILE, change.key, *change.words), book)


PROCESSES = {
    "kappa and drain coupling above 1": case(
        "drain_coupling = 0.02", "drain_coupling = 0.31", "device.nfet", "at most 1"
    ),
    "kappa above 1": case("kappa = 0.7", "kappa = 1.2", "device.nfet.kappa", "1.2", "at most 1"),
    "missing parameter": case('threshold = "0.45 V"\n', "", "device.nfet.threshold", "missing"),
    "unknown parameter": case("threshold =", "treshold =", "device.nfet.treshold", "did you mean threshold"),
    "formula": case("kappa = 0.7", 'kappa = { formula = "0.7" }', "device.nfet.kappa", "number"),
    "corner of no device": case("[corner.slow.nfet]", "[corner.slow.nfat]", "corner.slow.nfat", "did you mean nfet"),
    "changes in typical": case("[corner.slow.nfet]", "[corner.typical.nfet]", "corner.typical", "none"),
    "grid of nothing": case('grid = "0.005 um"', 'grid = "0 um"', "device.nfet.grid", "above 0"),
    "limits the wrong way round": case(
        'max_width = "10 mm"', 'max_width = "0.1 um"', "device.nfet.min_width", "at most"
    ),
    "conflict": case("own_well = false", "<<<<<<< a\nown_well = false\n=======\n>>>>>>> b", "", "conflict marker"),
}


@pytest.mark.parametrize("name", PROCESSES)
def test_a_spoilt_process_file_is_named(name: str, tmp_path: Path) -> None:
    change = PROCESSES[name]
    book = books.write(tmp_path, process=replaced(PROCESS, change.old, change.new))
    refused(book, PROCESS_FILE, change.key, *change.words)


PROJECTS = {
    "unknown corner": case(
        '"typical", "slow"', '"typical", "slwo"', "conditions.process", "slwo", "did you mean 'slow'"
    ),
    "unknown nominal corner": case(
        'process = "typical", temp', 'process = "quick", temp', "conditions.nominal", "quick"
    ),
    "missing process file": case('"plain_180"', '"plain_181"', "process", "process/plain_181.toml", "plain_180"),
    "process file elsewhere": case('"plain_180"', '"../../plain_180"', "process"),
    "no supplies": case('supply = ["1.7 V", "1.8 V"]', "supply = []", "conditions.supply"),
    "supply in kelvin": case('"1.7 V", ', '"17 °C", ', "conditions.supply", "a temperature"),
    "below absolute zero": case('"0 °C", ', '"-300 °C", ', "conditions.temperature"),
    "budget of what does not add up": case("supply_current =", "dc_gain =", "budget.dc_gain"),
    "newer format": case("schema = 1", "schema = 2", "schema", "newer"),
    "no schema": case("schema = 1\n", "", "schema", "missing"),
    "unknown key": case("owner =", "ownr =", "ownr", "did you mean owner"),
    "conflict": case("owner", "<<<<<<< a\n=======\n>>>>>>> b\nowner", "", "conflict marker"),
}


@pytest.mark.parametrize("name", PROJECTS)
def test_a_spoilt_project_file_is_named(name: str, tmp_path: Path) -> None:
    change = PROJECTS[name]
    book = books.write(tmp_path)
    (book / PROJECT_FILE).write_text(replaced(PROJECT, change.old, change.new), encoding="utf-8")
    refused(book, PROJECT_FILE, change.key, *change.words)


def _swap(path: Path, make: Callable[[Path], object]) -> None:
    path.unlink()
    make(path)


def _outside(path: Path) -> None:
    secret = path.parents[2] / "secret.toml"
    secret.write_text(FOLLOWER, encoding="utf-8")
    path.symlink_to(secret)


PLACES: dict[str, tuple[Callable[[Path], object], str]] = {
    "folder": (Path.mkdir, "a folder"),
    "pipe": (os.mkfifo, "pipe"),
    "link to a device without end": (lambda path: path.symlink_to("/dev/zero"), "leads out of the project"),
    "link out of the project": (_outside, "leads out of the project"),
    "link to nothing": (lambda path: path.symlink_to("nothing.toml"), ""),
    "link to itself": (lambda path: path.symlink_to(path.name), ""),
    "link over the parent": (lambda path: path.symlink_to("../../../../../../../etc/hostname"), "leads out"),
    "empty": (Path.touch, "schema"),
    "too large": (lambda path: path.write_text("#" * 2_000_001), "2"),
    "UTF-16": (lambda path: path.write_bytes(FOLLOWER.encode("utf-16")), "UTF-8"),
    "bytes": (lambda path: path.write_bytes(bytes(range(256)) * 10), "UTF-8"),
}
"""What may stand where a file should: how it is made, and a word of the message."""


@pytest.mark.parametrize("name", PLACES)
@pytest.mark.parametrize("file", [SHEET_FILE, PROCESS_FILE, PROJECT_FILE])
def test_what_is_no_file_is_refused(file: str, name: str, tmp_path: Path) -> None:
    make, word = PLACES[name]
    book = books.write(tmp_path / "book")
    _swap(book / file, make)
    done = run("review", str(book))
    assert done.status == 2, done
    assert word in done.err
    assert "Traceback" not in done.err
    if file == SHEET_FILE:
        assert SHEET_FILE in done.err
        others_reviewed(done, book)


def test_a_pipe_among_the_sheets_is_solved_no_more_than_reviewed(tmp_path: Path) -> None:
    book = books.write(tmp_path / "book")
    _swap(book / SHEET_FILE, os.mkfifo)
    done = run("solve", str(book / SHEET_FILE))
    assert done.status == 2
    assert "pipe" in done.err


@pytest.mark.skipif(os.geteuid() == 0, reason="root reads every file")
def test_a_file_that_may_not_be_read_is_named(tmp_path: Path) -> None:
    book = books.write(tmp_path)
    (book / SHEET_FILE).chmod(0)
    others_reviewed(refused(book, SHEET_FILE, "", "cannot be read"), book)


def test_a_folder_of_sheets_that_leads_out_is_not_followed(tmp_path: Path) -> None:
    book = books.write(tmp_path / "book")
    (book / "sheets").rename(tmp_path / "elsewhere")
    (book / "sheets").symlink_to(tmp_path / "elsewhere")
    done = run("review", str(book))
    assert done.status == 2
    assert "sheets" in done.err
    assert "leads out of the project" in done.err


def test_a_process_folder_that_leads_out_is_not_followed(tmp_path: Path) -> None:
    book = books.write(tmp_path / "book")
    (book / "process").rename(tmp_path / "elsewhere")
    (book / "process").symlink_to(tmp_path / "elsewhere")
    done = run("review", str(book))
    assert done.status == 2
    assert PROCESS_FILE in done.err


@pytest.mark.parametrize("path", ["nothing", "nothing/deeper", "file", "bare", "a\0b", "x" * 5_000])
def test_where_no_project_is_the_command_says_so(path: str, tmp_path: Path) -> None:
    (tmp_path / "file").write_text("schema = 1\n", encoding="utf-8")
    (tmp_path / "bare").mkdir()
    for command in ("review", "open", "history"):
        done = run(command, str(tmp_path / path))
        assert done.status == 2, (command, done)
        assert done.err.startswith("biasbook: "), (command, done)
        assert "Traceback" not in done.err


@pytest.mark.parametrize("name", ["class", "pi", "min", "two words", "1st", "a-b", "supply.x"])
def test_a_sheet_that_no_formula_could_name_is_refused(name: str, tmp_path: Path) -> None:
    book = books.write(tmp_path)
    (book / SHEET_FILE).rename(book / "sheets" / f"{name}.toml")
    done = run("review", str(book))
    assert done.status == 2, done
    assert f"sheets/{name}.toml" in done.err
    others_reviewed(done, book)


def test_marks_and_line_ends_of_other_editors_are_no_problem(tmp_path: Path) -> None:
    plain = json.loads(run("review", str(books.write(tmp_path / "a")), "--json").out)
    text = "\ufeff" + FOLLOWER.replace("\n", "\r\n")
    book = books.write(tmp_path / "b")
    (book / SHEET_FILE).write_bytes(text.encode())
    for file, content in ((PROCESS_FILE, PROCESS), (PROJECT_FILE, PROJECT)):
        (book / file).write_bytes(("\ufeff" + content.replace("\n", "\r\n")).encode())
    assert json.loads(run("review", str(book), "--json").out) == plain


@pytest.mark.parametrize("wanted", ["amplifier.dc_gain", "amplifier.width"])
def test_a_sheet_that_needs_a_bad_one_is_named_too(wanted: str, tmp_path: Path) -> None:
    book = books.write(tmp_path, replaced(FOLLOWER, LOAD, f'{{ formula = "line + 0*{wanted}" }}'))
    sheet = book / f"sheets/{OTHER}.toml"
    sheet.write_text(replaced(sheet.read_text(encoding="utf-8"), "dc_gain", "dc_gian"), encoding="utf-8")
    done = run("review", str(book))
    assert done.status == 2
    assert f"sheets/{OTHER}.toml" in done.err
    assert SHEET_FILE in done.err
    assert OTHER in next(line for line in done.err.splitlines() if SHEET_FILE in line)


def test_a_loop_over_two_sheets_is_printed_whole(tmp_path: Path) -> None:
    book = books.write(tmp_path, replaced(FOLLOWER, LOAD, '{ formula = "line + amplifier.input_capacitance" }'))
    sheet = book / f"sheets/{OTHER}.toml"
    text = replaced(
        books.AMPLIFIER, 'load_capacitance = "1 pF"', 'load_capacitance = { formula = "buffer.input_capacitance" }'
    )
    sheet.write_text(text, encoding="utf-8")
    done = run("review", str(book))
    assert done.status == 2
    assert "form a loop" in done.err
    assert (
        "amplifier.load_capacitance -> buffer (all of it) -> buffer.load_capacitance -> amplifier (all of it) -> "
        "amplifier.load_capacitance"
    ) in done.err


def test_a_step_that_leaves_the_output_range_is_validity_and_no_bad_input(tmp_path: Path) -> None:
    book = books.write(tmp_path, replaced(FOLLOWER, LEVEL, f'{LEVEL}\nstep_size = "900 mV"'))
    done = run("review", str(book), "--json")
    document = json.loads(done.out)
    assert document["problems"] == []
    assert done.status == 1
    sheet = next(s for s in document["sheets"] if s["sheet"] == BUFFER)
    assert {entry["what"] for entry in sheet["validity"]} >= {"range"}
    assert {target["verdict"] for target in sheet["targets"]} == {"unknown"}


HOSTILE = (
    "\x1b]0;owned\x07\x1b[31mred\x1b[0m",
    "[bold red]markup[/bold red] [@click=app.quit]x[/] [/x]",
    "\x9b31m \x85 \u202eevil\u2066 \u200b\ufeff",
    "%s {0} {x!r} $HOME `id` \\ ' \" \n\t end",
    "é 漢字 😀 e\u0301 " + "long " * 2_000,
)
TEXTS = {
    "title": ("", 'title = "Lamp buffer"', "title = {}"),
    "owner": ("", 'owner = "T. Vik"', "owner = {}"),
    "notes": ("", 'notes = "Drives the lamp\'s sense line."', "notes = {}"),
    "source": ("", 'source = "floor plan", trust', "source = {}, trust"),
    "note": ("", 'note = ""', "note = {}"),
    "id": ("", 'id = "L-1"', "id = {}"),
    "target source": ("", 'source = "plan", why', "source = {}, why"),
    "why": ("", 'why = "speed"', "why = {}"),
    "waiver": ("", "[choose]", '[[waiver]]\ntarget = "bandwidth"\nby = {}\nreason = {}\n\n[choose]'),
    "evidence": (
        "",
        "[choose]",
        (
            '[[evidence]]\nmetric = "bandwidth"\nvalue = "1 MHz"\nfound_by = "simulation"\nbasis = {}\nby = {}\n'
            "reference = {}\nnote = {}\n\n[choose]"
        ),
    ),
}


def _harmless(text: str) -> bool:
    return all(c == "\n" or c.isprintable() for c in text)


@pytest.mark.parametrize("field", TEXTS)
@pytest.mark.parametrize("text", HOSTILE, ids=range(len(HOSTILE)))
def test_text_of_every_field_reaches_the_terminal_harmless(field: str, text: str, tmp_path: Path) -> None:
    _, old, new = TEXTS[field]
    spoilt = replaced(FOLLOWER, old, new.replace("{}", json.dumps(text, ensure_ascii=False)))
    spoilt = replaced(spoilt, 'min = "5 MHz"', 'min = "500 MHz"')  # missed, so that all there is gets said
    book = books.write(tmp_path, spoilt)
    done = run("review", str(book), "--details")
    assert done.status in (0, 1), done.err
    assert _harmless(done.out)
    assert _harmless(done.err)
    assert all(len(line) <= 80 for line in done.out.splitlines() if "漢" not in line)
    document = json.loads(run("review", str(book), "--json").out)
    assert document["problems"] == []


@pytest.mark.parametrize("text", HOSTILE[:4], ids=range(4))
@pytest.mark.parametrize("place", ["key", "name", "device", "stage", "value", "formula", "project title"])
def test_hostile_text_in_messages_is_harmless(place: str, text: str, tmp_path: Path) -> None:
    quoted = json.dumps(text, ensure_ascii=False)
    changes = {
        "key": (OWN, f"{OWN}\n{quoted} = 1"),
        "name": ("[choose]", f"[choose]\n{quoted} = 1"),
        "device": ('device = "nfet"', f"device = {quoted}"),
        "stage": ('"source-follower"', quoted),
        "value": ('"4 uA"', quoted),
        "formula": (LOAD, f"{{ formula = {quoted} }}"),
    }
    if place == "project title":
        project = replaced(PROJECT, '"Harbour light"', quoted)
        done = run("review", str(books.write(tmp_path, project=project)))
        assert done.status == 0
    else:
        done = run("review", str(books.write(tmp_path, replaced(FOLLOWER, *changes[place]))))
        assert done.status == 2
        assert SHEET_FILE in done.err
    assert _harmless(done.out)
    assert _harmless(done.err)


def test_many_problems_come_at_once(tmp_path: Path) -> None:
    text = replaced(replaced(FOLLOWER, '"4 uA"', '"4 V"'), "[target]", "[targets]").replace("nfet", "nfot")
    done = run("review", str(books.write(tmp_path, text)))
    keys = [line.split(": ")[2] for line in done.err.splitlines()]
    assert done.status == 2
    assert keys == ["choose.bias_current", "targets"]  # the device is looked for once the sheet can be read


def test_a_book_that_may_not_be_written_is_reviewed(tmp_path: Path) -> None:
    book = books.write(tmp_path / "book")
    before = {path: path.read_bytes() for path in book.rglob("*.toml")}
    for path in [*book.rglob("*"), book]:
        path.chmod(0o555 if path.is_dir() else 0o444)
    try:
        assert run("review", str(book)).status == 0
        assert {path: path.read_bytes() for path in book.rglob("*.toml")} == before
    finally:
        for path in [book, *book.rglob("*")]:
            path.chmod(0o755 if path.is_dir() else 0o644)
