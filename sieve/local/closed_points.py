"""Logarithms at p of closed places over Q, through sections that contain them exactly.

The part of the place in each disc of an F_p-point is integrated there directly: the power sums of the local
parameter over its points are traces.  What remains, D, reduces to places of higher degree.  In Pic modulo U a
multiple k D is equivalent to a combination of F_p-points; the section modulo p that shows it lifts to a
section that vanishes on k D exactly, and its other zeros lie in discs of F_p-points: k Log(D) is minus the
sum of their logarithms.
"""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction
from typing import Any

from flint import fmpz_mod_poly, nmod_mat, nmod_poly

from sieve.curves.discs import in_chart
from sieve.curves.divisors import ClosedPlace, MumfordPlace, Place
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.moving import residual_places, rewritten_places
from sieve.errors import BadReduction, InternalError, Uncertified
from sieve.exact.padic_linear import PadicVector, combine
from sieve.exact.series import (
    characteristic,
    coefficients,
    inverse_modulo,
    lift_factor,
    polynomial,
)
from sieve.local.centres import Centres
from sieve.local.disc_integrals import DiscIntegrals
from sieve.local.picard import PicardGroup
from sieve.local.supported_sections import (
    Model,
    Scheme,
    coordinates_of,
    find_section,
    invert,
    relation_lattice,
    scheme_of,
)

MOVES = 60
"""How many sections are tried to replace a divisor that cannot be used as it is."""


def scheme_logarithm(
    integrals: DiscIntegrals, centres: Centres, group: PicardGroup, place: Place
) -> PadicVector:
    """Log of a closed place over Q.

    Known modulo p^(precision of the centres - v_p(k)), k the multiple above; v_p(k) is at most their guard. A
    place with denominators at p, or without the coordinate that k > 1 needs, is written in another way or
    replaced by the other zeros of a section through it, see `sieve.curves.moving`.  Raises `BadReduction` or
    `Uncertified`, from the place itself, when that fails.
    """
    try:
        return _integral_scheme(integrals, centres, group, place)
    except (BadReduction, Uncertified) as error:
        curve = integrals.curve
        if isinstance(place, MumfordPlace) and isinstance(curve, HyperellipticCurve):
            for _, moved in residual_places(curve, place, integrals.prime, MOVES):
                try:
                    return -_integral_scheme(integrals, centres, group, moved)
                except (BadReduction, Uncertified):
                    continue
        if isinstance(place, ClosedPlace):
            for same in rewritten_places(place, integrals.prime, MOVES):
                try:
                    return _integral_scheme(integrals, centres, group, same)
                except (BadReduction, Uncertified):
                    continue
        raise error


def parts_modulo(
    integrals: DiscIntegrals, scheme: Scheme
) -> tuple[list[tuple[int, list[int]]], list[int]]:
    """The factors of u modulo p: (disc, factor) where the points are rational over F_p, and all others'
    product.

    Arguments: `scheme` over F_p.  Factors as coefficients, low degree first.  Raises `BadReduction` when all
    coordinates of a point vanish.
    """
    p, weight = integrals.prime, integrals.model.weight
    known: list[tuple[int, list[int]]] = []
    rest = polynomial([1], p)
    for factor, multiplicity in nmod_poly(coefficients(scheme.u, scheme.degree + 1), p).factor()[1]:
        q = polynomial([int(c) for c in factor.coeffs()], p)
        part = scheme.part(q)
        point = _rational_point(part, p, weight)
        whole = q ** int(multiplicity)
        if point is None:
            rest = rest * whole
        else:
            known.append((integrals.reduced.index_of(*point), coefficients(whole, int(whole.degree()) + 1)))
    return known, coefficients(rest, int(rest.degree()) + 1)


