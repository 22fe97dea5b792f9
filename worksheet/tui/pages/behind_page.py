"""What stands behind a number: its relation, what it comes to, and which inputs move it, most fragile first."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from worksheet.model import metrics
from worksheet.model.quantity import format_quantity
from worksheet.report import wording
from worksheet.report.table import wrapped
from worksheet.review.fragility import Fragile
from worksheet.solver.results import Bound, Window
from worksheet.tui.explained import WORST, Explained, name_of
from worksheet.tui.helping import of_subject
from worksheet.tui.pages import algebra_page, words
from worksheet.tui.pages.parts import Facts, design, region_text
from worksheet.tui.rows import HEAD, LABEL, PLAIN, QUIET, Page, Row, Span, heading, line

_NAME = 30


def page(
    facts: Facts, kind: str, name: str, fragile: Sequence[Fragile], asked: Window | None, found: Explained | None
) -> Page:
    """Rows about one number of a sheet.

    Args:
        facts: The sheet.
        kind, name: What the number is, as a row's subject.
        fragile: The ranking of the sheet's inputs at the nominal condition.
        asked: The window of another unknown, where the user asked for one.
        found: Its algebra, None while it is being looked for.
    """
    target = name.partition(":")[2] if kind == "bound" else name
    made: list[Row] = list(_about(facts, kind, name))
    if kind in ("metric", "bound", "figure"):
        made += _achieved(facts, target)
    made += algebra_page.rows(facts, found)
    if kind in ("metric", "bound", "figure"):
        made += _windows(facts, target, asked)
        made += _moved_by(facts, [one for one in fragile if one.target == target])
    elif kind != algebra_page.EXPLAIN:
        made += _window(facts, name)
        made += _moves(facts, [one for one in fragile if one.name.rpartition(".")[2] == name])
    return Page(tuple(made), tuple(row.key for row in made if row.key.startswith("part.")))


def _about(facts: Facts, kind: str, name: str) -> Iterator[Row]:
    if kind == "bound":
        kind, name = "metric", name.partition(":")[2]
    found = of_subject(kind, name)
    key = next((one for one in design(facts) if one.name == name), None)
    if not found and key is not None:
        found = [f"# {key.title} {key.symbol}", key.help]
    for k, paragraph in enumerate(found):
        role = HEAD if paragraph.startswith("# ") else PLAIN
        for n, text in enumerate(wrapped(paragraph.removeprefix("# "), max(facts.columns, 20))):
            yield Row(f"about.{k}.{n}", (line(facts.text(text, role)),), stops=False)


def _achieved(facts: Facts, name: str) -> Iterator[Row]:
    result = None if facts.result is None else facts.result.metrics.get(name)
    target = None if facts.result is None else next((t for t in facts.result.targets if t.target.name == name), None)
    if result is not None:
        text = wording.metric_number(name, result.value, result.unit, result.reason)
        yield Row("now", (line(Span("nominal", LABEL, 10), facts.text(text)),), copied=(name, text))
    if target is not None:
        text = f"{words.metric(target, target.worst)} {words.worst_place(target.worst_at, target.worst_with)}"
        spans = line(Span("worst", LABEL, 10), facts.text(text), words.verdict_span(target.verdict))
        subject = (algebra_page.EXPLAIN, name_of(name, WORST))
        yield Row("worst", (spans,), subject=subject, copied=(name, text, target.verdict))
        wanted = wording.limits(target.target, target.unit)
        yield Row("wanted", (line(Span("wanted", LABEL, 10), facts.text(wanted)),), copied=(name, wanted))


def _bounds(window: Window, target: str) -> list[Bound]:
    return [bound for bound in window.bounds if bound.target == target]


def _windows(facts: Facts, target: str, asked: Window | None) -> Iterator[Row]:
    """Where the target is just met on every variable's axis."""
    windows = [] if facts.solved is None else list(facts.solved.needed.values())
    if asked is not None:
        windows = [asked, *(one for one in windows if one.name != asked.name)]
    rows = [row for window in windows for row in _bound_rows(facts, window, target)]
    if asked is not None and not _bounds(asked, target):
        said = f"{target} is not met just so by any value of {asked.name}."
        rows.insert(0, Row("asked.none", (line(facts.text(said, QUIET)),)))
    if rows:
        yield heading("part.solved", "Solved for each unknown, the others held", facts.columns, facts.signs.across)
        yield from rows


