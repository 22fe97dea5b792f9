"""The reference against itself: closed forms beside nodal analysis, formulas beside integrals, limits beside both."""

from __future__ import annotations

import json
import math
import tomllib
from pathlib import Path
from typing import Any

import pytest
from mpmath import mp, mpc, mpf

from tests.precision import reference_device as device
from tests.precision import reference_settling as settling
from tests.precision.make_cases import conditions_of, expected, make_device_cases
from tests.precision.reference import Solved, evaluate, solve
from tests.precision.reference_closed import closed_metrics, one_node
from tests.precision.reference_measures import Circuit, Shape, measures, square_integral

CASES = json.loads((Path(__file__).parent / "cases.json").read_text(encoding="utf-8"))["cases"]
CLOSE = mpf(10) ** -35
BY_QUADRATURE = {"01", "28", "53", "57"}
"""Cases whose noise is also integrated over frequency: slow, so a few suffice beside the Lyapunov equation."""

DOCUMENTS = [
    (case["name"], tomllib.loads(case["project"]), tomllib.loads(case["process"]), tomllib.loads(case["sheet"]))
    for case in CASES
    if not case["name"].startswith("edge")
]


def close(found: Any, wanted: Any, tolerance: Any = CLOSE) -> bool:
    return bool(abs(found - wanted) <= tolerance * abs(wanted))


def solved(project: dict[str, Any], process: dict[str, Any], sheet: dict[str, Any], index: int = 0) -> Solved:
    nominal = project["conditions"]["nominal"]
    return solve(process, sheet, nominal, conditions_of(project)[index])[0]


@pytest.mark.parametrize(("name", "project", "process", "sheet"), DOCUMENTS, ids=[row[0] for row in DOCUMENTS])
def test_closed_forms_agree_with_nodal_analysis(
    name: str, project: dict[str, Any], process: dict[str, Any], sheet: dict[str, Any]
) -> None:
    if "cascode" in name:
        pytest.skip("a cascode has no closed form of one node")
    plain = {key: value for key, value in sheet["assume"].items() if key not in {"drive_resistance", "step_size"}}
    sheet = sheet | {"assume": plain}
    for index in (0, 1, 2):
        at = solved(project, process, sheet, index)
        nodal = measures(at.bench, at.levels, at.devices, sheet)
        closed = closed_metrics(at.bench, at.devices, one_node(at.bench, at.devices, sheet))
        del closed["white_output_noise"]
        for key, wanted in closed.items():
            if key == "supply_rejection" and "drain-follower" in name:
                assert key not in nodal
                continue
            found = nodal[key][0]
            assert (found is None) == (wanted is None), key
            assert wanted is None or close(found, wanted), key


@pytest.mark.parametrize(
    ("name", "project", "process", "sheet"),
    [pytest.param(*row, marks=pytest.mark.full if k % 3 else ()) for k, row in enumerate(DOCUMENTS)],
    ids=[row[0] for row in DOCUMENTS],
)
def test_frequencies_and_noise_agree_with_a_direct_complex_solution(
    name: str, project: dict[str, Any], process: dict[str, Any], sheet: dict[str, Any]
) -> None:
    at = solved(project, process, sheet)
    circuit = Circuit(at.bench, at.devices, sheet, driven=True)
    net = circuit.network

    def voltage(right: dict[str, Any], s: Any) -> Any:
        matrix = mp.matrix([[net.g[row, col] + s * net.c[row, col] for col in net.unknown] for row in net.unknown])
        column = mp.matrix([[mpc(right.get(node, 0))] for node in net.unknown])
        return mp.lu_solve(matrix, column)[net.unknown.index("out")]

    def transfer(frequency: Any) -> Any:
        s = 2j * mp.pi * frequency
        return abs(voltage({node: -net.g[node, "in"] - s * net.c[node, "in"] for node in net.unknown}, s))

    metrics = measures(at.bench, at.levels, at.devices, sheet)
    gain = transfer(mpf(0))
    assert close(metrics["dc_gain"][0], gain)
    for key, level in (("bandwidth", gain / mp.sqrt(2)), ("unity_gain_frequency", mpf(1))):
        if metrics[key][0] is not None:
            assert close(transfer(metrics[key][0]), level), key
            assert all(transfer(metrics[key][0] * mpf(k) / 50) > level for k in range(50)), key

    if name[:2] not in BY_QUADRATURE:
        return
    shape = Shape(circuit.forward(), net.denominator())
    nodes = circuit.terminals["main"]
    injected = {nodes["drain"]: mpf(-1), nodes["source"]: mpf(1)}
    corner = shape.pole_frequency

    def density(x: Any) -> Any:
        frequency = corner * mp.exp(x)
        return frequency * abs(voltage(injected, 2j * mp.pi * frequency)) ** 2

    with mp.workdps(15):
        wanted = mp.quad(density, mp.linspace(mpf(-40), mpf(50), 30))
        found = square_integral(circuit.from_device("main"), shape.denominator, shape.poles)
        assert close(found, wanted, mpf(10) ** -8), name