def _rational_point(part: Scheme, p: int, weight: int) -> tuple[int, int, int] | None:
    """The coordinates of the points above an irreducible u over F_p, if they are in F_p."""
    pivot, power = (part.z, weight) if not part.z.is_zero() else (part.x, weight)
    if pivot.is_zero():
        if weight > 1 or part.y.is_zero():
            raise BadReduction(p, "the coordinates of a closed point vanish")
        return 0, 1, 0
    inverse = inverse_modulo(pivot, part.u, p, 1)
    values = []
    for value, times in ((part.x, 1), (part.y, power), (part.z, 1)):
        for _ in range(times):
            value = value * inverse % part.u
        if value.degree() > 0:
            return None
        values.append(int(value[0]))
    return values[0], values[1], values[2]


def _integral_scheme(
    integrals: DiscIntegrals, centres: Centres, group: PicardGroup, place: Place
) -> PadicVector:
    terms: list[tuple[Fraction, PadicVector]] = []
    p, precision = integrals.prime, centres.precision
    if any(c.denominator % p == 0 for part in coordinates_of(place) for c in part):
        raise BadReduction(p, "a denominator of a divisor vanishes there")
    known, rest = parts_modulo(integrals, scheme_of(place, p))
    for number, factor in known:
        multiplicity = len(factor) - 1
        _, exponent = integrals.working(multiplicity, precision)
        whole = scheme_of(place, p**exponent)
        part = whole.part(lift_factor(whole.u, factor, p, exponent))
        terms.append((Fraction(1), integrals.over_scheme(number, part, precision)))
        terms.append((Fraction(multiplicity), centres.logs[number]))
    if len(rest) > 1:
        terms.append((Fraction(1), _higher_part(integrals, centres, group, place, rest)))
    return combine(terms)


def _higher_part(
    integrals: DiscIntegrals, centres: Centres, group: PicardGroup, place: Place, factor: list[int]
) -> PadicVector:
    """Log of the part of the place above a factor of u modulo p, which has no F_p-points."""
    p, precision, relations = integrals.prime, centres.precision, centres.relations
    local: Any = integrals.reduced.reduce(place)
    degree = len(factor) - 1
    extra = [degree, *group.log(replace(local, units=0, points=()))]
    row = relation_lattice(group, relations.heads, extra)[0]
    k = row[0]
    n, unit = k * degree, integrals.model.unit_degree
    whole = scheme_of(place, p)
    low = _multiple(whole.part(polynomial(factor, p)), k, integrals.model, p, 1)
    multiple = max(n - 1, 0)
    while not low.independent(integrals.model.monomials(multiple, p), p):
        multiple += 1
        if multiple > n * integrals.model.weight:
            raise BadReduction(p, "points of a closed place that become equal")
    vector = relations.effective(relations.lattice.reduce(row[1:]), multiple * unit - n)
    _, exponent = integrals.working(max(1, *vector), precision)
    whole = scheme_of(place, p**exponent)
    part = whole.part(lift_factor(whole.u, factor, p, exponent))
    scheme = _multiple(part, k, integrals.model, p, exponent)
    section = find_section(integrals.discs, integrals.model, vector, scheme.reduced(p))
    terms = [(Fraction(-1, k), integrals.over_zeros(section, precision, scheme))]
    terms += [(Fraction(-m, k), log) for m, log in zip(vector, centres.logs, strict=True) if m]
    return combine(terms)


