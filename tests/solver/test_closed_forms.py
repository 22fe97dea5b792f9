"""The formulas that designers think in, as sympy finds them: compared as expressions, never as text.

Sources: the four gains and the follower's I_spec (y + y^2) follow from the charge model (Enz and Vittoz 2006); slew and
power are definitions; the gain's length is the law of drain coupling turned round. Published numbers stand beside the
last tests.
"""

from __future__ import annotations

from typing import Any

import pytest
import sympy

from worksheet.engine.symbolic.algebra import Algebra, Setting, of
from worksheet.engine.symbolic.metric import SymbolicSolution
from worksheet.engine.symbolic.neglects import DRAIN_CONDUCTANCE, FEED_THROUGH
from worksheet.solver.inversion import KEEP_INVERSION, HandFormula, hand_formula
from worksheet.solver.stage_algebra import metric_formula, plain_setting
from worksheet.stages import catalogue
from worksheet.stages.circuit import Circuit

STOP = ("source_conductance", "gate_coupling", "drain_coupling")


def setting(
    stage: str, *, with_: str = "", ideal_bias: bool = True, bulk: str = "rail", polarity: str = "n"
) -> Setting:
    found = catalogue.find(stage)
    assert found is not None
    plain = plain_setting(Circuit(found, polarity, bulk, ideal_bias), ideal=True)
    return Setting(plain.circuit, plain.absent - {with_})


def formula(of_: Setting, metric: str, unknown: str, **options: Any) -> HandFormula:
    found = hand_formula(of_, metric, unknown, **options)
    assert found is not None
    return found


def same(found: Any, wanted: Any) -> bool:
    return bool(sympy.simplify(found - wanted) == 0)


def symbols(a: Algebra, *keys: str) -> tuple[Any, ...]:
    return tuple(a.symbol(key) for key in keys)


@pytest.mark.parametrize("polarity", ["n", "p"])
def test_the_four_gains_at_every_inversion_and_temperature(polarity: str) -> None:
    """With an ideal bias source and no length modulation only kappa and sigma are left."""
    gains = {}
    for stage in ("source-follower", "common-source", "common-gate", "drain-follower"):
        a = of(setting(stage, polarity=polarity))
        gains[stage] = a.opened(SymbolicSolution(a).signed_gain(), lambda key: key.endswith(STOP))
        kappa, sigma = symbols(a, "main.gate_coupling", "main.drain_coupling")
    assert gains["source-follower"] == kappa
    assert gains["common-source"] == -kappa / sigma
    assert gains["common-gate"] == 1 / sigma
    assert gains["drain-follower"] == sigma


@pytest.mark.parametrize("stage", ["source-follower", "common-source", "common-gate", "drain-follower"])
def test_one_transistor_stages_reduce_to_their_table(stage: str) -> None:
    """Gain, output conductance and node capacitance of the four stages with a bias conductance g_L (and C_b)."""
    found = catalogue.find(stage)
    assert found is not None
    a = of(plain_setting(Circuit(found)))
    names = ("transconductance", "source_conductance", "drain_conductance")
    g_m, g_s, g_d = symbols(a, *(f"main.{name}" for name in names))
    c_gs, c_sb, c_gd, c_db = symbols(
        a, *(f"main.{n}_capacitance" for n in ("gate_source", "source_bulk", "gate_drain", "drain_bulk"))
    )
    g_l, load, own = symbols(a, "bias.output_conductance", "load_capacitance", "bias.capacitance")
    gain, conductance, capacitance = {
        "source-follower": (g_m / (g_s + g_l), g_s + g_l, c_gs + c_sb),
        "common-source": (-g_m / (g_d + g_l), g_d + g_l, c_gd + c_db),
        "common-gate": (g_s / (g_d + g_l), g_d + g_l, c_gd + c_db),
        "drain-follower": (g_d / (g_s + g_l), g_s + g_l, c_gs + c_sb),
    }[stage]
    solution = SymbolicSolution(a)
    assert same(solution.signed_gain(), gain)
    assert same(solution.output_resistance(), 1 / conductance)
    node = a.definition("output_capacitance")
    assert node is not None
    assert same(node.expression, load + own + capacitance)


def test_the_pole_of_a_follower_at_fixed_geometry() -> None:
    """I >= I_spec (y + y^2) with y = 2 pi f C_o U_T/I_spec."""
    found = formula(setting("source-follower"), "bandwidth", "bias_current")
    specific, thermal, node = symbols(found.algebra, "main.specific_current", "thermal_voltage", "output_capacitance")
    assert found.shorthand[0] is not None
    y, meaning = found.shorthand[0]
    assert same(meaning, 2 * sympy.pi * found.limit * node * thermal / specific)
    assert same(found.branches[0], specific * (y + y**2))
    assert sympy.sstr(found.branches[0], order="rev-lex") == "I_spec*(y + y**2)"
    assert found.neglects == ("feed-through",)
    assert [hold.moving_with("bias_current") for hold in found.held] == ["parasitics that move with current"]


