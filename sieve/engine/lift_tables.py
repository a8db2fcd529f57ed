"""Tables of lifts: what a condition says of x + j b, j = 0..l-1, in one word for each class of x.

For a step from K to K' of prime index l, b in K not in K', the set of the j that a condition at v allows
depends on the class of x in J(F_v)/phi_v(K') alone.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from sieve.engine.codes import CODE_LIMIT
from sieve.engine.relation import Relation
from sieve.exact.abelian import quotient_by

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

_TABLE = 1 << 18
_SPARE = 32
"""Tables longer than 2^18 are hashed to so many entries for each allowed class."""

_EXACT_FLOAT = 2.0**50


@dataclass(frozen=True, eq=False)
class LiftTable:
    """One condition on one step.

    `moduli`: the group J(F_v)/phi_v(K') as a product of cyclic groups; `weights`, shape (len(moduli), n): the
    images of the unit vectors, entries between -m/2 and m/2; `masks`: bit j of the entry at the key of x says
    whether x + j b is allowed; `strides`: key = sum of strides times codes, modulo the length of the table
    (a power of two) if `hashed`.
    """

    name: str
    moduli: tuple[int, ...]
    weights: FloatArray
    strides: tuple[int, ...]
    hashed: bool
    masks: NDArray[np.unsignedinteger]

    def keys(self, block: FloatArray, bound: float) -> IntArray:
        """The keys of classes, shape (count,), from their coordinates, shape (count, n), of size <= bound."""
        key: IntArray | None = None
        for modulus, row, stride in zip(self.moduli, self.weights, self.strides, strict=True):
            code = residues(row, block, modulus, bound)
            term = code if stride == 1 else code * stride
            key = term if key is None else key + term
        assert key is not None
        return key & (len(self.masks) - 1) if self.hashed else key


def residues(row: FloatArray, block: FloatArray, modulus: int, bound: float) -> IntArray:
    """block . row modulo m, exactly: in floating point below 2^50, in integers beyond."""
    if float(np.abs(row).sum()) * bound < _EXACT_FLOAT:
        value = block @ row
        # value + 1/2 is at least 1/2 away from the multiples of m: the rounding of the quotient is harmless
        quotient = np.floor((value + 0.5) * (1.0 / modulus))
        quotient *= modulus
        value -= quotient
        return value.astype(np.int64)
    total = np.zeros(len(block), dtype=np.int64)
    for weight, coordinates in zip(row.tolist(), block.T, strict=True):
        if weight:
            # both factors are below 2^31
            total += coordinates.astype(np.int64) % modulus * (int(weight) % modulus) % modulus
    return total % modulus


def make_table(relation: Relation, basis: Sequence[Sequence[int]], shift: Sequence[int],
                ell: int) -> LiftTable | None:
    """The table of a condition in J(F_v)/phi_v(K') for K' with this basis; None if it excludes nothing."""
    characters = [(row, m) for part in relation.parts for row, m in zip(part.rows, part.moduli, strict=True)]
    width = len(characters)
    relators = [[m if i == k else 0 for i in range(width)] for k, (_, m) in enumerate(characters)]
    relators += [[sum(c * x for c, x in zip(row, vector, strict=True)) % m for row, m in characters]
                 for vector in basis]
    quotient = quotient_by(width, relators)
    if quotient is None or not quotient.invariants or max(quotient.invariants) >= CODE_LIMIT:
        return None
    moduli = quotient.invariants
    maps = np.array(quotient.coordinates, dtype=np.int64)
    codes = np.zeros((relation.count, len(moduli)), dtype=np.int64)
    for k in range(width):
        # factors below 2^31
        codes += relation.codes[:, k, None] * maps[k] % np.array(moduli, dtype=np.int64)
    codes %= np.array(moduli, dtype=np.int64)
    codes = np.unique(codes, axis=0)
    if len(codes) >= quotient.order:
        return None
    units = [[sum(row[j] * quotient.coordinates[k][i] for k, (row, _) in enumerate(characters)) % m
              for j in range(relation.n)] for i, m in enumerate(moduli)]
    centred = [[u - m if 2 * u > m else u for u in row] for row, m in zip(units, moduli, strict=True)]
    weights = np.array(centred, dtype=np.float64)
    image = [sum(u * x for u, x in zip(row, shift, strict=True)) % m
             for row, m in zip(units, moduli, strict=True)]
    size = max(_TABLE, 1 << (_SPARE * len(codes) - 1).bit_length())
    hashed = quotient.order > size
    strides = [1]
    for m in moduli[:-1]:
        strides.append(strides[-1] * m)
    if hashed:
        # odd numbers; a key is below 4 * 2^31 * 2^29
        strides = [1, *(((1 << 29) * (2 * i + 1) // 7) | 1 for i in range(len(moduli) - 1))]
    masks = np.zeros(size if hashed else quotient.order, dtype=mask_type(ell))
    for j in range(ell):
        key = np.zeros(len(codes), dtype=np.int64)
        for i, m in enumerate(moduli):
            key += (codes[:, i] - j * image[i]) % m * strides[i]
        if hashed:
            key &= size - 1
        masks[key] |= masks.dtype.type(1 << j)
    return LiftTable(relation.name, moduli, weights, tuple(strides), hashed, masks)


def mask_type(bits: int) -> type[np.unsignedinteger]:
    """The shortest unsigned type with so many bits (at most 64)."""
    return next(t for size, t in ((8, np.uint8), (16, np.uint16), (32, np.uint32), (64, np.uint64))
                if bits <= size)


__all__ = ["LiftTable", "make_table", "mask_type", "residues"]
