"""Planners: same answers, deterministic plans, the exhaustive one is best; verdicts do not move."""

from __future__ import annotations

import random
from dataclasses import replace
from functools import reduce
from itertools import permutations
from math import log

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sieve.engine.fates import decide
from sieve.engine.graph import ConstraintGraph
from sieve.engine.join import join
from sieve.engine.outlook import sum_of_parts
from sieve.engine.plan import informative, run_plan
from sieve.engine.planners import PLANNERS, planner, register
from sieve.engine.relation import relation_from_condition
from sieve.errors import InternalError
from tests.support.random_conditions import box, exponent, image, labelled, random_condition, survivors

SMALL = (2, 3, 4, 6, 8)


def family(seed, count=6, density=0.5, planted=((1, 2),)):
    rng = random.Random(seed)
    return [random_condition(rng, f"v = {k}", 2, moduli=SMALL, planted=planted, density=density)
            for k in range(count)]


@pytest.mark.parametrize("name", sorted(PLANNERS))
@pytest.mark.parametrize("seed", range(6))
def test_every_planner_keeps_what_is_allowed_and_ends_empty_when_nothing_is(name, seed):
    planted = ((1, 2),) if seed % 2 else ()
    conditions = family(seed, density=0.5 if planted else 0.3, planted=planted)
    relations = [relation_from_condition(c) for c in conditions]
    good = survivors(conditions, 2)
    plan = planner(name)(relations)
    assert plan == planner(name)(list(reversed(relations)))
    outcome = run_plan(plan, relations)
    assert all(outcome.relation.contains(x) for x in good)
    if name != "greedy":
        assert (outcome.relation.count == 0) == (not good)
        whole = reduce(join, informative(relations))
        if good:
            assert (outcome.relation.count, outcome.relation.index) == (whole.count, whole.index)
    text = str(outcome.plan)
    assert "expected" in text and "found" in text and "found" not in str(plan)


@pytest.mark.parametrize("seed", range(5))
def test_the_exhaustive_plan_has_the_least_largest_set(seed):
    relations = informative([relation_from_condition(c) for c in family(seed, count=5)])

    def largest(order):
        parts, density, worst = {}, 0.0, -1e9
        for r in order:
            parts = sum_of_parts(parts, r)
            density += log(r.count) - log(r.index)
            worst = max(worst, density + sum(p.length * log(p.prime) for p in parts.values()))
        return worst

    best = min(largest(order) for order in permutations(relations))
    plans = {name: planner(name)(relations) for name in ("exhaustive", "beam", "tree")}
    found = {name: max(log(s.predicted) for s in plan.steps) for name, plan in plans.items()}
    assert abs(found["exhaustive"] - best) < 1e-6
    assert found["exhaustive"] <= found["beam"] + 1e-6


def test_the_registry_refuses_second_names_and_unknown_ones():
    with pytest.raises(InternalError):
        register("greedy")(planner("beam"))
    with pytest.raises(KeyError, match="beam"):
        planner("none")
    many = [relation_from_condition(c) for c in family(1, count=30, density=0.5)]
    with pytest.raises(InternalError):
        planner("exhaustive")(many)


@settings(max_examples=40, deadline=None, derandomize=True)
@given(st.integers(0, 10**6))
def test_planner_join_order_and_limits_never_change_a_verdict(seed):
    """Against enumeration: a label dies exactly when no allowed vector lies in its classes (one is allowed at
    all: conditions that contradict each other away from the candidates do not concern them)."""
    rng = random.Random(seed)
    planted = [(rng.randrange(24), rng.randrange(24))]
    conditions = [random_condition(rng, f"v = {k}", 2, moduli=SMALL, density=0.35, planted=planted)
                  for k in range(4)]
    lists = labelled(rng, random_condition(rng, "p = 2", 2, moduli=(4, 8, 3), density=0.7), 5)
    if not lists.count:
        return
    candidates = relation_from_condition(lists)
    pool = [relation_from_condition(c) for c in conditions]
    size = exponent([*conditions, lists])
    good = [x for x in box(2, size) if all(list(image(c, x)) in c.allowed.tolist() for c in conditions)]
    classes = {tuple(int(v) for v in row): ids for row, ids in zip(lists.allowed, lists.labels, strict=True)}
    alive = {label for x in good for label in classes.get(image(lists, x), ())}
    everyone = {label for ids in lists.labels for label in ids}
    for shuffled in (pool, list(reversed(pool)), rng.sample(pool, len(pool))):
        fates = decide([candidates], shuffled)
        assert {f.label for f in fates if f.eliminated} == everyone - alive
    start = replace(candidates, outside=())
    for name in sorted(PLANNERS):
        for cap in (10**6, 3):
            end = run_plan(planner(name)(pool, start), pool, start, cap=cap).relation
            assert alive <= set(end.labels)
            if cap > 3 and name != "greedy":
                assert set(end.labels) == alive
    order = ConstraintGraph(pool).order()
    joined = reduce(join, [next(r for r in pool if r.name == n) for n in order], start)
    assert set(joined.labels) == alive
