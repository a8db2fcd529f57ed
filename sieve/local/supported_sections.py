"""Sections with a prescribed divisor modulo p: from classes in the Picard group to forms H(X, Y, Z).

A section of multiple n is a weighted form of degree n modulo the equation.  Its divisor of zeros E has degree
n D / w and the class n U.  Conversely an effective E of this degree and class over F_p is the divisor of
exactly one section up to scalars, because forms cut out complete linear systems on a smooth weighted plane
curve. Which E on rational points have the class is a lattice, read off the group.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

from flint import fmpz_mat, fmpz_mod_poly, nmod_mat

from sieve.curves.discs import ResidueDisc
from sieve.curves.divisors import ClosedPlace, MumfordPlace, Place
from sieve.curves.protocol import Curve
from sieve.errors import InternalError
from sieve.exact.lattice import hermite
from sieve.exact.series import coefficients, polynomial
from sieve.local.picard import PicardGroup

Monomial = tuple[int, int, int]
"""Exponents of X, Y, Z."""


@dataclass(frozen=True)
class Model:
    """F(X, Y, Z) = 0 of weighted degree `degree`, weights (1, weight, 1), as in `sieve.curves.discs`."""

    rows: tuple[tuple[int, ...], ...]
    weight: int
    degree: int

    @property
    def unit_degree(self) -> int:
        """The degree of U."""
        return self.degree // self.weight

    def monomials(self, multiple: int, prime: int) -> list[Monomial]:
        """Monomials of a degree that form a basis modulo F and p: no multiples of the leading one of F.

        >>> Model(((-1, 0, 0, 0, 0, -1), (), (1,)), 3, 6).monomials(3, 7)
        [(0, 0, 3), (1, 0, 2), (2, 0, 1), (3, 0, 0), (0, 1, 0)]
        """
        w = self.weight
        k, i = max((k, i) for k, row in enumerate(self.rows) for i, c in enumerate(row) if c % prime)
        rest = self.degree - i - w * k
        out = []
        for b in range(multiple // w + 1):
            for a in range(multiple - w * b + 1):
                c = multiple - w * b - a
                if a < i or b < k or c < rest:
                    out.append((a, b, c))
        return out


def model_of(curve: Curve) -> Model:
    """The equation of a curve."""
    return Model(tuple(tuple(row) for row in curve.rows), curve.weight, curve.degree)


@dataclass(frozen=True)
class Scheme:
    """All conjugates of (x : y : z) over Z/p^exponent: polynomials in t modulo the monic u(t).

    >>> Scheme(*(polynomial(c, 9) for c in ([1, 0, 1], [0, 1], [2], [1]))).degree
    2
    """

    u: fmpz_mod_poly
    x: fmpz_mod_poly
    y: fmpz_mod_poly
    z: fmpz_mod_poly

    @property
    def degree(self) -> int:
        """deg u."""
        return int(self.u.degree())

    def reduced(self, modulus: int) -> Scheme:
        """The same modulo a divisor of the modulus."""
        return Scheme(
            *(polynomial(coefficients(c, c.length()), modulus) for c in (self.u, self.x, self.y, self.z))
        )

    def part(self, factor: fmpz_mod_poly) -> Scheme:
        """The part above a monic factor of u."""
        return Scheme(factor, self.x % factor, self.y % factor, self.z % factor)

    def values(self, monomials: Sequence[Monomial]) -> list[list[int]]:
        """For every monomial its coefficients in 1, t, .., t^(deg u - 1)."""
        one = polynomial([1], int(self.u.modulus())) % self.u
        tables = []
        for part, base in enumerate((self.x, self.y, self.z)):
            powers = [one]
            for _ in range(max((m[part] for m in monomials), default=0)):
                powers.append(powers[-1] * base % self.u)
            tables.append(powers)
        x, y, z = tables
        known: dict[tuple[int, int], fmpz_mod_poly] = {}
        out = []
        for a, b, c in monomials:
            if (b, c) not in known:
                known[b, c] = y[b] * z[c] % self.u
            out.append(coefficients(x[a] * known[b, c] % self.u, self.degree))
        return out

    def independent(self, monomials: Sequence[Monomial], prime: int) -> bool:
        """Whether vanishing here imposes as many conditions modulo p as the degree says."""
        return len(independent_columns(self.values(monomials), prime)) == self.degree


def coordinates_of(place: Place) -> tuple[tuple[Fraction, ...], ...]:
    """(u, x, y, z) of a closed place: it consists of all (x(t) : y(t) : z(t)), u(t) = 0."""
    if isinstance(place, MumfordPlace):
        one, zero = Fraction(1), Fraction(0)
        x = (-place.u[0],) if place.degree == 1 else (zero, one)
        return place.u, x, place.w, (one,)
    if isinstance(place, ClosedPlace):
        return place.u, place.x, place.y, place.z
    raise InternalError(f"{place} is no closed place")


def scheme_of(place: Place, modulus: int) -> Scheme:
    """A closed place modulo a power of p; its coefficients must be integral at p."""
    u, x, y, z = (
        polynomial([c.numerator * pow(c.denominator, -1, modulus) for c in part], modulus)
        for part in coordinates_of(place)
    )
    return Scheme(u, x, y, z)


@dataclass(frozen=True)
class SupportedSection:
    """A section modulo p and where it vanishes.

    `contacts`: (disc, order) pairs with order >= 1, sorted: the zeros apart from a scheme.  `terms`:
    monomials with coefficients in 0..p-1 (0 where a lift may have others).
    """

    multiple: int
    contacts: tuple[tuple[int, int], ...]
    terms: tuple[tuple[Monomial, int], ...]

    @property
    def rows(self) -> list[list[int]]:
        """The section by powers of y, as `ResidueDisc.restrict` takes it."""
        return _rows(self.terms)

    def through(self, scheme: Scheme, prime: int) -> list[list[int]]:
        """Rows of a lift to the ring of the scheme that vanishes on it.

        The section vanishes on the scheme modulo p, which imposes independent conditions on the monomials.
        """
        if scheme.degree == 0:
            return self.rows
        modulus = int(scheme.u.modulus())
        monomials = [m for m, _ in self.terms]
        vector = [c for _, c in self.terms]
        values = scheme.values(monomials)
        pivots = independent_columns(values, prime)
        if len(pivots) < scheme.degree:
            raise InternalError("a scheme without independent conditions")
        degree = scheme.degree
        square = [[values[j][i] for j in pivots] for i in range(degree)]
        inverse = invert(square, prime, modulus)
        for j in pivots:
            vector[j] = 0
        total = [sum(c * v[i] for c, v in zip(vector, values, strict=True) if c) for i in range(degree)]
        for j, row in zip(pivots, inverse, strict=True):
            vector[j] = -sum(a * b for a, b in zip(row, total, strict=True)) % modulus
        return _rows(tuple(zip(monomials, vector, strict=True)))


def independent_columns(values: Sequence[Sequence[int]], prime: int) -> list[int]:
    """Indices of vectors that are a basis of the span of all of them modulo p: the first possible ones."""
    height = len(values[0])
    matrix = nmod_mat(height, len(values), [v[i] % prime for i in range(height) for v in values], prime)
    reduced, rank = matrix.rref()
    out: list[int] = []
    for i in range(rank):
        start = out[-1] + 1 if out else 0
        out.append(next(j for j in range(start, len(values)) if int(reduced[i, j])))
    return out


def invert(square: Sequence[Sequence[int]], prime: int, modulus: int) -> list[list[int]]:
    """The inverse modulo a power of p of a matrix that is invertible modulo p, by Newton's iteration."""
    n = len(square)
    start = nmod_mat(n, n, [c % prime for row in square for c in row], prime).inv()
    matrix = fmpz_mat([list(row) for row in square])
    inverse = fmpz_mat([[int(start[i, j]) for j in range(n)] for i in range(n)])
    known = prime
    while True:
        known = min(known * known, modulus)
        product = inverse * (matrix * inverse)
        pairs = [[(int(inverse[i, j]), int(product[i, j])) for j in range(n)] for i in range(n)]
        entries = [[(2 * a - b) % known for a, b in row] for row in pairs]
        if known == modulus:
            return entries
        inverse = fmpz_mat(entries)


