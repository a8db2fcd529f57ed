"""Rational primes: tests, lists, factors (through FLINT, at one place)."""

from __future__ import annotations

import flint


def is_prime(n: int) -> bool:
    """Is n a prime?  Proved for n < 2^64 (FLINT's test is deterministic there); a probable prime beyond."""
    return n > 1 and bool(flint.fmpz(n).is_prime())


def primes_below(bound: int, start: int = 2) -> list[int]:
    """All primes q with start <= q < bound, increasing.

    >>> primes_below(12)
    [2, 3, 5, 7, 11]
    """
    return [q for q in range(max(start, 2), bound) if is_prime(q)]


def prime_factors(n: int) -> list[int]:
    """The primes that divide n != 0, increasing."""
    return sorted(int(q) for q, _ in flint.fmpz(abs(n)).factor())


def valuation_of(n: int, prime: int) -> int:
    """The exponent of `prime` in the nonzero integer n."""
    count = 0
    while n % prime == 0:
        n //= prime
        count += 1
    return count
