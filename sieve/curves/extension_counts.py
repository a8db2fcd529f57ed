"""Points over small extensions of F_v, by enumeration."""

from __future__ import annotations

from collections.abc import Sequence

import flint
import numpy as np
from numpy.typing import NDArray

IntArray = NDArray[np.int64]


class SmallField:
    """F_{v^e} with elements as columns of e coefficients; int64, shape (e, size of the array)."""

    def __init__(self, v: int, degree: int) -> None:
        self.prime, self.degree, self.size = v, degree, v**degree
        self.modulus = _irreducible(v, degree)

    def everything(self) -> IntArray:
        """All elements, by code."""
        codes = np.arange(self.size, dtype=np.int64)
        return np.stack([codes // self.prime**i % self.prime for i in range(self.degree)])

    def multiply(self, a: IntArray, b: IntArray) -> IntArray:
        """Products, entry by entry."""
        degree = self.degree
        shape = np.broadcast_shapes(a.shape[1:], b.shape[1:])
        out = np.zeros((2 * degree - 1, *shape), dtype=np.int64)
        for i in range(degree):
            out[i : i + degree] += a[i] * b
        out %= self.prime
        for i in range(2 * degree - 2, degree - 1, -1):
            for j in range(degree):
                out[i - degree + j] -= out[i] * self.modulus[j]
        return np.asarray(out[:degree] % self.prime)

    def power(self, a: IntArray, exponent: int) -> IntArray:
        """a^exponent, exponent >= 1, entry by entry."""
        out = a
        for bit in bin(exponent)[3:]:
            out = self.multiply(out, out)
            if bit == "1":
                out = self.multiply(out, a)
        return out

    def evaluate(self, coefficients: Sequence[int], x: IntArray) -> IntArray:
        """A polynomial over F_v, low degree first, at all x."""
        value = np.zeros_like(x)
        for c in reversed(coefficients):
            value = self.multiply(value, x)
            value[0] = (value[0] + c) % self.prime
        return value

    def code(self, a: IntArray) -> IntArray:
        """The number of every element."""
        return np.asarray(sum(a[i] * self.prime**i for i in range(self.degree)), dtype=np.int64)


def roots_in_extension(coefficients: Sequence[int], v: int, degree: int) -> int:
    """The number of roots in F_{v^degree} of a polynomial over F_v that is not 0."""
    poly = flint.nmod_poly([c % v for c in coefficients], v)
    if poly.degree() < 1:
        return 0
    return sum(int(q.degree()) for q, _ in poly.factor()[1] if degree % q.degree() == 0)


def quadratic_count(f: Sequence[int], h: Sequence[int], v: int, degree: int) -> int:
    """The number of (x, y) in F_{v^degree} with y^2 + h(x) y = f(x)."""
    field = SmallField(v, degree)
    x = field.everything()
    fx, hx = field.evaluate(f, x), field.evaluate(h, x)
    if v == 2:
        affine = 0
        for y_code in range(field.size):
            y = np.repeat(x[:, y_code : y_code + 1], field.size, axis=1)
            value = (field.multiply(y, y) + field.multiply(hx, y) - fx) % v
            affine += int((value == 0).all(axis=0).sum())
        return affine
    square = field.multiply(hx, hx) + 4 * fx
    roots = np.bincount(field.code(field.multiply(x, x)), minlength=field.size)
    return int(roots[field.code(square % v)].sum())


def plane_count(rows: Sequence[Sequence[int]], v: int, degree: int) -> int:
    """The number of (x, y) in F_{v^degree} with sum rows[k](x) y^k = 0; about v^{2 degree} / degree steps."""
    field = SmallField(v, degree)
    y = field.everything()
    powers = [np.zeros_like(y)]
    powers[0][0] = 1
    for _ in rows[1:]:
        powers.append(field.multiply(powers[-1], y))
    coefficients = [field.evaluate(row, y) for row in rows]
    # conjugate x have equally many y: one x of every orbit of Frobenius
    frobenius = field.code(field.power(y, v))
    orbit = np.arange(field.size)
    smallest, length = orbit.copy(), np.ones_like(orbit)
    for _ in range(1, degree):
        orbit = frobenius[orbit]
        smallest = np.minimum(smallest, orbit)
    length = np.bincount(smallest, minlength=field.size)
    total = 0
    for number in np.flatnonzero(length).tolist():
        value = np.zeros_like(y)
        for c, power in zip(coefficients, powers, strict=True):
            value += field.multiply(c[:, number : number + 1], power)
        total += int(length[number]) * int((value % v == 0).all(axis=0).sum())
    return total


def _irreducible(v: int, degree: int) -> list[int]:
    """The coefficients (low first, monic leading one included) of the first irreducible polynomial."""
    for tail in range(1, v**degree):
        digits = [tail // v**i % v for i in range(degree)]
        factors = flint.nmod_poly([*digits, 1], v).factor()[1]
        if len(factors) == 1 and factors[0][1] == 1:
            return [*digits, 1]
    raise AssertionError("there is always an irreducible polynomial")


__all__ = ["SmallField", "plane_count", "quadratic_count", "roots_in_extension"]