def _rows(terms: Sequence[tuple[Monomial, int]]) -> list[list[int]]:
    rows: list[list[int]] = [[] for _ in range(max((b for (_, b, _), _ in terms), default=-1) + 1)]
    for (a, b, _), c in terms:
        rows[b] += [0] * (a + 1 - len(rows[b]))
        rows[b][a] = c
    return rows


def relation_lattice(
    group: PicardGroup, points: Sequence[int], extra: Sequence[int] | None = None
) -> list[list[int]]:
    """All integer vectors n for which sum n_i P_i is equivalent to a multiple of U, as a reduced basis.

    Arguments: `points`, numbers of rational points; `extra`, a class (degree, then its logarithm) that takes
    part as a first column.  With `extra` the first row has the least positive coefficient there, all others
    0. The basis (without that row) is LLL-reduced, the first row is not.
    """
    s = len(group.invariants)
    classes = [[1, *(int(c) for c in group.point_logs[i])] for i in points]
    if extra is not None:
        classes.insert(0, list(extra))
    k = len(classes)
    rows = [row + [int(i == j) for j in range(k)] for i, row in enumerate(classes)]
    rows.append([int(group.curve.unit_degree), *group.unit_log] + [0] * k)
    for i, d in enumerate(group.invariants):
        rows.append([0] * (1 + i) + [d] + [0] * (s - 1 - i + k))
    kernel = [list(row[s + 1 :]) for row in hermite(rows) if not any(row[: s + 1])]
    head = 0 if extra is None else 1
    rest = [row[head:] for row in kernel[head:]]
    if rest:
        reduced = fmpz_mat(rest).lll()
        rest = [[int(reduced[i, j]) for j in range(k - head)] for i in range(k - head)]
    return kernel[:head] + [[0] * head + row for row in rest]


