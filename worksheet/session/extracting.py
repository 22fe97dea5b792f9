"""Device parameters from curves, for both front ends: fitted, written into a process file, laid out as curves."""

from __future__ import annotations

import datetime
import hashlib
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from worksheet.extract import curves
from worksheet.extract.data import Extraction, Rows
from worksheet.extract.extraction import Request, extract_parameters, read_rows
from worksheet.extract.header import parse_stated
from worksheet.extract.law import Reference
from worksheet.extract.store import Stating, stating
from worksheet.model import dimension as dim
from worksheet.model.fitted_keys import FITTED
from worksheet.model.problem import Problem
from worksheet.model.quantity import QuantityError, parse
from worksheet.model.sheet import DeviceModel, Process
from worksheet.model.text import clean, nearest
from worksheet.project.discover import EVIDENCE
from worksheet.sheetfile import source
from worksheet.sheetfile.document import WriteRefusedError
from worksheet.sheetfile.edit import AddTable, Edit, RemoveKey, SetValue, apply
from worksheet.sheetfile.paths import inside
from worksheet.sheetfile.processes import TYPICAL
from worksheet.sheetfile.read import parse_process
from worksheet.sheetfile.write import save

_PROCESS_FOLDER = "process"


@dataclass(frozen=True, eq=False, slots=True)
class ProcessText:
    """A process file as it was read, with the one device that is meant.

    Attributes:
        path: The file.
        shown: What messages call it.
        content: Its bytes.
        process: What it states.
        device: The device.
    """

    path: Path
    shown: str
    content: bytes
    process: Process
    device: DeviceModel

    @property
    def root(self) -> Path:
        """The project it belongs to, or its own folder."""
        folder = self.path.absolute().parent
        return folder.parent if folder.name == _PROCESS_FOLDER else folder


def read_device(path: Path, name: str | None, polarity: str | None) -> ProcessText | list[Problem]:
    """Read a process file and find a device in it.

    Args:
        path: The file.
        name: The device; None where the file has one of that polarity only.
        polarity: "n" or "p", to find it by where no name is given; None for any.

    Returns: the file, or every problem.
    """
    shown = clean(str(path))
    content = source.load(path, shown)
    if isinstance(content, Problem):
        return [content]
    process, problems = parse_process(content, path.stem, shown)
    if process is None:
        return problems
    if name is None:
        fitting = [one for one in process.devices.values() if polarity in {None, one.polarity}]
        if len(fitting) != 1:
            names = ", ".join(one.name for one in fitting) or "none"
            message = f"Found {names} to choose from, expected the device to be named."
            return [Problem(shown, None, "device", message)]
        return ProcessText(path, shown, content, process, fitting[0])
    device = process.devices.get(name)
    if device is None:
        near = nearest(name, process.devices)
        hint = f"did you mean {near}?" if near else f"expected one of {', '.join(process.devices)}."
        return [Problem(shown, None, "device", f"Found no device {clean(name)}; {hint}")]
    return ProcessText(path, shown, content, process, device)


def extract(
    paths: Sequence[Path], request: Request, into: ProcessText | None = None
) -> tuple[Extraction | None, list[Problem]]:
    """Fit a device to tables; one that goes into a process file is stated at that file's reference temperature.

    Args:
        paths: The tables.
        request: What is asked.
        into: The process file it is meant for.

    Returns: the extraction and no problem, or None and every problem.
    """
    if into is not None and request.reference_temperature is None:
        request = replace(request, reference_temperature=into.process.reference_temperature)
    return extract_parameters(paths, request, shown=[clean(str(path)) for path in paths])


def write_into(
    result: Extraction, into: ProcessText, *, dated: datetime.date, trust: str, confirmed: bool
) -> Stating | list[Problem]:
    """Write an extraction into its process file, in place.

    Args:
        result: The extraction.
        into: The file as it was read.
        dated: The day of the fit.
        trust: How far its values are to be trusted.
        confirmed: Whether guessed columns were confirmed.

    Returns: what was written, or every problem; then the file is as it was.
    """
    made = text_with(result, into, dated=dated, trust=trust, confirmed=confirmed)
    if isinstance(made, list):
        return made
    wanted, text = made
    try:
        save(into.path, read=into.content, new=text, root=into.root)
    except WriteRefusedError as error:
        return [Problem(into.shown, None, f"device.{into.device.name}", str(error))]
    return wanted


