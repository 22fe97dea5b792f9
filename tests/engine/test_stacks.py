"""Stages with stacks on either side of the output, which no built-in stage has: levels, ranges and poles."""

from __future__ import annotations

import dataclasses

import mpmath
import numpy as np
import pytest

from tests.device.test_transistor import DEVICE
from worksheet.device import bulk
from worksheet.device.constants import thermal_voltage
from worksheet.device.transistor import saturation_voltage
from worksheet.engine import polynomial as poly
from worksheet.engine import settling
from worksheet.engine.inputs import Inputs
from worksheet.engine.solution import NumericSolution
from worksheet.engine.validity import shortfalls
from worksheet.stages.circuit import Circuit
from worksheet.stages.one_transistor import COMMON_GATE, COMMON_SOURCE, DRAIN_FOLLOWER, SOURCE_FOLLOWER
from worksheet.stages.stage import GROUND, IN, LINE, OUT, SUPPLY, Stage, Transistor

TALL = Stage(
    "tall",
    "Tall",
    "Two common gates over a common source.",
    (
        Transistor("main", IN, "first", GROUND),
        Transistor("lower", LINE, "second", "first"),
        Transistor("upper", LINE, OUT, "second"),
    ),
    ("output_level",),
)
HUNG = Stage(
    "hung",
    "Hung follower",
    "A follower whose drain is held by a common gate.",
    (Transistor("main", IN, "hold", OUT), Transistor("top", LINE, SUPPLY, "hold")),
    ("input_level", "output_level"),
    one_level=True,
)
SUPPLY_VOLTAGE, CURRENT, MARGIN = 3.0, 2e-6, 0.03


def solved(stage: Stage, polarity: str = "n", **more: float) -> NumericSolution:
    devices = {d.name: DEVICE for d in stage.transistors}
    circuit = Circuit(stage, polarity, "rail", ideal_bias=True)
    return NumericSolution(
        Inputs(circuit, np.array([300.0]), SUPPLY_VOLTAGE, CURRENT, devices, 1e-12, saturation_margin=MARGIN, **more)
    )


WANTED = float(saturation_voltage(CURRENT / DEVICE.specific, thermal_voltage(300.0))) + MARGIN


@pytest.mark.parametrize("polarity", ["n", "p"])
def test_inner_nodes_of_a_tall_stack(polarity: str) -> None:
    solution = solved(TALL, polarity)
    nodes = solution.levels.nodes
    assert float(np.ravel(nodes["first"])[0]) == pytest.approx(WANTED)
    assert float(np.ravel(nodes["second"])[0]) == pytest.approx(2 * WANTED)
    low, high = 3 * WANTED, SUPPLY_VOLTAGE
    expected = (low, high) if polarity == "n" else (SUPPLY_VOLTAGE - high, SUPPLY_VOLTAGE - low)
    assert float(np.ravel(solution["output_low"])[0]) == pytest.approx(expected[0])
    assert float(np.ravel(solution["output_high"])[0]) == pytest.approx(expected[1])


def test_a_held_drain_stands_below_the_supply() -> None:
    solution = solved(HUNG, output_level=0.8)
    assert float(np.ravel(solution.levels.nodes["hold"])[0]) == pytest.approx(SUPPLY_VOLTAGE - WANTED)
    main = solution.devices["main"]
    assert float(np.ravel(main.drain_voltage)[0]) == pytest.approx(SUPPLY_VOLTAGE - WANTED)
    assert float(np.ravel(main.source_voltage)[0]) == pytest.approx(0.8)


def test_gain_of_a_tall_stack_against_a_plain_linear_solve() -> None:
    solution = solved(TALL)
    s = solution.devices["main"].slopes
    g_m, g_s, g_d = (float(np.ravel(x)[0]) for x in (s.transconductance, s.source_conductance, s.drain_conductance))
    matrix = np.array([[g_d + g_s, -g_d, 0.0], [-g_s, g_d + g_s, -g_d], [0.0, -g_s, g_d]])
    output = np.linalg.solve(matrix, np.array([-g_m, 0.0, 0.0]))[2]
    assert float(np.ravel(solution["dc_gain"])[0]) == pytest.approx(abs(output), rel=1e-9)
    inner = np.linalg.solve(matrix, np.array([0.0, 0.0, 1.0]))[2]
    assert float(np.ravel(solution["output_resistance"])[0]) == pytest.approx(inner, rel=1e-9)


