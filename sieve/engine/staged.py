"""Sieving in stages: modulo M1 | M2 | .., all conditions cut to the stage, a path of moduli planned first.

In high rank sizes multiply until the common quotients outgrow the point counts.  Between two stages only the
part of L/M L that is new has to be met by joins, and every condition filters it at once.  The expected number
of survivors modulo M is known from the counts alone, M^n times the product of the densities modulo M; the
path is the one with the smallest largest stage.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from heapq import heappop, heappush
from math import exp, expm1, log, log1p

import numpy as np

from sieve.engine.join import join, semijoin
from sieve.engine.plan import Outcome, Plan, Reporter, Step, sieve_run
from sieve.engine.relation import Relation, coarsen, merge_equal, trivial

Exponents = tuple[int, ...]


def expected_log_size(relations: Sequence[Relation], modulus: Mapping[int, int], known: int = 1) -> float:
    """log of the number of classes expected modulo M = prod l^e, from counts; at least log(known).

    N classes thrown at random into a quotient of order n occupy n (1 - exp(-N/n)) of it; N follows from the
    classes of the condition in its own quotient by the same formula.
    """
    rank = relations[0].n if relations else 0
    total = rank * sum(e * log(ell) for ell, e in modulus.items())
    for relation in relations:
        order = sum(min(e, modulus.get(part.prime, 0)) * log(part.prime)
                    for part in relation.parts for e in part.exponents)
        if relation.count >= relation.index:
            continue
        thrown = -log1p(-relation.count / relation.index) * relation.index
        load = thrown * exp(-order)
        if load < 20:
            total += log(max(-expm1(-load), 1e-300))
    return max(total, log(max(known, 1)))


def modulus_path(relations: Sequence[Relation], tops: Mapping[int, int], least_index: float,
                 known: int = 1, limit: int = 20_000) -> list[int]:
    """Primes l1, l2, .. by which the modulus grows, with the smallest largest expected size on the way.

    Arguments: the conditions; for each prime the largest exponent; log of the index n log M to be reached
    (the whole of `tops` if it is beyond that); how many classes survive everything; so many moduli are looked
    at.  Best-first search; ties go to the smaller modulus.
    """
    primes = sorted(tops)
    rank = relations[0].n if relations else 0
    goal = min(least_index, rank * sum(tops[ell] * log(ell) for ell in primes)) - 1e-9
    start: Exponents = (0,) * len(primes)
    heap: list[tuple[float, float, Exponents, tuple[int, ...]]] = [(0.0, 0.0, start, ())]
    done: set[Exponents] = set()
    while heap:
        peak, index, here, path = heappop(heap)
        if here in done:
            continue
        done.add(here)
        if index >= goal or len(done) > limit:
            return list(path)
        for place, ell in enumerate(primes):
            if here[place] < tops[ell]:
                there = here[:place] + (here[place] + 1,) + here[place + 1 :]
                if there not in done:
                    size = expected_log_size(relations, dict(zip(primes, there, strict=True)), known)
                    heappush(heap, (round(max(peak, size), 6), index + rank * log(ell), there, (*path, ell)))
    return []


def sieve_in_stages(relations: Sequence[Relation], path: Sequence[int], *, cap: int = 2 * 10**7,
                    max_joins: int = 60, premium: float = 0.2, chunk: int = 300_000,
                    report: Reporter | None = None) -> Outcome:
    """The classes that all conditions allow, modulo the growing product of the path.

    Arguments: conditions with distinct names; primes by which the modulus grows; limits as in `sieve_run`;
    `chunk`: a stage that begins with more classes goes on with so many at a time, to the end of the path.
    The plan comes from the first chunk and is the same for all, so that the result is what one set would have
    given and memory is that of one chunk. Returns: the outcome; its plan is one list of joins and semijoins
    over all stages.
    """
    return _stages(relations, list(path), {}, trivial(relations[0].n if relations else 0), cap, max_joins,
                   premium, chunk, report)


def _stages(relations: Sequence[Relation], path: list[int], exponents: dict[int, int], state: Relation,
            cap: int, max_joins: int, premium: float, chunk: int, report: Reporter | None) -> Outcome:
    steps: list[Step] = []
    largest, exponents = state.count, dict(exponents)
    for number, ell in enumerate(path):
        if state.count > chunk and number:
            rest = _in_chunks(relations, path[number:], exponents, state, cap, max_joins, premium, chunk,
                              report)
            return Outcome(rest.relation, Plan((*steps, *rest.plan.steps)), max(largest, rest.largest))
        exponents[ell] = exponents.get(ell, 0) + 1
        pool = _with_a_group([coarsen(r, exponents) for r in relations])
        # few options are compared where each costs a pass over many classes
        width = 12 if state.count < 20_000 else 4 if state.count < 200_000 else 2
        begun = bool(state.parts)
        for end in sieve_run(pool, state if begun else None, cap=cap, max_joins=max_joins, width=width,
                             premium=premium, report=report):
            new, after = end.plan.steps, end
        kinds = {"start": "join"} if begun else {}
        steps.extend(replace(s, kind=kinds.get(s.kind, s.kind)) for s in new)
        state, largest = after.relation, max(largest, after.largest)
        if state.count == 0:
            break
    return Outcome(state, Plan(tuple(steps)), largest)


def _in_chunks(relations: Sequence[Relation], path: list[int], exponents: dict[int, int], state: Relation,
               cap: int, max_joins: int, premium: float, chunk: int, report: Reporter | None) -> Outcome:
    """The rest of the path for one part of the classes after the other, all by the plan of the first."""
    order = np.argsort(np.arange(state.count) * 7919 % state.count, kind="stable")
    pieces = [state.select(np.isin(np.arange(state.count), order[low : low + chunk]))
              for low in range(0, state.count, chunk)]
    first = _stages(relations, path, exponents, pieces[0], cap, max_joins, premium, 10 * cap, report)
    by_name = {r.name: r for r in relations}
    blocks, largest = [first.relation.codes], first.largest
    for piece in pieces[1:]:
        here = piece
        for step in first.plan.steps:
            condition = coarsen(by_name[step.name], dict(step.exponents))
            here = semijoin(here, condition) if step.kind == "semijoin" else join(here, condition)
            largest = max(largest, here.count)
        blocks.append(here.codes)
        if report is not None and first.plan.steps:
            report(replace(first.plan.steps[-1], actual=sum(len(b) for b in blocks)))
    codes = np.concatenate(blocks)
    largest = max(largest, state.count, len(codes))
    return Outcome(merge_equal(replace(first.relation, codes=codes)), first.plan, largest)


def _with_a_group(relations: Sequence[Relation]) -> list[Relation]:
    """The conditions with some group left, by name."""
    return sorted((r for r in relations if r.parts or not r.count), key=lambda r: r.name)


__all__ = ["expected_log_size", "modulus_path", "sieve_in_stages"]
