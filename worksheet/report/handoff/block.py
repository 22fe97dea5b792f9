"""A block for a colleague: what it is for, what to doubt first, what it achieves, how, and what has moved."""

from __future__ import annotations

import re
from collections.abc import Iterator

from worksheet.model import metrics, operating
from worksheet.model.sheet import Evidence, Remark, Target, Value, Waiver
from worksheet.model.sheet_keys import ASSUMPTIONS, BIAS_KEYS, DESIGN
from worksheet.project.links import values_of
from worksheet.report import wording
from worksheet.report.algebra_text import origin
from worksheet.report.handoff import pictures, schematic, sizes
from worksheet.report.handoff.material import Block, HandOff
from worksheet.report.handoff.moved import moved_block
from worksheet.report.handoff.tree import (
    Builder,
    Cell,
    Formula,
    Number,
    Points,
    joined,
    metric,
    number,
    quantity,
    share,
    text,
)
from worksheet.report.handoff.windows import windows
from worksheet.review.results import MISSED, UNKNOWN, EvidenceVerdict, SheetReview, TargetReview
from worksheet.review.weakest import Weak
from worksheet.solver.subject import own_unit

_SENTENCE = re.compile(r"(.+?[.!?])(?:\s|$)", re.DOTALL)
_MOST_WEAK = 15


def block(made: HandOff, found: Block, into: Builder) -> None:
    """Write one block; the builder's level is that of its sections."""
    _weakest(found, into)
    _remarks(found, into)
    _targets(found, into)
    _waivers(found, into)
    windows(found, into)
    _algebra(found, into)
    _operating(found, into)
    sizes.sizes(found, into)
    moved_block(made, found, into)


def opening(found: Block, into: Builder) -> None:
    """What the block is, how it stands, and its drawing."""
    sheet, result = found.review.sheet, found.review
    into.say(purpose(found), strong=True)
    into.say(", ".join(part for part in _facts(result, found) if part) + ".")
    into.say(*counted(result).parts)
    if result.state_reason is not None:
        into.say(f"{result.state}: {result.state_reason}")
    said = " ".join(sheet.notes.split())
    rest = said.removeprefix(purpose(found)).strip()
    if rest:
        into.say(rest)
    into.head("Stage", "stage")
    into.add(schematic.picture(found))


def purpose(found: Block) -> str:
    """What the block is for, in one line: the first sentence of its notes, else what one takes its stage for."""
    said = " ".join(found.review.sheet.notes.split())
    first = _SENTENCE.match(said)
    return first[1] if first else said or found.circuit.stage.purpose


def _facts(result: SheetReview, found: Block) -> Iterator[str]:
    sheet = result.sheet
    yield f"{found.circuit.stage.title}, {found.circuit.polarity}-channel"
    yield f"device {sheet.device}, bulk on the {sheet.bulk}"
    yield f"bias {'an ideal source' if sheet.bias.ideal else sheet.bias.device}"
    yield f"{sheet.count} on the chip" if sheet.count != 1 else ""
    yield f"owner {sheet.owner}" if sheet.owner else ""
    yield f"state {result.state}"
    yield f"basis {result.basis}"
    yield f"nominal {wording.condition(found.nominal)}"


def counted(result: SheetReview) -> Cell:
    """How its targets stand: "5 targets: 4 met, 1 missed (bandwidth)"."""
    every = [t.verdict for t in result.targets]
    parts = []
    for verdict in dict.fromkeys(every):
        names = [t.target.name for t in result.targets if t.verdict == verdict]
        which = f" ({', '.join(names)})" if verdict != "met" else ""
        parts.append(f"{len(names)} {verdict}{which}")
    targets = "1 target" if len(every) == 1 else f"{len(every)} targets"
    return text(f"{targets}: {', '.join(parts)}." if every else "No targets.", _tone(result))


def _tone(result: SheetReview) -> str:
    return next((v for v in (MISSED, UNKNOWN) if result.count(v)), "")


