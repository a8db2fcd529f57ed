"""Logs of whole runs: accepted by the checker, in agreement with the result, deterministic, trimmed."""

from __future__ import annotations

import io
import json
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path

import pytest

from sieve.commands import run as run_command
from sieve.commands.prooflog import proof_of
from sieve.curves.branch import branch_factors, irreducibility_primes
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.local.picard import picard_group
from sieve.local.rational_sections import present, section_through
from sieve.proof import checker
from sieve.proof.trim import trim
from tests.support.reference_cases import reference_case, reference_cases
from tests.support.run_files import RUNNABLE, chabauty_prime, run_to, write_candidates, write_case, write_json

DEMO = Path(__file__).resolve().parents[2] / "data" / "demo"
QUICK = (
    "X0p103_lmfdb",
    "X0p125",
    "X0_37",
    "X1_13",
    "X1_16",
    "lmfdb100154",
    "five_roots_0_1_2_5_6",
    "lmfdb2059",
)


def records_of(text: str) -> list[dict]:
    return [json.loads(line) for line in text.splitlines()]


def accept(text: str) -> None:
    """The checker accepts these bytes (it raises otherwise)."""
    checker.check(io.BytesIO(text.encode()))


def reference_run(name: str, directory: Path, count: int = 6, bound: int | None = 150) -> run_command.Run:
    case = reference_case(name)
    candidates = write_candidates(case, directory, chabauty_prime(case), 4, count)
    return run_command.execute(str(write_case(case, directory)), [str(candidates)], bound=bound)


def check_agreement(run: run_command.Run, text: str) -> None:
    """Log and result say the same about every candidate, and about X(Q)."""
    records = records_of(text)
    result = run_command.result_of(run)
    fates = {(r["prime"], r["id"]): r for r in records if r["kind"] == "fate"}
    assert len(fates) == len(result.verdicts)
    for verdict in result.verdicts:
        fate = fates[verdict.prime, verdict.id]
        assert fate["verdict"] == verdict.verdict
        if verdict.verdict == "eliminated":
            # v, "p = q" or "deep q"
            names = [u[0] if isinstance(u[0], int) else int(u[0].split(" ")[-1]) for u in fate["uses"]]
            assert tuple(dict.fromkeys(names)) == verdict.primes
        elif verdict.verdict == "rational":
            assert (fate["given"], fate["sole"]) == (verdict.given, verdict.sole)
    end = records[-1]
    assert (end["conclusion"] == "empty") == ("X(Q) is empty" in result.statement)
    assert (end["conclusion"] == "points") == ("exactly" in result.statement)


@pytest.mark.parametrize("name", QUICK)
def test_reference_curves(name: str, tmp_path: Path) -> None:
    run = reference_run(name, tmp_path)
    trimmed, full = proof_of(run, False), proof_of(run, True)
    for log in (trimmed, full):
        accept(log.text)
        check_agreement(run, log.text)
    assert trimmed.records < full.records == full.all_records == trimmed.all_records
    assert set(trimmed.primes) <= set(full.primes)
    # trimming the full log gives the trimmed one up to the primes l of fates without uses
    again = trim(records_of(full.text))
    text = "".join(json.dumps(r, separators=(",", ":")) + "\n" for r in again)
    accept(text)
    assert trim(again) == again
    assert trim(records_of(trimmed.text)) == records_of(trimmed.text)


@pytest.mark.slow
@pytest.mark.parametrize("name", RUNNABLE)
def test_every_reference_curve(name: str, tmp_path: Path) -> None:
    run = reference_run(name, tmp_path, 10, None)
    for log in (proof_of(run, False), proof_of(run, True)):
        accept(log.text)
        check_agreement(run, log.text)


