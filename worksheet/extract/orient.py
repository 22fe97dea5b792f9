"""From columns to rows that one law can be fitted to: bulk-referred voltages, signs of p, source and drain in order.

Here belongs what has to be true of a table before physics can look at it, and the clear refusal of one where it is not:
wrong signs, a size in the wrong unit, a temperature in degrees Celsius without saying so.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from worksheet.device.arrays import Array
from worksheet.extract.data import Rows
from worksheet.extract.header import BY_NAME, REQUIRED
from worksheet.model.problem import Problem

DEFAULT_TEMPERATURE = 300.15
"""Temperature of a table that states none. [K]"""

_LARGEST = {"w": 1.0, "l": 0.01, "id": 1e3}
_LARGEST_VOLTAGE = 1e3
_COLDEST, _HOTTEST = 1.0, 1000.0
_CLEAR = 1e-2


@dataclass(frozen=True, eq=False, slots=True)
class Oriented:
    """A table's rows, mirrored to n.

    Attributes:
        rows: The points.
        notes: What was taken for granted, a sentence each.
        assumed: Whether a voltage was among it.
    """

    rows: Rows
    notes: tuple[str, ...]
    assumed: bool


def orient(
    values: Mapping[str, Array], fixed: Mapping[str, float], *, polarity: str, shown: str
) -> tuple[Oriented | None, list[Problem]]:
    """Make rows of a table's columns.

    Args:
        values: Quantity to column. [SI], shape (rows,) each
        fixed: Quantity to the one value that holds for the whole table. [SI]
        polarity: "n" or "p".
        shown: What messages call the table.

    Returns: the rows and no problem, or None and every problem.
    """
    count = len(next(iter(values.values())))
    columns = dict(values)
    problems = []
    for name, number in fixed.items():
        if name in columns and not np.allclose(columns[name], number, rtol=1e-6, atol=0.0):
            message = f"Found the value {number:g} {BY_NAME[name].dimension.unit} stated and other values in the column"
            problems.append(Problem(shown, None, name, f"{message}, expected only one of the two."))
        columns.setdefault(name, np.full(count, number))
    problems += _ranges(columns, shown)
    if "id" not in columns:
        problems.append(Problem(shown, None, "id", f"Found no drain current, expected the columns {REQUIRED}."))
    notes: list[str] = []
    voltages = _voltages(columns, notes)
    if isinstance(voltages, str):
        problems.append(Problem(shown, None, voltages, f"Found no {voltages}, expected the columns {REQUIRED}."))
    if problems or isinstance(voltages, str):
        return None, problems
    assumed = bool(notes)
    mirrored = _mirrored((*voltages, columns["id"]), polarity, shown)
    if isinstance(mirrored, Problem):
        return None, [mirrored]
    if "temperature" not in columns:
        notes.append(f"The table states no temperature; {DEFAULT_TEMPERATURE - 273.15:.0f} °C was taken.")
    unknown = np.full(count, np.nan)
    gate, source, drain, current = mirrored
    exchanged = drain < source
    rows = Rows(
        gate=gate,
        source=np.where(exchanged, drain, source),
        drain=np.where(exchanged, source, drain),
        current=np.where(exchanged, -current, current),
        width=columns.get("w", unknown),
        length=columns.get("l", unknown),
        temperature=columns.get("temperature", np.full(count, DEFAULT_TEMPERATURE)),
    )
    wrong = falling(rows, shown)
    return (None, [wrong]) if wrong else (Oriented(rows, tuple(notes), assumed), [])


def _ranges(columns: Mapping[str, Array], shown: str) -> list[Problem]:
    """Values that no transistor has, most of them a unit that was not stated."""
    problems = []
    for name, column in columns.items():
        unit = BY_NAME[name].dimension.unit
        stated = f"state the unit of the column with {name}=HEADER:UNIT"
        low, high = float(np.min(column)), float(np.max(column))
        if name == "temperature" and (low < _COLDEST or high > _HOTTEST):
            problems.append(Problem(shown, None, name, f"Found {low:g} K, expected {_COLDEST:g} to {_HOTTEST:g} K."))
        elif name == "temperature" and low < 150.0 and high <= 200.0:
            message = f'Found {low:g} K, expected kelvin; for degrees Celsius {stated} ("temperature=HEADER:°C")'
            problems.append(Problem(shown, None, name, f"{message}."))
        elif name in {"w", "l"} and low <= 0.0:
            problems.append(Problem(shown, None, name, f"Found {low:g} {unit}, expected a size above 0."))
        elif max(abs(low), abs(high)) > _LARGEST.get(name, _LARGEST_VOLTAGE if unit == "V" else np.inf):
            worst = low if abs(low) > abs(high) else high
            problems.append(Problem(shown, None, name, f"Found {worst:g} {unit}, which no transistor has; {stated}."))
    return problems


def _voltages(columns: Mapping[str, Array], notes: list[str]) -> tuple[Array, Array, Array] | str:
    """Gate, source and drain from the bulk, or the name of what is missing."""
    bulk = columns.get("vb", np.zeros(1))
    if "vsb" in columns:
        source = columns["vsb"]
    elif "vbs" in columns:
        source = -columns["vbs"]
    elif "vs" in columns:
        source = columns["vs"] - bulk
    elif "vb" in columns:
        source = -bulk
        notes.append("The table has no source voltage; the source was taken at 0 V beside the bulk voltage.")
    else:
        source = np.zeros(len(next(iter(columns.values()))))
        notes.append("The table has no source voltage; the source was taken on the bulk.")
    ends = []
    for name, relative, absolute in (("vg", "vgs", "vgb"), ("vd", "vds", "vdb")):
        if absolute in columns:
            ends.append(columns[absolute])
        elif name in columns:
            ends.append(columns[name] - bulk)
        elif relative in columns:
            ends.append(columns[relative] + source)
        else:
            return name
    return ends[0], np.broadcast_to(source, ends[0].shape), ends[1]


def _mirrored(
    measured: tuple[Array, Array, Array, Array], polarity: str, shown: str
) -> tuple[Array, Array, Array, Array] | Problem:
    """Gate, source, drain and current as of an n-channel device, or what is wrong with their signs."""
    gate, source, drain, current = measured
    across = drain - source
    largest = float(np.max(np.abs(current), initial=0.0))
    if largest == 0.0:
        return Problem(shown, None, "id", "Found no current other than 0, expected drain currents.")
    if not across.any():
        return Problem(shown, None, "vd", "Found the drain at the source in every row, expected a voltage across them.")
    clear = (np.abs(current) > _CLEAR * largest) & (across != 0.0)
    flow = float(np.mean(np.sign(current[clear]) * np.sign(across[clear]))) if clear.any() else 1.0
    if flow < 0.5:
        return Problem(
            shown,
            None,
            "id",
            "Found currents that run against the drain-source voltage, expected a current into the drain with the "
            "sign of its voltage; turn the sign with id=-HEADER"
            + (", or give a p-channel device all magnitudes or all signs." if polarity == "p" else "."),
        )
    # Of the largest currents the gate must stand on the side that turns the device on.
    strong = np.abs(current) > 0.5 * largest
    opened = float(np.median((gate - source)[strong]))
    downwards = float(np.mean(np.sign(across[clear]))) < 0.0
    if polarity == "n":
        if downwards and opened < 0.0:
            message = "Found currents and voltages below 0, expected those of an n-channel device; is it --polarity p?"
            return Problem(shown, None, "id", message)
        return gate, source, drain, current
    signed = downwards or (float(np.median(drain)) < 0.0 and opened < 0.0)
    turn = -1.0 if signed else 1.0
    return turn * gate, turn * source, turn * drain, turn * current


def falling(rows: Rows, shown: str) -> Problem | None:
    """What to say of a table whose current falls as the gate rises, None of any other.

    Args:
        rows: Mirrored to n.
        shown: What messages call the table.
    """
    over = rows.gate - rows.source
    good = (rows.current > 0.0) & (rows.across > 0.0)
    if np.ptp(over[good]) < 1e-3 if good.any() else True:
        return None
    over, level = over[good], np.log(rows.current[good])
    if np.ptp(level) == 0.0 or float(np.corrcoef(over, level)[0, 1]) > -0.5:
        return None
    return Problem(
        shown,
        None,
        "vg",
        "Found a current that falls as the gate turns the device on, expected the gate voltage with the sign of the "
        "drain's; turn the sign with vg=-HEADER.",
    )
