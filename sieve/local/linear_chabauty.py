"""Linear Chabauty: a finite p-adic set that contains X(Q), when the rank of J(Q) is below the genus.

For an annihilating differential w (see `annihilators`) and every rational point P the integral of w over
P - B, B the base divisor, is 0.  In a residue disc with parameter t the integral to the point t is a power
series f(t) = c_0 + sum a_{k-1} t^k / k, and for odd p all terms of f(p s) are integral but perhaps c_0, so
that its zeros in Z_p can be counted and found.  Several independent differentials are used together: a
rational point is a common zero.  (Chabauty 1941; Coleman 1985.)
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

from sieve.curves.discs import ResidueDisc
from sieve.curves.divisors import Divisor
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.protocol import Curve
from sieve.curves.search import points_over
from sieve.errors import InternalError, PrecisionLost
from sieve.exact.padic_linear import PadicVector
from sieve.exact.padic_zeros import Ball, common_zeros, zero_count
from sieve.exact.series import coefficients, integral_length
from sieve.local.annihilators import Annihilator, annihilators, exact_annihilators
from sieve.local.chabauty import LocatedCandidate
from sieve.local.logarithms import PadicIntegrals
from sieve.local.picard import PicardGroup, picard_group

EXTRA_DIGITS = 3
"""Digits computed beyond those asked for, at first."""

LARGEST_FACTOR = 4
"""At most about this many times the digits asked for are computed."""


@dataclass(frozen=True)
class DiscZeros:
    """What is proved about one residue disc.

    `disc`, its number; `point`, its reduction in weighted coordinates; `count`, the number of zeros of one
    integral (the one with the fewest) with |t| <= 1/p over the algebraic closure, with multiplicity;
    `balls`, in the parameter t, contain all common zeros in the disc.
    """

    disc: int
    point: tuple[int, int, int]
    count: int
    balls: tuple[Ball, ...]


@dataclass(frozen=True)
class ChabautyZeros:
    """The outcome at one prime: every rational point of X lies in a ball of `discs`, given the rank.

    `digits`, those asked for; `working`, those computed with; `alone`, pairs (disc, value) of balls with
    multiplicity 2 that hold one rational point at most.
    """

    prime: int
    digits: int
    working: int
    annihilators: tuple[Annihilator, ...]
    integrals: PadicIntegrals
    discs: tuple[DiscZeros, ...]
    alone: tuple[tuple[int, int], ...]

    @property
    def count(self) -> int:
        """The number of balls."""
        return sum(len(d.balls) for d in self.discs)

    def candidates(self) -> list[LocatedCandidate]:
        """The balls as candidates z1, z2, .., in the order of discs and values."""
        out: list[LocatedCandidate] = []
        for found in self.discs:
            for ball in found.balls:
                name = f"z{len(out) + 1}"
                alone = 1 if (found.disc, ball.value) in self.alone else None
                out.append(
                    LocatedCandidate(
                        name, "point", found.disc, ball.value, ball.digits,
                        multiplicity=max(1, ball.multiplicity), at_most=alone,
                    )
                )
        return out


def chabauty_zeros(
    curve: Curve,
    base: Divisor,
    generators: Sequence[Divisor],
    prime: int,
    digits: int,
    group: PicardGroup | None = None,
) -> ChabautyZeros:
    """All common zeros of the integrals of the annihilating differentials, each known modulo p^digits.

    Arguments: `base` of degree 1 (or 2: half of it is meant); `generators`, as many divisors of degree 0 as
    the rank of J(Q) at most, fewer than the genus; `prime` odd, of good reduction; `digits` >= 1 of the local
    parameter.  The working precision grows until every zero has its digits; a ball with several zeros is
    given to `digits` digits, or to fewer when even `LARGEST_FACTOR` times as many computed digits do not
    decide it.
    Raises `PrecisionLost` when the logarithms of the generators, or all integrals over some disc, vanish to
    that precision; `BadReduction`, `Uncertified`, `Inconsistent`.
    """
    if prime == 2:
        raise InternalError("linear Chabauty needs an odd prime")
    group = picard_group(curve.modulo(prime)) if group is None else group
    limit = LARGEST_FACTOR * digits + 20
    working = digits + EXTRA_DIGITS
    while True:
        last = working >= limit
        try:
            found = _at_precision(curve, base, generators, prime, digits, working, group)
        except PrecisionLost:
            if last:
                raise
            working = min(limit, 2 * working)
            continue
        missing = max((digits - ball.digits for d in found.discs for ball in d.balls), default=0)
        if missing <= 0 or last:
            return found
        working = min(limit, working + max(missing, working // 2))


def _at_precision(
    curve: Curve, base: Divisor, generators: Sequence[Divisor], prime: int, digits: int,
    working: int, group: PicardGroup,
) -> ChabautyZeros:
    integrals = PadicIntegrals(curve, prime, working, group)
    logs = [integrals.log_divisor(d) for d in generators]
    forms = exact_annihilators(curve, logs, annihilators(logs, prime, curve.genus, working))
    origin = Fraction(1, base.degree) * integrals.log_divisor(base)
    found, alone = [], []
    for disc in integrals.discs:
        constant = integrals.log_parameter(disc.number, 0, working) - origin
        series, precision = _series(disc, forms, constant, working)
        known = [n for n in (zero_count(f, prime, precision) for f in series) if n is not None]
        if not known:
            what = f"the integrals over the disc of {disc.point}"
            raise PrecisionLost(prime, precision, precision + 1, what)
        balls = [
            Ball(prime * b.value, b.digits + 1, b.multiplicity)
            for b in common_zeros(series, prime, precision, max(1, digits - 1))
        ]
        balls = _cut(balls, prime, digits)
        found.append(DiscZeros(disc.number, disc.point, min(known), tuple(balls)))
        alone += [
            (disc.number, b.value) for b in balls if b.multiplicity == 2 and _alone(curve, disc, forms, b)
        ]
    return ChabautyZeros(prime, digits, working, tuple(forms), integrals, tuple(found), tuple(alone))


def _cut(balls: Sequence[Ball], prime: int, digits: int) -> list[Ball]:
    """The balls to at most `digits` digits; those that become one are counted together."""
    total: dict[tuple[int, int], int] = {}
    for ball in balls:
        known = min(digits, ball.digits)
        key = (ball.value % prime**known, known)
        total[key] = total.get(key, 0) + ball.multiplicity
    return [Ball(value, known, total[value, known]) for value, known in sorted(total)]


def _series(
    disc: ResidueDisc, forms: Sequence[Annihilator], constant: PadicVector, working: int
) -> tuple[list[list[int]], int]:
    """The integrals as series in s = t/p, times a power of p, and the precision of all coefficients."""
    p, shift = disc.prime, constant.shift
    # c_0 is known modulo p^precision; the other terms carry at least one factor p more than the forms
    precision = min([constant.precision, *(a.precision - shift for a in forms if not a.exact), working])
    if precision < 1:
        raise PrecisionLost(p, precision, 1, f"the integrals over the disc of {disc.point}")
    length, modulus = integral_length(p, 1, precision), p ** (precision + shift)
    expansion = disc.expansion(precision, max(1, length)).forms
    terms = [coefficients(form, length) for form in expansion]
    out = []
    for a in forms:
        series = [sum(c * n for c, n in zip(a.coefficients, constant.numerators, strict=True)) % modulus]
        for k in range(1, length + 1):
            rest, power = k, p**k
            while rest % p == 0:
                rest, power = rest // p, power // p
            value = sum(c * term[k - 1] for c, term in zip(a.coefficients, terms, strict=True))
            series.append(value * power * p**shift * pow(rest, -1, modulus) % modulus)
        out.append(series)
    return out, precision + shift


def _alone(curve: Curve, disc: ResidueDisc, forms: Sequence[Annihilator], ball: Ball) -> bool:
    """Whether two zeros near the centre are one double zero at a rational point with x = 0 or infinity.

    On a symmetric model x^j dx/(2y+h) is an even or odd function of t there, times dt; when it is odd the
    integral f is even.  f is 0 at the centre if that is a rational point, so the zeros are both there.
    """
    if not isinstance(curve, HyperellipticCurve) or len(forms) != 1 or not forms[0].exact:
        return False
    if disc.ramified or disc.residue[0] or ball.value:
        return False
    j = forms[0].free
    order = curve.genus - 1 - j if disc.at_infinity else j
    if order % 2 == 0:
        return False
    rational = points_over(curve, None if disc.at_infinity else Fraction(0))
    return any(point[1] % disc.prime == disc.residue[1] for point in rational)
