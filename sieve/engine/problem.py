"""The problem as mathematics: a curve, a base divisor, generators, premises; no files."""

from __future__ import annotations

from dataclasses import dataclass

from sieve.curves.divisors import Divisor, Point
from sieve.curves.protocol import Curve


@dataclass(frozen=True)
class Problem:
    """What the user claims and what the engine works with.

    Fields: `base`, a divisor of degree 1, or of degree 2 (then [2 P - base] takes the place of [P - base]);
    `generators`, r divisors of degree 0 (none with `from_known_points`: then a basis of the group generated
    by the differences of the known points, and by
    `torsion`, is computed); `torsion`, pairs (claimed order, divisor of degree 0); `known_points`,
    normalised, distinct; `rank`, the claimed rank of J(Q), with its source; `index_prime_to`, primes that
    do not divide [J(Q) : G] on the user's word, with the source; `integral`, whether the integral points of
    the affine equation are asked for, and not all rational points.
    """

    name: str
    curve: Curve
    base: Divisor
    generators: tuple[Divisor, ...]
    torsion: tuple[tuple[int, Divisor], ...]
    known_points: tuple[Point, ...]
    rank: int
    rank_source: str
    index_prime_to: tuple[int, ...] = ()
    index_source: str = ""
    from_known_points: bool = False
    integral: bool = False

    def asks_for(self, point: Point) -> bool:
        """Whether a rational point of the curve is one of those in question."""
        return not self.integral or point[2] == 1
