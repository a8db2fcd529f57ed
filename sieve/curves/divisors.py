"""Divisors over the rationals as integer combinations of places."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from fractions import Fraction

Point = tuple[int, int, int]
"""A rational point, weighted coordinates (X : Y : Z), X and Z coprime, the first nonzero of Z, X positive."""


@dataclass(frozen=True, order=True)
class RationalPlace:
    """A rational point."""

    point: Point

    @property
    def degree(self) -> int:
        """Always 1."""
        return 1


@dataclass(frozen=True, order=True)
class MumfordPlace:
    """The effective divisor u(x) = 0, y = w(x) in its Mumford representation.

    Coefficients low degree first; u monic of degree >= 1, deg w < deg u, u divides w^2 + h w - f.  It need
    not be irreducible; on a smooth curve its degree is deg u.
    """

    u: tuple[Fraction, ...]
    w: tuple[Fraction, ...]

    @property
    def degree(self) -> int:
        """deg u."""
        return len(self.u) - 1


@dataclass(frozen=True, order=True)
class FibrePlace:
    """A sum of `count` whole fibres of the degree-2 map to the line; only its class is used."""

    count: int

    @property
    def degree(self) -> int:
        """Twice the number of fibres."""
        return 2 * self.count


@dataclass(frozen=True, order=True)
class ClosedPlace:
    """All conjugates of the point (x(t) : y(t) : z(t)), t a root of u.

    Coefficients low degree first; u monic and squarefree of degree >= 1, coordinates of degree < deg u;
    different roots give different points.
    """

    u: tuple[Fraction, ...]
    x: tuple[Fraction, ...]
    y: tuple[Fraction, ...]
    z: tuple[Fraction, ...]

    @property
    def degree(self) -> int:
        """deg u."""
        return len(self.u) - 1


Place = RationalPlace | MumfordPlace | ClosedPlace | FibrePlace


@dataclass(frozen=True)
class Divisor:
    """An integer combination of places; `terms` is sorted and has no zero multiplicity.

    >>> p, q = RationalPlace((0, 1, 1)), RationalPlace((1, 1, 0))
    >>> (Divisor.of([(1, p)]) - Divisor.of([(1, q)])).degree
    0
    """

    terms: tuple[tuple[int, Place], ...]

    @staticmethod
    def of(terms: Iterable[tuple[int, Place]]) -> Divisor:
        """Collect equal places; order the terms."""
        total: dict[Place, int] = {}
        for multiplicity, place in terms:
            total[place] = total.get(place, 0) + multiplicity
        kept = [(m, place) for place, m in total.items() if m]
        kept.sort(key=lambda term: (type(term[1]).__name__, term[1]))
        return Divisor(tuple(kept))

    @property
    def degree(self) -> int:
        """The sum of multiplicity times degree."""
        return sum(m * place.degree for m, place in self.terms)

    def __add__(self, other: Divisor) -> Divisor:
        return Divisor.of(self.terms + other.terms)

    def __neg__(self) -> Divisor:
        return Divisor(tuple((-m, place) for m, place in self.terms))

    def __sub__(self, other: Divisor) -> Divisor:
        return self + (-other)

    def __rmul__(self, factor: int) -> Divisor:
        return Divisor.of((factor * m, place) for m, place in self.terms)
