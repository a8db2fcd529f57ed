"""Small runs of different kinds, whose logs are the accepted part of the corpus in data/proofs.

Run as `python -m tests.support.proof_cases [NAME ..]` to write data/proofs/accepted anew, all logs or those
named; the stored logs are fixtures and need not be what today's engine writes.
"""

from __future__ import annotations

import json
import sys
import tempfile
from collections.abc import Callable, Sequence
from itertools import combinations
from pathlib import Path
from typing import Any

from flint import fmpq, fmpq_poly

from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.errors import SieveError
from tests.support.plane_proof_cases import PLANE_CASES
from tests.support.reference_cases import reference_case
from tests.support.run_files import (
    chabauty_prime,
    random_points,
    run_to,
    write_candidates,
    write_case,
    write_json,
)
from tests.support.zero_proof_cases import ZERO_CASES

ROOT = Path(__file__).resolve().parents[2]
CORPUS = ROOT / "data" / "proofs"

Case = Callable[[Path], Path]


def _reference(name: str, digits: int, count: int) -> Case:
    """A reference curve, its known points and random ones as a complete list."""

    def make(directory: Path) -> Path:
        case = reference_case(name)
        candidates = write_candidates(case, directory, chabauty_prime(case), digits, count)
        return run_to(directory, write_case(case, directory), [candidates], bound=200)[1]

    return make


def _demo(directory: Path) -> Path:
    demo = ROOT / "data" / "demo"
    return run_to(directory, demo / "case.toml", [demo / "candidates.json"])[1]


def _empty(directory: Path) -> Path:
    return run_to(directory, ROOT / "data" / "empty" / "empty_bielliptic_1.toml", [])[1]


def _no_local_points(directory: Path) -> Path:
    """A curve without points modulo 3."""
    path = directory / "case.toml"
    path.write_text(
        'format = "sieve-case/1"\nname = "nowhere modulo 3"\n[curve]\nequation = "y^2 = 2*x^6 + x^2 + 2"\n'
        '[jacobian]\nrank = 0\nrank_source = "claimed for this test"\nbase = "half a fibre"\n',
        encoding="utf-8",
    )
    return run_to(directory, path, [], bound=4)[1]


def _forms(directory: Path) -> Path:
    """Discs, coefficients and points, two Chabauty primes, a stated bound."""
    case = reference_case("X0p67")
    curve = HyperellipticCurve(case.f, case.h)
    points: list[dict[str, object]] = [
        {"id": f"z{i}", "point": f"({x} : {y} : {z})"} for i, (x, y, z) in enumerate(case.known_points, 1)
    ]
    points += [{"id": f"r{i}", "point": text} for i, text in enumerate(random_points(curve, 7, 4, 2, 11), 1)]
    others: list[dict[str, object]] = [
        {"id": "c1", "coefficients": ["1 + O(3^3)", "2*3 + O(3^3)"]},
        {"id": "c2", "coefficients": ["2 + O(3^4)", "1 + 2*3 + 3^3 + O(3^4)"], "disc": "(0 : 1 : 1)"},
        {"id": "c3", "coefficients": ["1 + 3^2 + O(3^4)", "0 + O(3^4)"]},
    ]
    discs: list[dict[str, object]] = [
        {"id": "d1", "disc": "(0 : 1 : 1)", "at_most": 1},
        {"id": "d2", "disc": "(1 : 1 : 0)"},
    ]
    affine = [(x, y) for x, y, z in curve.modulo(5).points if z]
    discs += [{"id": f"d{i}", "disc": f"({x} : {y} : 1)"} for i, (x, y) in enumerate(affine, 3)]
    files = [
        write_json(directory / "c7.json", 7, 4, points, True),
        write_json(directory / "c3.json", 3, 4, others, False),
        write_json(directory / "c5.json", 5, 3, discs, False),
    ]
    return run_to(directory, write_case(case, directory), files, bound=200)[1]


def _sole_by_coefficients(directory: Path) -> Path:
    """A candidate by coefficients that the groups tell to be the base point, alone by a stated bound."""
    records = [json.loads(line) for line in _forms(directory).read_text(encoding="utf-8").splitlines()]
    base = next(r for r in records if r["kind"] == "group")["base"][0][1]["point"]
    first = next(i for i, r in enumerate(records) if r["kind"] == "candidate")
    records.insert(
        first,
        {
            "kind": "premise",
            "id": "bound 3 c4",
            "statement": "at most one",
            "source": "stated for this test",
            "prime": 3,
            "candidate": "c4",
            "at_most": 1,
        },
    )
    after = max(i for i, r in enumerate(records) if r["kind"] == "candidate")
    records.insert(
        after + 1,
        {
            "kind": "candidate",
            "prime": 3,
            "id": "c4",
            "form": "coefficients",
            "coefficients": [[0, 2], [0, 1]],
            "torsion": None,
            "disc": None,
        },
    )
    records.insert(
        -1,
        {
            "kind": "fate",
            "prime": 3,
            "id": "c4",
            "verdict": "rational",
            "points": [base],
            "given": True,
            "sole": True,
        },
    )
    records[-1]["records"] = len(records) - 1
    log = directory / "proof.jsonl"
    log.write_text("".join(json.dumps(r, separators=(",", ":")) + "\n" for r in records), encoding="utf-8")
    return log


