"""Ladders from L to M L: subgroups, expected sizes, the order of the steps."""

from __future__ import annotations

import random
from itertools import pairwise
from math import exp, log, prod

import numpy as np
import pytest

from sieve.engine.relation import relation_from_condition
from sieve.engine.staged import Forecast, expected_log_size, log_density, plan_ladder, thrown
from tests.support.random_conditions import box, random_condition

MODULI = (2, 4, 3, 9, 6, 12, 36, 5)
TOPS = {2: 2, 3: 1, 5: 1}


def family(seed, n=3, count=9, density=0.55):
    rng = random.Random(seed)
    conditions = [random_condition(rng, f"v = {k}", n, moduli=MODULI, density=density, factors=3)
                  for k in range(count)]
    return [relation_from_condition(c) for c in conditions]


def modulus_after(ladder):
    return prod({(x.prime, x.level): x.prime for x in ladder}.values())


def inside(ladder, vector):
    """Whether a vector is in the subgroup after these lifts, one character after the other."""
    for lift in ladder:
        value = sum(c * x for c, x in zip(lift.character, vector, strict=True))
        assert value % lift.prime**lift.level == 0
        if value // lift.prime**lift.level % lift.prime:
            return False
    return True


def test_expected_sizes_start_at_one_class_and_never_fall_below_the_known_ones():
    relations = family(1)
    assert expected_log_size(relations, {}) == 0
    assert expected_log_size(relations, {2: 2, 3: 2, 5: 1}, known=10**6) == log(10**6)
    assert expected_log_size(relations, {2: 1}) <= 3 * log(2) + 1e-9


@pytest.mark.parametrize("seed", range(2))
def test_every_step_is_a_subgroup_of_its_index_and_sizes_follow_from_the_images(seed):
    relations = family(seed)
    ladder = plan_ladder(relations, TOPS, 3 * log(60), rest=0)
    modulus = modulus_after(ladder)
    assert modulus == 60 and len(ladder) == 12
    usable = [r for r in relations if 0 < r.count < r.index]
    for steps in (5, 9, 12):
        below = [x for x in box(3, modulus) if inside(ladder[:steps], x)]
        assert modulus**3 == len(below) * round(exp(ladder[steps - 1].log_index))
        size = ladder[steps - 1].log_index
        for relation in usable:
            # the image of the subgroup in the group, listed; it contains 60 L
            rows = np.array([row for part in relation.parts for row in part.rows])
            some = np.array(below) @ rows.T
            shifts = 60 * np.array(list(box(3, 3))) @ rows.T
            image = np.unique((some[:, None] + shifts[None]).reshape(-1, len(rows)) % relation.moduli, axis=0)
            size += float(log_density(thrown(relation) / np.array(relation.index / len(image))))
        assert size == pytest.approx(ladder[steps - 1].log_size, abs=1e-6)
    whole = expected_log_size(usable, {2: 2, 3: 1, 5: 1})
    assert whole == pytest.approx(max(ladder[-1].log_size, 0), abs=1e-6)


@pytest.mark.parametrize("seed", range(4))
def test_stages_end_where_the_subgroup_is_a_multiple_of_l(seed):
    ladder = plan_ladder(family(seed), TOPS, 3 * log(60), rest=0)
    reached = []
    for number, lift in enumerate(ladder, start=1):
        if lift.last:
            modulus = modulus_after(ladder[:number])
            assert round(exp(lift.log_index)) == modulus**3
            reached.append(modulus)
            assert all(inside(ladder[:number], [modulus * (i == j) for i in range(3)]) for j in range(3))
    assert reached[-1] == 60 and all(b % a == 0 for a, b in pairwise(reached))


@pytest.mark.parametrize("seed", range(4))
def test_the_order_of_stages_is_the_cheapest_of_all(seed):
    relations = family(seed)
    ladder = plan_ladder(relations, TOPS, 3 * log(60), rest=0)
    forecast = Forecast(relations, TOPS)

    def total(order):
        node, exponents = forecast.start(), {}
        for ell in order:
            node = forecast.stage(node, (ell,), exponents)
            exponents[ell] = exponents.get(ell, 0) + 1
        return sum(exp(lift.log_size) for lift in node.lifts)

    best = sum(exp(lift.log_size) for lift in ladder)
    orders = {(2, 2, 3, 5), (5, 3, 2, 2), (2, 3, 2, 5), (3, 5, 2, 2), (2, 5, 3, 2), (3, 2, 2, 5)}
    assert all(best <= total(order) * (1 + 1e-9) for order in orders)


def test_aims_and_limits():
    relations = family(2)
    assert plan_ladder(relations, TOPS, 0.0) == ()
    short = plan_ladder(relations, TOPS, 3 * log(2), rest=10**9)
    assert short[-1].last and short[-1].log_index >= 3 * log(2) - 1e-9 and len(short) == 3
    # an index out of reach: as far as the exponents go
    assert plan_ladder(relations, {2: 1, 3: 1}, 1e9)[-1].log_index == pytest.approx(3 * log(6))
    with pytest.raises(ValueError, match="up to 61"):
        plan_ladder(relations, {67: 1}, 1.0)
    assert plan_ladder(relations, TOPS, 3 * log(60)) == plan_ladder(relations, TOPS, 3 * log(60))


def test_names_are_those_of_conditions_that_see_the_step():
    relations = family(3)
    by_name = {r.name: r for r in relations}
    for lift in plan_ladder(relations, TOPS, 3 * log(60), rest=0):
        assert len(set(lift.names)) == len(lift.names)
        for name in lift.names:
            part = by_name[name].by_prime[lift.prime]
            assert max(part.exponents) > lift.level
