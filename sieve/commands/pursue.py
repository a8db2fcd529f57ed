"""After the usual stages: primes sought for the candidates that are still open, and why some stay open."""

from __future__ import annotations

import time
from collections.abc import Callable, Collection, Sequence
from dataclasses import dataclass, field, replace

from sieve.commands.common import StoredInvestigation
from sieve.curves.protocol import Curve
from sieve.engine.explain import explain
from sieve.engine.investigation import Investigation
from sieve.engine.prime_hunt import Hunt, Prospect, ranked
from sieve.engine.relation import relation_from_condition
from sieve.engine.verdicts import CandidateList, Decision, candidate_relations, from_fate
from sieve.exact.primes import primes_below
from sieve.local.records import local_record

REACH = 4000
"""Primes below this are considered when neither a bound nor a time is given."""

LONG_REACH = 20_000
"""Primes below this are considered when a time is given."""

BLOCK = 16
"""So many groups are computed before their conditions are used (the same for any number of processes)."""

Key = tuple[int, str]


def reach_of(curve: Curve, bound: int | None, seconds: float | None) -> int:
    """How far primes are sought by their orders for open candidates: 0 where orders take long (genus 3 and
    more)."""
    if curve.weight == 3:
        return bound or (REACH if seconds is None else LONG_REACH)
    return 0


@dataclass
class Pursuit:
    """What the search for primes did: new decisions, primes looked at, whether a deadline stopped it."""

    decisions: dict[Key, Decision]
    looked_at: list[Prospect] = field(default_factory=list)
    bound: int = 0
    stopped: bool = False


def make_hunts(investigation: Investigation, lists: Sequence[CandidateList], decisions: dict[Key, Decision],
               ells: Sequence[int], bound: int | None,
               primes: Collection[int] | None = None) -> list[tuple[int, Hunt]]:
    """A hunt for every labelled relation with open candidates, with the number of its list."""
    labelled, lists_of = candidate_relations(investigation, lists, ells)
    auxiliary = investigation.relations(ells, bound, primes)
    known = [c.vector for c in investigation.sought.values() if c.denominator == 1]
    out = []
    for relation in labelled:
        number = lists_of[relation.name]
        labels = [label for label in relation.labels if (d := decisions.get((number, label))) is not None
                  and d.verdict == "open" and d.fate is not None]
        if labels:
            others = [r.unlabelled() for r in labelled if r is not relation and r.complete]
            prime = lists[number].place.prime
            out.append((number, Hunt(relation, labels, prime, [*auxiliary, *others], known)))
    return out


def pursue(lists: Sequence[CandidateList], decisions: dict[Key, Decision], ells: Sequence[int], start: int,
           bound: int, stored: StoredInvestigation, primes: Collection[int] | None = None,
           deadline: float | None = None, say: Callable[[str], None] = lambda text: None) -> Pursuit:
    """Look for primes from `start` below `bound` that decide open candidates.

    Arguments: the decisions so far by (number of the list, id), not changed; `stored`, through which local
    data come; `primes`, those that the decisions rest on (None: all below `start`).
    Every candidate that stays open gets an explanation.
    """
    investigation = stored.investigation
    hunts = make_hunts(investigation, lists, decisions, ells, start, primes)
    result = Pursuit(dict(decisions), bound=start)
    _settle(result, lists, hunts)
    low, high = start, 2 * start
    while low < bound and any(hunt.open for _, hunt in hunts) and not result.stopped:
        high = min(high, bound)
        fresh = [v for v in primes_below(high) if v >= low and v not in investigation.records]
        orders = stored.quick_orders(fresh)
        best = ranked([hunt for _, hunt in hunts], {v: (q.points, q.orders) for v, q in orders.items()})
        say(f"{len(best)} of {len(fresh)} primes from {low} to {high} may help {_open_count(hunts)} "
            "open candidates")
        _use(result, investigation, hunts, best, ells, stored.gather, deadline)
        if not result.stopped:
            for _, hunt in hunts:
                hunt.combine()
            result.bound = high
        low, high = high, 2 * high
        _settle(result, lists, hunts)
    _explain(result, stored, lists, hunts, ells)
    return result


def _open_count(hunts: Sequence[tuple[int, Hunt]]) -> int:
    return sum(len(hunt.open) for _, hunt in hunts)


def _use(result: Pursuit, investigation: Investigation, hunts: Sequence[tuple[int, Hunt]],
         best: Sequence[Prospect], ells: Sequence[int], gather: Callable[[list[int]], bool],
         deadline: float | None) -> None:
    for place in range(0, len(best), BLOCK):
        if deadline is not None and time.monotonic() > deadline:
            result.stopped = True
            return
        block = list(best[place : place + BLOCK])
        if not gather([p.prime for p in block]):
            result.stopped = True
            return
        for prospect in block:
            result.looked_at.append(prospect)
            record = investigation.records[prospect.prime]
            if investigation.serves(record):
                relation = relation_from_condition(record.condition(investigation.images(record)), ells)
                for _, hunt in hunts:
                    hunt.add(relation)
        if not any(hunt.open for _, hunt in hunts):
            return


def _settle(result: Pursuit, lists: Sequence[CandidateList], hunts: Sequence[tuple[int, Hunt]]) -> None:
    for number, hunt in hunts:
        for label, fate in hunt.fates.items():
            result.decisions[number, label] = from_fate(lists[number].place.prime, fate)


def next_prime(stored: StoredInvestigation, hunts: Sequence[Hunt], ells: Sequence[int], start: int,
               width: int = 4000, checks: int = 12) -> int | None:
    """The first prime in start .. start + width that is expected to remove much of the classes left.

    Picked by its order, then confirmed by its group; at most `checks` groups are computed (None after that).
    """
    investigation, problem = stored.investigation, stored.investigation.problem
    primes = [v for v in primes_below(start + width) if v >= start]
    for low in range(0, len(primes), 64):
        orders = stored.quick_orders(primes[low : low + 64])
        for v, order in orders.items():
            found = ranked(hunts, {v: (order.points, order.orders)})
            if not found or found[0].gain < 0.3:
                continue
            record = local_record(
                problem.curve, problem.base, investigation.asked, v, problem.integral
            )
            if investigation.serves(record):
                relation = relation_from_condition(record.condition(investigation.images(record)), ells)
                if any(hunt.expected_gain(relation) > 0.3 for hunt in hunts):
                    return v
            checks -= 1
            if checks == 0:
                return None
    return None


def _explain(result: Pursuit, stored: StoredInvestigation, lists: Sequence[CandidateList],
             hunts: Sequence[tuple[int, Hunt]], ells: Sequence[int]) -> None:
    investigation = stored.investigation
    curve = investigation.problem.curve
    waiting = [hunt for _, hunt in hunts if hunt.open]
    following = next_prime(stored, waiting, ells, result.bound) if waiting else None
    for number, listing in enumerate(lists):
        p = listing.place.prime
        why_not = "" if p in ells else investigation.saturation_at(p).reason
        for candidate in listing.candidates:
            decision = result.decisions.get((number, candidate.id))
            if decision is None or decision.verdict != "open" or decision.fate is None:
                continue
            hunt = next((h for n, h in hunts if n == number and candidate.id in h.powers), None)
            found = explain(curve, p, candidate, hunt, bound=result.bound, ells=ells, why_not=why_not,
                            following=following)
            reason = "; ".join(filter(None, [decision.reason, found.reason]))
            result.decisions[number, candidate.id] = replace(decision, reason=reason, hint=found.hint)


__all__ = ["LONG_REACH", "REACH", "Pursuit", "make_hunts", "next_prime", "pursue"]
