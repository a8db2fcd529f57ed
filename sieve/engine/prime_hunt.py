"""Auxiliary primes for the candidates that are still open: which to look at, and what each of them does.

A candidate in the disc of a rational point is told from it by the p-part of L alone, from some power p^e on,
so that only v with p^e dividing #J(F_v) can help; and v helps the more, the more of J(F_v) the classes left
so far are known in.  Both are read off the order of J(F_v), which is cheap; the structure is computed for the
promising primes only.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from math import log

from sieve.engine.fates import Fate, Use, replay, shorten, visible_view
from sieve.engine.join import common_index, join, match, semijoin, semijoin_mask
from sieve.engine.outlook import PREMIUMS, log_pass, shared_parts
from sieve.engine.plan import Outcome, informative, sieve_run
from sieve.engine.relation import Relation, coarsen
from sieve.errors import Inconsistent
from sieve.exact.primes import valuation_of

CAP = 60_000
"""The largest set of classes that a hunt keeps."""

SMALL = 20
"""Parts at primes below this are kept even where one condition alone has them."""

FAR = 10**6
"""Trails of a smaller index than this (relative to the candidates) are joined by trails made without them."""

LEAST_GAIN = 0.05
"""A prime is looked at when it is expected to remove this share (as a logarithm) of the classes."""


@dataclass(frozen=True, eq=False)
class Trail:
    """The classes left for the open candidates, and the conditions that led there."""

    relation: Relation
    uses: tuple[Use, ...]


@dataclass(frozen=True)
class Prospect:
    """What a prime is expected to do: `gain`, minus the logarithm of the share of classes that pass."""

    prime: int
    gain: float
    power: int

    @property
    def rank(self) -> tuple[float, int]:
        """Gain for its cost (which grows like v); the best comes first in increasing order."""
        return (-self.gain / (200 + self.prime), self.prime)


def depth(candidates: Relation, label: str, prime: int, known: Sequence[Sequence[int]],
          pool: Sequence[Relation]) -> int:
    """The number e such that the p-part modulo p^e, with all else the pool sees, does not tell the candidate
    from some known point, but modulo p^(e+1) it does (0: it is told apart already without p).

    The largest exponent in the group of the candidates when they agree throughout: then more p-adic digits
    are needed.
    """
    mine = candidates.with_labels([label])
    part = candidates.by_prime.get(prime)
    if part is None:
        return 0
    top = max(part.exponents)
    others = {ell: e for ell, e in candidates.exponents.items() if ell != prime}
    seen = visible_view(coarsen(mine, others), pool)
    best = 0
    for vector in known:
        if not seen.contains(vector):
            continue
        values = part.values(vector)
        for row in mine.codes_at(prime):
            e = 0
            while e < top and all((int(a) - b) % prime ** min(e + 1, k) == 0
                                  for a, b, k in zip(row, values, part.exponents, strict=True)):
                e += 1
            best = max(best, e)
    return best


def _worth_keeping(relations: Sequence[Relation]) -> list[Relation]:
    """The relations with the parts that others share, and those at small primes in any case."""
    shared = shared_parts(relations)
    return [coarsen(r, {ell: e if ell < SMALL else s.exponents.get(ell, 0) for ell, e in r.exponents.items()})
            for r, s in zip(relations, shared, strict=True)]


def _best(outcomes: Sequence[Outcome], most: int) -> Trail | None:
    """The strongest statement with at most so many classes."""
    fitting = [o for o in outcomes if o.relation.count <= most]
    if not fitting:
        return None
    best = max(fitting, key=lambda o: log(o.relation.index) - log(max(o.relation.count, 1)))
    kinds = {"start": "join"}
    uses = tuple(Use(s.name, s.exponents, kinds.get(s.kind, s.kind)) for s in best.plan.steps)
    return Trail(best.relation, uses)


class Hunt:
    """The open candidates of one labelled relation while auxiliary primes come in.

    Arguments: the labelled relation with all its digits; the open labels; the residue characteristic p of the
    relation; the conditions used so far; coefficient vectors of the known rational points; the parts at
    primes that conditions to come may use are those of the pool and p. Attributes: `trails`, some of them
    with few classes, some with a large index; `fates`, what became of labels; `powers`, for each label the
    least e with p^e useful.
    """

    def __init__(self, candidates: Relation, labels: Iterable[str], prime: int, pool: Sequence[Relation],
                 known: Sequence[Sequence[int]] = (), *, cap: int = CAP) -> None:
        self.candidates, self.prime, self.cap = candidates, prime, cap
        self.known = [tuple(int(c) for c in vector) for vector in known]
        self.pool = informative(_worth_keeping([*pool, candidates])[:-1])
        self.by_name = {r.name: r for r in self.pool}
        self.fates: dict[str, Fate] = {}
        self.top = candidates.exponents.get(prime, 0)
        self.powers = {label: depth(candidates, label, prime, known, self.pool) + 1
                       for label in sorted(labels)}
        self.hunted: list[Relation] = []
        #: labels that no condition can decide: with all their digits they are in the class of a known point
        self.hopeless = [label for label, e in self.powers.items() if e > self.top]
        self.trails = self._trails([label for label in self.powers if label not in self.hopeless])

    @property
    def open(self) -> list[str]:
        """The labels that may still be decided."""
        return [label for label in self.powers if label not in self.fates and label not in self.hopeless]

    def _trails(self, labels: Sequence[str]) -> list[Trail]:
        if not labels:
            return []
        start = self.candidates.with_labels(labels)
        found: list[Outcome] = []
        for premium in PREMIUMS:
            found.extend(sieve_run(self.pool, start, cap=self.cap, premium=premium))
        trails: list[Trail] = []
        limits = (2 * start.count, 30 * start.count, self.cap)
        for most in limits:
            best = _best(found, most)
            if best is not None and all(best.uses != t.uses for t in trails):
                trails.append(best)
        # conditions that do not meet the candidates yet may do so through one that is still to come
        if max((t.relation.index for t in trails), default=1) < FAR * start.index:
            apart = [o for premium in PREMIUMS for o in sieve_run(self.pool, cap=self.cap, premium=premium)]
            for most in limits:
                best = _best(apart, max(most // start.count, 1))
                if best is not None and match(start, best.relation).size <= self.cap:
                    trails.append(Trail(join(start, best.relation), best.uses))
        for trail in trails:
            self._bury(trail, set(labels) - set(trail.relation.labels))
        return self._without_dead(trails)

    def _without_dead(self, trails: Sequence[Trail]) -> list[Trail]:
        alive = set(self.open)
        out = []
        for trail in trails:
            if not set(trail.relation.labels) <= alive:
                trail = replace(trail, relation=trail.relation.with_labels(alive))
            out.append(trail)
        return out

    def _bury(self, trail: Trail, labels: Iterable[str]) -> None:
        for label in sorted(labels):
            if label in self.fates:
                continue
            view = self.candidates.with_labels([label])
            end = replay(view, trail.uses, self.by_name, 4 * self.cap)
            if end is None or end.count:
                continue
            short = shorten(view, trail.uses, self.by_name, 4 * self.cap)
            kind = "single" if len({use.name for use in short}) == 1 else "several"
            seen = tuple(sorted(self.candidates.exponents.items()))
            self.fates[label] = Fate(self.candidates.name, label, kind, short, exponents=seen)

    @property
    def largest_power(self) -> int:
        """The largest e such that the group of some condition used has a character of order p^e."""
        return max([r.exponents.get(self.prime, 0) for r in (*self.pool, *self.hunted)], default=0)

    def classes_left(self, label: str) -> int:
        """The least number of classes of the label in a trail (0 when it takes part in none)."""
        return min((t.relation.with_labels([label]).count for t in self.trails), default=0)

    def prospect(self, v: int, points: int, orders: Sequence[int]) -> Prospect:
        """What is expected of the prime v from #X(F_v) and the possible orders of J(F_v)."""
        needed = sorted({self.powers[label] for label in self.open})
        gain, power = 0.0, 0
        for order in orders:
            here = valuation_of(order, self.prime)
            if not needed or here < needed[0]:
                continue
            best = 0.0
            for trail in self.trails:
                exponents = trail.relation.exponents
                common = sum(min(valuation_of(order, ell), e) * log(ell) for ell, e in exponents.items())
                best = max(best, -log_pass(points, common))
            gain += best / len(orders)
            power = max(power, here)
        return Prospect(v, gain, power)

    def expected_gain(self, condition: Relation) -> float:
        """Minus the logarithm of the share of classes expected to pass, from the subgroup and count alone."""
        needed = min((self.powers[label] for label in self.open), default=1)
        if condition.exponents.get(self.prime, 0) < needed:
            return 0.0
        return max((-log_pass(condition.count, log(common_index(t.relation, condition)))
                    for t in self.trails), default=0.0)

    def add(self, condition: Relation) -> list[str]:
        """Use one more condition; returns the labels that it decides.

        Raises `Inconsistent` when it excludes a known point.
        """
        for vector in self.known:
            if not condition.contains(vector):
                shown = str(tuple(int(c) for c in vector))
                raise Inconsistent(f"the known point with coefficients {shown} is excluded by "
                                   f"{condition.name}", shown)
        if condition.name in self.by_name or not self.open:
            return []
        before = set(self.fates)
        trails = []
        for trail in self.trails:
            exponents = {ell: min(e, trail.relation.exponents.get(ell, 0))
                         for ell, e in condition.exponents.items()}
            small = coarsen(condition, exponents)
            if small.parts:
                mask = semijoin_mask(trail.relation, small)
                if not mask.all():
                    use = Use(condition.name, tuple(sorted(small.exponents.items())), "semijoin")
                    self.by_name[condition.name] = condition
                    gone = set(trail.relation.labels)
                    trail = Trail(semijoin(trail.relation, small), (*trail.uses, use))
                    self._bury(trail, gone - set(trail.relation.labels))
            trails.append(trail)
        self.by_name[condition.name] = condition
        self.hunted.append(condition)
        self.trails = self._without_dead(trails)
        return sorted(set(self.fates) - before)

    def combine(self, most: int = 40) -> list[str]:
        """Join the primes found with one another, where none of them was enough alone."""
        if not self.open or len(self.hunted) < 2:
            return []
        before = set(self.fates)
        for place, trail in enumerate(self.trails):
            if not trail.relation.count:
                continue
            useful = sorted((r for r in self.hunted if common_index(trail.relation, r) > 1),
                            key=lambda r: (-common_index(trail.relation, r) / max(1, r.count), r.name))[:most]
            pool = [*self.pool, *useful]
            shared = shared_parts([*pool, trail.relation])[:-1]
            *_, outcome = sieve_run(informative(shared), trail.relation, cap=self.cap, max_joins=12)
            uses = tuple(Use(s.name, s.exponents, s.kind) for s in outcome.plan.steps)
            longer = Trail(outcome.relation, (*trail.uses, *uses))
            self._bury(longer, set(trail.relation.labels) - set(outcome.relation.labels))
            if outcome.relation.count <= self.trails[place].relation.count:
                self.trails[place] = longer
            if not self.open:
                break
        self.trails = self._without_dead(self.trails)
        return sorted(set(self.fates) - before)


def ranked(hunts: Sequence[Hunt], orders: Mapping[int, tuple[int, Sequence[int]]]) -> list[Prospect]:
    """The primes that some hunt can use, best first.

    Arguments: for each prime #X(F_v) and the possible orders of J(F_v).
    """
    out = []
    for v in sorted(orders):
        points, possible = orders[v]
        found = [hunt.prospect(v, points, possible) for hunt in hunts if hunt.open]
        if found:
            best = max(found, key=lambda p: p.gain)
            if best.gain >= LEAST_GAIN:
                out.append(best)
    return sorted(out, key=lambda p: p.rank)


__all__ = ["Hunt", "Prospect", "Trail", "depth", "ranked"]
