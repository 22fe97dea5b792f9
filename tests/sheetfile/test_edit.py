"""Edits of a document: what they write, and that every byte beside them stays."""

import datetime
import difflib
import tomllib

import pytest

from tests.sheetfile.texts import PROCESS, PROJECT, SHEET
from worksheet.sheetfile.document import WriteRefusedError
from worksheet.sheetfile.edit import AddEntry, AddTable, Edit, RemoveKey, SetValue, apply
from worksheet.sheetfile.read import parse_process, parse_project, parse_sheet
from worksheet.sheetfile.source import Written

MIXED = """\
# a file that was written by hand
a.b = 1
notes = '''
first
'''

[choose]   # decisions
width="1 um"
  length   =   '2 um'      # indented
# width = "3 um"

# about the list
[x]
list = [ # several
  1, # one
  2,
]
"odd key" = { "in ner" = 1, plain = [ 1,2 ] , last = 'x'}   # tail
# about the waiver
[[waiver]]
k = '1' # c"""


def changes(old: str, *edits: Edit) -> list[str]:
    """The lines that edits take out ("-") and put in ("+")."""
    new = apply(old, edits)
    lines = difflib.ndiff(old.splitlines(), new.splitlines())
    return [line[:1] + line[2:] for line in lines if line[0] in "+-"]


def test_a_value_is_changed_in_its_place() -> None:
    assert changes(SHEET, SetValue(("choose", "length"), "0.6 um")) == [
        '-length = "0.5 um"                        # above the shortest',
        '+length = "0.6 um"                        # above the shortest',
    ]


def test_annotations_stay_beside_a_new_number() -> None:
    new = apply(SHEET, [SetValue(("assume", "load_capacitance"), "2 pF")])
    assert new == SHEET.replace('value = "1.2 pF", low', 'value = "2 pF", low')


def test_a_note_on_a_bare_value_makes_it_a_table() -> None:
    assert changes(SHEET, SetValue(("choose", "length", "source"), "layout")) == [
        '-length = "0.5 um"                        # above the shortest',
        '+length = { value = "0.5 um", source = "layout" }                        # above the shortest',
    ]


def test_a_note_is_added_changed_and_removed() -> None:
    path = ("assume", "input_level", "note")
    assert changes(SHEET, SetValue(path, "two")) == [
        '-input_level = { value = "0.9 V", source = "sensor", trust = "agreed" }',
        '+input_level = { value = "0.9 V", source = "sensor", trust = "agreed", note = "two" }',
    ]
    assert apply(SHEET, [SetValue(path, "one"), SetValue(path, "two"), RemoveKey(path)]) == SHEET


def test_a_formula_takes_the_place_of_a_value_and_back() -> None:
    path = ("assume", "load_capacitance")
    formula = SetValue((*path, "formula"), "3*x")
    assert apply(SHEET, [formula]) == SHEET.replace('value = "1.2 pF", low', 'formula = "3*x", low')
    assert apply(SHEET, [formula, SetValue(path, "1.2 pF")]) == SHEET
    assert apply(SHEET, [formula, SetValue((*path, "value"), "1.2 pF")]) == SHEET
    bare = ("choose", "width")
    assert changes(SHEET, SetValue((*bare, "formula"), "2*length")) == [
        '-width = "20 um"',
        '+width = { formula = "2*length" }',
    ]


def test_new_keys_stand_behind_the_last_of_their_table() -> None:
    assert changes(SHEET, SetValue(("choose", "bias_current"), "5 uA"), SetValue(("own", "q"), 2)) == [
        "+q = 2",
        '-bias_current = "4 uA"',
        '+bias_current = "5 uA"',
    ]
    assert "own_step = 0.1\nq = 2\n\n[choose]" in apply(SHEET, [SetValue(("own", "q"), 2)])
    assert changes(MIXED, SetValue(("choose", "q"), 2)) == ["+  q = 2"]
    assert '# width = "3 um"\n  q = 2\n\n# about' in apply(MIXED, [SetValue(("choose", "q"), 2)])
    assert ']\nnew = true\n"odd' not in apply(MIXED, [SetValue(("x", "new"), True)])
    assert "# tail\nnew = true\n# about the waiver" in apply(MIXED, [SetValue(("x", "new"), True)])


def test_targets_are_added_as_inline_tables() -> None:
    assert changes(SHEET, SetValue(("target", "power", "max"), "20 uW")) == ['+power = { max = "20 uW" }']
    added = SetValue(("target", "power"), {"max": "20 uW", "guard": 0.1})
    assert changes(SHEET, added) == ['+power = { max = "20 uW", guard = 0.1 }']
    assert apply(SHEET, [added, RemoveKey(("target", "power"))]) == SHEET


def test_a_missing_table_is_made_before_the_arrays() -> None:
    text = (
        SHEET.replace("[solve]\n", "").replace('keep = "geometry"\n', "").replace("inversion_coefficient = 1.0\n", "")
    )
    text = text.replace('over = "all"\ncurrent_allowance = 0.05\n\n', "")
    new = apply(text, [SetValue(("solve", "over"), "nominal")])
    assert 'unit = "Hz/W" }\n\n[solve]\nover = "nominal"\n\n[[evidence]]' in new


