"""Conflict markers taken apart and put together as git itself does it."""

import subprocess
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from worksheet.compare import conflict

PLAIN = """\
a = 1
<<<<<<< HEAD
b = 2
=======
b = 3
c = 4
>>>>>>> side
d = 5
"""


def test_both_sides() -> None:
    found = conflict.split(PLAIN)
    assert found is not None
    assert (found.ours, found.theirs) == ("a = 1\nb = 2\nd = 5\n", "a = 1\nb = 3\nc = 4\nd = 5\n")
    assert (found.our_label, found.their_label) == ("HEAD", "side")
    assert found.hunks == (conflict.Hunk(2, "b = 2\n", "b = 3\nc = 4\n"),)


def test_what_both_started_from() -> None:
    found = conflict.split(PLAIN.replace("=======\n", "||||||| 3f9a0c1\nb = 1\n=======\n"))
    assert found is not None
    assert found.hunks[0] == conflict.Hunk(2, "b = 2\n", "b = 3\nc = 4\n", "b = 1\n")
    assert found.ours == "a = 1\nb = 2\nd = 5\n"


@pytest.mark.parametrize(
    "text",
    [
        "",
        "a = 1\n",
        "a = 1\n=======\nb = 2\n",
        "notes = '''\n=======\n'''\n",
        "<<<<<<< HEAD\nb = 2\n",
        "<<<<<<< HEAD\nb = 2\n=======\n",
        "=======\n>>>>>>> side\n",
        "<<<<<<<HEAD\nb = 2\n=======\n>>>>>>> side\n",
        "<<<<<<<< HEAD\nb = 2\n=======\n>>>>>>> side\n",
        " <<<<<<< HEAD\nb = 2\n=======\n>>>>>>> side\n",
    ],
)
def test_no_conflict(text: str) -> None:
    assert conflict.split(text) is None


def test_labels_are_harmless_to_show() -> None:
    found = conflict.split(PLAIN.replace("HEAD", "\x1b[31mHEAD\u202e"))
    assert found is not None
    assert found.our_label == "\ufffd[31mHEAD\ufffd"


def test_line_ends_of_every_kind() -> None:
    found = conflict.split(PLAIN.replace("\n", "\r\n").removesuffix("\r\n") + "\u2028\x0b")
    assert found is not None
    assert found.theirs == "a = 1\r\nb = 3\r\nc = 4\r\nd = 5\u2028\x0b"


_LINES = st.lists(st.sampled_from(["a = 1", "b = 2", "", "# x\u2028y", "=", "c\r"]), max_size=8)


@given(_LINES, _LINES)
def test_what_was_marked_is_taken_apart_again(ours: list[str], theirs: list[str]) -> None:
    mine, other = ("".join(f"{line}\n" for line in side) for side in (ours, theirs))
    found = conflict.split(conflict.mark(mine, other))
    if mine == other:
        assert found is None
        assert conflict.mark(mine, other) == mine
    else:
        assert found is not None
        assert (found.ours, found.theirs) == (mine, other)


@given(_LINES, _LINES, _LINES)
def test_a_side_of_what_git_marked_is_what_git_takes_for_that_side(
    base: list[str], one: list[str], two: list[str]
) -> None:
    import tempfile

    with tempfile.TemporaryDirectory() as folder:
        for name, lines in (("base", base), ("ours", one), ("theirs", two)):
            Path(folder, name).write_bytes("".join(f"{line}\n" for line in lines).encode())

        def git(*options: str) -> tuple[str, int]:
            command = ["git", "merge-file", "-p", "-q", *options, "ours", "base", "theirs"]
            done = subprocess.run(command, cwd=folder, capture_output=True, stdin=subprocess.DEVNULL, check=False)
            return done.stdout.decode(), done.returncode

        marked, conflicts = git()
        found = conflict.split(marked)
        assert (found is None) == (conflicts == 0)
        if found is not None:
            assert len(found.hunks) == conflicts
            assert (found.ours, found.theirs) == (git("--ours")[0], git("--theirs")[0])
