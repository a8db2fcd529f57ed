"""Evidence for the logarithms at a Chabauty prime: sections whose zeros lie in residue discs of F_p-points.

For each disc that is needed a combination of sections that leaves n times the logarithm of its centre; for
each closed place a section through it whose other zeros avoid the discs that it meets.  How the logarithms
follow: `sieve.local.centres`.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from math import lcm
from typing import Any

from sieve.curves.divisors import Divisor, FibrePlace, Place
from sieve.curves.protocol import Curve
from sieve.errors import BadReduction, InternalError, Uncertified
from sieve.exact.padic_number import valuation
from sieve.exact.series import floor_log
from sieve.local.centres import relation_basis
from sieve.local.disc_integrals import DiscIntegrals
from sieve.local.effective import EffectiveRelations, Vector
from sieve.local.picard import PicardGroup
from sieve.local.supported_sections import (
    SupportedSection,
    coordinates_of,
    find_section,
    relation_lattice,
    scheme_of,
)


class Inexpressible(Exception):
    """The proof log has no words for something the engine can do; the message says what."""


@dataclass(frozen=True)
class Combination:
    """n Log(centre of `disc`) from sections: pairs (contact orders at all discs, coefficient)."""

    disc: int
    multiple: int
    terms: tuple[tuple[Vector, int], ...]


class PadicEvidence:
    """What a `padic` record says at one prime.

    Arguments: the curve; the certified group at p; the different closed places of the statement, in order.
    Raises `Inexpressible` when a place cannot be treated the way the log does it.
    """

    def __init__(self, curve: Curve, group: PicardGroup, places: Sequence[Place]) -> None:
        self.curve, self.group, self.prime = curve, group, group.prime
        self.inside = DiscIntegrals(curve, group.curve)
        self.basis = relation_basis(self.inside, group)
        self.places = list(places)
        self.through = [self._section_through(place) for place in self.places]

    # ---- discs --------------------------------------------------------------------------------------------

    def combination(self, disc: int) -> Combination:
        """Sections whose zeros, counted with the coefficients, are n times one point."""
        relations, orbit = self.basis.relations, self.group.curve.orbit
        head = next(k for k, i in enumerate(relations.heads) if orbit[i] == orbit[disc])
        line = self.basis.inverse[head]
        multiple = lcm(1, *(c.denominator for c in line))
        sign = 1 if relations.heads[head] == disc else -1
        terms: dict[Vector, int] = {}
        for i, c in zip(self.basis.chosen, line, strict=True):
            if c:
                terms[self.basis.rows[i]] = sign * int(multiple * c)
        # what is left are whole fibres
        for number in range(len(self.inside.discs)):
            if number not in relations.heads:
                fibre = next(u for u in relations.units if u[number])
                left = self._total(terms, number) - multiple * (number == disc)
                if left:
                    terms[fibre] = terms.get(fibre, 0) - left
        for number in range(len(self.inside.discs)):
            if self._total(terms, number) != multiple * (number == disc):
                raise InternalError(f"p = {self.prime}: no combination for the disc {disc}")
        return Combination(disc, multiple, tuple((v, k) for v, k in sorted(terms.items()) if k))

    def _total(self, terms: dict[Vector, int], number: int) -> int:
        return sum(k * vector[number] for vector, k in terms.items())

    def discs_of(self, divisors: Iterable[Divisor]) -> set[int]:
        """The discs that the points and the reductions of the closed places of divisors meet."""
        out: set[int] = set()
        for divisor in divisors:
            for _, place in divisor.terms:
                if not isinstance(place, FibrePlace):
                    out |= {i for i, _ in self.group.curve.reduce(place).points}
        return out

    # ---- places -------------------------------------------------------------------------------------------

    def _section_through(self, place: Place) -> SupportedSection:
        p, degree, model = self.prime, place.degree, self.inside.model
        try:
            if any(c.denominator % p == 0 for part in coordinates_of(place) for c in part):
                raise BadReduction(p, "a denominator of a divisor vanishes there")
            local = self.group.curve.reduce(place)
            extra = [degree, *self.group.log(local)]
        except (BadReduction, Uncertified) as error:
            raise Inexpressible(
                f"a generator whose reduction modulo {p} is not simple ({error.reason})"
            ) from None
        own = {i for i, _ in local.points}
        if len(own) == len(self.inside.discs):
            raise Inexpressible(f"a closed point that meets every residue disc modulo {p}")
        relations = EffectiveRelations(
            self.inside.discs, model, self.group, self.basis.relations.units, own
        )
        first = relation_lattice(self.group, relations.heads, extra)[0]
        if first[0] != 1:
            raise Inexpressible(
                f"a closed point that only a multiple of which is equivalent to points modulo {p}"
            )
        scheme = scheme_of(place, p)
        try:
            vector = relations.effective(
                relations.lattice.reduce(first[1:]), (degree - 1) * model.unit_degree - degree
            )
        except Uncertified as error:
            raise Inexpressible(f"a closed point without a section modulo {p} ({error.reason})") from None
        multiple = (sum(vector) + degree) // model.unit_degree
        if not scheme.independent(model.monomials(multiple, p), p):
            raise Inexpressible(f"a closed point whose conjugates become equal modulo {p}")
        return find_section(self.inside.discs, model, vector, scheme)

    # ---- the record ---------------------------------------------------------------------------------------

    def record(self, discs: Iterable[int], digits: int, reduction: bool) -> dict[str, Any]:
        """The record for these discs and the places, for logarithms modulo p^digits."""
        p = self.prime
        wanted = {int(i) for i in discs} | {i for section in self.through for i, _ in section.contacts}
        found = [self.combination(i) for i in sorted(wanted)]
        vectors = sorted({vector for c in found for vector, _ in c.terms})
        position = {vector: k for k, vector in enumerate(vectors)}
        sections = [find_section(self.inside.discs, self.inside.model, vector) for vector in vectors]
        zeros = max([1, *(order for s in [*sections, *self.through] for _, order in s.contacts)])
        loss = max((valuation(c.multiple, p) for c in found), default=0)
        working, terms = 0, 1
        while True:
            target = digits + loss + floor_log(terms, p)
            if target <= working:
                break
            working = target
            terms = zeros * working + 1
        return {
            "kind": "padic",
            "prime": p,
            "digits": working,
            "terms": terms,
            "sections": [_written(section.multiple, section.rows) for section in sections],
            "discs": [
                [c.disc, c.multiple, [[position[vector], k] for vector, k in c.terms]] for c in found
            ],
            "places": [
                [k, _written(section.multiple, section.through(scheme_of(place, p**working), p))]
                for k, (place, section) in enumerate(zip(self.places, self.through, strict=True))
            ],
            "reduction": reduction,
        }


def _written(multiple: int, rows: Sequence[Sequence[int]]) -> list[Any]:
    """[n, row0, row1, ..] without trailing zeros and empty rows at the end."""
    out = []
    for row in rows:
        kept = [int(c) for c in row]
        while kept and kept[-1] == 0:
            kept.pop()
        out.append(kept)
    while out and not out[-1]:
        out.pop()
    return [multiple, *out]