def _two_lists(directory: Path) -> Path:
    """A complete list of discs at 5 serves as a condition for candidates at 7."""
    case = reference_case("X0p67")
    curve = HyperellipticCurve(case.f, case.h)
    points: list[dict[str, object]] = [
        {"id": f"r{i}", "point": text} for i, text in enumerate(random_points(curve, 7, 4, 6, 5), 1)
    ]
    discs: list[dict[str, object]] = [
        {"id": f"d{i}", "disc": f"({x} : {y} : {z})"} for i, (x, y, z) in enumerate(curve.modulo(5).points)
    ]
    files = [
        write_json(directory / "c7.json", 7, 4, points, False),
        write_json(directory / "c5.json", 5, 2, discs, True),
    ]
    log = run_to(directory, write_case(case, directory), files, bound=60)[1]
    text = log.read_text(encoding="utf-8")
    # a use of the other list that the engine happens not to need
    text = text.replace('"uses":[[53', '"uses":[["p = 5",{"3":1},"join"],[53', 1)
    log.write_text(text, encoding="utf-8")
    return log


def _index(directory: Path) -> Path:
    """A finite index stated by the user: the generators are twice a basis in one direction."""
    path = directory / "case.toml"
    path.write_text(
        'format = "sieve-case/1"\nname = "stated index"\nknown_points = ["(1 : 1 : 0)", "(0, 1)"]\n[curve]\n'
        'equation = "y^2 = x^6 + 8*x^5 + 22*x^4 + 22*x^3 + 5*x^2 + 6*x + 1"\n[jacobian]\nrank = 1\n'
        'rank_source = "the reference data"\nbase = "(1 : 1 : 0)"\nindex_prime_to = [3]\n'
        'index_source = "stated for this test"\n[[jacobian.generators]]\n'
        'divisor = [[1, "(1 : 1 : 0)"], [-1, "(1 : -1 : 0)"]]\n',
        encoding="utf-8",
    )
    case = reference_case("quadratic_period_5")
    return run_to(directory, path, [write_candidates(case, directory, 7, 3, 3)], bound=200)[1]


def _square_root_at_infinity(f: Sequence[int]) -> list[fmpq]:
    """The polynomial part of sqrt(f), f monic of degree 6."""
    c = [fmpq(0)] * 3 + [fmpq(1)]
    for k in (2, 1, 0):
        square = fmpq_poly(c) * fmpq_poly(c)
        c[k] = (f[k + 3] - square[k + 3]) / 2
    return c


def _mumford(directory: Path) -> Path:
    """A generator in Mumford representation with an irreducible u."""
    case = reference_case("quadratic_period_5")
    curve = HyperellipticCurve(case.f, case.h)
    affine = [p for p in case.known_points if p[2] == 1]
    # a cubic c(x) that agrees with sqrt(f) at infinity and passes through points; the other two zeros of y -
    # c(x) are the place
    root = _square_root_at_infinity(case.f)
    options = (
        (sign, k, chosen) for k in (1, 2, 3) for sign in (1, -1) for chosen in combinations(affine, 4 - k)
    )
    for sign, k, points in options:
        if len({x for x, _, _ in points}) < len(points):
            continue
        cubic = fmpq_poly([0] * (4 - k) + [sign * c for c in root[4 - k :]])
        rest = fmpq_poly([])
        for x, y, _ in points:
            term = fmpq_poly([y - cubic(x)])
            for other, _, _ in points:
                if other != x:
                    term *= fmpq_poly([fmpq(-other, x - other), fmpq(1, x - other)])
            rest += term
        cubic += rest
        norm = cubic * cubic - fmpq_poly(list(curve.f))
        for x, _, _ in points:
            norm = norm / fmpq_poly([-x, 1])
        if norm.degree() == 2:
            path = directory / "case.toml"
            u, w = norm / norm.coeffs()[-1], cubic % norm
            shown = [" + ".join(f"({c})*x^{i}" for i, c in enumerate(q.coeffs())) for q in (u, w)]
            path.write_text(
                f'format = "sieve-case/1"\nname = "closed point"\nknown_points = ["(1 : 1 : 0)"]\n[curve]\n'
                f'equation = "{case.equation}"\n[jacobian]\nrank = 1\nrank_source = "the reference data"\n'
                f'base = "(1 : 1 : 0)"\n[[jacobian.generators]]\ndivisor = [[1, {{ mumford = ["{shown[0]}", '
                f'"{shown[1]}"] }}], [-1, {{ fibres = 1 }}]]\n',
                encoding="utf-8",
            )
            try:
                run, log = run_to(directory, path, [write_candidates(case, directory, 5, 4, 6)], bound=200)
            except SieveError:
                continue
            if any(d.verdict == "eliminated" for d in run.decisions):
                return log
    raise AssertionError("no such generator")