def test_three_poles_against_numpy_and_quadrature() -> None:
    """numpy.roots for the poles, a fine grid for the noise integral, an explicit step response for settling."""
    poles = np.array([-1.0, -2.5 + 1.5j, -2.5 - 1.5j])
    denominator = [float(c) for c in np.poly(poles)[::-1].real]
    numerator = [3.0, 0.4, 0.05]
    constants = poly.inverse_roots([np.asarray(c) for c in denominator])
    assert np.sort_complex(-1 / constants) == pytest.approx(np.sort_complex(poles), rel=1e-9)
    omega = np.concatenate([np.linspace(0, 400, 2_000_001)])
    h = np.polyval(numerator[::-1], 1j * omega) / np.polyval(denominator[::-1], 1j * omega)
    integral = np.trapezoid(np.abs(h) ** 2, omega) / np.pi
    assert float(poly.noise_integral(numerator, [np.asarray(c) for c in denominator])) == pytest.approx(
        integral, rel=1e-4
    )
    t = np.linspace(0, 20, 200_001)
    residues = [
        np.polyval(numerator[::-1], p) / (p * np.polyval(np.polyder(np.array(denominator[::-1])), p)) for p in poles
    ]
    error = np.abs(sum(r * np.exp(p * t) for r, p in zip(residues, poles, strict=True)).real) / (
        numerator[0] / denominator[0]
    )
    expected = t[np.flatnonzero(error > 1e-3)[-1]]
    found = settling.linear([np.asarray(c) for c in [*numerator, 0.0]], [np.asarray(c) for c in denominator], 1e-3)
    assert float(found) == pytest.approx(expected, abs=2e-4)


def test_positive_roots_of_a_cubic_against_numpy() -> None:
    coefficients = [np.asarray(c) for c in (-6.0, 11.0, -6.0, 1.0)]
    assert np.sort(poly.positive_roots(coefficients)) == pytest.approx([1.0, 2.0, 3.0], rel=1e-12)
    assert float(poly.lowest_positive_root(coefficients)) == pytest.approx(1.0, rel=1e-12)


@pytest.mark.parametrize("kind", ["spread", "mixed", "pair"])
def test_roots_of_cubics_however_far_apart_against_mpmath(kind: str) -> None:
    """mpmath.polyroots at 60 digits of the very coefficients; time constants may be twelve decades apart."""
    draw = np.random.default_rng(3)
    sizes = -(10.0 ** draw.uniform(-12, 0, (3, 60)))
    if kind == "mixed":
        sizes *= draw.choice([-1.0, 1.0], sizes.shape)
    roots = sizes.astype(complex)
    if kind == "pair":
        roots[1] = np.abs(sizes[1]) * np.exp(1j * draw.uniform(0.05, 3.09, 60))
        roots[2] = np.conj(roots[1])
    coefficients = [np.ones(60), *(np.array([np.poly(r).real[k] for r in roots.T]) for k in (1, 2, 3))]
    found = -poly.inverse_roots(coefficients)
    with mpmath.workdps(60):
        for k in range(60):
            exact = mpmath.polyroots([mpmath.mpf(float(c[k])) for c in coefficients], maxsteps=500, extraprec=300)
            left = list(found[:, k])
            for root in exact:
                apart = [abs(mpmath.mpmathify(complex(one)) - root) / abs(root) for one in left]
                assert min(apart) < 1e-11
                left.pop(apart.index(min(apart)))


def test_a_cubic_of_lower_degree_has_roots_at_infinity() -> None:
    found = poly.inverse_roots([np.asarray(c) for c in (1.0, 3.0, 2.0, 0.0)])
    assert min(found.real) == 0.0
    assert sorted(found.real) == pytest.approx([0.0, 1.0, 2.0], rel=1e-15)
    assert not found.imag.any()


def test_the_gate_of_a_hung_follower_counts_with_its_held_drain() -> None:
    solution = solved(HUNG, output_level=0.8)
    drive = solution.levels.drives["main"]
    expected = bulk.gate_voltage(DEVICE, drive, 0.8, SUPPLY_VOLTAGE - WANTED, solution.inputs.thermal)
    assert float(np.ravel(solution.levels.input)[0]) == pytest.approx(float(np.ravel(expected)[0]), rel=1e-12)


@pytest.mark.parametrize("polarity", ["n", "p"])
def test_a_common_gate_without_levels_stands_in_the_middle(polarity: str) -> None:
    """Input in the middle of 0 to supply less both saturation voltages, output in the middle of what that leaves."""
    circuit = Circuit(COMMON_GATE, polarity, "rail", ideal_bias=False)
    bias = dataclasses.replace(DEVICE, width=3e-6)
    inputs = Inputs(
        circuit,
        np.array([300.0]),
        SUPPLY_VOLTAGE,
        CURRENT,
        {"main": DEVICE, "bias": bias},
        1e-12,
        saturation_margin=MARGIN,
    )
    levels = NumericSolution(inputs).levels
    over = float(saturation_voltage(CURRENT / bias.specific, thermal_voltage(300.0))) + MARGIN
    entry = (SUPPLY_VOLTAGE - WANTED - over) / 2
    assert float(np.ravel(levels.input)[0]) == pytest.approx(entry)
    assert float(np.ravel(levels.output)[0]) == pytest.approx((entry + WANTED + SUPPLY_VOLTAGE - over) / 2)
    assert float(np.ravel(levels.empty)[0]) < 0


