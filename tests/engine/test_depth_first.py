"""The run up a ladder: the same classes whatever the batches, tables and halving; nothing allowed is lost."""

from __future__ import annotations

import random
from dataclasses import replace
from functools import reduce
from math import log

import numpy as np
import pytest

import sieve.engine.depth_first as depth_first
import sieve.engine.lift_tables as lift_tables
from sieve.engine.depth_first import climb, is_symmetric
from sieve.engine.join import join
from sieve.engine.relation import coarsen, relation_from_condition
from sieve.engine.staged import plan_ladder
from sieve.errors import Inconsistent, LimitReached
from tests.support.random_conditions import allows, box, random_condition

MODULI = (2, 4, 3, 9, 6, 12, 36, 5)
TOPS = {2: 2, 3: 1, 5: 1}


def conditions(seed, n=3, count=9, density=0.5, symmetric=False):
    rng = random.Random(seed)
    planted = [tuple(rng.randrange(60) for _ in range(n)) for _ in range(2)]
    made = [random_condition(rng, f"v = {k}", n, moduli=MODULI, planted=planted, density=density, factors=3)
            for k in range(count)]
    if symmetric:
        made = [replace(c, allowed=np.unique(np.concatenate(
            [c.allowed, -c.allowed % np.array(c.moduli, dtype=np.int64)]), axis=0)) for c in made]
        planted += [tuple(-x for x in vector) for vector in planted]
    return planted, made


def ladder_for(relations, n=3):
    return plan_ladder(relations, TOPS, n * log(60), rest=0)


def allowed_modulo(made, modulus, n):
    """Residues modulo M that each condition allows for some lift, one by one."""
    small = [relation_from_condition(c) for c in made]
    return {x for x in box(n, modulus) if all(coarsen(r, TOPS).contains(x) for r in small)}


def residues(relation, modulus, n):
    """The classes of a relation as residues, by trying all."""
    return {x for x in box(n, modulus) if relation.contains(x)}


@pytest.mark.parametrize("seed", range(6))
def test_exactly_the_classes_that_all_conditions_allow(seed):
    planted, made = conditions(seed, n=2, density=0.7)
    relations = [relation_from_condition(c) for c in made]
    result = climb(relations, ladder_for(relations, 2), known=planted)
    assert result.relation.index == 60**2
    assert residues(result.relation, 60, 2) == allowed_modulo(made, 60, 2)
    assert len(result.sizes) == 8 and result.sizes[0] == 1
    # with all digits of the conditions nothing more may be allowed
    assert all(result.relation.contains(x) for x in box(2, 60) if all(allows(c, x) for c in made))


@pytest.mark.parametrize("seed", range(8))
def test_batches_and_ladders_do_not_matter(seed):
    planted, made = conditions(seed)
    relations = [relation_from_condition(c) for c in made]
    ladder = ladder_for(relations)
    whole = climb(relations, ladder, known=planted)
    cut = [coarsen(r, TOPS) for r in relations]
    every = reduce(join, [r for r in cut if r.parts])
    assert all(every.contains([int(c) for c in x]) for x in planted)
    for batch in (1, 7, 100):
        again = climb(relations, ladder, known=planted, batch=batch)
        assert again.relation.codes.tolist() == whole.relation.codes.tolist()
        assert again.sizes == whole.sizes and again.most_held <= whole.most_held + batch * 60
    other = climb(relations, plan_ladder(relations, TOPS, 3 * log(60), rest=0, width=1, pairs=False))
    assert other.relation.codes.tolist() == whole.relation.codes.tolist()


@pytest.mark.parametrize("seed", range(4))
def test_hashed_tables_change_nothing(seed, monkeypatch):
    planted, made = conditions(seed)
    relations = [relation_from_condition(c) for c in made]
    ladder = ladder_for(relations)
    exact = climb(relations, ladder, known=planted)
    monkeypatch.setattr(lift_tables, "_TABLE", 2)
    monkeypatch.setattr(lift_tables, "_SPARE", 1)
    found = []
    make = depth_first.make_table
    monkeypatch.setattr(depth_first, "make_table", lambda *a: found.append(make(*a)) or found[-1])
    hashed = climb(relations, ladder, known=planted)
    assert any(f is not None and f.hashed for f in found)
    assert hashed.relation.codes.tolist() == exact.relation.codes.tolist()
    # more classes are met, never fewer
    assert all(a >= b for a, b in zip(hashed.sizes, exact.sizes, strict=True))


