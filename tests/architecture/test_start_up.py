"""What a command loads, seen from outside: a fresh interpreter and its sys.modules.

Import-linter sees what could be imported; only a run shows what is. sympy alone costs more than the whole
first paint, so it must not slip in through a module that a command happens to touch.
"""

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from tests.paths import TOP, needs_command_line

HEAVY = ("textual", "rich", "sympy", "scipy", "matplotlib", "tomlkit")

RUN = """
import json, sys
sys.argv = ["biasbook", *sys.argv[1:]]
from worksheet.cli.main import entry
try:
    status = entry()
except SystemExit as stop:
    status = stop.code
print(json.dumps([status or 0, sorted({name.partition(".")[0] for name in sys.modules})]), file=sys.stderr)
"""


def _loaded(code: str, *arguments: str) -> tuple[int, set[str]]:
    done = subprocess.run(
        [sys.executable, "-c", code, *arguments],
        capture_output=True,
        text=True,
        check=False,
        stdin=subprocess.DEVNULL,
        cwd=TOP,
        env={**os.environ, "NO_COLOR": "1"},
    )
    assert done.returncode == 0, done.stderr
    status, names = json.loads(done.stderr.strip().splitlines()[-1])
    return status, set(names)


def _without_running(module: str) -> set[str]:
    names = "sorted({name.partition('.')[0] for name in sys.modules})"
    _, loaded = _loaded(f"import sys, json, {module}; print(json.dumps([0, {names}]), file=sys.stderr)")
    return loaded


@needs_command_line
def test_the_command_line_loads_nothing_heavy() -> None:
    assert not _without_running("worksheet.cli.main").intersection(HEAVY)


@pytest.mark.parametrize("folder", ["model", "stages"])
def test_descriptions_load_the_standard_library_alone(folder: str) -> None:
    modules = ["worksheet." + folder] + [
        f"worksheet.{folder}.{path.stem}" for path in sorted((TOP / "worksheet" / folder).glob("[!_]*.py"))
    ]
    loaded = _without_running(", ".join(modules))
    bare = _without_running("worksheet")
    assert loaded - bare <= set(sys.stdlib_module_names) | {"worksheet"}


@pytest.mark.parametrize("layer", ["device", "engine", "sheetfile", "project", "review", "report", "session"])
def test_a_layer_loads_no_algebra_and_no_screens(layer: str) -> None:
    assert not _without_running("worksheet." + layer).intersection(HEAVY)


@needs_command_line
def test_help_loads_nothing_heavy() -> None:
    status, loaded = _loaded(RUN, "--help")
    assert status == 0
    assert not loaded.intersection((*HEAVY, "numpy"))


@needs_command_line
def test_review_loads_neither_screens_nor_algebra(tmp_path: Path) -> None:
    folder = str(tmp_path / "project")
    status, _ = _loaded(RUN, "start", folder)
    assert status == 0
    status, loaded = _loaded(RUN, "review", folder, "--json")
    assert status in (0, 1)
    assert "numpy" in loaded
    assert not loaded.intersection(HEAVY)