def test_noise_integral_of_four_poles_against_quadrature() -> None:
    poles = np.array([-1.0, -3.0, -2.0 + 1.0j, -2.0 - 1.0j])
    denominator = [float(c) for c in np.poly(poles)[::-1].real]
    numerator = [2.0, 0.7, -0.3]
    omega = np.linspace(0, 400, 2_000_001)
    h = np.polyval(numerator[::-1], 1j * omega) / np.polyval(denominator[::-1], 1j * omega)
    integral = np.trapezoid(np.abs(h) ** 2, omega) / np.pi
    assert float(poly.noise_integral(numerator, [np.asarray(c) for c in denominator])) == pytest.approx(
        integral, rel=1e-4
    )


@pytest.mark.parametrize("inversion", [1e-6, 0.3, 50.0])
@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_a_tiny_step_settles_with_the_linear_time_constant(inversion: float, sign: float) -> None:
    specific, capacitance, thermal, tolerance = 1e-6, 1e-12, 0.0259, 1e-3
    slope = 2 / (1 + np.sqrt(1 + 4 * inversion))
    tau = capacitance / (specific * inversion * slope / thermal)
    found = settling.source_step(sign * 1e-8, inversion, specific, capacitance, thermal, tolerance)
    assert float(found) == pytest.approx(tau * np.log(1 / tolerance), rel=1e-5)


def test_only_the_common_source_inverts() -> None:
    for stage, sign in ((COMMON_SOURCE, -1.0), (COMMON_GATE, 1.0), (SOURCE_FOLLOWER, 1.0)):
        solution = solved(stage)
        assert np.sign(float(np.ravel(solution.signed_gain())[0])) == sign


def stepped(stage: Stage, bulk_at: str, step: float) -> NumericSolution:
    circuit = Circuit(stage, "n", bulk_at, ideal_bias=True)
    return NumericSolution(
        Inputs(circuit, np.array([300.0]), SUPPLY_VOLTAGE, CURRENT, {"main": DEVICE}, 1e-12, step_size=step)
    )


def test_a_tiny_step_of_a_follower_in_its_own_well() -> None:
    """Bulk on the source: C_o/(kappa + sigma) in place of C_o."""
    solution = stepped(SOURCE_FOLLOWER, "source", 1e-7)
    g_s = float(np.ravel(solution.devices["main"].slopes.source_conductance)[0])
    load = float(np.ravel(solution.output_capacitance)[0])
    tau = load / (g_s * (DEVICE.kappa + DEVICE.drain_coupling))
    assert float(np.ravel(solution["settling_time"])[0]) == pytest.approx(tau * np.log(1e3), rel=1e-4)


@pytest.mark.parametrize("step", [0.2, 1.4])
def test_the_range_after_a_step_moves_with_the_input(step: float) -> None:
    """Drain-driven follower: a step of the drain moves the output by sigma times it and the upper end by all of it."""
    solution = stepped(DRAIN_FOLLOWER, "rail", step)
    levels = solution.levels
    out, low, high = (float(np.ravel(x)[0]) for x in (levels.output, levels.output_low, levels.output_high))
    moved = [out + DEVICE.drain_coupling * s for s in (step, -step)]
    expected = max(
        low - out, out - high, *(max(low - m, m - (high + s)) for m, s in zip(moved, (step, -step), strict=True))
    )
    found = next(s for s in shortfalls(solution) if (s.device, s.what) == ("output", "range"))
    assert float(np.ravel(found.short_by)[0]) == pytest.approx(expected, abs=1e-12)


def test_the_range_after_a_step_of_a_common_gate() -> None:
    """A step of the source moves the lower end by all of it and the output by the gain."""
    step = 0.002
    solution = stepped(COMMON_GATE, "rail", step)
    levels = solution.levels
    gain = float(np.ravel(solution.signed_gain())[0])
    out, low, high = (float(np.ravel(x)[0]) for x in (levels.output, levels.output_low, levels.output_high))
    expected = max(
        low - out, out - high, *(max(low + s - (out + gain * s), out + gain * s - high) for s in (step, -step))
    )
    found = next(s for s in shortfalls(solution) if (s.device, s.what) == ("output", "range"))
    assert float(np.ravel(found.short_by)[0]) == pytest.approx(expected, rel=1e-9)
