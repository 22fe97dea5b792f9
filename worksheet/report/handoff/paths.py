"""Signal paths of a project: what they achieve from end to end, and what each block takes of it."""

from __future__ import annotations

from worksheet.report import wording
from worksheet.report.handoff.block import wanted
from worksheet.report.handoff.material import HandOff
from worksheet.report.handoff.tree import Builder, Cell, Points, metric, number, share, text
from worksheet.review.chained import ChainReview, StageShare
from worksheet.review.results import TargetReview


def paths(made: HandOff, into: Builder) -> None:
    """The section of signal paths, nothing where the project names none."""
    if not made.review.chains:
        return
    into.head("Signal paths", "paths")
    for found in made.review.chains:
        _path(found, into)


def _path(found: ChainReview, into: Builder) -> None:
    name = found.chain.name
    into.head(found.chain.title or name, f"path-{name}", 1)
    into.say(f"{name}: {', then '.join(found.chain.sheets)}.")
    if found.reason is not None:
        into.say(f"It cannot be reckoned: {found.reason}", strong=True)
    columns = ("target", "wanted", "nominal", "worst", "where", "margin", "verdict")
    rows = tuple(_target(name, one) for one in found.targets)
    into.table(f"{name}: wanted against calculated", columns, rows, (2, 3, 5))
    achieved = tuple(
        (
            text(key),
            number(one.nominal.value, one.nominal.unit, f"chain/{name}/metrics/{key}/value", one.nominal.reason),
            number(one.low, one.nominal.unit, f"chain/{name}/metrics/{key}/low"),
            number(one.high, one.nominal.unit, f"chain/{name}/metrics/{key}/high"),
        )
        for key, one in found.metrics.items()
    )
    spans = ("quantity", "nominal", "least", "greatest")
    into.table(f"{name}: from end to end over all conditions", spans, achieved, (1, 2, 3))
    takes = tuple(_stage(name, place, one) for place, one in enumerate(found.stages))
    parts = ("block", "gain", "noise at the input", "of the noise", "bandwidth lost", "settling lost", "of the current")
    into.table(f"{name}: what each block takes, at the nominal condition", parts, takes, tuple(range(1, len(parts))))
    if found.notes:
        into.add(Points(tuple(text(f"{note.about}: {note.text}") for note in found.notes)))


def _target(name: str, one: TargetReview) -> tuple[Cell, ...]:
    of = f"chain/{name}/targets/{one.target.name}"
    return (
        text(one.target.name),
        wanted(one.target, one.unit, of),
        metric(one.target.name, one.nominal, one.unit, f"{of}/nominal"),
        metric(one.target.name, one.worst, one.unit, f"{of}/worst"),
        text(wording.condition(one.worst_at)),
        share(one.margin, f"{of}/margin", sign=True),
        text(one.verdict, one.verdict),
    )


def _stage(name: str, place: int, one: StageShare) -> tuple[Cell, ...]:
    of = f"chain/{name}/takes/{place}"
    return (
        text(one.sheet),
        number(one.gain, "V/V", f"{of}/gain"),
        number(one.input_noise, "V", f"{of}/input_noise"),
        share(one.noise_share, f"{of}/noise_share"),
        share(one.bandwidth_lost, f"{of}/bandwidth_lost"),
        share(one.settling_lost, f"{of}/settling_lost"),
        share(one.current_share, f"{of}/current_share"),
    )
