"""p-adic points that are algebraic: recognised by lattice reduction, verified exactly on the curve.

The zeros of a Chabauty function often are points over a quadratic or another small field (common practice:
they, or a multiple of their classes, lie in the closure of J(Q), so that no sieve can exclude them).  A short
integer polynomial that vanishes at x modulo p^n is a guess. On y^2 + h y = f, that 4 f + h^2 is a square in
the field it defines, with the root that the candidate has, is checked exactly; on a plane curve the
coordinates are guessed as elements of the field and the equation is checked exactly.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from math import isqrt

import flint

from sieve.curves.protocol import Curve
from sieve.exact.padic_number import PadicNumber

LARGEST_DEGREE = 4

CHANCE = {1: 1000, 2: 50, 3: 50, 4: 50}
"""How many times rarer than residues modulo p^n polynomials of this degree and height must be for a guess to
be worth a check; a rational x needs more, for over it there always is a quadratic point."""


@dataclass(frozen=True)
class AlgebraicPoint:
    """A point of the curve over Q[t]/(minimal), in the user's coordinates.

    `minimal`: integer coefficients of an irreducible polynomial, low degree first; `y`: rational coefficients
    of y as a polynomial in t.  `inverted`: the point is (1/t, y) and not (t, y).  Where x is rational, t is
    the root of y^2 + h y = f and `x` is set.  On a plane curve `entries` are the projective coordinates as
    polynomials in t, and y is the second of them.
    """

    minimal: tuple[int, ...]
    y: tuple[Fraction, ...]
    inverted: bool = False
    x: Fraction | None = None
    entries: tuple[tuple[Fraction, ...], ...] = ()

    @property
    def degree(self) -> int:
        """The degree of the field."""
        return len(self.minimal) - 1

    def __str__(self) -> str:
        field = f"with {_written(tuple(map(Fraction, self.minimal)))} = 0"
        if self.entries:
            return f"({' : '.join(map(_written, self.entries))}) {field}"
        x = str(self.x) if self.x is not None else "1/t" if self.inverted else "t"
        return f"({x}, {_written(self.y)}) {field}"


def _written(coefficients: Sequence[Fraction]) -> str:
    terms = []
    for k in reversed(range(len(coefficients))):
        c = coefficients[k]
        if c:
            power = "" if k == 0 else "t" if k == 1 else f"t^{k}"
            size = "" if power and abs(c) == 1 else str(abs(c)) + ("*" if power else "")
            terms.append(("-" if c < 0 else "+", size + power))
    text = " ".join(f"{sign} {body}" for sign, body in terms) or "0"
    return text.removeprefix("+ ").replace("- ", "-", 1) if text.startswith("- ") else text.removeprefix("+ ")


def small_polynomial(value: int, modulus: int, degree: int) -> tuple[int, ...] | None:
    """An irreducible integer polynomial of the degree with a root at `value` modulo `modulus`, if a short
    one is there.

    Short: see `CHANCE`.

    >>> small_polynomial(pow(2, -1, 7**6), 7**6, 1)
    (-1, 2)
    """
    size = degree + 1
    rows = [[modulus] + [0] * degree]
    power = 1
    for k in range(1, size):
        power = power * value % modulus
        rows.append([-power] + [int(j == k) for j in range(1, size)])
    reduced = flint.fmpz_mat(rows).lll()
    coefficients = [int(reduced[0, j]) for j in range(size)]
    height = max(map(abs, coefficients))
    if CHANCE[degree] * (2 * height + 1) ** size > modulus:
        return None
    poly = flint.fmpz_poly(coefficients)
    content, factors = poly.factor()
    if poly.degree() != degree or abs(int(content)) != 1 or len(factors) != 1 or factors[0][1] != 1:
        return None
    return tuple(int(c) for c in factors[0][0].coeffs())


def _square_root(value: flint.fmpq_poly, minimal: flint.fmpq_poly) -> flint.fmpq_poly | None:
    """A square root of `value` in Q[t]/(minimal) that generates the field or is rational; None otherwise."""
    degree = int(minimal.degree())
    value = value % minimal
    if value.degree() <= 0:
        c = Fraction(int(value[0].p), int(value[0].q)) if value.degree() == 0 else Fraction(0)
        root = _rational_root(c)
        if root is not None:
            return flint.fmpq_poly([flint.fmpq(root.numerator, root.denominator)])
        if degree != 2:
            return None
        # c = r^2 D, D the discriminant: the root is r times the derivative of the minimal polynomial
        low, middle, top = (Fraction(int(minimal[k].p), int(minimal[k].q)) for k in range(3))
        root = _rational_root(c / (middle * middle - 4 * low * top))
        return None if root is None else flint.fmpq(root.numerator, root.denominator) * minimal.derivative()
    # the minimal polynomial of the value at Y^2 splits into g(Y) g(-Y)
    powers = [flint.fmpq_poly([1])]
    for _ in range(degree):
        powers.append(powers[-1] * value % minimal)
    matrix = flint.fmpq_mat(degree, degree, [p[i] for i in range(degree) for p in powers[:degree]])
    target = flint.fmpq_mat(degree, 1, [powers[degree][i] for i in range(degree)])
    try:
        solution = matrix.solve(target)
    except ZeroDivisionError:
        return None
    spread = [flint.fmpq(0)] * (2 * degree + 1)
    spread[2 * degree] = flint.fmpq(1)
    for k in range(degree):
        spread[2 * k] = -solution[k, 0]
    whole = flint.fmpq_poly(spread)
    _, factors = flint.fmpz_poly([int(c) for c in (whole * whole.denom()).coeffs()]).factor()
    half = [f for f, _ in factors if f.degree() == degree]
    if len(factors) != 2 or len(half) != 2:
        return None
    # reduce g(Y) modulo Y^2 - value: A + B Y = 0
    a, b = flint.fmpq_poly([0]), flint.fmpq_poly([0])
    for k, coefficient in enumerate(half[0].coeffs()):
        term = powers[k // 2] * flint.fmpq(int(coefficient))
        if k % 2:
            b = b + term
        else:
            a = a + term
    divisor, inverse, _ = (b % minimal).xgcd(minimal)
    if divisor.degree() != 0:
        return None
    root_poly = -a * inverse % minimal
    return root_poly if not ((root_poly * root_poly - value) % minimal).coeffs() else None


def _rational_root(c: Fraction) -> Fraction | None:
    if c < 0:
        return None
    top, bottom = isqrt(c.numerator), isqrt(c.denominator)
    exact = top * top == c.numerator and bottom * bottom == c.denominator
    return Fraction(top, bottom) if exact else None


def recognise_algebraic(curve: Curve, prime: int,
                        coordinates: tuple[PadicNumber, PadicNumber, PadicNumber]) -> AlgebraicPoint | None:
    """The algebraic point of degree 2 to 4 that a p-adic point agrees with to all its digits, if one of small
    height is found.

    Arguments: weighted p-adic coordinates of the model, integral, Z or X a unit (on a plane curve: one of
    the three).  Rational points are not looked for.
    """
    if curve.weight == 1:
        return _on_plane_curve(curve, prime, coordinates)
    x, y, z = coordinates
    infinite = z.is_zero or z.valuation > 0
    inverse = (x if infinite else z).inverse()
    value, y = (z if infinite else x) * inverse, y * inverse**curve.weight
    if value.is_zero or value.valuation < 0:
        return None
    digits = min(value.precision, y.precision)
    modulus = prime**digits
    f, h = _f_and_h(curve)
    chart = _chart(f, 2 * curve.genus + 2, infinite), _chart(h, curve.genus + 1, infinite)
    root = value.residue(digits)
    target = y.residue(digits) if y.valuation >= 0 else None
    if target is None:
        return None
    found = small_polynomial(root, modulus, 1)
    if found is not None:
        return _over_rational_x(curve, Fraction(-found[0], found[1]), infinite)
    for degree in range(2, LARGEST_DEGREE + 1):
        minimal = small_polynomial(root, modulus, degree)
        if minimal is not None:
            return _over_field(curve, prime, chart, minimal, root, target, modulus, infinite)
    return None


def _f_and_h(curve: Curve) -> tuple[list[int], list[int]]:
    return [-c for c in curve.rows[0]], list(curve.rows[1])


def _chart(coefficients: Sequence[int], degree: int, infinite: bool) -> flint.fmpq_poly:
    full = list(coefficients) + [0] * (degree + 1 - len(coefficients))
    return flint.fmpq_poly(full[::-1] if infinite else full)


def _over_rational_x(curve: Curve, value: Fraction, infinite: bool) -> AlgebraicPoint | None:
    """x is rational and y quadratic."""
    if infinite and value == 0:
        return None
    x = 1 / value if infinite else value
    at = flint.fmpq(x.numerator, x.denominator)
    f_form, h_form = _f_and_h(curve)
    f = flint.fmpq_poly(f_form)(at)
    h = flint.fmpq_poly([0, *h_form])(at) / at if x else flint.fmpq((h_form or [0])[0])
    # t = user's y = model y / scale
    scale = flint.fmpq(curve.y_scale.numerator, curve.y_scale.denominator)
    poly = flint.fmpq_poly([-f / scale**2, h / scale, 1])
    minimal = flint.fmpz_poly([int(c) for c in (poly * poly.denom()).coeffs()])
    _, factors = minimal.factor()
    if len(factors) != 1 or factors[0][1] != 1:
        return None
    return AlgebraicPoint(tuple(int(c) for c in factors[0][0].coeffs()), (Fraction(0), Fraction(1)), x=x)


def _over_field(curve: Curve, prime: int, chart: tuple[flint.fmpq_poly, flint.fmpq_poly],
                minimal: tuple[int, ...], root: int, target: int, modulus: int,
                infinite: bool) -> AlgebraicPoint | None:
    f, h = chart
    m = flint.fmpq_poly(list(minimal))
    square = _square_root(4 * f + h * h, m)
    if square is None:
        return None
    for sign in (1, -1):
        y = (sign * square - h) / 2 % m
        if ((y * y + h * y - f) % m).coeffs():
            return None
        coefficients = [Fraction(int(c.p), int(c.q)) for c in y.coeffs()]
        if any(c.denominator % prime == 0 for c in coefficients):
            continue
        here = sum(c.numerator * pow(c.denominator, -1, modulus) * pow(root, k, modulus)
                   for k, c in enumerate(coefficients))
        if (here - target) % modulus == 0:
            if infinite:
                # y of the curve is (y of the chart) * x^(g+1)
                t = flint.fmpq_poly([0, 1])
                _, inverse, _ = t.xgcd(m)
                y = y * inverse ** (curve.genus + 1) % m
            scale = curve.y_scale
            shown = tuple(Fraction(int(c.p), int(c.q)) / scale for c in y.coeffs())
            return AlgebraicPoint(minimal, shown or (Fraction(0),), infinite)
    return None


# ---- plane curves ----------------------------------------------------------------------------------------


def _on_plane_curve(curve: Curve, prime: int,
                    coordinates: tuple[PadicNumber, PadicNumber, PadicNumber]) -> AlgebraicPoint | None:
    one = next((i for i in (2, 0, 1) if coordinates[i].digits > 0 and coordinates[i].valuation == 0), None)
    if one is None:
        return None
    inverse = coordinates[one].inverse()
    a, b = (coordinates[i] * inverse for i in range(3) if i != one)
    digits = min(a.precision, b.precision)
    modulus = prime**digits
    first, second = a.residue(digits), b.residue(digits)
    for t in (first, second, (first + second) % modulus):
        for degree in range(2, LARGEST_DEGREE + 1):
            minimal = small_polynomial(t, modulus, degree)
            if minimal is None:
                continue
            pair = [_element(value, t, prime, modulus, degree) for value in (first, second)]
            if pair[0] is None or pair[1] is None:
                break
            entries = [pair[0], pair[1]]
            entries.insert(one, (Fraction(1),))
            if _vanishes(curve, entries, minimal):
                return AlgebraicPoint(minimal, entries[1], entries=tuple(entries))
            break
    return None


def _element(value: int, t: int, prime: int, modulus: int, degree: int) -> tuple[Fraction, ...] | None:
    """The number that agrees with `value` modulo `modulus`, as a short polynomial in t."""
    rows = [[modulus] + [0] * degree]
    for k in range(1, degree + 1):
        power = pow(t, k, modulus) if k < degree else value
        rows.append([-power] + [int(j == k) for j in range(1, degree + 1)])
    reduced = flint.fmpz_mat(rows).lll()
    found = [int(reduced[0, j]) for j in range(degree + 1)]
    height = max(map(abs, found))
    if found[degree] % prime == 0 or CHANCE[degree] * (2 * height + 1) ** (degree + 1) > modulus:
        return None
    out = [Fraction(-c, found[degree]) for c in found[:degree]]
    while len(out) > 1 and out[-1] == 0:
        out.pop()
    return tuple(out)


def _vanishes(curve: Curve, entries: Sequence[Sequence[Fraction]], minimal: Sequence[int]) -> bool:
    """Is the point with these coordinates in Q[t]/(minimal) on the plane curve?"""
    m = flint.fmpq_poly(list(minimal))
    x, y, z = (flint.fmpq_poly([flint.fmpq(c.numerator, c.denominator) for c in e]) for e in entries)
    total = flint.fmpq_poly([0])
    for k, row in enumerate(curve.rows):
        for i, c in enumerate(row):
            if c:
                total = (total + c * x**i * y**k * z ** (curve.degree - i - k)) % m
    return not total.coeffs()


__all__ = ["AlgebraicPoint", "recognise_algebraic", "small_polynomial"]