def test_evidence_and_waivers_are_added_and_removed() -> None:
    entry = AddEntry("evidence", {"metric": "power", "value": 1e-5, "dated": datetime.date(2026, 12, 1)})
    new = apply(SHEET, [entry])
    block = '[[evidence]]\nmetric = "power"\nvalue = 1e-05\ndated = 2026-12-01\n'
    assert new == SHEET.replace("[[waiver]]", f"{block}\n[[waiver]]")
    assert apply(new, [RemoveKey(("evidence", 2))]) == SHEET
    assert apply(SHEET, [AddEntry("remark", {"by": "x"})]) == SHEET + '\n[[remark]]\nby = "x"\n'
    gone = apply(SHEET, [RemoveKey(("evidence", 0)), RemoveKey(("evidence", 0))])
    assert "evidence" not in tomllib.loads(gone)
    assert 'unit = "Hz/W" }\n\n[[waiver]]' in gone


def test_a_device_is_added_beside_the_others() -> None:
    new = apply(PROCESS, [AddTable(("device", "pfet"), {"polarity": "p"})])
    assert 'max_voltage = "1.98 V"\n\n[device.pfet]\npolarity = "p"\n\n[corner.slow.nfet]' in new


def test_removing_a_corner_leaves_no_trace_of_it() -> None:
    new = apply(PROCESS, [RemoveKey(("corner", "slow", "nfet"))])
    assert "corner" not in tomllib.loads(new)
    process, problems = parse_process(new, "a", "a.toml")
    assert problems == []
    assert process is not None


def test_lists_are_edited_entry_by_entry() -> None:
    assert changes(PROJECT, SetValue(("conditions", "temperature", 1), "85 °C")) == ['-    "27 °C",', '+    "85 °C",']
    assert changes(PROJECT, RemoveKey(("conditions", "temperature", 0))) == ['-    "-40 °C",']
    assert changes(PROJECT, SetValue(("conditions", "supply"), ["1.7 V", "1.8 V"])) == [
        '-supply = "1.8 V"',
        '+supply = ["1.7 V", "1.8 V"]',
    ]
    assert changes(PROJECT, SetValue(("conditions", "nominal", "supply"), "1.7 V")) == [
        '-nominal = { process = "typical", temperature = "27 °C", supply = "1.8 V" }',
        '+nominal = { process = "typical", temperature = "27 °C", supply = "1.7 V" }',
    ]


@pytest.mark.parametrize(
    ("edit", "lines"),
    [
        (SetValue(("a", "b"), 2), ["-a.b = 1", "+a.b = 2"]),
        (SetValue(("a", "c"), 2), ["+a.c = 2"]),
        (RemoveKey(("a", "b")), ["-a.b = 1"]),
        (SetValue(("choose", "length"), "3 um"),
         ["-  length   =   '2 um'      # indented", "+  length   =   '3 um'      # indented"]),
        (SetValue(("choose", "width"), "it's"), ['-width="1 um"', '+width="it\'s"']),
        (SetValue(("choose", "length"), "it's"),
         ["-  length   =   '2 um'      # indented", '+  length   =   "it\'s"      # indented']),
        (SetValue(("notes",), "second\n"), ["-first", "+second"]),
        (SetValue(("x", "list", 0), 5), ["-  1, # one", "+  5, # one"]),
        (SetValue(("waiver", 0, "k"), 7), ["-k = '1' # c", "+k = 7 # c"]),
        (SetValue(("x", "odd key", "in ner"), 2),
         ['-"odd key" = { "in ner" = 1, plain = [ 1,2 ] , last = \'x\'}   # tail',
          '+"odd key" = { "in ner" = 2, plain = [ 1,2 ] , last = \'x\'}   # tail']),
        (SetValue(("x", "odd key", "new one"), 2),
         ['-"odd key" = { "in ner" = 1, plain = [ 1,2 ] , last = \'x\'}   # tail',
          '+"odd key" = { "in ner" = 1, plain = [ 1,2 ] , last = \'x\', "new one" = 2}   # tail']),
        (RemoveKey(("x", "odd key", "in ner")),
         ['-"odd key" = { "in ner" = 1, plain = [ 1,2 ] , last = \'x\'}   # tail',
          '+"odd key" = { plain = [ 1,2 ] , last = \'x\'}   # tail']),
        (RemoveKey(("x", "odd key", "plain", 1)),
         ['-"odd key" = { "in ner" = 1, plain = [ 1,2 ] , last = \'x\'}   # tail',
          '+"odd key" = { "in ner" = 1, plain = [ 1, ] , last = \'x\'}   # tail']),
    ],
)  # fmt: skip
def test_the_way_of_writing_stays(edit: Edit, lines: list[str]) -> None:
    assert changes(MIXED, edit) == lines


