"""Logarithms of the centres of residue discs at a prime p of good reduction.

Log(D) is the vector of integrals of the regular differentials over D - (deg D / deg U) U, so Log(U) = 0; on
divisors of degree 0 it is the abelian logarithm of the class, and on the zeros of every section it is 0.

Let H be a section over Z_p whose zeros modulo p are F_p-points, m_c of them in the disc c.  Then sum_c (m_c
Log(centre c) + S_c) = 0, S_c the integrals from the centre summed over the zeros in the disc; no zero needs
to be rational or simple, so any lift of a section modulo p will do.  The vectors (m_c) span the lattice of
relations between F_p-points in Pic modulo U, and a basis of it determines all Log(centre c).  Conjugate
points of a curve with an involution have conjugate centres, whose fibre is a section: their logarithms are
opposite.

Precision: the basis is solved by its exact inverse, whose denominators divide the exponent of Z^n modulo the
lattice, a subgroup of Pic modulo U.  So the loss is known before any series is computed, and at most v_p of
that exponent.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from math import isqrt, lcm

from sieve.errors import InternalError
from sieve.exact.padic_linear import PadicVector, independent_rows, integer_combination, rational_inverse
from sieve.exact.padic_number import valuation
from sieve.local.disc_integrals import DiscIntegrals
from sieve.local.effective import EffectiveRelations, Vector, unit_vectors
from sieve.local.picard import PicardGroup
from sieve.local.supported_sections import find_section

SURPLUS = 4
"""How many equations more than unknowns are computed and checked, where there are unknowns."""


@dataclass(frozen=True)
class Centres:
    """The logarithms of all centres, in the numbering of discs, each modulo p^`precision` at least.

    `guard`: v_p of the index in Pic modulo U of the subgroup that F_p-points generate; a p-power multiple of
    a divisor over F_p by at most that is equivalent to a combination of them.
    """

    logs: tuple[PadicVector, ...]
    precision: int
    guard: int
    relations: EffectiveRelations


@dataclass(frozen=True)
class Basis:
    """Effective relations whose folded rows are invertible over Q, and span all relations over Z_p.

    `inverse`: n Log(head i) is minus the combination of the S of the sections with row i.
    """

    relations: EffectiveRelations
    rows: tuple[Vector, ...]
    chosen: tuple[int, ...]
    inverse: tuple[tuple[Fraction, ...], ...]

    @cached_property
    def scaled(self) -> list[tuple[int, list[int]]]:
        """For every row of the inverse its common denominator and its numerators."""
        out = []
        for line in self.inverse:
            multiple = lcm(1, *(c.denominator for c in line))
            out.append((multiple, [c.numerator * (multiple // c.denominator) for c in line]))
        return out


def relation_basis(integrals: DiscIntegrals, group: PicardGroup) -> Basis:
    """A basis of the relations between all discs."""
    discs, model = integrals.discs, integrals.model
    relations = EffectiveRelations(discs, model, group, unit_vectors(discs, model))
    rows = [row for row in relations.rows() if any(relations.fold(row))]
    folded = [relations.fold(row) for row in rows]
    chosen = independent_rows(folded, integrals.prime, len(relations.heads))
    inverse = rational_inverse([folded[i] for i in chosen])
    return Basis(relations, tuple(rows), tuple(chosen), tuple(tuple(line) for line in inverse))


def centre_logarithms(integrals: DiscIntegrals, group: PicardGroup, digits: int) -> Centres:
    """The logarithms of all centres, known modulo p^(digits + guard) or better.

    Arguments: `group`, the certified Picard group of the reduction; `digits` >= 1.
    Raises `InternalError` when a surplus equation fails.
    """
    p = integrals.prime
    basis = relation_basis(integrals, group)
    relations = basis.relations
    # d[-1] is the determinant of the Gram matrix, the square of the index in Z^n
    whole = integrals.model.unit_degree * group.order
    guard = valuation(whole, p) - valuation(isqrt(relations.lattice.d[-1]), p)
    loss = max((-valuation(c, p) for line in basis.inverse for c in line if c), default=0)
    precision = digits + guard
    working = precision + max(0, loss)
    constants = [_right_side(integrals, basis.rows[i], working) for i in basis.chosen]
    heads = [integer_combination(line, constants, multiple) for multiple, line in basis.scaled]
    for vector in _surplus(basis):
        total = integer_combination(relations.fold(vector), heads)
        if not total.agrees(_right_side(integrals, vector, working)):
            raise InternalError(f"p = {p}: the integrals do not satisfy the relation {vector}")
    by_orbit = {int(group.curve.orbit[i]): (i, log) for i, log in zip(relations.heads, heads, strict=True)}
    logs = []
    for number in range(len(integrals.discs)):
        head, log = by_orbit[int(group.curve.orbit[number])]
        logs.append(log if number == head else -log)
    return Centres(tuple(logs), precision, guard, relations)


def _right_side(integrals: DiscIntegrals, vector: Vector, precision: int) -> PadicVector:
    """What sum m_c Log(centre c) must be for an effective relation."""
    section = find_section(integrals.discs, integrals.model, vector)
    return -integrals.over_zeros(section, precision)


def _surplus(basis: Basis) -> list[Vector]:
    """Relations to check that depend, together, on as many equations as possible.

    Candidates: those not used, and the shortest sums of two short ones.
    """
    relations = basis.relations
    unused = [row for i, row in enumerate(basis.rows) if i not in basis.chosen][: 2 * SURPLUS]
    short = sorted(relations.relations, key=lambda row: (max(map(abs, row)), sum(map(abs, row)), row))
    sums = [
        [a + s * b for a, b in zip(x, y, strict=True)]
        for i, x in enumerate(short[: 2 * SURPLUS]) for y in short[: i + 1] for s in (1, -1)
    ]
    sums.sort(key=lambda row: (max(map(abs, row)), sum(map(abs, row)), row))
    more = [relations.effective(row) for row in sums[: 4 * SURPLUS]]
    options = {row: _used(basis, relations.fold(row)) for row in [*unused, *more] if any(relations.fold(row))}
    chosen: list[Vector] = []
    missing = set(range(len(basis.chosen)))
    while options and len(chosen) < SURPLUS:
        best = max(options, key=lambda row: len(options[row] & missing))
        missing -= options.pop(best)
        chosen.append(best)
    return chosen


def _used(basis: Basis, folded: Vector) -> set[int]:
    """The equations of the basis that occur in an expression of a relation."""
    common = lcm(*(multiple for multiple, _ in basis.scaled))
    total = [0] * len(basis.chosen)
    for n, (multiple, line) in zip(folded, basis.scaled, strict=True):
        if n:
            factor = n * (common // multiple)
            total = [a + factor * b for a, b in zip(total, line, strict=True)]
    return {i for i, c in enumerate(total) if c}
