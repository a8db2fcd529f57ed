"""Effective divisors of a curve over F_v."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any


@dataclass(frozen=True)
class LocalDivisor:
    """An effective divisor over F_v: `units` times U plus points (by index) plus places of higher degree.

    A place is a sortable tuple of tuples whose first entry is a polynomial of its degree.
    """

    units: int
    points: tuple[tuple[int, int], ...]
    places: tuple[tuple[Any, int], ...] = ()


def place_degree(place: Any) -> int:
    """The degree of a place of higher degree over F_v."""
    return len(place[0]) - 1


__all__ = ["LocalDivisor", "place_degree"]
