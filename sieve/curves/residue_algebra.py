"""F_v[t]/u and points of the plane over it: is such a point a closed subscheme, and which one?"""

from __future__ import annotations

from collections.abc import Sequence

import flint

TRIES = 12
"""a, b, a + b, .., a + TRIES b are tried as generators."""

Poly = tuple[int, ...]


class ResidueAlgebra:
    """F_v[t]/u for a monic u of degree e >= 1, not necessarily irreducible."""

    def __init__(self, u: flint.nmod_poly) -> None:
        self.u = u
        self.prime = int(u.modulus())
        self.degree = int(u.degree())

    def column(self, a: flint.nmod_poly) -> list[int]:
        """The e coefficients of a modulo u."""
        rest = a % self.u
        return [int(rest[i]) for i in range(self.degree)]

    def power_rows(self, a: flint.nmod_poly) -> list[list[int]]:
        """1, a, .., a^{e-1} as rows of coefficients."""
        rows, power = [], flint.nmod_poly([1], self.prime)
        for _ in range(self.degree):
            rows.append(self.column(power))
            power = power * a % self.u
        return rows

    def generates(self, a: flint.nmod_poly) -> bool:
        """Are the powers of a a basis?"""
        rows = self.power_rows(a)
        matrix = flint.nmod_mat(self.degree, self.degree, [c for row in rows for c in row], self.prime)
        return int(matrix.rank()) == self.degree

    def embedding(
        self, coordinates: Sequence[flint.nmod_poly], weight: int = 1
    ) -> tuple[flint.nmod_poly, list[flint.nmod_poly]] | None:
        """A generator made of a point's coordinates, and these, scaled; None if it is no closed immersion.

        Arguments: X, Y, Z with weights 1, w, 1.  The first unit among Z, X and (w = 1) Y becomes 1.  The
        other two, a and b, generate the algebra when one of a, b, a + b, .., does.
        """
        x, y, z = (c % self.u for c in coordinates)
        for lead in (2, 0, 1) if weight == 1 else (2, 0):
            unit = (x, y, z)[lead]
            common, inverse, _ = unit.xgcd(self.u)
            if unit.degree() >= 0 and common.degree() == 0:
                break
        else:
            return None
        inverse = inverse * pow(int(common[0]), -1, self.prime) % self.u
        scaled = [x * inverse % self.u, y * pow(inverse, weight) % self.u, z * inverse % self.u]
        a, b = (scaled[k] for k in ((0, 1) if lead == 2 else (2, 1) if lead == 0 else (0, 2)))
        for generator in (a, b, *(a + k * b for k in range(1, TRIES + 1))):
            if self.generates(generator):
                return generator, scaled
        return None

    def in_terms_of(
        self, generator: flint.nmod_poly, elements: Sequence[flint.nmod_poly]
    ) -> tuple[Poly, tuple[Poly, ...]]:
        """The minimal polynomial of a generator, and elements as polynomials in it (low degree first)."""
        e, v = self.degree, self.prime
        rows = self.power_rows(generator)
        matrix = flint.nmod_mat(e, e, [rows[j][i] for i in range(e) for j in range(e)], v)
        top = flint.nmod_poly(rows[-1], v) * generator
        wanted = [self.column(c) for c in (*elements, top)]
        right = flint.nmod_mat(e, len(wanted), [column[i] for i in range(e) for column in wanted], v)
        solution = matrix.solve(right)
        columns = [[int(solution[i, k]) for i in range(e)] for k in range(len(wanted))]
        minimal = (*((-c) % v for c in columns.pop()), 1)
        return minimal, tuple(_trim(column) for column in columns)


def _trim(values: list[int]) -> Poly:
    while values and values[-1] == 0:
        values.pop()
    return tuple(values)


__all__ = ["ResidueAlgebra"]
