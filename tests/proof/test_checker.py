"""The checker against its corpus, against fakes of itself, alone and on the command line."""

from __future__ import annotations

import ast
import itertools
import json
import os
import random
import re
import shutil
import subprocess
import sys
from collections import Counter
from collections.abc import Callable
from math import prod
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import pytest
from click.testing import CliRunner

from sieve.cli import main
from sieve.curves.discs import ResidueDisc
from sieve.curves.hyperelliptic_mod import smooth_modulo
from sieve.curves.plane import PlaneCurve
from sieve.exact.series import coefficients
from sieve.proof import checker
from sieve.proof.witness_local import local_document
from tests.support.checker_mutants import (
    CORPUS,
    ROOT,
    SOURCE,
    expected,
    expected_words,
    judge,
    refusals,
    words,
)
from tests.support.make_corpus import corpus
from tests.support.plane_cases import DATA, QuarticCase, quartic_cases

FORMAT_PAGE = ROOT / "sieve" / "proof" / "FORMAT.md"
ACCEPTED = sorted((CORPUS / "accepted").glob("*.jsonl"))


def failures(module: object) -> list[str]:
    """The corpus files for which a checker gives another verdict than it must."""
    return [name for data, verdict, name in expected() if judge(module, data) != verdict]


def alone(arguments: list[str], script: Path = SOURCE) -> subprocess.CompletedProcess[str]:
    """The checker as a program of its own, without the package and without site packages."""
    command = [sys.executable, "-I", "-S", "-O", str(script), *arguments]
    return subprocess.run(command, capture_output=True, text=True, timeout=60, cwd="/")


def test_corpus() -> None:
    assert failures(checker) == []


def test_corpus_is_what_its_script_makes() -> None:
    files, rows = corpus()
    assert len(rows) >= 80
    stored = {
        f"{p.parent.name}/{p.name}": p.read_bytes()
        for folder in ("malformed", "rejected", "declined")
        for p in (CORPUS / folder).glob("*.jsonl")
    }
    assert stored == files
    lines = (CORPUS / "expected.tsv").read_text(encoding="utf-8").splitlines()[1:]
    assert lines == ["\t".join(map(str, row)) for row in rows]


def test_every_reason_code_that_can_occur_occurs() -> None:
    spelt = {code for _, code in refusals(ast.parse(SOURCE.read_text(encoding="utf-8")))} - {""}
    seen = {code for _, (_, _, code), _ in expected()}
    # self-checks that no log reaches
    assert spelt - seen == {"expansion", "field", "roots"}


def _fake(check: Callable[[object], object]) -> SimpleNamespace:
    return SimpleNamespace(
        check=check, Fault=checker.Fault, Malformed=checker.Malformed, Declined=checker.Declined
    )


def _always_reject(stream: object) -> object:
    fault = checker.Rejected("claim", "no")
    fault.line = 1
    raise fault


def _parse_only(stream: object) -> object:
    lines = checker.lines_of(stream)  # type: ignore[arg-type]
    for number, line in enumerate(lines, 1):
        try:
            checker.decode(line)
        except checker.Fault as fault:
            fault.line = number
            raise
    return None


@pytest.mark.parametrize(
    "fake, missed",
    [
        (lambda stream: None, 200),
        (_always_reject, 200),
        (_parse_only, 150),
    ],
)
def test_fakes_fail(fake: Callable[[object], object], missed: int) -> None:
    assert len(failures(_fake(fake))) >= missed


@pytest.mark.parametrize("path", ACCEPTED, ids=lambda p: p.stem)
def test_accepted_alone(path: Path, tmp_path: Path) -> None:
    copy = tmp_path / "elsewhere.py"
    shutil.copy(SOURCE, copy)
    done = alone([str(path), "--json"], copy)
    assert done.returncode == 0 and done.stderr == ""
    result = json.loads(done.stdout)
    records = [json.loads(line) for line in path.read_text(encoding="utf-8").splitlines()]
    assert result["valid"] is True
    assert result["records"] == len(records)
    assert [[e["prime"], e["id"]] for e in result["eliminated"]] == records[-1]["eliminated"]
    assert [p["source"] for p in result["premises"]] == [
        r["source"] for r in records if r["kind"] == "premise"
    ]


@pytest.mark.parametrize(
    "name", ["rejected/one_more_eliminated", "malformed/not_a_number", "accepted/torsion"]
)
@pytest.mark.parametrize("flags", [[], ["--json"]])
def test_command_agrees(name: str, flags: list[str]) -> None:
    path = str(CORPUS / f"{name}.jsonl")
    own = alone([path, *flags])
    command = CliRunner().invoke(main, ["check", path, *flags])
    assert (command.exit_code, command.stdout) == (own.returncode, own.stdout)
    assert own.returncode == (0 if "accepted" in name else 3)


