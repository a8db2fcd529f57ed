"""Deep information at a small auxiliary prime q: X(Z/q^2) in J(F_q) x (logarithms modulo q^2).

A rational point is one of the points of X modulo q^2, of which each residue disc has q.  Their classes in
J(F_q) and their logarithms modulo q^2 are a condition like any other; compared with J(F_q) alone it lets one
in q^(g-1) classes through.  (Bruin and Stoll 2010, "deep information".)
"""

from __future__ import annotations

from collections.abc import Sequence

from sieve.curves.divisors import Divisor
from sieve.curves.protocol import Curve
from sieve.local.chabauty import ChabautyPlace, LocatedCandidate
from sieve.local.condition import Condition

DEEP_PRIMES = (3, 5, 7, 11)
"""Where it is tried."""

DIGITS = 2
"""Points are told apart modulo q^DIGITS."""


def deep_name(q: int) -> str:
    """The name of the condition."""
    return f"deep v = {q}"


def deep_condition(
    curve: Curve, base: Divisor, generators: Sequence[Divisor], q: int, integral: bool = False
) -> Condition:
    """The condition at an odd prime q of good reduction.

    Arguments: `base` of degree 1 or more, the `generators` of L; `integral`: only points that reduce to
    affine ones.  Raises `BadReduction`, `Uncertified`, `PrecisionLost`.
    """
    place = ChabautyPlace(curve, q, DIGITS + 1)
    place.attach(base, generators)
    reduced = place.group.curve
    points = [
        LocatedCandidate("", "point", disc, q * k, DIGITS)
        for disc in range(reduced.affine_count if integral else reduced.count)
        for k in range(q)
    ]
    (found,) = place.conditions(points, 0, (), True)
    return Condition(deep_name(q), q, found.moduli, found.images, found.allowed)
