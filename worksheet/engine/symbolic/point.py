"""Numbers for the levels of an algebra: stated leaves at one condition, and every definition evaluated on them.

sympy evaluates to twenty digits, so that nothing is lost where terms cancel; what comes out is a float.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Callable, Mapping
from typing import Any

from worksheet.engine.symbolic.algebra import Algebra
from worksheet.engine.symbolic.definition import Definition, Pick, Root
from worksheet.engine.symbolic.vocabulary import AT_NOMINAL, canonical

DIGITS = 20
_SCAN, _HALVINGS = 3000, 100

Leaf = Callable[[str], float]
"""Gives the stated number of a leaf by its key. [unit of the leaf]"""


class Point:
    """An algebra at one condition."""

    def __init__(
        self, algebra: Algebra, leaf: Leaf, nominal: Point | None = None, held: Mapping[str, float] | None = None
    ) -> None:
        """Take the numbers; nothing is evaluated yet.

        Args:
            algebra: What to evaluate.
            leaf: Gives the numbers that are stated.
            nominal: The nominal condition, where levels that are held were found; None where this is it.
            held: Numbers of levels that are not evaluated, by key. [unit of the level]
        """
        self.algebra = algebra
        self.nominal = nominal
        self._leaf = leaf
        self._known: dict[str, Any] = {}
        for key, value in (held or {}).items():
            self._known[canonical(algebra.circuit, key)] = _float(value)

    def number(self, key: str) -> float | None:
        """The number of a level, None where it has none. [unit of the level]"""
        return real(self.exact(key))

    def exact(self, key: str) -> Any:
        """The number of a level to twenty digits, a sympy number; None where it has none. [unit of the level]"""
        key = canonical(self.algebra.circuit, key)
        if key not in self._known:
            found = self.algebra.definition(key)
            if found is not None:
                self._known[key] = self._defined(found)
            elif key.endswith(AT_NOMINAL):
                assert self.nominal is not None  # held levels belong to other conditions
                self._known[key] = self.nominal.exact(key.removesuffix(AT_NOMINAL))
            else:
                self._known[key] = _float(self._leaf(key))
        return self._known[key]

    def _defined(self, found: Definition) -> Any:
        values = {self.algebra.symbol(key): self.exact(key) for key in self.algebra.inputs(found)}
        return None if any(value is None for value in values.values()) else _on(found, values)

    def value(self, expression: Any) -> float | None:
        """An expression in the algebra's symbols, None where it has no real number."""
        values = {}
        for symbol in expression.free_symbols:
            key = self.algebra.key(symbol)
            if key is not None:
                values[symbol] = self.exact(key)
        if any(v is None for v in values.values()):
            return None
        return real(evaluated(expression, None, values))


def evaluated(expression: Any, root: Root | None, values: Mapping[Any, Any]) -> Any:
    """An expression, with the root behind it, on numbers.

    Args:
        expression: sympy expression in symbols and perhaps the root's unknown.
        root: The equation of that unknown.
        values: sympy numbers by symbol.
    Returns: a sympy number; None where there is none
    """
    import sympy

    if root is None:
        return _number(expression, values)
    if root.pick is Pick.LAST:
        found = _last(root, values)
        return None if found is None else _number(expression, {**values, root.unknown: sympy.Float(found)})
    left, right = root.left.xreplace(dict(values)), root.right.xreplace(dict(values))
    if root.pick is Pick.ONLY:
        return _number(expression, {**values, root.unknown: _only(left - right, root.unknown)})
    roots = _roots(left - right, root.unknown)
    if root.pick is Pick.GREATEST:
        return _greatest(expression.xreplace(dict(values)), root.unknown, roots)
    chosen = _chosen(roots, root.pick)
    return None if chosen is None else _number(expression, {**values, root.unknown: chosen})


def _float(value: float) -> Any:
    import sympy

    return sympy.Float(value, DIGITS + 5)


def _number(expression: Any, values: Mapping[Any, Any]) -> Any:
    import sympy

    try:
        found = (sympy.S.Zero + expression).evalf(DIGITS, subs=dict(values), maxn=400)
    except ZeroDivisionError:
        return None
    return found if found.is_number and found.is_finite else None


def real(value: Any) -> float | None:
    """A sympy number as a float, None where it is not real or not finite."""
    if value is None:
        return None
    real, imaginary = value.as_real_imag()
    number = float(real)
    scale = abs(number)
    if not math.isfinite(number) or abs(float(imaginary)) > 1e-12 * scale:
        return None
    return number


