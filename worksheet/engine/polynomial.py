"""Polynomials in s (or in omega squared) whose coefficients are arrays over conditions, lowest power first.

A determinant of G + sC is expanded by minors into such a polynomial; nodes are few. Minors cancel where elements
differ by more than 1e7, so a test compares them with a numeric solve.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from worksheet.device.arrays import Array, Complex, Number

Poly = list[Number]
"""Coefficients, lowest power first; an empty list is zero."""

Matrix = list[list[Poly]]


def add(a: Sequence[Number], b: Sequence[Number]) -> Poly:
    """a + b."""
    if len(a) < len(b):
        a, b = b, a
    return [x + b[k] if k < len(b) else x for k, x in enumerate(a)]


def scale(a: Sequence[Number], factor: Number) -> Poly:
    """factor times a."""
    return [factor * x for x in a]


def multiply(a: Sequence[Number], b: Sequence[Number]) -> Poly:
    """a times b."""
    if not a or not b:
        return []
    product: Poly = [0.0] * (len(a) + len(b) - 1)
    for i, x in enumerate(a):
        for j, y in enumerate(b):
            product[i + j] = product[i + j] + x * y
    return product


def determinant(matrix: Matrix) -> Poly:
    """Determinant of a square matrix of polynomials, by minors of its first column."""
    if not matrix:
        return [1.0]
    total: Poly = []
    for i, row in enumerate(matrix):
        if row[0]:
            minor = [other[1:] for k, other in enumerate(matrix) if k != i]
            total = add(total, scale(multiply(row[0], determinant(minor)), -1.0 if i % 2 else 1.0))
    return total


def column_cofactors(matrix: Matrix, column: int) -> list[Poly]:
    """Cofactors of one column: with them Cramer's rule gives that unknown for any right-hand side."""
    cofactors = []
    for i in range(len(matrix)):
        minor = [[p for j, p in enumerate(row) if j != column] for k, row in enumerate(matrix) if k != i]
        cofactors.append(scale(determinant(minor), -1.0 if (i + column) % 2 else 1.0))
    return cofactors


def padded(a: Sequence[Number], length: int) -> Poly:
    """a with zeros added up to `length` coefficients."""
    return [*a, *([0.0] * (length - len(a)))]


def squared_magnitude(a: Sequence[Number]) -> Poly:
    """Coefficients in x = omega^2 of abs(a(j omega))^2."""
    n = len(a)
    result: Poly = []
    for k in range(n):
        total: Number = 0.0
        for i in range(max(0, 2 * k - n + 1), min(n, 2 * k + 1)):
            sign = -1.0 if (k - i) % 2 else 1.0
            total = total + sign * (a[i] * a[2 * k - i])
        result.append(total)
    return result


def evaluate(a: Sequence[Number], x: Number) -> Array:
    """Value of the polynomial at x (Horner)."""
    total: Number = 0.0
    for coefficient in reversed(a):
        total = total * x + coefficient
    return np.asarray(total)


def evaluate_complex(a: Sequence[Number], x: Complex) -> Complex:
    """Value of the polynomial at complex x (Horner)."""
    total = np.zeros((), dtype=np.complex128)
    for coefficient in reversed(a):
        total = np.asarray(total * x + coefficient)
    return total


def lowest_positive_root(a: Sequence[Number]) -> Array:
    """Smallest real root above zero, NaN where there is none.

    Args:
        a: Coefficients, arrays that broadcast; a[0] is not zero.
    Returns: array of the broadcast shape
    """
    roots = positive_roots(a)
    lowest = np.min(np.where(np.isnan(roots), np.inf, roots), axis=0)
    return np.where(np.isinf(lowest), np.nan, lowest)


def positive_roots(a: Sequence[Number]) -> Array:
    """All real roots above zero along a new first axis, NaN where a root is none of these."""
    with np.errstate(all="ignore"):
        ratio = (
            np.stack(np.broadcast_arrays(*[np.asarray(c / np.asarray(a[0])) for c in a[1:]]))
            if len(a) > 1
            else np.zeros((0,))
        )
        if len(a) == 2:
            inverse = np.asarray(-ratio, dtype=np.float64)
        elif len(a) == 3:
            inverse = np.stack(_quadratic_inverse(ratio[0], ratio[1]))
        else:
            every = _inverses(ratio)
            inverse = np.where(np.abs(every.imag) <= 1e-7 * np.abs(every), every.real, np.nan)
        roots: Array = np.asarray(np.where(inverse > 0, 1.0 / inverse, np.nan), dtype=np.float64)
        return roots if len(a) <= 3 else _polished(a, roots)