def _classes(directory: Path) -> Path:
    """No candidates, and classes that remain."""
    return run_to(directory, write_case(reference_case("lmfdb2059"), directory), [], bound=20)[1]


def _torsion_coordinates(directory: Path) -> Path:
    """Coefficients with a torsion coordinate, and discs without which candidates would remain."""
    chosen: list[tuple[str, int, int, str]] = [
        ("a1", 0, 0, ""),
        ("a2", 0, 1, ""),
        ("a3", 1, 0, "(0 : 0 : 1)"),
        ("a4", 1, 1, "(0 : 0 : 1)"),
        ("a5", 1, 1, ""),
        ("a6", 1, 1, "(1 : 0 : 1)"),
        ("a7", 0, 1, "(0 : 0 : 1)"),
        ("a8", 2, 2, ""),
    ]
    candidates: list[dict[str, object]] = [
        {"id": name, "coefficients": [f"{a} + O(3)"], "torsion": [e], **({"disc": disc} if disc else {})}
        for name, a, e, disc in chosen
    ]
    file = write_json(directory / "c3.json", 3, 1, candidates, False)
    log = run_to(directory, write_case(reference_case("lmfdb2059"), directory), [file], bound=60)[1]
    # the order of J(F_2) by points over F_4 as well, although the bound would do
    return _changed(log, "local", lambda record: record.update(counts=2))


def _cubic_place(directory: Path, p: int, u: str, w: str) -> Path:
    """A generator (u, w) - U - (1 : 1 : 0), deg u = 3, and candidates at p."""
    case = reference_case("quadratic_period_5")
    path = directory / "case.toml"
    path.write_text(
        f'format = "sieve-case/1"\nname = "cubic place"\nknown_points = ["(1 : 1 : 0)"]\n[curve]\n'
        f'equation = "{case.equation}"\n[jacobian]\nrank = 1\nrank_source = "the reference data"\n'
        f'base = "(1 : 1 : 0)"\n[[jacobian.generators]]\ndivisor = [[1, {{ mumford = ["{u}", "{w}"] }}], '
        '[-1, { fibres = 1 }], [-1, "(1 : 1 : 0)"]]\n',
        encoding="utf-8",
    )
    return run_to(directory, path, [write_candidates(case, directory, p, 4, 6)], bound=200)[1]


def _changed(log: Path, kind: str, change: Callable[[dict[str, Any]], None]) -> Path:
    """The log with another first record of a kind."""
    records = [json.loads(line) for line in log.read_text(encoding="utf-8").splitlines()]
    change(next(r for r in records if r["kind"] == kind))
    log.write_text("".join(json.dumps(r, separators=(",", ":")) + "\n" for r in records), encoding="utf-8")
    return log


def _place_in_discs(directory: Path) -> Path:
    """u = (x - 7) (x - 6)^2 modulo 11; the place is written as two of it less one of it."""

    def twice(group: dict[str, Any]) -> None:
        (divisor,) = group["free"]
        place = next(entry[1] for entry in divisor if "closed" in entry[1])
        group["free"] = [[e for e in divisor if e[1] != place] + [[2, place], [-1, place]]]

    return _changed(_cubic_place(directory, 11, "x^3 + 3*x^2 - x + 1", "x^2 + 2*x"), "group", twice)


def _place_partly_in_discs(directory: Path) -> Path:
    """u has one root modulo 7."""
    return _cubic_place(directory, 7, "x^3 + 4*x^2 + 3/2*x - 7", "5/2*x + 6")


CASES: dict[str, Case] = {
    "demo": _demo,
    "torsion": _reference("X1_13", 4, 6),
    "residue_characteristic_two": _reference("lmfdb2059", 5, 8),
    "odd_degree_at_three": _reference("X1_16", 4, 6),
    "genus_three": _reference("integral_g3", 4, 4),
    "branch_points": _reference("integral_g2", 4, 4),
    "three_generators": _reference("y2_minus_y_x5_minus_x", 5, 6),
    "empty_by_classes": _empty,
    "empty_modulo_three": _no_local_points,
    "forms": _forms,
    "sole_by_coefficients": _sole_by_coefficients,
    "two_lists": _two_lists,
    "stated_index": _index,
    "closed_point": _mumford,
    "classes_left": _classes,
    "torsion_coordinates": _torsion_coordinates,
    "place_in_discs": _place_in_discs,
    "place_partly_in_discs": _place_partly_in_discs,
    **PLANE_CASES,
    **ZERO_CASES,
    **ZERO_CASES,
}


def main(names: Sequence[str]) -> None:
    """Write the accepted logs, all or those named."""
    target = CORPUS / "accepted"
    target.mkdir(parents=True, exist_ok=True)
    for name, case in CASES.items():
        if names and name not in names:
            continue
        with tempfile.TemporaryDirectory() as directory:
            data = case(Path(directory)).read_bytes()
        (target / f"{name}.jsonl").write_bytes(data)
        last = json.loads(data.splitlines()[-1])
        print(name, len(data), last["conclusion"], len(last["eliminated"]))


if __name__ == "__main__":
    main(sys.argv[1:])
