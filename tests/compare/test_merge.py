"""Merging by value: what one side changed is taken, what both changed is said, and comments stay."""

import copy
import tomllib
from typing import Any

import pytest
import tomlkit
from hypothesis import given
from hypothesis import strategies as st

from worksheet.compare import conflict
from worksheet.compare.merge import Driven, Merged, merge, merge_bytes
from worksheet.compare.same import same
from worksheet.compare.settle import Side, settle
from worksheet.model.problem import Problem
from worksheet.model.sheet import Collision
from worksheet.sheetfile.read import parse_sheet

BASE = """\
schema = 1
title = "Element buffer"   # for people
stage = "source-follower"
device = "nfet"

[assume]
# the bus
load_capacitance = { value = "1.2 pF", low = "0.9 pF", source = "floor plan", trust = "estimate" }  # tight
input_level = "0.9 V"

[choose]
bias_current = "4 uA"    # by hand
width = "20 um"
length = "0.5 um"

[target]
bandwidth = { min = "5 MHz", id = "AFE-12" }
power = { max = "20 uW" }

[[evidence]]
# first run
metric = "bandwidth"
value = "5.6 MHz"
found_by = "simulation"
reference = "run 1"

[[waiver]]
target = "power"
by = "Ada"
reason = "late"
until = 2027-01-31
"""
MORE = """
[[evidence]]
metric = "bandwidth"
value = "5.1 MHz"
found_by = "measurement"
reference = "bench"
"""


def merged(ours: str, theirs: str, base: str = BASE) -> Merged:
    done = merge(base, ours, theirs, "sheets/buffer.toml")
    assert isinstance(done, Merged), done
    return done


def changed(*changes: tuple[str, str], text: str = BASE) -> str:
    for old, new in changes:
        assert text.count(old) == 1, old
        text = text.replace(old, new)
    return text


def clean(ours: str, theirs: str) -> str:
    done = merged(ours, theirs)
    assert done.collisions == ()
    assert done.marked == done.theirs == done.text
    return done.text


def test_different_keys_are_both_taken_and_comments_stay() -> None:
    ours = changed(('bias_current = "4 uA"', 'bias_current = "5 uA"'), ('"Element buffer"', '"Buffer"'))
    theirs = changed(('width = "20 um"', 'width = "22 um"'), ('max = "20 uW"', 'max = "25 uW"'))
    assert clean(ours, theirs) == changed(('"20 um"', '"22 um"'), ('max = "20 uW"', 'max = "25 uW"'), text=ours)


def test_neighbouring_lines_do_not_collide_as_they_would_for_git() -> None:
    ours = changed(('bias_current = "4 uA"    # by hand\n', 'bias_current = "5 uA"    # by hand\n'))
    theirs = changed(('width = "20 um"\n', 'width = "22 um"\nfingers = 2\n'))
    assert tomllib.loads(clean(ours, theirs))["choose"] == {
        "bias_current": "5 uA", "width": "22 um", "length": "0.5 um", "fingers": 2,
    }  # fmt: skip


def test_keys_and_tables_come_and_go() -> None:
    ours = changed(('input_level = "0.9 V"\n', ""), ('length = "0.5 um"\n', 'length = "0.5 um"\nfingers = 4\n'))
    theirs = changed(
        ("[target]\n", '[own]\nrate = "40 kHz"\n\n[target]\noffset_limit = { max = "6 mV", yield = 0.99 }\n'),
        ('power = { max = "20 uW" }\n', ""),
    )
    data = tomllib.loads(clean(ours, theirs))
    assert "input_level" not in data["assume"]
    assert data["choose"]["fingers"] == 4
    assert data["own"] == {"rate": "40 kHz"}
    assert data["target"] == {
        "bandwidth": {"min": "5 MHz", "id": "AFE-12"},
        "offset_limit": {"max": "6 mV", "yield": 0.99},
    }


def test_a_true_collision_keeps_ours_and_says_both() -> None:
    ours = changed(('"4 uA"', '"5 uA"'), ('"20 um"', '"21 um"'))
    theirs = changed(('"4 uA"', '"6 uA"'), ('"0.5 um"', '"0.6 um"'))
    done = merged(ours, theirs)
    assert done.text == changed(('"0.5 um"', '"0.6 um"'), text=ours)
    assert done.collisions == (Collision("choose.bias_current", '"4 uA"', '"5 uA"', '"6 uA"'),)
    assert done.theirs == changed(('"5 uA"', '"6 uA"'), text=done.text)
    assert done.marked is not None
    sheet, problems = parse_sheet(done.marked, "buffer", "sheets/buffer.toml")
    assert problems == []
    assert sheet is not None
    assert sheet.collisions == done.collisions
    assert sheet.collisions[0].line == done.marked.splitlines().index("[[collision]]") + 1
    assert sheet.choose["bias_current"].number == 5e-6


