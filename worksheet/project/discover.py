"""Find a project's files in its folder and read them; nothing outside the folder is reached."""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from types import MappingProxyType

from worksheet.model.problem import Problem
from worksheet.model.sheet import Process, ProjectFile, Sheet
from worksheet.project import check, links
from worksheet.project.chains import chain_problems
from worksheet.project.variants import variant_problems
from worksheet.sheetfile.paths import inside
from worksheet.sheetfile.read import read_process, read_project, read_sheet

PROJECT_FILE = "biasbook.toml"
SHEETS, PROCESSES, EVIDENCE = "sheets", "process", "evidence"


@dataclass(frozen=True, eq=False)
class Project:
    """A project as its files state it.

    Attributes:
        root: Its folder.
        file: biasbook.toml, None where it cannot be read.
        process: The process file, None where it cannot be read.
        sheets: Sheets without problems, by name.
        bad: Names of sheets with problems.
        problems: Everything that is wrong.
    """

    root: Path
    file: ProjectFile | None
    process: Process | None
    sheets: Mapping[str, Sheet] = field(default_factory=dict)
    bad: tuple[str, ...] = ()
    problems: tuple[Problem, ...] = ()


class Reading:
    """How the files of a project are listed and read: from the disk, each time. A session keeps what did not change."""

    def sheets(self, root: Path) -> list[Path]:
        """The files of the sheets, in the order of their names."""
        return _sheet_files(root)

    def project(self, path: Path, shown: str) -> tuple[ProjectFile | None, list[Problem]]:
        """biasbook.toml."""
        return read_project(path, shown=shown)

    def process(self, path: Path, shown: str) -> tuple[Process | None, list[Problem]]:
        """A process file."""
        return read_process(path, shown=shown)

    def sheet(self, path: Path, shown: str) -> tuple[Sheet | None, list[Problem]]:
        """A sheet."""
        return read_sheet(path, shown=shown)


FROM_DISK = Reading()


def load(root: Path, reading: Reading = FROM_DISK) -> Project:
    """Read a project folder.

    Args:
        root: The folder that holds biasbook.toml.
        reading: How its files are read.
    Returns: the project with every problem found; sheets without problems are there in any case
    """
    missing = not_a_project(root)
    if missing is not None:
        return Project(root, None, None, problems=(missing,))
    refused = _leads_out(root, root / PROJECT_FILE, PROJECT_FILE)
    if refused is not None:
        return Project(root, None, None, problems=(refused,))
    file, problems = reading.project(root / PROJECT_FILE, PROJECT_FILE)
    process: Process | None = None
    if file is not None:
        process, found = _process(root, file, reading)
        problems = [*problems, *found]
    sheets: dict[str, Sheet] = {}
    bad: list[str] = []
    unlisted = _unlisted(root)
    problems = [*problems, *([unlisted] if unlisted is not None else [])]
    followed = inside(root, root / SHEETS)
    for path in reading.sheets(root):
        shown = f"{SHEETS}/{path.name}"
        refused = None if followed and not path.is_symlink() else _leads_out(root, path, shown)
        sheet, found = (None, [refused]) if refused is not None else reading.sheet(path, shown)
        problems = [*problems, *found]
        if sheet is None:
            bad.append(path.stem)
        else:
            sheets[sheet.name] = sheet
    if file is None or process is None:
        return Project(root, file, process, bad=(*bad, *sheets), problems=tuple(problems))
    return checked(Project(root, file, process, MappingProxyType(sheets), tuple(bad), tuple(problems)))


def checked(project: Project) -> Project:
    """Check what single files cannot show: devices, sizes, corners, links; sheets with problems move to `bad`."""
    assert project.file is not None
    assert project.process is not None
    problems = list(check.project_problems(project.file, project.process))
    problems += chain_problems(project.file, project.sheets, project.bad)
    sheets = dict(project.sheets)
    used = links.names_used(project.sheets)
    for sheet in project.sheets.values():
        found = [
            *check.sheet_problems(sheet, project.process),
            *variant_problems(sheet, project.process),
            *links.name_problems(sheet, project.sheets, project.bad, used),
        ]
        if found:
            problems += found
            del sheets[sheet.name]
    loops = links.loops(project.sheets)
    problems += links.loop_problems(project.sheets, loops)
    for loop in loops:
        for name, _ in loop:
            sheets.pop(name, None)
    _drop_dependents(sheets, project, problems)
    bad = (*project.bad, *(name for name in project.sheets if name not in sheets))
    return Project(
        project.root, project.file, project.process, MappingProxyType(sheets), bad, (*project.problems, *problems)
    )


def _drop_dependents(sheets: dict[str, Sheet], project: Project, problems: list[Problem]) -> None:
    """Take out sheets that need a sheet that is bad, each with a problem that says which."""
    dropped = True
    while dropped:
        dropped = False
        for sheet in list(sheets.values()):
            missing = [n for n in links.sheets_needed(sheet) if n in project.sheets and n not in sheets]
            if missing:
                message = f"this sheet takes values from {missing[0]!r}, which has problems of its own"
                problems.append(Problem(sheet.file, None, "", message))
                del sheets[sheet.name]
                dropped = True


def not_a_project(root: Path) -> Problem | None:
    """Say why a path is no project folder, or None where it is one."""
    try:
        folder, file = root.is_dir(), (root / PROJECT_FILE).exists()
    except (OSError, ValueError) as error:
        return Problem(
            str(root), None, "", f"found a path that cannot be looked at ({error}); expected a project folder"
        )
    if not folder:
        return Problem(str(root), None, "", "found no such folder; expected a project folder that holds biasbook.toml")
    if not file:
        message = "found a folder without biasbook.toml; expected a project (`biasbook start DIR` makes one)"
        return Problem(str(root), None, "", message)
    return None


def _process(root: Path, file: ProjectFile, reading: Reading) -> tuple[Process | None, list[Problem]]:
    path = root / PROCESSES / f"{file.process}.toml"
    shown = f"{PROCESSES}/{path.name}"
    if not path.exists():
        known = sorted(p.stem for p in (root / PROCESSES).glob("*.toml")) if (root / PROCESSES).is_dir() else []
        there = f"; there is {', '.join(known)}" if known else ""
        return None, [
            Problem(
                file.file,
                file.lines.get("process"),
                "process",
                f"found {file.process!r}, expected a file {shown}{there}",
            )
        ]
    refused = _leads_out(root, path, shown)
    return (None, [refused]) if refused is not None else reading.process(path, shown)


def _sheet_files(root: Path) -> list[Path]:
    folder = root / SHEETS
    return sorted(folder.glob("*.toml")) if folder.is_dir() and inside(root, folder) else []


def _unlisted(root: Path) -> Problem | None:
    """Say why the folder of the sheets cannot be listed, or None where it can or is not there."""
    folder = root / SHEETS
    if not inside(root, folder):
        return _leads_out(root, folder, SHEETS)
    try:
        if folder.exists():
            os.scandir(folder).close()
    except OSError as error:
        return Problem(SHEETS, None, "", f"the folder of the sheets cannot be listed: {error.strerror}")
    return None


def _leads_out(root: Path, path: Path, shown: str) -> Problem | None:
    if inside(root, path):
        return None
    return Problem(shown, None, "", "found a link that leads out of the project; expected a place inside it")
