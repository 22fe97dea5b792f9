"""The formulas of a stage apart from any sheet: its metrics in small-signal values, and turned round for a designer."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import islice
from typing import Any

from worksheet.engine.symbolic.algebra import Algebra, Setting, of
from worksheet.model import metrics
from worksheet.model.dimension import NUMBER
from worksheet.model.process_keys import CORNER_CHANGES, DEVICE_PARAMETERS
from worksheet.model.sheet_keys import DESIGN
from worksheet.solver import algebra_print
from worksheet.solver.algebra_print import Piece
from worksheet.solver.inversion import hand_formula
from worksheet.stages.circuit import Circuit
from worksheet.stages.stage import Stage

STATED_FOR = (
    "n-channel devices, long channel, typical corner, bulk on the rail, small steps, levels in the middle of their "
    "range; the current source is ideal and has g_L and C_b, which the formulas turned round leave out. A metric's "
    "key stands for the limit on it, y for the charge at the source end."
)
"""What the formulas of a stage hold for, and how they are to be read."""

IDEALS = ("bias.output_conductance", "bias.capacitance")
"""What an ideal current source may still have."""

_IDLE = (
    "bias_temperature_exponent",
    "bias_overhead",
    "saturation_margin",
    "well_capacitance",
    "input_level",
    "output_level",
    "step_size",
)
_ORDER = sorted(DESIGN, key=lambda k: ("bias_current", "length", "load_capacitance", "width").index(k.name))
_LAWS = ("length_modulation", "surface_potential", "velocity_length", "flicker_exponent")


def plain_setting(circuit: Circuit, ideal: bool = False) -> Setting:
    """A circuit with everything optional left out: long channel, typical corner, small steps, levels in the middle.

    Args:
        circuit: The circuit.
        ideal: Whether an ideal current source has no conductance and no capacitance.
    """
    absent = {*_IDLE, *(IDEALS if ideal else ())}
    for d in circuit.devices:
        absent |= {f"{d.name}.process.{law}" for law in _LAWS} | {f"{d.name}.corner.{k.name}" for k in CORNER_CHANGES}
    return Setting(circuit, frozenset(absent))


@dataclass(frozen=True, slots=True)
class Inverted:
    """A metric turned round: the unknown's key, the formula, what its shorthand stands for ("" for none), neglects."""

    unknown: str
    formula: str
    where: str
    neglects: tuple[str, ...]


@dataclass(frozen=True, eq=False)
class MetricFormula:
    """One metric of a stage.

    Attributes:
        key: The metric.
        inverted: What it asks of design variables.
    """

    key: str
    inverted: tuple[Inverted, ...]
    _pieces: Sequence[Piece]

    def line(self) -> str:
        """The metric on one line; its last piece where it is a root of an equation."""
        return "; ".join(f"{caption} {algebra_print.as_line(e)}".strip() for caption, e in self._pieces)

    def text(self, width: int, use_unicode: bool = True) -> list[str]:
        """The metric as lines of characters no wider than `width` columns."""
        return algebra_print.as_text(self._pieces, width, use_unicode)

    def latex(self) -> tuple[str, ...]:
        """The metric as LaTeX."""
        return algebra_print.as_latex(self._pieces)

    def mathml(self) -> tuple[str, ...]:
        """The metric as presentation MathML."""
        return algebra_print.as_mathml(self._pieces)


def formulas_of(stage: Stage) -> tuple[str, ...]:
    """Keys of the metrics that a stage has a formula for: all of its metrics."""
    return tuple(m.key for m in metrics.all_metrics() if stage.absent_metric(m.key) is None)


def metric_formula(stage: Stage, key: str, ideal_bias: bool = True, every: bool = False) -> MetricFormula:
    """One metric of a stage for n-channel devices with the bulk on the rail.

    Args:
        stage: The stage.
        key: The metric. KeyError where it has none of that key.
        ideal_bias: Whether the current source is ideal; it then has g_L and C_b.
        every: Whether to turn it round for every design variable, or for the first that it bounds alone.
    """
    if metrics.find(key) is None or stage.absent_metric(key) is not None:
        raise KeyError(key)
    circuit = Circuit(stage, ideal_bias=ideal_bias)
    algebra: Algebra = of(plain_setting(circuit))
    found = algebra.definition(key)
    assert found is not None  # metrics have one
    turned = (_inverted(plain_setting(circuit, ideal=True), key, k.name) for k in _ORDER)
    every_one = (t for t in turned if t is not None)
    shown = tuple(every_one) if every else tuple(islice(every_one, 1))
    return MetricFormula(key, shown, algebra_print.pieces(algebra.symbol(key), found))


def _inverted(setting: Setting, metric: str, unknown: str) -> Inverted | None:
    formula = hand_formula(setting, metric, unknown)
    if formula is None or not _has_value(formula.whole()):
        return None
    short = formula.shorthand[0]
    where = "" if short is None else f"{short[0]} = {algebra_print.as_line(short[1])}"
    left_out = (*formula.neglects, *(hold.moving_with(unknown) for hold in formula.held))
    return Inverted(unknown, algebra_print.as_line(formula.branches[0]), where, left_out)


def _has_value(expression: Any) -> bool:
    """Whether every root that hangs on shares of a device alone is real, as at the shares that they are described with.

    A follower's gain is below one at every current: a formula for its unity-gain frequency is none.
    """
    import sympy

    usual = {k.symbol: sympy.Float(k.example) for k in DEVICE_PARAMETERS if k.dimension is NUMBER and k.example}
    known = {s: usual[s.name] for s in expression.free_symbols if s.name in usual}
    bases = (p.base for p in expression.atoms(sympy.Pow) if not p.exp.is_integer)
    return not any(base.xreplace(known).is_negative for base in bases)