def test_the_pole_of_a_follower_at_fixed_inversion() -> None:
    """I >= 2 pi f C_o U_T/G(IC)."""
    found = formula(setting("source-follower"), "bandwidth", "bias_current", keep=KEEP_INVERSION)
    slope, thermal, node = symbols(found.algebra, "main.slope_factor", "thermal_voltage", "output_capacitance")
    assert same(found.whole(), 2 * sympy.pi * found.limit * node * thermal / slope)
    inversion = found.algebra.symbol("main.inversion_coefficient")
    law = found.algebra.definition("main.slope_factor")
    assert law is not None
    assert same(law.expression, 2 / (1 + sympy.sqrt(1 + 4 * inversion)))


@pytest.mark.parametrize(("stage", "drain_side"), [("drain-follower", False), ("common-gate", True)])
def test_self_loading_at_fixed_inversion_is_closed(stage: str, drain_side: bool) -> None:
    """I >= 2 pi f C_L/(G/U_T - 2 pi f c_w L/(I_sq IC)), the whole metric of a stage without a zero."""
    found = formula(setting(stage), "bandwidth", "bias_current", keep=KEEP_INVERSION, moving_parasitics=True)
    a = found.algebra
    slope, square, inversion = symbols(
        a, *(f"main.{n}" for n in ("slope_factor", "square_current", "inversion_coefficient"))
    )
    load, length, thermal, per_width = symbols(
        a, "load_capacitance", "length", "thermal_voltage", "main.width_capacitance"
    )
    share = a.symbol("main.drain_coupling") if drain_side else 1
    rate = 2 * sympy.pi * found.limit
    assert same(
        found.whole(), rate * load / (share * slope / thermal - rate * per_width * length / (square * inversion))
    )
    assert found.exact


@pytest.mark.parametrize("stage", catalogue.keys())
def test_slew_gives_the_current(stage: str) -> None:
    found = formula(setting(stage), "slew_rate", "bias_current")
    assert found.whole() == found.limit * found.algebra.symbol("output_capacitance")
    moves = found.algebra.depends("output_capacitance", "bias_current")
    assert found.exact == (not moves)


@pytest.mark.parametrize("stage", catalogue.keys())
def test_power_gives_the_current(stage: str) -> None:
    found = formula(setting(stage, with_="bias_overhead"), "power", "bias_current")
    supply, overhead = symbols(found.algebra, "supply", "bias_overhead")
    assert same(found.whole(), found.limit / (supply * (1 + overhead)))
    assert found.exact


@pytest.mark.parametrize(("stage", "with_kappa"), [("common-source", True), ("common-gate", False)])
def test_gain_gives_the_length(stage: str, with_kappa: bool) -> None:
    """L from sigma(L) = sigma_ref (L_ref/L)^m."""
    found = formula(setting(stage), "dc_gain", "length")
    a = found.algebra
    reference, coupling, exponent = symbols(
        a, *(f"main.process.drain_coupling{end}" for end in ("_length", "", "_exponent"))
    )
    wanted_sigma = (a.symbol("main.gate_coupling") if with_kappa else 1) / found.limit
    assert same(found.whole(), reference * (coupling / wanted_sigma) ** (1 / exponent))
    assert found.exact or not with_kappa


def test_swing_gives_the_inversion() -> None:
    """V_DSsat = U_T (2 sqrt(IC + 1/4) + 3), so that q = V/(2 U_T) - 2."""
    found = formula(setting("common-source"), "output_low", "inversion_coefficient")
    thermal = found.algebra.symbol("thermal_voltage")
    assert same(found.whole(), (found.limit / thermal - 3) ** 2 / 4 - sympy.Rational(1, 4))
    assert found.exact


def test_area_and_offset_give_the_width() -> None:
    area = formula(setting("common-source"), "gate_area", "width")
    length = area.algebra.symbol("length")
    assert area.whole() == area.limit / length
    offset = formula(setting("common-source"), "offset", "width")
    matching = offset.algebra.symbol("main.process.matching_threshold")
    assert same(offset.whole(), matching**2 / (2 * length * offset.limit**2))
    assert offset.neglects == ("current-factor mismatch",)


def test_a_load_is_found_with_the_zero_in_place() -> None:
    """Squares are taken on the way: of two roots one would be a negative capacitance, and is dropped for it."""
    found = formula(setting("source-follower"), "bandwidth", "load_capacitance")
    assert found.exact
    assert found.dropped == ("C_o would be negative",)
    assert len(found.branches) == 1


