"""Bounds for #J(F_v) from point counts, and the counts over small extensions.

Write #J(F_v) = prod (v + 1 - x_i) with real x_i, |x_i| <= 2 sqrt(v), sum x_i = v + 1 - N_1 (Weil 1948).
"""

from __future__ import annotations

from fractions import Fraction
from math import isqrt

import flint
import numpy as np
from numpy.typing import NDArray

from sieve.curves.hyperelliptic_mod import ReducedHyperelliptic


def _sqrt_bounds(n: int) -> tuple[Fraction, Fraction]:
    """Rational numbers just below and above sqrt(n)."""
    scale = 10**12
    root = isqrt(n * scale * scale)
    return Fraction(root, scale), Fraction(root + 1, scale)


def order_lower_bound(v: int, genus: int, points: int) -> int:
    """A lower bound for #J(F_v) from #X(F_v) = `points`.

    The product is log-concave on the polytope |x_i| <= 2 sqrt(v), sum x_i = v + 1 - points, so its minimum
    is at a vertex: all x_i but one are at an end of the interval.  Rounding is outward; at least 1.
    """
    low, high = _sqrt_bounds(4 * v)
    q, total = v + 1, v + 1 - points
    best: Fraction | None = None
    for plus in range(genus):
        minus = genus - 1 - plus
        # last = total - plus * 2 sqrt v + minus * 2 sqrt v, known up to the rounding of sqrt
        last_low = total - plus * high + minus * low
        last_high = total - plus * low + minus * high
        if last_high < -high or last_low > high:
            continue
        value = (q - high) ** plus * (q + low) ** minus * max(Fraction(0), q - min(last_high, high))
        best = value if best is None else min(best, value)
    # (sqrt v - 1)^{2g} holds whatever the count
    fallback = (q - high) ** genus
    result = fallback if best is None else max(best, fallback)
    return max(1, -((-result.numerator) // result.denominator))


def extension_count(curve: ReducedHyperelliptic, degree: int) -> int:
    """#X(F_{v^degree}) by enumeration; cost about v^degree operations, so for small fields only."""
    v, g = curve.prime, curve.genus
    if degree == 1:
        return curve.count
    modulus = _irreducible(v, degree)
    size = v**degree
    codes = np.arange(size, dtype=np.int64)
    x = np.stack([codes // v**i % v for i in range(degree)])

    def constant(c: int) -> NDArray[np.int64]:
        value = np.zeros_like(x)
        value[0] = c
        return value

    def multiply(a: NDArray[np.int64], b: NDArray[np.int64]) -> NDArray[np.int64]:
        out = np.zeros((2 * degree - 1, size), dtype=np.int64)
        for i in range(degree):
            out[i : i + degree] += a[i] * b
        out %= v
        for i in range(2 * degree - 2, degree - 1, -1):
            for j in range(degree):
                out[i - degree + j] -= out[i] * modulus[j]
        return out[:degree] % v

    def evaluate(coefficients: list[int]) -> NDArray[np.int64]:
        value = constant(0)
        for c in reversed(coefficients):
            value = multiply(value, x)
            value[0] = (value[0] + c) % v
        return value

    def code(a: NDArray[np.int64]) -> NDArray[np.int64]:
        return np.asarray(sum(a[i] * v**i for i in range(degree)), dtype=np.int64)

    lead_f, lead_h = curve.f[2 * g + 2], curve.h[g + 1]
    if v == 2:
        fx, hx = evaluate(curve.f), evaluate(curve.h)
        affine = 0
        for y_code in range(size):
            y = np.repeat(
                np.array([[y_code // v**i % v] for i in range(degree)], dtype=np.int64), size, axis=1
            )
            value = (multiply(y, y) + multiply(hx, y) - fx) % v
            affine += int((value == 0).all(axis=0).sum())
        infinite = _leading_roots(lead_f, lead_h, v, degree)
        return affine + infinite
    square = multiply(evaluate(curve.h), evaluate(curve.h)) + 4 * evaluate(curve.f)
    roots = np.bincount(code(multiply(x, x)), minlength=size)
    return int(roots[code(square % v)].sum()) + _leading_roots(lead_f, lead_h, v, degree)


def _leading_roots(lead_f: int, lead_h: int, v: int, degree: int) -> int:
    """The number of s in F_{v^degree} with s^2 + lead_h s = lead_f."""
    poly = flint.nmod_poly([-lead_f % v, lead_h % v, 1], v)
    factors = poly.factor()[1]
    return sum(int(factor.degree()) for factor, _ in factors if degree % factor.degree() == 0)


def _irreducible(v: int, degree: int) -> list[int]:
    """The coefficients (low first, monic leading one included) of the first irreducible polynomial."""
    for tail in range(1, v**degree):
        digits = [tail // v**i % v for i in range(degree)]
        factors = flint.nmod_poly([*digits, 1], v).factor()[1]
        if len(factors) == 1 and factors[0][1] == 1:
            return [*digits, 1]
    raise AssertionError("there is always an irreducible polynomial")


def exact_order(curve: ReducedHyperelliptic, counts: list[int]) -> int:
    """#J(F_v) from N_1 .. N_g, through Newton's identities for the L-polynomial.

    Arguments: `counts` of length g, counts[i] = #X(F_{v^{i+1}}).  Raises nothing; exact integers.
    """
    v, g = curve.prime, curve.genus
    sums = [counts[i] - (v ** (i + 1) + 1) for i in range(g)]
    a = [1] + [0] * (2 * g)
    for i in range(1, g + 1):
        a[i] = sum(sums[j - 1] * a[i - j] for j in range(1, i + 1)) // i
    for i in range(g):
        a[2 * g - i] = v ** (g - i) * a[i]
    return sum(a)
