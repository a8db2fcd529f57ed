"""Vectors over Q_p with one absolute precision, and linear equations with integer coefficients for them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

from flint import fmpz_mat

from sieve.errors import InternalError, PrecisionLost
from sieve.exact.padic_number import PadicNumber, valuation


@dataclass(frozen=True)
class PadicVector:
    """The vector numerators / p^shift + O(p^precision) of Q_p^g.

    Use `of` to make one: it reduces numerators modulo p^(precision + shift) and takes `shift` >= 0 as small
    as possible, so that equal balls have equal fields.

    >>> a = PadicVector.of(5, (5, 126), 1, 2)
    >>> a.numerators, a.shift, (a + a).numerators, (5 * a).precision
    ((5, 1), 1, (10, 2), 3)
    """

    prime: int
    numerators: tuple[int, ...]
    shift: int
    precision: int

    @staticmethod
    def of(prime: int, numerators: Sequence[int], shift: int, precision: int) -> PadicVector:
        """The normalised vector; any integers, `shift` may be negative."""
        if shift < 0:
            numerators, shift = [a * prime**-shift for a in numerators], 0
        modulus = prime ** max(0, precision + shift)
        reduced = [a % modulus for a in numerators]
        while shift > 0 and all(a % prime == 0 for a in reduced):
            reduced = [a // prime for a in reduced]
            shift -= 1
        return PadicVector(prime, tuple(reduced), shift, precision)

    @staticmethod
    def zero(prime: int, length: int, precision: int) -> PadicVector:
        """The ball around 0."""
        return PadicVector(prime, (0,) * length, 0, precision)

    @property
    def is_zero(self) -> bool:
        """Zero to the known precision."""
        return not any(self.numerators)

    @property
    def numbers(self) -> tuple[PadicNumber, ...]:
        """The entries as p-adic numbers."""
        return tuple(PadicNumber.padic(self.prime, a, -self.shift, self.precision) for a in self.numerators)

    def __add__(self, other: PadicVector) -> PadicVector:
        return combine([(Fraction(1), self), (Fraction(1), other)])

    def __neg__(self) -> PadicVector:
        return combine([(Fraction(-1), self)])

    def __sub__(self, other: PadicVector) -> PadicVector:
        return combine([(Fraction(1), self), (Fraction(-1), other)])

    def __rmul__(self, factor: int | Fraction) -> PadicVector:
        return combine([(Fraction(factor), self)])

    def to_precision(self, precision: int) -> PadicVector:
        """The same vector with absolute precision at most `precision`."""
        if precision >= self.precision:
            return self
        return PadicVector.of(self.prime, self.numerators, self.shift, precision)

    def scaled(self, shift: int, modulus: int) -> tuple[int, ...]:
        """The entries of p^shift times the vector modulo `modulus`, a power of p.

        Raises `PrecisionLost` when they are not known that far, `InternalError` when they are not integral.

        >>> PadicVector.of(5, (1, 50), 1, 2).scaled(1, 25)
        (1, 0)
        """
        if shift < self.shift:
            raise InternalError(f"p^{shift} times a vector with denominator p^{self.shift}")
        exponent = valuation(modulus, self.prime)
        if exponent > self.precision + shift:
            raise PrecisionLost(self.prime, self.precision + shift, exponent, "a vector of integrals")
        return tuple(a * self.prime ** (shift - self.shift) % modulus for a in self.numerators)

    def agrees(self, other: PadicVector) -> bool:
        """Whether the two may be equal, as far as both are known."""
        return (self - other).is_zero


def combine(terms: Sequence[tuple[Fraction, PadicVector]]) -> PadicVector:
    """A linear combination with exact rational coefficients, known as far as every term is.

    A term with coefficient 0 keeps its own precision: it stands for an exact zero and bounds nothing else, so
    it is left out unless it is alone.  Raises `InternalError` for no terms.
    """
    if not terms:
        raise InternalError("an empty combination has no precision")
    used = [(c, v) for c, v in terms if c] or [(Fraction(0), terms[0][1])]
    prime = used[0][1].prime
    powers = [valuation(c, prime) if c else 0 for c, _ in used]
    precision = min(v.precision + e for (_, v), e in zip(used, powers, strict=True))
    shift = max(0, *(v.shift - e for (_, v), e in zip(used, powers, strict=True)))
    modulus = prime ** max(1, precision + shift)
    total = [0] * len(used[0][1].numerators)
    for (c, v), e in zip(used, powers, strict=True):
        unit = c / Fraction(prime) ** e
        factor = unit.numerator * pow(unit.denominator, -1, modulus) * prime ** (shift - v.shift + e)
        total = [t + factor * a for t, a in zip(total, v.numerators, strict=True)]
    return PadicVector.of(prime, total, shift, precision)


def integer_combination(
    factors: Sequence[int], vectors: Sequence[PadicVector], divisor: int = 1
) -> PadicVector:
    """sum factors[i] vectors[i] / divisor, as `combine` does it, for integers that are not all 0.

    >>> v = PadicVector.of(5, (5, 126), 1, 2)
    >>> integer_combination((2, 0, 4), (v, v, v), 25) == combine([(Fraction(6, 25), v)])
    True
    """
    used = [(k, v) for k, v in zip(factors, vectors, strict=True) if k]
    prime = used[0][1].prime
    lost = valuation(divisor, prime)
    precision = min(v.precision if k % prime else v.precision + valuation(k, prime) for k, v in used)
    shift = max(v.shift for _, v in used)
    scaled = [(k if v.shift == shift else k * prime ** (shift - v.shift), v.numerators) for k, v in used]
    total = [sum(k * n[j] for k, n in scaled) for j in range(len(used[0][1].numerators))]
    unit = pow(divisor // prime**lost, -1, prime ** max(1, precision + shift))
    return PadicVector.of(prime, [unit * c for c in total], shift + lost, precision - lost)


def independent_rows(matrix: Sequence[Sequence[int]], prime: int, columns: int) -> list[int]:
    """Indices of `columns` rows that span the same lattice over Z_p as all rows, in increasing order.

    Arguments: an integer matrix with `columns` columns.  Elimination with pivots of least valuation, modulo a
    power of p above the p-part of every minor (Hadamard's bound).  Raises `InternalError` when the rank is
    too small.

    >>> independent_rows([(3, 0), (1, 1), (0, 1)], 3, 2)
    [1, 2]
    """
    exponent, size = 1, 1
    longest = sorted((sum(c * c for c in row) for row in matrix), reverse=True)[:columns]
    for norm in longest:
        size *= max(1, norm)
    while prime ** (2 * exponent) <= size:
        exponent += 1
    modulus = prime ** (exponent + 1)
    rows = [[c % modulus for c in row] for row in matrix]
    free, chosen, open_columns = list(range(len(rows))), [], list(range(columns))
    for _ in range(columns):
        found = [(valuation(rows[i][j], prime), i, j) for i in free for j in open_columns if rows[i][j]]
        best = min(found, default=None)
        if best is None:
            raise InternalError(f"the relations have rank below {columns}")
        v, i, j = best
        free.remove(i)
        open_columns.remove(j)
        chosen.append(i)
        inverse = pow(rows[i][j] // prime**v, -1, modulus)
        for k in free:
            if rows[k][j]:
                factor = rows[k][j] // prime**v * inverse
                rows[k] = [(a - factor * b) % modulus for a, b in zip(rows[k], rows[i], strict=True)]
    return sorted(chosen)


def rational_inverse(matrix: Sequence[Sequence[int]]) -> list[list[Fraction]]:
    """The inverse of a square nonsingular integer matrix.

    >>> rational_inverse([[2, 1], [0, 1]])
    [[Fraction(1, 2), Fraction(-1, 2)], [Fraction(0, 1), Fraction(1, 1)]]
    """
    n = len(matrix)
    if n == 0:
        return []
    inverse = fmpz_mat([list(row) for row in matrix]).inv()
    return [[Fraction(int(inverse[i, j].p), int(inverse[i, j].q)) for j in range(n)] for i in range(n)]
