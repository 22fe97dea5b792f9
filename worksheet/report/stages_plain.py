"""The stages as JSON-ready data, from their tables and the metric descriptions."""

from __future__ import annotations

from typing import Any

from worksheet.model import metrics
from worksheet.report.plain import SCHEMA
from worksheet.solver.stage_algebra import STATED_FOR, metric_formula
from worksheet.stages.stage import IN, LINE, OUT, Stage, Transistor

Plain = dict[str, Any]


def document(stages: tuple[Stage, ...], formulas: bool = False) -> Plain:
    """Stages as one document.

    Args:
        stages: What is asked for.
        formulas: Whether each metric comes with its formula and what that asks of the design variables.
    """
    found = [stage(s) for s in stages]
    if formulas:
        for plain, of in zip(found, stages, strict=True):
            plain["formulas_hold_for"] = STATED_FOR
            for one in plain["metrics"]:
                one.update(formula(of, one["metric"]))
    return {"schema": SCHEMA, "stages": found, "problems": []}


def stage(found: Stage) -> Plain:
    """One stage: what it is made of, what its sheet may say, and which metrics it has."""
    return {
        "stage": found.key,
        "title": found.title,
        "purpose": found.purpose,
        "driven": found.drive,
        "watched": watched(found),
        "held": held(found),
        "transistors": [transistor(d) for d in found.transistors],
        "bias": {"polarity": "same" if found.source_output else "other", "from": found.bias.source},
        "design": [key.name for key in found.design_keys(ideal_bias=False)],
        "assume": [key.name for key in found.assumption_keys("source")],
        "levels": list(found.levels),
        "metrics": [metric(m) for m in metrics.all_metrics() if found.absent_metric(m.key) is None],
    }


def transistor(device: Transistor) -> Plain:
    """One transistor and the nodes that it touches, as in an n-channel stage."""
    return {"name": device.name, "gate": device.gate, "drain": device.drain, "source": device.source}


def watched(found: Stage) -> str:
    """The terminal that the output is taken from."""
    return "source" if found.source_output else "drain"


def held(found: Stage) -> list[str]:
    """Terminals that neither the input drives nor the output watches, and that no other transistor moves."""
    fixed = [
        (device, terminal)
        for device in found.transistors
        for terminal in ("gate", "drain", "source")
        if getattr(device, terminal) not in (IN, OUT, *found.internal_nodes)
    ]
    alone = len(found.transistors) == 1
    return [terminal if alone else f"{device.name} {terminal}" for device, terminal in fixed]


def metric(found: metrics.Metric) -> Plain:
    """One metric."""
    return {
        "metric": found.key,
        "title": found.title,
        "symbol": found.symbol,
        "unit": found.dimension.unit,
        "relation": found.relation,
        "help": found.help,
    }


def formula(found: Stage, key: str) -> Plain:
    """A metric's formula in every form that it is printed in, and what it asks of each design variable."""
    algebra = metric_formula(found, key, every=True)
    return {
        "formula": algebra.line(),
        "latex": list(algebra.latex()),
        "mathml": list(algebra.mathml()),
        "asks": [
            {"of": i.unknown, "formula": i.formula, "where": i.where or None, "neglects": list(i.neglects)}
            for i in algebra.inverted
        ],
    }


def line_of(device: Transistor) -> str:
    """A transistor in words: "main: gate in, drain out, source ground"."""
    named = {LINE: "a bias line"}
    parts = [
        f"{terminal} {named.get(node, node)}" for terminal, node in transistor(device).items() if terminal != "name"
    ]
    return f"{device.name}: {', '.join(parts)}"
