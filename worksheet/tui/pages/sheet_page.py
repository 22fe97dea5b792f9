"""A sheet's page: all its parts in the order of the work, what is wanted first."""

from __future__ import annotations

from collections.abc import Callable, Iterator

from worksheet.model import metrics, operating
from worksheet.model.quantity import format_quantity
from worksheet.report import wording
from worksheet.report.table import wrapped
from worksheet.solver.results import Bound, Window
from worksheet.tui import rows
from worksheet.tui.pages import merged_part, parts, words
from worksheet.tui.pages.parts import Facts, design
from worksheet.tui.rows import LABEL, PLAIN, QUIET, Page, Row, Span, heading, line

_DEVICE = 10


def page(facts: Facts) -> Page:
    """All rows of a sheet."""
    made: list[Row] = list(_problems(facts))
    sections: list[str] = []
    if made and not facts.data and facts.snapshot.sides(facts.name) is None:  # no TOML: nothing to show or to change
        return Page(tuple(made))
    for key, title, part in PARTS:
        found = list(part(facts))
        if found:
            sections.append(f"part.{key}")
            made.append(heading(f"part.{key}", title, facts.columns, facts.signs.across, _note(facts, key)))
            made += found
    return Page(tuple(made), tuple(sections))


def _note(facts: Facts, key: str) -> str:
    if key == "needed" and facts.solved is not None:
        return "in every condition" if facts.solved.over == "all" else "at the nominal condition"
    return ""


def _problems(facts: Facts) -> Iterator[Row]:
    for k, problem in enumerate(facts.snapshot.problems_of(facts.name)):
        place = f"line {problem.line}: " if problem.line is not None else ""
        said = f"{place}{problem.key + ': ' if problem.key else ''}{problem.message}"
        for n, text in enumerate(_wrapped(facts, said)):
            yield Row(f"problem.{k}.{n}", (line(facts.text(text, rows.MISSED)),), stops=n == 0, copied=(said,))


def _wrapped(facts: Facts, text: str) -> list[str]:
    return wrapped(text, max(facts.columns, 20))


def _holds(facts: Facts) -> Iterator[Row]:
    """What does not hold, and remarks of the program."""
    if facts.result is None:
        return
    kinds = dict.fromkeys((one.device, one.what) for one in facts.result.validity)
    for device, what in kinds:
        entries = [one for one in facts.result.validity if (one.device, one.what) == (device, what)]
        worst = max(entries, key=lambda one: one.short_by)
        short = wording.number(worst.short_by, worst.unit, digits=words.DIGITS)
        said = f"{device} {_BROKEN[what]} by {short} at {wording.condition(worst.at)}"
        more = f", and at {len(entries) - 1} more" if len(entries) > 1 else ""
        yield from _said(facts, f"validity.{device}.{what}", f"not valid: {said}{more}", rows.MISSED)
    if facts.result.state_reason is not None:
        yield from _said(facts, "state", f"{facts.result.state}: {facts.result.state_reason}", rows.UNKNOWN)
    for k, note in enumerate(facts.result.notes):
        yield from _said(facts, f"note.{k}", f"{note.about}: {note.text}", PLAIN)
    if any(one.what == "max_voltage" for one in facts.result.validity):
        yield from _said(facts, "caution", wording.CAUTION, rows.MISSED)


_BROKEN = {
    "saturation": "short of saturation",
    "max_voltage": "past its voltage rating",
    "range": "outside its range",
}


def _said(facts: Facts, key: str, text: str, role: str) -> Iterator[Row]:
    lines = tuple(line(facts.text(one, role)) for one in _wrapped(facts, text))
    yield Row(key, lines, copied=(text,))


def _needed(facts: Facts) -> Iterator[Row]:
    """Every bound of every variable, the binding ones first, with its formula by hand; then the proposals."""
    if facts.solved is None:
        return
    keys = {key.name: key for key in design(facts)}
    for window in facts.solved.needed.values():
        key = keys.get(window.name)
        if key is not None:
            for k, bound in enumerate(_binding_first(window)):
                yield _bound(facts, window, bound, k)
    if facts.solved.reason and facts.solved.recommended is None:
        yield from _said(facts, "needed.reason", f"No proposal: {facts.solved.reason}.", QUIET)
    if facts.solved.conflict is not None:
        yield from _said(facts, "needed.conflict", f"CONFLICT: {facts.solved.conflict.explain}.", rows.MISSED)