@pytest.mark.parametrize("seed", range(6))
def test_one_class_of_each_pair_is_enough_when_conditions_are_symmetric(seed):
    planted, made = conditions(seed, symmetric=True, density=0.45)
    relations = [relation_from_condition(c) for c in made]
    assert all(is_symmetric(r) for r in relations)
    ladder = ladder_for(relations)
    half = climb(relations, ladder, known=planted)
    whole = climb(relations, ladder, known=planted, symmetric=False)
    assert not whole.halved
    assert half.relation.codes.tolist() == whole.relation.codes.tolist()
    if half.halved:
        assert sum(half.sizes) < sum(whole.sizes)


def test_symmetry_is_seen_and_not_assumed():
    _, made = conditions(1)
    relations = [relation_from_condition(c) for c in made]
    seen = [is_symmetric(r) for r in relations]
    for condition, even in zip(made, seen, strict=True):
        mirrored = sorted((-condition.allowed % np.array(condition.moduli)).tolist())
        # conditions of this family need not be onto: symmetric there is symmetric here
        if mirrored == condition.allowed.tolist():
            assert even
        if even:
            assert all(allows(condition, [-c for c in x]) for x in box(3, 12) if allows(condition, x))
    assert not all(seen)
    with pytest.raises(ValueError, match="symmetric"):
        climb(relations, ladder_for(relations), symmetric=True)
    assert not climb(relations, ladder_for(relations)).halved


def test_a_known_vector_that_is_excluded_is_named():
    _, made = conditions(5, density=0.3)
    relations = [relation_from_condition(c) for c in made]
    ladder = ladder_for(relations)
    cut = [coarsen(r, TOPS) for r in relations]
    bad = next(x for x in box(3, 60) if not all(r.contains(x) for r in cut))
    with pytest.raises(Inconsistent, match="excluded"):
        climb(relations, ladder, known=[bad])


def test_limits():
    _, made = conditions(0)
    relations = [relation_from_condition(c) for c in made]
    ladder = ladder_for(relations)
    with pytest.raises(LimitReached) as caught:
        climb(relations, ladder, most=10)
    assert sum(caught.value.partial) > 10
    with pytest.raises(ValueError, match="within a stage"):
        climb(relations, ladder[:1])
    assert climb(relations, ()).relation.count == 1
    nothing = relation_from_condition(replace(made[0], name="none", allowed=made[0].allowed[:0]))
    assert climb([*relations, nothing], ladder).relation.count == 0


@pytest.mark.parametrize("bound", [1, 10**4, 2**29 - 1])
def test_residues_are_exact(bound):
    rng = random.Random(bound)
    for modulus in (2, 3, 97, 10**6 + 3, 2**31 - 1):
        row = np.array([rng.randrange(-(modulus // 2), modulus // 2 + 1) for _ in range(6)], dtype=np.float64)
        points = [[rng.choice((0, bound, -bound, rng.randint(-bound, bound))) for _ in range(200)]
                  for _ in range(6)]
        # multiples of the modulus and their neighbours
        got = lift_tables.residues(row, np.array(points, dtype=np.float64).T, modulus, float(bound))
        expected = [sum(int(c) * p[k] for c, p in zip(row, points, strict=True)) % modulus
                    for k in range(200)]
        assert got.tolist() == expected


def test_coordinates_stay_in_their_words(monkeypatch):
    planted, made = conditions(2)
    relations = [relation_from_condition(c) for c in made]
    ladder = ladder_for(relations)
    whole = climb(relations, ladder, known=planted)
    rungs = depth_first.build_rungs([coarsen(r, TOPS) for r in relations], ladder, np.zeros((0, 3), np.int32))
    assert {rung.modulus for rung in rungs if rung.tidy} <= {2, 3, 4, 5, 6, 10, 12, 15, 20, 30, 60}
    assert [rung.tidy for rung in rungs] == [lift.last for lift in ladder]
    # with narrower words coordinates are reduced more often, with the same result, or the run is refused
    worst = max((rung.lift.prime - 1) * max(map(abs, rung.shift)) for rung in rungs)
    monkeypatch.setattr(depth_first, "CODE_LIMIT", 60 + worst + 1)
    tidier = depth_first.build_rungs(relations, ladder, np.zeros((0, 3), np.int32))
    assert sum(rung.tidy for rung in tidier) > sum(rung.tidy for rung in rungs)
    assert climb(relations, ladder, known=planted).relation.codes.tolist() == whole.relation.codes.tolist()
    monkeypatch.setattr(depth_first, "CODE_LIMIT", worst)
    with pytest.raises(ValueError, match="too large"):
        climb(relations, ladder)