@pytest.mark.parametrize(
    ("ours", "theirs"),
    [
        ('"4.0 uA"', '"4 µA"'),
        ('"5 uA"', '"5.0 uA"'),
        ('"5 uA"', "5e-6"),
        ('{ value = "5 uA" }', '"5 uA"'),
        ('"5 uA"', '"0.005 mA"'),
    ],
)
def test_one_quantity_written_in_two_ways_is_no_collision(ours: str, theirs: str) -> None:
    assert clean(changed(('"4 uA"', ours)), changed(('"4 uA"', theirs))) == changed(('"4 uA"', ours))


def test_a_reformatted_side_is_no_change() -> None:
    theirs = tomlkit.dumps(tomllib.loads(BASE)).replace("\n\n", "\n")
    ours = changed(('"4 uA"', '"5 uA"'))
    assert clean(ours, theirs) == ours
    assert clean(theirs, ours) == theirs.replace('"4 uA"', '"5 uA"')


def test_a_value_and_its_source_are_merged_as_one() -> None:
    ours = changed(('value = "1.2 pF"', 'value = "1.4 pF"'))
    theirs = changed(('source = "floor plan"', 'source = "floor plan, rev 3"'))
    (collision,) = merged(ours, theirs).collisions
    assert collision.key == "assume.load_capacitance"
    assert "1.4 pF" in collision.ours
    assert "rev 3" in collision.theirs


def test_a_note_is_merged_on_its_own() -> None:
    ours = changed(('value = "1.2 pF"', 'value = "1.4 pF"'))
    theirs = changed(('trust = "estimate" }', 'trust = "estimate", note = "ask layout" }'))
    assert clean(ours, theirs) == changed(
        ('trust = "estimate" }', 'trust = "estimate", note = "ask layout" }'), text=ours
    )
    both = merged(
        changed(('trust = "estimate" }', 'trust = "estimate", note = "ask us" }'), text=ours), theirs
    ).collisions
    assert both == (Collision("assume.load_capacitance.note", "", '"ask us"', '"ask layout"'),)


def test_a_bare_value_takes_what_the_other_side_puts_beside_it() -> None:
    theirs = changed(('input_level = "0.9 V"', 'input_level = { value = "0.9 V", source = "data sheet" }'))
    ours = changed(('"20 um"', '"21 um"'))
    assert clean(ours, theirs) == changed(
        ('input_level = "0.9 V"', 'input_level = { value = "0.9 V", source = "data sheet" }'), text=ours
    )


def test_a_value_may_become_a_formula_on_one_side() -> None:
    theirs = changed(
        ('load_capacitance = { value = "1.2 pF", low = "0.9 pF",', 'load_capacitance = { formula = "2*1e-12",')
    )
    ours = changed(('"20 um"', '"21 um"'))
    assert tomllib.loads(clean(ours, theirs))["assume"]["load_capacitance"] == {
        "formula": "2*1e-12", "source": "floor plan", "trust": "estimate",
    }  # fmt: skip


def test_taken_out_on_one_side_and_changed_on_the_other() -> None:
    done = merged(changed(('width = "20 um"\n', "")), changed(('"20 um"', '"21 um"')))
    assert done.collisions == (Collision("choose.width", '"20 um"', "", '"21 um"'),)
    assert done.theirs is not None
    assert tomllib.loads(done.theirs)["choose"]["width"] == "21 um"
    back = merged(changed(('"20 um"', '"21 um"')), changed(('width = "20 um"\n', "")))
    assert back.collisions == (Collision("choose.width", '"20 um"', '"21 um"', ""),)
    assert back.theirs is not None
    assert "width" not in tomllib.loads(back.theirs)["choose"]


def test_evidence_of_both_sides_is_kept() -> None:
    ours = BASE + MORE
    theirs = BASE + MORE.replace('"bench"', '"bench 2"').replace("5.1", "5.2")
    found = tomllib.loads(clean(ours, theirs))["evidence"]
    assert [one["reference"] for one in found] == ["run 1", "bench", "bench 2"]
    assert clean(ours, ours) == ours


