"""Sections with a prescribed divisor modulo p: from classes in the Picard group to functions even(x) + odd(x)
y.

A section of multiple m is a function even(x) + odd(x) y with deg even <= m, deg odd <= m - g - 1: these are
all functions whose poles are bounded by m times the fibre at infinity.  Its divisor of zeros E has degree 2 m
and the class m U.  Conversely an effective E of degree 2 m with this class over F_p is the divisor of exactly
one section up to scalars. Which E on rational points have it is a lattice, read off the group.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from flint import fmpz_mat, fmpz_mod_poly, nmod_mat

from sieve.curves.discs import ResidueDisc
from sieve.errors import InternalError
from sieve.exact.lattice import hermite
from sieve.exact.series import coefficients, polynomial
from sieve.local.picard import PicardGroup


@dataclass(frozen=True)
class Scheme:
    """The effective divisor u(x) = 0, y = w(x) over Z/p^exponent, u monic.

    >>> Scheme(polynomial([1, 0, 1], 9), polynomial([2], 9)).degree
    2
    """

    u: fmpz_mod_poly
    w: fmpz_mod_poly

    @property
    def degree(self) -> int:
        """deg u."""
        return int(self.u.degree())

    def reduced(self, modulus: int) -> Scheme:
        """The same modulo a divisor of the modulus."""
        return Scheme(*(polynomial(coefficients(c, c.length()), modulus) for c in (self.u, self.w)))

    @staticmethod
    def empty(modulus: int) -> Scheme:
        """The zero divisor."""
        return Scheme(polynomial([1], modulus), polynomial([], modulus))


@dataclass(frozen=True)
class SupportedSection:
    """A section modulo p: the chosen multiples of the scheme and of (y - w), see `through`; and where it
    vanishes.

    `contacts`: (disc, order) pairs with order >= 1, sorted: the zeros apart from the scheme.  The two lists
    are the coefficients of r and b in even = r u - (b w mod u), odd = b, entries in 0..p-1.
    """

    multiple: int
    contacts: tuple[tuple[int, int], ...]
    r: tuple[int, ...]
    b: tuple[int, ...]

    def through(self, scheme: Scheme) -> tuple[list[int], list[int]]:
        """Coefficients of even and odd for a section over the ring of the scheme that vanishes on it."""
        modulus = int(scheme.u.modulus())
        r, b = polynomial(self.r, modulus), polynomial(self.b, modulus)
        even = r * scheme.u - b * scheme.w % scheme.u
        return coefficients(even, self.multiple + 1), list(self.b)


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
    rows.append([2, *group.unit_log] + [0] * k)
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
    discs: Sequence[ResidueDisc], contacts: dict[int, int], scheme: Scheme, prime: int, genus: int
) -> SupportedSection:
    """The section whose zeros modulo p are the scheme and the given points with the given orders.

    Arguments: `scheme` over F_p, of degree at most multiple + 1, where 2 * multiple is the degree of the
    zeros. Raises `InternalError` when there is none, that is, when the class is not a multiple of U.
    """
    orders = tuple(sorted((c, e) for c, e in contacts.items() if e))
    degree = scheme.degree + sum(e for _, e in orders)
    multiple = degree // 2
    if degree % 2 or scheme.degree > multiple + 1:
        raise InternalError(f"zeros of degree {degree} with a scheme of degree {scheme.degree}")
    width = max(0, multiple - genus)
    monomials = _monomial_conditions(discs, orders, multiple, width, prime)
    parameters = []
    power = scheme.u
    for _ in range(multiple - scheme.degree + 1):
        parameters.append(coefficients(power, multiple + 1) + [0] * width)
        power = power * polynomial([0, 1], prime)
    power = scheme.w % scheme.u
    for j in range(width):
        even = coefficients(-power, multiple + 1)
        parameters.append(even + [int(i == j) for i in range(width)])
        power = power * polynomial([0, 1], prime) % scheme.u
    size, count = multiple + 1 + width, len(parameters)
    basis = nmod_mat(size, count, [parameters[j][i] for i in range(size) for j in range(count)], prime)
    conditions = nmod_mat(len(monomials), size, [c for row in monomials for c in row], prime) * basis
    null, nullity = conditions.nullspace()
    if nullity != 1:
        raise InternalError(f"{nullity} sections with zeros {orders} modulo {prime}")
    vector = [int(null[i, 0]) for i in range(count)]
    return SupportedSection(multiple, orders, tuple(vector[: count - width]), tuple(vector[count - width :]))


def _monomial_conditions(
    discs: Sequence[ResidueDisc], orders: Sequence[tuple[int, int]], multiple: int, width: int, prime: int
) -> list[list[int]]:
    """Rows: Taylor coefficients of order below the contact at each disc; columns: x^i, then x^j y."""
    rows: list[list[int]] = []
    for number, order in orders:
        disc = discs[number]
        series = disc.expansion(1, order)
        a, b = series.a.truncate(order), series.b.truncate(order)
        powers = [polynomial([1], disc.prime)]
        for _ in range(multiple):
            powers.append(powers[-1].mul_low(a, order))
        odd = [powers[j].mul_low(b, order) for j in range(width)]
        columns = powers[::-1] + odd[::-1] if disc.at_infinity else powers + odd
        table = [coefficients(c, order) for c in columns]
        rows += [[column[k] for column in table] for k in range(order)]
    return rows
