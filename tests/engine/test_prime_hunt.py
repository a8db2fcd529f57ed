"""The hunt for primes: depth, ranking, decisions that the conditions bear out, known points kept."""

from __future__ import annotations

import random

import pytest

from sieve.engine.fates import replay
from sieve.engine.join import join
from sieve.engine.prime_hunt import Hunt, depth, ranked
from sieve.engine.relation import coarsen, relation_from_condition
from sieve.errors import Inconsistent
from tests.support.random_conditions import box, exponent, image, labelled, make, random_condition


def candidates_mod(q, rows, base=2):
    """Labelled classes of Z^2 modulo q."""
    return relation_from_condition(make(f"p = {base}", [q, q], [[1, 0], [0, 1]], rows,
                                        [[f"z{k}"] for k in range(len(rows))]))


def test_depth_counts_the_digits_shared_with_a_known_point():
    z = candidates_mod(343, [[1, 2], [8, 2], [50, 2], [3, 4], [1, 345 % 343]], 7)
    known = [(1, 2), (100, 100)]
    got = {label: depth(z, label, 7, known, []) for label in z.labels}
    # rows are sorted by the relation's labels as given: z0 is the point itself
    assert got == {"z0": 3, "z1": 1, "z2": 2, "z3": 0, "z4": 3}


def test_depth_looks_at_what_the_pool_sees_elsewhere():
    z = relation_from_condition(make("p = 3", [9, 5], [[1, 0], [0, 1]], [[1, 2]], [["a"]]))
    known = [(1, 3)]
    assert depth(z, "a", 3, known, []) == 2
    five = relation_from_condition(make("v = 11", [5], [[0], [1]], [[2], [3]]))
    assert depth(z, "a", 3, known, [five]) == 0


def test_hopeless_labels_take_no_part():
    z = candidates_mod(9, [[1, 2], [4, 2]], 3)
    hunt = Hunt(z, ["z0", "z1"], 3, [], [(1, 2)])
    assert hunt.hopeless == ["z0"] and hunt.open == ["z1"] and hunt.powers == {"z0": 3, "z1": 2}


def test_a_condition_with_the_power_decides_and_one_without_does_not():
    z = candidates_mod(9, [[4, 2]], 3)
    pool = [relation_from_condition(make("v = 7", [5, 5], [[1, 0], [0, 1]], [[1, 2]]))]
    hunt = Hunt(z, ["z0"], 3, pool, [(1, 2)])
    weak = relation_from_condition(make("v = 13", [3, 5], [[1, 0], [0, 1]], [[1, 2]]))
    assert hunt.add(weak) == [] and hunt.open == ["z0"]
    strong = relation_from_condition(make("v = 17", [9, 5], [[1, 0], [0, 1]], [[1, 2], [4, 3]]))
    assert hunt.add(strong) == ["z0"] and hunt.open == []
    fate = hunt.fates["z0"]
    assert fate.eliminated and fate.conditions[-1] == "v = 17" and "v = 7" in fate.conditions
    end = replay(z, fate.uses, hunt.by_name, 10**6)
    assert end is not None and end.count == 0


def test_a_condition_that_excludes_a_known_point_is_an_error():
    hunt = Hunt(candidates_mod(9, [[4, 2]], 3), ["z0"], 3, [], [(1, 2)])
    with pytest.raises(Inconsistent, match="v = 5"):
        hunt.add(relation_from_condition(make("v = 5", [9], [[1], [0]], [[2]])))


def test_orders_without_the_power_are_not_ranked_and_better_ones_come_first():
    z = candidates_mod(9, [[4, 2]], 3)
    pool = [relation_from_condition(make("v = 7", [35, 11], [[1, 0], [0, 1]], [[1, 2], [3, 4], [8, 8]]))]
    hunt = Hunt(z, ["z0"], 3, pool, [(1, 2)])
    found = ranked([hunt], {101: (90, [3 * 10007]), 103: (90, [9 * 1009]), 107: (90, [9 * 7 * 5 * 11]),
                            109: (90, [9 * 7 * 5 * 11, 10007])})
    assert [p.prime for p in found] == [107, 109] and found[0].gain > found[1].gain > 0


@pytest.mark.parametrize("seed", range(10))
def test_decisions_agree_with_enumeration(seed):
    rng = random.Random(seed)
    planted = [(rng.randrange(12), rng.randrange(12))]
    conditions = [random_condition(rng, f"v = {k}", 2, moduli=(2, 3, 4, 6), density=0.4, planted=planted)
                  for k in range(7)]
    lists = labelled(rng, random_condition(rng, "p = 2", 2, moduli=(4, 8), density=0.8), 5)
    if not lists.count:
        pytest.skip("no classes")
    z = relation_from_condition(lists)
    relations = [relation_from_condition(c) for c in conditions]
    size = exponent([*conditions, lists])
    good = [x for x in box(2, size) if all(list(image(c, x)) in c.allowed.tolist() for c in conditions)]
    classes = {tuple(int(v) for v in row): ids for row, ids in zip(lists.allowed, lists.labels, strict=True)}
    alive = {label for x in good for label in classes.get(image(lists, x), ())}
    hunt = Hunt(z, z.labels, 2, relations[:3])
    for relation in relations[3:]:
        hunt.add(relation)
    hunt.combine()
    assert not alive & set(hunt.fates)
    for label, fate in hunt.fates.items():
        state = z.with_labels([label])
        for use in fate.uses:
            source = next(r for r in relations if r.name == use.name)
            state = join(state, coarsen(source, dict(use.exponents)))
        assert state.count == 0
