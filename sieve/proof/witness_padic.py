"""Evidence for the logarithms at a Chabauty prime: sections whose zeros lie in residue discs of F_p-points.

For each disc that is needed a combination of sections that leaves n times the logarithm of its centre;
for each divisor in Mumford representation a section through it.  How the logarithms follow:
`sieve.local.centres`.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from itertools import combinations
from math import lcm
from typing import Any

from sieve.curves.divisors import Divisor, MumfordPlace, RationalPlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.errors import BadReduction, Uncertified
from sieve.exact.lattice import ReducedLattice
from sieve.exact.padic_linear import independent_rows, rational_inverse
from sieve.exact.padic_number import valuation
from sieve.exact.series import floor_log, polynomial
from sieve.local.centres import contact_orders
from sieve.local.disc_integrals import DiscIntegrals
from sieve.local.picard import PicardGroup
from sieve.local.supported_sections import Scheme, SupportedSection, find_section, relation_lattice


class Inexpressible(Exception):
    """The proof log has no words for something the engine can do; the message says what."""


@dataclass(frozen=True)
class Combination:
    """n Log(centre of `disc`) from sections: pairs (row of the relation basis, coefficient)."""

    disc: int
    multiple: int
    terms: tuple[tuple[int, int], ...]


class PadicEvidence:
    """What a `padic` record says at one prime.

    Arguments: the curve; the certified group at p; the different Mumford places of the statement, in order.
    Raises `Inexpressible` when a place cannot be treated the way the log does it.
    """

    def __init__(self, curve: HyperellipticCurve, group: PicardGroup, places: Sequence[MumfordPlace]) -> None:
        self.curve, self.group, self.prime = curve, group, group.prime
        self.inside = DiscIntegrals(curve, group.curve)
        self.count = len(self.inside.leaders)
        relations = relation_lattice(group, self.inside.leaders + self.inside.ramified)
        self.lattice = ReducedLattice(relations)
        self.relations = relations
        self.rows = [row for row in relations if any(row[: self.count])]
        self.chosen = independent_rows([row[: self.count] for row in self.rows], self.prime, self.count)
        self.inverse = rational_inverse([self.rows[i][: self.count] for i in self.chosen])
        self.places = list(places)
        self.through = [self._section_through(place) for place in self.places]

    # ---- discs --------------------------------------------------------------------------------------------

    def leader(self, disc: int) -> int:
        """The first disc of a conjugate pair."""
        return min(disc, self.inside.partner[disc])

    def combination(self, leader: int) -> Combination:
        """The combination for a disc that is the first of its pair."""
        line = self.inverse[self.inside.leaders.index(leader)]
        multiple = lcm(1, *(c.denominator for c in line))
        terms = [(i, int(multiple * c)) for i, c in zip(self.chosen, line, strict=True) if c]
        return Combination(leader, multiple, tuple(terms))

    def section(self, row: int) -> SupportedSection:
        """The section that a basis relation stands for."""
        contacts = contact_orders(self.inside, self.rows[row])
        return find_section(
            self.inside.discs, contacts, Scheme.empty(self.prime), self.prime, self.curve.genus
        )

    def discs_of(self, divisors: Iterable[Divisor]) -> set[int]:
        """The discs that the rational points and the reductions of the Mumford places of divisors meet."""
        out: set[int] = set()
        for divisor in divisors:
            for _, place in divisor.terms:
                if isinstance(place, RationalPlace | MumfordPlace):
                    out |= {i for i, _ in self.group.curve.reduce(place).points}
        return out

    # ---- places -------------------------------------------------------------------------------------------

    def _section_through(self, place: MumfordPlace) -> SupportedSection:
        p, degree = self.prime, place.degree
        try:
            local = self.group.curve.reduce(place)
            extra = [degree, *self.group.log(local)]
        except (BadReduction, Uncertified) as error:
            raise Inexpressible(
                f"a generator whose reduction modulo {p} is not simple ({error.reason})"
            ) from None
        own = {i for i, _ in local.points}
        if any(i == self.inside.partner[i] for i in own):
            raise Inexpressible(f"a closed point that meets a ramified residue disc modulo {p}")
        first = relation_lattice(self.group, self.inside.leaders + self.inside.ramified, extra)[0]
        if first[0] != 1:
            raise Inexpressible(
                f"a closed point that only a multiple of which is equivalent to points modulo {p}"
            )
        contacts = self._contacts(first[1:], own)
        if contacts is None:
            raise Inexpressible(f"a closed point that meets every residue disc modulo {p}")
        self._pad(contacts, own, degree - 2)
        return find_section(self.inside.discs, contacts, _scheme(place, p), p, self.curve.genus)

    def _contacts(self, vector: Sequence[int], own: set[int]) -> dict[int, int] | None:
        """Contact orders for a relation modulo the lattice that leaves the discs in `own` alone."""
        start = list(self.lattice.reduce(vector))
        steps = [[0] * len(start)]
        basis = [[s * c for c in row] for row in self.relations for s in (1, -1)]
        steps += basis
        steps += [[a + b for a, b in zip(x, y, strict=True)] for x, y in combinations(basis, 2)]
        options = [[a + b for a, b in zip(start, step, strict=True)] for step in steps]
        options.sort(key=lambda row: (sum(map(abs, row)), row))
        for option in options:
            contacts = contact_orders(self.inside, option)
            if not own.intersection(contacts):
                return contacts
        return None

    def _pad(self, contacts: dict[int, int], own: set[int], least: int) -> None:
        """Add whole fibres until the contact orders have the least sum."""
        partner = self.inside.partner
        everything = [i for i in self.inside.leaders + self.inside.ramified if not own & {i, partner[i]}]
        # the degrees of a lift tell its multiple, unless it vanishes at infinity modulo p
        numbers = [i for i in everything if not self.inside.discs[i].at_infinity] or everything
        step = 0
        while sum(contacts.values()) < least:
            if not numbers:
                raise Inexpressible(f"a closed point that meets every residue disc modulo {self.prime}")
            for i in (numbers[step % len(numbers)], partner[numbers[step % len(numbers)]]):
                contacts[i] = contacts.get(i, 0) + 1
            step += 1

    # ---- the record ---------------------------------------------------------------------------------------

    def record(self, discs: Iterable[int], digits: int, reduction: bool) -> dict[str, Any]:
        """The record for these discs and the places, for logarithms modulo p^digits."""
        p, m = self.prime, 1
        wanted = {self.leader(i) for i in discs}
        for section in self.through:
            wanted |= {self.leader(i) for i, _ in section.contacts}
        wanted -= set(self.inside.ramified)
        found = [self.combination(i) for i in sorted(wanted)]
        rows = sorted({row for c in found for row, _ in c.terms})
        position = {row: k for k, row in enumerate(rows)}
        sections = [self.section(row) for row in rows]
        for section in [*sections, *self.through]:
            m = max([m, *(order for _, order in section.contacts)])
        m = max([m, *(place.degree for place in self.places)])
        loss = max((valuation(c.multiple, p) for c in found), default=0)
        working, terms = 0, 1
        while True:
            # halving at p = 2 may cost a digit as well
            target = digits + loss + floor_log(terms, p) + 1
            if target <= working:
                break
            working = target
            terms = m * working + 1
        empty = Scheme.empty(p)
        return {
            "kind": "padic",
            "prime": p,
            "digits": working,
            "terms": terms,
            "sections": [_pair(section, empty) for section in sections],
            "discs": [[c.disc, c.multiple, [[position[row], k] for row, k in c.terms]] for c in found],
            "mumford": [
                [k, *_pair(section, _scheme(place, p**working))]
                for k, (place, section) in enumerate(zip(self.places, self.through, strict=True))
            ],
            "reduction": reduction,
        }


def _scheme(place: MumfordPlace, modulus: int) -> Scheme:
    u, w = (
        polynomial([c.numerator * pow(c.denominator, -1, modulus) for c in values], modulus)
        for values in (place.u, place.w)
    )
    return Scheme(u, w)


def _pair(section: SupportedSection, scheme: Scheme) -> list[list[int]]:
    return [_trimmed(part) for part in section.through(scheme)]


def _trimmed(values: Sequence[int]) -> list[int]:
    out = [int(c) for c in values]
    while out and out[-1] == 0:
        out.pop()
    return out
