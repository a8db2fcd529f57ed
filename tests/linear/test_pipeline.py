"""From an equation to the set of rational points, through the code behind `candidates` and `run`."""

from __future__ import annotations

import importlib.util
import json
import shutil
import tomllib
from pathlib import Path

import pytest

from sieve.commands import candidates, propose
from sieve.commands import run as run_command
from sieve.curves.base_search import closed_points
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.search import search_points
from sieve.errors import Inconsistent, InputError
from sieve.files.candidates import load_candidates
from tests.linear.test_linear_chabauty import BIELLIPTIC, RANK_ONE, RANK_ZERO, even_curve, known
from tests.support.pipeline import pipeline, write_case
from tests.support.reference_cases import reference_case

ROOT = Path(__file__).resolve().parents[2]
DEMO = ROOT / "data" / "demo-linear" / "case.toml"
EMPTY = sorted((ROOT / "data" / "empty").glob("*.toml"))


@pytest.mark.parametrize("name", RANK_ONE + RANK_ZERO)
def test_reference_curves(name: str, tmp_path: Path) -> None:
    """The published sets of rational points; the sources are in the reference file."""
    case = reference_case(name)
    path = write_case(tmp_path, case.f, case.h, int(case.rank or 0), "data/reference/hyperelliptic.json")
    outcome = pipeline(path)
    assert outcome.open_candidates == []
    assert outcome.proved and outcome.points == set(known(case))
    assert len(outcome.points) == case.raw["points"]["total"]


@pytest.mark.parametrize(("name", "prime"), [("quadratic_period_5", 11), ("X0_37", 7), ("lmfdb2059", 7)])
def test_the_sieve_removes_spurious_zeros(name: str, prime: int, tmp_path: Path) -> None:
    case = reference_case(name)
    path = write_case(tmp_path, case.f, case.h, int(case.rank or 0), "data/reference/hyperelliptic.json")
    outcome = pipeline(path, prime)
    assert outcome.search.chosen.spurious > 0
    assert sum(d.verdict == "eliminated" for d in outcome.run.decisions) == outcome.search.chosen.spurious
    assert outcome.proved and outcome.points == set(known(case))


@pytest.mark.parametrize("key", sorted(BIELLIPTIC))
def test_bielliptic_curves(key: tuple[int, int, int, int], tmp_path: Path) -> None:
    """The expected set is what a search to height 200 finds.  It is proved to be all on eight curves.

    On two curves with branch points in quadratic fields a class looks divisible by 2 modulo every prime,
    so the parts at l = 2 cannot be used and two candidates may stay open; none is eliminated wrongly.
    """
    curve = even_curve(key)
    path = write_case(tmp_path, curve.f, (), 1, "ranks of the elliptic factors by PARI")
    outcome = pipeline(path)
    assert outcome.points == set(search_points(curve, 200))
    if key not in ((1, -16, 76, -96), (1, -16, 79, -120)):
        assert outcome.open_candidates == [] and outcome.proved
    assert len(outcome.open_candidates) <= 2


# ---- the second demo --------------------------------------------------------------------------------------


def test_the_demo(tmp_path: Path) -> None:
    path = tmp_path / "case.toml"
    shutil.copy(DEMO, path)
    outcome = pipeline(path)
    assert outcome.search.zeros.prime == 7
    assert (outcome.search.zeros.count, outcome.search.chosen.spurious) == (12, 6)
    # no prime that was tried is without spurious zeros
    assert all(trial.spurious > 0 for trial in outcome.search.trials) and len(outcome.search.trials) >= 6
    eliminated = [d for d in outcome.run.decisions if d.verdict == "eliminated"]
    assert len(eliminated) == 6 and all(d.primes for d in eliminated)
    assert outcome.proved and outcome.points == {
        (1, 1, 0), (1, -1, 0), *((s * 3, t * 30, 1) for s in (1, -1) for t in (1, -1))
    }


def test_the_rank_of_the_demo_is_proved_and_cited() -> None:
    spec = importlib.util.spec_from_file_location("rank", ROOT / "scripts" / "demo_linear_rank.py")
    assert spec is not None and spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    jacobian = tomllib.loads(DEMO.read_text("utf-8"))["jacobian"]
    assert jacobian["rank_source"] == module.rank_source()


