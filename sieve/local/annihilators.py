"""Differentials whose integrals vanish on the closure of J(Q) in J(Q_p): the kernel of the logarithms.

Let D_1..D_r be given, r at least the rank of J(Q).  When their logarithms are independent over Q_p, the
divisors are independent, so they generate a subgroup of finite index, the rank is r, and a differential
annihilates J(Q) exactly when it annihilates their logarithms: a space of dimension g - r.

Symmetric models.  If f and h are even, s(x, y) = (-x, y) acts on the curve and J(Q) (x) Q is the sum of its
two eigenspaces; x^j dx/(2y+h) has the sign (-1)^(j+1).  For r = 1 one of the eigenspaces is 0, and the
logarithm of D_1 tells which: the differentials of that sign annihilate J(Q) exactly, not just to the known
digits.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.protocol import Curve
from sieve.errors import Inconsistent, PrecisionLost
from sieve.exact.padic_linear import PadicVector
from sieve.exact.padic_number import valuation


@dataclass(frozen=True)
class Annihilator:
    """The differential sum c_j w_j with c_j = 1 for j = `free`; w_0, w_1, .. as in `sieve.curves.discs`.

    `coefficients` are known modulo p^`precision`; `exact`: it is w_free, without any error.
    """

    coefficients: tuple[int, ...]
    precision: int
    free: int
    exact: bool = False


def annihilators(logs: Sequence[PadicVector], prime: int, genus: int, digits: int) -> list[Annihilator]:
    """A basis, over Z_p, of the annihilating differentials with coefficients in Z_p.

    Arguments: `logs`, the logarithms of r < genus divisors; `digits`, the precision when there are none.
    Raises `PrecisionLost` when the logarithms may be dependent, as far as they are known.

    >>> annihilators([PadicVector.of(5, (5, 10), 0, 3)], 5, 2, 3)
    [Annihilator(coefficients=(23, 1), precision=2, free=1, exact=False)]
    """
    rows, known = [], digits
    for log in logs:
        least = min((valuation(c, prime) for c in log.numerators if c), default=log.precision + log.shift)
        rows.append([c // prime**least for c in log.numerators])
        known = min(known, log.precision + log.shift - least)
    modulus = prime ** max(known, 0)
    if known < 1:
        raise PrecisionLost(prime, known, 1, "the logarithm of a generator")
    # rows that were used are known modulo p^(known - lost), the others modulo p^known
    lost, pivots = 0, []
    for step in range(len(rows)):
        rows = [[c % modulus for c in row] for row in rows]
        found = [
            (valuation(rows[i][j], prime), i, j)
            for i in range(step, len(rows)) for j in range(genus) if rows[i][j] and j not in pivots
        ]
        least, i, j = min(found, default=(known, 0, 0))
        if least >= known:
            raise PrecisionLost(prime, known, known + 1, "the independence of the logarithms of generators")
        rows[step], rows[i] = rows[i], rows[step]
        lost = max(lost, least)
        inverse = pow(rows[step][j] // prime**least, -1, modulus)
        rows[step] = [c * inverse // prime**least for c in rows[step]]
        for other in range(len(rows)):
            if other != step:
                factor = rows[other][j]
                rows[other] = [a - factor * b for a, b in zip(rows[other], rows[step], strict=True)]
        pivots.append(j)
    out, precision = [], known - lost
    if precision < 1:
        raise PrecisionLost(prime, precision, 1, "the annihilating differentials")
    for free in (j for j in range(genus) if j not in pivots):
        vector = [int(j == free) for j in range(genus)]
        for row, j in zip(rows, pivots, strict=True):
            vector[j] = -row[free] % prime**precision
        out.append(Annihilator(tuple(vector), precision, free))
    return out


def symmetric(curve: Curve) -> bool:
    """Whether the model is y^2 + h y = f with even f and h, so that (x, y) -> (-x, y) maps it to itself."""
    return isinstance(curve, HyperellipticCurve) and not any(curve.f[1::2]) and not any(curve.h[1::2])


def exact_annihilators(
    curve: Curve, logs: Sequence[PadicVector], found: Sequence[Annihilator]
) -> list[Annihilator]:
    """The same differentials, with those that are exactly known marked as such.

    Without generators every differential annihilates exactly.  Raises `Inconsistent` when the logarithm of
    the one generator has components of both signs: the rank is at least 2 then.
    """
    if not logs:
        return [replace(a, exact=True) for a in found]
    if len(logs) > 1 or not symmetric(curve):
        return list(found)
    signs = {j % 2 for j, c in enumerate(logs[0].numerators) if c}
    if len(signs) > 1:
        raise Inconsistent(
            "the logarithm of the generator has components in both factors of the Jacobian: the rank is "
            "at least 2", "generator no. 1",
        )
    out = []
    for a in found:
        if {a.free % 2} | signs == {0, 1}:
            unit = tuple(int(j == a.free) for j in range(curve.genus))
            a = replace(a, coefficients=unit, exact=True)
        out.append(a)
    return out
