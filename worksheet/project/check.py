"""What a single file cannot show: whether the devices, corners and sizes that a sheet names exist in its process."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

import numpy as np

from worksheet.device.parameters import couplings
from worksheet.model import dimension as dim
from worksheet.model.problem import Problem
from worksheet.model.process_keys import CORNER_CHANGES
from worksheet.model.quantity import format_quantity
from worksheet.model.sheet import DeviceModel, Process, ProjectFile, Sheet
from worksheet.model.sheet_keys import GEOMETRY
from worksheet.model.text import nearest
from worksheet.stages import catalogue
from worksheet.stages.stage import BIAS, Stage, Transistor

TYPICAL = "typical"
_SLACK = 1e-9
_COUPLED = ("kappa", "drain_coupling", "drain_coupling_length", "drain_coupling_exponent")
_COUPLING = tuple(key for key in CORNER_CHANGES if key.name in ("kappa_shift", "drain_coupling_factor"))


def project_problems(file: ProjectFile, process: Process) -> Iterator[Problem]:
    """Corners that the project names and the process file does not have, and corners of devices it does not have."""
    known = list(dict.fromkeys((TYPICAL, *process.corners)))
    for name in dict.fromkeys((*file.processes, file.nominal.process)):
        if name not in known:
            key = "conditions.process" if name in file.processes else "conditions.nominal"
            yield Problem(file.file, file.lines.get(key), key, _expected(name, "a corner of the process file", known))


def sheet_problems(sheet: Sheet, process: Process) -> list[Problem]:
    """What does not fit between a sheet and its process file."""
    stage = catalogue.find(sheet.stage)
    assert stage is not None  # the reader refuses unknown stages
    problems = list(_devices(sheet, stage, process)) + list(_levels(sheet, stage)) + list(_evidence(sheet, process))
    return problems or list(_sizes(sheet, stage, process))


def _problem(sheet: Sheet, key: str, message: str) -> Problem:
    return Problem(sheet.file, sheet.lines.get(key), key, message)


def _expected(found: str, wanted: str, known: list[str]) -> str:
    near = nearest(found, known)
    hint = f"; did you mean {near!r}?" if near else ""
    return f"found {found!r}, expected {wanted}: {', '.join(known)}{hint}"


def _devices(sheet: Sheet, stage: Stage, process: Process) -> Iterator[Problem]:
    main = process.devices.get(sheet.device)
    if main is None:
        yield _problem(sheet, "device", _expected(sheet.device, f"a device of {process.file}", list(process.devices)))
        return
    if sheet.bulk == "source" and not main.own_well:
        yield _problem(
            sheet,
            "bulk",
            f'found "source", expected "rail": {sheet.device} has no well of its own (own_well in {process.file})',
        )
    if sheet.bias.ideal:
        return
    polarity = stage.bias_polarity(main.polarity)
    fitting = ["ideal", *(name for name, device in process.devices.items() if device.polarity == polarity)]
    bias = process.devices.get(sheet.bias.device)
    if bias is None:
        yield _problem(sheet, "bias.device", _expected(sheet.bias.device, '"ideal" or a device', fitting))
    elif bias.polarity != polarity:
        where = (
            "a source output takes the same polarity"
            if stage.source_output
            else "a drain output takes the other polarity"
        )
        yield _problem(
            sheet,
            "bias.device",
            f"found {sheet.bias.device!r}, which is {bias.polarity}-channel; {where}: {', '.join(fitting)}",
        )


def _levels(sheet: Sheet, stage: Stage) -> Iterator[Problem]:
    if stage.one_level and all(level in sheet.assume for level in ("input_level", "output_level")):
        yield _problem(
            sheet,
            "assume.output_level",
            f"a {stage.title.lower()} takes input_level or output_level, not both: one follows from the other",
        )


def _evidence(sheet: Sheet, process: Process) -> Iterator[Problem]:
    known = list(dict.fromkeys((TYPICAL, *process.corners)))
    for number, item in enumerate(sheet.evidence):
        if item.at is not None and item.at.process not in known:
            yield _problem(
                sheet, f"evidence.{number}.at", _expected(item.at.process, "a corner of the process file", known)
            )


def _sizes(sheet: Sheet, stage: Stage, process: Process) -> Iterator[Problem]:
    for device in stage.devices(sheet.bias.ideal):
        model = process.devices[sheet.bias.device if device.name == BIAS else sheet.device]
        stated = {name: _stated(sheet, device.key(name)) for name in GEOMETRY}
        for name, number in stated.items():
            if number is not None:
                yield from _within(sheet, device, model, name, number)
        if stated["length"] is not None:
            yield from coupling_problems(sheet, device, model, process, stated["length"])


def _stated(sheet: Sheet, key: str) -> float | None:
    value = sheet.assume.get(key) or sheet.choose.get(key)
    return None if value is None else value.number


def _within(sheet: Sheet, device: Transistor, model: DeviceModel, name: str, number: float) -> Iterator[Problem]:
    low, high = model.number(f"min_{name}"), model.number(f"max_{name}")
    if not low * (1 - _SLACK) <= number <= high * (1 + _SLACK):
        key = _key(sheet, device.key(name))
        shown = [format_quantity(x, dim.LENGTH) for x in (number, low, high)]
        yield _problem(
            sheet,
            key,
            f"found {shown[0]}, expected between {shown[1]} and {shown[2]}, the process limits of {model.name}",
        )


def _key(sheet: Sheet, name: str) -> str:
    return f"assume.{name}" if name in sheet.assume else f"choose.{name}"


def coupling_problems(
    sheet: Sheet, device: Transistor, model: DeviceModel, process: Process, length: float
) -> Iterator[Problem]:
    """kappa within (0, 1] and kappa + sigma(L) at most 1, in every corner, at one length."""
    corners: Mapping[str, Mapping[str, Mapping[str, float]]] = {TYPICAL: {}, **process.corners}
    changed = [devices.get(model.name, {}) for devices in corners.values()]
    kappas, sigmas = couplings(
        {name: model.number(name) for name in _COUPLED},
        {key.name: np.array([c.get(key.name, key.default) for c in changed], dtype=np.float64) for key in _COUPLING},
        length,
    )
    for corner, kappa, coupling in zip(corners, np.asarray(kappas).tolist(), np.asarray(sigmas).tolist(), strict=True):
        if not 0 < kappa <= 1:
            yield _problem(
                sheet,
                "device",
                f"kappa of {model.name} is {kappa:.4g} in corner {corner}, expected above 0 and at most 1",
            )
        elif kappa + coupling > 1 + _SLACK:
            key = _key(sheet, device.key("length"))
            yield _problem(
                sheet,
                key,
                f"kappa + drain coupling of {model.name} is {kappa + coupling:.4g} at "
                f"{format_quantity(length, dim.LENGTH)} in corner {corner}; "
                f"expected at most 1 (kappa {kappa:.4g}, drain coupling {coupling:.4g} from {process.file})",
            )
