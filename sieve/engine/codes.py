"""Arrays of class codes: one int64 column for each basis character, never one huge number.

A class of a quotient Z/q_1 x .. x Z/q_k is a row of k codes 0 <= c_i < q_i with q_i < 2^31, so a product of
two codes fits in int64 whatever the size of the quotient.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

CodeArray = NDArray[np.int64]

#: every modulus of a code column stays below this, so that products of two codes are exact in int64
CODE_LIMIT = 1 << 31
_KEY_LIMIT = 1 << 62


def largest_exponent(prime: int) -> int:
    """The largest e with prime^e < 2^31; 0 when the prime itself is too large.

    >>> largest_exponent(2), largest_exponent(13), largest_exponent(2**31 + 11)
    (30, 8, 0)
    """
    e, power = 0, prime
    while power < CODE_LIMIT:
        e, power = e + 1, power * prime
    return e


def combine(codes: CodeArray, matrix: Sequence[Sequence[int]], modulus: int,
            divisors: Sequence[int]) -> CodeArray:
    """Column i of the result is (sum_k matrix[i][k] codes[:, k] mod modulus) / divisors[i].

    Arguments: int64 codes, shape (count, k), entries in 0..2^31 - 1; rows of k integers; modulus < 2^31;
    divisors that divide the modulus (the sums are multiples of them by construction). Returns: int64, shape
    (count, len(matrix)).

    >>> combine(np.array([[1, 2], [3, 0]]), [[2, 2], [3, 0]], 9, [1, 3]).tolist()
    [[6, 1], [6, 0]]
    """
    out = np.zeros((codes.shape[0], len(matrix)), dtype=np.int64)
    for i, (row, divisor) in enumerate(zip(matrix, divisors, strict=True)):
        column = out[:, i]
        for k, entry in enumerate(row):
            factor = entry % modulus
            if factor:
                # both factors are below 2^31, and the sum of fewer than 2^31 residues is below 2^62
                column += codes[:, k] * factor % modulus
        column %= modulus
        if divisor != 1:
            column //= divisor
    return out


def class_ids(blocks: Sequence[CodeArray], moduli: Sequence[int]) -> list[CodeArray]:
    """One int64 number for each row, equal for equal rows, in lexicographic order, over several arrays at
    once.

    Arguments: arrays of shape (count_b, k) with the same k = len(moduli) and 0 <= column i < moduli[i] <
    2^31. Returns: for each array its ids (shape (count_b,)).  Mixed radix while that stays below 2^62;
    beyond, the ids so far are replaced by their ranks, so k and the product of the moduli may be anything.

    >>> class_ids([np.array([[1, 2], [0, 5]]), np.array([[1, 2]])], [3, 7])
    [array([9, 5]), array([9])]
    """
    counts = [block.shape[0] for block in blocks]
    total = sum(counts)
    ids = np.zeros(total, dtype=np.int64)
    span = 1
    for k, modulus in enumerate(moduli):
        if span * modulus >= _KEY_LIMIT:
            distinct, ids = np.unique(ids, return_inverse=True)
            span = max(1, int(distinct.size))
            if span * modulus >= _KEY_LIMIT:
                raise OverflowError("too many rows to number")
        ids = ids * modulus + np.concatenate([block[:, k] for block in blocks])
        span *= modulus
    return list(np.split(ids.astype(np.int64, copy=False), np.cumsum(counts)[:-1]))


def distinct_rows(codes: CodeArray, moduli: Sequence[int]) -> tuple[CodeArray, CodeArray]:
    """The distinct rows in lexicographic order, and for each given row the number of its distinct row.

    >>> rows, where = distinct_rows(np.array([[2, 0], [1, 1], [2, 0]]), [3, 3])
    >>> rows.tolist(), where.tolist()
    ([[1, 1], [2, 0]], [1, 0, 1])
    """
    (ids,) = class_ids([codes], moduli)
    _, first, where = np.unique(ids, return_index=True, return_inverse=True)
    return codes[first], where.reshape(-1).astype(np.int64, copy=False)
