"""Join, semijoin, coarsen, project against vectors checked one by one."""

from __future__ import annotations

import random
from itertools import permutations

import numpy as np
import pytest

from sieve.engine.codes import class_ids, combine, distinct_rows
from sieve.engine.join import (
    arc_consistent,
    common_index,
    join,
    match,
    project,
    semijoin,
    semijoin_mask,
)
from sieve.engine.outlook import shared_parts
from sieve.engine.relation import coarsen, relation_from_condition, trivial
from sieve.errors import LimitReached
from tests.support.random_conditions import (
    allows,
    box,
    exponent,
    labelled,
    make,
    random_condition,
    survivors,
)


def explicit(relation, n, modulus):
    """The vectors modulo a multiple of the exponent that lie in the relation."""
    return {x for x in box(n, modulus) if relation.contains(x)}


def values(relation, vector):
    """The codes of the class of a vector."""
    return tuple(c for part in relation.parts for c in part.values(vector))


def small_case(seed, conditions=3):
    rng = random.Random(seed)
    n = rng.randint(1, 2)
    moduli = (2, 3, 4, 6, 8, 9, 12) if n == 1 else (2, 3, 4, 6)
    return n, [random_condition(rng, f"c{k}", n, moduli=moduli) for k in range(conditions)]


@pytest.mark.parametrize("seed", range(40))
def test_a_relation_is_its_condition(seed):
    n, (condition, *_) = small_case(seed)
    relation = relation_from_condition(condition)
    modulus = exponent([condition])
    good = survivors([condition], n)
    assert explicit(relation, n, modulus) == good
    # a class of L/K has modulus^n / [L : K] members
    assert relation.count * modulus**n == len(good) * relation.index
    assert len(set(map(tuple, relation.codes.tolist()))) == relation.count


@pytest.mark.parametrize("seed", range(40))
def test_join_is_conjunction_in_any_order(seed):
    n, conditions = small_case(1000 + seed)
    relations = [relation_from_condition(c) for c in conditions]
    modulus = exponent(conditions)
    good = survivors(conditions, n)
    results = []
    for order in permutations(relations):
        whole = join(join(order[0], order[1]), order[2])
        assert explicit(whole, n, modulus) == good
        results.append((whole.count, whole.index, whole.sources))
    right = join(relations[0], join(relations[1], relations[2]))
    assert explicit(right, n, modulus) == good
    assert set(results) == {(right.count, right.index, ("c0", "c1", "c2"))}
    assert right.count * modulus**n == len(good) * right.index


@pytest.mark.parametrize("seed", range(30))
def test_semijoin_keeps_exactly_what_has_a_partner(seed):
    n, conditions = small_case(2000 + seed, 2)
    a, b = map(relation_from_condition, conditions)
    both = join(a, b)
    modulus = exponent(conditions)
    mask = semijoin_mask(a, b)
    kept = a.select(mask)
    assert match(a, b).size == both.count
    assert mask.tolist() == (match(a, b).partners > 0).tolist()
    # a class of L/(K1 cap K2) in the join lies over a kept class, and every kept class has one over it
    over = explicit(both, n, modulus)
    assert over <= explicit(kept, n, modulus) <= explicit(a, n, modulus)
    reached = {values(a, x) for x in over}
    assert reached == set(map(tuple, kept.codes.tolist()))


@pytest.mark.parametrize("seed", range(30))
def test_coarsen_is_sound_and_compatible(seed):
    n, conditions = small_case(3000 + seed, 2)
    a, b = map(relation_from_condition, conditions)
    modulus = exponent(conditions)
    for exponents in ({}, {2: 1}, {3: 1}, {2: 1, 3: 1}, {2: 2, 3: 9}, {5: 1}):
        small = coarsen(a, exponents)
        assert small.index <= a.index and a.index % small.index == 0
        assert explicit(a, n, modulus) <= explicit(small, n, modulus)
        for x in explicit(small, n, modulus):
            # the smallest set: the class of x contains an allowed vector up to l^e L
            assert small.contains(x)
        reached = {values(small, x) for x in explicit(a, n, modulus)}
        assert reached == set(map(tuple, small.codes.tolist()))
        finer = coarsen(join(a, b), exponents)
        coarser = join(small, coarsen(b, exponents))
        assert explicit(finer, n, modulus) <= explicit(coarser, n, modulus)


