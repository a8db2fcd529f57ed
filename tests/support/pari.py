"""Orders from PARI, the reference for point counts (`hyperellcharpoly` at 1)."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache

from cypari import pari


def _polynomial(c: Sequence[int]) -> str:
    return "+".join(f"({int(a)})*x^{i}" for i, a in enumerate(c)) or "0"


@cache
def _jacobian_order(v: int, f: tuple[int, ...], h: tuple[int, ...]) -> int:
    return int(pari(f"subst(hyperellcharpoly(Mod(1,{v})*[{_polynomial(f)}, {_polynomial(h)}]), 'x, 1)"))


def jacobian_order(v: int, f: Sequence[int], h: Sequence[int]) -> int:
    """#J(F_v) for y^2 + h y = f, v an odd prime of good reduction; cached."""
    return _jacobian_order(v, tuple(f), tuple(h))