def test_same_bytes_with_workers(tmp_path: Path) -> None:
    case, candidates = str(DEMO / "case.toml"), [str(DEMO / "candidates.json")]
    alone = run_command.execute(case, candidates)
    with ProcessPoolExecutor(2) as pool:
        together = run_command.execute(case, candidates, executor=pool)
    run_command.write_files(alone, tmp_path / "a")
    run_command.write_files(together, tmp_path / "b")
    for name in ("proof.jsonl", "result.json", "report.txt"):
        assert (tmp_path / "a" / name).read_bytes() == (tmp_path / "b" / name).read_bytes()
    assert "records kept" in (tmp_path / "a" / "report.txt").read_text(encoding="utf-8")


def test_demo_needs_few_primes() -> None:
    run = run_command.execute(str(DEMO / "case.toml"), [str(DEMO / "candidates.json")])
    log = proof_of(run, False)
    assert len(log.primes) <= 4
    assert log.records - len(run.decisions) * 2 < 20
    check_agreement(run, log.text)


def test_without_candidates_the_classes_are_in_the_log(tmp_path: Path) -> None:
    case = reference_case("X0_37")
    run, path = run_to(tmp_path, write_case(case, tmp_path), [], bound=100)
    text = path.read_text(encoding="utf-8")
    accept(text)
    (classes,) = [r for r in records_of(text) if r["kind"] == "classes"]
    assert run.outlook is not None
    relation = run.outlook.outcome.relation
    assert (classes["count"], classes["index"]) == (relation.count, relation.index)
    assert len(classes["vectors"]) == min(relation.count, 1000)
    survivors = run_command.result_of(run).survivors
    assert survivors is not None and (survivors.count, survivors.quotient) == (relation.count, relation.index)


def test_coefficients_and_discs(tmp_path: Path) -> None:
    case = reference_case("X0p103_lmfdb")
    p = 3
    discs = [f"({x} : {y} : {z})" for x, y, z in HyperellipticCurve(case.f, case.h).modulo(p).points[:4]]
    listed: list[dict[str, object]] = [{"id": f"d{i}", "disc": disc} for i, disc in enumerate(discs)]
    for i in range(6):
        values = [f"{900 * i + 40} + O(3^4)", f"{731 * i + 5} + O(3^4)"]
        listed.append({"id": f"c{i}", "coefficients": values})
    listed.append({"id": "e", "coefficients": ["1 + O(3^2)", "1 + O(3)"], "disc": discs[0]})
    path = write_json(tmp_path / "c.json", p, 4, listed, False)
    run, log = run_to(tmp_path, write_case(case, tmp_path), [path], bound=150)
    text = log.read_text(encoding="utf-8")
    accept(text)
    check_agreement(run, text)
    verdicts = {d.id[0]: set() for d in run.decisions}
    for d in run.decisions:
        verdicts[d.id[0]].add(d.verdict)
    assert "eliminated" in verdicts["c"]
    assert not any(d.sole for d in run.decisions if d.id[0] in "ce")


def test_a_place_that_meets_a_ramified_disc(tmp_path: Path) -> None:
    """(2, 3) reduces to a branch point modulo 3, and lies on the generator x^2 = 4, y = x + 1."""
    curve = HyperellipticCurve(_plus(_times([-4, 0, 1], [-1, -1, -1, 1, 1]), [1, 2, 1]))
    place = '{ mumford = ["x^2 - 4", "x + 1"] }'
    lines = [
        'format = "sieve-case/1"',
        'name = "blocked"',
        "[curve]",
        f'equation = "y^2 = {_text(curve.f)}"',
        "[jacobian]",
        "rank = 1",
        'rank_source = "assumed"',
        f'base = "{curve.format_point((1, 1, 0))}"',
        "[[jacobian.generators]]",
        f"divisor = [[1, {place}], [-1, {{ fibres = 1 }}]]",
    ]
    case = tmp_path / "case.toml"
    case.write_text("\n".join(lines) + "\n", encoding="utf-8")
    assert curve.is_smooth(3)
    discs: list[dict[str, object]] = [
        {"id": f"d{k}", "disc": f"({x} : {y} : {z})"} for k, (x, y, z) in enumerate(curve.modulo(3).points)
    ]
    path = write_json(tmp_path / "c.json", 3, 3, discs, False)
    run, log = run_to(tmp_path, case, [path], bound=40)
    text = log.read_text(encoding="utf-8")
    accept(text)
    assert not run.lists[0].blocked
    assert [r["prime"] for r in records_of(text) if r["kind"] == "padic"] == [3]