def find_section(
    discs: Sequence[ResidueDisc], model: Model, contacts: Sequence[int] | dict[int, int],
    scheme: Scheme | None = None,
) -> SupportedSection:
    """The section whose zeros modulo p are the scheme and the given points with the given orders.

    Arguments: `contacts`, orders by number of the disc; `scheme` over F_p.
    Raises `InternalError` when there is none, that is, when the class is not a multiple of U.
    """
    pairs = contacts.items() if isinstance(contacts, dict) else enumerate(contacts)
    orders = tuple(sorted((c, e) for c, e in pairs if e))
    degree = sum(e for _, e in orders) + (scheme.degree if scheme else 0)
    multiple, rest = divmod(degree, model.unit_degree)
    if rest:
        raise InternalError(f"zeros of degree {degree}")
    prime = discs[0].prime
    monomials = model.monomials(multiple, prime)
    conditions: list[list[int]] = []
    for number, order in orders:
        conditions += _contact_conditions(discs[number], order, monomials)
    if scheme is not None and scheme.degree:
        values = scheme.values(monomials)
        conditions += [[v[i] for v in values] for i in range(scheme.degree)]
    matrix = nmod_mat(len(conditions), len(monomials), [c for row in conditions for c in row], prime)
    null, nullity = matrix.nullspace()
    if nullity != 1:
        raise InternalError(f"{nullity} sections with zeros {orders} modulo {prime}")
    terms = tuple((m, int(null[i, 0])) for i, m in enumerate(monomials))
    return SupportedSection(multiple, orders, terms)


def _contact_conditions(disc: ResidueDisc, order: int, monomials: Sequence[Monomial]) -> list[list[int]]:
    """Rows: Taylor coefficients of order below the contact; columns: monomials."""
    first, second = {"z": (0, 1), "x": (2, 1), "y": (0, 2)}[disc.chart]
    p = disc.prime
    if order == 1:
        a, b = disc.residue
        return [[pow(a, m[first], p) * pow(b, m[second], p) % p for m in monomials]]
    series = disc.expansion(1, order)
    tables = []
    for part, base in ((first, series.a), (second, series.b)):
        powers = [polynomial([1], p)]
        for _ in range(max(m[part] for m in monomials)):
            powers.append(powers[-1].mul_low(base, order))
        tables.append(powers)
    products = [tables[0][m[first]].mul_low(tables[1][m[second]], order) for m in monomials]
    columns = [coefficients(product, order) for product in products]
    return [[column[k] for column in columns] for k in range(order)]
