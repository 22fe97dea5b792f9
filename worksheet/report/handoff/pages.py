"""Whole pages: of one block, and of a project with all of its blocks."""

from __future__ import annotations

from worksheet.model.problem import Problem
from worksheet.report import wording
from worksheet.report.handoff import pictures
from worksheet.report.handoff.block import block, counted, opening, purpose
from worksheet.report.handoff.material import Block, HandOff, Origin
from worksheet.report.handoff.moved import moved_project
from worksheet.report.handoff.paths import paths
from worksheet.report.handoff.tree import Builder, Cell, Heading, Links, Page, Points, joined, metric, text
from worksheet.review.results import MISSED

_ID = 10

CAUTION = (
    "The calculation knows a voltage rating for each device and nothing else of reliability: supplies, start-up, "
    "discharge and ageing are for the foundry's rules, local codes and licensed practice."
)
"""Said on every page that leaves the house."""


def block_page(made: HandOff, found: Block) -> Page:
    """A page of one block."""
    title = found.review.sheet.title or found.name
    head = Builder(1)
    head.head(f"{title} ({found.name})", "top", block=found.name)
    body = Builder(2)
    _standing(made, head)
    opening(found, body)
    block(made, found, body)
    _budgets(made, body)
    _problems(made, body, f"sheets/{found.name}.toml")
    links = [(n.text, n.name, Cell()) for n in body.nodes if isinstance(n, Heading) and n.level == 2]
    head.add(Links("Contents", tuple(links)))
    return Page(f"{title}: hand-off", _foot(made), (*head.nodes, *body.nodes))


def project_page(made: HandOff) -> Page:
    """A page of a project."""
    head = Builder(1)
    head.head(made.review.title or "Project", "top")
    _standing(made, head)
    body = Builder(2)
    _overview(made, body)
    paths(made, body)
    _budgets(made, body)
    _uncovered(made, body)
    _problems(made, body)
    moved_project(made, body)
    _fits(made, body)
    for found in made.blocks:
        one = Builder(2, f"{found.name}-")
        one.head(f"{found.review.sheet.title or found.name} ({found.name})", "block", block=found.name)
        inner = Builder(3, f"{found.name}-")
        opening(found, inner)
        block(made, found, inner)
        body.add(*one.nodes, *inner.nodes)
    links = [(n.text, n.name, Cell()) for n in body.nodes if isinstance(n, Heading) and n.level == 2]
    head.add(Links("Contents", tuple(links)))
    return Page(f"{made.review.title or 'Project'}: hand-off", _foot(made), (*head.nodes, *body.nodes))


def _standing(made: HandOff, into: Builder) -> None:
    owner = f", owner {made.owner}" if made.owner else ""
    project = made.review.title or "a project"
    into.say(f"Hand-off of {made.dated.isoformat()}; project {project}{owner}; process {made.process}.")
    into.say(_from(made.origin))
    if made.conditions:
        into.say(made.conditions)
    into.say(wording.STANDING, " ", CAUTION)


def _from(origin: Origin) -> str:
    if not origin.revision:
        return "Made from files that no revision holds."
    more = ", with changes that are not recorded yet" if origin.changed else ""
    return f"Made from revision {origin.revision[:_ID]}{more}."


def _overview(made: HandOff, into: Builder) -> None:
    into.head("Blocks", "blocks")
    rows = tuple(_line(found) for found in made.blocks)
    into.table("Every block, what it is for and how it stands", ("block", "for", "state", "count", "targets"), rows)
    if made.review.bad:
        into.add(Points(tuple(text(f"{name} cannot be read; see the problems", MISSED) for name in made.review.bad)))


def _line(found: Block) -> tuple[Cell, ...]:
    sheet = found.review.sheet
    said = ": ".join(part for part in (sheet.title, purpose(found)) if part)
    return text(sheet.name), text(said), text(found.review.state), text(sheet.count), counted(found.review)


def _budgets(made: HandOff, into: Builder) -> None:
    if not made.review.budgets:
        return
    into.head("Budgets", "budgets")
    rows = tuple(
        (
            text(b.metric),
            joined(text("≤ "), metric(b.metric, b.maximum, b.unit, f"budget/{b.metric}/max")),
            metric(b.metric, b.nominal, b.unit, f"budget/{b.metric}/nominal"),
            metric(b.metric, b.worst, b.unit, f"budget/{b.metric}/worst"),
            text(b.verdict, b.verdict),
        )
        for b in made.review.budgets
    )
    columns = ("budget", "limit", "nominal", "worst", "verdict")
    into.table("All blocks times their count", columns, rows, (1, 2, 3))


def _uncovered(made: HandOff, into: Builder) -> None:
    if not made.review.uncovered:
        return
    into.head("Requirements that no target names", "uncovered")
    rows = tuple((text(number), text(said)) for number, said in made.review.uncovered.items())
    into.table("To be covered elsewhere, or by a target that carries the number", ("id", "requirement"), rows)


def _problems(made: HandOff, into: Builder, file: str = "") -> None:
    found = [p for p in made.review.problems if not file or p.file == file or not p.file.startswith("sheets/")]
    if not found:
        return
    into.head("Problems", "problems")
    into.say("Something of the project is wrong; what it concerns is not in the numbers.")
    into.table("What is wrong, and where", ("file", "line", "key", "what"), tuple(map(_problem, found)))


def _problem(found: Problem) -> tuple[Cell, ...]:
    return text(found.file), text(found.line or "-"), text(found.key or "-"), text(found.message)


def _fits(made: HandOff, into: Builder) -> None:
    if not made.fits:
        return
    into.head("Devices with curves behind them", "fits")
    for fit in made.fits:
        into.add(pictures.fit(fit))


def _foot(made: HandOff) -> str:
    return f"{made.review.title or 'Project'}, {made.dated.isoformat()}. {wording.STANDING}"
