"""Which auxiliary primes to add next: what each would remove, what it would cost, and why.

The group of a prime costs milliseconds, so below a few thousand the advice is tried out on the classes left
and not guessed; beyond, only primes whose order promises something are tried (`prime_hunt`).
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from math import exp, log

from sieve.engine.join import common_exponents, semijoin
from sieve.engine.outlook import log_pass
from sieve.engine.relation import Relation

OVERHEAD = 1.0
"""Seconds added to the cost of a prime, so that cheap primes of no use do not come first."""


@dataclass(frozen=True)
class Advice:
    """One prime that is worth adding.

    `estimated`: classes expected to be left from sizes alone when the prime is added to those above it in the
    list; `left`: classes left when that is tried; `seconds`: the cost of its local data; `labels`: open
    candidates that it decides; `reason` in words.
    """

    prime: int
    structure: tuple[int, ...]
    estimated: float
    left: int
    seconds: float
    labels: tuple[str, ...]
    reason: str


@dataclass(frozen=True, eq=False)
class Offer:
    """A prime that might be added: its relation, the invariant factors of its group, the cost in seconds."""

    prime: int
    relation: Relation
    structure: tuple[int, ...]
    seconds: float


def estimate(state: Relation, relation: Relation, known: int = 0) -> float:
    """The number of classes expected to pass, from counts and subgroups alone; `known` ones pass for sure."""
    common = sum(length * log(ell) for ell, length in common_exponents(state, relation).items())
    rest = max(0, state.count - known)
    return known + rest * exp(log_pass(relation.count, common)) if relation.count else 0.0


def known_classes(state: Relation, known: Sequence[Sequence[int]]) -> int:
    """The number of different classes of the relation that hold known vectors."""
    codes = {tuple(c for part in state.parts for c in part.values(vector)) for vector in known}
    return len(codes.intersection(tuple(int(c) for c in row) for row in state.codes)) if known else 0


def advise(states: Sequence[Relation], offers: Sequence[Offer], top: int,
           known: Sequence[Sequence[int]] = (), say: Callable[[int], None] = lambda v: None) -> list[Advice]:
    """The best primes, each chosen for what it removes beyond those before it.

    Arguments: classes left, one or more relations (for candidates: labelled); the primes on offer; the
    largest number of entries; coefficient vectors of the known points.  A prime counts by the share of
    classes that it removes, in the state where it removes most, for its cost plus `OVERHEAD`.  Primes that
    remove nothing are not listed, unless none removes anything by itself (high rank): then those come first
    whose join is expected to be smallest for the quotient it reaches.
    """
    left = [state for state in states if state.count]
    pool = list(offers)
    out: list[Advice] = []
    gains: dict[int, float] = {}
    while len(out) < top and left and pool:
        best: tuple[float, int] | None = None
        # what a prime removes can only shrink as classes disappear: look again at promising ones only
        for offer in sorted(pool, key=lambda o: (-gains.get(o.prime, 1e9), o.prime)):
            if best is not None and gains.get(offer.prime, 1e9) <= best[0]:
                break
            share = max(1 - semijoin(state, offer.relation).count / state.count for state in left)
            gains[offer.prime] = share / (OVERHEAD + offer.seconds)
            say(offer.prime)
            if share > 0 and (best is None or (gains[offer.prime], -offer.prime) > best):
                best = (gains[offer.prime], -offer.prime)
        if best is None:
            break
        chosen = next(o for o in pool if o.prime == -best[1])
        pool.remove(chosen)
        after = [semijoin(state, chosen.relation) for state in left]
        shares = [a.count / b.count for a, b in zip(after, left, strict=True)]
        place = shares.index(min(shares))
        before, now = left[place], after[place]
        labels = tuple(sorted({label for state in left for label in state.labels
                               if any(label not in a.labels for a, b in zip(after, left, strict=True)
                                      if label in b.labels)}))
        meet = common_exponents(before, chosen.relation)
        parts = " * ".join(f"{ell}^{e}" if e > 1 else str(ell) for ell, e in sorted(meet.items()))
        reason = (f"it shares a quotient of order {parts} with the classes left; "
                  f"{now.count} of {before.count} pass")
        if labels:
            reason += f"; decides {', '.join(labels[:8])}{' ..' if len(labels) > 8 else ''}"
        sure = known_classes(before, known) if before.tags is None else 0
        out.append(Advice(chosen.prime, chosen.structure, estimate(before, chosen.relation, sure), now.count,
                          chosen.seconds, labels, reason))
        dead = set(labels)
        left = [state for a in after if (state := a.with_labels(set(a.labels) - dead)
                                         if a.tags is not None else a).count]
    return out or [a for state in left[:1] for a in _by_joins(state, offers, top)]


def _by_joins(state: Relation, offers: Sequence[Offer], top: int) -> list[Advice]:
    """Primes by what a join with them is worth."""
    found = []
    for offer in offers:
        r = offer.relation
        common = sum(length * log(ell) for ell, length in common_exponents(state, r).items())
        worth = (log(r.index) - log(r.count)) if r.count else 1e9
        if worth > 1e-9 and common > 0:
            size = state.count * r.count / exp(common)
            growth = r.index / exp(common)
            reason = (f"alone it removes nothing; a join with it is expected to leave {size:.3g} classes of "
                      f"{state.index * growth:.3g}")
            found.append((-worth / (OVERHEAD + offer.seconds), offer.prime,
                          Advice(offer.prime, offer.structure, size, round(size), offer.seconds, (), reason)))
    return [advice for _, _, advice in sorted(found, key=lambda t: t[:2])[:top]]


__all__ = ["Advice", "Offer", "advise", "estimate"]
