"""Abelian logarithms at a prime p of good reduction: of points, of p-adic points, of divisors over Q.

Log(P) is half the vector of integrals of x^j dx/(2y+h), j = 0..g-1, from the conjugate of P to P; Log is
additive, 0 on fibres and on zeros of sections, and on divisors of degree 0 it is the abelian logarithm of
their class. How the values are found and why all digits hold: `sieve.local.centres`, `disc_integrals` and
`closed_points`.
"""

from __future__ import annotations

from fractions import Fraction

from sieve.curves.discs import ResidueDisc
from sieve.curves.divisors import Divisor, FibrePlace, MumfordPlace, Place, Point, RationalPlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.errors import InternalError, PrecisionLost
from sieve.exact.padic_linear import PadicVector, combine
from sieve.exact.padic_number import PadicNumber
from sieve.local.centres import centre_logarithms
from sieve.local.closed_points import scheme_logarithm
from sieve.local.disc_integrals import DiscIntegrals
from sieve.local.picard import PicardGroup, picard_group


class PadicIntegrals:
    """The logarithm of a curve at p.

    Arguments: `curve`, of good reduction at the prime `prime` (2 and 3 included); `digits` >= 1, the absolute
    precision wanted; `group`, the certified Picard group of the reduction, computed when absent.
    Raises `BadReduction`, `Uncertified` (from the group).

    Precision: Log of every point and of every divisor over Q is known modulo p^digits or better, of a p-adic
    point given modulo p^n modulo p^min(n, digits) or better.  Attributes: `prime`, `genus`, `digits`,
    `group`.

    >>> curve = HyperellipticCurve([1, -4, 2, -2, 1, 2, 1])
    >>> integrals = PadicIntegrals(curve, 7, 5)
    >>> a, b, c = (integrals.log_point(P) for P in ((0, -1, 1), (1, 1, 0), (0, 1, 1)))
    >>> d = integrals.log_point((1, -1, 0))
    >>> (c - b).agrees(-1 * (a - b) + (d - b))  # (0 : 1 : 1) = - D1 + D2
    True
    """

    def __init__(
        self, curve: HyperellipticCurve, prime: int, digits: int, group: PicardGroup | None = None
    ) -> None:
        if digits < 1:
            raise InternalError(f"{digits} digits of integrals were asked for")
        self.curve, self.prime, self.digits, self.genus = curve, prime, digits, curve.genus
        self.group = picard_group(curve.modulo(prime)) if group is None else group
        self._inside = DiscIntegrals(curve, self.group.curve)
        self._centres = centre_logarithms(self._inside, self.group, digits)
        self._places: dict[Place, PadicVector] = {}

    # ---- discs and parameters ---------------------------------------------------------------------------

    @property
    def discs(self) -> list[ResidueDisc]:
        """The residue discs, by number."""
        return self._inside.discs

    def disc_of(self, point: Point) -> int:
        """The number of the residue disc of a rational point (weighted integer coordinates)."""
        return self.group.curve.index_of(*point)

    def centre(self, disc: int, exponent: int | None = None) -> tuple[int, int, int]:
        """The weighted coordinates (X : Y : Z) of a centre modulo p^exponent (default: `digits`)."""
        return self.point_at(disc, 0, exponent)

    def point_at(self, disc: int, t: int, exponent: int | None = None) -> tuple[int, int, int]:
        """The weighted coordinates of the point with parameter t, p | t, modulo p^exponent (or `digits`)."""
        chart = self.discs[disc]
        if t % self.prime:
            raise InternalError(f"the parameter {t} is outside the disc")
        return chart.weighted(*chart.coordinates(t, self.digits if exponent is None else exponent))

    def parameter_of_point(self, point: Point, exponent: int | None = None) -> tuple[int, int]:
        """(t, n): the parameter modulo p^n of a rational point, n = exponent (default: `digits`)."""
        n = self.digits if exponent is None else exponent
        chart = self.discs[self.disc_of(point)]
        x, y, z = point
        modulus = self.prime**n
        scale = pow(x if chart.at_infinity else z, -1, modulus)
        a = (z if chart.at_infinity else x) * scale % modulus
        b = y * pow(scale, self.genus + 1, modulus) % modulus
        return chart.parameter(a, b, n), n

    def parameter_of_padic(self, x: PadicNumber, y: PadicNumber, z: PadicNumber) -> tuple[int, int, int]:
        """(disc, t, n): the disc and the parameter modulo p^n of a p-adic point in weighted coordinates.

        The coordinates may have any common scale.  Raises `ValueError` when they are on no point of the
        curve, `PrecisionLost` when not even the disc is known.
        """
        p, power = self.prime, self.genus + 1
        if min(x.valuation, z.valuation) >= min(x.precision, z.precision):
            raise PrecisionLost(p, 0, 1, "a point with X and Z unknown")
        at_infinity = x.valuation < z.valuation
        scale = (x if at_infinity else z).inverse()
        a, b = (z if at_infinity else x) * scale, y * scale**power
        if not b.is_integral and not b.is_zero:
            raise ValueError("not on the curve: the y-coordinate has a pole")
        if a.precision < 1 or b.precision < 1:
            raise PrecisionLost(p, min(a.precision, b.precision), 1, "a point whose residue disc is unknown")
        n = min(a.precision, b.precision)
        modulus = p**n
        ai, bi = a.residue(n), b.residue(n)
        f, h = [*self.curve.f], [*self.curve.h]
        f += [0] * (2 * power + 1 - len(f))
        h += [0] * (power + 1 - len(h))
        if at_infinity:
            f, h = f[::-1], h[::-1]
        hi, fi = (sum(c * pow(ai, i, modulus) for i, c in enumerate(form)) for form in (h, f))
        if (bi * bi + bi * hi - fi) % modulus:
            raise ValueError(f"not on the curve modulo {p}^{n}")
        disc = self.group.curve.index_of(*((1, bi, 0) if at_infinity else (ai, bi, 1)))
        chart = self.discs[disc]
        # the parameter is one of the two coordinates, and may be known better than the other
        known = b.precision if chart.ramified else a.precision
        coordinate = (b if chart.ramified else a).residue(known)
        return disc, chart.parameter(coordinate, coordinate, known), known

    # ---- logarithms -------------------------------------------------------------------------------------

    def log_parameter(self, disc: int, t: int, precision: int) -> PadicVector:
        """Log of the point with parameter t modulo p^precision; t = 0, precision 1: any point of the disc."""
        if precision < 1:
            raise PrecisionLost(self.prime, precision, 1, "the parameter of a point")
        known = min(precision, self._centres.precision)
        inside = self._inside.to_parameter(disc, t, known)
        return self._centres.logs[disc] + inside

    def log_point(self, point: Point) -> PadicVector:
        """Log of a rational point of the curve, given by weighted integer coordinates."""
        t, known = self.parameter_of_point(point, self._centres.precision)
        return self.log_parameter(self.disc_of(point), t, known)

    def log_place(self, place: Place) -> PadicVector:
        """Log of a place over Q; raises `BadReduction` when its equations are not integral at p."""
        known = self._places.get(place)
        if known is None:
            if isinstance(place, RationalPlace):
                known = self.log_point(place.point)
            elif isinstance(place, MumfordPlace):
                known = scheme_logarithm(self._inside, self._centres, self.group, place)
            else:
                known = PadicVector.zero(self.prime, self.genus, self._centres.precision)
            self._places[place] = known
        return known

    def log_divisor(self, divisor: Divisor) -> PadicVector:
        """Log of a divisor over Q, of any degree (see the module text for what it means in degree not 0)."""
        terms = [
            (Fraction(m), self.log_place(place))
            for m, place in divisor.terms
            if not isinstance(place, FibrePlace)
        ]
        if not terms:
            return PadicVector.zero(self.prime, self.genus, self._centres.precision)
        return combine(terms)