def _weakest(found: Block, into: Builder) -> None:
    into.head("Weakest assumptions first", "weakest")
    rows = tuple(_weak(found, one) for one in found.weak[:_MOST_WEAK])
    if not rows:
        into.say("The block takes nothing from elsewhere.")
    columns = ("input", "trust", "now", "breaks at", "room", "target that breaks", "where it comes from")
    into.table("Least trusted first, then the least room before a target breaks", columns, rows, (2, 3, 4))
    if len(found.weak) > _MOST_WEAK:
        into.say(f"{len(found.weak) - _MOST_WEAK} more have more room or more trust.")


def _weak(found: Block, one: Weak) -> tuple[Cell, ...]:
    of = f"weak/{found.name}/{one.key}"
    checked = f"checked by {one.checked_by}" if one.checked_by else ""
    when = f" on {one.checked.isoformat()}" if checked and one.checked is not None else ""
    beside = "; ".join(part for part in (one.source, one.note, f"{checked}{when}") if part)
    stated = values_of(found.review.sheet).get(one.key)
    unit = unit_of(one, stated)
    formula = "" if stated is None or stated.formula is None else stated.formula.text
    return (
        text(one.key),
        text(one.trust or "not said"),
        number(one.value, unit, f"{of}/value", formula or None),
        number(one.break_value, unit, f"{of}/break_value"),
        share(one.room, f"{of}/room"),
        text(one.target or "-"),
        text(beside or "not said"),
    )


def unit_of(one: Weak, stated: Value | None) -> str:
    """The SI unit of a value that a block rests on; of an own name, that of the unit it was written in."""
    if one.key.startswith("own.") and stated is not None:
        return own_unit(stated)
    table, _, name = one.key.partition(".")
    keys = {"assume": ASSUMPTIONS, "bias": BIAS_KEYS}.get(table, ())
    dimension = next((key.dimension for key in (*keys, *DESIGN) if key.name == name), None)
    return one.unit if one.unit or dimension is None else dimension.unit


def _remarks(found: Block, into: Builder) -> None:
    into.head("Open remarks and questions", "remarks")
    unsettled = [
        text(f"Unsettled merge of {c.key}: ours {c.ours or 'nothing'}, theirs {c.theirs or 'nothing'}.")
        for c in found.review.sheet.collisions
    ]
    items = [*unsettled, *(text(_remark(r)) for r in found.review.sheet.remarks if r.open)]
    if items:
        into.add(Points(tuple(items)))
    else:
        into.say("None is open.")


def _remark(said: Remark) -> str:
    to = f" to {said.to}" if said.to else ""
    when = f", {said.dated.isoformat()}" if said.dated is not None else ""
    about = f", about {said.about}" if said.about else ""
    return f"{said.by}{to}{when}{about}: {said.text}"


def _targets(found: Block, into: Builder) -> None:
    result = found.review
    into.head("Targets", "targets")
    columns = ("target", "wanted", "nominal", "worst", "where", "margin", "simulated", "measured", "verdict")
    rows = tuple(_target(found, one) for one in result.targets)
    into.table("Wanted against calculated, simulated and measured", columns, rows, (2, 3, 5))
    said = [text(f"{t.target.name}: {s}") for t in result.targets if (s := _said(t))]
    if said:
        into.add(Points(tuple(said)))
    origins = tuple(_origin(one.target) for one in result.targets)
    into.table("Where the targets come from", ("target", "id", "source", "guard", "conditions", "what for"), origins)
    _evidence(found, into)
    _holds(result, into)
    for picture in (pictures.margins(found), pictures.response(found)):
        if picture is not None:
            into.add(picture)


def _of(found: Block, target: TargetReview) -> str:
    return f"review/{found.name}/targets/{target.target.name}"


def _target(found: Block, one: TargetReview) -> tuple[Cell, ...]:
    name, of = one.target.name, _of(found, one)
    entries = [e for e in found.review.sheet.evidence if e.metric == name]
    judged = list(zip(entries, one.evidence, strict=True))
    ends = "".join(f", {key} at an end of its range" for key in one.worst_with)
    return (
        text(name),
        wanted(one.target, one.unit, of),
        metric(name, one.nominal, one.unit, f"{of}/nominal"),
        metric(name, one.worst, one.unit, f"{of}/worst"),
        text(f"{wording.condition(one.worst_at)}{ends}"),
        share(one.margin, f"{of}/margin", sign=True),
        _found(found, judged, ("simulation", "extraction")),
        _found(found, judged, ("measurement",)),
        text(one.verdict, one.verdict),
    )