def state(circuit: Circuit) -> tuple[Any, Any]:
    """Matrices C and G of C dv/dt = -G v over the unknown nodes."""
    net = circuit.network
    matrices = ([[table[row, col] for col in net.unknown] for row in net.unknown] for table in (net.c, net.g))
    capacitance, conductance = (mp.matrix(rows) for rows in matrices)
    return capacitance, conductance


@pytest.mark.parametrize(("name", "project", "process", "sheet"), DOCUMENTS, ids=[row[0] for row in DOCUMENTS])
def test_residues_of_noise_agree_with_a_lyapunov_equation(
    name: str, project: dict[str, Any], process: dict[str, Any], sheet: dict[str, Any]
) -> None:
    """A P + P A' + b b' = 0: P is the covariance under white noise of unit two-sided density."""
    at = solved(project, process, sheet)
    circuit = Circuit(at.bench, at.devices, sheet, driven=True)
    unknown, size = circuit.network.unknown, len(circuit.network.unknown)
    capacitance, conductance = state(circuit)
    drift = -mp.inverse(capacitance) * conductance
    shape = Shape(circuit.forward(), circuit.network.denominator())
    for device_name, nodes in circuit.terminals.items():
        column = mp.matrix([[(node == nodes["source"]) - (node == nodes["drain"])] for node in unknown])
        kick = mp.inverse(capacitance) * column
        system, right = mp.zeros(size**2), mp.zeros(size**2, 1)
        for row in range(size):
            for col in range(size):
                right[row * size + col] = -kick[row] * kick[col]
                for k in range(size):
                    system[row * size + col, k * size + col] += drift[row, k]
                    system[row * size + col, row * size + k] += drift[col, k]
        wanted = mp.lu_solve(system, right)[0] / 2
        found = square_integral(circuit.from_device(device_name), shape.denominator, shape.poles)
        assert close(found, wanted, mpf(10) ** -25), (name, device_name)


@pytest.mark.parametrize(("name", "project", "process", "sheet"), DOCUMENTS, ids=[row[0] for row in DOCUMENTS])
def test_linear_settling_agrees_with_a_matrix_exponential(
    name: str, project: dict[str, Any], process: dict[str, Any], sheet: dict[str, Any]
) -> None:
    assume = {key: value for key, value in sheet["assume"].items() if key != "step_size"}
    sheet = sheet | {"assume": assume}
    at = solved(project, process, sheet)
    circuit = Circuit(at.bench, at.devices, sheet, driven=True)
    net, tolerance = circuit.network, mpf(assume.get("settling_tolerance", 1e-3))
    capacitance, conductance = state(circuit)
    inverse = mp.inverse(capacitance)
    start = inverse * mp.matrix([[-net.c[node, "in"]] for node in net.unknown])
    final = mp.lu_solve(conductance, mp.matrix([[-net.g[node, "in"]] for node in net.unknown]))
    out = net.unknown.index("out")
    time = measures(at.bench, at.levels, at.devices, sheet)["settling_time"][0]

    def error(t: Any) -> Any:
        return abs((mp.expm(inverse * conductance * -t) * (start - final))[out] / final[out])

    assert time >= 0
    if time > 0:
        assert close(error(time), tolerance, mpf(10) ** -20), name
    for factor in (1.0001, 1.01, 1.04, 1.1, 1.2, 1.35, 1.5, 2, 3):
        assert error(time * factor) < tolerance, name


@pytest.mark.full
def test_stored_cases_are_what_the_reference_says() -> None:
    """A change of the reference without `python -m tests.precision.make_cases` must not pass unseen."""
    stored = json.loads((Path(__file__).parent / "cases.json").read_text(encoding="utf-8"))
    for case in stored["cases"]:
        project, process, sheet = (tomllib.loads(case[key]) for key in ("project", "process", "sheet"))
        nominal = project["conditions"]["nominal"]
        answers = evaluate(process, sheet, nominal, conditions_of(project))
        found = [expected(answer, stored["operating_point_keys"], stored["metric_keys"]) for answer in answers]
        assert found == case["expected"], case["name"]
    device_file = Path(__file__).parent / "cases_device.json"
    assert make_device_cases() == json.loads(device_file.read_text(encoding="utf-8"))


def test_charge_solves_its_equation() -> None:
    device.precise()
    for u in (-700, -3, 0, 0.5, 40, 1e6):
        q = device.charge_from_drive(mpf(u))
        assert abs(2 * q + mp.log(q) - u) < mpf(10) ** -48 * max(1, abs(u))


