"""Sieving on from classes: the same as one longer ladder, and no allowed class is lost."""

from __future__ import annotations

import random
from math import log

import pytest

from sieve.engine.depth_first import climb
from sieve.engine.higher import above, climb_further, representatives
from sieve.engine.join import join
from sieve.engine.relation import coarsen, relation_from_condition
from sieve.engine.staged import plan_ladder
from tests.support.random_conditions import box, random_condition

MODULI = (2, 4, 3, 9, 6, 12, 36, 5)


def conditions(seed, n=2, count=8, density=0.6):
    rng = random.Random(seed)
    planted = [tuple(rng.randrange(180) for _ in range(n)) for _ in range(2)]
    made = [random_condition(rng, f"v = {k}", n, moduli=MODULI, planted=planted, density=density, factors=3)
            for k in range(count)]
    return planted, [relation_from_condition(c) for c in made]


@pytest.mark.parametrize("seed", range(5))
def test_a_condition_above_a_class_is_the_condition_on_its_lifts(seed):
    _, relations = conditions(seed)
    rng = random.Random(seed)
    for relation in relations:
        for modulus in (1, 2, 6, 12, 45):
            x = [rng.randrange(-50, 50) for _ in range(2)]
            higher = above(relation, modulus, x)
            for y in box(2, 7):
                lift = [a + modulus * b for a, b in zip(x, y, strict=True)]
                assert higher.contains(y) == relation.contains(lift)


@pytest.mark.parametrize("seed", range(5))
def test_two_ladders_do_what_one_does(seed):
    planted, relations = conditions(seed)
    low = {2: 1, 3: 1}
    whole = climb(relations, plan_ladder(relations, {2: 2, 3: 2, 5: 1}, 2 * log(180), rest=0), known=planted)
    start = climb(relations, plan_ladder(relations, low, 2 * log(6), rest=0), known=planted)
    assert representatives(start.relation)[0] == 6
    found, ladder = climb_further(relations, start.relation, {2: 1, 3: 1, 5: 1}, 2 * log(30), known=planted,
                                  rest=0)
    assert found.index == 180**2 and len(ladder) == 6
    assert found.codes.tolist() == whole.relation.codes.tolist()
    assert all(map(found.contains, planted))


def test_representatives_are_the_classes():
    _, relations = conditions(3)
    start = climb(relations, plan_ladder(relations, {2: 1, 3: 1}, 2 * log(6), rest=0)).relation
    modulus, vectors = representatives(start)
    assert sorted(vectors) == [x for x in box(2, modulus) if start.contains(x)]
    mixed = join(coarsen(relations[0], {2: 1}), coarsen(relations[1], {3: 1}))
    with pytest.raises(ValueError, match="residues"):
        representatives(mixed)
