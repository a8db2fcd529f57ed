"""Logarithms of the centres of residue discs at a prime p of good reduction.

Log(P) is half the vector of integrals of x^j dx/(2y+h), j = 0..g-1, from the conjugate of P to P.  On
divisors of degree 0 it is the abelian logarithm of the class, because the involution acts as -1 on the
differentials; and the zeros of every section have logarithm 0, because their class is a multiple of the fibre
class U, and Log(P) + Log(conjugate of P) = 0.

Let F be a section over Z_p whose zeros modulo p are F_p-points, m_c of them in the disc c.  Then sum_c (m_c
Log(centre c) + S_c) = 0, S_c the integrals from the centre summed over the zeros in the disc; no zero needs
to be rational or simple, so any lift of a section modulo p will do.  The vectors (m_c) form the lattice of
relations between F_p-points in Pic modulo U, and a basis of it determines all Log(centre c).  Ramified discs
are known beforehand: there Log(centre) is half the integral from the conjugate of the centre, inside the
disc.

Precision: the basis is solved by its exact inverse, whose denominators divide the exponent of Z^n modulo the
lattice, a subgroup of Pic modulo U.  So the loss is known before any series is computed, and at most v_p of
that exponent.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from math import isqrt

from sieve.errors import InternalError
from sieve.exact.lattice import ReducedLattice
from sieve.exact.padic_linear import PadicVector, combine, independent_rows, rational_inverse
from sieve.exact.padic_number import valuation
from sieve.local.disc_integrals import DiscIntegrals
from sieve.local.picard import PicardGroup
from sieve.local.supported_sections import Scheme, find_section, relation_lattice

SURPLUS = 4
"""How many equations more than unknowns are computed and checked, where there are unknowns."""


@dataclass(frozen=True)
class Centres:
    """The logarithms of all centres, in the numbering of discs, each modulo p^`precision` at least.

    `lattice`: the relations between the discs `leaders + ramified`.  `guard`: v_p of the index in Pic modulo
    U of the subgroup that F_p-points generate; a p-power multiple of a divisor over F_p by at most that is
    equivalent to a combination of them.
    """

    logs: tuple[PadicVector, ...]
    precision: int
    guard: int
    lattice: ReducedLattice


def contact_orders(integrals: DiscIntegrals, vector: Sequence[int]) -> dict[int, int]:
    """The effective divisor, without whole fibres, that a relation stands for modulo U.

    `vector` over leaders, then ramified discs: -P becomes the conjugate of P, ramified points count modulo 2.
    """
    contacts: dict[int, int] = {}
    count = len(integrals.leaders)
    for number, n in zip(integrals.leaders, vector[:count], strict=True):
        if n:
            contacts[number if n > 0 else integrals.partner[number]] = abs(n)
    for number, n in zip(integrals.ramified, vector[count:], strict=True):
        if n % 2:
            contacts[number] = 1
    return contacts


def centre_logarithms(integrals: DiscIntegrals, group: PicardGroup, digits: int) -> Centres:
    """The logarithms of all centres, known modulo p^(digits + guard) or better.

    Arguments: `group`, the certified Picard group of the reduction; `digits` >= 1.
    Raises `InternalError` when a surplus equation fails.
    """
    p, count = integrals.prime, len(integrals.leaders)
    relations = relation_lattice(group, integrals.leaders + integrals.ramified)
    lattice = ReducedLattice(relations)
    # d[-1] is the determinant of the Gram matrix, the square of the index in Z^n
    guard = valuation(2 * group.order, p) - valuation(isqrt(lattice.d[-1]), p)
    rows = [row for row in relations if any(row[:count])]
    chosen = independent_rows([row[:count] for row in rows], p, count)
    inverse = rational_inverse([rows[i][:count] for i in chosen])
    loss = max((-valuation(c, p) for line in inverse for c in line if c), default=0)
    precision = digits + guard
    working = precision + max(0, loss)
    logs: dict[int, PadicVector] = {i: _ramified_centre(integrals, i, working) for i in integrals.ramified}
    constants = [_right_side(integrals, rows[i], logs, working) for i in chosen]
    for number, line in zip(integrals.leaders, inverse, strict=True):
        logs[number] = combine([(c, v) for c, v in zip(line, constants, strict=True)])
    fixed = {i: logs[i] for i in integrals.ramified}
    for row in _surplus([row for i, row in enumerate(rows) if i not in chosen], rows, count):
        left = combine([(Fraction(n), logs[i]) for i, n in zip(integrals.leaders, row[:count], strict=True)])
        if not left.agrees(_right_side(integrals, row, fixed, working)):
            raise InternalError(f"p = {p}: the integrals do not satisfy the relation {row}")
    for number in integrals.leaders:
        logs[integrals.partner[number]] = -logs[number]
    return Centres(tuple(logs[i] for i in range(len(integrals.discs))), precision, guard, lattice)


def _ramified_centre(integrals: DiscIntegrals, number: int, precision: int) -> PadicVector:
    """Half the integral from the conjugate of the centre to the centre (0 for odd p: a Weierstrass point)."""
    disc, p = integrals.discs[number], integrals.prime
    # halving may cost a digit, and the integrals are known as far as the parameter
    exponent = precision + 1
    a, b = disc.centre(exponent)
    t = (-2 * b - sum(c * a**i for i, c in enumerate(disc.h))) % p**exponent
    return Fraction(-1, 2) * integrals.to_parameter(number, t, exponent)


def _right_side(
    integrals: DiscIntegrals, row: Sequence[int], fixed: dict[int, PadicVector], precision: int
) -> PadicVector:
    """What sum n_i Log(centre i) over the leaders must be."""
    p = integrals.prime
    contacts = contact_orders(integrals, row)
    nothing = Scheme.empty(p)
    section = find_section(integrals.discs, contacts, nothing, p, integrals.genus)
    terms = [(Fraction(-1), integrals.over_zeros(section, nothing, precision))]
    terms += [(Fraction(-1), fixed[i]) for i in integrals.ramified if i in contacts]
    return combine(terms)


def _surplus(unused: list[list[int]], rows: list[list[int]], count: int) -> list[list[int]]:
    """Relations to check: those not used, then the shortest sums of two short ones."""
    rows = sorted(rows, key=lambda row: (max(map(abs, row)), sum(map(abs, row)), row))[: 2 * SURPLUS]
    sums = [
        [a + s * b for a, b in zip(x, y, strict=True)]
        for i, x in enumerate(rows) for y in rows[: i + 1] for s in (1, -1)
    ]
    sums = [row for row in sums if any(row[:count])]
    sums.sort(key=lambda row: (max(map(abs, row)), sum(map(abs, row)), row))
    return (unused + sums)[:SURPLUS]
