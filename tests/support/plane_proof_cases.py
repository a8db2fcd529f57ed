"""Runs on smooth plane curves, and one of integral points, whose logs are in the corpus of data/proofs."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from sieve.curves.divisors import Point
from sieve.curves.plane import PlaneCurve
from tests.support.plane_cases import plane_case_text, quartic_case, write_plane_candidates, write_quartic
from tests.support.reference_cases import reference_case
from tests.support.run_files import run_to, write_candidates, write_case, write_json


def _quartic(
    name: str, p: int, digits: int, count: int, seed: int, *, complete: bool = True
) -> Callable[[Path], Path]:
    """A quartic of the reference data with its known points and random ones."""

    def make(directory: Path) -> Path:
        case = write_quartic(quartic_case(name), directory)
        candidates = directory / "candidates.json"
        write_plane_candidates(case, candidates, p, digits, count, complete=complete, seed=seed)
        return run_to(directory, case, [candidates], bound=250)[1]

    return make


def _closed_place(directory: Path) -> Path:
    """A generator that is the other three zeros of the line x = y, less three times the base."""
    quartic = quartic_case("level13_S4")
    base, *others = map(quartic.curve.format_point, quartic.known_points)
    generators = "".join(
        f'[[jacobian.generators]]\ndivisor = [[1, "{q}"], [-1, "{base}"]]\n' for q in others[:2]
    )
    generators += (
        '[[jacobian.generators]]\ndivisor = [[1, { root_of = "4*t^3 + 9*t^2 + 13*t + 3", '
        f'point = "(t : t : 1)" }}], [-3, "{base}"]]\n'
    )
    case = directory / "case.toml"
    case.write_text(
        plane_case_text(quartic.curve, "closed point", 3, quartic.known_points, generators), "utf-8"
    )
    candidates = directory / "candidates.json"
    write_plane_candidates(case, candidates, 5, 3, 6, seed=3)
    return run_to(directory, case, [candidates], bound=250)[1]


def _klein(directory: Path) -> Path:
    """x^3 y + y^3 z + z^3 x: rank 0, and every residue disc modulo 5 a candidate."""
    curve = PlaneCurve({(3, 1, 0): 1, (0, 3, 1): 1, (1, 0, 3): 1})
    points: list[Point] = [(0, 0, 1), (0, 1, 0), (1, 0, 0)]
    case = directory / "case.toml"
    torsion = '[[jacobian.torsion]]\norder = 7\ndivisor = [[1, "(0 : 1 : 0)"], [-1, "(0 : 0 : 1)"]]\n'
    case.write_text(plane_case_text(curve, "rank 0", 0, points, torsion), "utf-8")
    discs: list[dict[str, object]] = [
        {"id": f"d{i}", "disc": f"({x} : {y} : {z})"} for i, (x, y, z) in enumerate(curve.modulo(5).points)
    ]
    candidates = write_json(directory / "c5.json", 5, 2, discs, True)
    return run_to(directory, case, [candidates], bound=60)[1]


def _integral(directory: Path) -> Path:
    """Integral points: candidates at infinity are none."""
    case = reference_case("integral_g2")
    path = write_case(case, directory)
    text = path.read_text("utf-8")
    path.write_text(text.replace("known_points", "integral = true\nknown_points", 1), "utf-8")
    return run_to(directory, path, [write_candidates(case, directory, 7, 4, 6)], bound=200)[1]


PLANE_CASES: dict[str, Callable[[Path], Path]] = {
    "plane_points": _quartic("level13_split", 5, 3, 6, 2),
    "plane_at_three": _quartic("X0p239", 3, 3, 6, 2),
    "plane_incomplete": _quartic("X0p113", 5, 3, 6, 2, complete=False),
    "plane_closed_place": _closed_place,
    "plane_discs": _klein,
    "integral_points": _integral,
}
