"""Whatever is edited in whatever document: the value edited changes, and no byte beside it."""

import copy
import re
import tomllib
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.sheetfile.sheets import WORDS, Drawn, sheets
from tests.sheetfile.texts import PROCESS, PROJECT, SHEET
from worksheet.sheetfile.document import WriteRefusedError
from worksheet.sheetfile.edit import AddEntry, AddTable, Edit, RemoveKey, SetValue, apply, find
from worksheet.sheetfile.read import parse_sheet

Path = tuple[str | int, ...]
PLAIN = st.text("abcdefgh 0123456789.#[]{}=", max_size=12)
RAW = r"""("(?:[^"\\\n]|\\.)*"|'[^'\n]*'|[^\s,}\]#]+)"""


def leaves(data: Any, path: Path = ()) -> list[Path]:
    """The path of every plain value."""
    if isinstance(data, dict):
        return [leaf for key, value in data.items() for leaf in leaves(value, (*path, key))]
    if isinstance(data, list):
        return [leaf for key, value in enumerate(data) for leaf in leaves(value, (*path, key))]
    return [path]


@given(sheets(), st.data())
def test_a_new_value_changes_no_other_byte(drawn: tuple[str, Drawn], data: st.DataObject) -> None:
    text = drawn[0]
    body = text.removeprefix("\ufeff")
    sheet, _ = parse_sheet(text, "s", "s.toml")
    assert sheet is not None
    path = data.draw(st.sampled_from(leaves(tomllib.loads(body))))
    value = data.draw(PLAIN)
    # Found without the editor: the value behind its key on its line, in the writing that it had.
    start = sum(len(line) for line in text.split("\n")[: sheet.lines[".".join(map(str, path))] - 1])
    start += sheet.lines[".".join(map(str, path))] - 1
    key = re.compile(rf"(?<![\w.]){path[-1]}\s*=\s*{RAW}").search(text, start)
    assert key is not None
    quote = "'" if key[1][0] == "'" else '"'
    assert apply(text, [SetValue(path, value)]) == text[: key.start(1)] + quote + value + quote + text[key.end(1) :]


@given(sheets(), st.data())
@pytest.mark.full
def test_a_value_set_to_what_it_is_changes_nothing(drawn: tuple[str, Drawn], data: st.DataObject) -> None:
    text = drawn[0]
    plain = tomllib.loads(text.removeprefix("\ufeff"))
    path = data.draw(st.sampled_from([leaf for leaf in leaves(plain) if isinstance(find(plain, leaf), int | str)]))
    new = apply(text, [SetValue(path, find(plain, path))])
    assert tomllib.loads(new.removeprefix("\ufeff")) == plain
    assert [a for a, b in zip(text.split("\n"), new.split("\n"), strict=True) if a != b][1:] == []


VALUES = st.one_of(
    WORDS, st.integers(-(2**53), 2**53), st.floats(allow_nan=False, allow_infinity=False), st.booleans(), st.dates()
)
KEYS = st.sampled_from(["note", "source", "low", "value", "formula", "new", "odd key", "a.b", "é", ""])


@st.composite
def edits(draw: st.DrawFn, text: str) -> Edit:
    """An edit of something that exists, or of something beside it."""
    data = tomllib.loads(text.removeprefix("\ufeff"))
    path = draw(st.sampled_from(leaves(data) or [("x",)]))
    path = path[: draw(st.integers(1, len(path)))]
    kind = draw(st.sampled_from(["set", "beside", "inside", "remove", "entry", "table"]))
    value = draw(VALUES | st.lists(st.integers(0, 9), max_size=3) | st.dictionaries(KEYS, VALUES, max_size=2))
    if kind == "set":
        return SetValue(path, value)
    if kind == "beside":
        return SetValue((*path[:-1], draw(KEYS)), value)
    if kind == "inside":
        return SetValue((*path, draw(KEYS)), value)
    if kind == "remove":
        return RemoveKey(path)
    if kind == "entry":
        return AddEntry(draw(st.sampled_from(["evidence", "remark", "odd key"])), {"by": draw(WORDS)})
    names = tuple(str(part) for part in path[:-1])
    return AddTable((*names, draw(KEYS)), {"by": draw(WORDS)})


