"""Settling as relations: of small steps from the poles, of large ones at a source or a drain output."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

from worksheet.engine.symbolic.definition import Definition, Pick, Root
from worksheet.engine.symbolic.neglects import LINEAR, SLEWING
from worksheet.model.metrics import Reason

if TYPE_CHECKING:
    from worksheet.engine.symbolic.algebra import Algebra
    from worksheet.engine.symbolic.metric import SymbolicSolution
    from worksheet.stages.stage import Transistor

CHARGE_EQUATION = "integral of the charge equation at a source output (long channel)"


def define(solution: SymbolicSolution) -> Definition:
    """The settling time of a solved circuit."""
    a = solution.a
    if not a.has("step_size") or SLEWING in a.setting.neglects:
        return _linear(solution)
    if not a.circuit.stage.source_output:
        return _drain_step(a)
    return _source_step(a)


def _linear(solution: SymbolicSolution) -> Definition:
    import sympy

    solution.check_response()
    tolerance, n, d = solution.a.symbol("settling_tolerance"), solution.numerator, solution.denominator
    if len(d) == 2:
        tau = d[1] / d[0]
        if len(n) == 1 or n[1] == 0:
            return Definition("", tau * sympy.log(1 / tolerance))
        start = abs(1 - n[1] / (n[0] * tau))
        return Definition("", sympy.Max(0, tau * sympy.log(start / tolerance), evaluate=False))
    s, t = sympy.Symbol("s"), sympy.Symbol("t", positive=True)
    top, bottom = (sum(c * s**k for k, c in enumerate(of)) for of in (n, d))
    weight = d[0] * top / (n[0] * s * sympy.diff(bottom, s))
    error = sympy.RootSum(bottom, sympy.Lambda(s, weight * sympy.exp(s * t)), x=s, auto=False)
    return Definition("", t, Root(t, abs(error), tolerance, Pick.LAST))


def _drain_step(a: Algebra) -> Definition:
    """Slewing, then linear: the common two-phase rule."""
    import sympy

    rate, tolerance = a.symbol("slew_rate"), a.symbol("settling_tolerance")
    tau = 1 / (2 * sympy.pi * a.symbol("pole_frequency"))
    change, linear = a.symbol("dc_gain") * a.symbol("step_size"), rate * tau
    if LINEAR in a.setting.neglects:
        return Definition("", change / rate)
    slewing = (change - linear) / rate + tau * sympy.log(linear / (tolerance * change))
    return Definition("", sympy.Piecewise((tau * sympy.log(1 / tolerance), change <= linear), (slewing, True)))


def _main(a: Algebra) -> Transistor:
    return a.circuit.stage.transistors[0]


def _source_step(a: Algebra) -> Definition:
    import sympy

    if a.has("main.process.velocity_length"):
        return Definition("", None, missing=Reason.LONG_CHANNEL_ONLY)
    if LINEAR in a.setting.neglects:
        return Definition("", _capacitance(a) * a.symbol("drive_step") / a.symbol("current"))
    slower = sympy.Max(a.symbol("settling_rise"), a.symbol("settling_fall"), evaluate=False)
    return Definition("", slower)


def _capacitance(a: Algebra) -> Any:
    """C_o, over kappa + sigma with the bulk on the source."""
    if a.circuit.bulk != "source":
        return a.symbol("output_capacitance")
    main = _main(a)
    return a.symbol("output_capacitance") / (a.of(main, "gate_coupling") + a.of(main, "drain_coupling"))


def _drive_step(a: Algebra) -> Definition:
    share = "gate_coupling" if a.circuit.stage.drive == "gate" else "drain_coupling"
    return Definition("drive_step", a.of(_main(a), share) * a.symbol("step_size"), source=CHARGE_EQUATION)


def _charge_after(sign: int, settled: bool) -> Callable[[Algebra], Definition]:
    def law(a: Algebra) -> Definition:
        import sympy

        share = a.symbol("settling_tolerance") if settled else 1
        u = a.of(_main(a), "drive") + sign * share * a.symbol("drive_step") / a.symbol("thermal_voltage")
        key = f"{'rise' if sign > 0 else 'fall'}_{'end' if settled else 'start'}"
        return Definition(key, sympy.LambertW(2 * sympy.exp(u)) / 2, source=CHARGE_EQUATION)

    return law


def _time(name: str) -> Callable[[Algebra], Definition]:
    def law(a: Algebra) -> Definition:
        main = _main(a)
        unit = _capacitance(a) * a.symbol("thermal_voltage") / a.of(main, "specific_current")
        start, end = (_antiderivative(a, a.symbol(f"{name}_{at}")) for at in ("start", "end"))
        key = {"rise": "settling_rise", "fall": "settling_fall"}[name]
        return Definition(key, unit * (start - end), source=CHARGE_EQUATION)

    return law


def _antiderivative(a: Algebra, q: Any) -> Any:
    import sympy

    main = _main(a)
    settled, inversion = a.of(main, "charge"), a.of(main, "inversion_coefficient")
    near = sympy.log(abs(q - settled)) / settled
    return near - sympy.log(q) / inversion - sympy.log(q + settled + 1) / (settled + 1)


OF_CIRCUIT: dict[str, Callable[[Algebra], Definition]] = {
    "drive_step": _drive_step,
    "rise_start": _charge_after(1, settled=False),
    "rise_end": _charge_after(1, settled=True),
    "fall_start": _charge_after(-1, settled=False),
    "fall_end": _charge_after(-1, settled=True),
    "settling_rise": _time("rise"),
    "settling_fall": _time("fall"),
}
"""Levels that the settling of a large step at a source output is written in."""