def test_an_entry_that_one_side_changed_or_took_out() -> None:
    ours = BASE + MORE
    theirs = changed(('value = "5.6 MHz"', 'value = "5.7 MHz"'))
    assert clean(ours, theirs) == ours.replace("5.6 MHz", "5.7 MHz")
    gone = BASE[: BASE.index("[[evidence]]")] + BASE[BASE.index("[[waiver]]") :]
    assert [one["reference"] for one in tomllib.loads(clean(ours, gone))["evidence"]] == ["bench"]
    assert "evidence" not in tomllib.loads(clean(gone, changed(('"20 um"', '"21 um"'))))


def test_a_waiver_that_one_side_prolonged_and_the_other_took_back_collides() -> None:
    ours = changed(("2027-01-31", "2027-06-30"))
    theirs = BASE[: BASE.index("[[waiver]]")]
    done = merged(ours, theirs)
    (collision,) = done.collisions
    assert (collision.key, collision.theirs) == ("waiver", "")
    assert done.text == ours
    assert done.theirs is not None
    assert "waiver" not in tomllib.loads(done.theirs)
    back = merged(theirs, ours)
    assert back.text == theirs
    assert back.theirs is not None
    assert tomllib.loads(back.theirs)["waiver"] == tomllib.loads(ours)["waiver"]


def test_two_new_waivers_for_one_target_collide() -> None:
    without = BASE[: BASE.index("[[waiver]]")]
    waiver = BASE[BASE.index("[[waiver]]") :]
    done = merged(without + waiver, without + waiver.replace("Ada", "Grace"), without)
    assert [one.key for one in done.collisions] == ["waiver"]
    assert merged(without + waiver, without + waiver, without).collisions == ()


def test_a_file_that_both_added() -> None:
    theirs = changed(('"4 uA"', '"6 uA"'), ("\n[[waiver]]", MORE + "\n[[waiver]]"))
    done = merged(BASE, theirs, "")
    assert done.collisions == (Collision("choose.bias_current", "", '"4 uA"', '"6 uA"'),)
    assert len(tomllib.loads(done.text)["evidence"]) == 2


def test_line_ends_and_the_mark_before_the_text_stay() -> None:
    ours = "\ufeff" + changed(('"4 uA"', '"5 uA"')).replace("\n", "\r\n")
    theirs = changed(("[target]\n", '[own]\nrate = "40 kHz"\n\n[target]\n'), ('"20 um"', '"21 um"'))
    text = clean(ours, theirs)
    assert text.startswith("\ufeff")
    assert text.count("\n") == text.count("\r\n")
    assert tomllib.loads(text.removeprefix("\ufeff"))["own"] == {"rate": "40 kHz"}


def test_own_names_that_look_like_ways_of_stating_a_value() -> None:
    base = BASE + '\n[own]\nvalue = "1 V"\nnote = "2 V"\n'
    ours = base.replace('value = "1 V"', 'value = "3 V"')
    theirs = base.replace('note = "2 V"', 'note = "4 V"')
    done = merged(ours, theirs, base)
    assert done.collisions == ()
    assert tomllib.loads(done.text)["own"] == {"value": "3 V", "note": "4 V"}


def test_a_table_that_only_its_inner_tables_imply_takes_a_new_key() -> None:
    base = 'schema = 1\n\n[own.rate]  # of samples\nvalue = "40 kHz"\n'
    done = merged(base + 'source = "spec"\n', base + '\n[own]\nspan = "1 V"\n', base)
    assert done.collisions == ()
    assert tomllib.loads(done.text)["own"] == {"rate": {"value": "40 kHz", "source": "spec"}, "span": "1 V"}
    assert "# of samples" in done.text


# The driver


def drive(base: str, ours: str, theirs: str, name: str = "p/sheets/buffer.toml") -> Driven:
    return merge_bytes(base.encode(), ours.encode(), theirs.encode(), name)


def test_the_driver_marks_a_sheet_in_its_own_way_and_other_files_in_gits() -> None:
    ours, theirs = changed(('"4 uA"', '"5 uA"'), ('"20 um"', '"21 um"')), changed(('"4 uA"', '"6 uA"'))
    sheet = drive(BASE, ours, theirs)
    assert not sheet.clean
    assert b"[[collision]]" in sheet.content
    assert b"<<<<<<<" not in sheet.content
    process = 'schema = 1\n[device.nfet]\nkappa = {}  # fit\ngrid = "{} um"\n'
    other = drive(process.format(0.7, 1), process.format(0.68, 1), process.format(0.66, 2), "process/a.toml")
    assert not other.clean
    sides = conflict.split(other.content.decode())
    assert sides is not None
    assert sides.ours == process.format(0.68, 2)
    assert sides.theirs == process.format(0.66, 2)
    assert len(sides.hunks) == 1


