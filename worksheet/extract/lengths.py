"""Several lengths that one set of parameters does not describe: each fitted alone, and the laws over length from them.

Threshold and gate coupling of real devices move with the length (halo implants, charge sharing), and the device table
holds one of each. So each length gets its own fit, the one at the reference length states the parameters, and the drain
coupling's exponent comes from a straight line through ln sigma over ln L.
"""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.extract.data import ByLength, Estimate, Mask, Rows
from worksheet.extract.estimates import estimates
from worksheet.extract.fit import starting
from worksheet.extract.law import Reference
from worksheet.extract.screen import groups
from worksheet.extract.span import Spanned, inversion, span

_LEAST_ROWS = 12
_SURE = 2.0


@dataclass(frozen=True, eq=False, slots=True)
class Alone:
    """One length fitted alone.

    Attributes:
        length: [m]
        member: Its rows, shape (rows,).
        found: Its fit; `found.inside` counts the member rows.
        estimates: By name.
        error: rms of ln I over the rows used. [-]
    """

    length: float
    member: Mask
    found: Spanned
    estimates: dict[str, Estimate]
    error: float

    @property
    def summary(self) -> ByLength:
        """What the result keeps of it."""
        return ByLength(self.length, self.estimates, self.error)


def each_alone(rows: Rows, temperature: float, *, keep: Collection[str], most: float) -> list[Alone]:
    """Fit every length by itself, the shortest first.

    Args:
        rows: The points that were not screened out.
        temperature: At which parameters are stated. [K]
        keep: Reasons that are overruled.
        most: Share of the rows that may be left out for series resistance. [-]
    """
    fits = []
    for group in groups((rows.length,)):
        member = np.zeros(len(rows), dtype=bool)
        member[group] = True
        part = rows.take(member)
        if len(part) < _LEAST_ROWS:
            continue
        length = float(part.length[0])
        reference = Reference(temperature, length)
        found = span(part, starting(part, reference), reference, keep=keep, most=most)
        used = part.take(found.inside)
        level = inversion(found.values, used, reference)
        table = estimates(found.choice, used, (float(level.min()), float(level.max())), reference)
        error = float(np.sqrt(np.mean(found.choice.solution.residuals**2)))
        fits.append(Alone(length, member, found, table, error))
    return sorted(fits, key=lambda one: one.length)


def exponent(fits: list[Alone]) -> Estimate:
    """The exponent of the drain coupling over length, from fits of each length.

    Args:
        fits: At least two of them, or the estimate is None.
    """
    points = [
        (np.log(one.length), np.log(sigma.value), sigma.standard_error / sigma.value)
        for one in fits
        if (sigma := one.estimates["drain_coupling"]).value is not None
        and sigma.standard_error is not None
        and sigma.value > _SURE * sigma.standard_error
    ]
    if len(points) < 2:
        return Estimate(None, None, "", "fewer than two lengths have a drain coupling that stands above its error")
    x, y, error = (np.array(column) for column in zip(*points, strict=True))
    slope, spread = _line(x, y, np.maximum(error, 0.02))
    return Estimate(-slope, spread, "")


def _line(x: Array, y: Array, error: Array) -> tuple[float, float]:
    """Weighted straight line: slope and its standard error, widened where the points miss the line."""
    weight = 1.0 / error**2
    middle = float(np.sum(weight * x) / np.sum(weight))
    power = float(np.sum(weight * (x - middle) ** 2))
    slope = float(np.sum(weight * (x - middle) * y) / power)
    level = float(np.sum(weight * y) / np.sum(weight))
    missed = float(np.sum(weight * (y - level - slope * (x - middle)) ** 2))
    widened = max(missed / (len(x) - 2), 1.0) if len(x) > 2 else 1.0
    return slope, float(np.sqrt(widened / power))
