"""Residue discs of y^2 + h(x) y = f(x) at a prime p of good reduction: centres, parameters, expansions.

The points of X(Q_p) with a given reduction form a disc, and a local parameter t maps it one-to-one to p Z_p.
Affine discs use (a, b) = (x, y), discs at infinity (a, b) = (1/x, y/x^(g+1)); either way b^2 + h(a) b = f(a),
with reversed coefficients at infinity.  Where 2 b + h(a) is a unit, t = a - a0; elsewhere the derivative by a
is a unit (the reduction is smooth) and t = b - b0; these discs, which the involution maps to themselves, are
called ramified.

Centres: a0 in 0..p-1 in the first case, so that the involution maps centres to centres; the Weierstrass point
in ramified discs for odd p; b0 in {0, 1} in ramified discs for p = 2.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from flint import fmpz_mod_poly

from sieve.errors import InternalError
from sieve.exact.series import evaluate_at, polynomial


@dataclass(frozen=True)
class Expansion:
    """Coordinates and differentials of a disc as series modulo (p^exponent, t^length).

    `a`, `b`: chart coordinates.  `forms[j]`: the series c(t) with x^j dx / (2y + h) = c(t) dt, j = 0..g-1.
    """

    exponent: int
    length: int
    a: fmpz_mod_poly
    b: fmpz_mod_poly
    forms: tuple[fmpz_mod_poly, ...]


def _value(coefficients: Sequence[int], x: int, modulus: int) -> int:
    value = 0
    for c in reversed(coefficients):
        value = (value * x + c) % modulus
    return value


def _derivative(coefficients: Sequence[int]) -> list[int]:
    return [k * c for k, c in enumerate(coefficients)][1:]


class ResidueDisc:
    """One residue disc.

    Arguments: `f`, `h` integer coefficients of the model, low degree first; `genus`; `prime`, of good
    reduction; `point`, the reduction in weighted coordinates, (x, y, 1) or (1, s, 0), entries in 0..p-1;
    `number`, its number.

    >>> disc = ResidueDisc([1, 0, 0, 0, 0, 1], [], 2, 7, (0, 6, 1), 0)
    >>> disc.centre(3), disc.ramified, disc.at_infinity
    ((0, 342), False, False)
    """

    def __init__(
        self,
        f: Sequence[int],
        h: Sequence[int],
        genus: int,
        prime: int,
        point: tuple[int, int, int],
        number: int,
    ) -> None:
        self.genus, self.prime, self.point, self.number = genus, prime, point, number
        full_f = list(f) + [0] * (2 * genus + 3 - len(f))
        full_h = list(h) + [0] * (genus + 2 - len(h))
        self.at_infinity = point[2] == 0
        self.f = full_f[::-1] if self.at_infinity else full_f
        self.h = full_h[::-1] if self.at_infinity else full_h
        self.residue = (0, point[1]) if self.at_infinity else (point[0], point[1])
        a, b = self.residue
        if self.equation(a, b, prime):
            raise InternalError(f"{point} is not a point modulo {prime}")
        self.ramified = (2 * b + _value(self.h, a, prime)) % prime == 0
        self._expansions: dict[int, Expansion] = {}

    def equation(self, a: int, b: int, modulus: int) -> int:
        """b^2 + h(a) b - f(a) in this chart."""
        return (b * b + _value(self.h, a, modulus) * b - _value(self.f, a, modulus)) % modulus

    def centre(self, exponent: int) -> tuple[int, int]:
        """The chart coordinates (a0, b0) of the centre modulo p^exponent, one point for all exponents."""
        p, modulus = self.prime, self.prime**exponent
        a, b = self.residue
        if not self.ramified:
            return a, self._solve_b(a, b, modulus)
        dh = _derivative(self.h)
        if p == 2:
            df = _derivative(self.f)
            for _ in range(exponent.bit_length() + 1):
                slope = _value(dh, a, modulus) * b - _value(df, a, modulus)
                a = (a - self.equation(a, b, modulus) * pow(slope, -1, modulus)) % modulus
            return a, b
        # the branch polynomial 4 f + h^2 has a simple root here
        square = [4 * c for c in self.f]
        for i, c in enumerate(self.h):
            for j, d in enumerate(self.h):
                square[i + j] += c * d
        slope_of = _derivative(square)
        for _ in range(exponent.bit_length() + 1):
            a = (a - _value(square, a, modulus) * pow(_value(slope_of, a, modulus), -1, modulus)) % modulus
        return a, -_value(self.h, a, modulus) * pow(2, -1, modulus) % modulus

    def _solve_b(self, a: int, b: int, modulus: int) -> int:
        ha, fa = _value(self.h, a, modulus), _value(self.f, a, modulus)
        for _ in range(modulus.bit_length().bit_length() + 1):
            b = (b - (b * b + ha * b - fa) * pow(2 * b + ha, -1, modulus)) % modulus
        return b

    def coordinates(self, t: int, exponent: int) -> tuple[int, int]:
        """The chart coordinates modulo p^exponent of the point with parameter t, p | t."""
        modulus = self.prime**exponent
        a0, b0 = self.centre(exponent)
        if not self.ramified:
            a = (a0 + t) % modulus
            return a, self._solve_b(a, b0, modulus)
        a, b = a0, (b0 + t) % modulus
        df, dh = _derivative(self.f), _derivative(self.h)
        for _ in range(exponent.bit_length() + 1):
            slope = _value(dh, a, modulus) * b - _value(df, a, modulus)
            a = (a - self.equation(a, b, modulus) * pow(slope, -1, modulus)) % modulus
        return a, b

    def parameter(self, a: int, b: int, exponent: int) -> int:
        """The parameter modulo p^exponent of a point given by its chart coordinates to that precision."""
        a0, b0 = self.centre(exponent)
        return (b - b0 if self.ramified else a - a0) % self.prime**exponent

    def weighted(self, a: int, b: int) -> tuple[int, int, int]:
        """Chart coordinates as weighted coordinates (X : Y : Z)."""
        return (1, b, a) if self.at_infinity else (a, b, 1)

    def expansion(self, exponent: int, length: int) -> Expansion:
        """The coordinates and differentials modulo (p^exponent, t^length); cached per exponent."""
        known = self._expansions.get(exponent)
        if known is None or known.length < length:
            known = self._expand(exponent, length)
            self._expansions[exponent] = known
        return known

    def _expand(self, exponent: int, length: int) -> Expansion:
        modulus = self.prime**exponent
        a0, b0 = self.centre(exponent)
        df, dh = _derivative(self.f), _derivative(self.h)
        if not self.ramified:
            a, b = polynomial([a0, 1], modulus), polynomial([b0], modulus)
            fa, ha = evaluate_at(self.f, a, length), evaluate_at(self.h, a, length)
            known = 1
            while known < length:
                known = min(2 * known, length)
                slope = (2 * b + ha).truncate(known).inverse_series_trunc(known)
                b = b - (b.mul_low(b + ha, known) - fa.truncate(known)).mul_low(slope, known)
            first = (2 * b + ha).inverse_series_trunc(length)
        else:
            a, b = polynomial([a0], modulus), polynomial([b0, 1], modulus)
            known = 1
            while known < length:
                known = min(2 * known, length)
                slope = evaluate_at(dh, a, known).mul_low(b, known) - evaluate_at(df, a, known)
                value = b.mul_low(b + evaluate_at(self.h, a, known), known) - evaluate_at(self.f, a, known)
                a = a - value.mul_low(slope.inverse_series_trunc(known), known)
            slope = evaluate_at(dh, a, length).mul_low(b, length) - evaluate_at(df, a, length)
            # da / (2 b + h) = - db / (derivative of the equation by a)
            first = -slope.inverse_series_trunc(length)
        forms = [first]
        for _ in range(1, self.genus):
            forms.append(forms[-1].mul_low(a, length))
        if self.at_infinity:
            # x = 1/a, y = b/a^(g+1): x^j dx/(2y+h) = - a^(g-1-j) da/(2b+h)
            forms = [-form for form in reversed(forms)]
        return Expansion(exponent, length, a, b, tuple(forms))

    def restrict(
        self, even: Sequence[int], odd: Sequence[int], multiple: int, exponent: int, length: int
    ) -> fmpz_mod_poly:
        """The section even(x) + odd(x) y of the given multiple of the fibre class as a series on this disc.

        Arguments: coefficients low degree first, deg even <= multiple, deg odd <= multiple - g - 1.  At
        infinity the section is divided by x^multiple.
        """
        series = self.expansion(exponent, length)
        if self.at_infinity:
            even = ([*even, *[0] * (multiple + 1 - len(even))])[::-1]
            width = max(0, multiple - self.genus)
            odd = ([*odd, *[0] * (width - len(odd))])[::-1]
        a, b = series.a.truncate(length), series.b.truncate(length)
        total = evaluate_at(even, a, length)
        if any(odd):
            total = total + evaluate_at(odd, a, length).mul_low(b, length)
        return total.truncate(length)
