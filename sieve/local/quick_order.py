"""The order of J(F_v) up to a few possibilities, long before its structure is known (genus 2).

The Hasse-Witt matrix of y^2 = F(x) modulo v, coefficients of F^((v-1)/2), gives the characteristic polynomial
of Frobenius modulo v (Manin 1961), and Weil's bounds leave at most five values for the order.  One power of a
polynomial: a few milliseconds at v = 20,000, some thirty times less than the group.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import isqrt

import flint


@dataclass(frozen=True)
class QuickOrder:
    """What is known of J(F_v): `points` = #X(F_v), and `orders`, sorted, one of which is #J(F_v)."""

    prime: int
    points: int
    orders: tuple[int, ...]


def quick_order(f: Sequence[int], h: Sequence[int], v: int) -> QuickOrder | None:
    """The number of points and the possible orders of J(F_v) for y^2 + h y = f of genus 2.

    Arguments: integer coefficients, low degree first; a prime v.  Returns None for v < 80 (where the trace
    modulo v does not determine the trace) and at primes of bad reduction.

    >>> quick_order([1, -4, 2, -2, 1, 2, 1], [], 101).orders
    (11109, 11210, 11311)
    """
    if v < 80:
        return None
    square = flint.nmod_poly([int(c) % v for c in (_poly(h) ** 2 + 4 * _poly(f)).coeffs()], v)
    if not 5 <= square.degree() <= 6 or square.gcd(square.derivative()).degree():
        return None
    power = square ** ((v - 1) // 2)
    a, b = int(power[v - 1]), int(power[v - 2])
    c, d = int(power[2 * v - 1]), int(power[2 * v - 2])
    trace = (a + d) % v
    if trace > v // 2:
        trace -= v
    second = (a * d - b * c) % v
    # 2 |s1| sqrt v - 2 v <= s2 <= s1^2 / 4 + 2 v
    low = isqrt(4 * trace * trace * v) - 2 * v
    high = trace * trace // 4 + 2 * v
    first = low + (second - low) % v
    orders = [v * v + 1 - trace * (v + 1) + s for s in range(first, high + 1, v)]
    return QuickOrder(v, v + 1 - trace, tuple(orders))


def _poly(coefficients: Sequence[int]) -> flint.fmpz_poly:
    return flint.fmpz_poly([int(c) for c in coefficients])


__all__ = ["QuickOrder", "quick_order"]
