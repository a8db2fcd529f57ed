"""A condition: what the rational points of X look like in one finite abelian group."""

from __future__ import annotations

from dataclasses import dataclass
from math import prod

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True)
class Condition:
    """A homomorphism L -> A and the set of allowed classes in A.

    If P is a rational point of X and iota(P) is the image of a in L (locally at the primes the user of the
    condition may use), then the image of a in A is one of the allowed classes.

    Fields: `name` (as reports print it, "v = 59"); `prime` (residue characteristic); `moduli` (A is the
    product of Z/m for these m > 1, m < 2^62, not necessarily prime powers); `images` (one row for each
    generator of L, entries reduced); `allowed` (int64, shape (count, len(moduli)), distinct rows, count may
    be 0); `labels` (for candidates: the ids that share each allowed row; None for auxiliary primes);
    `complete` (labelled conditions only: every rational point lies in one of the classes).
    """

    name: str
    prime: int
    moduli: tuple[int, ...]
    images: tuple[tuple[int, ...], ...]
    allowed: NDArray[np.int64]
    labels: tuple[tuple[str, ...], ...] | None = None
    complete: bool = True

    @property
    def order(self) -> int:
        """The order of A."""
        return prod(self.moduli)

    @property
    def count(self) -> int:
        """The number of allowed classes."""
        return int(self.allowed.shape[0])
