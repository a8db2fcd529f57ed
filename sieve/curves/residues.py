"""Arrays of residues modulo a prime."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

IntArray = NDArray[np.int64]
FloatArray = NDArray[np.float64]


def inverse_table(v: int) -> IntArray:
    """Inverses of 0 .. v-1 modulo the prime v (0 for 0), as powers with exponent v - 2; int64, v < 2^31."""
    base = np.arange(v, dtype=np.int64)
    result = np.ones_like(base)
    exponent = v - 2
    while exponent:
        if exponent & 1:
            result = result * base % v
        base = base * base % v
        exponent >>= 1
    result[0] = 0
    return result


def power_table(values: IntArray, degree: int, v: int) -> IntArray:
    """values^0 .. values^degree modulo v; int64, shape (degree + 1, len(values)); v < 2^31."""
    out = np.ones((degree + 1, len(values)), dtype=np.int64)
    for k in range(1, degree + 1):
        out[k] = out[k - 1] * values % v
    return out


def zeros_modulo(values: FloatArray, v: int) -> NDArray[np.bool_]:
    """Which entries, exact integers below 2^53, are divisible by v."""
    quotient = values * (1.0 / v)
    np.rint(quotient, out=quotient)
    quotient *= v
    return np.asarray(quotient == values)


__all__ = ["inverse_table", "power_table", "zeros_modulo"]
