"""Survivors modulo M of the reference curves, by joins in several orders and by lift-and-filter.

Source of the numbers: data/reference/hyperelliptic.json, field `sieve`: survivors modulo M with the listed
primes only, computed independently of this project.  There each prime has the relations between the
generators in J(F_p) and the classes of the points of X(F_p) that lie in the subgroup generated.
"""

from __future__ import annotations

import json
import random
from functools import cache, reduce
from pathlib import Path

import pytest
from flint import fmpz

from sieve.engine.join import join
from sieve.engine.lift_filter import lift_and_filter
from sieve.engine.plan import informative, sieve_classes
from sieve.engine.relation import Relation, coarsen, relation_from_condition
from sieve.engine.survivors import barrier, short_vectors
from sieve.exact.abelian import quotient_by
from tests.support.random_conditions import make

DATA = Path(__file__).resolve().parents[2] / "data" / "reference" / "hyperelliptic.json"


@cache
def stored() -> dict[str, dict]:
    cases = json.loads(DATA.read_text(encoding="utf-8"))
    return {case["id"]: case["sieve"] for case in cases if "sieve" in case}


def vectors(step: dict) -> list[tuple[int, ...]]:
    """The listed survivors (plain integers in rank 1)."""
    return [tuple(x) if isinstance(x, list) else (x,) for x in step["list"]]


@cache
def relation(case: str, p: int) -> Relation:
    """The relation at one prime, from the stored presentation of the image of the group."""
    entry = next(e for e in stored()[case]["primes"] if e["p"] == p)
    n = len(entry["S"][0])
    quotient = quotient_by(n, entry["rels"])
    assert quotient is not None
    images = [quotient.reduce([int(i == j) for j in range(n)]) for i in range(n)]
    allowed = sorted({quotient.reduce(x) for x in entry["S"]})
    assert len(allowed) == len(entry["S"])
    found = relation_from_condition(make(f"v = {p}", quotient.invariants, images, allowed))
    assert found.index == entry["image"] and found.count == len(entry["S"])
    return found


def steps() -> list:
    return [pytest.param(case, step, id=f"{case}-{step['M']}")
            for case, sieve in stored().items() for step in sieve["steps"]]


@pytest.mark.parametrize("case, step", steps())
def test_survivors_modulo_m(case, step):
    modulus = step["M"]
    exponents = {int(ell): int(e) for ell, e in fmpz(modulus).factor()}
    relations = [coarsen(relation(case, p), exponents) for p, _ in step["steps"]]
    n = len(stored()[case]["primes"][0]["S"][0])
    rng = random.Random(modulus)
    # the stored running counts, in the stored order, are those of the running join
    state = None
    for small, (_, count) in zip(relations, step["steps"], strict=True):
        state = small if state is None else join(state, small)
        assert state.count * modulus**n == count * state.index
    # any other order ends with the same number of classes
    shuffled = rng.sample(relations, len(relations))
    if state is not None:
        other = reduce(join, shuffled)
        assert (other.count, other.index) == (state.count, state.index)
        assert state.count * modulus**n == step["survivors"] * state.index
    else:
        assert step["survivors"] == step["total"] == modulus**n
    if step["list"] is not None and state is not None:
        assert all(state.contains(x) for x in vectors(step))
        assert len({tuple(c % modulus for c in x) for x in vectors(step)}) == step["survivors"]


@pytest.mark.parametrize("case", ["X0p67", "bielliptic_x6_x2_1", "lmfdb13689", "quadratic_period_5"])
def test_lift_and_filter_agrees(case):
    done = 0
    for step in stored()[case]["steps"]:
        modulus = step["M"]
        n = len(stored()[case]["primes"][0]["S"][0])
        path = [int(ell) for ell, e in fmpz(modulus).factor() for _ in range(int(e))]
        relations = [relation(case, p) for p, _ in step["steps"]]
        if not relations or modulus**n > 10**6:
            continue
        found = lift_and_filter(relations, path)
        assert found.modulus == modulus and len(found.vectors) == step["survivors"]
        assert found.largest >= len(found.vectors) and found.trace[-1][2] == step["survivors"]
        if step["list"] is not None:
            assert {tuple(x) for x in found.vectors.tolist()} == {
                tuple(c % modulus for c in x) for x in vectors(step)}
        done += 1
    assert done >= 3


@pytest.mark.parametrize("case", sorted(stored()))
def test_the_planner_never_loses_a_vector_that_all_conditions_allow(case):
    relations = [relation(case, e["p"]) for e in stored()[case]["primes"]]
    n = relations[0].n
    outcome = sieve_classes(relations)
    # the vectors of the known points are those that all conditions allow: small ones first
    known = [x for x in _small_vectors(n, 4 if n < 3 else 2) if all(r.contains(x) for r in relations)]
    assert known
    assert all(outcome.relation.contains(x) for x in known)
    survivors = short_vectors(outcome.relation)
    assert len(survivors) == outcome.relation.count
    assert {s.vector for s in survivors} >= {s.vector for s in survivors if s.norm == 0}
    found = barrier(outcome.relation, known)
    assert found.norm is not None
    for x in _small_vectors(n, 6 if n < 3 else 3):
        if outcome.relation.contains(x) and x not in known:
            assert sum(c * c for c in x) >= found.norm
    assert set(outcome.relation.sources) <= {r.name for r in informative(relations)}


def _small_vectors(n: int, radius: int) -> list[tuple[int, ...]]:
    out: list[tuple[int, ...]] = [()]
    for _ in range(n):
        out = [(*x, c) for x in out for c in range(-radius, radius + 1)]
    return out
