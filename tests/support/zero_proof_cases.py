"""Runs whose lists are proved complete: zeros are counted, or every residue disc is a candidate.

Their logs are in the corpus of data/proofs.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from pathlib import Path

from sieve.commands import candidates, propose
from sieve.commands import run as run_command
from sieve.curves.divisors import Point
from sieve.curves.protocol import Curve
from sieve.files.resolve import read_case
from sieve.files.result import json_text
from tests.support import pipeline
from tests.support.reference_cases import reference_case
from tests.support.run_files import run_to, write_case, write_json

Case = Callable[[Path], Path]


def with_lines(path: Path, first: str) -> Path:
    """A case file with a line added at the top level."""
    path.write_text(path.read_text("utf-8").replace("[curve]", f"{first}\n[curve]", 1), "utf-8")
    return path


def all_discs(
    path: Path, p: int, near: Sequence[Point] = (), leave_out: int = 0, infinity: bool = True
) -> Path:
    """A list of all residue discs at p, not claimed complete; `near`: bounds of 1 in the discs of these."""
    curve: Curve = read_case(path).curve
    reduced = curve.modulo(p)
    bounded = {reduced.index_of(*point) for point in near}
    count = reduced.count if infinity else reduced.affine_count
    entries: list[dict[str, object]] = []
    for number in range(leave_out, count):
        x, y, z = (int(c) for c in reduced.points[number])
        entry: dict[str, object] = {"id": f"d{number}", "disc": f"({x} : {y} : {z})"}
        entries.append(entry | ({"at_most": 1} if number in bounded else {}))
    return write_json(path.with_suffix(f".{p}.json"), p, 1, entries, False)


def by_zeros(
    name: str, p: int, digits: int, *, integral: bool = False, half: bool = False, discs: bool = False
) -> Case:
    """A reference curve of rank below the genus; the candidates of linear Chabauty, or all discs."""

    def make(directory: Path) -> Path:
        case = reference_case(name)
        path = pipeline.write_case(directory, case.f, case.h, int(case.rank or 0), "the reference data")
        if half:
            lines = path.read_text("utf-8").splitlines()
            lines = ['base = "half a fibre"' if line.startswith("base = ") else line for line in lines]
            path.write_text("\n".join(lines) + "\n", "utf-8")
        if integral:
            with_lines(path, "integral = true")
        if discs:
            return run_to(directory, path, [all_discs(path, p)], bound=200)[1]
        return run_to(directory, path, [chabauty_list(path, p, digits)], bound=200)[1]

    return make


def chabauty_list(path: Path, p: int, digits: int) -> Path:
    """The candidates of a case at p by linear Chabauty, as a list that does not claim to be complete."""
    found = candidates.execute(str(path), prime=p, precision=digits)
    document = candidates.candidate_document(found) | {"complete": False}
    for entry in document["candidates"]:
        entry.pop("at_most", None)
    file = path.with_suffix(f".{p}.json")
    file.write_text(json_text(document), "utf-8")
    return file


def double_zeros(f: Sequence[int]) -> Case:
    """y^2 = f, f even: the integrals have double zeros at rational points with x = 0, or at infinity."""

    def make(directory: Path) -> Path:
        source = "ranks of the elliptic factors by PARI"
        path = pipeline.write_case(directory, f, (), 1, source)
        return run_to(directory, path, [chabauty_list(path, 3, 6)], bound=200)[1]

    return make


def integral_discs(name: str, p: int) -> Case:
    """All affine discs and those at infinity; at most one integral point near each published one."""

    def make(directory: Path) -> Path:
        case = reference_case(name)
        path = with_lines(write_case(case, directory), "integral = true")
        near = [point for point in read_case(path).known_points if point[2] == 1]
        return run_to(directory, path, [all_discs(path, p, near)], bound=200)[1]

    return make


def plane_zeros(equation: str, rank: int, p: int) -> Case:
    """A plane curve, its base and generators proposed, with the candidates of linear Chabauty."""

    def make(directory: Path) -> Path:
        sketch = directory / "sketch.toml"
        sketch.write_text(
            f'format = "sieve-case/1"\nname = "quartic"\n[curve]\nequation = "{equation}"\n'
            f'[jacobian]\nrank = {rank}\nrank_source = "the ranks of three elliptic quotients by PARI"\n',
            "utf-8",
        )
        path = directory / "case.toml"
        path.write_text(propose.text(propose.execute(str(sketch))), "utf-8")
        return run_to(directory, path, [chabauty_list(path, p, 4)], bound=200)[1]

    return make


def deep(directory: Path) -> Path:
    """Few auxiliary primes, so that points modulo q^2 are worth their while."""
    path = write_case(reference_case("integral_g2"), directory)
    done = run_command.execute(str(path), [], primes=[3, 5, 7, 11])
    run_command.write_files(done, directory)
    return directory / "proof.jsonl"


ZERO_CASES: dict[str, Case] = {
    "zeros": by_zeros("quadratic_period_5", 3, 5),
    "zeros_rank_zero": by_zeros("X1_13", 3, 4),
    "zeros_half_fibre": by_zeros("X0_37", 3, 4, half=True),
    "zeros_integral": by_zeros("quadratic_period_5", 5, 4, integral=True),
    "zeros_in_discs": by_zeros("quadratic_period_5", 5, 1, discs=True),
    "zeros_double": double_zeros([4, 0, 4, 0, 1, 0, 1]),
    "zeros_double_at_infinity": double_zeros([4, 0, -4, 0, 0, 0, 1]),
    "zeros_plane": plane_zeros("x^4 + y^4 - z^4 = 0", 0, 3),
    "zeros_plane_rank_two": plane_zeros("x^4 + y^4 - z^4 - x^2*y^2 = 0", 2, 7),
    "integral_discs": integral_discs("integral_g2", 5),
    "deep": deep,
}
"""Names in data/proofs/accepted."""