def wanted(target: Target, unit: str, of: str) -> Cell:
    """What a target wants, with its guard band in words."""
    parts: list[Cell] = []
    for sign, name, limit in (("≥ ", "min", target.minimum), ("≤ ", "max", target.maximum)):
        if limit is not None:
            shown = wording.metric_number(target.name, limit, unit)
            parts.append(Cell((sign, Number(shown, limit, unit, f"{of}/{name}", name))))
    return joined(*parts, between=", ")


def _found(found: Block, judged: list[tuple[Evidence, EvidenceVerdict]], by: tuple[str, ...]) -> Cell:
    """The last of what was found in a way, with a word where it belongs to other inputs."""
    places = [k for k, (entry, _) in enumerate(judged) if entry.found_by in by]
    if not places:
        return text("-")
    place = places[-1]
    entry, verdict = judged[place]
    unit = _unit(found, entry)
    of = f"review/{found.name}/targets/{entry.metric}/evidence/{place}/value"
    return joined(metric(entry.metric, entry.value, unit, of), text(", stale" if verdict.stale else ""))


def _unit(found: Block, entry: Evidence) -> str:
    known = metrics.find(entry.metric)
    if known is not None:
        return known.dimension.unit
    return next((t.unit for t in found.review.targets if t.target.name == entry.metric), "")


def _said(one: TargetReview) -> str:
    parts = [one.reason or ""]
    if one.invalid:
        parts.append(f"{one.invalid} points are not valid and count for nothing")
    if one.cause is not None and one.cause.axis != "range":
        parts.append(f"costs most: {one.cause.axis}, at {wording.condition(one.cause.at)}")
    elif one.cause is not None:
        parts.append(f"costs most: the range of {', '.join(one.cause.moved)}")
    return "; ".join(part for part in parts if part)


def _origin(target: Target) -> tuple[Cell, ...]:
    guard = f"{target.guard:.0%}" if target.guard else "none"
    where = "nominal" if target.at == "nominal" else "all"
    formula = target.formula.text if target.formula is not None else ""
    why = ": ".join(part for part in (formula, target.why) if part)
    return text(target.name), text(target.id), text(target.source), text(guard), text(where), text(why)


def _evidence(found: Block, into: Builder) -> None:
    rows = []
    for one in found.review.targets:
        entries = [e for e in found.review.sheet.evidence if e.metric == one.target.name]
        rows += [_piece(found, e, v, k) for k, (e, v) in enumerate(zip(entries, one.evidence, strict=True))]
    columns = ("target", "value", "spread or range", "found by", "at", "when, by whom, where", "stands", "verdict")
    into.table("Evidence: what simulations and benches found", columns, rows, (1,))


def _piece(found: Block, entry: Evidence, verdict: EvidenceVerdict, place: int) -> tuple[Cell, ...]:
    unit = _unit(found, entry)
    ends = [wording.metric_number(entry.metric, x, unit) for x in (entry.low, entry.high) if x is not None]
    spread = "" if entry.spread is None else f"sd {wording.metric_number(entry.metric, entry.spread, unit)}"
    samples = "" if entry.samples is None else f"{entry.samples} samples"
    day = "" if entry.dated is None else entry.dated.isoformat()
    return (
        text(entry.metric),
        metric(entry.metric, entry.value, unit, f"review/{found.name}/targets/{entry.metric}/evidence/{place}/value"),
        text(", ".join(part for part in (" to ".join(ends), spread, samples) if part) or "-"),
        text(entry.found_by),
        text("nominal" if entry.at is None else wording.condition(entry.at)),
        text(", ".join(part for part in (day, entry.by, entry.reference, entry.note) if part)),
        text("stale: found for other inputs" if verdict.stale else "for the inputs as they are"),
        text(verdict.verdict, verdict.verdict),
    )