def test_noise_gives_the_load() -> None:
    """kT/C in the form that the model has it: gamma k T/C_o at a source output, white noise alone."""
    found = formula(
        setting("source-follower"), "output_noise", "load_capacitance", neglects=frozenset({"flicker noise"})
    )
    a = found.algebra
    opened = a.opened(found.whole(), lambda key: not key.endswith(("white_density", "current")))
    thermal = a.symbol("constant.boltzmann") * a.symbol("temperature") * a.symbol("main.white_factor")
    parasitic = a.symbol("main.gate_source_capacitance") + a.symbol("main.source_bulk_capacitance")
    assert same(opened, thermal / found.limit**2 - parasitic)


@pytest.mark.parametrize("stage", ["source-follower", "drain-follower"])
def test_no_formula_for_what_the_unknown_does_not_move(stage: str) -> None:
    assert hand_formula(setting(stage), "dc_gain", "bias_current") is None
    assert hand_formula(setting(stage), "gate_area", "load_capacitance") is None


def test_a_formula_is_derived_once() -> None:
    assert formula(setting("common-gate"), "bandwidth", "width") is formula(
        setting("common-gate"), "bandwidth", "width"
    )


def test_published_current_of_a_follower_in_its_own_well() -> None:
    """Enz, "Improved voltage followers", 2026: 1 MHz, 10 pF, IC 1, n 1.27136 and U_T 25.875 mV take 3.344 uA."""
    made = frozenset({FEED_THROUGH, DRAIN_CONDUCTANCE})
    found = formula(
        setting("source-follower", bulk="source"), "bandwidth", "bias_current", keep=KEEP_INVERSION, neglects=made
    )
    numbers = {
        found.limit: 1e6,
        found.algebra.symbol("output_capacitance"): 10e-12,
        found.algebra.symbol("thermal_voltage"): 25.875e-3,
        found.algebra.symbol("main.gate_coupling"): 1 / 1.27136,
        found.algebra.symbol("main.slope_factor"): 0.618034,
    }
    assert float(found.whole().subs(numbers)) == pytest.approx(3.344e-6, rel=2e-3)


def test_published_least_current_of_a_gain_stage() -> None:
    """Enz, "Cascode gain stage", 2025: in weak inversion 1 MHz of gain-bandwidth into 1 pF takes at least 198 nA."""
    made = frozenset({FEED_THROUGH, DRAIN_CONDUCTANCE})
    found = formula(setting("common-source"), "unity_gain_frequency", "bias_current", neglects=made)
    a = found.algebra
    specific = a.symbol("main.specific_current")
    weak = sympy.limit(found.whole().subs(a.symbol("main.drain_coupling"), 0), specific, sympy.oo)
    numbers = {
        found.limit: 1e6,
        a.symbol("output_capacitance"): 1e-12,
        a.symbol("main.gate_drain_capacitance"): 0,
        a.symbol("thermal_voltage"): 25.865e-3,
        a.symbol("main.gate_coupling"): 1 / 1.22,
    }
    assert float(weak.subs(numbers)) == pytest.approx(198e-9, rel=2e-3)


def test_published_output_resistance_of_a_cascode() -> None:
    """Enz, "Cascode gain stage", 2025: g_ms2 8.362 uA/V, g_ds1 520.2 and g_ds2 638.1 nA/V give 28.7 Mohm.

    There g_ds lies between drain and source beside g_ms, so the whole slope against the source voltage is their sum.
    """
    a = of(setting("cascode"))
    resistance = SymbolicSolution(a).output_resistance()
    numbers = {
        a.symbol("cascode.source_conductance"): 8.362e-6 + 638.1e-9,
        a.symbol("main.drain_conductance"): 520.2e-9,
        a.symbol("cascode.drain_conductance"): 638.1e-9,
    }
    assert float(resistance.subs(numbers)) == pytest.approx(28.7e6, rel=2e-3)


def test_no_formula_stands_in_the_source_as_text() -> None:
    """A formula printed by a stage is written nowhere: neither whole nor in the short form that a designer knows."""
    from tests.paths import TOP

    stage = catalogue.find("source-follower")
    assert stage is not None
    printed = [
        metric_formula(stage, key, every=True) for key in ("bandwidth", "slew_rate", "power", "supply_rejection")
    ]
    lines = [turned.formula for found in printed for turned in found.inverted] + [found.line() for found in printed]
    source = "\n".join(
        path.read_text("utf-8") for layer in ("engine", "solver") for path in (TOP / "worksheet" / layer).rglob("*.py")
    )
    code = "\n".join(line for line in source.splitlines() if '"""' not in line and not line.lstrip().startswith("#"))
    assert [line for line in lines if len(line) > 12 and line in code] == []