def inverse_roots(a: Sequence[Number]) -> Complex:
    """-1/root of every root along a new first axis, complex; 0 where the degree is lower (a root at infinity).

    For a denominator these are the time constants of its poles. [s]
    """
    with np.errstate(all="ignore"):
        ratio = np.stack(np.broadcast_arrays(*[np.asarray(c / np.asarray(a[0])) for c in a[1:]]))
        if len(a) == 2:
            return ratio.astype(np.complex128)
        if len(a) == 3:
            half = ratio[0] / 2.0
            inside = half * half - ratio[1]
            root = np.sqrt(inside.astype(np.complex128))
            large = half + root
            small = np.where(
                inside >= 0, np.where(large == 0, 0.0, ratio[1] / np.where(large == 0, 1.0, large)), half - root
            )
            return np.stack([large, small])
        return -_inverses(ratio)


def _quadratic_inverse(b: Array, c: Array) -> tuple[Array, Array]:
    """Both y with y^2 + b y + c = 0 (y = 1/x for 1 + b x + c x^2), NaN where complex, without cancellation."""
    half = -b / 2.0
    inside = half * half - c
    root = np.sqrt(np.where(inside >= 0, inside, np.nan))
    far = np.where(half >= 0, half + root, half - root)
    near = np.where(far == 0, 0.0, c / np.where(far == 0, 1.0, far))
    return far, near


def _inverses(ratio: Array) -> Complex:
    """All y = 1/x with 1 + r_1 x + ... + r_n x^n = 0, along the first axis, after scaling to order one."""
    degree = ratio.shape[0]
    powers = np.arange(1, degree + 1).reshape((-1,) + (1,) * (ratio.ndim - 1))
    size = np.max(np.abs(ratio) ** (1.0 / powers), axis=0)
    size = np.where((size > 0) & np.isfinite(size), size, 1.0)
    scaled = np.where(np.isfinite(ratio), ratio, 0.0) / size**powers
    found = _cubic(scaled[0], scaled[1], scaled[2]) if degree == 3 else _eigenvalues(scaled)
    return np.asarray(found * size, dtype=np.complex128)


def _eigenvalues(scaled: Array) -> Complex:
    """Roots y of y^n + r_1 y^(n-1) + ... + r_n along the first axis, as eigenvalues of the companion matrix."""
    degree = len(scaled)
    matrix = np.zeros((*scaled.shape[1:], degree, degree))
    matrix[..., 0, :] = -np.moveaxis(scaled, 0, -1)
    for k in range(1, degree):
        matrix[..., k, k - 1] = 1.0
    return np.asarray(np.moveaxis(np.linalg.eigvals(matrix), -1, 0), dtype=np.complex128)


def _cubic(b: Array, c: Array, d: Array) -> Complex:
    """Roots of y^3 + b y^2 + c y + d along a first axis: one real root in closed form, then those of what is left.

    Ten times faster over many cases than eigenvalues. Where all roots are real the greatest in magnitude is taken out,
    so that small ones keep their digits.
    """
    first = _one_real(b, c, d)
    for _ in range(2):
        step = evaluate([d, c, b, 1.0], first) / evaluate([c, 2.0 * b, 3.0], first)
        first = np.where(np.isfinite(step), first - step, first)
    great = np.abs(first) ** 3 >= np.abs(d)
    last = np.where(first == 0, c, -d / np.where(first == 0, 1.0, first))
    middle = np.where(great & (first != 0), (last - c) / np.where(first == 0, 1.0, first), b + first)
    half = -middle / 2.0
    inside = half * half - last
    root = np.sqrt(inside.astype(np.complex128))
    far = np.where(half >= 0, half + root, half - root)
    near = np.where(inside >= 0, np.where(far == 0, 0.0, last / np.where(far == 0, 1.0, far)), np.conj(far))
    rest = np.stack([far, near])
    closer = evaluate_complex([d, c, b, 1.0], rest) / evaluate_complex([c, 2.0 * b, 3.0], rest)
    rest = np.where(np.abs(closer) < 1e-3 * np.abs(rest), rest - closer, rest)
    return np.concatenate([first[None].astype(np.complex128), rest])


