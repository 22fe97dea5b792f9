"""The variants of a sheet laid side by side: each reviewed as if the sheet were so, everything else held."""

from __future__ import annotations

import datetime
from collections.abc import Mapping
from dataclasses import dataclass

from worksheet.model.problem import Problem
from worksheet.model.sheet import Sheet, Value, Variant
from worksheet.project.evaluate import Evaluator
from worksheet.project.variants import key_of_fingers, table_of, with_variant
from worksheet.review.results import SheetReview
from worksheet.review.review import reviewed

AS_IT_STANDS = ""
"""The name of the column that is no variant."""


@dataclass(frozen=True, eq=False)
class Column:
    """One variant, or the sheet as it stands.

    Attributes:
        name: Its name; AS_IT_STANDS for the sheet itself.
        note: What the user said of it.
        sheet: The sheet as the variant has it.
        stated: What it changes, by plain name; of the sheet itself nothing.
        review: Its review, None with problems.
        current, area: supply_current [A] and gate_area [m^2] of one block at the nominal condition, None where missing.
        problems: Why it cannot be reviewed.
    """

    name: str
    note: str
    sheet: Sheet
    stated: Mapping[str, Value]
    review: SheetReview | None
    current: float | None
    area: float | None
    problems: tuple[Problem, ...] = ()

    def shown(self, key: str) -> str:
        """A value by plain name as it was typed, here or in the sheet; "" where nothing states it."""
        value = self.sheet.assume.get(key) or self.sheet.choose.get(key) or self.sheet.own.get(key)
        return "" if value is None else value.text


@dataclass(frozen=True, eq=False)
class SideBySide:
    """A sheet and its variants.

    Attributes:
        sheet: As it stands.
        columns: The sheet first, then the variants in the order of the file.
        changed: Every key that some variant changes, qualified by its table ("choose.bias_current").
        fingers: Every key of fingers that some variant changes, by the device's name.
    """

    sheet: Sheet
    columns: tuple[Column, ...]
    changed: tuple[str, ...]
    fingers: Mapping[str, str]


def side_by_side(evaluator: Evaluator, name: str, today: datetime.date) -> SideBySide:
    """Review a sheet and every variant of it.

    Args:
        evaluator: The project.
        name: The sheet.
        today: For waivers with an end.
    """
    sheet = evaluator.project.sheets[name]
    columns = [_column(evaluator, sheet, None, today)]
    for variant in sheet.variants.values():
        changed = with_variant(sheet, variant)
        columns.append(_column(evaluator.with_sheet(changed), changed, variant, today))
    keys = dict.fromkeys(key for variant in sheet.variants.values() for key in variant.changes)
    devices = dict.fromkeys(device for variant in sheet.variants.values() for device in variant.fingers)
    return SideBySide(
        sheet,
        tuple(columns),
        tuple(f"{table_of(sheet, key)}.{key}" for key in keys),
        {device: key_of_fingers(device) for device in devices},
    )


def _column(evaluator: Evaluator, sheet: Sheet, variant: Variant | None, today: datetime.date) -> Column:
    found = reviewed(evaluator, (sheet.name,), today)[sheet.name]
    numbers = {} if found.result is None else found.result.metrics
    current, area = (numbers[key].value if key in numbers else None for key in ("supply_current", "gate_area"))
    return Column(
        AS_IT_STANDS if variant is None else variant.name,
        "" if variant is None else variant.note,
        sheet,
        {} if variant is None else variant.changes,
        found.result,
        current,
        area,
        found.problems,
    )
