"""Bounds for #J(F_v), and its exact value, from point counts.

Write #J(F_v) = prod (v + 1 - x_i) with real x_i, |x_i| <= 2 sqrt(v), sum x_i = v + 1 - N_1 (Weil 1948).
"""

from __future__ import annotations

from fractions import Fraction
from math import isqrt

from sieve.curves.protocol import ReducedCurve


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


def exact_order(curve: ReducedCurve, counts: list[int]) -> int:
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