def test_rejection_names_line_record_and_reason() -> None:
    done = alone([str(CORPUS / "rejected" / "one_more_eliminated.jsonl")])
    assert re.fullmatch(r"rejected: line \d+, record end, claim: .+\n", done.stdout)


@pytest.mark.parametrize(
    "arguments",
    [
        [str(CORPUS / "declined" / "another_version.jsonl")],
        ["no such file"],
        ["/"],
        [],
        ["a", "b"],
    ],
)
def test_declined_and_unreadable_are_one_line_and_exit_2(arguments: list[str]) -> None:
    done = alone(arguments)
    assert done.returncode == 2 and done.stdout == ""
    assert re.fullmatch(
        r"sieve: error: .+, expected .+\n|sieve: error: command line: expected .+\n", done.stderr
    )


@pytest.mark.parametrize(
    "name", ["accepted/forms", "rejected/another_rank", "malformed/not_a_number", "declined/another_version"]
)
@pytest.mark.parametrize("flags", [[], ["--json"]])
def test_verdict_that_nobody_reads_is_no_acceptance(name: str, flags: list[str]) -> None:
    """The reader of the pipe has gone: one line on standard error, no traceback, never exit code 0."""
    reader, writer = os.pipe()
    os.close(reader)
    command = [sys.executable, "-I", "-S", "-O", str(SOURCE), str(CORPUS / f"{name}.jsonl"), *flags]
    done = subprocess.run(command, stdout=writer, stderr=subprocess.PIPE, text=True, timeout=60, cwd="/")
    os.close(writer)
    assert done.returncode == 2
    assert re.fullmatch(r"sieve: error: .+, expected .+\n", done.stderr)


def test_source_is_one_plain_file() -> None:
    """Standard library only, no assert, no catch-all that could end in an acceptance."""
    tree = ast.parse(SOURCE.read_text(encoding="utf-8"))
    modules = {a.name.split(".")[0] for n in ast.walk(tree) if isinstance(n, ast.Import) for a in n.names}
    modules |= {(n.module or "").split(".")[0] for n in ast.walk(tree) if isinstance(n, ast.ImportFrom)}
    assert modules <= sys.stdlib_module_names
    assert not any(isinstance(n, ast.Assert) for n in ast.walk(tree))
    for handler in (n for n in ast.walk(tree) if isinstance(n, ast.ExceptHandler)):
        assert (
            handler.type is not None
            and "Exception" not in ast.unparse(handler.type).replace("(", " ").split()
        )
        last = handler.body[-1]
        ends = isinstance(last, ast.Raise) or (
            isinstance(last, ast.Return) and re.match(r"return (3|complain\(.*\))$", ast.unparse(last))
        )
        assert ends, ast.unparse(handler)


def test_examples_of_the_format_page_are_in_the_corpus() -> None:
    page = FORMAT_PAGE.read_text(encoding="utf-8")
    good = {line for path in ACCEPTED for line in path.read_text(encoding="utf-8").splitlines()}
    verdicts = {name: verdict for _, verdict, name in expected()}
    examples = re.findall(
        r"Accepted:\n```json\n(.+)\n```\nRejected, `([a-z-]+)` \(data/proofs/(\S+)\):\n```json\n(.+)\n```",
        page,
    )
    assert len(examples) == 13
    for accepted, code, name, rejected in examples:
        assert accepted in good
        exit_code, number, expected_code = verdicts[name]
        assert (exit_code, expected_code) == (3, code)
        assert (CORPUS / name).read_text(encoding="utf-8").splitlines()[number - 1] == rejected


def _evaluate(rows: list[list[int]], x: int, y: int, v: int) -> int:
    """F(x, y, 1), one term after the other."""
    return sum(c * pow(x, i, v) * pow(y, k, v) for k, row in enumerate(rows) for i, c in enumerate(row)) % v


def _points(header: dict[str, Any], v: int) -> int:
    """#X(F_v) by trying all pairs."""
    rows, w = header["equation"], header["weight"]
    top = max(i + w * k for k, row in enumerate(rows) for i, c in enumerate(row) if c)
    # where Z = 0: F(1, s, 0) and F(0, 1, 0)
    ends = [row[top - w * k] if len(row) > top - w * k >= 0 else 0 for k, row in enumerate(rows)]
    affine = sum(_evaluate(rows, x, y, v) == 0 for x in range(v) for y in range(v))
    infinite = sum(sum(c * pow(s, k, v) for k, c in enumerate(ends)) % v == 0 for s in range(v))
    return affine + infinite + (w == 1 and (len(ends) <= top or ends[top] % v == 0))


