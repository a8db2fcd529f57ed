"""The plane quartics of the reference data, and case and candidate files for plane curves."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from pathlib import Path

from sieve.curves.divisors import Divisor, Point, RationalPlace
from sieve.curves.plane import PlaneCurve
from sieve.curves.protocol import Curve
from sieve.engine.problem import Problem
from sieve.files.notation_out import form_text
from sieve.files.resolve import read_case
from tests.support.run_files import numbered, random_points, write_json

DATA = Path(__file__).resolve().parents[2] / "data" / "reference" / "quartics.json"


@dataclass(frozen=True)
class QuarticCase:
    """One quartic of the reference data; `rank` None where it is not recorded."""

    id: str
    terms: tuple[tuple[tuple[int, int, int], int], ...]
    rank: int | None
    points: tuple[Point, ...]

    @property
    def curve(self) -> PlaneCurve:
        return PlaneCurve(dict(self.terms))

    @property
    def known_points(self) -> tuple[Point, ...]:
        """In the order of the data, as the curve writes them."""
        return tuple(self.curve.from_user(*p) for p in self.points)


@cache
def quartic_cases() -> tuple[QuarticCase, ...]:
    out = []
    for raw in json.loads(DATA.read_text("utf-8")):
        equation = raw["equations"]
        if isinstance(equation[0][0][0], list):
            (equation,) = equation
        terms = tuple(((e[0], e[1], e[2]), c) for e, c in equation)
        rank = raw["rank"] if isinstance(raw["rank"], int) else None
        points = tuple((x, y, z) for x, y, z in raw["points"]["points"])
        out.append(QuarticCase(raw["id"], terms, rank, points))
    return tuple(out)


def quartic_case(name: str) -> QuarticCase:
    return next(case for case in quartic_cases() if case.id == name)


def quartic_problem(case: QuarticCase) -> Problem:
    """The known points with the group that they generate."""
    assert case.rank is not None
    base = Divisor.of([(1, RationalPlace(case.known_points[0]))])
    points = case.known_points
    return Problem(case.id, case.curve, base, (), (), points, case.rank, "data", from_known_points=True)


def plane_case_text(
    curve: Curve, name: str, rank: int, points: Sequence[Point],
    more: str = 'generators_from = "known_points"',
) -> str:
    """A case file with the first point as base."""
    known = json.dumps([curve.format_point(p) for p in points])
    return f"""format = "sieve-case/1"
name = "{name}"
known_points = {known}

[curve]
equation = "{form_text(curve)} = 0"
variables = {json.dumps(list(curve.variables))}

[jacobian]
rank = {rank}
rank_source = "the reference data"
base = "{curve.format_point(points[0])}"
{more}
"""


def moved(curve: PlaneCurve, matrix: list[list[int]]) -> PlaneCurve:
    """The curve F(M (X, Y, Z)) = 0."""
    total: dict[tuple[int, int, int], int] = {}
    for exponents, c in curve.terms.items():
        product = {(0, 0, 0): c}
        for row, exponent in zip(matrix, exponents, strict=True):
            for _ in range(exponent):
                longer: dict[tuple[int, int, int], int] = {}
                for (i, j, k), a in product.items():
                    for key, b in zip(((i + 1, j, k), (i, j + 1, k), (i, j, k + 1)), row, strict=True):
                        longer[key] = longer.get(key, 0) + a * b
                product = longer
        for key, a in product.items():
            total[key] = total.get(key, 0) + a
    return PlaneCurve(total)


def write_quartic(case: QuarticCase, directory: Path) -> Path:
    assert case.rank is not None
    path = directory / f"{case.id}.toml"
    path.write_text(plane_case_text(case.curve, case.id, case.rank, case.known_points), "utf-8")
    return path


def write_plane_candidates(
    case: Path, path: Path, p: int, digits: int, count: int, *, complete: bool = True, seed: int = 1
) -> Path:
    """The known points of a case file and random points over Q_p."""
    problem = read_case(case)
    points = [problem.curve.format_point(q) for q in problem.known_points]
    points += random_points(problem.curve, p, digits, count, seed)
    return write_json(path, p, digits, numbered(points), complete)