def _times(a: list[int], b: list[int]) -> list[int]:
    out = [0] * (len(a) + len(b) - 1)
    for i, x in enumerate(a):
        for j, y in enumerate(b):
            out[i + j] += x * y
    return out


def _plus(a: list[int], b: list[int]) -> list[int]:
    return [x + (b[i] if i < len(b) else 0) for i, x in enumerate(a)]


def _text(coefficients: tuple[int, ...]) -> str:
    return " + ".join(f"({c})*x^{i}" for i, c in enumerate(coefficients))


def test_without_rational_generation_the_class_is_not_used(tmp_path: Path) -> None:
    """At p = 3 on the genus-3 curve too few points are known to generate; integrals alone must do."""
    case = reference_case("integral_g3")
    candidates = write_candidates(case, tmp_path, 3, 4, 4, complete=False)
    run, log = run_to(tmp_path, write_case(case, tmp_path), [candidates], bound=60)
    text = log.read_text(encoding="utf-8")
    accept(text)
    assert not run.lists[0].place.reduction
    assert 3 not in [r["prime"] for r in records_of(text) if r["kind"] == "local"]
    assert 3 in [r.prime for r in run.investigation.skipped]


@pytest.mark.parametrize("name", ["X0p67", "X1_13", "integral_g3", "empty_bielliptic_2", "lmfdb2059"])
def test_presentations(name: str) -> None:
    """Every definition has one new zero, and together everything is reached; sections are what they claim."""
    case = reference_case(name)
    curve = HyperellipticCurve(case.f, case.h)
    for v in [*case.good_primes(40), 101, 211]:
        group = picard_group(curve.modulo(v))
        found = present(group)
        if found is None:
            assert v < 30
            continue
        reduced = group.curve
        known = {found.origin, *found.base}
        known |= {int(reduced.partner[i]) for i in known}
        for section in found.define:
            (new,) = [i for i in section.zeros if i not in known]
            known |= {new, int(reduced.partner[new])}
        assert known == set(range(reduced.count))
        for section in (*found.define, *found.close):
            assert len(section.zeros) == 2 * section.multiple >= 2 * curve.genus + 2
            for i in set(section.zeros):
                x, y, z = reduced.points[i]
                if z:
                    assert _value(section.rows, x, y) % v == 0


def test_section_through_a_place() -> None:
    curve = HyperellipticCurve([1, -4, 2, -2, 1, 2, 1])
    place = curve.mumford([2, 3, 1], [-1, -4])  # (-1, 3) and (-2, 7)
    reduced = curve.modulo(31)
    section = section_through(reduced, place)
    assert section is not None and len(section.zeros) == 2 * section.multiple - 2
    for x, y in ((-1, 3), (-2, 7)):
        assert _value(section.rows, x, y) % 31 == 0


def _value(rows: tuple[tuple[int, ...], ...], x: int, y: int) -> int:
    """H(x, y, 1)."""
    return sum(c * x**i * y**k for k, row in enumerate(rows) for i, c in enumerate(row))


def test_branch_factors_multiply_to_the_branch_polynomial() -> None:
    for case in reference_cases():
        square = HyperellipticCurve(case.f, case.h).square_form
        found = branch_factors(square)
        assert found is not None
        product = [1]
        for factor in found.factors:
            product = _times(product, list(factor))
        assert tuple(product) == square


def test_reducible_polynomials_have_no_evidence() -> None:
    assert irreducibility_primes([-2, 0, 1, 0, 1]) is None  # (x^2 - 1)(x^2 + 2)
    assert irreducibility_primes([1, 0, 0, 0, 1]) is None
    assert branch_factors([1, 0, 0, 0, 1]) is None