@pytest.mark.parametrize("seed", range(20))
def test_project_and_common_index(seed):
    n, conditions = small_case(4000 + seed, 2)
    a, b = map(relation_from_condition, conditions)
    small = project(a, b.by_prime)
    assert small.index == common_index(a, b) == common_index(b, a)
    # [L : K1 cap K2] [L : K1 + K2] = [L : K1] [L : K2]
    assert join(a, b).index * small.index == a.index * b.index
    modulus = exponent(conditions)
    reached = {values(small, x) for x in explicit(a, n, modulus)}
    assert reached == set(map(tuple, small.codes.tolist()))


@pytest.mark.parametrize("seed", range(25))
def test_arc_consistency_and_shared_parts_lose_nothing(seed):
    n, conditions = small_case(5000 + seed)
    relations = [relation_from_condition(c) for c in conditions]
    whole = join(join(*relations[:2]), relations[2])
    tight = arc_consistent(relations)
    again = join(join(*tight[:2]), tight[2])
    assert again.count == whole.count if all(r.count for r in tight) else whole.count == 0
    for before, after in zip(relations, tight, strict=True):
        assert after.count <= before.count
    modulus = exponent(conditions)
    seen = shared_parts(relations)
    for k, relation in enumerate(relations):
        others = [r for i, r in enumerate(relations) if i != k]
        rest = join(*others)
        # emptiness, and the classes of each relation that survive, are decided by the visible parts
        assert (join(rest, seen[k]).count == 0) == (whole.count == 0)
        survivors_there = join(rest, seen[k])
        assert {x for x in explicit(survivors_there, n, modulus) if relation.contains(x)} == explicit(
            whole, n, modulus)


@pytest.mark.parametrize("seed", range(20))
def test_labels_follow_their_classes(seed):
    rng = random.Random(6000 + seed)
    n = rng.randint(1, 2)
    a = labelled(rng, random_condition(rng, "a", n, moduli=(2, 3, 4, 6)), 6)
    b = random_condition(rng, "b", n, moduli=(2, 3, 4, 6))
    relation, other = relation_from_condition(a), relation_from_condition(b)
    expected: dict[str, set] = {}
    for x in box(n, exponent([a, b])):
        for row, ids in zip(a.allowed.tolist(), a.labels, strict=True):
            if allows(make("row", a.moduli, a.images, [row]), x):
                for label in ids:
                    expected.setdefault(label, set()).add(x)
    assert relation.labels == tuple(sorted(expected))
    assert set(relation.outside) == {label for ids in a.labels for label in ids} - set(expected)
    good = {label: {x for x in xs if allows(b, x)} for label, xs in expected.items()}
    for whole in (join(relation, other), join(other, relation)):
        assert whole.labels == tuple(sorted(label for label, xs in good.items() if xs))
        for label in whole.labels:
            assert explicit(whole.with_labels([label]), n, exponent([a, b])) == good[label]
    assert semijoin(relation, other).labels == join(relation, other).labels
    coarse = coarsen(relation, {2: 1, 3: 1})
    assert coarse.labels == relation.labels
    assert coarse.unlabelled().labels == ()


def test_classes_outside_the_image_are_dropped_and_named():
    # L = Z -> Z/4 x Z/2 by 1 -> (2, 1): the image has two elements
    condition = make("p", [4, 2], [[2, 1]], [[0, 0], [2, 1], [1, 0], [2, 0]],
                     [["a"], ["b"], ["c"], ["d", "a"]])
    relation = relation_from_condition(condition)
    assert relation.index == 2 and relation.count == 2
    assert relation.outside == ("c", "d") and relation.outside_count == 2
    assert relation.labels == ("a", "b")


def test_restricting_primes_and_exponents():
    condition = make("v", [72], [[1]], [[5]])
    assert relation_from_condition(condition, primes=[3]).index == 9
    assert relation_from_condition(condition, primes=[2, 3], max_exponents={2: 1}).index == 18
    assert relation_from_condition(condition, primes=[5]).parts == ()
    assert relation_from_condition(condition, primes=[5]).count == 1
    # the syzygy at 2 is not used when only 3 may be
    outside = make("v", [6], [[2]], [[1]])
    assert relation_from_condition(outside).count == 0
    assert relation_from_condition(outside, primes=[3]).count == 1


