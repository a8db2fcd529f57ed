"""The irreducible factors of 4 f + h^2, with primes that show that they are irreducible.

A factorisation over Q reduces to one modulo every prime q at which the polynomial keeps its degree and
stays squarefree, so the degree of a factor over Q is a sum of degrees of factors modulo q, for every such q.
When only 0 and the whole degree are sums for all of them, the polynomial is irreducible.  Not every
irreducible polynomial has such primes (x^4 + 1 has none).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import flint

from sieve.exact.primes import primes_below

PRIME_BOUND = 400
"""Primes below this are tried."""


@dataclass(frozen=True)
class BranchFactors:
    """Integer polynomials (low degree first) with product 4 f + h^2, and the primes that prove them
    irreducible."""

    factors: tuple[tuple[int, ...], ...]
    primes: tuple[int, ...]


def branch_factors(square_form: Sequence[int]) -> BranchFactors | None:
    """The factors of 4 f + h^2 with their evidence, or None where some factor has none.

    Arguments: the squarefree integer polynomial, low degree first (empty for a model without one: None).

    >>> branch_factors([-1, 0, 0, 0, 0, 1]).factors
    ((-1, 1), (1, 1, 1, 1, 1))
    >>> branch_factors([1, 0, 0, 0, 1]) is None
    True
    """
    if not square_form:
        return None
    content, found = flint.fmpz_poly(list(square_form)).factor()
    factors = sorted((tuple(int(c) for c in q.coeffs()) for q, _ in found), key=lambda q: (len(q), q))
    primes: set[int] = set()
    for q in factors:
        evidence = irreducibility_primes(q)
        if evidence is None:
            return None
        primes |= set(evidence)
    scaled = [tuple(int(content) * c for c in factors[0]), *factors[1:]]
    return BranchFactors(tuple(scaled), tuple(sorted(primes)))


def irreducibility_primes(coefficients: Sequence[int]) -> tuple[int, ...] | None:
    """Primes at which the degrees of the factors leave no proper degree for a factor over Q, or None.

    >>> irreducibility_primes([1, 1, 1])
    (2,)
    """
    degree = len(coefficients) - 1
    if degree == 1:
        return ()
    goal = frozenset({0, degree})
    patterns: dict[int, frozenset[int]] = {}
    left = frozenset(range(degree + 1))
    for q in primes_below(PRIME_BOUND):
        sums = _degree_sums(coefficients, q)
        if sums is None or left <= sums:
            continue
        patterns[q], left = sums, left & sums
        if left == goal:
            break
    else:
        return None
    for q in list(patterns):
        others = frozenset(range(degree + 1)).intersection(*(s for r, s in patterns.items() if r != q))
        if others == goal and len(patterns) > 1:
            del patterns[q]
    return tuple(patterns)


def _degree_sums(coefficients: Sequence[int], q: int) -> frozenset[int] | None:
    """The sums of degrees of factors modulo q; None where the degree drops or a factor is repeated."""
    poly = flint.nmod_poly([c % q for c in coefficients], q)
    if poly.degree() < len(coefficients) - 1:
        return None
    found = poly.factor()[1]
    if any(multiplicity > 1 for _, multiplicity in found):
        return None
    sums = {0}
    for factor, _ in found:
        sums |= {a + factor.degree() for a in sums}
    return frozenset(sums)
