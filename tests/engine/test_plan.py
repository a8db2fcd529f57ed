"""Plans: predicted, executed, printed; soundness with planted vectors."""

from __future__ import annotations

import random
from functools import reduce

import pytest

from sieve.engine.join import join
from sieve.engine.lift_filter import lift_and_filter
from sieve.engine.outlook import Outlook, choose, choose_start, log_pass, shared_parts
from sieve.engine.plan import Plan, Step, fit, informative, make_plan, run_plan, sieve_classes, sieve_run
from sieve.engine.relation import coarsen, relation_from_condition, trivial
from sieve.errors import LimitReached
from tests.support.random_conditions import exponent, make, random_condition, survivors

MODULI = (7, 9, 27, 11, 13, 21, 33, 35, 63, 64, 99, 117, 45)


def planted_family(seed, n=2, conditions=12, density=0.12, points=3):
    rng = random.Random(seed)
    planted = sorted({tuple(rng.randint(-9, 9) for _ in range(n)) for _ in range(points)})
    found = [random_condition(rng, f"v = {k:02}", n, moduli=MODULI, planted=planted, density=density)
             for k in range(conditions)]
    return planted, [relation_from_condition(c) for c in found]


@pytest.mark.parametrize("seed", range(12))
def test_planted_vectors_survive_every_way_of_sieving(seed):
    planted, relations = planted_family(seed, n=1 + seed % 4)
    for pool in (relations, shared_parts(relations)):
        plan = make_plan(pool, known=len(planted))
        for outcome in (sieve_classes(pool), run_plan(plan, pool), run_plan(plan, pool, cap=50)):
            assert all(outcome.relation.contains(x) for x in planted)
            assert outcome.largest >= outcome.relation.count > 0
            used = {r.name: r for r in pool}
            assert set(outcome.relation.sources) <= set(used)


@pytest.mark.parametrize("seed", range(12))
def test_the_result_lies_between_the_full_join_and_its_sources(seed):
    rng = random.Random(seed)
    n = rng.randint(1, 2)
    moduli = (2, 3, 4, 6, 8, 9) if n == 1 else (2, 3, 4, 6)
    conditions = [random_condition(rng, f"c{k}", n, moduli=moduli, density=0.6) for k in range(5)]
    relations = [relation_from_condition(c) for c in conditions]
    good = survivors(conditions, n)
    outcome = sieve_classes(relations)
    assert all(outcome.relation.contains(x) for x in good)
    named = [c for c in conditions if c.name in outcome.relation.sources]
    if outcome.relation.count == 0:
        assert not survivors(named, n) and not good
    # every surviving class contains a vector that the sources allow up to the coarsening used
    last = None
    for last in sieve_run(relations):
        assert all(last.relation.contains(x) for x in good)
    whole = reduce(join, relations)
    assert whole.count * exponent(conditions) ** n == len(good) * whole.index
    if last.relation.index == whole.index and set(last.relation.sources) == set(whole.sources):
        assert last.relation.count == whole.count


def test_a_contradiction_is_found():
    # no two of the three conditions contradict each other
    a = make("a", [3, 5], [[1, 1]], [[0, 0], [1, 1], [2, 2]])
    b = make("b", [5, 7], [[1, 1]], [[0, 0], [1, 1], [2, 2]])
    c = make("c", [7, 3], [[1, 1]], [[0, 1], [1, 2], [2, 0]])
    relations = [relation_from_condition(x) for x in (a, b, c)]
    outcome = sieve_classes(relations)
    assert outcome.relation.count == 0 and outcome.relation.sources == ("a", "b", "c")
    assert outcome.plan.steps[-1].actual == 0
    again = run_plan(outcome.plan, relations)
    assert again.relation.count == 0 and again.plan == outcome.plan


def test_an_empty_condition_ends_everything():
    nothing = relation_from_condition(make("a", [6], [[1]], []))
    other = relation_from_condition(make("b", [5], [[1]], [[1], [2]]))
    outcome = sieve_classes([other, nothing])
    assert outcome.relation.count == 0 and outcome.relation.sources == ("a",)
    assert sieve_classes([other, nothing], other).relation.count == 0
    assert choose_start([nothing, other]) is nothing


def test_nothing_to_say():
    full = relation_from_condition(make("a", [4], [[1]], [[0], [1], [2], [3]]))
    assert informative([full]) == []
    outcome = sieve_classes([full])
    assert outcome.relation.index == 1 and outcome.relation.count == 1 and outcome.plan == Plan(())
    assert make_plan([full]) == Plan(())
    assert run_plan(Plan(()), [full]).relation.index == 1
    assert sieve_classes([]).relation.count == 1


