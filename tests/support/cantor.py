"""Textbook arithmetic in J(F_v) for y^2 + h(x) y = f(x), kept apart from the package as an oracle.

A rational point is moved to infinity first.  When it is a Weierstrass point, classes are Mumford pairs with
Cantor's algorithm (Cantor 1987; Koblitz 1989 for h nonzero); otherwise both points at infinity are rational
and classes are balanced divisors (Galbraith, Harrison, Mireles Morales 2008), derived here from the divisor
of y - w(x).  Any genus, any prime v, including 2.
"""

from __future__ import annotations

import random
from collections.abc import Iterable, Sequence

from flint import nmod_poly

Point = tuple[int, int, int]
Pair = tuple[Sequence[int], Sequence[int]]
# The class of (u = 0, y = w) + n * (first point at infinity) + (what makes the degree zero at the other one).
Element = tuple[tuple[int, ...], tuple[int, ...], int]


def coefficients(p: nmod_poly) -> tuple[int, ...]:
    """The coefficients of a polynomial, low degree first, as Python integers."""
    return tuple(int(c) for c in p.coeffs())


def affine_points(v: int, f: Sequence[int], h: Sequence[int]) -> list[Point]:
    """All (x : y : 1) on y^2 + h y = f modulo v, by trying every pair (completing the square for odd v)."""
    found = []
    if v == 2:
        for x in range(2):
            fx, hx = sum(c * x**i for i, c in enumerate(f)), sum(c * x**i for i, c in enumerate(h))
            found += [(x, y, 1) for y in range(2) if (y * y + hx * y - fx) % 2 == 0]
        return found
    roots: dict[int, list[int]] = {}
    for s in range(v):
        roots.setdefault(s * s % v, []).append(s)
    half = pow(2, -1, v)
    for x in range(v):
        fx = sum(c * pow(x, i, v) for i, c in enumerate(f))
        hx = sum(c * pow(x, i, v) for i, c in enumerate(h))
        signs = roots.get((hx * hx + 4 * fx) % v, [])
        found += [(x, y, 1) for y in sorted((s - hx) * half % v for s in signs)]
    return found


def infinite_points(v: int, genus: int, f: Sequence[int], h: Sequence[int]) -> list[Point]:
    """All (1 : s : 0) on the curve modulo v."""
    top_f = f[2 * genus + 2] if len(f) > 2 * genus + 2 else 0
    top_h = h[genus + 1] if len(h) > genus + 1 else 0
    return [(1, s, 0) for s in range(v) if (s * s + top_h * s - top_f) % v == 0]


