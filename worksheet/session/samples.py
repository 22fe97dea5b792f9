"""A sample project copied to where the user may change it."""

from __future__ import annotations

from pathlib import Path

from worksheet.model.problem import Problem
from worksheet.model.resources import data_folder
from worksheet.session.starter import occupied

SAMPLE = "tide_gauge"


def copy_sample(folder: Path) -> list[Problem]:
    """Copy the sample project into a folder that does not exist or is empty.

    Contents alone are copied, not modes: an installation that nobody may write to must not give a project that nobody
    may write to.

    Args:
        folder: Where.
    Returns: what stood in the way; a folder that was in use is left as it was
    """
    problem = occupied(folder)
    if problem is not None:
        return [problem]
    try:
        source = data_folder("sample_projects") / SAMPLE
        folder.mkdir(parents=True, exist_ok=True)
        for path in sorted(source.rglob("*")):
            copy = folder / path.relative_to(source)
            if path.is_dir():
                copy.mkdir(exist_ok=True)
            else:
                copy.write_bytes(path.read_bytes())
    except OSError as error:
        return [Problem(str(folder), None, "", f"the sample could not be copied: {error}")]
    return []
