"""A measured number: values over conditions and, where a value does not exist, the reason."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from worksheet.device.arrays import Array, Number
from worksheet.model.metrics import Reason


@dataclass(frozen=True, eq=False, slots=True)
class Measured:
    """Values with NaN where there is none, and the reason there.

    Attributes:
        values: Array over conditions. [unit of the metric]
        reasons: Reason by number, same shape or scalar; None where every value exists.
    """

    values: Array
    reasons: NDArray[np.int8] | None = None

    @property
    def complete(self) -> bool:
        """Whether every value exists."""
        return self.reasons is None

    def reason(self, index: tuple[int, ...]) -> Reason:
        """The reason at one place; Reason.NONE where the value exists."""
        if self.reasons is None:
            return Reason.NONE
        return Reason(int(np.broadcast_to(self.reasons, self.values.shape)[index]))


def missing_where(values: Number, *rules: tuple[ArrayLike, Reason]) -> Measured:
    """Measured with values taken out where a rule's mask holds; earlier rules win, the rest of what is not finite last.

    Args:
        values: Any shape. [unit of the metric]
        rules: (mask, reason) pairs; masks broadcast with the values.
    """
    array = np.asarray(values, dtype=np.float64)
    masks = [np.asarray(mask, dtype=bool) for mask, _ in rules]
    finite = np.isfinite(array)
    if finite.all() and not any(mask.any() for mask in masks):
        return Measured(array)
    shape = np.broadcast_shapes(array.shape, *[mask.shape for mask in masks])
    reasons = np.zeros(shape, dtype=np.int8)
    reasons[~np.broadcast_to(finite, shape)] = Reason.NOT_A_NUMBER
    for mask, (_, reason) in zip(reversed(masks), reversed(rules), strict=True):
        reasons[np.broadcast_to(mask, shape)] = reason
    return Measured(np.where(reasons == Reason.NONE, array, np.nan), reasons)


def either(mask: ArrayLike, first: Measured, second: Measured) -> Measured:
    """The first where a mask holds, the second elsewhere."""
    values = np.where(mask, first.values, second.values)
    if first.reasons is None and second.reasons is None:
        return Measured(values)
    none = np.zeros((), dtype=np.int8)
    parts = [none if part.reasons is None else part.reasons for part in (first, second)]
    reasons = np.where(mask, *parts)
    return Measured(values, reasons if reasons.any() else None)


def with_reasons_of(values: Number, parts: Sequence[Measured], *rest: tuple[ArrayLike, Reason]) -> Measured:
    """Plain values; where one is missing, the reason of the first part that is missing there, else the first of `rest`.

    Args:
        values: Any shape. [unit of the metric]
        parts: What the values were reckoned from.
        rest: (mask, reason) pairs that count only where a value is missing.
    """
    missing = ~np.isfinite(np.asarray(values, dtype=np.float64))
    rules = [
        (part.reasons == reason, reason) for part in parts if part.reasons is not None for reason in Reason if reason
    ]
    return missing_where(values, *rules, *((missing & mask, reason) for mask, reason in rest))