# ---- curves without rational points -----------------------------------------------------------------------


@pytest.mark.parametrize("path", EMPTY, ids=lambda p: p.stem)
def test_curves_without_points_are_proved_empty(path: Path) -> None:
    done = run_command.execute(str(path), [], bound=150)
    assert run_command.statement(done) == "X(Q) is empty."
    assert done.exit_code == 0


def test_the_cases_without_points_are_what_the_proposal_gives() -> None:
    spec = importlib.util.spec_from_file_location("cases", ROOT / "scripts" / "empty_cases.py")
    assert spec is not None and spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    records = module.records()
    assert len(EMPTY) == len(records) == 6
    for record in records[1:2]:
        path = ROOT / "data" / "empty" / f"{record['id']}.toml"
        assert path.read_text("utf-8") == module.rendered(record)


def test_half_a_fibre_does_not_prove_a_curve_with_points_empty(tmp_path: Path) -> None:
    """A curve of rank 1 with rational points, none of them told: some class survives."""
    case = tmp_path / "case.toml"
    text = DEMO.read_text("utf-8").replace('base = "(1 : 1 : 0)"', 'base = "half a fibre"')
    for points in ('"(1 : 1 : 0)", "(1 : -1 : 0)",', '"(3, 30)", "(3, -30)",'):
        text = text.replace(points, "")
    case.write_text(text, "utf-8")
    done = run_command.execute(str(case), [], bound=150)
    assert done.exit_code == 1 and done.outlook is not None and not done.outlook.empty
    assert len(done.warnings) == 4


def test_candidates_with_half_a_fibre(tmp_path: Path) -> None:
    """The same zeros as with a rational base point, and the same verdict."""
    case = tmp_path / "case.toml"
    case.write_text(DEMO.read_text("utf-8").replace('base = "(1 : 1 : 0)"', 'base = "half a fibre"'), "utf-8")
    outcome = pipeline(case, 7)
    assert outcome.search.zeros.discs == candidates.execute(str(DEMO), prime=7).zeros.discs
    assert outcome.proved


# ---- proposals --------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", ["X0_37", "lmfdb2059", "empty_bielliptic_3"])
def test_closed_points_lie_on_the_curve(name: str) -> None:
    case = reference_case(name)
    curve = HyperellipticCurve(case.f, case.h)
    places = closed_points(curve, 2)
    assert places == sorted(set(places), key=lambda p: [p.degree, places.index(p)])
    for place in places:
        assert curve.mumford(place.u, place.w) == place
        assert place.degree <= 3


def test_a_cubic_point_becomes_a_base() -> None:
    """y^2 = (x^3 + x + 1)(x^3 - x + 3): the closed point x^3 + x + 1 = 0, y = 0 has odd degree."""
    curve = HyperellipticCurve([3, 2, -1, 4, 0, 0, 1])
    places = [p for p in closed_points(curve, 0) if p.degree == 3]
    assert [p.w for p in places] == [(), ()]


def test_proposal_text_is_a_case(tmp_path: Path) -> None:
    case = reference_case("lmfdb2059")
    path = write_case(tmp_path, case.f, case.h, 1, "source")
    data = tomllib.loads(path.read_text("utf-8"))
    assert len(data["known_points"]) == 7
    assert data["jacobian"]["torsion"][0]["order"] == 3
    document = propose.document(propose.execute(str(path)))
    assert document["rank"] == 1 and len(document["generators"]) == 1
    assert json.loads(json.dumps(document)) == document


def test_more_independent_classes_than_the_rank(tmp_path: Path) -> None:
    case = reference_case("X0p67")
    with pytest.raises(Inconsistent, match="2 independent divisor classes for rank 1"):
        write_case(tmp_path, case.f, case.h, 1, "wrong")