def _binding_first(window: Window) -> list[Bound]:
    region = window.region
    ends = () if region is None else (region.low, region.high)
    return sorted(window.bounds, key=lambda bound: (bound.value not in ends, bound.side, bound.value))


def _bound(facts: Facts, window: Window, bound: Bound, k: int) -> Row:
    keys = {key.name: key for key in design(facts)}
    key = keys[window.name]
    ends = (window.region.low, window.region.high) if window.region is not None else ()
    sign = "≥" if bound.side == "low" else "≤"
    assert key.dimension is not None  # variables have one
    value = format_quantity(wording.safe(bound.value, bound.side, words.DIGITS), key.dimension, words.DIGITS)
    binds = Span("binds", rows.WAIVED) if bound.value in ends else Span("", QUIET)
    name = f"{key.symbol or key.name} {sign} {value}"
    first = line(facts.text(name, LABEL, 20), facts.text(bound.target, PLAIN, 18), binds)
    where = wording.bound_place(bound.at, bound.edge, bound.valid)
    lines = [first, line(Span("  "), facts.text(f"at {where}", QUIET), gap=0)]
    hand = facts.hands.get((window.name, bound.target, bound.side))
    if hand:
        lines += [line(Span("  "), facts.text(text, QUIET), gap=0) for text in _wrapped(facts, hand)[:2]]
    copied = (window.name, bound.side, value, bound.target, wording.condition(bound.at), hand or "")
    subject = ("bound", f"{window.name}:{bound.target}")
    return Row(f"needed.{window.name}.{k}", tuple(lines), subject=subject, copied=copied)


def _metrics(facts: Facts) -> Iterator[Row]:
    """Every metric at the nominal condition."""
    if facts.result is None:
        return
    for name, number in facts.result.metrics.items():
        metric = metrics.find(name)
        if metric is None:
            continue
        text = wording.metric_number(name, number.value, number.unit, number.reason)
        spans = line(facts.text(name, LABEL, 24), facts.text(text, PLAIN, 14), facts.text(metric.symbol, QUIET))
        yield Row(f"metric.{name}", (spans,), subject=("metric", name), copied=(name, text))


def _operating(facts: Facts) -> Iterator[Row]:
    """The operating point, a column a device."""
    if facts.result is None:
        return
    devices = facts.result.operating_point
    first = [Span("", QUIET, 26), *(facts.text(name, QUIET, _DEVICE) for name in devices)]
    yield Row("operating", (line(*first),), stops=False)
    for value in operating.OPERATING_POINT:
        cells = [_cell(facts, values.get(value.key), value) for values in devices.values()]
        texts = [facts.text(text, PLAIN, _DEVICE) for text in cells]
        spans = line(facts.text(f"{value.title} {value.symbol}", LABEL, 26), *texts)
        yield Row(f"operating.{value.key}", (spans,), subject=("operating", value.key), copied=(value.key, *cells))
    regions = [str(values.get("region", "-")) for values in devices.values()]
    spans = line(facts.text("Region", LABEL, 26), *(facts.text(text, PLAIN, _DEVICE) for text in regions))
    yield Row("operating.region", (spans,), subject=("operating", "inversion_coefficient"), copied=("region", *regions))


def _cell(facts: Facts, number: float | str | None, value: operating.OperatingValue) -> str:
    del facts
    return format_quantity(number, value.dimension, words.DIGITS) if isinstance(number, float) else "-"


PARTS: tuple[tuple[str, str, Callable[[Facts], Iterator[Row]]], ...] = (
    ("conflict", "Two sides of a merge", merged_part.conflicts),
    ("collision", "What a merge left to be settled", merged_part.collisions),
    ("target", "Targets", parts.targets),
    ("holds", "What does not hold, and remarks", _holds),
    ("choose", "Choices", parts.choices),
    ("assume", "Assumptions", parts.assumptions),
    ("own", "Own names", parts.own_names),
    ("needed", "What is needed", _needed),
    ("metric", "Metrics, nominal", _metrics),
    ("operating", "Operating point, nominal", _operating),
    ("evidence", "Evidence", parts.evidence),
    ("waiver", "Waivers", parts.waivers),
    ("remark", "Remarks", parts.remarks),
    ("acceptance", "Accepted", parts.acceptances),
    ("block", "The block", parts.block),
)
"""Key, title and rows of each part."""
