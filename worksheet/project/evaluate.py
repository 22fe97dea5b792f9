"""A project evaluated: every sheet's values resolved, links followed at the same condition, proposals found once."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import replace
from functools import partial
from types import MappingProxyType

import numpy as np

from worksheet.device.arrays import Array
from worksheet.engine.inputs import Inputs
from worksheet.model import metrics
from worksheet.model.problem import Problem
from worksheet.model.sheet import Sheet
from worksheet.project import conditions as sets
from worksheet.project import links
from worksheet.project.batch import batches
from worksheet.project.case import Case, CaseError, External
from worksheet.project.conditions import ConditionSet
from worksheet.project.discover import Project

Proposer = Callable[[Case], Mapping[str, float]]
"""Finds numbers for what a case leaves open; raises CaseError where it cannot."""


class Evaluator:
    """Cases of all sheets of a project, each built once; links are followed through it.

    Results are kept for the life of the evaluator; a changed project gets a new one.
    """

    def __init__(self, project: Project, propose: Proposer) -> None:
        """Take the project and the way to find proposals."""
        assert project.file is not None
        assert project.process is not None
        self.project = project
        self._file, self._process = project.file, project.process
        self._propose = propose
        self._cases: dict[str, Case] = {}
        self._filled: dict[str, Mapping[str, float]] = {}
        self._linked: dict[tuple[str, ConditionSet], Case] = {}
        self._sets: dict[tuple[object, ...], ConditionSet] = {}
        self._known: dict[str, Array] = {}

    def conditions(self, name: str) -> ConditionSet:
        """The conditions of a sheet, nominal first; sheets without their own share one set."""
        sheet = self.project.sheets[name]
        own = tuple(sheet.assume[key].numbers if key in sheet.assume else None for key in ("temperature", "supply"))
        if own not in self._sets:
            self._sets[own] = sets.of_sheet(sheet, self._file, self._process)
        return self._sets[own]

    @property
    def shared(self) -> ConditionSet:
        """The project's conditions, nominal first: those of every sheet that states none of its own."""
        if (None, None) not in self._sets:
            self._sets[None, None] = sets.of_project(self._file, self._process)
        return self._sets[None, None]

    def linked(self, name: str, wanted: ConditionSet) -> Case:
        """A sheet's case for the conditions of a path that it lies in: its own nominal one, then one for each wanted.

        A sheet on its own regulator is at its nominal supply there.
        """
        return self._linked_case(name, wanted, "supply" in self.project.sheets[name].assume)

    def with_sheet(self, sheet: Sheet) -> Evaluator:
        """The same project with one of its sheets in another form; proposals are sought for it anew."""
        sheets = MappingProxyType({**self.project.sheets, sheet.name: sheet})
        return Evaluator(replace(self.project, sheets=sheets), self._propose)

    def bare(self, name: str) -> Case:
        """A sheet's case with nothing proposed."""
        conditions = self.conditions(name)
        return Case(self.project.sheets[name], conditions, partial(self._external, name, conditions))

    def case(self, name: str) -> Case:
        """A sheet's case over its own conditions, with what it leaves open proposed.

        Raises: CaseError where a value does not resolve or a proposal cannot be found.
        """
        if name not in self._cases:
            self._cases[name] = self.bare(name).with_filled(self.filled(name))
        return self._cases[name]

    def over(self, name: str, conditions: ConditionSet) -> Case:
        """A sheet's case over other conditions than its own, its proposals held."""
        own = self.conditions(name)
        if all(c in own.index for c in conditions.conditions):  # what other sheets give is known there
            places = [own.index[c] for c in conditions.conditions]
            external: External = partial(self._picked, name, own, places)
        else:
            external = partial(self._external, name, conditions)
        return Case(self.project.sheets[name], conditions, external, self.filled(name))

    def _picked(self, asking: str, own: ConditionSet, places: list[int], name: str, key: str) -> Array:
        values = self._external(asking, own, name, key)
        return values if values.ndim == 0 or values.shape[-1] == 1 else values[..., places]

    def filled(self, name: str) -> Mapping[str, float]:
        """Proposals for what a sheet leaves open, found once. [unit of the key]"""
        if name not in self._filled:
            case = self.bare(name)
            self._filled[name] = self._propose(case) if case.open_keys else {}
        return self._filled[name]

    def _external(self, asking: str, wanted: ConditionSet, name: str, key: str) -> Array:
        """SHEET.NAME at another sheet's conditions. [SI], over those conditions"""
        sheet = self.project.sheets.get(name)
        if sheet is None:
            raise CaseError(
                Problem(
                    self.project.sheets[asking].file,
                    None,
                    "",
                    f"there is no sheet {name!r}, or it has problems of its own",
                )
            )
        own_supply = any("supply" in self.project.sheets[n].assume for n in (asking, name))
        if wanted is self.conditions(name) and not own_supply:
            if f"{name}.{key}" not in self._known:
                self._known[f"{name}.{key}"] = _taken(self.case(name), key)
            return self._known[f"{name}.{key}"]
        values = _taken(self._linked_case(name, wanted, own_supply), key)
        return values if values.size == 1 else values[..., 1:]  # one number holds in every condition

    def find_links(self, names: Iterable[str]) -> None:
        """Work out in batches the metrics that sheets of those names take from others, nearer or further."""
        wanted = links.metrics_taken(self.project.sheets, names)
        for wave in links.waves(self.project.sheets, wanted):
            cases = []
            for name in wave:
                try:
                    self.case(name).resolve()
                    cases.append(self.case(name))
                except CaseError:
                    continue  # whoever asks for it will hear
            for batch in batches(cases):
                for number, case in enumerate(batch.cases):
                    for key in wanted[case.sheet.name]:
                        self._known[f"{case.sheet.name}.{key}"] = batch.measure(key).values[batch.place(number)][0]

    def _linked_case(self, name: str, wanted: ConditionSet, own_supply: bool) -> Case:
        key = (f"{name}:{own_supply}", wanted)
        if key not in self._linked:
            mapped = sets.linked(wanted, self.conditions(name), own_supply)
            self._linked[key] = Case(
                self.project.sheets[name], mapped, partial(self._external, name, mapped), self.filled(name)
            )
        return self._linked[key]

    def inputs(self, name: str) -> Inputs:
        """The engine's inputs of a sheet. CaseError where a value does not resolve."""
        return self.case(name).inputs


def _taken(case: Case, key: str) -> Array:
    """A metric or a value of a case, over its conditions. [SI]"""
    return np.asarray(case.solution[key] if metrics.find(key) is not None else case.value(key))
