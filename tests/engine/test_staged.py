"""Sieving in stages: the same classes whatever the chunks, estimates, paths."""

from __future__ import annotations

import random
from functools import reduce
from math import log

import pytest

from sieve.engine.join import join, project
from sieve.engine.plan import run_plan
from sieve.engine.relation import coarsen, relation_from_condition
from sieve.engine.staged import expected_log_size, modulus_path, sieve_in_stages
from tests.support.random_conditions import random_condition

MODULI = (2, 4, 3, 9, 6, 12, 36, 5)


def family(seed, n=3, count=9, density=0.55):
    rng = random.Random(seed)
    planted = [tuple(rng.randrange(60) for _ in range(n)) for _ in range(2)]
    conditions = [random_condition(rng, f"v = {k}", n, moduli=MODULI, planted=planted, density=density,
                                   factors=3) for k in range(count)]
    return planted, [relation_from_condition(c) for c in conditions]


@pytest.mark.parametrize("seed", range(8))
def test_chunks_do_not_matter_and_nothing_allowed_is_lost(seed):
    planted, relations = family(seed)
    path = [2, 3, 2, 5, 3]
    whole = sieve_in_stages(relations, path)
    pieces = sieve_in_stages(relations, path, chunk=3)
    cut = [coarsen(r, {2: 2, 3: 2, 5: 1}) for r in relations]
    every = reduce(join, [r for r in cut if r.parts])
    for outcome in (whole, pieces):
        assert all(outcome.relation.contains(x) for x in planted)
        assert outcome.largest >= outcome.relation.count
        # the plan run in one piece ends with the same classes
        again = run_plan(outcome.plan, relations).relation
        assert (again.count, again.index) == (outcome.relation.count, outcome.relation.index)
        assert sorted(again.codes.tolist()) == sorted(outcome.relation.codes.tolist())
        allowed = project(every, outcome.relation.by_prime)
        assert {tuple(c) for c in allowed.codes.tolist()} <= {tuple(c) for c in _in_basis_of(
            allowed, outcome.relation)}


def _in_basis_of(target, relation):
    """The classes of a relation in the basis that `project` gives for the same subgroup."""
    assert target.index == relation.index
    return project(relation, target.by_prime).codes.tolist() if target.parts else relation.codes.tolist()


def test_expected_sizes_start_at_one_class_and_never_fall_below_the_known_ones():
    _, relations = family(1)
    assert expected_log_size(relations, {}) == 0
    assert expected_log_size(relations, {2: 2, 3: 2, 5: 1}, known=10**6) == log(10**6)
    assert expected_log_size(relations, {2: 1}) <= 3 * log(2) + 1e-9


@pytest.mark.parametrize("seed", range(4))
def test_the_path_has_the_least_peak(seed):
    _, relations = family(seed)
    tops = {2: 2, 3: 1, 5: 1}
    path = modulus_path(relations, tops, 1e9)
    assert sorted(path) == [2, 2, 3, 5]

    def peak(order):
        modulus, worst = {}, 0.0
        for ell in order:
            modulus[ell] = modulus.get(ell, 0) + 1
            worst = max(worst, expected_log_size(relations, modulus))
        return worst

    rng = random.Random(seed)
    assert all(peak(path) <= peak(rng.sample(path, 4)) + 1e-5 for _ in range(24))
    short = modulus_path(relations, tops, 3 * log(2))
    assert len(short) == 1
