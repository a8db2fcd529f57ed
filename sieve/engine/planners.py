"""Planners: different ways to choose a join order, with one signature, by name.

A planner sees counts and subgroups only and returns a `Plan`; `run_plan` executes it.  The expected size of a
join of several conditions is the index of the meet of their subgroups times the product of their densities,
whatever the order; orders differ in the sizes on the way.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import combinations
from math import exp, log
from typing import Protocol

from sieve.engine.graph import ConstraintGraph
from sieve.engine.outlook import Outlook, Parts, sum_of_parts
from sieve.engine.plan import Plan, Step, informative, make_plan
from sieve.engine.relation import Relation
from sieve.errors import InternalError
from sieve.exact.primary import Characters

MOST_EXHAUSTIVE = 10
"""Exhaustive planning takes at most so many conditions (2^10 sets)."""


class Planner(Protocol):
    """What a planner is called with.

    Arguments: the conditions (distinct names); a relation to start from; how many classes are expected to
    survive everything; the largest predicted number of classes; the largest number of joins.
    """

    def __call__(self, relations: Sequence[Relation], start: Relation | None = None, *, known: int = 1,
                 cap: float = 2e5, max_joins: int = 24) -> Plan: ...


PLANNERS: dict[str, Planner] = {}
"""The planners by name."""


def register(name: str) -> Callable[[Planner], Planner]:
    """Enter a planner under a name (decorator); a name is given once."""

    def enter(planner: Planner) -> Planner:
        if name in PLANNERS:
            raise InternalError(f"two planners are called {name}")
        PLANNERS[name] = planner
        return planner

    return enter


def planner(name: str) -> Planner:
    """The planner of that name; raises `KeyError` with the names there are."""
    if name not in PLANNERS:
        raise KeyError(f"no planner {name!r}; there are {', '.join(sorted(PLANNERS))}")
    return PLANNERS[name]


def _exponents(relation: Relation) -> tuple[tuple[int, int], ...]:
    return tuple(sorted(relation.exponents.items()))


def _log_index(parts: Parts) -> float:
    return sum(part.length * log(part.prime) for part in parts.values())


def _order_of(parts: Parts) -> int:
    out = 1
    for part in parts.values():
        out *= part.order
    return out


def _log_density(relation: Relation) -> float:
    return log(max(relation.count, 1)) - log(relation.index)


def _plan_of(order: Sequence[Relation], start: Relation | None) -> Plan:
    """The plan that joins in the given order, with the expected sizes."""
    steps: list[Step] = []
    parts: dict[int, Characters] = {} if start is None else dict(start.by_prime)
    density = 0.0 if start is None else _log_density(start)
    for place, relation in enumerate(order):
        parts = sum_of_parts(parts, relation)
        density += _log_density(relation)
        kind = "start" if start is None and place == 0 else "join"
        size = exp(min(700.0, density + _log_index(parts)))
        steps.append(Step(kind, relation.name, _exponents(relation), size, _order_of(parts)))
    return Plan(tuple(steps))


@register("greedy")
def greedy(relations: Sequence[Relation], start: Relation | None = None, *, known: int = 1, cap: float = 2e5,
           max_joins: int = 24) -> Plan:
    """One choice at a time with one step of foresight, semijoins in between (`make_plan`)."""
    return make_plan(relations, start, known=known, cap=cap, max_joins=max_joins)


@register("tree")
def tree(relations: Sequence[Relation], start: Relation | None = None, *, known: int = 1, cap: float = 2e5,
         max_joins: int = 24) -> Plan:
    """Along a maximum spanning tree of the constraint graph."""
    pool = informative(relations)
    graph = ConstraintGraph(pool)
    by_name = {r.name: r for r in pool}
    return _plan_of([by_name[name] for name in graph.order()][: max_joins + 1], start)


@register("beam")
def beam(relations: Sequence[Relation], start: Relation | None = None, *, known: int = 1, cap: float = 2e5,
         max_joins: int = 24, width: int = 4) -> Plan:
    """The best few partial orders are kept at every step: small largest size first, then small last size."""
    pool = informative(relations)
    if not pool:
        return Plan(())
    Partial = tuple[float, float, tuple[int, ...]]
    beams: list[tuple[Partial, dict[int, Characters], float]] = []
    base: dict[int, Characters] = {} if start is None else dict(start.by_prime)
    density = 0.0 if start is None else _log_density(start)
    first = 0.0 if start is None else log(max(start.count, 1))
    beams = [((first, first, ()), base, density)]
    for _ in range(min(len(pool), max_joins + (start is None))):
        following: dict[frozenset[int], tuple[Partial, dict[int, Characters], float]] = {}
        for (largest, _, order), parts, so_far in beams:
            outlook = Outlook(pool, parts)
            for place, relation in enumerate(pool):
                if place in order:
                    continue
                if order and not outlook.common[place] and any(
                        c for k, c in enumerate(outlook.common) if k not in order):
                    continue
                more = sum_of_parts(parts, relation)
                value = so_far + _log_density(relation)
                size = value + _log_index(more)
                key = frozenset((*order, place))
                entry = ((round(max(largest, size), 9), round(size, 9), (*order, place)), more, value)
                if key not in following or entry[0] < following[key][0]:
                    following[key] = entry
        beams = sorted(following.values(), key=lambda entry: entry[0])[:width]
    return _plan_of([pool[k] for k in beams[0][0][2]], start)


@register("exhaustive")
def exhaustive(relations: Sequence[Relation], start: Relation | None = None, *, known: int = 1,
               cap: float = 2e5, max_joins: int = 24) -> Plan:
    """The order with the smallest largest set, then the smallest sum of sizes; for few conditions only.

    Raises `InternalError` for more than `MOST_EXHAUSTIVE` conditions.  Method: best order of every set of
    conditions from those of its subsets, since the expected size of a set does not depend on the order.
    """
    pool = informative(relations)
    if len(pool) > MOST_EXHAUSTIVE:
        raise InternalError(f"{len(pool)} conditions are too many for exhaustive planning")
    if not pool:
        return Plan(())
    base: dict[int, Characters] = {} if start is None else dict(start.by_prime)
    density = 0.0 if start is None else _log_density(start)
    parts: dict[frozenset[int], dict[int, Characters]] = {frozenset(): base}
    best: dict[frozenset[int], tuple[float, float, tuple[int, ...]]] = {frozenset(): (-1e9, 0.0, ())}
    for number in range(1, len(pool) + 1):
        for chosen in combinations(range(len(pool)), number):
            key = frozenset(chosen)
            parts[key] = sum_of_parts(parts[key - {chosen[-1]}], pool[chosen[-1]])
            size = density + sum(_log_density(pool[k]) for k in chosen) + _log_index(parts[key])
            options = []
            for last in chosen:
                largest, total, order = best[key - {last}]
                options.append((round(max(largest, size), 9), round(total + exp(min(size, 700.0)), 6),
                                (*order, last)))
            best[key] = min(options)
    return _plan_of([pool[k] for k in best[frozenset(range(len(pool)))][2]], start)


__all__ = ["MOST_EXHAUSTIVE", "PLANNERS", "Planner", "beam", "exhaustive", "greedy", "planner", "register",
           "tree"]
