"""Fates of candidates against vectors checked one by one, and against planted rational points."""

from __future__ import annotations

import random

import pytest

from sieve.engine.fates import decide, replay, visible_view
from sieve.engine.join import join
from sieve.engine.plan import informative
from sieve.engine.relation import coarsen, relation_from_condition
from sieve.errors import Inconsistent, InternalError
from tests.support.random_conditions import (
    allows,
    box,
    exponent,
    image,
    labelled,
    make,
    random_condition,
    survivors,
)


def possible_labels(candidate, auxiliary, n):
    """The labels with a vector that every condition allows, by brute force."""
    modulus = exponent([candidate, *auxiliary])
    rows = {tuple(row): ids for row, ids in zip(candidate.allowed.tolist(), candidate.labels, strict=True)}
    good = set()
    for x in box(n, modulus):
        ids = rows.get(image(candidate, x))
        if ids is not None and not good.issuperset(ids) and all(allows(c, x) for c in auxiliary):
            good.update(ids)
    return good


def check_witness(fate, candidate, by_name):
    """An elimination must be repeated by joining whole, uncoarsened conditions in any order."""
    state = relation_from_condition(candidate).with_labels([fate.label])
    for name in reversed(fate.conditions):
        state = join(state, by_name[name])
    assert state.count == 0
    if fate.kind == "image":
        assert fate.conditions == ()
    if fate.kind == "single":
        assert len(fate.conditions) == 1
    if fate.kind == "several":
        assert len(fate.conditions) > 1
        for use in fate.uses:
            assert dict(use.exponents) == coarsen(by_name[use.name], dict(use.exponents)).exponents


@pytest.mark.parametrize("seed", range(60))
def test_decisions_are_exactly_right_on_small_groups(seed):
    rng = random.Random(seed)
    n = rng.randint(1, 2)
    moduli = (2, 3, 4, 6, 8, 9, 12) if n == 1 else (2, 3, 4, 6)
    candidate = labelled(rng, random_condition(rng, "p", n, moduli=moduli), 5)
    auxiliary = [random_condition(rng, f"v{k}", n, moduli=moduli, density=rng.choice([0.3, 0.6]))
                 for k in range(4)]
    relations = [relation_from_condition(c) for c in auxiliary]
    by_name = {r.name: r for r in relations}
    alone = bool(survivors(auxiliary, n)) if auxiliary else True
    good = possible_labels(candidate, auxiliary, n)
    fates = decide([relation_from_condition(candidate)], relations)
    assert [f.label for f in fates] == sorted({label for ids in candidate.labels for label in ids})
    for fate in fates:
        assert fate.condition == "p"
        if fate.eliminated:
            assert fate.label not in good
            check_witness(fate, candidate, by_name)
        elif alone:
            # conditions that contradict one another away from the candidate are not looked for here
            assert fate.exhausted and fate.label in good
    assert fates == decide([relation_from_condition(candidate)], relations[::-1])


@pytest.mark.parametrize("seed", range(15))
def test_planted_points_survive_and_can_be_told_to_be_rational(seed):
    rng = random.Random(500 + seed)
    n = rng.randint(1, 4)
    planted = [tuple(rng.randint(-20, 20) for _ in range(n)) for _ in range(3)]
    moduli = (4, 9, 5, 7, 25, 12, 35, 60, 63, 99)
    auxiliary = [random_condition(rng, f"v{k}", n, moduli=moduli, planted=planted, density=0.15, factors=2)
                 for k in range(12)]
    p = rng.choice([2, 3, 5, 7])
    bare = make("p", [p**3] * n, [[int(i == j) for j in range(n)] for i in range(n)], [])
    classes: dict[tuple[int, ...], list[str]] = {}
    for k, x in enumerate(planted):
        classes.setdefault(image(bare, x), []).append(f"k{k}")
    for k in range(20):
        classes.setdefault(tuple(rng.randrange(p**3) for _ in range(n)), []).append(f"z{k}")
    rows = sorted(classes)
    candidate = make("p", bare.moduli, bare.images, rows, [classes[row] for row in rows])
    relation = relation_from_condition(candidate)
    relations = [relation_from_condition(c) for c in auxiliary]
    by_name = {r.name: r for r in relations}
    known = [("p", f"k{k}") for k in range(len(planted))]
    for rational in ([], known):
        fates = {f.label: f for f in decide([relation], relations, rational)}
        assert set(fates) == {f"z{k}" for k in range(20)} | ({"k0", "k1", "k2"} - {b for _, b in rational})
        for label, fate in fates.items():
            if fate.eliminated:
                assert label.startswith("z")
                check_witness(fate, candidate, by_name)
            if fate.kind == "shared":
                assert rational and fate.same_as and set(fate.same_as) <= {"k0", "k1", "k2"}