def _roots(polynomial: Any, unknown: Any) -> list[Any]:
    """All roots of a polynomial whose coefficients may differ by many decades."""
    import sympy

    coefficients = sympy.Poly(polynomial, unknown).all_coeffs()
    while coefficients and coefficients[0] == 0:
        coefficients = coefficients[1:]
    degree = len(coefficients) - 1
    if degree < 1:
        return []
    known = [abs(c) ** sympy.Rational(1, k) for k, c in enumerate(c / coefficients[0] for c in coefficients) if k]
    size = max(known) or sympy.Integer(1)
    scaled = [sympy.Float(c / coefficients[0] / size**k, 40) for k, c in enumerate(coefficients)]
    return [r * size for r in sympy.Poly(scaled, unknown).nroots(n=30, maxsteps=300)]


def _is_real(root: Any) -> bool:
    real, imaginary = root.as_real_imag()
    return bool(abs(imaginary) <= 1e-15 * abs(real))


def _chosen(roots: list[Any], pick: Pick) -> Any:
    if pick is Pick.SLOWEST:
        return min(roots, key=abs, default=None)
    real = [r.as_real_imag()[0] for r in roots if _is_real(r)]
    if pick is Pick.LARGEST:
        return max(real, default=None)
    return min((r for r in real if r > 0), default=None)


def _greatest(expression: Any, unknown: Any, roots: list[Any]) -> Any:
    """The greatest value of an expression over positive roots, at 0 and in the limit."""
    import sympy

    top = max((abs(r) for r in roots), default=sympy.Integer(1)) or sympy.Integer(1)
    places = [sympy.Integer(0), top * 10**12]
    places += [r.as_real_imag()[0] for r in roots if _is_real(r) and r.as_real_imag()[0] > 0]
    values = [_number(expression, {unknown: x}) for x in places]
    return max((v for v in values if v is not None), default=None)


def _only(difference: Any, unknown: Any) -> Any:
    """The positive root of a falling function, by halving in the logarithm."""
    import sympy

    low, high = -700.0, 700.0
    for _ in range(_HALVINGS):
        middle = 0.5 * (low + high)
        if _number(difference, {unknown: sympy.exp(sympy.Float(middle, DIGITS))}) > 0:
            low = middle
        else:
            high = middle
    return sympy.exp(sympy.Float(0.5 * (low + high), DIGITS)).evalf(DIGITS)


def _last(root: Root, values: Mapping[Any, Any]) -> float | None:
    """The last time at which the magnitude of a sum of exponentials equals a tolerance; 0 where it never exceeds it."""
    import sympy

    summed = next(iter(root.left.atoms(sympy.RootSum)))
    pole = summed.fun.variables[0]
    outside = root.left.xreplace({summed: sympy.S.One})
    weight = (outside * summed.fun.expr / sympy.exp(pole * root.unknown)).xreplace(dict(values))
    poles = _roots(summed.poly.as_expr().xreplace(dict(values)), summed.poly.gen)
    terms = [(complex(weight.subs(pole, p).evalf(DIGITS)), complex(p)) for p in poles]
    if any(p.real >= 0 for _, p in terms):
        return None
    tolerance = float(root.right.xreplace(dict(values)))

    def excess(t: float) -> float:
        return abs(sum((w * cmath.exp(p * t)).real for w, p in terms)) - tolerance

    slowest = max(1.0 / -p.real for _, p in terms)
    bound = slowest * math.log(max(sum(abs(w) for w, _ in terms) / tolerance, 1.0)) * 1.001 + 1e-300
    times = sorted(
        {bound * k / _SCAN for k in range(_SCAN + 1)} | {bound * 10 ** (-9 * k / _SCAN) for k in range(_SCAN)}
    )
    for before, after in zip(times[-2::-1], times[:0:-1], strict=True):
        if excess(before) > 0:
            low, high = before, after
            for _ in range(_HALVINGS):
                middle = 0.5 * (low + high)
                low, high = (middle, high) if excess(middle) > 0 else (low, middle)
            return 0.5 * (low + high)
    return 0.0


def evaluated_float(expression: Any, numbers: Mapping[Any, float]) -> float | None:
    """An expression on numbers by symbol, None where it has no real one."""
    return real(evaluated(expression, None, {symbol: _float(value) for symbol, value in numbers.items()}))


def evaluated_definition(found: Definition, numbers: Mapping[Any, float | None]) -> float | None:
    """A definition on numbers by symbol, None where it has no real one."""
    values = {symbol: _float(value) for symbol, value in numbers.items() if value is not None}
    return real(_on(found, values))


def _on(found: Definition, values: Mapping[Any, Any]) -> Any:
    import sympy

    if found.expression is None or (found.holds is not None and found.holds.xreplace(dict(values)) != sympy.true):
        return None
    return evaluated(found.expression, found.root, values)
