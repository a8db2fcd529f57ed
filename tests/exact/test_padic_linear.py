"""Vectors over Q_p against exact rational members of their balls; row choice against determinants."""

from __future__ import annotations

import itertools
import random
from fractions import Fraction
from math import gcd

import pytest
from flint import fmpz_mat

from sieve.errors import InternalError, PrecisionLost
from sieve.exact.padic_linear import PadicVector, combine, independent_rows, rational_inverse
from sieve.exact.padic_number import valuation


def members(vector: PadicVector, rng: random.Random) -> list[Fraction]:
    """A random rational member of the ball, entry by entry."""
    p = Fraction(vector.prime)
    step = p**vector.precision
    return [Fraction(a) / p**vector.shift + rng.randrange(-30, 30) * step for a in vector.numerators]


def contains(vector: PadicVector, values: list[Fraction]) -> bool:
    p = Fraction(vector.prime)
    differences = [v - Fraction(a) / p**vector.shift for v, a in zip(values, vector.numerators, strict=True)]
    return all(d == 0 or valuation(d, vector.prime) >= vector.precision for d in differences)


def random_vector(p: int, rng: random.Random) -> PadicVector:
    shift = rng.randrange(0, 3)
    return PadicVector.of(p, [rng.randrange(10**6) for _ in range(2)], shift, rng.randrange(-1, 6))


@pytest.mark.parametrize("seed", range(60))
def test_a_combination_contains_the_combinations_of_members(seed: int) -> None:
    rng = random.Random(seed)
    p = rng.choice([2, 3, 5])
    vectors = [random_vector(p, rng) for _ in range(3)]
    factors = [Fraction(rng.randrange(-9, 10), rng.choice([1, 2, 3, 9, 10])) for _ in range(3)]
    total = combine(list(zip(factors, vectors, strict=True)))
    for _ in range(5):
        exact = [members(v, rng) for v in vectors]
        values = [sum((f * e[i] for f, e in zip(factors, exact, strict=True)), Fraction(0)) for i in range(2)]
        assert contains(total, values)
    used = [v.precision + valuation(f, p) for f, v in zip(factors, vectors, strict=True) if f]
    assert not used or total.precision == min(used)


def test_operators_are_combinations() -> None:
    a, b = PadicVector.of(3, (5, 7), 1, 4), PadicVector.of(3, (1, 0), 0, 2)
    assert a + b == combine([(Fraction(1), a), (Fraction(1), b)])
    assert (a - a).is_zero and not a.is_zero and (-a + a).is_zero
    assert 3 * a == PadicVector.of(3, (5, 7), 0, 5)
    assert (Fraction(1, 3) * b).precision == 1
    assert a.agrees(a.to_precision(1)) and not a.agrees(a + PadicVector.of(3, (1, 0), 0, 4))
    assert a.to_precision(9) is a


def test_equal_balls_have_equal_fields() -> None:
    assert PadicVector.of(5, (25, 50), 2, 1) == PadicVector.of(5, (1, 2), 0, 1)
    assert PadicVector.of(5, (1 + 5**3, 0), 1, 2) == PadicVector.of(5, (1, 5**3), 1, 2)
    assert PadicVector.of(5, (1, 2), -1, 3) == PadicVector.of(5, (5, 10), 0, 3)


def test_numbers_and_scaling() -> None:
    vector = PadicVector.of(7, (3, 14), 1, 2)
    assert [str(x) for x in vector.numbers] == ["3*7^-1 + O(7^2)", "2 + O(7^2)"]
    assert vector.scaled(1, 7**3) == (3, 14) and vector.scaled(2, 49) == (21, 0)
    with pytest.raises(InternalError):
        vector.scaled(0, 7)
    with pytest.raises(PrecisionLost):
        vector.scaled(1, 7**4)


def test_no_terms_and_zero_terms() -> None:
    with pytest.raises(InternalError):
        combine([])
    zero = combine([(Fraction(0), PadicVector.of(3, (1,), 0, 4))])
    assert zero.is_zero and zero.precision == 4


@pytest.mark.parametrize("seed", range(30))
def test_chosen_rows_span_the_lattice_of_all_rows(seed: int) -> None:
    """Over Z_p that means: the determinant of the choice is as divisible by p as the gcd of all minors."""
    rng = random.Random(seed)
    p, columns = rng.choice([2, 3, 5]), rng.randrange(1, 4)
    count = columns + 3
    rows = [[rng.choice([1, p, p * p]) * rng.randrange(-6, 7) for _ in range(columns)] for _ in range(count)]
    choices = itertools.combinations(range(count), columns)
    minors = [int(fmpz_mat([rows[i] for i in choice]).det()) for choice in choices]
    if not any(minors):
        with pytest.raises(InternalError):
            independent_rows(rows, p, columns)
        return
    chosen = independent_rows(rows, p, columns)
    assert chosen == sorted(set(chosen)) and len(chosen) == columns
    determinant = int(fmpz_mat([rows[i] for i in chosen]).det())
    assert valuation(determinant, p) == valuation(gcd(*minors), p)


def test_no_columns() -> None:
    assert independent_rows([], 5, 0) == [] and rational_inverse([]) == []


def test_inverse() -> None:
    matrix = [[2, 1, 0], [0, 3, 5], [1, 1, 1]]
    inverse = rational_inverse(matrix)
    product = [[sum(a * b for a, b in zip(row, column, strict=True)) for column in zip(*inverse, strict=True)]
               for row in matrix]
    assert product == [[int(i == j) for j in range(3)] for i in range(3)]
