"""What stands on standard output and standard error: data and narration, signs, colours, status."""

from __future__ import annotations

import json
import os
import pty
import re
import subprocess
import sys
from pathlib import Path

import pytest

from tests.cli import books
from tests.paths import TOP
from tests.support import run
from worksheet.cli.locale import asks_for_ascii

SAMPLE = str(TOP / "sample_projects" / "tide_gauge")
CODE = "import sys; from worksheet.cli.main import entry; sys.exit(entry())"
SGR = re.compile(rb"\x1b\[[0-9;]*m")


def _environment(stated: dict[str, str]) -> dict[str, str]:
    """Little but what a program needs, and what is stated."""
    return {name: os.environ[name] for name in ("PATH", "HOME") if name in os.environ} | stated


def _run(*arguments: str, **environment: str) -> tuple[int, bytes]:
    """The command in a process of its own: status and standard output."""
    done = subprocess.run(
        [sys.executable, "-c", CODE, *arguments],
        cwd=TOP,
        env=_environment(environment),
        stdin=subprocess.DEVNULL,
        capture_output=True,
        check=False,
        timeout=60,
    )
    return done.returncode, done.stdout


def _on_terminal(*arguments: str, **environment: str) -> bytes:
    """What the command writes where standard output is a terminal."""
    ours, theirs = pty.openpty()
    command = [sys.executable, "-c", CODE, *arguments]
    with subprocess.Popen(
        command, cwd=TOP, env=_environment(environment), stdin=subprocess.DEVNULL, stdout=theirs, stderr=theirs
    ):
        os.close(theirs)
        found = b""
        try:
            while part := os.read(ours, 65536):
                found += part
        except OSError:  # how a terminal says that the other side is closed
            pass
        finally:
            os.close(ours)
    return found


@pytest.mark.parametrize(
    "environment", [{"LC_ALL": "C"}, {"LANG": "C"}, {"PYTHONIOENCODING": "ascii"}, {"LANG": "POSIX"}]
)
@pytest.mark.parametrize(
    "arguments", [("review", SAMPLE, "--details"), pytest.param(("stages", "cascode"), marks=pytest.mark.full)]
)
def test_where_only_ascii_can_be_shown_signs_are_spelled(
    arguments: tuple[str, ...], environment: dict[str, str]
) -> None:
    _, out = _run(*arguments, **environment)
    assert out.isascii()
    assert b"?" not in out
    if arguments[0] == "review":
        for word in (b">= 4 MHz", b"kohm", b"nV/rtHz", b"um^2", b"degC", b"uA"):
            assert word in out
    assert all(len(line) <= 80 for line in out.splitlines())


@pytest.mark.parametrize("environment", [{"LANG": "C.UTF-8"}, {"LC_ALL": "en_US.UTF-8"}, {}])
def test_where_more_can_be_shown_it_is(environment: dict[str, str]) -> None:
    _, out = _run("review", SAMPLE, **environment)
    assert "≥ 4 MHz" in out.decode("utf-8")


@pytest.mark.parametrize(
    ("environment", "plain"),
    [
        ({}, False),
        ({"LANG": "C"}, True),
        ({"LANG": "POSIX"}, True),
        ({"LANG": "C", "LC_CTYPE": "C.UTF-8"}, True),
        ({"LANG": "C", "LC_ALL": "C.UTF-8"}, False),
        ({"LANG": "en_US.UTF-8", "LC_ALL": "C"}, True),
        ({"LANG": "en_US.UTF-8", "LC_CTYPE": "C"}, True),
        ({"LANG": "C", "LC_CTYPE": "de_DE.UTF-8"}, False),
    ],
)
def test_the_locale_that_counts_decides(environment: dict[str, str], plain: bool) -> None:
    assert asks_for_ascii(environment) is plain


def test_columns_stand_under_each_other_in_ascii_too() -> None:
    _, out = _run("review", SAMPLE, LC_ALL="C")
    block = out.decode().split("converter_driver:")[1].splitlines()[1:5]
    ends = {line.rindex("  ") for line in block}
    assert len(ends) == 1


