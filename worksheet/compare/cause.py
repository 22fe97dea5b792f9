"""Why a metric moved: its movement shared out among the inputs that changed.

The rule is Shapley's (L. S. Shapley, A value for n-person games, 1953): an input's part is what changing it does,
averaged over the orders in which all of them could have been changed one after the other. So parts of inputs that act
on their own are their effects alone, what arises from two together is halved, and the parts add up to the whole
movement. Up to MOST_EXACT inputs every order counts; beyond, ORDERS of them, drawn once and for all, and each one's
reverse.

What was proposed counts as an input with the number it had. Numbers are those at the nominal condition.
"""

from __future__ import annotations

import math
import random
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import combinations

import numpy as np

from worksheet.model import metrics
from worksheet.model.sheet import Process, ProjectFile, Sheet, Value
from worksheet.project.case import CaseError
from worksheet.project.discover import Project
from worksheet.project.evaluate import Evaluator
from worksheet.project.links import formulas_of
from worksheet.review.results import Review
from worksheet.solver import goals
from worksheet.solver.propose import propose

MOST_EXACT = 6
"""Inputs up to which every order counts."""

ORDERS = 6
"""Orders that are drawn beyond; each is also taken backwards."""

_TABLES = ("assume", "own", "choose")
_STRUCTURE = ("stage", "device", "bulk")


@dataclass(frozen=True, slots=True)
class Part:
    """What one input did to a metric. `part` in the metric's unit."""

    key: str
    part: float


@dataclass(frozen=True, slots=True)
class Cause:
    """A movement shared out: parts and remainder add up to it.

    Attributes:
        parts: The greatest first. [unit of the metric]
        remainder: What no part explains. [unit of the metric]
        reason: Why nothing could be shared out, None where it was.
    """

    parts: tuple[Part, ...]
    remainder: float
    reason: str | None = None


@dataclass(frozen=True, eq=False, slots=True)
class Mixture:
    """A project between two states."""

    file: ProjectFile
    process: Process
    sheets: Mapping[str, Sheet]


Swap = Callable[[Mixture], Mixture]
"""Puts the newer state of one input into a mixture."""

Players = Mapping[str, Swap]
"""The inputs that changed, by key: project.*, process.*, "sheet NAME", or a key of the sheet itself."""


class Causes:
    """What changed between two states, and what of it moved a sheet."""

    def __init__(self, old: tuple[Project, Review], new: tuple[Project, Review]) -> None:
        """Take both states with their reviews."""
        self._old, self._new = _mixture(*old), _mixture(*new)
        self._root = old[0].root

    def players(self, name: str) -> Players:
        """Inputs of a sheet that changed, in itself and around it."""
        old, new = self._old, self._new
        if old is None or new is None or name not in old.sheets or name not in new.sheets:
            return {}
        return dict(_players(old, new, name))

    def of(self, name: str, moved: Mapping[str, float]) -> Mapping[str, Cause]:
        """Share the movements of one sheet's metrics out.

        Args:
            name: The sheet, there in both states.
            moved: By how much each metric or figure moved. [unit of the metric]
        """
        players = self.players(name)
        if not players or self._old is None:
            return {metric: Cause((), by, "nothing that was stated explains it") for metric, by in moved.items()}
        if len(players) == 1:
            return {metric: Cause((Part(key, by),), 0.0) for key in players for metric, by in moved.items()}
        look = _Look(self._root, self._old, name, players, tuple(moved))
        shares = _exact(look, list(players)) if len(players) <= MOST_EXACT else _drawn(look, list(players))
        return {metric: _cause(metric, by, list(players), shares[:, k]) for k, (metric, by) in enumerate(moved.items())}


def _cause(metric: str, by: float, keys: list[str], shares: np.ndarray[tuple[int], np.dtype[np.float64]]) -> Cause:
    if not np.isfinite(shares).all():
        return Cause((), by, f"{metric} has no number for some of the inputs changed and others not")
    parts = sorted((Part(key, float(part)) for key, part in zip(keys, shares, strict=True) if part), key=_size)
    return Cause(tuple(parts), by - math.fsum(one.part for one in parts))


def _size(part: Part) -> float:
    return -abs(part.part)


Shares = np.ndarray[tuple[int, int], np.dtype[np.float64]]
"""(inputs, metrics), in the units of the metrics."""


