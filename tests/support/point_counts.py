"""#J(F_v) from the numbers of points over F_v, F_v^2, .., F_v^g, counted one x at a time (tiny v only)."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from itertools import product

from flint import fq_default, fq_default_ctx, fq_default_poly_ctx, nmod_poly


def count_points(v: int, degree: int, f: Sequence[int], h: Sequence[int], genus: int) -> int:
    """#X(F_q), q = v^degree, as the number of roots y over every x of the projective line."""
    field = fq_default_ctx(v, degree)
    ring = fq_default_poly_ctx(field)

    def roots(fx: fq_default, hx: fq_default) -> int:
        y = ring.gen()
        return len((y * y + hx * y - fx).roots())

    total = 0
    for digits in product(range(v), repeat=degree):
        x = field(nmod_poly(list(digits), v))
        fx, hx = field(0), field(0)
        for c in reversed(f):
            fx = fx * x + c
        for c in reversed(h):
            hx = hx * x + c
        total += roots(fx, hx)
    top_f = f[2 * genus + 2] if len(f) > 2 * genus + 2 else 0
    top_h = h[genus + 1] if len(h) > genus + 1 else 0
    return total + roots(field(top_f), field(top_h))


def order_from_counts(v: int, counts: Sequence[int]) -> int:
    """L(1) from the first g counts.

    L(T) = exp(sum over n of (#X(F_v^n) - v^n - 1) T^n / n) has degree 2g, L(T) = v^g T^2g L(1/(v T)) (Weil).
    """
    g = len(counts)
    a = [Fraction(1)]
    for n in range(1, g + 1):
        a.append(sum((counts[k - 1] - v**k - 1) * a[n - k] for k in range(1, n + 1)) / Fraction(n))
    value = sum(a[: g + 1]) + sum(v ** (g - i) * a[i] for i in range(g))
    assert value.denominator == 1
    return int(value)


def jacobian_order_by_counting(v: int, f: Sequence[int], h: Sequence[int], genus: int) -> int:
    """#J(F_v); about v^genus steps."""
    return order_from_counts(v, [count_points(v, n, f, h, genus) for n in range(1, genus + 1)])
