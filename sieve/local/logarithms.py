"""Abelian logarithms at a prime p of good reduction: of points, of p-adic points, of divisors over Q.

Log(D) is the vector of integrals of the regular differentials x^i y^k dx / F_y, in the order of
`sieve.curves.discs`, over D - (deg D / deg U) U.  So Log(U) = 0; Log is additive, 0 on the zeros of every
section, and on divisors of degree 0 it is the abelian logarithm of their class.  For y^2 + h y = f, Log(P) is
half the vector of integrals from the conjugate of P to P.  How the values are found and why all digits hold:
`sieve.local.centres`, `disc_integrals` and `closed_points`.
"""

from __future__ import annotations

from fractions import Fraction

from sieve.curves.discs import ResidueDisc, in_chart, value_at
from sieve.curves.divisors import Divisor, FibrePlace, Place, Point, RationalPlace
from sieve.curves.protocol import Curve
from sieve.errors import InternalError, PrecisionLost
from sieve.exact.padic_linear import PadicVector, combine
from sieve.exact.padic_number import PadicNumber
from sieve.local.centres import centre_logarithms
from sieve.local.closed_points import scheme_logarithm
from sieve.local.disc_integrals import DiscIntegrals
from sieve.local.picard import PicardGroup, picard_group

COORDINATES = {"z": (2, 0, 1), "x": (0, 2, 1), "y": (1, 0, 2)}
"""For every chart: the coordinate that is 1, and those that are a and b, by position in (X, Y, Z)."""


class PadicIntegrals:
    """The logarithm of a curve at p.

    Arguments: `curve`, of good reduction at the prime `prime` (2 and 3 included); `digits` >= 1, the absolute
    precision wanted; `group`, the certified Picard group of the reduction, computed when absent.
    Raises `BadReduction`, `Uncertified` (from the group).

    Precision: Log of every point and of every divisor over Q is known modulo p^digits or better, of a p-adic
    point given modulo p^n modulo p^min(n, digits) or better.  Attributes: `prime`, `genus`, `digits`,
    `group`.

    >>> from sieve.curves.hyperelliptic import HyperellipticCurve
    >>> curve = HyperellipticCurve([1, -4, 2, -2, 1, 2, 1])
    >>> integrals = PadicIntegrals(curve, 7, 5)
    >>> a, b, c = (integrals.log_point(P) for P in ((0, -1, 1), (1, 1, 0), (0, 1, 1)))
    >>> d = integrals.log_point((1, -1, 0))
    >>> (c - b).agrees(-1 * (a - b) + (d - b))  # (0 : 1 : 1) = - D1 + D2
    True
    """

    def __init__(
        self, curve: Curve, prime: int, digits: int, group: PicardGroup | None = None
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
        modulus, weights = self.prime**n, (1, chart.weight, 1)
        pivot, first, second = COORDINATES[chart.chart]
        scale = pow(point[pivot], -1, modulus)
        a, b = (point[i] * pow(scale, weights[i], modulus) % modulus for i in (first, second))
        return chart.parameter(a, b, n), n

    def parameter_of_padic(self, x: PadicNumber, y: PadicNumber, z: PadicNumber) -> tuple[int, int, int]:
        """(disc, t, n): the disc and the parameter modulo p^n of a p-adic point in weighted coordinates.

        The coordinates may have any common scale.  Raises `ValueError` when they are on no point of the
        curve, `PrecisionLost` when not even the disc is known.
        """
        p, model, numbers = self.prime, self._inside.model, (x, y, z)
        pivots = ("z", "x", "y") if model.weight == 1 else ("z", "x")
        known = [numbers[COORDINATES[c][0]] for c in pivots]
        least = min(number.valuation for number in known)
        if least >= min(number.precision for number in known):
            raise PrecisionLost(p, 0, 1, "a point with X and Z unknown")
        name = next(c for c, number in zip(pivots, known, strict=True) if number.valuation == least)
        pivot, first, second = COORDINATES[name]
        scale = numbers[pivot].inverse()
        weights = (1, model.weight, 1)
        a, b = (numbers[i] * scale ** weights[i] for i in (first, second))
        if not b.is_integral and not b.is_zero:
            raise ValueError("not on the curve: the y-coordinate has a pole")
        if a.precision < 1 or b.precision < 1:
            raise PrecisionLost(p, min(a.precision, b.precision), 1, "a point whose residue disc is unknown")
        n = min(a.precision, b.precision)
        rows = in_chart(model.rows, model.weight, model.degree, name)
        if value_at(rows, a.residue(n), b.residue(n), p**n):
            raise ValueError(f"not on the curve modulo {p}^{n}")
        place = [0, 0, 0]
        place[pivot], place[first], place[second] = 1, a.residue(1), b.residue(1)
        disc = self.group.curve.index_of(*place)
        chart = self.discs[disc]
        # the parameter is one of the two coordinates, and may be known better than the other
        digits = b.precision if chart.ramified else a.precision
        coordinate = (b if chart.ramified else a).residue(digits)
        return disc, chart.parameter(coordinate, coordinate, digits), digits

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
            elif isinstance(place, FibrePlace):
                known = PadicVector.zero(self.prime, self.genus, self._centres.precision)
            else:
                known = scheme_logarithm(self._inside, self._centres, self.group, place)
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