class _Look:
    """Metrics of one sheet with some of the inputs changed, each set looked at once."""

    def __init__(self, root: object, old: Mixture, name: str, players: Players, wanted: tuple[str, ...]) -> None:
        self._root, self._old, self._name, self._players, self.wanted = root, old, name, players, wanted
        self._seen: dict[frozenset[str], np.ndarray[tuple[int], np.dtype[np.float64]]] = {}

    def __call__(self, changed: frozenset[str]) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
        if changed not in self._seen:
            self._seen[changed] = self._values(changed)
        return self._seen[changed]

    def _values(self, changed: frozenset[str]) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
        mixture = self._old
        for key, swap in self._players.items():
            if key in changed:
                mixture = swap(mixture)
        none = np.full(len(self.wanted), np.nan)
        project = Project(self._root, mixture.file, mixture.process, mixture.sheets)  # type: ignore[arg-type]
        try:
            evaluator = Evaluator(project, propose)
            case = evaluator.over(self._name, evaluator.conditions(self._name).only_nominal())
            solution = case.solution
            targets = case.sheet.targets
            for k, key in enumerate(self.wanted):
                known = metrics.find(key) is not None
                if known or key in targets:
                    found = solution.measure(key) if known else goals.measure(case, targets[key], solution)
                    none[k] = np.ravel(found.values)[0]
        except (CaseError, KeyError):  # a mixture that no sheet could state: a device without its size, say
            none[:] = np.nan
        return none


def _exact(look: _Look, keys: list[str]) -> Shares:
    """Shapley values over every subset."""
    count = len(keys)
    shares = np.zeros((count, len(look.wanted)))
    for k, key in enumerate(keys):
        others = [other for other in keys if other != key]
        for size in range(count):
            weight = math.factorial(size) * math.factorial(count - size - 1) / math.factorial(count)
            for chosen in combinations(others, size):
                before = frozenset(chosen)
                shares[k] += weight * (look(before | {key}) - look(before))
    return shares


def _drawn(look: _Look, keys: list[str]) -> Shares:
    """The mean over drawn orders and their reverses."""
    draw = random.Random(len(keys))  # noqa: S311 - an order, not a secret
    orders = [draw.sample(keys, len(keys)) for _ in range(ORDERS)]
    orders += [order[::-1] for order in orders]
    shares = np.zeros((len(keys), len(look.wanted)))
    for order in orders:
        changed: frozenset[str] = frozenset()
        for key in order:
            shares[keys.index(key)] += (look(changed | {key}) - look(changed)) / len(orders)
            changed |= {key}
    return shares


# What changed


def _mixture(project: Project, review: Review) -> Mixture | None:
    """A state with what it proposes written down as numbers; None where it cannot be evaluated."""
    if project.file is None or project.process is None:
        return None
    choices = {one.sheet.name: one.choices for one in review.sheets}
    sheets = {}
    for name, sheet in project.sheets.items():
        proposed = {key: one.value for key, one in choices.get(name, {}).items() if one.origin == "proposed"}
        numbers = {key: Value(value, numbers=(value,)) for key, value in proposed.items()}
        sheets[name] = replace(sheet, choose={**sheet.choose, **numbers})
    return Mixture(project.file, project.process, sheets)


def _players(old: Mixture, new: Mixture, name: str) -> Iterator[tuple[str, Swap]]:
    before, after = old.sheets[name], new.sheets[name]
    structure = [key for key in _STRUCTURE if getattr(before, key) != getattr(after, key)]
    if before.bias.device != after.bias.device:
        structure.append("bias.device")
    if structure:
        yield ", ".join(structure), _swap_structure(name, after)
    for key in _names_that_moved(before, after):
        yield _shown(before, after, key), _swap_value(name, after, key)
    for key in dict.fromkeys([*before.bias.values, *after.bias.values]):
        if _stated(before.bias.values.get(key)) != _stated(after.bias.values.get(key)):
            yield f"bias.{key}", _swap_bias(name, after, key)
    reached = _reached(old, name) | _reached(new, name)
    yield from _process(old, new, {name, *reached})
    yield from _conditions(old, new)
    for other in sorted(reached):
        if other in new.sheets and _results_differ(old.sheets.get(other), new.sheets[other]):
            yield f"sheet {other}", _swap_sheet(other, new.sheets[other])


def _stated(value: Value | None) -> tuple[object, ...] | None:
    """What moves results of a value."""
    if value is None:
        return None
    return value.number, value.numbers, None if value.formula is None else value.formula.text


def _names_that_moved(before: Sheet, after: Sheet) -> list[str]:
    """Names whose value differs, wherever it stands: one that went from a choice to an assumption is one input."""
    found = []
    for key in dict.fromkeys(k for sheet in (before, after) for table in _TABLES for k in getattr(sheet, table)):
        was, now = ([_stated(getattr(sheet, table).get(key)) for table in _TABLES] for sheet in (before, after))
        if [one for one in was if one] != [one for one in now if one]:
            found.append(key)
    return found


def _shown(before: Sheet, after: Sheet, key: str) -> str:
    tables = [table for sheet in (after, before) for table in _TABLES if key in getattr(sheet, table)]
    return f"{tables[0]}.{key}"


def _swapped(mixture: Mixture, name: str, **parts: object) -> Mixture:
    return replace(mixture, sheets={**mixture.sheets, name: replace(mixture.sheets[name], **parts)})  # type: ignore[arg-type]


def _swap_structure(name: str, after: Sheet) -> Swap:
    def swap(mixture: Mixture) -> Mixture:
        bias = replace(mixture.sheets[name].bias, device=after.bias.device)
        return _swapped(mixture, name, stage=after.stage, device=after.device, bulk=after.bulk, bias=bias)

    return swap


