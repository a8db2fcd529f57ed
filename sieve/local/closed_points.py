"""Logarithms at p of divisors u(x) = 0, y = w(x) over Q, through sections that contain them exactly.

The part of the divisor in each disc of an F_p-point is integrated there directly: the power sums of the local
parameter over its points are traces.  What remains, D, reduces to places of higher degree.  In Pic modulo U a
multiple k D is equivalent to a combination of F_p-points; the section modulo p that shows it lifts to a
section that vanishes on k D exactly, and its other zeros lie in discs of F_p-points: k Log(D) is minus the
sum of their logarithms.
"""

from __future__ import annotations

from fractions import Fraction

from sieve.curves.divisors import MumfordPlace
from sieve.curves.hyperelliptic_mod import HigherPlace, LocalDivisor
from sieve.curves.moving import residual_places
from sieve.errors import BadReduction, InternalError, Uncertified
from sieve.exact.padic_linear import PadicVector, combine
from sieve.exact.series import coefficients, lift_factor, polynomial
from sieve.local.centres import Centres, contact_orders
from sieve.local.disc_integrals import DiscIntegrals
from sieve.local.picard import PicardGroup
from sieve.local.supported_sections import Scheme, find_section, relation_lattice

MOVES = 60
"""How many sections are tried to replace a divisor that cannot be used as it is."""


def scheme_logarithm(
    integrals: DiscIntegrals, centres: Centres, group: PicardGroup, place: MumfordPlace
) -> PadicVector:
    """Log of an effective divisor over Q in Mumford representation.

    Known modulo p^(precision of the centres - v_p(k)), k the multiple above; v_p(k) is at most their guard. A
    divisor with denominators at p, or which k > 1 and ramified places forbid, is replaced by the other zeros
    of a section through it.  Raises `BadReduction` or `Uncertified`, from the divisor itself, when that
    fails.
    """
    try:
        return _integral_scheme(integrals, centres, group, place)
    except (BadReduction, Uncertified) as error:
        for _, moved in residual_places(integrals.curve, place, integrals.prime, MOVES):
            try:
                return -_integral_scheme(integrals, centres, group, moved)
            except (BadReduction, Uncertified):
                continue
        raise error


def _integral_scheme(
    integrals: DiscIntegrals, centres: Centres, group: PicardGroup, place: MumfordPlace
) -> PadicVector:
    local = integrals.reduced.reduce(place)
    terms: list[tuple[Fraction, PadicVector]] = []
    p, precision = integrals.prime, centres.precision
    for number, multiplicity in local.points:
        _, exponent = integrals.working(multiplicity, precision)
        whole = _modulo(place, p**exponent)
        x = integrals.discs[number].point[0]
        factor = coefficients(polynomial([-x, 1], p) ** multiplicity, multiplicity + 1)
        u = lift_factor(whole.u, factor, p, exponent)
        terms.append((Fraction(1), integrals.over_scheme(number, u, whole.w % u, precision)))
        terms.append((Fraction(multiplicity), centres.logs[number]))
    if local.places:
        terms.append((Fraction(1), _higher_part(integrals, centres, group, place, local.places)))
    return combine(terms)


def _modulo(place: MumfordPlace, modulus: int) -> Scheme:
    u, w = (
        polynomial([c.numerator * pow(c.denominator, -1, modulus) for c in values], modulus)
        for values in (place.u, place.w)
    )
    return Scheme(u, w)


def _higher_part(
    integrals: DiscIntegrals, centres: Centres, group: PicardGroup, place: MumfordPlace,
    places: tuple[tuple[HigherPlace, int], ...],
) -> PadicVector:
    """Log of the part of the divisor that reduces to places of degree >= 2."""
    p, precision = integrals.prime, centres.precision
    degree = sum((len(q[0]) - 1) * m for q, m in places)
    extra = [degree, *group.log(LocalDivisor(0, (), places))]
    numbers = integrals.leaders + integrals.ramified
    row = relation_lattice(group, numbers, extra)[0]
    k, vector = row[0], centres.lattice.reduce(row[1:])
    factor = polynomial([1], p)
    for q, m in places:
        factor = factor * polynomial(q[0], p) ** m
    if k > 1 and (2 * _modulo(place, p).w + polynomial(integrals.curve.h, p)).gcd(factor).degree() > 0:
        raise BadReduction(p, "a divisor meets a ramified place that rational points do not reach")
    contacts = contact_orders(integrals, vector)
    _pad(integrals, contacts, k * degree - 2)
    _, exponent = integrals.working(max(contacts.values(), default=1), precision)
    whole = _modulo(place, p**exponent)
    u = lift_factor(whole.u, coefficients(factor, degree + 1), p, exponent)
    scheme = _multiple(Scheme(u, whole.w % u), k, integrals, exponent)
    section = find_section(integrals.discs, contacts, scheme.reduced(p), p, integrals.genus)
    terms = [(Fraction(-1, k), integrals.over_zeros(section, scheme, precision))]
    terms += [(Fraction(-n, k), centres.logs[i]) for i, n in sorted(contacts.items())]
    return combine(terms)


def _pad(integrals: DiscIntegrals, contacts: dict[int, int], least: int) -> None:
    """Add whole fibres, whose logarithm is 0, until the contact orders have the least sum."""
    missing = least - sum(contacts.values())
    fibres = [(i, integrals.partner[i]) for i in integrals.leaders + integrals.ramified]
    step = 0
    while missing > 0:
        for i in fibres[step % len(fibres)]:
            contacts[i] = contacts.get(i, 0) + 1
        missing -= 2
        step += 1


def _multiple(scheme: Scheme, k: int, integrals: DiscIntegrals, exponent: int) -> Scheme:
    """k times a scheme on which 2 y + h is a unit modulo p (any scheme for k = 1), by Newton's iteration for
    w.

    u and p generate a nilpotent ideal modulo (u^k, p^exponent): its power exponent + k is 0, which bounds the
    steps.
    """
    if k == 1:
        return scheme
    p, modulus = integrals.prime, integrals.prime**exponent
    f, h = polynomial(integrals.curve.f, modulus), polynomial(integrals.curve.h, modulus)
    u, w = scheme.u**k, scheme.w
    reduced = scheme.reduced(p)
    slope = (2 * reduced.w + polynomial(integrals.curve.h, p)) % reduced.u
    common, start, _ = slope.xgcd(reduced.u)
    start = start * pow(int(common[0]), -1, p)
    inverse = polynomial(coefficients(start, start.length()), modulus)
    for _ in range((exponent + k).bit_length() + 1):
        inverse = inverse * (2 - (2 * w + h) * inverse) % u
        w = (w - (w * w + h * w - f) * inverse) % u
    if not ((w * w + h * w - f) % u).is_zero():
        raise InternalError("a multiple of a divisor was not found")
    return Scheme(u, w)