def test_shared_means_no_condition_can_ever_tell_them_apart():
    # the conditions see the candidates modulo 5 only; z and k agree modulo 5, y does not
    candidate = make("p", [25], [[1]], [[3], [8], [4]], [["k"], ["z"], ["y"]])
    auxiliary = [make("v", [5, 7], [[1, 1]], [[3, 3], [1, 2]])]
    relation = relation_from_condition(candidate)
    relations = [relation_from_condition(c) for c in auxiliary]
    assert visible_view(relation, relations).index == 5
    y, z = decide([relation], relations, [("p", "k")])
    assert (y.kind, y.conditions) == ("single", ("v",))
    assert (z.kind, z.same_as, z.exponents, z.index) == ("shared", ("k",), ((5, 1),), 5)
    assert y.reason == "excluded by v"
    assert z.reason == "in one class with k as far as the conditions see (exponent 5, quotient of order 5)"


def test_conditions_that_meet_each_other_where_the_candidates_do_not_look():
    # v and w share 9 and each shares 7 with the candidates: modulo 7 alone all is allowed
    candidate = make("p", [49], [[1]], [[1], [2]], [["a"], ["b"]])
    v = make("v", [7, 9], [[1, 1]], [[1, 4], [2, 4]] + [[c, 0] for c in (0, 3, 4, 5, 6)])
    w = make("w", [7, 9], [[1, 1]], [[1, 5], [2, 4]] + [[c, 0] for c in (0, 3, 4, 5, 6)])
    relations = [relation_from_condition(c) for c in (v, w)]
    a, b = decide([relation_from_condition(candidate)], relations)
    assert a.kind == "several" and set(a.conditions) == {"v", "w"}
    assert b.kind == "open" and b.exhausted and b.classes == 1
    assert a.reason in ("excluded by v, w together", "excluded by w, v together")
    assert b.reason.startswith("all conditions that bear on it allow 1 classes in a quotient of order 63")


def test_conditions_that_meet_the_candidates_only_together():
    # characters x | y | x + y modulo 2: pairwise independent, together dependent
    candidate = make("p", [2], [[1], [0]], [[1]], [["a"]])
    v = make("v", [2], [[0], [1]], [[0]])
    w = make("w", [2], [[1], [1]], [[0]])
    relations = [relation_from_condition(c) for c in (v, w)]
    (fate,) = decide([relation_from_condition(candidate)], relations)
    assert fate.kind == "several" and set(fate.conditions) == {"v", "w"}


def test_a_complete_list_is_a_condition_for_the_other_prime():
    first = make("p = 3", [9], [[1]], [[1], [2]], [["a"], ["b"]])
    second = make("p = 5", [25, 9], [[1, 1]], [[4, 1]], [["c"]])
    relations = [relation_from_condition(c) for c in (first, second)]
    a, b, c = decide(relations, [])
    assert (a.kind, b.kind, b.conditions, c.kind) == ("open", "single", ("p = 5",), "open")
    partial = relation_from_condition(make("p = 5", [25, 9], [[1, 1]], [[4, 1]], [["c"]], complete=False))
    a, b, c = decide([relations[0], partial], [])
    assert (a.kind, b.kind) == ("unseen", "unseen") and c.kind == "open"


def test_labels_outside_the_image():
    candidate = make("p", [4], [[2]], [[2], [1]], [["a"], ["b"]])
    relation = relation_from_condition(candidate)
    a, b = decide([relation], [])
    assert a.kind == "unseen" and (b.kind, b.conditions) == ("image", ())
    assert b.reason == "none of its classes lies in the image of the group"
    assert a.reason == "no condition sees any part of its group"
    with pytest.raises(Inconsistent) as caught:
        decide([relation], [], [("p", "b")])
    assert caught.value.witness == "b"