def _bound_rows(facts: Facts, window: Window, target: str) -> Iterator[Row]:
    for k, bound in enumerate(_bounds(window, target)):
        sign = "≥" if bound.side == "low" else "≤"
        value = wording.number(wording.safe(bound.value, bound.side), window.unit)
        where = f"at {wording.bound_place(bound.at, bound.edge, bound.valid)}"
        shown = facts.text(f"{sign} {value}", PLAIN, 16)
        spans = line(facts.text(window.name, LABEL, _NAME), shown, facts.text(where, QUIET))
        copied = (window.name, f"{sign} {value}", wording.condition(bound.at))
        hand = facts.hands.get((window.name, target, bound.side), "")
        below = [line(Span("  "), facts.text(text, QUIET), gap=0) for text in wrapped(hand, facts.columns - 2) if hand]
        yield Row(f"solved.{window.name}.{k}", (spans, *below), subject=("variable", window.name), copied=copied)


def _window(facts: Facts, name: str) -> Iterator[Row]:
    """The window of a variable."""
    window = None if facts.solved is None else facts.solved.needed.get(name)
    key = next((one for one in design(facts) if one.name == name), None)
    if window is None or key is None or key.dimension is None:
        return
    present = format_quantity(window.present, key.dimension, words.DIGITS)
    text = f"now {present}, needed {region_text(window.region, key)}"
    yield Row("window", (line(facts.text(text)),), copied=(name, present, text))
    for bound in window.bounds:
        sign = "≥" if bound.side == "low" else "≤"
        value = format_quantity(wording.safe(bound.value, bound.side, words.DIGITS), key.dimension, words.DIGITS)
        spans = line(
            facts.text(bound.target, LABEL, _NAME),
            facts.text(f"{sign} {value}", PLAIN, 16),
            facts.text(f"at {wording.condition(bound.at)}", QUIET),
        )
        copied = (bound.target, f"{sign} {value}")
        yield Row(f"bound.{bound.target}.{bound.side}", (spans,), subject=("metric", bound.target), copied=copied)


def _moved_by(facts: Facts, fragile: Sequence[Fragile]) -> Iterator[Row]:
    """What moves a target, most fragile first."""
    if not fragile:
        return
    title = "What moves it: value, per cent a per cent, where it breaks"
    yield heading("part.moved", title, facts.columns, facts.signs.across, "nominal")
    for one in fragile:
        yield _fragile(facts, one, one.name, ("variable", one.name.rpartition(".")[2]))


def _moves(facts: Facts, fragile: Sequence[Fragile]) -> Iterator[Row]:
    """Which targets an input moves."""
    if not fragile:
        return
    title = "What it moves: value, per cent a per cent, where it breaks"
    yield heading("part.moves", title, facts.columns, facts.signs.across, "nominal")
    for one in fragile:
        kind = "metric" if metrics.find(one.target) is not None else "figure"
        yield _fragile(facts, one, one.target, (kind, one.target))


def _fragile(facts: Facts, one: Fragile, title: str, subject: tuple[str, str]) -> Row:
    value = wording.number(one.value, one.unit, digits=words.DIGITS)
    slope = "-" if one.sensitivity is None else f"{one.sensitivity:+.2f}"
    ends = "never near" if one.break_value is None else wording.number(one.break_value, one.unit, digits=words.DIGITS)
    room = "" if one.room is None else f"{one.room:.0%} away"
    spans = line(
        facts.text(title, LABEL, _NAME),
        facts.text(value, PLAIN, 11),
        Span(slope, PLAIN, 7, right=True),
        facts.text(ends, PLAIN, 12),
        facts.text(f"{room} {one.trust}".strip(), QUIET),
    )
    return Row(f"fragile.{one.target}.{one.name}", (spans,), subject=subject, copied=(title, value, slope, ends, room))
