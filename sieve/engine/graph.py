"""The constraint graph: conditions as nodes, common quotients as edges, and what can be asked of it.

Two conditions are joined by an edge when they see a common quotient L/(K1 + K2), weighted by the logarithm of
its order.  Components of the graph do not interact at all (but see `Outlook.joint_primes`: several conditions
can meet another one together where none of them does alone).
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from math import log

import networkx as nx

from sieve.engine.fates import visible_view
from sieve.engine.join import arc_consistent, common_exponents
from sieve.engine.relation import Relation
from sieve.errors import InternalError


@dataclass(frozen=True)
class Sight:
    """What the other conditions see of one relation, and who they are.

    `parts`: for each prime of its group (exponent there, largest exponent that another condition shares);
    `neighbours`: names, the largest common quotient first; `orders`: of these quotients; `alike`: labels in
    the same class as the one asked about, as far as the others see.
    """

    parts: Mapping[int, tuple[int, int]]
    neighbours: tuple[str, ...]
    orders: tuple[int, ...]
    alike: tuple[str, ...] = ()

    def __str__(self) -> str:
        seen = ", ".join(f"{ell}^{b} of {ell}^{a}" for ell, (a, b) in sorted(self.parts.items()))
        near = ", ".join(f"{n} ({o})" for n, o in list(zip(self.neighbours, self.orders, strict=True))[:8])
        text = f"seen: {seen or 'nothing'}; by {near or 'no condition'}"
        return text + (f"; in one class with {', '.join(self.alike)}" if self.alike else "")


class ConstraintGraph:
    """Relations with distinct names and the common quotients between them; not changed once made.

    `graph` is a `networkx.Graph`: nodes have `count`, `index`, `exponents`; edges have `weight` (logarithm),
    `order` and `lengths` (prime: length of the common part).

    >>> from sieve.engine.relation import trivial
    >>> ConstraintGraph([trivial(2, ["v = 3"])]).components()
    [('v = 3',)]
    """

    def __init__(self, relations: Iterable[Relation]) -> None:
        given = sorted(relations, key=lambda r: r.name)
        self.relations = {r.name: r for r in given}
        if len({s for r in given for s in r.sources}) < len(given):
            raise InternalError("two conditions have the same name")
        self.graph: nx.Graph = nx.Graph()
        for r in given:
            self.graph.add_node(r.name, count=r.count, index=r.index, exponents=dict(r.exponents))
        for i, a in enumerate(given):
            for b in given[i + 1 :]:
                lengths = common_exponents(a, b)
                if lengths:
                    order = 1
                    for ell, length in lengths.items():
                        order *= ell**length
                    self.graph.add_edge(a.name, b.name, weight=log(order), order=order, lengths=lengths)

    def components(self) -> list[tuple[str, ...]]:
        """The connected components, each sorted, the largest first."""
        found = [tuple(sorted(c)) for c in nx.connected_components(self.graph)]
        return sorted(found, key=lambda c: (-len(c), c))

    def touching(self, ell: int) -> tuple[str, ...]:
        """The conditions that touch the l-part, those with the largest exponent first."""
        found = [(-r.exponents[ell], name) for name, r in self.relations.items() if ell in r.exponents]
        return tuple(name for _, name in sorted(found))

    def sight(self, name: str, label: str | None = None) -> Sight:
        """Why is this candidate still open: what the others see of the group it lives in.

        Arguments: the name of a relation; for a labelled one a label, to have the labels named that it cannot
        be told from.
        """
        relation = self.relations[name]
        edges = sorted((-self.graph.edges[name, other]["order"], other) for other in self.graph[name])
        view = visible_view(relation, [self.relations[other] for _, other in edges])
        parts = {ell: (e, view.exponents.get(ell, 0)) for ell, e in relation.exponents.items()}
        alike: set[str] = set()
        tags = None if label is None else view.with_labels([label]).tags
        for place in [] if tags is None else tags.tolist():
            alike.update(view.label_sets[place])
        return Sight(parts, tuple(other for _, other in edges), tuple(-o for o, _ in edges),
                     tuple(sorted(alike - {label or ""})))

    def spanning_tree(self) -> list[tuple[str, str]]:
        """The edges of a maximum spanning forest, the heaviest first; ties by name."""
        edges = sorted((-round(d["weight"], 9), *sorted((a, b))) for a, b, d in self.graph.edges(data=True))
        parent = {name: name for name in self.graph}

        def root(x: str) -> str:
            while parent[x] != x:
                parent[x] = parent[parent[x]]
                x = parent[x]
            return x

        out = []
        for _, a, b in edges:
            if root(a) != root(b):
                parent[root(a)] = root(b)
                out.append((a, b))
        return out

    def order(self) -> list[str]:
        """The default join order: each component along its spanning tree, from its densest condition.

        At every step the heaviest tree edge that leaves the conditions joined so far; components by size.
        """
        tree = nx.Graph()
        tree.add_nodes_from(self.graph)
        for a, b in self.spanning_tree():
            tree.add_edge(a, b, weight=self.graph.edges[a, b]["weight"])
        out: list[str] = []
        for component in self.components():
            first = max(component, key=lambda n: (self._gain(n), [-ord(c) for c in n]))
            done = [first]
            while len(done) < len(component):
                edges = [(-round(tree.edges[a, b]["weight"], 9), b) for a in done for b in tree[a]
                         if b not in done]
                done.append(min(edges)[1])
            out.extend(done)
        return out

    def _gain(self, name: str) -> float:
        r = self.relations[name]
        return log(r.index) - log(r.count) if r.count else float("inf")

    def propagate(self, rounds: int = 8) -> ConstraintGraph:
        """The graph after semijoins along all edges to a fixed point (or `rounds` passes)."""
        names = list(self.relations)
        smaller = arc_consistent([self.relations[n] for n in names], rounds)
        return ConstraintGraph([_named(r, name) for r, name in zip(smaller, names, strict=True)])

    def __len__(self) -> int:
        return len(self.relations)


def _named(relation: Relation, name: str) -> Relation:
    """The relation under its old name: its classes now depend on others too, its subgroup does not."""
    return replace(relation, sources=(name,))


__all__ = ["ConstraintGraph", "Sight"]