def test_weil_bound_is_below_the_order_and_sharp_enough() -> None:
    """#J(F_v) of the accepted logs, certified by their other witnesses."""
    seen = set()
    for path in ACCEPTED:
        records = [json.loads(line) for line in path.read_text(encoding="utf-8").splitlines()]
        header = records[0]
        for record in records:
            if record["kind"] == "local" and record["origin"] is not None and record["prime"] < 120:
                order = prod(record["invariants"])
                count = _points(header, record["prime"])
                bound = checker.weil_lower_bound(record["prime"], header["genus"], count)
                assert bound <= order
                assert (order < 2 * bound) or record["counts"] == header["genus"]
                seen.add((header["weight"] == 1, record["counts"] == 0))
    assert len(seen) == 4


CURVES = {
    "without h": ([[-1, 4, -2, 2, -1, -2, -1], [], [1]], 3, 2),
    "with h": ([[0, 1, 0, 0, 0, -1], [-1], [1]], 3, 2),
    "odd degree": ([[-4, -8, -1, -3, -7, 2, -2, -1], [], [1]], 4, 3),
    "h of degree 3": ([[-1, 0, -1, 0, 0, -1, -1], [1, 1, 0, 1], [1]], 3, 2),
    "Klein": ([[0, 0, 0, 1], [1], [], [0, 1]], 1, 3),
    "level 13": ([[0, 1, 0, -1], [-3, -2, 1, -1], [2, 1, 2], [0, -1]], 1, 3),
    "Fermat quintic": ([[1, 0, 0, 0, 0, 1], [], [], [], [], [1]], 1, 6),
}
"""Rows, weight, genus."""


def _curve(name: str) -> checker.Curve:
    rows, weight, genus = CURVES[name]
    return checker.Curve(rows, weight, genus, checker.Work())


@pytest.mark.parametrize(
    "name, v, counts",
    [
        ("without h", 3, 2),
        ("with h", 2, 2),
        ("odd degree", 3, 3),
        ("h of degree 3", 2, 3),
        ("Klein", 2, 3),
        ("Klein", 3, 3),
        ("level 13", 2, 4),
        ("level 13", 3, 3),
        ("Fermat quintic", 2, 5),
    ],
)
def test_extension_counts(name: str, v: int, counts: int) -> None:
    """Against trying all pairs in a slow field of polynomials modulo an irreducible one."""
    curve = _curve(name)
    assert curve.smooth(v)
    for degree in range(2, counts + 1):
        assert checker.extension_points(curve, v, degree) == _slow_count(curve, v, degree)