def test_colour_only_on_a_terminal_and_without_meaning_of_its_own() -> None:
    terminal = {"TERM": "xterm-256color", "LANG": "C.UTF-8"}
    coloured = _on_terminal("review", SAMPLE, **terminal)
    assert SGR.search(coloured)
    plain = _on_terminal("review", SAMPLE, NO_COLOR="1", **terminal)
    assert b"\x1b" not in plain
    assert SGR.sub(b"", coloured) == plain
    assert b"\x1b" not in _on_terminal("review", SAMPLE, TERM="dumb", LANG="C.UTF-8")
    _, piped = _run("review", SAMPLE, **terminal)
    assert b"\x1b" not in piped
    assert piped.replace(b"\n", b"\r\n") == plain


def test_json_has_no_colour_and_nothing_beside_it() -> None:
    out = _on_terminal("review", SAMPLE, "--json", TERM="xterm-256color")
    assert json.loads(out)["schema"] == 1


@pytest.mark.parametrize(
    "arguments",
    [
        ("review", "--bogus"),
        ("review", "a", "b"),
        ("review", "--samples", "0"),
        ("stages", "--stage"),
        ("solve",),
        ("nonsense",),
        ("--json",),
    ],
)
def test_wrong_usage_is_status_2_and_said_in_both_ways(arguments: tuple[str, ...]) -> None:
    plain = run(*(a for a in arguments if a != "--json"), *(() if arguments != ("--json",) else ("--jsn",)))
    assert plain.status == 2
    assert plain.out == ""
    assert plain.err.startswith("biasbook: command line: ")
    as_json = run(*arguments, *(() if "--json" in arguments else ("--json",)))
    document = json.loads(as_json.out)
    assert as_json.status == 2
    assert document["schema"] == 1
    (problem,) = document["problems"]
    assert problem["file"] == "command line"
    assert problem["message"]


def test_help_and_version_are_no_errors() -> None:
    for arguments in (("--help",), ("--version",), ("review", "--help"), ("stages", "--help")):
        done = run(*arguments)
        assert done.status == 0
        assert done.err == ""
        assert "biasbook" in done.out


def test_status_says_whether_all_is_met(tmp_path: Path) -> None:
    book = books.write(tmp_path)
    assert run("review", str(book)).status == 0
    sheet = book / f"sheets/{books.BUFFER}.toml"
    sheet.write_text(books.FOLLOWER.replace('min = "5 MHz"', 'min = "500 MHz"'), encoding="utf-8")
    assert run("review", str(book)).status == 1
    sheet.write_text(books.FOLLOWER, encoding="utf-8")
    (book / "biasbook.toml").write_text(books.PROJECT.replace("100 uA", "1 uA"), encoding="utf-8")
    assert run("review", str(book)).status == 1


def test_the_app_is_refused_where_it_cannot_be_shown(tmp_path: Path) -> None:
    book = books.write(tmp_path)
    for environment in ({"TERM": "dumb"}, {"TERM": "xterm"}, {}):
        done = subprocess.run(
            [sys.executable, "-c", CODE, "open", str(book)],
            cwd=TOP,
            env={"PATH": os.environ["PATH"], **environment},
            stdin=subprocess.DEVNULL,
            capture_output=True,
            text=True,
            check=False,
        )
        assert done.returncode == 2
        assert "biasbook review" in done.stderr
        assert "Traceback" not in done.stderr


def test_a_reader_that_goes_away_is_no_error() -> None:
    command = f"{sys.executable} -c '{CODE}' review {SAMPLE} --details | head -1; echo ${{PIPESTATUS[0]}}"
    done = subprocess.run(["bash", "-c", command], cwd=TOP, capture_output=True, text=True, check=True)
    assert done.stdout.splitlines()[0].startswith("Tide gauge readout")
    assert done.stderr == ""
