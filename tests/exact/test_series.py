"""Series modulo p^N: factors, distinguished polynomials, power sums, integrals, against slow definitions."""

from __future__ import annotations

import random
from fractions import Fraction

import pytest

from sieve.errors import InternalError
from sieve.exact.series import (
    coefficients,
    distinguished_polynomial,
    evaluate_at,
    floor_log,
    integral_length,
    integral_terms,
    lift_factor,
    polynomial,
    power_sums,
)


@pytest.mark.parametrize("p", [2, 3, 5, 19])
@pytest.mark.parametrize("roots", [1, 2, 3, 7])
@pytest.mark.parametrize("precision", [1, 2, 5, 12])
def test_integral_length_is_the_least_possible(p: int, roots: int, precision: int) -> None:
    def small(k: int) -> bool:
        return -(-k // roots) - floor_log(k, p) >= precision

    length = integral_length(p, roots, precision)
    assert all(small(k) for k in range(length + 1, length + 5 * roots * (precision + 10)))
    assert length == 0 or not small(length)


@pytest.mark.parametrize("n", [1, 2, 7, 8, 9, 1000])
def test_floor_log(n: int) -> None:
    e = floor_log(n, 2)
    assert 2**e <= n < 2 ** (e + 1)


@pytest.mark.parametrize("seed", range(20))
def test_a_factor_is_lifted_to_a_factor(seed: int) -> None:
    rng = random.Random(seed)
    p, exponent = rng.choice([2, 3, 7]), rng.randrange(1, 12)
    degree, modulus = rng.randrange(1, 4), p**exponent
    # (t^degree + p ..) times a polynomial with unit constant term: coprime modulo p
    low = polynomial([p * rng.randrange(modulus) for _ in range(degree)] + [1], modulus)
    high = polynomial([1 + p * rng.randrange(modulus)] + [rng.randrange(modulus) for _ in range(6)], modulus)
    assert lift_factor(low * high, [0] * degree + [1], p, exponent) == low


def test_a_factor_with_any_roots_is_lifted() -> None:
    p, exponent = 5, 8
    first, second = polynomial([7, 1, 1], p**exponent), polynomial([3, 11, 1], p**exponent)
    lifted = lift_factor(first * second, [2, 1, 1], p, exponent)
    assert lifted == first


@pytest.mark.parametrize("factor", [[1, 1], [0, 0, 1]])
def test_what_cannot_be_lifted_is_refused(factor: list[int]) -> None:
    """t + 1 does not divide t^3 (t + 2) modulo 5; t^2 is not coprime to its cofactor."""
    with pytest.raises(InternalError):
        lift_factor(polynomial([0, 0, 0, 2, 1], 5**3), factor, 5, 3)


@pytest.mark.parametrize("seed", range(20))
def test_distinguished_polynomial_of_a_product_with_a_unit(seed: int) -> None:
    rng = random.Random(seed)
    p, exponent, order = rng.choice([2, 3, 5]), rng.randrange(1, 9), rng.randrange(1, 5)
    modulus, length = p**exponent, order * exponent + 1
    monic = polynomial([p * rng.randrange(modulus) for _ in range(order)] + [1], modulus)
    tail = [rng.randrange(modulus) for _ in range(3 * length)]
    unit = polynomial([1 + p * rng.randrange(modulus), *tail], modulus)
    series = (monic * unit).truncate(length)
    assert distinguished_polynomial(series, p, exponent) == monic


def test_distinguished_polynomial_of_units_and_of_zero() -> None:
    assert distinguished_polynomial(polynomial([2, 3], 27), 3, 3) == polynomial([1], 27)
    with pytest.raises(InternalError):
        distinguished_polynomial(polynomial([3, 6, 9], 27), 3, 3)


@pytest.mark.parametrize("roots", [[], [4], [-3], [1, 2], [5, 5, -1], [2, 0, 7, -9]])
def test_power_sums_of_known_roots(roots: list[int]) -> None:
    monic = [1]
    for root in roots:
        monic = [a - root * b for a, b in zip([0, *monic], [*monic, 0], strict=True)]
    assert power_sums(monic, 9, 10**6) == [sum(r**k for r in roots) % 10**6 for k in range(1, 10)]


@pytest.mark.parametrize("p", [2, 3, 7])
def test_integral_terms_are_the_divided_coefficients(p: int) -> None:
    exponent, count = 6, 20
    shift = floor_log(count, p)
    form = [3 * k * k + 1 for k in range(count)]
    terms = integral_terms(polynomial(form, p**exponent), count, p, exponent, shift)
    for k, (a, term) in enumerate(zip(form, terms, strict=True), start=1):
        exact = Fraction(a % p**exponent, k) * p**shift
        assert (exact.numerator - term * exact.denominator) % p**exponent == 0


@pytest.mark.parametrize("series", [[2, 1], [3], [1, 2, 0, 5]])
def test_evaluation_at_a_series(series: list[int]) -> None:
    modulus, length = 81, 6
    value, power = polynomial([0], modulus), polynomial([1], modulus)
    for c in (5, 0, 7, 1):
        value, power = value + c * power, power * polynomial(series, modulus)
    expected = coefficients(value, length)
    assert coefficients(evaluate_at([5, 0, 7, 1], polynomial(series, modulus), length), length) == expected
