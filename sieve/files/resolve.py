"""From what a case file says to points and divisors of a curve, everything verified on the way."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from math import gcd, lcm
from pathlib import Path

import flint

from sieve.curves.divisors import Divisor, FibrePlace, Place, Point, RationalPlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.notation import Origin, Polynomial, dense, format_univariate, quote
from sieve.curves.plane import PlaneCurve, SingularPlaneCurve
from sieve.curves.protocol import Curve
from sieve.errors import NotSupported
from sieve.files.case import (
    HALF_FIBRE,
    Case,
    WrittenClosedPoint,
    WrittenDivisor,
    WrittenFibres,
    WrittenPlace,
    WrittenPoint,
    load_case,
)
from sieve.files.coordinates import chart_coordinates, nonzero_text, zeros_text
from sieve.files.equation import WANTED, WrittenEquation

MAX_DENOMINATOR_BITS = 128
"""Bits of a denominator in an equation: it is factored to find the smallest integral model."""
MAX_PLANE_DEGREE = 8
MAX_PLANE_BITS = 2000
"""Bits of a coefficient of a plane curve, without common factors and denominators."""


@dataclass(frozen=True)
class ResolvedCase:
    """A case whose data are points and divisors of one curve, in the coordinates of its integral model.

    Fields: `case` as read; `curve`; `known_points` in the order of the file, repetitions removed; `base` of
    degree 1 (a whole fibre for "half a fibre"), and `base_point` when it is one rational point; `generators`
    of degree 0, as many as the rank (none when `case.generators_from` is set); `torsion`, pairs (claimed
    order, divisor of degree 0).
    """

    case: Case
    curve: Curve
    known_points: tuple[Point, ...]
    base: Divisor
    base_point: Point | None
    generators: tuple[Divisor, ...]
    torsion: tuple[tuple[int, Divisor], ...]


def resolve(case: Case) -> ResolvedCase:
    """Check a case against its curve.

    Raises `InputError` for an equation of no model, a singular curve or one of genus below 2, a point off
    the curve, a Mumford pair or closed point that is none, a place of another model, a divisor of the wrong
    degree or equal to zero, and for fewer known points than `generators_from` needs.
    """
    curve = curve_of(case.equation)
    if case.integral:
        check_integral(curve, case.origin.at("integral"))
    known: dict[Point, None] = {}
    for written in case.known_points:
        known[_rational_point(curve, written)] = None
    halved = any(isinstance(place, WrittenFibres) and place.half for _, place in case.base.terms)
    base = _divisor(curve, case.base, 2 if halved else 1)
    base_point = None
    if len(base.terms) == 1 and isinstance(base.terms[0][1], RationalPlace):
        base_point = base.terms[0][1].point
    generators = tuple(_divisor(curve, written, 0) for written in case.generators)
    torsion = tuple((order, _divisor(curve, written, 0)) for order, written in case.torsion)
    if case.generators_from is not None:
        differences = len(known) - (1 if base_point in known else 0)
        if differences < case.rank:
            raise case.origin.at("jacobian.generators_from").error(
                f"{differences} differences of known points for rank {case.rank}", f"at least {case.rank}"
            )
    return ResolvedCase(case, curve, tuple(known), base, base_point, generators, torsion)


def read_case(path: str | Path) -> ResolvedCase:
    """`load_case` and `resolve` in one step."""
    return resolve(load_case(path))


def curve_of(equation: WrittenEquation) -> Curve:
    """The curve of an equation, of either model; raises `InputError` and `NotSupported`."""
    if equation.plane:
        return plane_curve(equation)
    return hyperelliptic_curve(equation.polynomial, equation.origin)


def check_integral(curve: Curve, origin: Origin) -> None:
    """Refuse integral points where they are not meaningful: on a plane curve, or with denominators."""
    if not isinstance(curve, HyperellipticCurve):
        raise origin.error("integral points of a plane curve", "integral = true for y^2 + h(x)*y = f(x) only")
    if curve.y_scale != 1:
        found = "integral points of an equation that is not monic in y with integer coefficients"
        raise origin.error(found, "y^2 + h(x)*y = f(x) with integer coefficients")


def plane_curve(equation: WrittenEquation) -> PlaneCurve:
    """The smooth plane curve of a homogeneous equation with rational coefficients.

    Raises `InputError` when its degree is below 4 or it is singular, `NotSupported` beyond the degrees and
    sizes of this version.
    """
    origin, degree = equation.origin, equation.degree
    if degree < 4:
        raise origin.error(f"a plane curve of degree {degree}", "degree at least 4 (genus at least 2)")
    if degree > MAX_PLANE_DEGREE:
        expected = f"degree at most {MAX_PLANE_DEGREE} in this version"
        raise NotSupported(origin.file, origin.place, f"a plane curve of degree {degree}", expected)
    denominator = lcm(*(c.denominator for c in equation.polynomial.values()))
    terms = {
        (i, j, k): int(c * denominator) for (i, j, k), c in equation.polynomial.items()
    }
    content = gcd(*terms.values())
    terms = {exponents: c // content for exponents, c in terms.items()}
    if max(c.bit_length() for c in terms.values()) > MAX_PLANE_BITS:
        raise origin.error("a very large coefficient", f"at most {MAX_PLANE_BITS} bits")
    try:
        return PlaneCurve(terms, equation.variables)
    except SingularPlaneCurve as error:
        expected = "a smooth plane curve (y^2 = f(x) is written without z)"
        raise origin.error(f"a singular curve ({error})", expected) from None


def hyperelliptic_curve(equation: Polynomial, origin: Origin) -> HyperellipticCurve:
    """The curve c*y^2 + h(x)*y - f(x) = 0, any nonzero rational c, sides in any order.

    Arguments: `equation` in x and y (and z, which does not occur), as left side minus right side.
    Returns the integral model; its `y_scale` records how its y comes from the user's.
    Raises `InputError` when the equation is of another form, singular, or of genus below 2.
    """
    by_power: dict[int, Polynomial] = {}
    for exponents, coefficient in equation.items():
        by_power.setdefault(exponents[1], {})[exponents] = coefficient
    degree = max(by_power)
    if degree != 2:
        raise origin.error("an equation without y^2" if degree < 2 else f"a term with y^{degree}", WANTED)
    leading = dense(by_power[2])
    if len(leading) > 1:
        raise origin.error("a coefficient of y^2 that is not constant", WANTED)
    h = [c / leading[0] for c in dense(by_power.get(1, {}))]
    f = [-c / leading[0] for c in dense(by_power.get(0, {}))]
    if max((c.denominator.bit_length() for c in h + f), default=0) > MAX_DENOMINATOR_BITS:
        raise origin.error("a very large denominator", f"at most {MAX_DENOMINATOR_BITS} bits")
    repeated = _repeated_factor(f, h)
    if len(repeated) > 1:
        factor = quote(format_univariate(repeated, "x"), 120)[1:-1]
        found = f"a singular curve (the repeated factor of 4*f + h^2 is {factor})"
        raise origin.error(found, "4*f + h^2 without repeated factors")
    try:
        return HyperellipticCurve.from_rational(f, h)
    except ValueError as error:
        if str(error).startswith("genus"):
            raise origin.error(f"a curve of {error}", "genus at least 2") from None
        found = f"deg f = {len(f) - 1}, deg h = {len(h) - 1}"
        expected = "deg h at most g + 1, deg f at most 2*g + 2 (complete the square)"
        raise origin.error(found, expected) from None


def _repeated_factor(f: list[Fraction], h: list[Fraction]) -> list[int]:
    """The product of the repeated factors of 4 f + h^2, primitive; coefficients low degree first."""
    fp, hp = (flint.fmpq_poly([flint.fmpq(c.numerator, c.denominator) for c in side]) for side in (f, h))
    square = (4 * fp + hp * hp).numer()
    repeated = [int(c) for c in square.gcd(square.derivative()).coeffs()] if square else []
    content = gcd(*repeated)
    return [c // content for c in repeated]


def _rational_point(curve: Curve, written: WrittenPoint) -> Point:
    entries = written.point.entries
    if not written.point.affine and not any(entries[i] for i in chart_coordinates(curve)):
        raise written.origin.error(f"a point with {zeros_text(curve)}", nonzero_text(curve))
    try:
        return curve.from_user(*entries)
    except ValueError:
        found = f"{quote(written.text, 120)}, which is not on the curve"
        raise written.origin.error(found, "a point of the curve") from None


def _place(curve: Curve, written: WrittenPlace) -> Place:
    if isinstance(written, WrittenPoint):
        return RationalPlace(_rational_point(curve, written))
    if isinstance(written, WrittenClosedPoint):
        x, y = written.point.entries[:2]
        z = (Fraction(1),) if written.point.affine else written.point.entries[2]
        try:
            return curve.closed_point(written.modulus, x, [curve.y_scale * c for c in y], z)
        except ValueError as error:
            raise written.origin.error(f"closed point: {error}", "a closed point of the curve") from None
    if not isinstance(curve, HyperellipticCurve):
        name = "fibres" if isinstance(written, WrittenFibres) else "mumford"
        if isinstance(written, WrittenFibres) and written.half:
            name = quote(HALF_FIBRE)
        expected = "a point, or a table with root_of and point"
        raise written.origin.error(f"{name} on a plane curve", expected)
    if isinstance(written, WrittenFibres):
        return FibrePlace(written.count)
    if len(written.w) >= max(len(written.u), 1):
        raise written.origin.error("mumford with deg w >= deg u", "deg w < deg u")
    try:
        return curve.mumford(written.u, [curve.y_scale * c for c in written.w])
    except ValueError as error:
        raise written.origin.error(f"mumford: {error}", "a Mumford pair of the curve") from None


def _divisor(curve: Curve, written: WrittenDivisor, degree: int) -> Divisor:
    divisor = Divisor.of((multiplicity, _place(curve, place)) for multiplicity, place in written.terms)
    if divisor.degree != degree:
        raise written.origin.error(f"a divisor of degree {divisor.degree}", f"degree {degree}")
    if not divisor.terms:
        raise written.origin.error("a divisor whose terms cancel", "a nonzero divisor")
    return divisor