@pytest.mark.parametrize("velocity", [0, 1e-3, 0.5, 3])
def test_charge_and_inversion_are_inverse_with_velocity_saturation(velocity: float) -> None:
    device.precise()
    for i in (1e-9, 1e-3, 0.4, 1, 30, 1e6):
        q = device.charge_from_inversion(mpf(i), mpf(velocity))
        assert close(device.inversion_from_charge(q, mpf(velocity)), mpf(i))
        # G is d ln i / d u, by definition of g_s: one published form must be the derivative of the other.
        slope = mp.diff(lambda x: mp.log(device.inversion_from_charge(mp.exp(x), mpf(velocity))), mp.log(q))
        assert close(device.slope_factor(mpf(i), mpf(velocity)), slope / (2 * q + 1), mpf(10) ** -20)


@pytest.mark.parametrize("a", [-40, -3, -0.1, 0.02, 1, 30])
@pytest.mark.parametrize("inversion", [1e-3, 0.7, 200])
def test_large_signal_settling_agrees_with_its_integral(a: float, inversion: float) -> None:
    device.precise()
    at = (mpf(a), mpf("1e-3"), mpf(inversion), mpf(1))
    with mp.workdps(30):
        assert close(settling.large_signal_formula(*at), settling.large_signal_integral(*at), mpf(10) ** -12)


@pytest.mark.parametrize("a", [-5.0, -0.5, 0.5, 5.0])
def test_large_signal_settling_agrees_with_stepping_its_equation(a: float) -> None:
    """scipy's stiff integrator over du/dt = -(q^2 + q - i_b), in units of C_o U_T/I_spec."""
    integrate = pytest.importorskip("scipy.integrate")
    special = pytest.importorskip("scipy.special")
    inversion, tolerance = 2.0, 1e-2
    resting = ((1 + 4 * inversion) ** 0.5 - 1) / 2

    def rate(_: float, rest: Any) -> list[float]:
        q = special.lambertw(2 * math.exp(2 * resting + math.log(resting) + rest[0])).real / 2
        return [-(q * q + q - inversion)]

    def settled(_: float, rest: Any) -> float:
        return float(abs(rest[0]) - tolerance * abs(a))

    settled.terminal = True  # type: ignore[attr-defined]
    run = integrate.solve_ivp(rate, (0, 100), [a], method="LSODA", events=settled, rtol=1e-11, atol=1e-13)
    device.precise()
    wanted = settling.large_signal_formula(mpf(a), mpf(tolerance), mpf(inversion), mpf(1))
    assert float(run.t_events[0][0]) == pytest.approx(float(wanted), rel=1e-7)


def test_weak_inversion_limit_of_large_signal_settling() -> None:
    """V - V_0 = U_T ln(e^a + (1 - e^a) e^(-t/tau)), tau = C_o U_T/I_bias."""
    device.precise()
    inversion, tolerance = mpf("1e-9"), mpf("1e-3")
    for a in (mpf(-4), mpf("0.3"), mpf(4)):
        t = settling.large_signal_formula(a, tolerance, inversion, inversion)
        reached = mp.log(mp.exp(a) + (1 - mp.exp(a)) * mp.exp(-t))
        assert close(reached, a * (1 - tolerance), mpf(10) ** -6)


def test_gains_do_not_know_inversion_or_temperature() -> None:
    """Section 2: kappa, -kappa/sigma, 1/sigma and sigma with an ideal source and no length modulation."""
    for name, project, process, sheet in DOCUMENTS:
        part = process["device"][sheet["device"]]
        if "cascode" in name or "surface_potential" in part or not part["drain_coupling"]:
            continue
        part = {key: value for key, value in part.items() if key != "length_modulation"}
        bare = process | {"device": process["device"] | {sheet["device"]: part}, "corner": {}}
        assume = {key: value for key, value in sheet["assume"].items() if key != "drive_resistance"}
        plain = sheet | {"bias": {"device": "ideal"}, "assume": assume, "bulk": "rail"}
        at = solved(project, bare, plain)
        sigma, kappa = at.bench.main.sigma, at.bench.main.kappa
        wanted = {
            "source-follower": kappa,
            "common-source": kappa / sigma,
            "common-gate": 1 / sigma,
            "drain-follower": sigma,
        }[sheet["stage"]]
        assert close(measures(at.bench, at.levels, at.devices, plain)["dc_gain"][0], wanted), name


def test_currents_follow_from_the_terminal_voltages() -> None:
    """The node voltages found must carry the bias current by the charge law itself."""
    for _, project, process, sheet in DOCUMENTS:
        at = solved(project, process, sheet)
        for point in at.devices.values():
            part, bulk = point.device, point.bulk
            source = point.source - bulk
            body = part.threshold_at(source) if part.surface_potential else part.threshold
            lift = part.kappa_at(source) * (point.gate - bulk - body) + part.sigma * (point.drain - bulk)
            u = (lift if part.surface_potential else lift - source) / part.thermal_voltage
            inversion = device.inversion_from_charge(device.charge_from_drive(u), part.velocity)
            assert close(inversion * part.specific_current, part.current, mpf(10) ** -25)