class CantorJacobian:
    """J(F_v) with slow and obvious arithmetic; needs at least one point of X over F_v.

    Arguments: `v` prime of good reduction (not checked); `f`, `h` integer coefficients, low degree first;
    `genus` of the curve over Q (deg f <= 2 genus + 2, deg h <= genus + 1).
    """

    def __init__(self, v: int, f: Sequence[int], h: Sequence[int], genus: int) -> None:
        self.v, self.genus = v, genus
        self.points: list[Point] = infinite_points(v, genus, f, h) + affine_points(v, f, h)
        if not self.points:
            raise ValueError(f"no point over F_{v}")
        self.origin = self.points[0]
        x0, y0, z0 = self.origin
        F, H, self.power = self.poly(f), self.poly(h), self.poly([0, 1]) ** (genus + 1)
        self.shift = x0 if z0 else None
        if self.shift is not None:
            F, H = self.invert(F, 2 * genus + 2), self.invert(H, genus + 1)
        self.y0 = y0
        self.h = H + 2 * y0 * self.power
        self.f = F - y0 * y0 * self.power * self.power - y0 * self.power * H
        assert self.f.degree() <= 2 * genus + 1
        self.top = int(self.h[genus + 1])
        self.near = self.poly([0])
        if self.top:
            inverse = pow(self.top, -1, v)
            for i in range(genus, -1, -1):
                rest = self.f - self.near * self.near - self.h * self.near
                self.near += self.poly([0] * i + [int(rest[i + genus + 1]) * inverse])
        self.far = -self.h - self.near
        self.zero: Element = ((1,), (), 0)

    def poly(self, c: Iterable[int]) -> nmod_poly:
        return nmod_poly([int(a) % self.v for a in c], self.v)

    def invert(self, p: nmod_poly, weight: int) -> nmod_poly:
        """x^weight * p(x0 + 1/x)."""
        assert self.shift is not None
        moved = p(self.poly([self.shift, 1]))
        c = list(moved.coeffs()) + [0] * (weight + 1 - len(moved.coeffs()))
        return self.poly([int(a) for a in reversed(c)])

    # -- classes of divisors -------------------------------------------------------------------------

    def of_point(self, point: Point) -> Element:
        """The class of P - O, O the first entry of `points`; weighted coordinates, reduced modulo v here."""
        x, y, z = (int(c) % self.v for c in point)
        if self.shift is not None:
            x, z = z, (x - self.shift * z) % self.v
        y = (y - self.y0 * pow(x, self.genus + 1, self.v)) % self.v
        if z:
            i = pow(z, -1, self.v)
            x, y = x * i % self.v, y * pow(i, self.genus + 1, self.v) % self.v
            return self.reduce(self.poly([-x, 1]), self.poly([y]), -1)
        i = pow(x, -1, self.v)
        s = y * pow(i, self.genus + 1, self.v) % self.v
        if s == 0:
            return self.zero
        if s != -self.top % self.v:
            raise ValueError(f"{point} is not on the curve modulo {self.v}")
        return self.reduce(self.poly([1]), self.poly([0]), -1)

    def of_pair(self, u: Sequence[int], w: Sequence[int]) -> Element:
        """The class of D - deg(D) O, D the divisor u(x) = 0, y = w(x) (u divides w^2 + h w - f)."""
        U, W = self.poly(u), self.poly(w)
        total = self.zero
        for q, m in sorted(U.factor()[1], key=lambda t: coefficients(t[0])):
            total = self.add(total, self.multiple(m, self.of_prime(q, W % q)))
        return total

    def of_prime(self, q: nmod_poly, w: nmod_poly) -> Element:
        """The class of the closed point (q, w), q irreducible."""
        if q.degree() == 1:
            x = -int(q[0]) * pow(int(q[1]), -1, self.v) % self.v
            return self.of_point((x, int(w(x)), 1))
        d = q.degree()
        if self.shift is None:
            return self.reduce(q / q.leading_coefficient(), w - self.y0 * self.power, -d)
        u = self.invert(q, d)
        # deg w < d may exceed g + 1: clear denominators, then divide by x^excess modulo u.
        excess = max(0, w.degree() - (self.genus + 1))
        W = self.invert(w, self.genus + 1 + excess)
        g, s, _ = (self.poly([0, 1]) ** excess).xgcd(u)
        assert g.degree() == 0
        return self.reduce(u / u.leading_coefficient(), W * s - self.y0 * self.power, -d)

    def of_divisor(self, divisor: Iterable[tuple[int, Point | Pair]]) -> Element:
        """The class of D - deg(D) O for D a sum of multiplicities times points or (u, w) pairs."""
        total = self.zero
        for m, place in divisor:
            one = self.of_point(place) if len(place) == 3 else self.of_pair(*place)
            total = self.add(total, self.multiple(m, one))
        return total

    def random_prime(self, rng: random.Random) -> Element:
        """The class of a closed point from a random function y - w(x): all degrees occur, they generate."""
        while True:
            w = self.poly(rng.randrange(self.v) for _ in range(self.genus + 2))
            norm = w * w + self.h * w - self.f
            if norm.degree() < 1:
                continue
            factors = sorted(norm.factor()[1], key=lambda t: coefficients(t[0]))
            q = factors[rng.randrange(len(factors))][0]
            return self.reduce(q / q.leading_coefficient(), w, -q.degree())

    # -- the group law ---------------------------------------------------------------------------------

    def add(self, a: Element, b: Element) -> Element:
        u1, w1, u2, w2 = (self.poly(c) for c in (a[0], a[1], b[0], b[1]))
        d1, e1, e2 = u1.xgcd(u2)
        d, c1, c2 = d1.xgcd(w1 + w2 + self.h)
        u = u1 * u2 / (d * d)
        w = (c1 * e1 * u1 * w2 + c1 * e2 * u2 * w1 + c2 * (w1 * w2 + self.f)) / d
        return self.reduce(u / u.leading_coefficient(), w, a[2] + b[2] + d.degree())

    def negate(self, a: Element) -> Element:
        u = self.poly(a[0])
        # The two points at infinity change places: n becomes -deg u - n, and then deg u fibres are taken off.
        return self.reduce(u, -self.h - self.poly(a[1]), -a[2] - u.degree())

    def multiple(self, k: int, a: Element) -> Element:
        if k < 0:
            return self.multiple(-k, self.negate(a))
        total = self.zero
        while k:
            if k & 1:
                total = self.add(total, a)
            k >>= 1
            if k:
                a = self.add(a, a)
        return total

    def step(self, u: nmod_poly, w: nmod_poly, n: int) -> tuple[nmod_poly, nmod_poly, int]:
        """Subtract the divisor of y - w(x), then replace the residual by its conjugate."""
        norm = w * w + self.h * w - self.f
        residual = norm / u
        residual = residual / residual.leading_coefficient()
        if not self.top:
            return residual, (-self.h - w) % residual, 0
        near, far = w - self.near, w - self.far
        pole = near.degree() if near.coeffs() else norm.degree() - far.degree()
        return residual, (-self.h - w) % residual, n + pole - residual.degree()

    def reduce(self, u: nmod_poly, w: nmod_poly, n: int) -> Element:
        """The one representative of a class: deg u <= g, and n in the balanced range."""
        g = self.genus
        w = w % u
        if not self.top:
            while u.degree() > g:
                u, w, n = self.step(u, w, n)
            return coefficients(u), coefficients(w), 0
        while u.degree() > g + 1:
            u, w, n = self.step(u, w, n)
        low = -((g + 1) // 2)
        while True:
            if u.degree() > g or n - low > g - u.degree():
                side = self.near
            elif n < low:
                side = self.far
            else:
                return coefficients(u), coefficients(w), n
            u, w, n = self.step(u, side + (w - side) % u, n)
