"""Structure and discrete logarithms of a finite abelian group of known order, the textbook way.

Sylow subgroup by Sylow subgroup: independent generators in order of falling order, logarithms digit by digit
(Pohlig, Hellman 1978) with baby and giant steps (Shanks 1971) in the socle.
"""

from __future__ import annotations

import random
from collections.abc import Iterator, Sequence
from itertools import product
from math import isqrt, prod

from flint import fmpz

from tests.support.cantor import CantorJacobian, Element


class SylowSubgroup:
    """The ell-part of J(F_v): independent generators `basis` of orders ell^`exponents`, falling."""

    def __init__(self, J: CantorJacobian, order: int, ell: int, k: int, rng: random.Random) -> None:
        self.J, self.ell, self.k = J, ell, k
        self.cofactor = order // ell**k
        self.basis: list[Element] = []
        self.exponents: list[int] = []
        self.baby: dict[Element, tuple[int, ...]] = {}
        self.giant: list[tuple[Element, tuple[int, ...]]] = []
        while sum(self.exponents) < k:
            self.insert(J.multiple(self.cofactor, J.random_prime(rng)))

    def exponent(self, x: Element) -> int:
        """e with ell^e the order of x."""
        e = 0
        while x != self.J.zero:
            x, e = self.J.multiple(self.ell, x), e + 1
            if e > self.k:
                raise ArithmeticError("the order of the group does not kill its elements")
        return e

    def insert(self, x: Element) -> None:
        """Enlarge the subgroup by x."""
        waiting = [(self.exponent(x), x)]
        while waiting:
            waiting.sort(key=lambda t: (t[0], t[1]))
            e, x = waiting.pop()
            if e == 0:
                continue
            while self.exponents and self.exponents[-1] < e:
                waiting.append((self.exponents.pop(), self.basis.pop()))
                self.baby = {}
            for i in range(e + 1):
                logs = self.logarithm(self.J.multiple(self.ell**i, x), e - i)
                if logs is not None:
                    break
            else:
                raise ArithmeticError("zero has no logarithm")
            # The orders of the basis are at least that of x, so ell^i divides every entry of logs.
            for c, b in zip(logs, self.basis, strict=True):
                assert c % self.ell**i == 0
                x = self.J.add(x, self.J.multiple(-(c // self.ell**i), b))
            if i == e:
                self.basis.append(x)
                self.exponents.append(e)
                self.baby = {}
            else:
                waiting.append((i, x))

    def boxes(self) -> tuple[list[int], list[int]]:
        """Numbers of low digits (baby steps) and high digits (giant steps) for each generator."""
        low, high, table, r = [], [], 1, len(self.basis)
        for _ in range(r):
            room = max(1, isqrt(self.ell**r) // table)
            size = min(self.ell, room) if room > 1 else 1
            table *= size
            low.append(size)
            high.append(-(-self.ell // size))
        return low, high

    def tables(self) -> None:
        """Fill the baby and giant steps of the socle."""
        J = self.J
        socle = [J.multiple(self.ell ** (e - 1), b) for b, e in zip(self.basis, self.exponents, strict=True)]
        low, high = self.boxes()
        self.baby = dict(self.span(socle, low))
        strides = [J.multiple(-m, s) for m, s in zip(low, socle, strict=True)]
        self.giant = [
            (x, tuple(d * m for d, m in zip(digits, low, strict=True)))
            for x, digits in self.span(strides, high)
        ]

    def span(self, generators: list[Element], sizes: list[int]) -> Iterator[tuple[Element, tuple[int, ...]]]:
        """All combinations with digits below `sizes`, each by one addition."""
        axes = []
        for g, size in zip(generators, sizes, strict=True):
            axis = [self.J.zero]
            for _ in range(size - 1):
                axis.append(self.J.add(axis[-1], g))
            axes.append(axis)
        for digits in product(*(range(s) for s in sizes)):
            x = self.J.zero
            for axis, d in zip(axes, digits, strict=True):
                x = self.J.add(x, axis[d]) if d else x
            yield x, digits

    def socle_logarithm(self, x: Element) -> tuple[int, ...] | None:
        """Coordinates modulo ell of an element killed by ell, or None outside the subgroup."""
        if x == self.J.zero:
            return (0,) * len(self.basis)
        if not self.basis:
            return None
        if not self.baby:
            self.tables()
        for step, digits in self.giant:
            low = self.baby.get(self.J.add(x, step) if any(digits) else x)
            if low is not None:
                return tuple((a + b) % self.ell for a, b in zip(low, digits, strict=True))
        return None

    def logarithm(self, x: Element, e: int | None = None) -> tuple[int, ...] | None:
        """Coordinates of x (of order ell^e) on the basis, or None when x is not in the subgroup so far."""
        e = self.exponent(x) if e is None else e
        logs = [0] * len(self.basis)
        for top in range(e, 0, -1):
            digits = self.socle_logarithm(self.J.multiple(self.ell ** (top - 1), x))
            if digits is None:
                return None
            for j, d in enumerate(digits):
                if d:
                    if self.exponents[j] < top:
                        return None
                    c = d * self.ell ** (self.exponents[j] - top)
                    logs[j] += c
                    x = self.J.add(x, self.J.multiple(-c, self.basis[j]))
        return tuple(c % self.ell**f for c, f in zip(logs, self.exponents, strict=True))


class GroupOracle:
    """The structure of J(F_v) and logarithms in it, from its order; slow, sure, and apart from the package.

    `moduli[i]` is the order of the i-th coordinate: prime powers, prime by prime, falling for each prime.
    """

    def __init__(self, J: CantorJacobian, order: int, seed: int = 1) -> None:
        rng = random.Random(seed)
        self.J, self.order = J, order
        self.parts = [SylowSubgroup(J, order, int(ell), int(k), rng) for ell, k in fmpz(order).factor()]
        self.moduli = tuple(part.ell**e for part in self.parts for e in part.exponents)
        assert prod(self.moduli) == order

    def invariants(self) -> list[int]:
        """The non-trivial invariant factors, each dividing the next."""
        length = max((len(part.exponents) for part in self.parts), default=0)
        factors = [1] * length
        for part in self.parts:
            for j, e in enumerate(part.exponents):
                factors[length - 1 - j] *= part.ell**e
        return factors

    def logarithm(self, x: Element) -> tuple[int, ...]:
        """The coordinates of a class, one for each entry of `moduli`."""
        logs: list[int] = []
        for part in self.parts:
            one = part.logarithm(self.J.multiple(part.cofactor, x))
            assert one is not None
            for c, e in zip(one, part.exponents, strict=True):
                logs.append(c * pow(part.cofactor, -1, part.ell**e) % part.ell**e)
        return tuple(logs)

    def combination(self, logs: Sequence[Sequence[int]], coefficients: Sequence[int]) -> tuple[int, ...]:
        """sum of coefficients[i] * logs[i], reduced."""
        rows = list(zip(coefficients, logs, strict=True))
        return tuple(sum(c * row[j] for c, row in rows) % m for j, m in enumerate(self.moduli))
