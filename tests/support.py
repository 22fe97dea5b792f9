"""Running the command line inside a test: a project written to a folder, the program called, its JSON read back."""

from __future__ import annotations

import io
import json
from contextlib import redirect_stderr, redirect_stdout
from pathlib import Path
from typing import Any, NamedTuple

from worksheet.cli.main import main


class Run(NamedTuple):
    """What a command left behind."""

    status: int
    out: str
    err: str


def run(*arguments: str) -> Run:
    """The command line in this process, with what it writes to both streams."""
    out = io.TextIOWrapper(io.BytesIO(), encoding="utf-8", write_through=True)
    err = io.TextIOWrapper(io.BytesIO(), encoding="utf-8", write_through=True)
    with redirect_stdout(out), redirect_stderr(err):
        status = main(list(arguments))
    texts = []
    for stream in (out, err):
        stream.flush()
        binary = stream.buffer
        assert isinstance(binary, io.BytesIO)
        texts.append(binary.getvalue().decode("utf-8"))
    return Run(status, texts[0], texts[1])


def write_project(folder: Path, project_toml: str, process_toml: str, sheets: dict[str, str]) -> Path:
    """A project folder; the project file names its process file."""
    name = next(
        line.split("=", 1)[1].strip().strip('"') for line in project_toml.splitlines() if line.startswith("process")
    )
    for inner in ("process", "sheets"):
        (folder / inner).mkdir(parents=True, exist_ok=True)
    (folder / "biasbook.toml").write_text(project_toml, encoding="utf-8")
    (folder / "process" / f"{name}.toml").write_text(process_toml, encoding="utf-8")
    for sheet, text in sheets.items():
        (folder / "sheets" / f"{sheet}.toml").write_text(text, encoding="utf-8")
    return folder


def review(tmp_path: Path, project_toml: str, process_toml: str, sheets: dict[str, str]) -> dict[str, Any]:
    """The document of `biasbook review --json` for a project written to `tmp_path`.

    Args:
        tmp_path: An empty folder.
        project_toml: Text of biasbook.toml; it names the process file.
        process_toml: Text of that process file.
        sheets: Text of each sheet by its name.
    Returns: The parsed document; it may hold problems.

    """
    folder = write_project(tmp_path, project_toml, process_toml, sheets)
    done = run("review", str(folder), "--json")
    assert done.out, f"nothing on standard output, status {done.status}: {done.err}"
    document: dict[str, Any] = json.loads(done.out)
    return document


def only_sheet(document: dict[str, Any]) -> dict[str, Any]:
    """The one sheet of a document without problems."""
    assert document["problems"] == [], document["problems"]
    (sheet,) = document["sheets"]
    assert isinstance(sheet, dict)
    return sheet
