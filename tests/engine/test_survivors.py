"""Short representatives and the barrier against enumeration of boxes."""

from __future__ import annotations

import random
from itertools import product

import pytest

from sieve.engine.join import join
from sieve.engine.relation import relation_from_condition, trivial
from sieve.engine.survivors import barrier, short_vectors
from sieve.errors import Inconsistent
from tests.support.random_conditions import make, random_condition


def code(relation, vector):
    return tuple(c for part in relation.parts for c in part.values(vector))


def random_relation(seed, r, torsion):
    """A condition on Z^r (+) T: the images of torsion generators are killed by their orders."""
    rng = random.Random(seed)
    moduli = [rng.choice([5, 6, 8, 9, 12, 16]) for _ in range(2)]
    images = [[rng.randrange(m) for m in moduli] for _ in range(r)]
    for order in torsion:
        images.append([rng.randrange(m) * m % (m * order) // order if m % order == 0 else 0 for m in moduli])
    images = [[x % m for x, m in zip(row, moduli, strict=True)] for row in images]
    allowed = [t for t in product(*(range(m) for m in moduli)) if rng.random() < 0.3]
    relation = relation_from_condition(make("v", moduli, images, allowed))
    for j, order in enumerate(torsion):
        assert not any(code(relation, [0] * (r + j) + [order] + [0] * (len(torsion) - j - 1)))
    return relation


def vectors_within(r, torsion, radius):
    return product(*[range(-radius, radius + 1)] * r, *(range(t) for t in torsion))


@pytest.mark.parametrize("seed", range(24))
def test_shortest_representatives(seed):
    r, torsion = [(1, ()), (2, ()), (2, (2,)), (1, (2, 4)), (3, ()), (2, (3,))][seed % 6]
    relation = random_relation(seed, r, torsion)
    found = short_vectors(relation, torsion)
    assert len(found) == relation.count
    assert [s.norm for s in found] == sorted(s.norm for s in found)
    best: dict[tuple[int, ...], int] = {}
    radius = 12 if r < 3 else 6
    for x in vectors_within(r, torsion, radius):
        norm = sum(c * c for c in x[:r])
        key = code(relation, x)
        best[key] = min(best.get(key, norm), norm)
    for s in found:
        assert s.exact and s.norm == sum(c * c for c in s.vector[:r])
        assert all(0 <= c < t for c, t in zip(s.vector[r:], torsion, strict=True))
        assert relation.contains(s.vector)
        if s.norm <= radius**2:
            assert best[code(relation, s.vector)] == s.norm
        else:
            assert code(relation, s.vector) not in best or best[code(relation, s.vector)] >= s.norm
    assert {code(relation, s.vector) for s in found} == set(map(tuple, relation.codes.tolist()))


@pytest.mark.parametrize("seed", range(24))
def test_the_barrier_is_the_least_unknown_vector(seed):
    r, torsion = [(1, ()), (2, ()), (2, (2,)), (1, (4,))][seed % 4]
    relation = random_relation(100 + seed, r, torsion)
    everything = [x for x in vectors_within(r, torsion, 12) if relation.contains(x)]
    rng = random.Random(seed)
    known = rng.sample(everything, min(3, len(everything)))
    known += [s.vector for s in short_vectors(relation, torsion)[:2]]
    found = barrier(relation, known, torsion)
    if relation.count == 0:
        assert found.norm is None and found.value is None
        return
    kernel_free = len({code(relation, (*[0] * r, *t)) for t in product(*(range(t) for t in torsion))})
    torsion_seen = kernel_free == max(1, len(list(product(*(range(t) for t in torsion)))))
    others = [x for x in everything if x not in known]
    least = min((sum(c * c for c in x[:r]) for x in others), default=10**9)
    if least <= 144:
        assert found.norm == least if torsion_seen else found.norm <= least
        assert found.value**2 <= found.norm < (found.value + 1) ** 2
    elif torsion_seen:
        assert found.norm is None or found.norm > 144
    classes = {code(relation, x) for x in known}
    assert found.open_classes == relation.count - len(classes)
    if found.vector is not None:
        assert found.explained == (code(relation, found.vector) in classes)


def test_second_shortest_in_the_class_of_a_known_point():
    relation = relation_from_condition(make("v", [100], [[1], [10]], [[0]]))
    found = barrier(relation, [(0, 0)])
    # the shortest nonzero vectors of a + 10 b = 0 mod 100 are +-(0, 10), then +-(10, -1), then +-(10, 9)
    assert (found.norm, found.value, found.explained, found.open_classes) == (100, 10, True, 0)
    assert barrier(relation, [(0, 0), (0, 10), (0, -10)]).norm == 101
    assert barrier(relation, [(0, 0), (0, 10), (0, -10), (10, -1), (-10, 1)]).norm == 181


def test_torsion_that_the_relation_does_not_see_counts():
    # Z + Z/2, the condition only looks at the free part: (3, 1) is in the class of (3, 0)
    relation = relation_from_condition(make("v", [7], [[1], [0]], [[3]]))
    assert barrier(relation, [(3, 0)], [2]).norm == 9
    seen = relation_from_condition(make("v", [7, 2], [[1, 0], [0, 1]], [[3, 0]]))
    assert barrier(seen, [(3, 0)], [2]).norm == 16


def test_a_known_vector_outside_or_a_wrong_torsion_order_is_an_error():
    relation = relation_from_condition(make("v", [7], [[1]], [[3]]))
    with pytest.raises(Inconsistent) as caught:
        barrier(relation, [(2,)])
    assert caught.value.witness == "(2,)"
    with pytest.raises(Inconsistent):
        short_vectors(relation_from_condition(make("v", [4], [[1], [1]], [[3]])), [2])


def test_large_counts_fall_back_to_rounding_and_say_so():
    rng = random.Random(1)
    relation = relation_from_condition(random_condition(rng, "v", 2, moduli=(64, 81), density=0.2, factors=1))
    rounded = short_vectors(relation, exact_limit=3)
    assert not any(s.exact for s in rounded)
    exact = {code(relation, s.vector): s.norm for s in short_vectors(relation)}
    assert all(exact[code(relation, s.vector)] <= s.norm for s in rounded)


def test_known_points_show_as_small_vectors_in_a_quotient_of_any_size():
    planted = (3, -2, 5, 0, 1, -4)
    state = trivial(6)
    for p in (101, 103, 107, 109, 113, 127):
        images = [[int(i == j) for j in range(6)] for i in range(6)]
        state = join(state, relation_from_condition(
            make(f"v = {p}", [p**4] * 6, images, [[x % p**4 for x in planted]])))
    assert state.index > 10**290
    (survivor,) = short_vectors(state)
    assert survivor.vector == planted and survivor.exact and survivor.norm == 55
    found = barrier(state, [planted])
    assert found.explained and found.value > 10**48


def test_everything_and_nothing():
    assert [s.vector for s in short_vectors(trivial(2))] == [(0, 0)]
    assert barrier(trivial(2), []).norm == 0
    assert barrier(trivial(2), [(0, 0)]).norm == 1
    nothing = relation_from_condition(make("v", [3], [[1]], []))
    assert short_vectors(nothing) == [] and barrier(nothing, []).value is None
    # only torsion: rank 0
    torsion_only = relation_from_condition(make("v", [4], [[1]], [[1], [3]]))
    assert [s.vector for s in short_vectors(torsion_only, [4])] == [(1,), (3,)]
    assert barrier(torsion_only, [(1,)], [4]).vector == (3,)
    assert barrier(torsion_only, [(1,), (3,)], [4]).norm is None
