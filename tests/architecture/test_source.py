"""Habits of the source that no linter of ours reads: length, docstrings, paths."""

import ast
import re
import subprocess
from collections.abc import Iterator
from pathlib import Path

from tests.paths import TOP

LINES = 400


def test_every_module_opens_with_what_belongs_in_it(modules: dict[str, ast.Module]) -> None:
    assert [path for path, tree in modules.items() if not ast.get_docstring(tree)] == []


def test_a_long_module_gives_its_reason(modules: dict[str, ast.Module]) -> None:
    """A module beyond the limit says why in a line of its docstring that starts with "Length:"."""
    long = {path for path in modules if len((TOP / path).read_text("utf-8").splitlines()) > LINES}
    reasoned = {
        path for path in long if re.search(r"^Length: \S+", ast.get_docstring(modules[path]) or "", re.MULTILINE)
    }
    assert sorted(long - reasoned) == []


def _public(body: list[ast.stmt], inside: str = "") -> Iterator[tuple[str, ast.FunctionDef | ast.ClassDef]]:
    for node in body:
        if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef | ast.ClassDef) and not node.name.startswith("_"):
            marks = {ast.unparse(mark).rpartition(".")[2] for mark in node.decorator_list}
            if not marks & {"overload", "override", "setter", "deleter"}:
                yield inside + node.name, node  # type: ignore[misc]
            # A protocol's docstring says what it asks for; its members repeat names that are described elsewhere.
            if isinstance(node, ast.ClassDef) and "Protocol" not in map(ast.unparse, node.bases):
                yield from _public(node.body, f"{inside}{node.name}.")


def test_everything_public_has_a_docstring(modules: dict[str, ast.Module]) -> None:
    bare = [
        f"{path}: {name}"
        for path, tree in modules.items()
        for name, node in _public(tree.body)
        if not ast.get_docstring(node)
    ]
    assert bare == []


def _files() -> list[Path]:
    """The project's own files: what git holds or would take, or the tree itself where there is no git."""
    command = ["git", "-c", "safe.directory=*", "ls-files", "-z", "--cached", "--others", "--exclude-standard"]
    try:
        done = subprocess.run(command, cwd=TOP, capture_output=True, check=True, stdin=subprocess.DEVNULL)
    except (OSError, subprocess.CalledProcessError):
        hidden = re.compile(r"(^|/)(\.(?!ci/|gitignore|editorconfig)|__pycache__|build/|dist/|venv/)")
        paths = [path for path in TOP.rglob("*") if not hidden.search(path.relative_to(TOP).as_posix())]
    else:
        paths = [TOP / name for name in done.stdout.decode().split("\0") if name]
    return [path for path in paths if path.is_file()]


def test_no_file_names_a_path_of_some_machine() -> None:
    # Put together here, so that this file does not name one itself.
    homes = "work|root|farm|home|Users|mnt"
    pattern = re.compile(rf"(?<![\w.~-])/(?:{homes})/\w|(?<![\w.~-])/tmp/[a-z_]+/|[A-Z]:\\Users\\|[.]library\b")
    found = []
    for path in _files():
        for number, line in enumerate(path.read_bytes().decode("utf-8", "replace").splitlines(), 1):
            if pattern.search(line):
                found.append(f"{path.relative_to(TOP)}:{number}: {line.strip()[:100]}")
    assert found == []


def test_no_mark_of_unfinished_work() -> None:
    marks = re.compile(r"\b(" + "|".join(("TO" + "DO", "FIX" + "ME", "X" + "XX")) + r")\b")
    found = [
        f"{path.relative_to(TOP)}:{number}"
        for path in _files()
        if path.suffix in {".py", ".toml", ".md", ".tcss"}
        for number, line in enumerate(path.read_text("utf-8", "replace").splitlines(), 1)
        if marks.search(line)
    ]
    assert found == []
