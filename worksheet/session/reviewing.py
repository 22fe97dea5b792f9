"""Reviews that work out again only what a change can have moved: a sheet, and the sheets that take values from it."""

from __future__ import annotations

import datetime
from collections.abc import Collection, Mapping, Sequence

from worksheet.model.sheet import Chain, Sheet
from worksheet.project import links
from worksheet.project.case import Case
from worksheet.project.discover import Project
from worksheet.project.evaluate import Evaluator
from worksheet.review.chained import ChainReview
from worksheet.review.results import Review
from worksheet.review.review import Reviewed, chained, review, reviewed
from worksheet.solver.propose import propose

Stated = tuple[object, ...]
"""Everything stated that a sheet's results can depend on, to be compared by value."""


class Reviewing:
    """Reviews the states of one project, one after the other."""

    def __init__(self) -> None:
        self._reviewed: dict[str, tuple[Stated, Reviewed]] = {}
        self._filled: dict[str, tuple[Stated, Mapping[str, float]]] = {}
        self._chains: dict[str, tuple[Stated, ChainReview]] = {}

    def evaluator(self, project: Project) -> Evaluator | None:
        """An evaluator of a state, which takes proposals over from states before where nothing moved them."""
        if project.file is None or project.process is None:
            return None
        return Evaluator(project, lambda case: self._proposed(project, case))

    def review(self, project: Project, evaluator: Evaluator | None, today: datetime.date) -> Review:
        """Every sheet at every condition."""

        def again(evaluator: Evaluator, names: Sequence[str], today: datetime.date) -> Mapping[str, Reviewed]:
            stated = {name: (today, *stated_of(project, name)) for name in names}
            known = self._reviewed
            changed = [name for name in names if name not in known or known[name][0] != stated[name]]
            for name, anew in reviewed(evaluator, changed, today).items():
                known[name] = (stated[name], anew)
            return {name: known[name][1] for name in names}

        return review(project, evaluator, today, again, lambda *found: self._chained(project, *found))

    def _chained(
        self, project: Project, evaluator: Evaluator, chains: Mapping[str, Chain], bad: Collection[str]
    ) -> tuple[ChainReview, ...]:
        """Chains, worked out again where a sheet of theirs, or what it takes values from, has changed."""
        every = []
        for name, chain in chains.items():
            there = [sheet for sheet in chain.sheets if sheet in project.sheets]
            stated = (chain, *(part for sheet in there for part in stated_of(project, sheet)))
            stated = (*stated, tuple(sheet for sheet in chain.sheets if sheet in bad))
            if name not in self._chains or self._chains[name][0] != stated:
                self._chains[name] = (stated, chained(evaluator, {name: chain}, bad)[0])
            every.append(self._chains[name][1])
        return tuple(every)

    def _proposed(self, project: Project, case: Case) -> Mapping[str, float]:
        name = case.sheet.name
        stated = stated_of(project, name)
        known = self._filled.get(name)
        if known is None or known[0] != stated:
            known = (stated, propose(case))
            self._filled[name] = known
        return known[1]


def stated_of(project: Project, name: str) -> Stated:
    """What the results of a sheet can depend on: the sheet, sheets it needs, process and conditions.

    The lines count too: a problem names its own.
    """
    file = project.file
    assert file is not None  # there is no evaluator without one
    conditions = (file.processes, file.temperatures, file.supplies, file.nominal)
    needed = _needed(project.sheets, name)
    return (*needed, *(sheet.lines for sheet in needed), project.process, conditions)


def _needed(sheets: Mapping[str, Sheet], name: str) -> tuple[Sheet, ...]:
    """A sheet and all that it takes values from, however far."""
    found: dict[str, Sheet] = {}
    open_names = [name]
    while open_names:
        sheet = sheets.get(open_names.pop())
        if sheet is not None and sheet.name not in found:
            found[sheet.name] = sheet
            open_names += links.sheets_needed(sheet)
    return tuple(found.values())
