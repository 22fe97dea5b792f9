"""Limits that can only be checked once values are resolved: sizes that come from formulas or proposals."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from worksheet.model.problem import Problem
from worksheet.model.sheet_keys import GEOMETRY
from worksheet.project import check
from worksheet.project.case import Case


def late_problems(case: Case) -> Iterator[Problem]:
    """Sizes outside the process limits, and lengths at which kappa + drain coupling passes 1, for resolved values."""
    for device in case.circuit.devices:
        model = case.model(device)
        for name in GEOMETRY:
            key = device.key(name)
            stated = case.stated(key)
            if stated is None or stated.formula is None:
                continue
            values = np.ravel(case.value(key))
            low, high = model.number(f"min_{name}"), model.number(f"max_{name}")
            if values.min() < low or values.max() > high:
                found = values.min() if values.min() < low else values.max()
                yield case.problem(
                    key,
                    stated,
                    f"the formula gives {found:g} m, expected {low:g} to {high:g} m, the limits of {model.name}",
                )
        length = float(np.min(case.value(device.key("length"))))
        if case.stated(device.key("length")) is None or case.sheet.choose.get(device.key("length")) is None:
            yield from check.coupling_problems(case.sheet, device, model, case.conditions.process, length)