def test_plans_are_data():
    _, relations = planted_family(3)
    plan = make_plan(relations)
    assert plan == make_plan(relations[::-1])
    assert plan.steps[0].kind == "start" and all(step.actual is None for step in plan.steps)
    lines = str(plan).splitlines()
    assert len(lines) == len(plan.steps) and lines[0].startswith("start    v = ")
    seen: list[Step] = []
    outcome = run_plan(plan, relations, report=seen.append)
    assert tuple(seen) == outcome.plan.steps and all(step.actual is not None for step in seen)
    assert "found" in str(outcome.plan)
    # the executed plan repeats itself exactly
    assert run_plan(outcome.plan, relations).plan == outcome.plan
    assert set(outcome.plan.names) <= set(plan.names)


def test_the_same_input_gives_the_same_bytes():
    _, relations = planted_family(5)
    first, second = sieve_classes(relations), sieve_classes(relations[::-1])
    assert first.plan == second.plan
    assert first.relation.codes.tobytes() == second.relation.codes.tobytes()


def test_predictions_are_of_the_right_size():
    """On random conditions without planted points the expected sizes are sums of many independent coins."""
    rng = random.Random(2)
    conditions = [random_condition(rng, f"c{k}", 2, moduli=(105, 99, 91), density=0.3, factors=1)
                  for k in range(6)]
    outcome = sieve_classes([relation_from_condition(c) for c in conditions], premiums=(0.4,))
    joins = [step for step in outcome.plan.steps if step.kind == "join"]
    assert joins
    for step in joins:
        if step.predicted > 100:
            assert 0.5 < step.actual / step.predicted < 2


def test_the_cap_holds_by_coarsening():
    planted, relations = planted_family(8, n=3, conditions=20, density=0.3)
    for cap in (30, 300, 3000):
        outcome = sieve_classes(relations, cap=cap)
        assert outcome.largest <= cap and all(outcome.relation.contains(x) for x in planted)
    a = relation_from_condition(make("a", [101], [[1], [0]], [[k] for k in range(60)]))
    b = relation_from_condition(make("b", [9, 101], [[0, 0], [1, 1]], [[k % 9, k] for k in range(80)]))
    small = fit(a, b, 600)
    assert small is not None and join(a, small).count <= 600 and small.index < b.index
    assert fit(a, b, 5) is None
    assert fit(a, b, 10**6) is b


def test_outlook_counts_common_quotients():
    a = relation_from_condition(make("a", [9, 5], [[1, 0], [0, 1]], [[1, 1], [2, 2]]))
    b = relation_from_condition(make("b", [27], [[1], [0]], [[1], [5]]))
    outlook = Outlook([a, b], a.by_prime)
    assert outlook.absorbed(0) and not outlook.absorbed(1)
    assert outlook.meets == [{3: 2, 5: 1}, {3: 2}]
    choice = choose(outlook, 2.0, {"a"}, 12, exact=a)
    assert choice is not None and choice.relation.name == "b"
    assert choice.size == join(a, choice.relation).count
    assert choose(outlook, 2.0, {"a", "b"}, 12) is None
    assert log_pass(0, 1.0) == float("-inf") and log_pass(5, 0.0) == 0.0 and log_pass(10**6, 1.0) == 0.0


@pytest.mark.parametrize("seed", range(8))
def test_lift_and_filter_finds_the_same_vectors(seed):
    rng = random.Random(seed)
    n = rng.randint(1, 3)
    moduli = (2, 3, 4, 6) if n > 1 else (2, 3, 4, 6, 8, 9, 12)
    conditions = [random_condition(rng, f"c{k}", n, moduli=moduli, density=0.6) for k in range(4)]
    relations = [relation_from_condition(c) for c in conditions]
    modulus = exponent(conditions)
    path = [q for q in (2, 3) for _ in range(4) if modulus % q**(_ + 1) == 0]
    found = lift_and_filter(relations, path)
    assert found.modulus == modulus
    assert {tuple(x) for x in found.vectors.tolist()} == survivors(conditions, n)
    assert lift_and_filter(relations, [modulus]).vectors.shape == found.vectors.shape


def test_lift_and_filter_limits():
    with pytest.raises(LimitReached):
        lift_and_filter([trivial(3)], [1000])
    with pytest.raises(LimitReached):
        lift_and_filter([relation_from_condition(make("a", [4], [[1]], [[0]]))], [2**16, 2**16], cap=10**9)


def test_coarsened_steps_are_replayed_as_recorded():
    planted, relations = planted_family(21, n=3, conditions=16, density=0.25)
    outcome = sieve_classes(relations, cap=500)
    by_name = {r.name: r for r in relations}
    replayed = run_plan(outcome.plan, relations)
    assert replayed.relation.codes.tobytes() == outcome.relation.codes.tobytes()
    coarse = [s for s in outcome.plan.steps if dict(s.exponents) != by_name[s.name].exponents]
    for step in coarse:
        assert coarsen(by_name[step.name], dict(step.exponents)).index < by_name[step.name].index
    assert all(outcome.relation.contains(x) for x in planted)
