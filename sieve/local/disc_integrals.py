"""Integrals of the regular differentials inside residue discs, to points and summed over zeros of sections.

Why every digit that is returned holds: see `sieve.exact.series` for sums over roots.  A parameter known
modulo p^n, n >= 1, gives integrals modulo p^n: between t and t + d, v(d) >= n, the integral is the sum of d^j
c_{j-1}(t) / j with Taylor coefficients c_{j-1}(t) in Z_p, and j n - v_p(j) >= n because v_p(j) <= j - 1.
"""

from __future__ import annotations

from collections.abc import Sequence

from sieve.curves.discs import ResidueDisc
from sieve.curves.protocol import Curve, ReducedCurve
from sieve.errors import InternalError
from sieve.exact.padic_linear import PadicVector, integer_combination
from sieve.exact.series import (
    characteristic,
    coefficients,
    distinguished_polynomial,
    floor_log,
    integral_length,
    integral_terms,
    inverse_modulo,
    power_sums,
)
from sieve.local.supported_sections import Scheme, SupportedSection, model_of


class DiscIntegrals:
    """The residue discs of a curve at a prime of good reduction, with integrals inside them.

    Arguments: `curve`; `reduced`, its reduction, whose numbering of points is that of the discs.

    >>> from sieve.curves.hyperelliptic import HyperellipticCurve
    >>> curve = HyperellipticCurve([1, -4, 2, -2, 1, 2, 1])
    >>> integrals = DiscIntegrals(curve, curve.modulo(7))
    >>> integrals.to_parameter(0, 7, 3).numerators
    (28, 98)
    """

    def __init__(self, curve: Curve, reduced: ReducedCurve) -> None:
        self.curve, self.reduced, self.prime, self.genus = curve, reduced, reduced.prime, curve.genus
        self.model = model_of(curve)
        self.discs = [
            ResidueDisc(self.model.rows, self.model.weight, self.model.degree, reduced.prime, point, number)
            for number, point in enumerate(reduced.points)
        ]

    def working(self, roots: int, precision: int) -> tuple[int, int]:
        """(length, exponent) for sums over `roots` zeros modulo p^precision: terms, working precision."""
        length = integral_length(self.prime, roots, precision)
        return length, precision + floor_log(max(1, length), self.prime)

    def to_parameter(self, number: int, t: int, precision: int) -> PadicVector:
        """The integrals from the centre of a disc to the parameter t (p | t), modulo p^precision."""
        return self.over_roots(number, [-t, 1], precision)

    def over_roots(self, number: int, monic: Sequence[int], precision: int) -> PadicVector:
        """The integrals from the centre of a disc summed over the roots of a distinguished polynomial.

        Arguments: coefficients low degree first, known modulo p^exponent, see `working`; precision >= 1.
        Returns the sum modulo p^precision; it need not be integral when there are p roots or more.
        """
        roots = len(monic) - 1
        if not any(monic[:-1]):
            return PadicVector.zero(self.prime, self.genus, precision)
        if any(c % self.prime for c in monic[:-1]):
            raise InternalError("integrals over points outside the disc")
        length, exponent = self.working(roots, precision)
        if length == 0:
            return PadicVector.zero(self.prime, self.genus, precision)
        modulus, shift = self.prime**exponent, exponent - precision
        sums = power_sums(monic, length, modulus)
        values = []
        for form in self.discs[number].expansion(exponent, length).forms:
            terms = integral_terms(form, length, self.prime, exponent, shift)
            values.append(sum(a * b for a, b in zip(terms, sums, strict=True)) % modulus)
        return PadicVector.of(self.prime, values, shift, precision)

    def over_zeros(
        self, section: SupportedSection, precision: int, scheme: Scheme | None = None
    ) -> PadicVector:
        """The integrals from the centres summed over the zeros of a section lifted to Z_p.

        Zeros in discs only; with a `scheme` over Z/p^N, N >= `working(largest contact order, precision)`, the
        lift vanishes on it, and its own zeros are left out.
        """
        parts = [PadicVector.zero(self.prime, self.genus, precision)]
        rows = section.rows if scheme is None else section.through(scheme, self.prime)
        for number, order in section.contacts:
            _, exponent = self.working(order, precision)
            series = self.discs[number].restrict(rows, section.multiple, exponent, order * exponent + 1)
            monic = distinguished_polynomial(series, self.prime, exponent)
            if monic.degree() != order:
                raise InternalError(f"{monic.degree()} zeros in a disc where {order} were prescribed")
            parts.append(self.over_roots(number, coefficients(monic, order + 1), precision))
        return integer_combination([1] * len(parts), parts)

    def over_scheme(self, number: int, scheme: Scheme, precision: int) -> PadicVector:
        """The integrals from the centre of a disc summed over a scheme all of whose points lie in it.

        The scheme modulo p^exponent or better, see `working` for as many roots as its degree.
        """
        disc, degree = self.discs[number], scheme.degree
        _, exponent = self.working(degree, precision)
        modulus = self.prime**exponent
        scheme = scheme.reduced(modulus)
        pivot = {"z": scheme.z, "x": scheme.x, "y": scheme.y}[disc.chart]
        first = scheme.z if disc.chart == "x" else scheme.x
        second, weight = (scheme.z, 1) if disc.chart == "y" else (scheme.y, self.model.weight)
        inverse = inverse_modulo(pivot, scheme.u, self.prime, exponent)
        a0, b0 = disc.centre(exponent)
        if disc.ramified:
            value = second
            for _ in range(weight):
                value = value * inverse % scheme.u
            value = value - b0
        else:
            value = first * inverse % scheme.u - a0
        return self.over_roots(number, characteristic(value, scheme.u), precision)