def _slow_count(curve: checker.Curve, v: int, degree: int) -> int:
    """Points over F_v[t]/(q), q found by having no factor of degree <= degree / 2."""

    def elements(n: int) -> list[tuple[int, ...]]:
        out: list[tuple[int, ...]] = [()]
        for _ in range(n):
            out = [(*e, a) for e in out for a in range(v)]
        return out

    def reducible(q: tuple[int, ...]) -> bool:
        return any(
            checker.divide(q, [*d, 1], v)[1] == [] for k in range(1, degree // 2 + 1) for d in elements(k)
        )

    q = next([*low, 1] for low in elements(degree) if not reducible((*low, 1)))
    field, code = elements(degree), {e: n for n, e in enumerate(elements(degree))}

    def product(a: tuple[int, ...], b: tuple[int, ...]) -> tuple[int, ...]:
        rest = checker.divide(checker.times(a, b), q, v)[1]
        return tuple(rest + [0] * (degree - len(rest)))

    times = [[code[product(a, b)] for b in field] for a in field]
    plus = [[code[tuple((x + y) % v for x, y in zip(a, b, strict=True))] for b in field] for a in field]
    number = [code[(c % v, *[0] * (degree - 1))] for c in range(v)]

    def form(x: int, y: int, z: int) -> int:
        total = number[0]
        for c, i, k, j in curve.form:
            value = number[c % v]
            for base, exponent in ((x, i), (y, k), (z, j)):
                for _ in range(exponent):
                    value = times[value][base]
            total = plus[total][value]
        return total

    zero, one = number[0], number[1]
    points = [(x, y, one) for x in range(len(field)) for y in range(len(field))]
    points += [(one, s, zero) for s in range(len(field))] + [(zero, one, zero)]
    return sum(form(*point) == zero for point in points)


@pytest.mark.parametrize("case", quartic_cases(), ids=lambda case: case.id)
def test_points_and_orders_of_quartics(case: QuarticCase) -> None:
    """The numbers of points and the L-polynomials of the reference data."""
    raw = next(d for d in json.loads(DATA.read_text("utf-8")) if d["id"] == case.id)
    curve = checker.Curve([list(row) for row in case.curve.rows], 1, 3, checker.Work())
    for text, expected_count in raw["counts"].items():
        v = int(text)
        if not curve.smooth(v):
            continue
        points = checker.Reduction(curve, v).points
        assert len(points) == expected_count == len(set(points))
        assert all(checker.evaluate(curve.form, point, v) == 0 for point in points)
        if v < 8 and text in raw["Lpoly"]:
            tower = [len(points), *(checker.extension_points(curve, v, i) for i in (2, 3))]
            assert checker.jacobian_order(v, 3, tower) == sum(raw["Lpoly"][text])


@pytest.mark.parametrize("name", ["Klein", "with h"])
def test_orders_of_sections(name: str) -> None:
    """The orders of a section have at most its degree as sum; those of its square are twice as large."""
    curve, rng = _curve(name), random.Random(3)
    v = 5
    reduction = checker.Reduction(curve, v)
    for n in (1, 2, 3, 4, 5):
        keys = checker.monomials(n, curve.weight)
        for _ in range(20):
            form = [(rng.randrange(v), *key) for key in keys]
            if not any(c for c, *_ in form):
                continue
            orders = []
            for i in range(len(reduction.points)):
                order = 0
                while order <= n * curve.unit and reduction.order_reaches(form, i, order + 1):
                    order += 1
                orders.append(order)
            multiple = curve.degree <= n and min(orders) > n * curve.unit
            assert multiple or sum(orders) <= n * curve.unit
            # a product has the sum of the orders
            doubled = Counter[tuple[int, int, int]]()
            for (c, i, k, j), (d, a, b, e) in itertools.product(form, form):
                doubled[i + a, k + b, j + e] += c * d
            square = [(c, *key) for key, c in doubled.items()]
            for i, order in enumerate(orders):
                if not multiple:
                    assert reduction.order_reaches(square, i, 2 * order)
                    assert not reduction.order_reaches(square, i, 2 * order + 1)


@pytest.mark.parametrize("v", [131, 149])
def test_group_of_a_quintic(v: int) -> None:
    """x^5 + y^5 + z^5 + x y z^3, genus 6; a group twice as large or half of it is refused."""
    quintic = PlaneCurve({(5, 0, 0): 1, (0, 5, 0): 1, (0, 0, 5): 1, (1, 1, 3): 1})

    def check(**changes: Any) -> checker.Local:
        proof = checker.Proof()
        proof.curve = checker.Curve([list(row) for row in quintic.rows], 1, 6, proof.work)
        return checker.Local(proof, {**document, **changes})

    document = local_document(quintic, v, [])
    assert prod(check().moduli) == prod(document["invariants"]) > (v**0.5 - 1) ** 12
    *others, last = document["invariants"]
    for changed in ([*others, 2 * last], [*others, last // 2]):
        with pytest.raises(checker.Fault):
            check(invariants=changed)


def test_a_line_through_a_place() -> None:
    """The closed place and the point (0 : 0 : 1) are the zeros of x = y: in every group, and for Log."""
    with (CORPUS / "accepted" / "plane_closed_place.jsonl").open("rb") as stream:
        proof = checker.check(stream)
    assert len(proof.locals) >= 4 and len(proof.padics) == 1
    for local in proof.locals.values():
        line = [(1, local.places[0]), (1, local.class_of((0, 0, 1))), (-1, local.unit)]
        assert any(local.places[0]) and not any(local.sum(line))
    for padic in proof.padics.values():
        divisor = [(1, "closed", 0), (1, "point", (0, 0, 1))]
        ball = padic.log(divisor)
        assert ball.precision >= 3 and not any(ball.numerators) and any(padic.log(divisor[:1]).numerators)


def test_primes() -> None:
    small = [n for n in range(2, 3000) if all(n % d for d in range(2, n))]
    assert [n for n in range(3000) if checker.is_prime(n)] == small
    # strong pseudoprimes to the bases 2, 3, 5 and to the first seven primes (Jaeschke 1993)
    assert not checker.is_prime(25326001) and not checker.is_prime(341550071728321)
    assert checker.is_prime(2**61 - 1)


def test_smoothness_agrees_with_the_engine() -> None:
    """On models y^2 + h y = f."""
    rng, seen = random.Random(5), set()
    for _ in range(300):
        g = rng.choice([2, 3])
        f = [rng.randint(-3, 3) for _ in range(2 * g + 2)] + [rng.choice([0, 1, 2])]
        h = [rng.randint(-1, 1) for _ in range(g + 1)] + [rng.choice([0, 1])]
        while f and f[-1] == 0:
            f.pop()
        while h and h[-1] == 0:
            h.pop()
        try:
            curve = checker.Curve([[-c for c in f], h, [1]], g + 1, g, checker.Work())
        except checker.Rejected:
            continue
        for v in (2, 3, 5, 7):
            expect = smooth_modulo(f, h, g, v)
            assert curve.smooth(v) == expect
            seen.add((v, expect))
    assert len(seen) == 8


def test_smoothness_of_plane_quartics() -> None:
    """A singular point over F_v, or a node planted, is noticed; the engine agrees."""
    rng, seen = random.Random(6), set()
    for _ in range(60):
        rows = [[rng.randint(-2, 2) for _ in range(5 - k)] for k in range(5)]
        if not rows[4][0]:
            continue
        rows = [row[: max((i + 1 for i, c in enumerate(row) if c), default=0)] for row in rows]
        try:
            curve = checker.Curve(rows, 1, 3, checker.Work())
        except checker.Rejected:
            continue
        engine = PlaneCurve({(i, k, j): c for c, i, k, j in curve.form})
        for v in (2, 3, 5, 7):
            everywhere = [(x, y, 1) for x in range(v) for y in range(v)]
            everywhere += [(1, s, 0) for s in range(v)] + [(0, 1, 0)]
            forms = [curve.form, *checker.partials(curve.form)]
            singular = any(all(checker.evaluate(f, p, v) == 0 for f in forms) for p in everywhere)
            assert not (singular and curve.smooth(v))
            assert curve.smooth(v) == engine.is_smooth(v)
            seen.add((v, curve.smooth(v), singular))
    assert len(seen) >= 10


@pytest.mark.parametrize("name", sorted(expected_words()))
def test_statements_and_premises(name: str) -> None:
    assert words(checker, name) == expected_words()[name]


def test_statement_in_words() -> None:
    done = alone([str(CORPUS / "accepted" / "stated_index.jsonl")]).stdout
    assert "X: y^2 = x^6 + 8*x^5 + 22*x^4 + 22*x^3 + 5*x^2 + 6*x + 1, of genus 2." in done
    assert "rank: the rank of J(Q) is at most 1" in done
    assert "complete 7: every rational point agrees with a candidate of the list at 7" in done
    for line in (CORPUS / "accepted" / "stated_index.jsonl").read_text(encoding="utf-8").splitlines():
        record = json.loads(line)
        if record["kind"] == "fate" and record["verdict"] == "eliminated":
            assert f"{record['id']} (p = 7)" in done.split("Candidate")[0]
        if record["kind"] == "fate" and record["verdict"] == "rational":
            assert f"Candidate {record['id']} (p = 7) agrees with" in done
    empty = alone([str(CORPUS / "accepted" / "empty_by_classes.jsonl")]).stdout
    assert "X: y^2 = -5*x^6 - 5*x^4 + x^2 + 2, of genus 2. X(Q) is empty.\n" in empty


@pytest.mark.parametrize(
    "name", ["closed_point", "residue_characteristic_two", "genus_three", "plane_discs", "plane_closed_place"]
)
def test_discs_agree_with_the_engine(name: str) -> None:
    """All digits of the differentials, in every disc with the same centre, those at infinity included."""
    with (CORPUS / "accepted" / f"{name}.jsonl").open("rb") as stream:
        proof = checker.check(stream)
    curve, same = proof.curve, 0
    for p, padic in proof.padics.items():
        for number, point in enumerate(padic.reduction.points):
            disc = ResidueDisc(curve.rows, curve.weight, curve.degree, p, point, number)
            own = padic.disc(number)
            assert own.vertical == disc.ramified
            if own.centre == disc.centre(padic.digits):
                forms = disc.expansion(padic.digits, padic.series.length).forms
                assert own.differentials() == [coefficients(form, padic.series.length) for form in forms]
                same += 1
            else:
                # a Weierstrass point is the centre for the engine
                assert own.vertical and curve.weight > 1 and p > 2
    assert same >= 3