def test_two_right_sides_that_are_wrong_together_are_not_clean() -> None:
    ours = changed(('width = "20 um"\n', ""), ("[choose]\n", 'width = "20 um"\n\n[choose]\n'))
    theirs = changed(('width = "20 um"\n', ""), ("[choose]\n", '[choose]\nwidth = "20 um"\n'))
    base = changed(('width = "20 um"\n', ""))
    done = drive(base, ours, theirs)
    assert not done.clean
    assert done.collisions == ()
    assert [problem.key for problem in done.problems] == ["choose.width"]


def test_what_cannot_be_read_by_value_keeps_both_sides() -> None:
    done = drive(BASE, BASE + "broken", BASE.replace("4 uA", "5 uA"))
    assert not done.clean
    assert len(done.problems) == 1
    sides = conflict.split(done.content.decode())
    assert sides is not None
    assert (sides.ours, sides.theirs) == (BASE + "broken\n", BASE.replace("4 uA", "5 uA"))
    binary = merge_bytes(BASE.encode(), b"\xff\xfe", BASE.encode(), "sheets/a.toml")
    assert (binary.content, binary.clean) == (b"\xff\xfe", False)


@pytest.mark.parametrize(
    "odd",
    ["x = 12:30:00", "x = 2026-01-01T00:00:00Z", "x = inf", "x = nan", "x = [1, [2]]", "collision = 3", "choose = 3",
     "[[choose]]\nx = 1", "target.bandwidth.min = 3", "[assume.load_capacitance]\nvalue = 1", "evidence = 3"],
)  # fmt: skip
def test_anything_that_is_toml_can_be_merged(odd: str) -> None:
    for sides in ((odd, BASE, BASE + "# x"), (BASE, odd, BASE.replace("4", "5")), (BASE, BASE.replace("4", "5"), odd)):
        for name in ("sheets/a.toml", "biasbook.toml"):
            done = drive(*sides, name)
            if done.clean:
                tomllib.loads(done.content.decode())


# Settling


@pytest.mark.parametrize(
    ("side", "current"), [("standing", "5 uA"), ("ours", "5 uA"), ("theirs", "6 uA"), ("base", "4 uA")]
)
def test_a_collision_is_settled(side: Side, current: str) -> None:
    ours = changed(('"4 uA"', '"5 uA"'))
    done = merged(ours, changed(('"4 uA"', '"6 uA"')))
    assert done.marked is not None
    text = settle(done.marked, 0, side, "sheets/buffer.toml")
    assert isinstance(text, str)
    assert text.rstrip("\n") + "\n" == changed(('"4 uA"', f'"{current}"'))


def test_several_collisions_are_settled_one_by_one() -> None:
    ours = changed(('"4 uA"', '"5 uA"'), ("2027-01-31", "2027-06-30"), ('value = "1.2 pF"', 'value = "1.4 pF"'))
    theirs = changed(
        ('bias_current = "4 uA"', 'bias_current = { value = "6 uA", source = "bench" }'),
        ("2027-01-31", "2027-03-31"),
        ('source = "floor plan"', 'source = "extraction"'),
    )
    done = merged(ours, theirs)
    assert sorted(one.key for one in done.collisions) == ["assume.load_capacitance", "choose.bias_current", "waiver"]
    text = done.marked
    for _ in done.collisions:
        assert text is not None
        settled = settle(text, 0, "theirs", "sheets/buffer.toml")
        assert isinstance(settled, str), settled
        text = settled
    assert done.theirs is not None
    assert text is not None
    assert text.rstrip("\n") == done.theirs.rstrip("\n")
    assert tomllib.loads(text) == tomllib.loads(theirs)
    assert "# by hand" in text


@pytest.mark.parametrize(
    "entry",
    [
        'key = ""\ntheirs = "1"',
        "theirs = '1'",
        'key = "choose.width"\ntheirs = "1\\ny = 2"',
        'key = "choose.width"\ntheirs = "\\"20"',
        'key = "collision"\ntheirs = "1"',
        'key = "choose.width.a.b"\ntheirs = "1"',
        'key = "stage.x"\nours = "1"\ntheirs = "2"',
    ],
)
def test_a_collision_that_makes_no_sense_is_said_and_nothing_changes(entry: str) -> None:
    assert isinstance(settle(f"{BASE}\n[[collision]]\n{entry}\n", 0, "theirs", "a"), Problem)
    assert isinstance(settle(BASE, 0, "theirs", "a"), Problem)


