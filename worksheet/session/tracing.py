"""One stated value, or one metric, over all revisions: who changed it, when, why, and what it was."""

from __future__ import annotations

import datetime
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from worksheet.compare import inputs
from worksheet.history import revisions as listed
from worksheet.history.outcome import Refused
from worksheet.history.repository import Repository
from worksheet.history.revisions import Files, Revision
from worksheet.model.problem import Problem
from worksheet.model.text import clean, nearest
from worksheet.review.review import reviewed
from worksheet.session.laying import laid
from worksheet.session.listing import refusal, repository_of
from worksheet.session.workbook import Workbook
from worksheet.sheetfile import source
from worksheet.sheetfile.read import parse_sheet

MOST = 60
"""Revisions over which a metric is worked out unless more are asked for."""


@dataclass(frozen=True, slots=True)
class Stated:
    """A value from one revision on. `value` in `unit`, None where it was not stated."""

    revision: Revision
    value: Any
    unit: str


@dataclass(frozen=True, slots=True)
class Achieved:
    """A metric at one revision, None where it has no number. Numbers in `unit`."""

    revision: Revision
    nominal: float | None
    worst: float | None
    unit: str
    verdict: str


def value(root: Path, sheet: str, key: str) -> tuple[Stated, ...] | Problem:
    """Every change of one value of a sheet, newest first.

    Args:
        root: The project folder.
        sheet: Its name.
        key: The dotted key, such as choose.bias_current or assume.load_capacitance.source.
    """
    found = _revisions(root, sheet)
    if isinstance(found, Problem):
        return found
    repository, every = found
    file = f"sheets/{sheet}.toml"
    versions = listed.read_versions(repository, file, [one.revision for one in every])
    if isinstance(versions, Refused):
        return refusal(versions, root)
    keys: set[str] = set()
    changes: list[Stated] = []
    before: tuple[Any, str] = (None, "")
    for revision, content in reversed(list(zip(every, versions, strict=True))):
        stated = _stated(content, sheet, file)
        keys |= stated.keys()
        now = stated.get(key, (None, ""))
        if now[0] != before[0]:
            changes.append(Stated(revision, now[0], now[1] or before[1]))
        before = now
    if key not in keys:
        near = nearest(key, sorted(keys))
        hint = f"did you mean {near}?" if near else "expected a dotted key, such as choose.bias_current."
        return Problem(file, None, clean(key), f"Found no such value in any revision; {hint}")
    return tuple(reversed(changes))


def _stated(content: bytes | None, sheet: str, file: str) -> inputs.Stated:
    """What a version of a sheet states; nothing where it cannot be read."""
    text = None if content is None else source.decode(content, file)
    if text is None or isinstance(text, Problem):
        return {}
    read, _ = parse_sheet(text, sheet, file)
    return {} if read is None else inputs.of_sheet(read)


def metric(root: Path, sheet: str, name: str, today: datetime.date, most: int = MOST) -> tuple[Achieved, ...] | Problem:
    """A metric or a target of a sheet at the revisions that touched the project, newest first.

    Args:
        root: The project folder.
        sheet: Its name.
        name: The metric, or a figure of the sheet's own.
        today: For waivers with an end.
        most: At most so many revisions.
    """
    found = _revisions(root, None)
    if isinstance(found, Problem):
        return found
    repository, every = found
    rows = list(_achieved(repository, every[:most], sheet, name, today))
    if not any(row.unit or row.nominal is not None for row in rows):
        file = f"sheets/{sheet}.toml"
        return Problem(file, None, clean(name), "Found no revision in which that sheet has such a metric or target.")
    return tuple(rows)


def _achieved(
    repository: Repository, every: Sequence[Revision], sheet: str, name: str, today: datetime.date
) -> Iterator[Achieved]:
    files = listed.read_revisions(repository, [one.revision for one in every])
    for revision, content in zip(every, files, strict=True):
        nothing = Achieved(revision, None, None, "", "")
        yield nothing if isinstance(content, Refused) else _at(revision, content, sheet, name, today) or nothing


def _at(revision: Revision, content: Files, sheet: str, name: str, today: datetime.date) -> Achieved | None:
    with laid(content.files) as folder:
        workbook = Workbook.read(folder)
        if workbook.evaluator is None or sheet not in workbook.project.sheets:
            return None
        result = reviewed(workbook.evaluator, (sheet,), today)[sheet].result
    if result is None:
        return None
    target = next((one for one in result.targets if one.target.name == name), None)
    number = result.metrics.get(name)
    if target is None and number is None:
        return None
    nominal = number.value if number is not None else target.nominal if target is not None else None
    unit = number.unit if number is not None else target.unit if target is not None else ""
    worst, verdict = (None, "") if target is None else (target.worst, target.verdict)
    return Achieved(revision, nominal, worst, unit, verdict)


def _revisions(root: Path, sheet: str | None) -> tuple[Repository, tuple[Revision, ...]] | Problem:
    repository = repository_of(root)
    if isinstance(repository, Problem):
        return repository
    every = listed.history(repository, None if sheet is None else f"sheets/{sheet}.toml")
    return refusal(every, root) if isinstance(every, Refused) else (repository, every)
