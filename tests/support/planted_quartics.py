"""Random smooth plane quartics with rational points planted on them; the sweep of `planted` on them.

Points first: the quartics through given points are the small vectors of a lattice of coefficients.
"""

from __future__ import annotations

import random
from math import gcd

import flint

from sieve.curves.divisors import Divisor, Point
from sieve.curves.line_search import line_places
from sieve.curves.plane import PlaneCurve, SingularPlaneCurve, monomials
from sieve.errors import Inconsistent
from tests.support.planted import Planted, Tally, group_of_points, spoil, survive


def normalised(x: int, y: int, z: int) -> Point:
    content = gcd(x, y, z)
    lead = z or x or y
    sign = 1 if lead > 0 else -1
    return sign * x // content, sign * y // content, sign * z // content


def planted_quartic(rng: random.Random) -> tuple[PlaneCurve, tuple[Point, ...]]:
    """A smooth quartic with 3 to 5 planted rational points, small coefficients."""
    exponents = monomials(4)
    while True:
        points: set[Point] = set()
        wanted = rng.choice([3, 3, 4, 5])
        while len(points) < wanted:
            x, y, z = (rng.choice([-2, -1, -1, 0, 0, 1, 1, 2]) for _ in range(3))
            if (x, y, z) != (0, 0, 0):
                points.add(normalised(x, y, z))
        rows = [[x**i * y**j * z**k for i, j, k in exponents] for x, y, z in sorted(points)]
        matrix = flint.fmpz_mat(rows)
        kernel, rank = matrix.nullspace()
        if rank < len(exponents) - wanted:
            continue
        basis = flint.fmpz_mat([[int(kernel[i, j]) for i in range(15)] for j in range(rank)]).lll()
        combination = [0] * 15
        for j in range(rank):
            factor = rng.randint(-1, 1)
            combination = [a + factor * int(basis[j, i]) for i, a in enumerate(combination)]
        if not 0 < max(map(abs, combination)) <= 30:
            continue
        try:
            curve = PlaneCurve({e: c for e, c in zip(exponents, combination, strict=True) if c})
        except SingularPlaneCurve:
            continue
        assert all(curve.contains(p) for p in points)
        return curve, tuple(sorted(points))


def plant_quartic(rng: random.Random) -> Planted:
    """A random quartic, a base among its planted points or a divisor, the group of the differences."""
    curve, points = planted_quartic(rng)
    place = curve.place_of_point
    base = Divisor.of([(1, place(rng.choice(points)))])
    if rng.random() < 0.3:
        # a divisor of degree 1 that is no rational point
        closed = line_places(curve, points, 0)
        if closed and rng.random() < 0.7:
            two = [p for p in closed if p.degree == 2]
            base = Divisor.of([(1, two[0])]) - base if two else base
        else:
            a, b = rng.sample(points, 2)
            base = Divisor.of([(1, place(a)), (1, place(b))]) - base
    return Planted(curve, points, base, group_of_points(curve, points, base))


def sweep_quartics(seed: str, count: int) -> Tally:
    """`count` random quartics, each with the right group and with a wrong one."""
    tally = Tally()
    for i in range(count):
        rng = random.Random(f"quartic {seed} {i}")
        try:
            planted = plant_quartic(rng)
        except Inconsistent as error:
            tally.counts[f"refused: {str(error)[:60]}"] += 1
            continue
        tally.counts["quartics"] += 1
        tally.counts[f"rank {planted.rank}"] += 1
        known = rng.random() < 0.5
        investigation = planted.group
        if not known:
            n = investigation.size
            unit = [[int(i == j) for j in range(n)] for i in range(n)]
            investigation = planted.with_group(unit, planted.rank, investigation.orders)
        survive(rng, planted, investigation, planted.coordinates, tally)
        spoil(rng, planted, tally)
    return tally
