"""Adapted bases over Z/l^E against plain enumeration."""

from __future__ import annotations

import random
from itertools import product

import pytest

from sieve.exact.primary import Characters, adapt, intersect, intersection_length, span_length


def evaluate(rows, exponents, prime, vector):
    return [sum(a * b for a, b in zip(r, vector, strict=True)) % prime**e
            for r, e in zip(rows, exponents, strict=True)]


def apply(matrix, codes, modulus, divisors):
    out = []
    for row, d in zip(matrix, divisors, strict=True):
        total = sum(a * b for a, b in zip(row, codes, strict=True)) % modulus
        assert total % d == 0
        out.append(total // d)
    return out


def obeys(a, codes):
    modulus = a.basis.prime**a.top
    return all(sum(s * c for s, c in zip(row, codes, strict=True)) % modulus == 0 for row in a.syzygies)


def random_rows(rng, prime, n, m, top=3):
    exponents = [rng.randint(1, top) for _ in range(m)]
    rows = [[rng.randrange(prime**e) * rng.choice([1, 1, prime]) % prime**e for _ in range(n)]
            for e in exponents]
    return rows, exponents


@pytest.mark.parametrize("seed", range(6))
def test_values_go_both_ways(seed):
    rng = random.Random(seed)
    for _ in range(150):
        prime, n, m = rng.choice([2, 3, 5, 101]), rng.randint(1, 4), rng.randint(0, 5)
        rows, exponents = random_rows(rng, prime, n, m)
        a = adapt(prime, rows, exponents)
        modulus = prime**a.top
        assert a.basis.length == span_length(prime, rows, exponents)
        for _ in range(4):
            x = [rng.randint(-10**6, 10**6) for _ in range(n)]
            old, new = evaluate(rows, exponents, prime, x), list(a.basis.values(x))
            assert apply(a.forward, old, modulus, [prime**v for v in a.shifts]) == new
            assert apply(a.backward, new, modulus, [prime ** (a.top - e) for e in exponents]) == old
            assert obeys(a, old)


@pytest.mark.parametrize("seed", range(6))
def test_syzygies_cut_out_the_image(seed):
    rng = random.Random(100 + seed)
    seen = 0
    while seen < 25:
        prime, n, m = rng.choice([2, 3, 5]), rng.randint(1, 2), rng.randint(1, 3)
        rows, exponents = random_rows(rng, prime, n, m, top=2)
        modulus = prime ** max(exponents)
        if modulus**n > 700 or prime ** sum(exponents) > 700:
            continue
        seen += 1
        a = adapt(prime, rows, exponents)
        image = {tuple(evaluate(rows, exponents, prime, x)) for x in product(range(modulus), repeat=n)}
        assert len(image) == a.basis.order
        for codes in product(*(range(prime**e) for e in exponents)):
            assert obeys(a, codes) == (codes in image)


@pytest.mark.parametrize("seed", range(4))
def test_the_adapted_basis_is_onto(seed):
    rng = random.Random(200 + seed)
    for _ in range(40):
        prime, n = rng.choice([2, 3]), rng.randint(1, 3)
        basis = adapt(prime, *random_rows(rng, prime, n, rng.randint(1, 4), top=2)).basis
        reached = {basis.values(x) for x in product(range(prime**2), repeat=n)}
        assert len(reached) == basis.order


@pytest.mark.parametrize("seed", range(6))
def test_intersection(seed):
    rng = random.Random(300 + seed)
    for _ in range(60):
        prime, n = rng.choice([2, 3, 5]), rng.randint(1, 3)
        a = adapt(prime, *random_rows(rng, prime, n, rng.randint(1, 3), top=2)).basis
        b = adapt(prime, *random_rows(rng, prime, n, rng.randint(1, 3), top=2)).basis
        meet = intersect(a, b)
        assert meet.basis.length == intersection_length(a, b) == intersection_length(b, a)
        modulus = prime**meet.top
        divisors = [prime**v for v in meet.shifts]
        pairs = set()
        for x in product(range(prime**2), repeat=n):
            value = list(meet.basis.values(x))
            assert apply(meet.from_a, a.values(x), modulus, divisors) == value
            assert apply(meet.from_b, b.values(x), modulus, divisors) == value
            pairs.add((a.values(x), b.values(x)))
        # the order of the sum by counting pairs of values: |A + B| |A cap B| = |A| |B|
        assert len(pairs) * meet.basis.order == a.order * b.order == len(pairs) * prime**meet.basis.length


def test_no_rows_and_zero_rows():
    empty = adapt(7, [], [])
    assert empty.basis == Characters(7, (), ()) and empty.syzygies == () and empty.top == 0
    zero = adapt(3, [(0, 0)], [2])
    assert zero.basis.rows == () and zero.syzygies == ((1,),) and zero.backward == ((),)
    assert zero.basis.order == 1


def test_truncation():
    a = Characters(2, ((1, 2), (0, 1)), (3, 1))
    assert a.truncated(2) == Characters(2, ((1, 2), (0, 1)), (2, 1))
    assert a.truncated(1) == Characters(2, ((1, 0), (0, 1)), (1, 1))
    assert a.truncated(0).rows == () and a.truncated(9) is a


def test_large_prime_powers_stay_exact():
    prime, e = 2**31 - 1, 4
    a = adapt(prime, [(3, 5), (7, 11)], [e, e])
    x = (10**30, -(10**29))
    codes = evaluate([(3, 5), (7, 11)], [e, e], prime, x)
    assert apply(a.forward, codes, prime**e, [1, 1]) == list(a.basis.values(x))