def _one_real(b: Array, c: Array, d: Array) -> Array:
    """A real root of y^3 + b y^2 + c y + d by Cardano's and Viete's formulas; of three, the greatest in magnitude."""
    third = b / 3.0
    p, q = c - b * third, (2.0 * third * third - c) * third + d
    above = (q / 2.0) ** 2 + (p / 3.0) ** 3
    reach = np.sqrt(np.maximum(-p / 3.0, 0.0))
    turn = np.arccos(np.clip(-q / 2.0 / np.where(reach == 0, 1.0, reach) ** 3, -1.0, 1.0)) / 3.0
    ends = 2.0 * reach * np.cos(turn) - third, 2.0 * reach * np.cos(turn + 2.0 * np.pi / 3.0) - third
    of_three = np.where(np.abs(ends[0]) >= np.abs(ends[1]), *ends)
    u = -np.where(q >= 0, 1.0, -1.0) * np.cbrt(np.abs(q) / 2.0 + np.sqrt(np.maximum(above, 0.0)))
    v = np.where(u == 0, 0.0, -p / 3.0 / np.where(u == 0, 1.0, u))
    width = u * u + v * v + p / 3.0
    of_one = np.where(p > 0, -q / np.where(width == 0, 1.0, width), u + v) - third
    return np.asarray(np.where(above > 0, of_one, of_three))


def _polished(a: Sequence[Number], roots: Array) -> Array:
    slope = [k * c for k, c in enumerate(a)][1:]
    for _ in range(3):
        step = evaluate(a, roots) / evaluate(slope, roots)
        roots = np.where(np.abs(step) < 0.1 * roots, roots - step, roots)
    return roots


def noise_integral(numerator: Sequence[Number], denominator: Sequence[Number]) -> Array:
    """(1/2 pi j) times the integral of abs(numerator/denominator)^2 along the imaginary axis, exact.

    Args:
        numerator: Of lower degree than the denominator.
        denominator: With all roots in the left half-plane.
    Returns: array; inf where the integral diverges
    Source: James, Nichols and Phillips, Theory of Servomechanisms, 1947 (table of integrals), in the general form
        c(s) c(-s) = d(s) q(-s) + d(-s) q(s), integral q_(n-1)/d_n.
    """
    n = len(denominator) - 1
    c, d = padded(list(numerator)[:n], n), denominator
    with np.errstate(all="ignore"):
        if n == 1:
            return np.asarray(c[0] ** 2 / (2.0 * d[0] * d[1]))
        if n == 2:
            fast = np.where(np.asarray(c[1]) == 0, 0.0, np.asarray(c[1]) ** 2 / (2.0 * d[1] * np.asarray(d[2])))
            return fast + c[0] ** 2 / (2.0 * d[0] * d[1])
        return _noise_integral_general(c, d)


def _noise_integral_general(c: Poly, d: Sequence[Number]) -> Array:
    n = len(d) - 1
    static = np.asarray(d[0])
    rate = np.abs(static / d[n]) ** (1.0 / n)
    scaled = [np.asarray(x * rate**k / static) for k, x in enumerate(d)]
    square = squared_magnitude([np.asarray(x * rate**k) for k, x in enumerate(c)])
    right = np.stack(
        np.broadcast_arrays(*[(-1.0 if k % 2 else 1.0) * np.asarray(square[k]) for k in range(n)]), axis=-1
    )
    matrix = np.zeros((*np.broadcast_shapes(right.shape[:-1], *[x.shape for x in scaled]), n, n))
    for k in range(n):
        for j in range(n):
            i = 2 * k - j
            if 0 <= i <= n:
                matrix[..., k, j] = 2.0 * (-1.0 if j % 2 else 1.0) * scaled[i]
    right = np.broadcast_to(right, matrix.shape[:-1])
    q = np.linalg.solve(matrix, right[..., None])[..., 0]
    return np.asarray(q[..., n - 1] / scaled[n] * rate / static**2)
