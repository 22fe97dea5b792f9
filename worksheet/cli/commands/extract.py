"""`biasbook extract`: device parameters from current-voltage data, and the curves that a device implies."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from worksheet.cli.diagnostics import Status, say, tell
from worksheet.model import dimension as dim
from worksheet.model.dimension import Dimension
from worksheet.model.keys import TRUST
from worksheet.model.problem import Problem
from worksheet.model.quantity import QuantityError, parse

if TYPE_CHECKING:
    from worksheet.cli.output import Output
    from worksheet.extract.data import Rows
    from worksheet.extract.extraction import Request
    from worksheet.session.extracting import ProcessText

_USAGE = """\
Tables have a header; vg, vs, vd and id (and w, l, temperature) in SI units, bulk-referred, are read without a question.
Anything else is guessed, shown, and can be stated:
  --column "vg=Vgate" --column "id=-Idrain:uA" --column "l=#5:um"     NAME=HEADER, - turns the sign, : states the unit
Names: vg vs vd vb vgs vds vbs vsb vgb vdb id w l temperature.

The other way, as CSV on standard output:
  biasbook extract --curves process/NAME.toml --device nfet --width "10 um" --length "1 um" --vg 0:1.2:0.05
With tables named as well, at their biases."""

_STEPS = 100_000


class _WrongError(Exception):
    """Arguments that cannot be read; carries a problem each."""

    def __init__(self, problems: list[Problem]) -> None:
        super().__init__("; ".join(map(str, problems)))
        self.problems = problems


def add(subparsers: Any) -> None:
    """Describe the command's arguments."""
    parser = subparsers.add_parser(
        "extract",
        help="device parameters from current-voltage data",
        epilog=_USAGE,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    parser.add_argument(
        "data", nargs="*", metavar="CSV", help="tables of drain current; a geometry or temperature each"
    )
    parser.add_argument("--polarity", choices=("n", "p"), help="channel type (default: that of --device, else n)")
    parser.add_argument("--width", action="append", default=[], help="channel width; once, or once a table")
    parser.add_argument("--length", action="append", default=[], help="channel length; once, or once a table")
    parser.add_argument("--temperature", action="append", default=[], help="temperature; once, or once a table")
    parser.add_argument(
        "--column", action="append", default=[], metavar="NAME=HEADER", help="state a column, see below"
    )
    parser.add_argument("--fixed", action="append", default=[], metavar="NAME=VALUE", help="a voltage without a column")
    parser.add_argument("--yes", action="store_true", help="confirm columns that were guessed")
    parser.add_argument("--reference-length", help="of several lengths, the one the parameters are stated at")
    parser.add_argument(
        "--keep", action="append", default=[], metavar="REASON", help="do not leave rows out for this reason, or 'all'"
    )
    parser.add_argument("--most-left-out", default="", metavar="SHARE", help="of the rows, 0 to 1 (default: 0.8)")
    parser.add_argument("--into", metavar="process/NAME.toml", help="write the device into this process file, in place")
    parser.add_argument("--device", help="the device in the process file")
    parser.add_argument("--trust", choices=TRUST, default="measured", help="what --into says of the values")
    parser.add_argument("--curves", metavar="process/NAME.toml", help="the other way: curves that a device implies")
    parser.add_argument("--corner", default="typical", help="for --curves: a corner of the process file")
    parser.add_argument("--vg", default="0:1.2:0.05", help="for --curves: gate voltages from the source, FROM:TO:STEP")
    parser.add_argument("--vs", default="0", help="for --curves: source voltages, FROM:TO:STEP or a list with commas")
    parser.add_argument("--vds", default="0.05,1.2", help="for --curves: drain-source voltages, as --vs")
    parser.add_argument("--json", action="store_true", help="one JSON document on standard output")
    parser.set_defaults(command=run)


def run(args: argparse.Namespace, output: Output) -> int:
    """Extract, or lay out curves. 0: done; 1: a poor fit; 2: bad input."""
    try:
        return _curves(args, output) if args.curves else _extract(args, output)
    except _WrongError as wrong:
        return _bad(wrong.problems, output)


def _extract(args: argparse.Namespace, output: Output) -> int:
    from worksheet.extract.document import document
    from worksheet.report import extraction_text, plain
    from worksheet.session import extracting

    if not args.data:
        raise _WrongError([_usage("CSV", "Found no table, expected one or several files.")])
    into = _device(args.into, args) if args.into else None
    result, problems = extracting.extract([Path(one) for one in args.data], _request(args, into), into)
    if result is None:
        return _bad(problems, output)
    written = _write(args, into, result) if into is not None else []
    if output.as_json:
        output.document({**document(result), "problems": plain.problems(written)})
    else:
        output.lines(extraction_text.text(result, output.width))
    if written:
        tell(written)
        return Status.BAD_INPUT
    return Status.NOT_MET if result.poor else Status.FINE


def _write(args: argparse.Namespace, into: ProcessText, result: Any) -> list[Problem]:
    """Write the fit into the process file and say what was written."""
    import datetime

    from worksheet.session import extracting

    done = extracting.write_into(
        result, into, dated=datetime.datetime.now().astimezone().date(), trust=args.trust, confirmed=args.yes
    )
    if isinstance(done, list):
        return done
    say(f"biasbook: {into.shown}: device.{into.device.name}: wrote {', '.join(done.written)}")
    for sentence in done.kept:
        say(f"biasbook: {into.shown}: {sentence}")
    return []


def _curves(args: argparse.Namespace, output: Output) -> int:
    from worksheet.extract.curves import COLUMNS
    from worksheet.session import extracting

    if output.as_json or args.into:
        raise _WrongError(
            [_usage("--curves", "Found --json or --into beside --curves, expected neither: curves are CSV.")]
        )
    device = _device(args.curves, args)
    found = extracting.implied_curves(device, _biases(args, device), args.corner)
    if isinstance(found, Problem):
        return _bad([found], output)
    output.lines([",".join(COLUMNS)])
    output.lines(",".join(map(repr, row)) for row in found)
    return Status.FINE


def _biases(args: argparse.Namespace, device: ProcessText) -> Rows:
    """The points that curves are laid out at: those of the tables, or a grid."""
    from worksheet.extract.curves import grid
    from worksheet.session import extracting

    request = _request(args, device)
    if args.data:
        rows, problems = extracting.biases_of([Path(one) for one in args.data], request)
        if rows is None:
            raise _WrongError(problems)
        return rows
    sizes = [(name, list(getattr(request, name))) for name in ("width", "length")]
    missing = [_usage(f"--{name}", f"Found no {name}, expected one.") for name, given in sizes if len(given) != 1]
    if missing:
        raise _WrongError(missing)
    temperature = request.temperature[0] if request.temperature else device.process.reference_temperature
    return grid(
        _values("--vg", args.vg),
        _values("--vs", args.vs),
        _values("--vds", args.vds),
        width=request.width[0],
        length=request.length[0],
        temperature=temperature,
    )


def _device(path: str, args: argparse.Namespace) -> ProcessText:
    from worksheet.session import extracting

    found = extracting.read_device(Path(path), args.device, args.polarity)
    if isinstance(found, list):
        raise _WrongError(found)
    return found


def _request(args: argparse.Namespace, device: ProcessText | None) -> Request:
    """The arguments as what is asked of a fit."""
    from worksheet.extract.extraction import Request
    from worksheet.extract.header import parse_stated
    from worksheet.extract.screen import MOST_LEFT_OUT

    problems: list[Problem] = []
    columns = {}
    for text in args.column:
        stated = parse_stated(text)
        if isinstance(stated, str):
            problems.append(_usage("--column", stated))
        else:
            columns[stated[0]] = stated[1]
    numbers = {
        name: [_quantity(f"--{name}", text, dimension, problems) for text in getattr(args, name)]
        for name, dimension in (("width", dim.LENGTH), ("length", dim.LENGTH), ("temperature", dim.TEMPERATURE))
    }
    reference = [
        _quantity("--reference-length", text, dim.LENGTH, problems) for text in [args.reference_length] if text
    ]
    share = _share(args.most_left_out, MOST_LEFT_OUT, problems)
    fixed = _fixed(args.fixed, problems)
    keep = _keep(args.keep, problems)
    if problems:
        raise _WrongError(problems)
    return Request(
        polarity=args.polarity or (device.device.polarity if device is not None else "n"),
        columns=columns,
        fixed=fixed,
        width=numbers["width"],
        length=numbers["length"],
        temperature=numbers["temperature"],
        reference_length=reference[0] if reference else None,
        keep=keep,
        most_left_out=share,
    )


def _fixed(texts: list[str], problems: list[Problem]) -> dict[str, float]:
    """Voltages that have one value in every table."""
    from worksheet.extract.header import BY_NAME

    found = {}
    for text in texts:
        name, sign, value = (part.strip() for part in text.partition("="))
        quantity = BY_NAME.get(name)
        if quantity is None or not sign or quantity.dimension is not dim.VOLTAGE:
            names = ", ".join(one for one, each in BY_NAME.items() if each.dimension is dim.VOLTAGE)
            problems.append(_usage("--fixed", f'Found "{text}", expected NAME=VALUE with NAME one of {names}.'))
        else:
            found[name] = _quantity("--fixed", value, dim.VOLTAGE, problems)
    return found


def _keep(texts: list[str], problems: list[Problem]) -> tuple[str, ...]:
    """Reasons that are overruled."""
    from worksheet.extract.extraction import REASONS_BY_OPTION

    if "all" in texts:
        return tuple(REASONS_BY_OPTION.values())
    known = [text.replace(" ", "-") for text in texts]
    for text in known:
        if text not in REASONS_BY_OPTION:
            message = f'Found "{text}", expected all or one of {", ".join(REASONS_BY_OPTION)}.'
            problems.append(_usage("--keep", message))
    return tuple(REASONS_BY_OPTION[text] for text in known if text in REASONS_BY_OPTION)


def _share(text: str, default: float, problems: list[Problem]) -> float:
    """A share of the rows."""
    if not text:
        return default
    share = _quantity("--most-left-out", text, dim.NUMBER, problems)
    if not 0.0 <= share <= 1.0:
        problems.append(_usage("--most-left-out", f"Found {share:g}, expected 0 to 1."))
    return share


def _quantity(option: str, text: str, dimension: Dimension, problems: list[Problem]) -> float:
    """A quantity as typed: with its unit, or a bare number in SI. [unit of the dimension]"""
    try:
        value: object = float(text)
    except ValueError:
        value = text
    try:
        return parse(value, dimension)
    except QuantityError as error:
        problems.append(_usage(option, str(error)))
        return 0.0


def _values(option: str, text: str) -> list[float]:
    """Voltages: FROM:TO:STEP, or a list with commas. [V]"""
    problems: list[Problem] = []
    if ":" not in text:
        values = [_quantity(option, part.strip(), dim.VOLTAGE, problems) for part in text.split(",")]
    else:
        parts = [_quantity(option, part.strip(), dim.VOLTAGE, problems) for part in text.split(":")]
        steps = (parts[1] - parts[0]) / parts[2] if len(parts) == 3 and parts[2] else -1.0
        if not 0.0 <= steps < _STEPS:
            problems.append(
                _usage(option, f'Found "{text}", expected FROM:TO:STEP with a step from the one to the other.')
            )
        values = [parts[0] + place * parts[2] for place in range(int(steps + 1e-9) + 1)] if not problems else []
    if problems:
        raise _WrongError(problems)
    return values


def _usage(option: str, message: str) -> Problem:
    return Problem("command line", None, option, message)


def _bad(problems: list[Problem], output: Output) -> int:
    """Say what is wrong."""
    from worksheet.report import plain

    tell(problems)
    if output.as_json:
        output.document(plain.only_problems(problems))
    return Status.BAD_INPUT