def test_a_rational_candidate_that_is_excluded_is_an_error():
    candidate = make("p", [9], [[1]], [[1], [2]], [["k"], ["z"]])
    v = relation_from_condition(make("v = 7", [3], [[1]], [[2]]))
    with pytest.raises(Inconsistent) as caught:
        decide([relation_from_condition(candidate)], [v], [("p", "k")])
    assert caught.value.witness == "k" and "v = 7" in str(caught.value)
    # the same when it takes two conditions
    v = relation_from_condition(make("v", [9, 7], [[1, 1]], [[1, 3], [2, 5]]))
    w = relation_from_condition(make("w", [9, 7], [[1, 1]], [[1, 4], [2, 6]]))
    with pytest.raises(Inconsistent) as caught:
        decide([relation_from_condition(candidate)], [v, w], [("p", "k")])
    assert caught.value.witness == "k"


def test_an_empty_condition_excludes_everything():
    candidate = relation_from_condition(make("p", [9], [[1]], [[1], [2]], [["a"], ["b"]]))
    nothing = relation_from_condition(make("v", [], [[]], []))
    fates = decide([candidate], [nothing])
    assert [(f.kind, f.conditions) for f in fates] == [("single", ("v",))] * 2
    with pytest.raises(Inconsistent):
        decide([candidate], [nothing], [("p", "a")])


def test_names_must_be_distinct():
    relation = relation_from_condition(make("p", [9], [[1]], [[1]], [["a"]]))
    with pytest.raises(InternalError):
        decide([relation, relation], [])


def test_a_limit_is_reported_as_a_limit():
    rng = random.Random(4)
    conditions = [random_condition(rng, f"v{k}", 2, moduli=(35, 77, 91, 63), density=0.5) for k in range(8)]
    candidate = labelled(rng, random_condition(rng, "p", 2, moduli=(7,), density=0.05, factors=1), 3)
    relations = [relation_from_condition(c) for c in conditions]
    fates = decide([relation_from_condition(candidate)], relations, cap=10)
    left = [f for f in fates if f.kind == "open" and not f.exhausted]
    assert left and all(f.reason.startswith("a limit was reached with ") for f in left)


def test_no_candidates_and_no_conditions():
    assert decide([], []) == []
    empty = relation_from_condition(make("p", [9], [[1]], [], []))
    assert decide([empty], []) == []
    candidate = relation_from_condition(make("p", [9], [[1]], [[1]], [["a"]]))
    (fate,) = decide([candidate], [])
    assert fate.kind == "unseen" and not fate.eliminated


def test_candidates_with_many_classes_die_only_when_all_their_classes_do():
    # the label covers a residue disc: every class modulo 9 that is 1 modulo 3
    candidate = make("p", [9], [[1]], [[1], [4], [7]], [["a"]] * 3)
    v = make("v", [9], [[1]], [[4], [2]])
    (fate,) = decide([relation_from_condition(candidate)], [relation_from_condition(v)])
    assert fate.kind == "open"
    w = make("w", [9, 5], [[1, 1]], [[1, 2], [7, 2], [5, 0]])
    relations = [relation_from_condition(c) for c in (v, w)]
    (fate,) = decide([relation_from_condition(candidate)], relations)
    assert fate.kind == "several" and set(fate.conditions) == {"v", "w"}


def test_the_uses_replay_and_respect_the_cap():
    rng = random.Random(11)
    conditions = [random_condition(rng, f"v{k}", 2, moduli=(35, 45, 63, 99), density=0.15) for k in range(8)]
    auxiliary = [relation_from_condition(c) for c in conditions]
    candidate = labelled(rng, random_condition(rng, "p", 2, moduli=(49, 25), density=0.02, factors=1), 12)
    relation = relation_from_condition(candidate)
    by_name = {r.name: r for r in auxiliary}
    fates = decide([relation], auxiliary)
    assert any(f.kind == "several" for f in fates)
    for fate in fates:
        if fate.eliminated and fate.kind != "image":
            start = visible_view(relation, informative(auxiliary)).with_labels([fate.label])
            end = replay(start, fate.uses, by_name, 10**6)
            assert end is not None and end.count == 0
            assert replay(relation.with_labels([fate.label]), fate.uses, by_name, 10**6).count == 0
            # no use can be left out without letting a class through, within the limit
            for k in range(len(fate.uses)):
                rest = replay(start, fate.uses[:k] + fate.uses[k + 1:], by_name, 1000)
                assert rest is None or rest.count > 0
    tight = decide([relation], auxiliary, cap=1)
    assert {f.label for f in tight if f.eliminated} <= {f.label for f in fates if f.eliminated}
