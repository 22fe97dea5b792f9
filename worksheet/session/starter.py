"""A new project written out from the key descriptions: every line says its unit, its meaning and where to find it."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator
from pathlib import Path

from worksheet.model.keys import Key, Kind
from worksheet.model.problem import Problem
from worksheet.model.process_keys import CORNER_CHANGES, DEVICE_PARAMETERS, PROCESS
from worksheet.model.project_keys import PROJECT
from worksheet.model.sheet_keys import SHEET, SOLVE_KEYS
from worksheet.project.discover import EVIDENCE, PROCESSES, PROJECT_FILE, SHEETS
from worksheet.sheetfile.document import WriteRefusedError
from worksheet.sheetfile.write import create
from worksheet.stages.stage import Stage

PROCESS_NAME = "my_process"
SHEET_NAME = "first_block"
PROCESS_FILE = f"{PROCESSES}/{PROCESS_NAME}.toml"
_WIDTH = 100
_P_CHANNEL = {
    "polarity": "p",
    "own_well": "true",
    "specific_current": "0.16 uA",
    "threshold": "0.45 V",
}
"""Where the p-channel device of the example differs."""

_CORNERS = {
    "slow": {
        "threshold_shift": "40 mV",
        "specific_current_factor": "0.85",
        "drain_coupling_factor": "1.1",
        "capacitance_factor": "1.05",
    },
    "fast": {
        "threshold_shift": "-40 mV",
        "specific_current_factor": "1.15",
        "drain_coupling_factor": "0.9",
        "capacitance_factor": "0.95",
    },
}
"""Changes of the example's corners, for both devices."""


def start(folder: Path, stage: Stage) -> list[Problem]:
    """Write a new project into a folder that does not exist or is empty.

    Args:
        folder: Where.
        stage: The stage of its first sheet.
    Returns: what stood in the way; nothing is written then
    """
    problem = occupied(folder)
    if problem is not None:
        return [problem]
    texts = {
        Path(PROJECT_FILE): project_text(),
        Path(PROCESSES) / f"{PROCESS_NAME}.toml": process_text(),
        Path(SHEETS) / f"{SHEET_NAME}.toml": sheet_text(stage),
    }
    try:
        for inner in (PROCESSES, SHEETS, EVIDENCE):
            (folder / inner).mkdir(parents=True, exist_ok=True)
        for path, text in texts.items():
            create(folder / path, text, root=folder)
    except (OSError, WriteRefusedError) as error:
        return [Problem(str(folder), None, "", f"the project could not be written: {error}")]
    return []


def occupied(folder: Path) -> Problem | None:
    """Say why a new project cannot be put into a folder, or None where it does not exist or is empty."""
    try:
        if not folder.is_dir():
            what = "a file" if folder.exists() or folder.is_symlink() else ""
        else:
            what = "a folder that is not empty" if any(folder.iterdir()) else ""
    except (OSError, ValueError) as error:
        what = f"a place that cannot be looked at ({error})"
    return Problem(str(folder), None, "", f"found {what}; expected a new or an empty folder") if what else None


def project_text() -> str:
    """biasbook.toml of a new project."""
    lines = [*_said(PROJECT.help)]
    for key in PROJECT.keys:
        value = {"process": PROCESS_NAME, "title": "A new project", "owner": ""}.get(key.name, key.example)
        lines += [*_about(key), _line(key, value)]
    conditions = PROJECT.table("conditions")
    assert conditions is not None  # part of the description
    lines += ["", *_said(conditions.help), "[conditions]"]
    spans = {
        "process": '["typical", "slow", "fast"]',
        "temperature": '["-40 °C", "27 °C", "125 °C"]',
        "supply": '["1.62 V", "1.8 V", "1.98 V"]',
    }
    for key in conditions.keys:
        lines += [*_about(key), f"{key.name} = {spans.get(key.name, key.example)}"]
    budget = PROJECT.table("budget")
    assert budget is not None  # part of the description
    lines += ["", *_said(budget.help), "[budget]", 'supply_current = { max = "100 uA" }']
    return "\n".join(lines) + "\n"


def process_text() -> str:
    """The process file of a new project: an n- and a p-channel device of invented numbers, and two corners."""
    lines = [
        *_said(
            "The numbers below are invented, so that the project can be reviewed at once. Put your own process's in: "
            "every line says what it is, in which unit, and where such a number is found. A bare value may become a "
            'table that says where it came from: { value = "0.45 V", source = "...", trust = "measured" }.'
        ),
        "",
    ]
    for key in PROCESS.keys:
        lines += [*_about(key), _line(key, "my process" if key.name == "title" else key.example)]
    for name in ("nfet", "pfet"):
        lines += ["", f"[device.{name}]"]
        for key in DEVICE_PARAMETERS:
            value = _P_CHANNEL.get(key.name, key.example) if name == "pfet" else key.example
            lines += [*(_about(key) if name == "nfet" else ()), _line(key, value)]
    for corner, changes in _CORNERS.items():
        for name in ("nfet", "pfet"):
            lines += ["", f"[corner.{corner}.{name}]"]
            for key in CORNER_CHANGES:
                explained = _about(key) if (corner, name) == ("slow", "nfet") else ()
                lines += [*explained, _line(key, changes.get(key.name, key.example))]
    return "\n".join(lines) + "\n"


def sheet_text(stage: Stage) -> str:
    """A first sheet of a stage: what must be stated, with its meaning, and one target."""
    fixed = {"title": "A first block", "stage": stage.key, "device": "nfet"}
    lines = [*_said(f"{stage.title}. {stage.purpose}")]
    for key in SHEET.keys:
        if key.required or key.name == "title":
            lines += [*_about(key), _line(key, fixed.get(key.name, key.example))]
    design = {key.name: key for key in stage.design_keys(ideal_bias=True)}
    load = design.pop("load_capacitance")
    lines += ["", "[assume]", *_about(load)]
    lines += [f'{load.name} = {{ value = "{load.example}", source = "say where it came from", trust = "guess" }}']
    lines += ["", "[choose]"]
    for key in design.values():
        if key.dimension is not None:
            lines += [*_about(key), _line(key, key.example)]
    over = next(key for key in SOLVE_KEYS if key.name == "over")
    lines += ["", "[solve]", *_about(over), _line(over, over.example)]
    lines += ["", *_said("What is wanted, by metric; `biasbook stages` lists the metrics."), "[target]"]
    lines += ['bandwidth = { min = "1 MHz", source = "say who asked for it" }']
    return "\n".join(lines) + "\n"


def _line(key: Key, value: str) -> str:
    plain = key.kind in (Kind.WHOLE, Kind.FLAG) or (key.dimension is not None and key.dimension.plain)
    return f"{key.name} = {value}" if plain else f'{key.name} = "{value}"'


def _about(key: Key) -> tuple[str, ...]:
    unit = f" [{key.dimension.unit}]" if key.dimension is not None and key.dimension.unit else ""
    symbol = f" {key.symbol}" if key.symbol else ""
    where = f" Found in: {key.where}" if key.where else ""
    return ("", *_said(f"{key.title}{symbol}{unit}: {key.help}{where}"))


def _said(text: str) -> Iterator[str]:
    return iter(textwrap.wrap(text, _WIDTH, initial_indent="# ", subsequent_indent="# ", break_on_hyphens=False))