def _multiple(scheme: Scheme, k: int, model: Model, p: int, exponent: int) -> Scheme:
    """k times a scheme, by Newton's iteration for the coordinates modulo u^k.

    For k > 1 a coordinate s = c a + d b of a chart must generate the ring of the scheme and be a local
    parameter everywhere: then u becomes the characteristic polynomial of s, t becomes s, and k times the
    divisor is u(s)^k = 0.  u and p generate a nilpotent ideal modulo (u^k, p^exponent): its power exponent +
    k is 0, which bounds the steps.  Raises `BadReduction` when there is no such coordinate.
    """
    if k == 1:
        return scheme
    modulus = p**exponent
    for chart in ("z", "x", "y") if model.weight == 1 else ("z", "x"):
        pivot = {"z": scheme.z, "x": scheme.x, "y": scheme.y}[chart]
        low = polynomial(coefficients(pivot, pivot.length()), p)
        if low.gcd(scheme.reduced(p).u).degree() > 0:
            continue
        inverse = inverse_modulo(pivot, scheme.u, p, exponent)
        first, second = {"z": ("x", "y"), "x": ("z", "y"), "y": ("x", "z")}[chart]
        a, b = getattr(scheme, first) * inverse % scheme.u, getattr(scheme, second)
        for _ in range(model.weight):
            b = b * inverse % scheme.u
        rows = in_chart(model.rows, model.weight, model.degree, chart)
        for c, d in [(1, e) for e in range(min(p, 7))] + [(0, 1)]:
            found = _thickened(scheme.u, a, b, c, d, rows, k, p, exponent)
            if found is not None:
                u, a, b = found
                one, zero = polynomial([1], modulus), polynomial([], modulus)
                parts = {chart: one, first: a, second: b}
                return Scheme(u, parts.get("x", zero), parts.get("y", zero), parts.get("z", zero))
        break
    raise BadReduction(p, "a multiple of a closed place needs a coordinate that is a local parameter on it")


def _thickened(
    u: fmpz_mod_poly, a: fmpz_mod_poly, b: fmpz_mod_poly, c: int, d: int, rows: list[list[int]],
    k: int, p: int, exponent: int,
) -> tuple[fmpz_mod_poly, fmpz_mod_poly, fmpz_mod_poly] | None:
    """u(s)^k, a and b as polynomials in s = c a + d b on the k-fold scheme, or None."""
    modulus, degree = p**exponent, int(u.degree())
    s = (c * a + d * b) % u
    powers, power = [], polynomial([1], modulus) % u
    for _ in range(degree):
        powers.append(coefficients(power, degree))
        power = power * s % u
    if nmod_mat(degree, degree, [e % p for row in powers for e in row], p).rank() < degree:
        return None
    # rows of `inverse` express t^i by powers of s
    inverse = invert(powers, p, modulus)
    u = polynomial(characteristic(s, u), modulus)

    def express(value: fmpz_mod_poly) -> fmpz_mod_poly:
        entries = coefficients(value, degree)
        columns = zip(*inverse, strict=True)
        return polynomial([sum(x * y for x, y in zip(entries, col, strict=True)) for col in columns], modulus)

    a, b = express(a), express(b)
    slope = d * _partial(rows, a, b, u, first=True) - c * _partial(rows, a, b, u, first=False)
    low, small = (polynomial(coefficients(e, e.length()), p) for e in (slope % u, u))
    if low.gcd(small).degree() > 0:
        return None
    whole = u**k
    # along (d, -c) the coordinate s does not change; its own value must be t
    for _ in range(2 * (exponent + k).bit_length() + 2):
        slope = d * _partial(rows, a, b, whole, first=True) - c * _partial(rows, a, b, whole, first=False)
        step = _evaluate(rows, a, b, whole) * inverse_modulo(slope % whole, whole, p, exponent) % whole
        a, b = a - d * step, b + c * step
    if not _evaluate(rows, a, b, whole).is_zero():
        raise InternalError("a multiple of a closed place was not found")
    return whole, a, b


def _evaluate(
    rows: list[list[int]], a: fmpz_mod_poly, b: fmpz_mod_poly, u: fmpz_mod_poly
) -> fmpz_mod_poly:
    modulus = int(u.modulus())
    total = polynomial([], modulus)
    for row in reversed(rows):
        inner = polynomial([], modulus)
        for c in reversed(row):
            inner = (inner * a + c) % u
        total = (total * b + inner) % u
    return total


def _partial(
    rows: list[list[int]], a: fmpz_mod_poly, b: fmpz_mod_poly, u: fmpz_mod_poly, first: bool
) -> fmpz_mod_poly:
    """The derivative of G by a (`first`) or by b."""
    if first:
        return _evaluate([[i * c for i, c in enumerate(row)][1:] for row in rows], a, b, u)
    return _evaluate([[k * c for c in row] for k, row in enumerate(rows)][1:], a, b, u)