def _holds(result: SheetReview, into: Builder) -> None:
    """What does not hold, and what the program remarks."""
    words = {"saturation": "is short of saturation", "max_voltage": "is past its voltage rating",
             "range": "is outside its range"}  # fmt: skip
    items = []
    for device, what in dict.fromkeys((v.device, v.what) for v in result.validity):
        entries = [v for v in result.validity if (v.device, v.what) == (device, what)]
        worst = max(entries, key=lambda v: v.short_by)
        more = f", and at {len(entries) - 1} more conditions" if len(entries) > 1 else ""
        short = wording.number(worst.short_by, worst.unit)
        items.append(text(f"{device} {words[what]} by {short} at {wording.condition(worst.at)}{more}", MISSED))
    items += [text(f"{note.about}: {note.text}") for note in result.notes]
    if items:
        into.head("What to know of the numbers", "notes", 1)
        into.add(Points(tuple(items)))
    if any(v.what == "max_voltage" for v in result.validity):
        into.say(wording.CAUTION)


def _algebra(found: Block, into: Builder) -> None:
    into.head("Algebra of the targets", "algebra")
    if not found.algebra:
        into.say("There is no target.")
        return
    into.say(f"Each with the numbers of the nominal condition put in, {wording.condition(found.nominal)}.")
    for one in found.algebra:
        shown = {g.symbol: _put_in(g.value, g.unit) for g in one.given if g.value is not None}
        value = metric(one.key, one.value, one.unit, f"explained/{found.name}/{one.key}", one.reason)
        into.add(
            Formula(
                f"{one.title} ({one.symbol})" if one.symbol != one.title else one.title,
                one.mathml(),
                one.mathml_put_in(shown),
                tuple(one.text(90)),
                joined(text(f"{one.symbol} = "), value),
                one.relation,
            )
        )
        rows = tuple(
            (text(g.symbol), text(g.title), number(g.value, g.unit), text("follows" if g.origin is None else
             origin(g.origin))) for g in one.given
        )  # fmt: skip
        into.table(f"Put into {one.symbol}", ("symbol", "what", "value", "from"), rows, (2,))


def _put_in(value: float, unit: str) -> str:
    """A number as it stands in a formula: a temperature in kelvin, whatever it is called elsewhere."""
    return f"{value:.4g} K" if unit == "K" else wording.number(value, unit)


def _operating(found: Block, into: Builder) -> None:
    into.head("Operating points", "operating")
    devices = tuple(found.review.operating_point)
    rows = []
    for value in operating.OPERATING_POINT:
        cells = []
        for device in devices:
            known = found.review.operating_point[device].get(value.key)
            of = f"review/{found.name}/operating_point/{device}/{value.key}"
            cells.append(quantity(known if isinstance(known, float) else None, value.dimension, of))
        rows.append((text(f"{value.title} {value.symbol}"), *cells))
        if value.key == "inversion_coefficient":
            regions = (found.review.operating_point[d].get("region") or "-" for d in devices)
            rows.append((text("Region"), *(text(region) for region in regions)))
    names = [f"{device} ({found.models[device]})" for device in devices]
    right = range(1, len(devices) + 1)
    into.table(f"Devices at {wording.condition(found.nominal)}", ("value", *names), rows, right)
    achieved = [
        (
            text(_metric_title(key)),
            metric(key, one.value, one.unit, f"review/{found.name}/metrics/{key}", one.reason),
        )
        for key, one in found.review.metrics.items()
    ]
    into.table("Every metric at the nominal condition", ("metric", "value"), achieved, (1,))


def _metric_title(key: str) -> str:
    found = metrics.find(key)
    return key if found is None else found.title


def _waivers(found: Block, into: Builder) -> None:
    into.head("Waivers", "waivers")
    rows = tuple(_waiver(found, one) for one in found.review.sheet.waivers)
    columns = ("target", "accepted", "by", "reason", "dated", "until", "holds now")
    into.table("Misses that were accepted", columns, rows, (1,))
    if not rows:
        into.say("None.")


def _waiver(found: Block, one: Waiver) -> tuple[Cell, ...]:
    target = next((t for t in found.review.targets if t.target.name == one.target), None)
    unit = "" if target is None else target.unit
    days = (day.isoformat() if day is not None else "" for day in (one.dated, one.until))
    dated, until = days
    now = "-" if target is None else target.verdict
    return (
        text(one.target),
        metric(one.target, one.value, unit, reason="the miss as it is"),
        text(one.by),
        text(one.reason),
        text(dated or "-"),
        text(until or "no end"),
        text(now, now if target is not None else ""),
    )
