"""The constraint graph: edges, components, trees, semijoins to a fixed point, queries."""

from __future__ import annotations

import random
from functools import reduce

import networkx as nx
import pytest

from sieve.engine.graph import ConstraintGraph
from sieve.engine.join import common_index, join
from sieve.engine.relation import relation_from_condition
from sieve.errors import InternalError
from tests.support.random_conditions import labelled, make, random_condition

MODULI = (2, 4, 3, 9, 5, 7)


def family(seed, n=2, count=7, density=0.5):
    rng = random.Random(seed)
    return [relation_from_condition(random_condition(rng, f"v = {k}", n, moduli=MODULI, planted=[(1, 2)],
                                                     density=density)) for k in range(count)]


@pytest.mark.parametrize("seed", range(8))
def test_edges_are_the_common_quotients(seed):
    relations = family(seed)
    graph = ConstraintGraph(relations)
    for a in relations:
        for b in relations:
            if a.name < b.name:
                order = common_index(a, b)
                assert graph.graph.has_edge(a.name, b.name) == (order > 1)
                if order > 1:
                    assert graph.graph.edges[a.name, b.name]["order"] == order
    assert sorted(n for c in graph.components() for n in c) == sorted(r.name for r in relations)


@pytest.mark.parametrize("seed", range(8))
def test_the_tree_is_a_maximum_spanning_forest_and_the_order_follows_it(seed):
    graph = ConstraintGraph(family(seed))
    tree = graph.spanning_tree()
    expected = nx.maximum_spanning_tree(graph.graph)
    weight = sum(graph.graph.edges[a, b]["weight"] for a, b in tree)
    assert abs(weight - expected.size(weight="weight")) < 1e-6 and len(tree) == expected.number_of_edges()
    order = graph.order()
    assert sorted(order) == sorted(graph.relations)
    edges = {frozenset(e) for e in tree}
    for component in graph.components():
        inside = [n for n in order if n in component]
        assert all(any(frozenset((a, b)) in edges for a in inside[:k]) for k, b in enumerate(inside) if k)


@pytest.mark.parametrize("seed", range(8))
def test_propagation_keeps_the_join_and_is_a_fixed_point(seed):
    relations = family(seed, count=5, density=0.4)
    graph = ConstraintGraph(relations)
    small = graph.propagate(50)
    assert [r.index for r in small.relations.values()] == [r.index for r in graph.relations.values()]
    pairs = zip(small.relations.values(), graph.relations.values(), strict=True)
    assert all(a.count <= b.count for a, b in pairs)
    before, after = reduce(join, graph.relations.values()), reduce(join, small.relations.values())
    assert (before.count, before.index) == (after.count, after.index) and before.count
    again = small.propagate(50)
    assert [r.count for r in again.relations.values()] == [r.count for r in small.relations.values()]


def test_queries_name_conditions_parts_and_labels():
    at_seven = make("v = 5", [7], [[1], [0]], [[0], [1]])
    at_49 = make("v = 3", [49, 2], [[1, 1], [0, 0]], [[0, 0], [8, 1]])
    other = make("v = 11", [3], [[0], [1]], [[1]])
    z = make("p = 7", [49], [[1], [0]], [[0], [7], [1]], [["a"], ["b"], ["c"]])
    graph = ConstraintGraph([relation_from_condition(c) for c in (at_seven, at_49, other, z)])
    assert graph.touching(7) == ("p = 7", "v = 3", "v = 5") and graph.touching(5) == ()
    assert graph.components() == [("p = 7", "v = 3", "v = 5"), ("v = 11",)]
    seen = graph.sight("p = 7", "a")
    assert seen.parts == {7: (2, 2)} and seen.neighbours == ("v = 3", "v = 5") and seen.orders == (49, 7)
    assert seen.alike == ()
    without = ConstraintGraph([relation_from_condition(c) for c in (at_seven, other, z)])
    assert without.sight("p = 7", "a").alike == ("b",)
    assert str(without.sight("p = 7", "a")) == "seen: 7^1 of 7^2; by v = 5 (7); in one class with b"


def test_two_conditions_of_one_name_are_refused():
    relations = family(0, count=2)
    with pytest.raises(InternalError):
        ConstraintGraph([relations[0], relations[0]])


def test_labels_live_through_propagation():
    rng = random.Random(3)
    z = relation_from_condition(labelled(rng, random_condition(rng, "p = 3", 2, moduli=(9,), density=0.9), 4))
    small = ConstraintGraph([*family(3), z]).propagate()
    assert set(small.relations["p = 3"].labels) <= set(z.labels)