def test_a_last_line_without_an_end_stays_so() -> None:
    assert apply(MIXED, [SetValue(("waiver", 0, "k"), "2")]).endswith("k = '2' # c")
    assert apply(MIXED, [SetValue(("waiver", 0, "l"), "2")]).endswith("k = '1' # c\nl = \"2\"\n")


@pytest.mark.parametrize(
    "text",
    [
        "a\nb",
        "say \"\"\" and '''",
        "back\\slash",
        "\u202e\x1b[31m",
        "tab\tend",
        "\n",
        "\n\nb\n",
        'end"',
        '"""',
        "a\r\nb",
        "é😀",
        "",
    ],
)
@pytest.mark.parametrize(
    "path", [("notes",), ("title",), ("assume", "input_level", "source"), ("choose", "length", "note")]
)
def test_any_text_can_be_written(path: tuple[str, ...], text: str) -> None:
    for source in (SHEET, SHEET.replace("\n", "\r\n"), SHEET.replace('"""', "'''")):
        new = apply(source, [SetValue(path, text)])
        sheet, problems = parse_sheet(new, "s", "s.toml")
        assert problems == []
        assert sheet is not None
        read = {
            "notes": sheet.notes,
            "title": sheet.title,
            "assume": sheet.assume["input_level"].source,
            "choose": sheet.choose["length"].note,
        }
        assert read[path[0]] == text


@pytest.mark.parametrize("mark", ["", "\ufeff"])
def test_mark_and_carriage_returns_stay(mark: str) -> None:
    text = mark + SHEET.replace("\n", "\r\n")
    edits: list[Edit] = [
        SetValue(("choose", "width"), "30 um"),
        SetValue(("choose", "width", "note"), "a\nb"),
        SetValue(("own", "q"), 1),
        AddEntry("waiver", {"target": "figure", "by": "x", "reason": "y"}),
        SetValue(("notes",), "one\ntwo\n"),
    ]
    new = apply(text, edits)
    assert new.startswith(mark + "schema")
    assert new == mark + apply(SHEET, edits).replace("\n", "\r\n")


@pytest.mark.parametrize(
    ("edit", "words"),
    [
        (SetValue(("choose",), 3), "keys are set one by one"),
        (SetValue((), 3), "needs a key"),
        (SetValue(("evidence", 7, "by"), "x"), "cannot be made"),
        (SetValue(("choose", "width"), float("nan")), "nan is not a value"),
        (SetValue(("choose", "width", "colour"), "x"), "takes no colour"),
        (SetValue(("title",), "\ud800"), "cannot be made"),
        (RemoveKey(("choose", "colour")), "does not exist"),
        (RemoveKey(()), "does not exist"),
        (AddTable(("choose",), {}), "exists already"),
        (AddEntry("choose", {}), "no list of tables"),
    ],
)
def test_what_cannot_be_done_is_refused(edit: Edit, words: str) -> None:
    with pytest.raises(WriteRefusedError, match=words):
        apply(SHEET, [edit])


def test_a_broken_text_is_not_touched() -> None:
    with pytest.raises(WriteRefusedError, match="not valid TOML"):
        apply("a = [", [SetValue(("a",), 1)])


def test_sizes_of_a_proposal_are_taken_over_at_once() -> None:
    edits = [
        SetValue(("choose", key), value)
        for key, value in (("bias_current", "3 uA"), ("width", "11 um"), ("length", "propose"))
    ]
    sheet, problems = parse_sheet(apply(SHEET, edits), "s", "s.toml")
    assert problems == []
    assert sheet is not None
    assert (sheet.choose["bias_current"].number, sheet.choose["width"].number, sheet.choose["length"].propose) == (
        3e-6,
        1.1e-5,
        True,
    )


def test_the_project_file_takes_edits() -> None:
    new = apply(
        PROJECT, [SetValue(("budget", "power", "max"), "1 mW"), SetValue(("budget", "gate_area", "max"), "0.03 mm^2")]
    )
    project, problems = parse_project(new, "biasbook.toml")
    assert problems == []
    assert project is not None
    assert project.budgets["power"] == 1e-3


def test_a_long_note_of_many_lines_is_set_and_set_again_as_lines() -> None:
    note = 'a line with "quotes" and a \\ in it\n' * 5_000 + 'µ"'
    text = apply('notes = "short" # kept\n', [SetValue(("notes",), note)])
    again = apply(text, [SetValue(("notes",), note + "!")])
    assert tomllib.loads(again)["notes"] == note + "!"
    assert again.endswith('!""" # kept\n')
    assert apply('notes = "short"\n', [SetValue(("notes",), "one\ntwo")]) == 'notes = """\none\ntwo"""\n'


def test_a_number_stays_as_it_was_typed() -> None:
    edits = [
        SetValue(("target", "figure", "min"), Written("1e11")),
        SetValue(("target", "figure", "max"), Written(".5")),
    ]
    text = apply("[target]\nfigure = { min = 2e10, max = 3 }\n", edits)
    assert text == "[target]\nfigure = { min = 1e11, max = 0.5 }\n"
