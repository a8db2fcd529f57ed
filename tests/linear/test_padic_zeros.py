"""Zeros of p-adic power series: against polynomials whose zeros are known, and against counting residues."""

from __future__ import annotations

from math import prod

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sieve.exact.padic_zeros import common_zeros, zero_count

PRIMES = st.sampled_from([3, 5, 7])


def from_roots(roots: list[int], factor: int = 1) -> list[int]:
    """Coefficients of factor * prod (s - root), low degree first."""
    poly = [factor]
    for r in roots:
        poly = [a - r * b for a, b in zip([0, *poly], [*poly, 0], strict=True)]
    return poly


@settings(max_examples=150, deadline=None)
@given(PRIMES, st.lists(st.integers(-200, 200), min_size=1, max_size=5), st.integers(0, 3))
def test_integral_zeros_are_all_found_and_told_apart(p: int, roots: list[int], power: int) -> None:
    precision, deepest = 60, 12
    balls = common_zeros([from_roots(roots, p**power)], p, precision, deepest)
    for ball in balls:
        inside = [r for r in roots if (r - ball.value) % p**ball.digits == 0]
        assert len(inside) == ball.multiplicity
        assert ball.digits >= deepest
    assert sum(ball.multiplicity for ball in balls) == len(roots)
    # 400 < 3^12: different roots differ in a digit that is looked at
    assert len(balls) == len(set(roots))


@settings(max_examples=100, deadline=None)
@given(
    PRIMES,
    st.lists(st.integers(-60, 60), min_size=1, max_size=4),
    st.lists(st.integers(-60, 60), max_size=4),
)
def test_common_zeros(p: int, first: list[int], second: list[int]) -> None:
    """Of two series exactly the common zeros are left; a shared zero that is simple once is found as such."""
    both = set(first) & set(second)
    balls = common_zeros([from_roots(first), from_roots(second)], p, 80, 8)
    assert len(balls) == len(both)
    for root in both:
        ball = next(b for b in balls if (root - b.value) % p**b.digits == 0)
        assert ball.multiplicity == min(first.count(root), second.count(root))


@settings(max_examples=100, deadline=None)
@given(PRIMES, st.lists(st.integers(-30, 30), max_size=4), st.lists(st.integers(1, 30), max_size=3))
def test_zero_count_is_the_number_of_integral_roots(p: int, inside: list[int], outside: list[int]) -> None:
    """1 - p c s has its zero outside Z_p and does not count."""
    poly = from_roots(inside)
    for c in outside:
        poly = [a - p * c * b for a, b in zip([*poly, 0], [0, *poly], strict=True)]
    assert zero_count(poly, p, 40) == len(inside)


@settings(max_examples=60, deadline=None)
@given(PRIMES, st.lists(st.integers(-50, 50), min_size=2, max_size=5))
def test_every_zero_modulo_a_power_lies_in_a_ball(p: int, poly: list[int]) -> None:
    """A zero of an arbitrary polynomial modulo p^4 need not lift, but a zero in Z_p is one modulo p^4."""
    if all(c % p**4 == 0 for c in poly):
        return
    balls = common_zeros([poly], p, 4, 4)
    for s in range(p**4):
        exact = sum(c * s**i for i, c in enumerate(poly)) == 0
        if exact:
            assert any((s - b.value) % p**b.digits == 0 for b in balls)


def test_more_digits_refine() -> None:
    """The balls at a higher precision lie in those at a lower one."""
    poly = [prod(range(1, 6)), 17, -25, 3, 1]
    coarse, fine = common_zeros([poly], 5, 6, 6), common_zeros([poly], 5, 12, 12)
    for ball in fine:
        assert any((ball.value - c.value) % 5 ** min(c.digits, ball.digits) == 0 for c in coarse)
    assert sum(b.multiplicity for b in fine) <= sum(b.multiplicity for b in coarse)


def test_a_series_that_vanishes_to_the_known_digits_says_nothing() -> None:
    assert zero_count([27, 54], 3, 3) is None
    (ball,) = common_zeros([[27, 54]], 3, 3, 3)
    assert (ball.digits, ball.multiplicity) == (0, 0)
    # beside another series it is left out
    assert common_zeros([[27, 54], [-1, 1]], 3, 3, 3) == common_zeros([[-1, 1]], 3, 3, 3)


@pytest.mark.parametrize("poly", [[2, 0, 1], [1, 0, 1, 3]])
def test_no_zero_in_the_field(poly: list[int]) -> None:
    """-2 is no square modulo 5, and s^2 + 1 has no zero modulo 3: zeros over the closure, none in Z_p."""
    p = 5 if poly[0] == 2 else 3
    assert zero_count(poly, p, 10) == 2
    assert common_zeros([poly], p, 10, 10) == []
