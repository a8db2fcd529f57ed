"""Differentials whose integrals vanish on the closure of J(Q) in J(Q_p): the kernel of the logarithms.

Let D_1..D_r be given, r at least the rank of J(Q).  When their logarithms are independent over Q_p, the
divisors are independent, so they generate a subgroup of finite index, the rank is r, and a differential
annihilates J(Q) exactly when it annihilates their logarithms: a space of dimension g - r.

Symmetric models.  If F is even in some of X, Y, Z, the changes of their signs act on the curve, J(Q) (x) Q is
the sum of its eigenspaces, and every x^i y^k dx / F_y belongs to one character.  A generator whose logarithm
has a part of a character shows that this eigenspace is not 0.  When r generators show r of them, the others
are 0, and the differentials of the other characters annihilate J(Q) exactly, not just to the known digits.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from sieve.curves.discs import differentials
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


def characters(curve: Curve) -> list[tuple[int, ...]]:
    """For every regular differential how the sign changes of coordinates in which F is even act on it.

    Entries 0 and 1 for each such coordinate, up to a common factor.

    >>> from sieve.curves.hyperelliptic import HyperellipticCurve
    >>> characters(HyperellipticCurve([9, 0, -2, 0, 1, 0, 1]))[:2]
    [(0, 0, 1), (1, 0, 0)]
    """
    weight, degree = curve.weight, curve.degree
    terms = [
        (i, k, degree - i - weight * k) for k, row in enumerate(curve.rows) for i, c in enumerate(row) if c
    ]
    even = [n for n in range(3) if not any(term[n] % 2 for term in terms)]
    forms = [(i, k, degree - weight - 2 - i - weight * k) for i, k in differentials(weight, degree)]
    return [tuple(form[n] % 2 for n in even) for form in forms]


def exact_annihilators(
    curve: Curve, logs: Sequence[PadicVector], found: Sequence[Annihilator]
) -> list[Annihilator]:
    """The same differentials, with those that are exactly known marked as such.

    Without generators every differential annihilates exactly.  Raises `Inconsistent` when the logarithms of
    the generators have parts of more characters than there are generators: the rank is larger then.
    """
    if not logs:
        return [replace(a, exact=True) for a in found]
    labels = characters(curve)
    present = {labels[j] for log in logs for j, c in enumerate(log.numerators) if c}
    if len(present) > len(logs):
        raise Inconsistent(
            f"the logarithms of the generators have parts in {len(present)} factors of the Jacobian: the "
            f"rank is at least {len(present)}", f"{len(logs)} generators",
        )
    out = []
    for a in found:
        if len(present) == len(logs) and labels[a.free] not in present:
            unit = tuple(int(j == a.free) for j in range(curve.genus))
            a = replace(a, coefficients=unit, exact=True)
        out.append(a)
    return out