def test_prime_powers_beyond_the_code_limit_are_coarsened():
    condition = make("p", [3**39], [[1], [3]], [[3**38 + 5]])
    relation = relation_from_condition(condition)
    assert relation.index == 3**19 and relation.count == 1
    assert relation.contains((3**38 + 5, 0)) and not relation.contains((3**38 + 6, 0))
    huge = make("v", [2**61 - 1], [[1]], [[7]])
    assert relation_from_condition(huge).parts == ()


def test_empty_sets_and_empty_shapes():
    nothing = relation_from_condition(make("v", [6], [[1]], []))
    everything = trivial(1)
    assert nothing.count == 0 and nothing.codes.shape == (0, 2)
    assert join(nothing, everything).count == 0 and join(everything, nothing).count == 0
    assert semijoin(everything, nothing).count == 0
    assert coarsen(nothing, {}).count == 0 and coarsen(nothing, {}).codes.shape == (0, 0)
    assert join(everything, everything).count == 1 and everything.index == 1
    # no constraint in common: an empty relation still excludes everything
    other = relation_from_condition(make("w", [5], [[1]], [[1], [2]]))
    assert semijoin(other, nothing).count == 0
    group = relation_from_condition(make("x", [], [[], []], [[]]))
    assert group.count == 1 and group.n == 2


def test_quotients_far_beyond_machine_integers():
    rng = random.Random(5)
    planted = tuple(rng.randint(-10**9, 10**9) for _ in range(3))
    state, index = trivial(3), 1
    primes = [7, 11, 13, 17, 19, 23, 29, 31, 37, 41, 43, 47, 53, 59, 61, 67]
    for p in primes:
        images = [[int(i == j) for j in range(3)] for i in range(3)]
        target = [x % p**2 for x in planted]
        noise = [[rng.randrange(p**2) for _ in range(3)]] if p == 7 else []
        state = join(state, relation_from_condition(make(f"v = {p}", [p**2] * 3, images, [target, *noise])))
        index *= p**6
    assert state.index == index > 10**100
    assert state.contains(planted) and state.count == 2
    # one more condition that shares all of it decides between the two
    value = (planted[0] + 2 * planted[1] + 3 * planted[2]) % 49
    last = make("w", [49], [[1], [2], [3]], [[value]])
    assert join(state, relation_from_condition(last)).count == 1
    assert semijoin(state, relation_from_condition(last)).contains(planted)


def test_common_quotients_beyond_machine_integers():
    """Keys of 21 columns at moduli near 2^31: far more than one machine word."""
    q = 2**31 - 1
    identity = [[int(i == j) for j in range(7)] for i in range(7)]
    rng = random.Random(9)
    rows = [[rng.randrange(q) for _ in range(7)] for _ in range(50)]
    a = relation_from_condition(make("a", [q] * 7, identity, rows))
    b = relation_from_condition(make("b", [q] * 7, identity, rows[::2] + [[1] * 7]))
    assert common_index(a, b) == q**7
    assert join(a, b).count == 25 == int(semijoin_mask(a, b).sum())
    assert all(join(a, b).contains(row) for row in rows[::2])


def test_cap_is_checked_before_anything_is_built():
    a = relation_from_condition(make("a", [1000003], [[1], [0]], [[k] for k in range(2000)]))
    b = relation_from_condition(make("b", [1000033], [[0], [1]], [[k] for k in range(2000)]))
    with pytest.raises(LimitReached) as caught:
        join(a, b, cap=10**6)
    assert caught.value.partial == 4 * 10**6


def test_code_helpers():
    codes = np.array([[5, 1], [5, 1], [0, 2**31 - 2]], dtype=np.int64)
    rows, where = distinct_rows(codes, [7, 2**31 - 1])
    assert rows.tolist() == [[0, 2**31 - 2], [5, 1]] and where.tolist() == [1, 1, 0]
    q = 2**31 - 1
    exact = [(x * (q - 1) + y * (q - 2)) % q for x, y in codes.tolist()]
    assert combine(codes, [[q - 1, q - 2]], q, [1])[:, 0].tolist() == exact
    ids = class_ids([codes, codes[:1]], [7, 2**31 - 1])
    assert ids[0][0] == ids[0][1] == ids[1][0] != ids[0][2]
    assert class_ids([codes[:, :0]], [])[0].tolist() == [0, 0, 0]
