"""One equation solved for one symbol by sympy: rational ones by their polynomial, the rest by its general solver.

Every solution is kept but those that sympy shows to be negative where the symbol cannot be; these are dropped with
the reason.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import Any

LARGEST = 70
"""Operations of an expression beyond which no short formula can come of it."""

_SMALL = 40
_SHAPE = 14
_SPREAD = 4
_HIGHEST_DEGREE = 2


@dataclass(frozen=True, slots=True)
class Solutions:
    """What an equation allows.

    Attributes:
        values: sympy expressions.
        dropped: Reasons for those that were left out.
    """

    values: tuple[Any, ...] = ()
    dropped: tuple[str, ...] = ()


@lru_cache(maxsize=4096)
def solve(expression: Any, value: Any, symbol: Any) -> Solutions:
    """Solve expression = value for a symbol.

    Args:
        expression: sympy expression that holds the symbol.
        value: What it must equal; without the symbol.
        symbol: What is sought.
    Returns: all solutions found; none where there is no short one
    """
    import sympy

    if isinstance(expression, (sympy.Max, sympy.Min)):
        return _of_parts([part for part in expression.args if part.has(symbol)], value, symbol)
    if isinstance(expression, sympy.Abs):
        return _joined([solve(expression.args[0], sign * value, symbol) for sign in (1, -1)])
    if isinstance(expression, sympy.Piecewise) or sympy.count_ops(expression) > LARGEST:
        return Solutions()
    roots = {p for p in expression.atoms(sympy.Pow) if p.exp in (_half(), -_half()) and p.base.has(symbol)}
    if roots:
        return _without_root(expression, value, symbol, roots)
    found = _rational(expression - value, symbol)
    return _physical(_general(expression, value, symbol) if found is None else found, symbol)


def _half() -> Any:
    import sympy

    return sympy.Rational(1, 2)


def _of_parts(parts: list[Any], value: Any, symbol: Any) -> Solutions:
    return _joined([solve(part, value, symbol) for part in parts])


def _joined(found: list[Solutions]) -> Solutions:
    return Solutions(tuple(v for f in found for v in f.values), tuple(d for f in found for d in f.dropped))


def _without_root(expression: Any, value: Any, symbol: Any, roots: set[Any]) -> Solutions:
    """Solve for the square root that holds the symbol, then for the symbol in what stands under it."""
    import sympy

    bases = {p.base for p in roots}
    if len(bases) != 1:
        return _squared(expression, value, symbol)
    base = bases.pop()
    stands = sympy.Dummy("root", positive=True)
    rest = expression.xreplace({p: stands if p.exp == _half() else 1 / stands for p in roots})
    if rest.has(symbol):
        return _squared(expression, value, symbol)
    inner = solve(rest, value, stands)
    return _joined([Solutions(dropped=inner.dropped), *(solve(base, root**2, symbol) for root in inner.values)])


def _squared(expression: Any, value: Any, symbol: Any) -> Solutions:
    """Solve an equation whose one side is a product with a square root by squaring both sides."""
    import sympy

    square = sympy.expand_power_base((expression**2).doit()) if expression.is_Mul or expression.is_Pow else None
    if square is None or any(not p.exp.is_integer for p in square.atoms(sympy.Pow) if p.base.has(symbol)):
        return Solutions()
    return solve(square, value**2, symbol)


def _rational(equation: Any, symbol: Any) -> list[Any] | None:
    """Solutions of an equation that is rational in the symbol and of low degree; None where it is not."""
    import sympy

    if not equation.is_rational_function(symbol):
        return None
    if sympy.count_ops(equation) > LARGEST:
        return []
    numerator, _ = sympy.fraction(sympy.together(equation))
    poly = sympy.Poly(numerator, symbol)
    degree = poly.degree()
    coefficients = poly.all_coeffs()
    lowest = next((k for k, c in enumerate(reversed(coefficients)) if c != 0), 0)
    if degree == lowest:
        return []
    if degree - lowest == 1:
        return [_tidy(-coefficients[1] / coefficients[0])]
    if all(c == 0 for c in coefficients[1 : degree - lowest]):
        ratio = _tidy(-coefficients[degree - lowest] / coefficients[0])
        return [
            sympy.root(ratio, degree - lowest),
            *([-sympy.sqrt(ratio)] if degree - lowest == _HIGHEST_DEGREE else []),
        ]
    if degree - lowest > _HIGHEST_DEGREE:
        return []
    if sum(sympy.count_ops(c) for c in coefficients[:3]) > _SMALL:
        return []
    return list(sympy.polys.polyroots.roots_quadratic(sympy.Poly(coefficients[:3], symbol)))


def _with_real_roots(expression: Any) -> Any:
    """An expression with a positive letter for every root of open sign: it counts only where it is real."""
    import sympy

    roots = {p for p in expression.atoms(sympy.Pow) if p.exp == _half() and p.is_positive is None}
    return expression.xreplace({p: sympy.Dummy(positive=True) for p in roots})


def _flat_roots(expression: Any) -> Any:
    """An expression whose roots of reciprocals are reciprocals of roots."""
    return expression.replace(
        lambda e: e.is_Pow and abs(e.exp) == _half() and e.base.is_Pow and e.base.exp == -1,
        lambda e: e.base.base ** (-e.exp),
    )


def _tidy(expression: Any) -> Any:
    """A short expression in the shorter of its two usual forms: one fraction, or a sum of terms."""
    import sympy

    if sympy.count_ops(expression) > _SMALL:
        return expression
    whole = _flat_roots(sympy.factor_terms(sympy.cancel(expression)))
    top, bottom = sympy.fraction(whole)
    if bottom == 1 or bottom.is_Add or not top.is_Add:
        return whole
    parts = sympy.expand(top / bottom)
    return parts if sympy.count_ops(parts) <= sympy.count_ops(whole) + _SPREAD else whole


def _unrooted(expression: Any) -> Any:
    """An expression whose powers of products give out the factors of which they are the inverse power."""
    import sympy

    def given(power: Any) -> Any:
        base, exponent = power.args
        parts = sympy.Mul.make_args(base)
        out = [p.base for p in parts if p.is_Pow and p.base.is_positive and p.exp * exponent == 1]
        rest = [p for p in parts if not (p.is_Pow and p.base.is_positive and p.exp * exponent == 1)]
        return sympy.Mul(*out) * sympy.Mul(*rest) ** exponent if out else power

    return expression.replace(lambda e: e.is_Pow and not e.exp.is_number, given)


def _general(expression: Any, value: Any, symbol: Any) -> list[Any]:
    """Solutions by sympy's general solver of the equation's bare shape, what is without the symbol being letters."""
    import sympy

    letters: dict[Any, Any] = {}
    shape = _shape(expression, symbol, letters)
    if sympy.count_ops(shape) > _SHAPE or not _solvable(shape, symbol):
        return []
    right = _letter(value, letters)
    unknown = sympy.Symbol("x", positive=symbol.is_positive, real=True)
    back = {letter: part for part, letter in letters.items()}
    return [_unrooted(f.xreplace(back)) for f in _solved(shape.xreplace({symbol: unknown}), right, unknown)]


def _solvable(shape: Any, symbol: Any) -> bool:
    """Whether a shape has a short solution: the symbol stands in it once.

    Where it stands beside a logarithm of itself, sympy looks for a second and more, and finds nothing that is short.
    """
    import sympy

    return sum(1 for part in sympy.preorder_traversal(shape) if part == symbol) == 1


@lru_cache(maxsize=256)
def _solved(shape: Any, right: Any, unknown: Any) -> tuple[Any, ...]:
    import sympy

    try:
        found = sympy.solve(shape - right, unknown)
    except NotImplementedError:
        return ()
    return tuple(f for f in found if not f.has(unknown, sympy.I, sympy.Piecewise))


def _letter(part: Any, letters: dict[Any, Any]) -> Any:
    """A letter that stands for an expression, the same for the same one; numbers stand for themselves."""
    import sympy

    part = part + sympy.S.Zero
    if part.is_number:
        return part
    if part not in letters:
        letters[part] = sympy.Symbol(f"a_{len(letters)}", positive=part.is_positive, real=True)
    return letters[part]


def _shape(expression: Any, symbol: Any, letters: dict[Any, Any]) -> Any:
    if not expression.has(symbol):
        return _letter(expression, letters)
    if expression == symbol:
        return expression
    if expression.is_Add or expression.is_Mul:
        rest, held = expression.as_independent(symbol, as_Add=expression.is_Add)
        inner = held.func(*(_shape(part, symbol, letters) for part in held.args)) if held != symbol else symbol
        if held.func not in (expression.func, type(symbol)):
            inner = _shape(held, symbol, letters)
        return expression.func(_letter(rest, letters), inner)
    return expression.func(*(_shape(part, symbol, letters) for part in expression.args))


def _physical(found: list[Any], symbol: Any) -> Solutions:
    import sympy

    if not symbol.is_positive:
        return Solutions(tuple(found))
    kept, dropped = [], []
    for solution in found:
        short = sympy.count_ops(solution) <= _SMALL  # of a long one sympy would search long for its sign
        if short and _with_real_roots(solution).is_nonpositive:
            dropped.append(f"{symbol.name} would be negative")
        elif short and solution.is_real is False:
            dropped.append(f"{symbol.name} would not be real")
        else:
            kept.append(_flat_roots(solution) if short else solution)
    return Solutions(tuple(kept), tuple(dropped))
