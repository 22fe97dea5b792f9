"""The direction of imports, as import-linter reads it from pyproject.toml."""

import subprocess
import sys
import tomllib
from typing import Any

import pytest

from tests.paths import TOP

# Who may import what: the homes as the architecture gives them, against which the contracts are held.
HOMES = {
    "textual": {"tui"},
    "rich": {"tui"},
    "tomllib": {"sheetfile"},
    "tomlkit": {"sheetfile"},
    "sympy": {"engine", "solver"},
    "scipy": {"extract"},
    "matplotlib": {"report"},
    "subprocess": {"history"},
}


def _linter() -> dict[str, Any]:
    with (TOP / "pyproject.toml").open("rb") as file:
        found: dict[str, Any] = tomllib.load(file)["tool"]["importlinter"]
    return found


def _layers() -> list[str]:
    (contract,) = [one for one in _linter()["contracts"] if one["type"] == "layers"]
    return [name.strip() for line in contract["layers"] for name in line.split("|")]


def test_contracts_hold() -> None:
    pytest.importorskip("importlinter", reason="import-linter comes with the extra 'dev', and CI installs it")
    command = "import sys; from importlinter.cli import lint_imports_command; sys.exit(lint_imports_command())"
    done = subprocess.run(
        [sys.executable, "-c", command, "--no-cache"],
        cwd=TOP,
        capture_output=True,
        text=True,
        check=False,
        stdin=subprocess.DEVNULL,
    )
    assert done.returncode == 0, done.stdout + done.stderr


def test_every_folder_is_a_layer() -> None:
    folders = {path.parent.name for path in (TOP / "worksheet").glob("*/__init__.py")}
    assert folders == set(_layers())


def test_documentation_gives_the_same_layers_in_the_same_order() -> None:
    text = (TOP / "DEVELOPERS.md").read_text("utf-8")
    block = text.split("<!-- layers -->")[1]
    rows = [line.split("|")[1].strip() for line in block.splitlines() if line.startswith("| `")]
    assert [name.strip("` ") for row in rows for name in row.split(",")] == _layers()


@pytest.mark.parametrize("library", HOMES)
def test_every_other_layer_is_forbidden_the_library(library: str) -> None:
    contracts = [one for one in _linter()["contracts"] if library in one.get("forbidden_modules", ())]
    forbidden = {name.removeprefix("worksheet.") for one in contracts for name in one["source_modules"]}
    assert forbidden == set(_layers()) - HOMES[library]
