"""Common zeros in Z_p of power series that converge on Z_p, with certified numbers of zeros.

A series is given by its coefficients modulo p^A, the omitted ones being 0 modulo p^A.  If some coefficient is
not 0 modulo p^A, the Newton polygon tells how many zeros, with multiplicity and over the completed algebraic
closure, lie in the closed unit ball: the last index at which the least valuation is taken (Strassman 1928).
Divided by that least power of p the series reduces to a polynomial over F_p whose roots are the residue
classes of the zeros; simple roots lift uniquely (Hensel), and over multiple roots the ball s0 + p Z_p is
blown up and searched the same way.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from flint import fmpz_poly, nmod_poly

from sieve.exact.padic_number import valuation


@dataclass(frozen=True, order=True)
class Ball:
    """The ball value + p^digits Z_p, 0 <= value < p^digits.

    `multiplicity` 1: it holds at most one common zero, and if there is one it is near `value` to all digits.
    Larger: some of the series has at most that many zeros there, over the algebraic closure, with
    multiplicity, and the known digits tell no more.
    """

    value: int
    digits: int
    multiplicity: int


def zero_count(coefficients: Sequence[int], prime: int, precision: int) -> int | None:
    """The number of zeros in the closed unit ball, or None when every coefficient is 0 modulo p^precision.

    Source: Strassman 1928; the Weierstrass preparation theorem.

    >>> zero_count([3, 1, 3, 9], 3, 2), zero_count([9, 18], 3, 2)
    (1, None)
    """
    least, count = precision, None
    for k, c in enumerate(coefficients):
        c %= prime**precision
        if c and valuation(c, prime) <= least:
            least, count = valuation(c, prime), k
    return count


def common_zeros(series: Sequence[Sequence[int]], prime: int, precision: int, deepest: int) -> list[Ball]:
    """Disjoint balls, none smaller than p^-`deepest` unless it holds at most one zero, with all common zeros.

    Arguments: at least one series, coefficients low degree first modulo p^precision, precision >= 1;
    `deepest` >= 1.  A series that vanishes modulo p^precision says nothing; when all do, the answer is one
    ball with 0 digits and multiplicity 0 (unknown).  Sorted.

    >>> common_zeros([[-6, 1, 1]], 5, 4, 4)  # (s - 2)(s + 3) in Z_5: 2 and 622 agree modulo 5
    [Ball(value=2, digits=3, multiplicity=1), Ball(value=122, digits=3, multiplicity=1)]
    >>> common_zeros([[-6, 1, 1], [-2, 1]], 5, 4, 4)
    [Ball(value=2, digits=4, multiplicity=1)]
    """
    polys = [fmpz_poly([c % prime**precision for c in coefficients]) for coefficients in series]
    return sorted(_search(polys, prime, precision, deepest, Ball(0, 0, 0)))


def _search(polys: list[fmpz_poly], p: int, precision: int, deepest: int, ball: Ball) -> list[Ball]:
    """The zeros of polys(s), s in Z_p, as balls for ball.value + p^ball.digits s."""
    scaled: list[tuple[int, fmpz_poly]] = []
    for poly in polys:
        entries = [int(c) for c in poly.coeffs()]
        least = min((valuation(c, p) for c in entries if c), default=precision)
        if least < precision:
            scaled.append((least, fmpz_poly([c // p**least for c in entries])))
    if not scaled:
        return [ball]
    reduced = [nmod_poly([int(c) for c in poly.coeffs()], p) for _, poly in scaled]
    common = reduced[0]
    for other in reduced[1:]:
        common = common.gcd(other)
    out: list[Ball] = []
    roots = sorted(int(r) for r, _ in common.roots()) if common.degree() > 0 else []
    for root in roots:
        orders = [_order(poly, root, p) for poly in reduced]
        simple = [(least, i) for i, (least, _) in enumerate(scaled) if orders[i] == 1]
        if simple:
            least, best = min(simple)
            digits = precision - least
            value = _lift(scaled[best][1], root, p**digits)
            # scaled[j] changes by p^digits between two zeros of scaled[best] near the value
            if all(int(poly(value)) % p ** min(precision - e, digits) == 0 for e, poly in scaled):
                out.append(Ball(ball.value + p**ball.digits * value, ball.digits + digits, 1))
            continue
        inner = Ball(ball.value + p**ball.digits * root, ball.digits + 1, min(orders))
        if inner.digits >= deepest:
            out.append(inner)
            continue
        line, modulus = fmpz_poly([root, p]), p**precision
        shifted = [fmpz_poly([int(c) % modulus for c in poly(line).coeffs()]) for poly in polys]
        out += _search(shifted, p, precision, deepest, inner)
    return out


def _order(poly: nmod_poly, root: int, p: int) -> int:
    """The order of vanishing of a nonzero polynomial at a root."""
    factor, order = nmod_poly([-root % p, 1], p), 0
    while True:
        quotient, rest = divmod(poly, factor)
        if rest.degree() >= 0:
            return order
        poly, order = quotient, order + 1


def _lift(poly: fmpz_poly, root: int, modulus: int) -> int:
    """The zero modulo a power of p near a simple root modulo p (Newton's iteration)."""
    slope = poly.derivative()
    for _ in range(modulus.bit_length().bit_length() + 1):
        root = (root - int(poly(root)) * pow(int(slope(root)), -1, modulus)) % modulus
    return root
