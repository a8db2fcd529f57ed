"""Plane quartics of the reference data, and places that lines cut out."""

from __future__ import annotations

import json
import random
from collections.abc import Sequence
from functools import cache
from pathlib import Path

import flint

from sieve.curves.algebras import fractions_of
from sieve.curves.divisors import Place, Point
from sieve.curves.plane import PlaneCurve

DATA = Path(__file__).parents[2] / "data" / "reference" / "quartics.json"


@cache
def quartics() -> dict[str, tuple[PlaneCurve, tuple[Point, ...]]]:
    """Name: (curve, known rational points)."""
    out = {}
    for case in json.loads(DATA.read_text()):
        terms = case["equations"][0] if len(case["equations"]) == 1 else case["equations"]
        curve = PlaneCurve({(i, j, k): c for (i, j, k), c in terms})
        points = tuple(curve.normalise(*point) for point in case["points"]["points"])
        out[case["id"]] = curve, points
    return out


def line_places(curve: PlaneCurve, start: Sequence[int], other: Sequence[int]) -> list[tuple[int, Place]]:
    """The zeros of the line through two points, with multiplicities; empty if the second is one of them."""
    line = [flint.fmpq_poly([a, b]) for a, b in zip(start, other, strict=True)]
    total = flint.fmpq_poly([])
    for exponents, c in curve.terms.items():
        term = flint.fmpq_poly([c])
        for base, exponent in zip(line, exponents, strict=True):
            term *= base**exponent
        total += term
    if total.degree() < curve.degree:
        return []
    whole = flint.fmpz_poly([int(c) for c in (total * total.denom()).coeffs()])
    out = []
    for factor, multiplicity in whole.factor()[1]:
        modulus = fractions_of(flint.fmpq_poly([int(c) for c in factor.coeffs()]))
        out.append((int(multiplicity), curve.closed_point(modulus, *(fractions_of(c) for c in line))))
    return out


def random_line(
    curve: PlaneCurve, points: Sequence[Point], rng: random.Random
) -> list[tuple[int, Place]]:
    """The zeros of a line, half of the time through a known point."""
    while True:
        start = rng.choice(points) if rng.random() < 0.5 else tuple(rng.randint(-5, 5) for _ in range(3))
        other = tuple(rng.randint(-5, 5) for _ in range(3))
        if _parallel(start, other):
            continue
        found = line_places(curve, start, other)
        if found:
            return found


def _parallel(a: Sequence[int], b: Sequence[int]) -> bool:
    return all(a[i] * b[j] == a[j] * b[i] for i in range(3) for j in range(3))