def is_part(lines: list[str], whole: list[str]) -> bool:
    """Whether lines stand in a text in their order, others between them."""
    rest = iter(whole)
    return all(line in rest for line in lines)


def check(text: str, edit: Edit) -> None:
    """Apply an edit; what comes out says what was asked for, and lines that it does not concern stay as they are."""
    try:
        new = apply(text, [edit])
    except WriteRefusedError:
        return
    mark = "\ufeff" if text.startswith("\ufeff") else ""
    assert new.startswith(mark)
    before, after = (tomllib.loads(one.removeprefix("\ufeff")) for one in (text, new))
    old_lines, new_lines = text.split("\n"), new.split("\n")
    if text and not text.endswith("\n") and new.endswith("\n"):
        old_lines = f"{text}\r\n".split("\n") if "\r\n" in text else f"{text}\n".split("\n")
    path = edit.path if not isinstance(edit, AddEntry) else (edit.array,)
    if isinstance(edit, RemoveKey):
        assert find(after, path) is None or isinstance(path[-1], int)
        changed = [line for line in new_lines if line not in old_lines]
        assert len(changed) <= 1
        if not changed:
            assert is_part(new_lines, old_lines)
    elif (
        isinstance(edit, SetValue)
        and find(before, path) is None
        and not isinstance(find(before, path[:-1]), dict | type(None))
    ):
        assert len(old_lines) == len(new_lines)  # a note on a bare value
    elif isinstance(edit, AddEntry | AddTable):
        assert is_part(old_lines, new_lines)
    # Whatever the edit was, the rest of the data is untouched.
    for one in leaves(before):
        if one[: len(path)] != path and path[: len(one)] != one and not isinstance(edit, RemoveKey):
            either = {one[-1], path[-1]} == {"value", "formula"} and one[:-1] == path[:-1]
            assert either or find(after, one) == find(before, one)


@given(sheets().flatmap(lambda drawn: st.tuples(st.just(drawn[0]), edits(drawn[0]))))
def test_random_edits_of_random_sheets(drawn: tuple[str, Edit]) -> None:
    check(*drawn)


@given(st.sampled_from([SHEET, PROCESS, PROJECT]).flatmap(lambda text: st.tuples(st.just(text), edits(text))))
def test_random_edits_of_whole_files(drawn: tuple[str, Edit]) -> None:
    check(*drawn)


LINES = st.sampled_from(
    [
        *("", "# remark", "a = 1", "b = 'x' # c", 'c = """\none\ntwo"""', "d = { e = 1, f = { g = 'x' } } # t"),
        *("h = [1, [2, 3], # in\n 4]", "i.j = 1", "i.k.l = 2", '"q r".s = 3', "t = 2026-01-01", "ee = {}", "ff = []"),
        *("u = [{ v = 1 }, { v = 2 }]", "  m = 0x1F", "n = [\n  'a', # one, two\n  'b',\n]", "[w]", "[w.x]", "[y.z]"),
        *("[[aa]]", "[[aa.bb]]", "[aa.cc]", '["o p"]', "[[ 'dd' ]] # e"),
    ]
)


@st.composite
def documents(draw: st.DrawFn) -> str:
    """Valid TOML of every shape that the grammar has."""
    text = ""
    for line in draw(st.lists(LINES, max_size=14)):
        try:
            tomllib.loads(f"{text}{line}\n")
        except tomllib.TOMLDecodeError:
            continue
        text += f"{line}\n"
    if draw(st.booleans()):
        text = text.replace("\n", "\r\n")
    return text.removesuffix("\n").removesuffix("\r") if draw(st.booleans()) else text


@given(documents().flatmap(lambda text: st.tuples(st.just(text), edits(text))))
def test_random_edits_of_free_documents(drawn: tuple[str, Edit]) -> None:
    check(*drawn)


@given(documents(), st.data())
def test_a_value_of_a_free_document_is_replaced(text: str, data: st.DataObject) -> None:
    plain = tomllib.loads(text)
    path = data.draw(st.sampled_from(leaves(plain) or [()]))
    if not path:
        return
    value = data.draw(VALUES)
    expected = copy.deepcopy(plain)
    find(expected, path[:-1])[path[-1]] = value
    assert tomllib.loads(apply(text, [SetValue(path, value)])) == expected