def _swap_value(name: str, after: Sheet, key: str) -> Swap:
    def swap(mixture: Mixture) -> Mixture:
        parts = {}
        for table in _TABLES:
            values = {k: v for k, v in getattr(mixture.sheets[name], table).items() if k != key}
            if key in getattr(after, table):
                values[key] = getattr(after, table)[key]
            parts[table] = values
        return _swapped(mixture, name, **parts)

    return swap


def _swap_bias(name: str, after: Sheet, key: str) -> Swap:
    def swap(mixture: Mixture) -> Mixture:
        bias = mixture.sheets[name].bias
        values = {k: v for k, v in bias.values.items() if k != key}
        if key in after.bias.values:
            values[key] = after.bias.values[key]
        return _swapped(mixture, name, bias=replace(bias, values=values))

    return swap


def _swap_sheet(other: str, after: Sheet) -> Swap:
    return lambda mixture: replace(mixture, sheets={**mixture.sheets, other: after})


def _process(old: Mixture, new: Mixture, names: set[str]) -> Iterator[tuple[str, Swap]]:
    """What changed in the process file of devices that sheets of those names use, in the nominal corner."""
    before, after = old.process, new.process
    sheets = [state.sheets[name] for state in (old, new) for name in names if name in state.sheets]
    used = {device for sheet in sheets for device in (sheet.device, sheet.bias.device)}
    if before.reference_temperature != after.reference_temperature:
        yield (
            "process.reference_temperature",
            lambda m: replace(m, process=replace(m.process, reference_temperature=after.reference_temperature)),
        )
    for name, device in after.devices.items():
        if name not in used:
            continue
        was = before.devices.get(name)
        if was is None or (was.polarity, was.own_well) != (device.polarity, device.own_well):
            yield f"process.{name}", _swap_device(name, new, None)
            continue
        for key in dict.fromkeys([*was.values, *device.values]):
            if _stated(was.values.get(key)) != _stated(device.values.get(key)):
                yield f"process.{name}.{key}", _swap_device(name, new, key)
    for corner in dict.fromkeys([old.file.nominal.process, new.file.nominal.process]):
        if before.corners.get(corner) != after.corners.get(corner):
            yield f"process.corner.{corner}", _swap_corner(corner, new)


def _swap_device(name: str, new: Mixture, key: str | None) -> Swap:
    device = new.process.devices[name]

    def swap(mixture: Mixture) -> Mixture:
        present = mixture.process.devices.get(name)
        swapped = device
        if key is not None and present is not None:
            values = {k: v for k, v in present.values.items() if k != key}
            if key in device.values:
                values[key] = device.values[key]
            swapped = replace(present, values=values)
        return replace(mixture, process=replace(mixture.process, devices={**mixture.process.devices, name: swapped}))

    return swap


def _swap_corner(corner: str, new: Mixture) -> Swap:
    def swap(mixture: Mixture) -> Mixture:
        corners = {k: v for k, v in mixture.process.corners.items() if k != corner}
        if corner in new.process.corners:
            corners[corner] = new.process.corners[corner]
        return replace(mixture, process=replace(mixture.process, corners=corners))

    return swap


def _conditions(old: Mixture, new: Mixture) -> Iterator[tuple[str, Swap]]:
    before, after = old.file.nominal, new.file.nominal
    for key in ("process", "temperature", "supply"):
        if getattr(before, key) != getattr(after, key):
            yield f"conditions.nominal.{key}", _swap_nominal(key, getattr(after, key))


def _swap_nominal(key: str, value: object) -> Swap:
    def swap(mixture: Mixture) -> Mixture:
        nominal = replace(mixture.file.nominal, **{key: value})  # type: ignore[arg-type]
        return replace(mixture, file=replace(mixture.file, nominal=nominal))

    return swap


def _reached(mixture: Mixture, name: str) -> set[str]:
    """Sheets that a sheet's formulas reach, nearer or further."""
    reached: set[str] = set()
    left = [name]
    while left:
        sheet = mixture.sheets.get(left.pop())
        for _, formula, _ in formulas_of(sheet) if sheet is not None else ():
            others = {one.partition(".")[0] for one in formula.names if "." in one} - reached - {name}
            reached |= others
            left += others
    return reached


def _results_differ(old: Sheet | None, new: Sheet) -> bool:
    if old is None:
        return True
    fixed = [(getattr(old, key), getattr(new, key)) for key in _STRUCTURE]
    fixed.append((old.bias.device, new.bias.device))
    values = [
        {k: _stated(v) for k, v in table.items()}
        for sheet in (old, new)
        for table in (*(getattr(sheet, name) for name in _TABLES), sheet.bias.values)
    ]
    half = len(values) // 2
    return any(a != b for a, b in fixed) or values[:half] != values[half:]


__all__: Sequence[str] = ["MOST_EXACT", "ORDERS", "Cause", "Causes", "Part"]
