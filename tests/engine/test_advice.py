"""Advice: what the listed primes remove is what was promised, and no other prime removes more."""

from __future__ import annotations

import random
from itertools import combinations

import pytest

from sieve.engine.advice import Offer, advise, estimate, known_classes
from sieve.engine.join import semijoin
from sieve.engine.relation import relation_from_condition
from tests.support.random_conditions import make, random_condition

MODULI = (2, 3, 4, 9, 5)


def offers(seed, count=8, planted=((1, 2),)):
    rng = random.Random(seed)
    out = []
    for k in range(count):
        c = random_condition(rng, f"v = {k + 3}", 2, moduli=MODULI, planted=planted, density=0.5)
        out.append(Offer(k + 3, relation_from_condition(c), tuple(c.moduli), 0.01))
    return out


def state(seed):
    rng = random.Random(1000 + seed)
    rows = {(1, 2), *((rng.randrange(36), rng.randrange(45)) for _ in range(150))}
    return relation_from_condition(make("w", [36, 45], [[1, 0], [0, 1]], sorted(rows)))


@pytest.mark.parametrize("seed", range(8))
def test_promises_are_kept_and_the_first_is_best(seed):
    start, on_offer = state(seed), offers(seed)
    found = advise([start], on_offer, 3, [(1, 2)])
    by_prime = {o.prime: o for o in on_offer}
    here = start
    for advice in found:
        expected = estimate(here, by_prime[advice.prime].relation, known_classes(here, [(1, 2)]))
        here = semijoin(here, by_prime[advice.prime].relation)
        assert advice.left == here.count and advice.estimated == expected
    alone = [semijoin(start, o.relation).count for o in on_offer]
    assert found[0].left == min(alone)
    best = start.count
    for chosen in combinations(on_offer, 3):
        state_now = start
        for offer in chosen:
            state_now = semijoin(state_now, offer.relation)
        best = min(best, state_now.count)
    # greedy choice of sets that cover: at least 1 - 1/e of the best (Nemhauser, Wolsey, Fisher 1978)
    assert start.count - here.count >= 0.63 * (start.count - best) - 1e-9
    assert known_classes(here, [(1, 2)]) == 1


def test_decided_candidates_are_named_and_idle_primes_left_out():
    z = relation_from_condition(make("p = 3", [9], [[1], [0]], [[0], [3], [4]], [["a"], ["b"], ["c"]]))
    idle = relation_from_condition(make("v = 5", [5], [[1], [0]], [[0]]))
    kills = relation_from_condition(make("v = 7", [9], [[1], [0]], [[0], [4]]))
    found = advise([z], [Offer(5, idle, (5,), 0.1), Offer(7, kills, (9,), 0.1)], 5)
    assert [a.prime for a in found] == [7] and found[0].labels == ("b",) and found[0].left == 2


def test_where_no_prime_removes_anything_joins_are_compared():
    line = relation_from_condition(make("w", [3], [[1], [0]], [[0], [1], [2]]))
    joined = relation_from_condition(make("v = 5", [3, 3], [[1, 0], [0, 1]], [[0, 0], [1, 1], [2, 0]]))
    found = advise([line], [Offer(5, joined, (3, 3), 0.1)], 5)
    assert [a.prime for a in found] == [5] and "join" in found[0].reason and found[0].left == 3