# ---- refusals ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("options", "text"),
    [
        ({"prime": 2}, "--prime: 2, expected an odd prime"),
        ({"prime": 9}, "--prime: 9, expected an odd prime"),
        ({"prime": 5}, "--prime: 5, where the curve is not smooth"),
        ({"prime": -7}, "--prime: -7, expected an odd prime"),
        ({"prime": 7, "precision": 0}, "--precision: 0, expected between 1 and 1000"),
        ({"prime": 7, "precision": 10**6}, "--precision: 1000000, expected between 1 and 1000"),
    ],
)
def test_refused_options(options: dict[str, int], text: str) -> None:
    with pytest.raises(InputError, match=text.replace("(", r"\(")):
        candidates.execute(str(DEMO), **options)


def test_a_rank_that_is_not_below_the_genus() -> None:
    with pytest.raises(InputError, match="rank 2 for genus 2, expected a rank below the genus"):
        candidates.execute(str(ROOT / "data" / "demo" / "case.toml"))


def test_too_few_digits_are_asked_for_in_words(tmp_path: Path) -> None:
    """A generator times 7^6 has fewer digits in its logarithm: more are computed, up to a limit."""
    case = tmp_path / "case.toml"
    big = 7**6
    text = DEMO.read_text("utf-8").replace('divisor = [[1, "(-3, -30)"], [-1, "(1 : 1 : 0)"]]', (
        f'divisor = [[{big}, "(-3, -30)"], [-{big}, "(1 : 1 : 0)"]]'
    ))
    case.write_text(text, "utf-8")
    few = candidates.execute(str(case), prime=7, precision=2)
    assert few.zeros.count == 12
    assert few.zeros.discs == candidates.execute(str(DEMO), prime=7, precision=2).zeros.discs


def test_wrong_generators_are_noticed(tmp_path: Path) -> None:
    """A class of finite order as the free generator: its logarithm is 0 to any precision."""
    case = tmp_path / "case.toml"
    text = DEMO.read_text("utf-8")
    text = text.replace('divisor = [[1, "(-3, -30)"], [-1, "(1 : 1 : 0)"]]',
                        'divisor = [[1, "(-3, 30)"], [-1, "(1 : 1 : 0)"]]')
    case.write_text(text, "utf-8")
    with pytest.raises(InputError, match="--precision: 4 digits, which are too few"):
        candidates.execute(str(case), prime=7, precision=4)


def test_the_file_is_read_back(tmp_path: Path) -> None:
    search = candidates.execute(str(DEMO), prime=11, precision=5)
    path = tmp_path / "c.json"
    path.write_text(json.dumps(candidates.candidate_document(search)), "utf-8")
    file = load_candidates(path)
    assert (file.prime, file.precision, file.complete) == (11, 5, True)
    assert len(file.candidates) == search.zeros.count
    assert "rank at most 1" in file.source
    document = candidates.document(search)
    assert sum(d["candidates"] for d in document["discs"]) == len(document["candidates"])
    assert "14 candidates, 8 of them near no known rational point" in candidates.text(search)


# ---- warnings ---------------------------------------------------------------------------------------------


def test_points_that_search_finds_are_reported(tmp_path: Path) -> None:
    """(-3, +-30) are missing in the case, (-3, 30) in a list that claims to be complete."""
    search = candidates.execute(str(DEMO), prime=7, precision=8)
    document = candidates.candidate_document(search)
    missing = next(name for name, points in search.chosen.points.items() if (-3, 30, 1) in points)
    document["candidates"] = [c for c in document["candidates"] if c["id"] != missing]
    list_path = tmp_path / "c.json"
    list_path.write_text(json.dumps(document), "utf-8")
    case = tmp_path / "case.toml"
    case.write_text(DEMO.read_text("utf-8").replace('"(-3, 30)", "(-3, -30)",', ""), "utf-8")
    done = run_command.execute(str(case), [str(list_path)], bound=400)
    assert [w for w in done.warnings if "(-3 : 30 : 1) is not in the case" in w]
    missed = "claims to be complete but misses the rational point (-3 : 30 : 1)"
    assert [w for w in done.warnings if missed in w]
    assert not done.lists[0].complete
    assert "exactly" not in run_command.statement(done)
    with pytest.raises(Inconsistent, match="claims to be complete"):
        run_command.execute(str(DEMO), [str(list_path)], bound=400)
