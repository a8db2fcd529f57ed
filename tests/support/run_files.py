"""Case and candidate files for reference curves, so that whole runs can be tested."""

from __future__ import annotations

import json
import random
from collections.abc import Sequence
from fractions import Fraction
from pathlib import Path

from sieve.commands import run as run_command
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.protocol import Curve
from sieve.local.logarithms import PadicIntegrals
from tests.support.reference_cases import ReferenceCase, reference_case

CHOICE = {
    "X0star129": 2,
    "lmfdb2059": 2,
    "bielliptic_x6_x2_1": 3,
    "X0p67": 7,
    "integral_g3": 7,
    "X1_16": 3,
    "X1_13": 5,
    "X0p103_lmfdb": 3,
}
"""Chabauty primes that make the runs different; 5, 7, 11, .. elsewhere."""

RUNNABLE = (
    "X0p67",
    "X0p103_lmfdb",
    "X0p107",
    "X0p125",
    "X0star129",
    "bielliptic_x6_x2_1",
    "quadratic_period_5",
    "integral_g2",
    "X0_37",
    "X1_13",
    "X1_16",
    "lmfdb2059",
    "lmfdb13689",
    "lmfdb123201c",
    "lmfdb100154",
    "integral_g3",
    "y2_minus_y_x5_minus_x",
    "lmfdb440509",
    "bielliptic_137",
    "X0p103_second_model",
    "binomial_y2_x5",
    "five_roots_0_1_2_5_6",
)
"""Reference curves with known rank and rational points that generate."""


def point_text(curve: HyperellipticCurve, point: tuple[int, int, int]) -> str:
    return curve.format_point(point)


def write_case(case: ReferenceCase, directory: Path) -> Path:
    """A case file whose generators come from the known points."""
    curve = HyperellipticCurve(case.f, case.h)
    known = list(case.known_points)
    top = len(case.f) - 1
    if top == 2 * case.genus + 1 and len(case.h) <= case.genus + 1 and (1, 0, 0) not in known:
        known.insert(0, (1, 0, 0))
    lines = [
        'format = "sieve-case/1"',
        f'name = "{case.id}"',
        "known_points = " + json.dumps([point_text(curve, p) for p in known]),
        "[curve]",
        f'equation = "{case.equation}"',
        "[jacobian]",
        f"rank = {case.rank}",
        'rank_source = "the reference data"',
        f'base = "{point_text(curve, known[0])}"',
        'generators_from = "known_points"',
    ]
    path = directory / f"{case.id}.toml"
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return path


def chabauty_prime(case: ReferenceCase) -> int:
    """A good prime for the candidates of a case."""
    return CHOICE.get(case.id) or next(p for p in (5, 7, 11, 13) if p not in case.bad_primes)


def random_points(curve: Curve, p: int, digits: int, count: int, seed: int) -> list[str]:
    """Random p-adic points of the curve as integers modulo p^digits, in the notation of candidate files."""
    rng = random.Random(seed)
    integrals = PadicIntegrals(curve, p, digits)
    out = []
    for _ in range(count):
        disc = rng.randrange(integrals.group.curve.count)
        t = p * rng.randrange(p ** (digits - 1))
        x, y, z = integrals.point_at(disc, t, digits)
        out.append(f"({x} + O({p}^{digits}) : {y} + O({p}^{digits}) : {z} + O({p}^{digits}))")
    return out


def write_candidates(
    case: ReferenceCase,
    directory: Path,
    p: int,
    digits: int,
    count: int,
    *,
    complete: bool = True,
    known: bool = True,
) -> Path:
    """A candidate file: the known points and random ones."""
    curve = HyperellipticCurve(case.f, case.h)
    points = [f"({x} : {y} : {z})" for x, y, z in case.known_points] if known else []
    if known and len(case.f) == 2 * case.genus + 2 and len(case.h) <= case.genus + 1:
        points += [] if (1, 0, 0) in case.known_points else ["(1 : 0 : 0)"]
    points += random_points(curve, p, digits, count, 1000 * p + digits)
    path = directory / f"{case.id}.{p}.json"
    return write_json(path, p, digits, numbered(points), complete)


def numbered(points: Sequence[str]) -> list[dict[str, object]]:
    """Candidates z1, z2, .. of the form point."""
    return [{"id": f"z{i}", "point": text} for i, text in enumerate(points, 1)]


def write_json(
    path: Path, prime: int, precision: int, candidates: list[dict[str, object]], complete: bool
) -> Path:
    """A candidate file with given candidates."""
    document = {
        "format": "sieve-candidates/1",
        "prime": prime,
        "precision": precision,
        "complete": complete,
        "source": "for tests",
        "candidates": candidates,
    }
    path.write_text(json.dumps(document), encoding="utf-8")
    return path


EMPTY = {
    # pulled back from points of infinite order on an elliptic quotient (the data of the reference file)
    "empty_bielliptic_1": ("x^2 + 1", "1", "t^2 + 5"),
    "empty_bielliptic_2": ("x^2 + 2", "4", "t^2 + 3"),
    "empty_bielliptic_3": ("x^2 + 1", "1", "t^2 + 3"),
}


def write_empty_case(name: str, directory: Path, base: str) -> Path:
    """A curve without rational points, one generator; `base`: the line of the case file with the base."""
    case = reference_case(name)
    u, w, infinity = EMPTY[name]
    fibre = f'{{ root_of = "{infinity}", point = "(1 : t : 0)" }}'
    lines = [
        'format = "sieve-case/1"',
        f'name = "{name}"',
        "[curve]",
        f'equation = "{case.equation}"',
        "[jacobian]",
        "rank = 1",
        'rank_source = "the reference data"',
        base.replace("FIBRE", fibre),
        "[[jacobian.generators]]",
        f'divisor = [[1, {{ mumford = ["{u}", "{w}"] }}], [-1, {fibre}]]',
    ]
    path = directory / f"{name}.toml"
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return path


def run_to(
    directory: Path,
    case: Path,
    candidates: list[Path],
    *,
    bound: int | None = None,
    full: bool = False,
) -> tuple[run_command.Run, Path]:
    """Run in this process; returns the run and the path of its log."""
    run = run_command.execute(str(case), [str(c) for c in candidates], bound=bound)
    run_command.write_files(run, directory, full)
    return run, directory / "proof.jsonl"


__all__ = ["EMPTY", "RUNNABLE", "Fraction", "chabauty_prime", "run_to", "write_candidates", "write_case"]