# Laws

_TEXT = st.sampled_from(["1 uA", "1.0 uA", "2 uA", "3 uA"])
_Strategy = st.SearchStrategy[Any]
_STATED: _Strategy = _TEXT | st.fixed_dictionaries(
    {"value": _TEXT}, optional={"low": st.just("1 nA"), "note": st.sampled_from("ab"), "source": st.sampled_from("st")}
)
_ENTRY: _Strategy = st.fixed_dictionaries(
    {"metric": st.sampled_from(["gain", "power"]), "value": st.sampled_from(["1 V", "2 V"])},
    optional={"reference": st.sampled_from(["r1", "r2"])},
)
_SHEET: _Strategy = st.fixed_dictionaries(
    {"schema": st.just(1)},
    optional={
        "title": st.sampled_from(["a", "b", "c"]),
        "assume": st.dictionaries(st.sampled_from(["x", "y", "z"]), _STATED, max_size=3),
        "choose": st.dictionaries(st.sampled_from(["x", "y"]), _STATED, min_size=1, max_size=2),
        "target": st.dictionaries(
            st.sampled_from(["gain", "power"]),
            st.fixed_dictionaries({}, optional={"min": _TEXT, "max": _TEXT, "why": st.sampled_from("uv")}),
            max_size=2,
        ),
        "evidence": st.lists(
            _ENTRY, min_size=1, max_size=3, unique_by=lambda one: (one["metric"], one.get("reference"))
        ),
    },
)


def written(data: dict[str, Any]) -> str:
    return tomlkit.dumps(data)


def meaning(data: dict[str, Any]) -> dict[str, Any]:
    """The data without what means nothing: the order of entries, and tables that hold nothing."""
    kept = copy.deepcopy(data)
    kept["evidence"] = sorted(kept.get("evidence", []), key=lambda one: str(sorted(one.items())))
    return {key: value for key, value in kept.items() if value not in ({}, [])}


@given(_SHEET, _SHEET)
def test_what_one_side_alone_changed_is_the_result(base: dict[str, Any], other: dict[str, Any]) -> None:
    assert clean_of(base, other, base) == written(other)
    taken = tomllib.loads(clean_of(base, base, other))
    assert same((), meaning(taken), meaning(other)), (taken, other)


def clean_of(base: dict[str, Any], ours: dict[str, Any], theirs: dict[str, Any]) -> str:
    done = merge(written(base), written(ours), written(theirs), "a")
    assert isinstance(done, Merged)
    assert done.collisions == ()
    return done.text


@given(_SHEET, _SHEET, _SHEET)
def test_the_sides_may_change_places(base: dict[str, Any], one: dict[str, Any], other: dict[str, Any]) -> None:
    there = merge(written(base), written(one), written(other), "a")
    back = merge(written(base), written(other), written(one), "a")
    assert isinstance(there, Merged)
    assert isinstance(back, Merged)
    assert there.marked is not None
    assert sorted((c.key, c.base, c.ours, c.theirs) for c in there.collisions) == sorted(
        (c.key, c.base, c.theirs, c.ours) for c in back.collisions
    )
    if not there.collisions:
        assert same((), meaning(tomllib.loads(there.text)), meaning(tomllib.loads(back.text)))
    titles = [side.get("title") for side in (base, one, other)]
    assert tomllib.loads(there.text).get("title") == (titles[2] if titles[0] == titles[1] else titles[1])


_MANY = st.lists(_ENTRY, max_size=4, unique_by=lambda one: str(sorted(one.items())))


@given(_MANY, _MANY, _MANY)
def test_no_entry_is_lost(base: list[Any], ours: list[Any], theirs: list[Any]) -> None:
    """Also where several are about the same, and which one became which can only be guessed."""
    first, second, third = (written({"evidence": side} if side else {}) for side in (base, ours, theirs))
    done = merge(first, second, third, "a")
    assert isinstance(done, Merged)
    kept = tomllib.loads(done.text).get("evidence", [])
    told = [tomllib.loads(f"x = {text}")["x"] for c in done.collisions for text in (c.ours, c.theirs) if text]
    for side, other in ((ours, theirs), (theirs, ours)):
        for one in side:
            assert one in kept or one in told or (one in base and one not in other), one
