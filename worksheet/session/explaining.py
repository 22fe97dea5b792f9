"""The algebra of any number of a sheet, by its key."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from worksheet.model.problem import Problem
from worksheet.model.text import clean, nearest
from worksheet.session.alternatives import opened, solved

if TYPE_CHECKING:  # it comes with a library that only whoever asks for algebra needs
    from worksheet.solver.explanation import Explanation


def explained(path: Path, key: str) -> Explanation | list[Problem]:
    """The algebra of one number at the nominal condition, or everything that is wrong.

    Args:
        path: PROJECT/sheets/NAME.toml.
        key: A metric, a figure of the sheet, DEVICE.VALUE of the operating point, or anything put into one of these.
    """
    found = opened(path)
    case = found if isinstance(found, list) else solved(*found)
    if isinstance(case, list):
        return case
    from worksheet.solver.algebra import explain, explainable

    try:
        return explain(case, key)
    except KeyError:
        known = explainable(case)
        near = nearest(key, known)
        hint = f"did you mean {near}?" if near else f"expected one of {', '.join(known)}."
        return [Problem(case.sheet.file, None, "why", f"Found no number {clean(key)}; {hint}")]
