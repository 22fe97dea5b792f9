"""The frequency at which a magnitude meets a condition: an equation in omega squared, solved where it is linear."""

from __future__ import annotations

from collections.abc import Callable
from functools import lru_cache
from typing import Any

from worksheet.engine.symbolic.definition import Definition, Pick, Root
from worksheet.engine.symbolic.network import squared_magnitude


def coefficients(letter: str, count: int) -> tuple[Any, ...]:
    """Symbols for the coefficients of a polynomial; a denominator's first one is positive."""
    import sympy

    first = sympy.Symbol(f"{letter}_0", positive=True) if letter == "d" else sympy.Symbol(f"{letter}_0", real=True)
    return (first, *(sympy.Symbol(f"{letter}_{k}", real=True) for k in range(1, count)))


def fallen(top: Any, bottom: Any, n: Any, d: Any) -> Any:
    """0 where the squared magnitude has fallen to half of its value at zero frequency."""
    return 2 * d**2 * top - n**2 * bottom


def at_one(top: Any, bottom: Any, n: Any, d: Any) -> Any:  # noqa: ARG001
    """0 where the magnitude is 1."""
    return top - bottom


@lru_cache(maxsize=64)
def law(of: Callable[[Any, Any, Any, Any], Any], present: tuple[int, ...], count: int) -> Definition:
    """The frequency of a condition for coefficients as symbols; written out where it is linear in omega^2.

    Args:
        of: The condition on numerator and denominator squared, and on their first coefficients.
        present: Powers of s that the numerator has.
        count: How many coefficients the denominator has.
    """
    import sympy

    x = sympy.Symbol("x", positive=True)
    every, d = coefficients("n", max(present, default=0) + 1), coefficients("d", count)
    n = [c if k in present else 0 for k, c in enumerate(every)]
    equation = of(squared_magnitude(n, x), squared_magnitude(d, x), n[0], d[0])
    poly = sympy.Poly(sympy.expand(equation), x)
    if poly.degree() == 1:
        slope, static = poly.all_coeffs()
        top, bottom = sympy.fraction(sympy.cancel(static / -slope))
        usual = dict.fromkeys((*every, *d), 1) | {every[0]: 3, d[-1]: 7}  # a gain above 1, a pole below the zero
        sign = 1 if top.subs(usual) > 0 else -1
        return Definition("", sympy.sqrt(sign * top) / (2 * sympy.pi * sympy.sqrt(sign * bottom)))
    terms = [c * x ** k[0] for k, c in sorted(poly.terms())]
    root = Root(x, sum(terms), sympy.S.Zero, Pick.LOWEST_POSITIVE)
    return Definition("", sympy.sqrt(x) / (2 * sympy.pi), root)
