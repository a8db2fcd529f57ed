"""The hyperelliptic reference cases, with their points in the model y^2 + h y = f."""

from __future__ import annotations

import json
from collections.abc import Iterator
from dataclasses import dataclass, field
from fractions import Fraction
from functools import cache
from math import isqrt
from pathlib import Path
from typing import Any

from tests.support.cantor import CantorJacobian, Point
from tests.support.pari import jacobian_order
from tests.support.pohlig_hellman import GroupOracle
from tests.support.point_counts import jacobian_order_by_counting

DATA = Path(__file__).resolve().parents[2] / "data" / "reference" / "hyperelliptic.json"


@dataclass(frozen=True)
class ReferenceCase:
    """One curve with what is known about it.

    `f`, `h`: coefficients, low degree first (h may be empty); `rank`: None where it is not recorded;
    `known_points`: weighted coordinates in the model y^2 + h y = f, infinity first, then by x and y;
    `raw`: the record as stored.
    """

    id: str
    genus: int
    f: tuple[int, ...]
    h: tuple[int, ...]
    rank: int | None
    bad_primes: tuple[int, ...]
    known_points: tuple[Point, ...]
    raw: dict[str, Any] = field(repr=False, compare=False, hash=False)

    @property
    def squared(self) -> bool:
        """Whether stored points are on y^2 = 4 f + h^2 instead of the model itself."""
        return "squared_form" in self.raw

    def value_of_h(self, x: int, z: int) -> int:
        """h as a form of degree g + 1."""
        return sum(c * x**i * z ** (self.genus + 1 - i) for i, c in enumerate(self.h))

    def from_stored(self, x: int, y: int, z: int) -> Point:
        """A weighted point of the stored squared form in the model (y_stored = 2 y + h)."""
        if not self.squared:
            return (x, y, z)
        double = y - self.value_of_h(x, z)
        assert double % 2 == 0
        return (x, double // 2, z)

    def on_curve(self, point: Point) -> bool:
        x, y, z = point
        g = self.genus
        value = sum(c * x**i * z ** (2 * g + 2 - i) for i, c in enumerate(self.f))
        return y * y + self.value_of_h(x, z) * y == value

    @property
    def equation(self) -> str:
        """The equation in the notation of case files."""

        def polynomial(c: tuple[int, ...]) -> str:
            return " + ".join(f"({a})*x^{i}" for i, a in reversed(list(enumerate(c))) if a) or "0"

        middle = f" + ({polynomial(self.h)})*y" if any(self.h) else ""
        return f"y^2{middle} = {polynomial(self.f)}"

    # -- relations between the known points --------------------------------------------------------------

    @property
    def relation_points(self) -> tuple[Point, ...]:
        """The points with stored coordinates, the base (all coordinates 0) first; perhaps none."""
        stored = self.raw.get("relations", {}).get("points", [])
        points = [self.from_stored(*p) for p in stored]
        if points and len(stored) == len(self.raw["relations"]["coords_free"]):
            points.insert(0, (1, 0, 0))
        return tuple(points)

    @property
    def relation_coordinates(self) -> tuple[tuple[int, ...], ...]:
        """For each relation point: free coordinates, then torsion coordinates (see `torsion`)."""
        if not self.relation_points:
            return ()
        r = self.raw["relations"]
        width = len(r["coords_free"][0]) + len(self.torsion)
        rows = [
            (*free, *(value for value, _ in torsion))
            for free, torsion in zip(r["coords_free"], r["coords_tors"], strict=True)
        ]
        return ((0,) * width, *rows)

    @property
    def torsion(self) -> tuple[int, ...]:
        """The orders of the torsion coordinates."""
        return tuple(self.raw.get("relations", {}).get("torsion", ()))

    # -- reductions --------------------------------------------------------------------------------------

    def good_primes(self, bound: int, start: int = 2) -> list[int]:
        """Primes start <= v < bound outside `bad_primes` (which holds 2 in every record)."""
        return [v for v in primes(bound) if v >= start and v not in self.bad_primes]

    def order(self, v: int) -> int:
        """#J(F_v): PARI for odd v, by counting for v = 2."""
        if v == 2:
            return jacobian_order_by_counting(2, self.f, self.h, self.genus)
        return jacobian_order(v, self.f, self.h)

    def oracle(self, v: int) -> GroupOracle:
        """Structure and logarithms of J(F_v) by textbook means; cached.  Needs a point of X over F_v."""
        return _oracle(self, v)


@cache
def _oracle(case: ReferenceCase, v: int) -> GroupOracle:
    return GroupOracle(CantorJacobian(v, case.f, case.h, case.genus), case.order(v))


def primes(bound: int) -> list[int]:
    """Primes below `bound`."""
    return [n for n in range(2, bound) if all(n % d for d in range(2, isqrt(n) + 1))]


def _known_points(case: ReferenceCase) -> Iterator[Point]:
    g = case.genus
    top_f = case.f[2 * g + 2] if len(case.f) > 2 * g + 2 else 0
    top_h = case.h[g + 1] if len(case.h) > g + 1 else 0
    disc = top_h * top_h + 4 * top_f
    if disc >= 0 and isqrt(disc) ** 2 == disc:
        for s in sorted({(-top_h + isqrt(disc)) // 2, (-top_h - isqrt(disc)) // 2}):
            yield (1, s, 0)
    affine = case.raw["points"].get("affine_squared_form", [])
    for sx, sy in sorted((Fraction(a), Fraction(b)) for a, b in affine):
        hx = sum(Fraction(c) * sx**i for i, c in enumerate(case.h))
        y = (sy - hx) / 2 if case.squared else sy
        # y z^(g+1) is integral for z the denominator of x, because y is integral over Z[x].
        yield (sx.numerator, int(y * sx.denominator ** (g + 1)), sx.denominator)


@cache
def reference_cases() -> tuple[ReferenceCase, ...]:
    """All cases in the order of the file."""
    cases = []
    for raw in json.loads(DATA.read_text("utf-8")):
        blank = ReferenceCase(
            id=raw["id"],
            genus=raw["genus"],
            f=tuple(raw["f"]),
            h=tuple(raw["h"]),
            rank=raw["rank"],
            bad_primes=tuple(raw["bad_primes"]),
            known_points=(),
            raw=raw,
        )
        points = tuple(_known_points(blank))
        cases.append(ReferenceCase(**{**vars(blank), "known_points": points}))
    return tuple(cases)


def reference_case(name: str) -> ReferenceCase:
    """The case with this id."""
    return next(case for case in reference_cases() if case.id == name)