def text_with(
    result: Extraction, into: ProcessText, *, dated: datetime.date, trust: str, confirmed: bool
) -> tuple[Stating, str] | list[Problem]:
    """A process file's text with an extraction in it, and what that states; nothing is written. See write_into."""
    guessed = [one for one in result.readings if one.guessed]
    if guessed and not confirmed:
        return [
            Problem(
                one.file,
                None,
                "",
                "Found columns that had to be guessed, expected them to be confirmed or stated before anything is "
                f"written: {', '.join(one.mapping)}.",
            )
            for one in guessed
        ]
    wanted = stating(result, into.process, into.device, dated=dated, trust=trust)
    if wanted.obstacles:
        return [Problem(into.shown, None, f"device.{into.device.name}", message) for message in wanted.obstacles]
    try:
        text = apply(into.content.decode("utf-8"), list(_edits(into, wanted)))
        _, problems = parse_process(text, into.path.stem, into.shown)
        if problems:
            return [replace(one, message=f"With the fit written into it: {one.message}") for one in problems]
    except WriteRefusedError as error:
        return [Problem(into.shown, None, f"device.{into.device.name}", str(error))]
    return wanted, text


def _edits(into: ProcessText, wanted: Stating) -> Iterator[Edit]:
    """The statements as edits of the file's text."""
    for path, value in wanted.statements:
        yield RemoveKey(path) if value is None else SetValue(path, value)
    name = into.device.name
    before = into.process.fitted.get(name)
    if before is None:
        yield AddTable((FITTED.name, name), {key: value for key, value in wanted.fitted.items() if value is not None})
        return
    for key, value in wanted.fitted.items():
        if value is not None:
            yield SetValue((FITTED.name, name, key), value)
        elif key in before:
            yield RemoveKey((FITTED.name, name, key))


def asked(texts: Mapping[str, str], polarity: str) -> Request | str:
    """What is asked of a fit, from texts as they are typed into a form.

    Args:
        texts: "width", "length", "temperature" (with commas one a table), "columns" (NAME=HEADER:UNIT, with commas).
        polarity: "n" or "p".
    Returns: the request, or what is wrong with a text, a sentence
    """
    columns = {}
    for text in filter(None, map(str.strip, texts.get("columns", "").split(","))):
        stated = parse_stated(text)
        if isinstance(stated, str):
            return stated
        columns[stated[0]] = stated[1]
    numbers: dict[str, list[float]] = {}
    for name, dimension in (("width", dim.LENGTH), ("length", dim.LENGTH), ("temperature", dim.TEMPERATURE)):
        try:
            numbers[name] = [parse(one.strip(), dimension) for one in texts.get(name, "").split(",") if one.strip()]
        except QuantityError as error:
            return f"{name}: {error}"
    return Request(
        polarity=polarity,
        columns=columns,
        width=numbers["width"],
        length=numbers["length"],
        temperature=numbers["temperature"],
    )


def tables_of(into: ProcessText, root: Path) -> tuple[Path, ...]:
    """The tables that a device was fitted to, as far as they still lie in the project and are what they were."""
    fitted = into.process.fitted.get(into.device.name, {})
    names = [name.strip() for name in str(fitted.get("files", "")).split(",") if name.strip()]
    digests = str(fitted.get("digest", ""))
    found = []
    for name in names:
        for place in (root / name, root / EVIDENCE / Path(name).name):
            if inside(root, place) and place.is_file():
                with place.open("rb") as file:
                    if hashlib.file_digest(file, "sha256").hexdigest() in digests:
                        found.append(place)
                break
    return tuple(found)


def corner_changes(into: ProcessText, corner: str) -> Mapping[str, float] | Problem:
    """What a corner does to the device, or what is wrong with its name."""
    corners = into.process.corners
    if corner not in corners:
        near = nearest(corner, corners)
        hint = f"did you mean {near}?" if near else f"expected one of {', '.join(corners)}."
        return Problem(into.shown, None, "corner", f"Found no corner {clean(corner)}; {hint}")
    return corners[corner].get(into.device.name, {})


def implied_curves(device: ProcessText, rows: Rows, corner: str = TYPICAL) -> Iterator[tuple[float, ...]] | Problem:
    """The curves of a device of a process file, one tuple of curves.COLUMNS a point.

    Args:
        device: The device.
        rows: Biases, sizes and temperatures, mirrored to n.
        corner: The process corner.
    """
    changes = corner_changes(device, corner)
    if isinstance(changes, Problem):
        return changes
    numbers = {name: one.number for name, one in device.device.values.items() if one.number is not None}
    values = curves.law_values(numbers, changes)
    reference = Reference(device.process.reference_temperature, numbers["drain_coupling_length"])
    return curves.implied(values, rows, reference, polarity=device.device.polarity)


def biases_of(paths: Sequence[Path], request: Request) -> tuple[Rows | None, list[Problem]]:
    """The biases of tables, for curves to be laid over them: rows, or every problem."""
    rows, _, problems = read_rows(paths, [clean(str(path)) for path in paths], request)
    if rows is not None and not rows.sized:
        message = "Found no width and length, expected both: state them with --width and --length."
        return None, [Problem(clean(str(paths[0])), None, "w", message)]
    return rows, problems
