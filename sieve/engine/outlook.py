"""Which condition to join next: expected sizes with one step of foresight.

The state is a relation (K, W).  A condition c with N allowed classes multiplies |W| by about N / [L : K +
K_c], and afterwards every condition that is still waiting can be semijoined and lets about the fraction 1 -
exp(-N' / [L : K' + K_c']) of the classes pass (N' classes thrown at random into the common quotient).  The
planner takes the condition for which the product of all these factors is smallest, with a premium on new
parts of the quotient.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from math import exp, inf, log, log1p
from weakref import WeakKeyDictionary

from sieve.engine.join import match
from sieve.engine.relation import Relation, coarsen
from sieve.exact.primary import Characters, adapt, intersect, intersection_length

#: premiums that are tried: the worth of the part of a new condition that the state has not met yet, as a
#: share of its logarithm; a larger quotient lets more of the waiting conditions interact (on curves of rank
#: 2, 3 and 6 anything from 0.3 to 0.8 is much better than 0, and no single value is best)
PREMIUMS = (0.4, 0.6, 0.8)

Parts = Mapping[int, Characters]


def sum_of_parts(parts: Parts, relation: Relation) -> dict[int, Characters]:
    """The characters of K cap K_c by prime, for K given by its characters."""
    out = dict(parts)
    for part in relation.parts:
        old = out.get(part.prime)
        out[part.prime] = part if old is None else adapt(
            part.prime, old.rows + part.rows, old.exponents + part.exponents).basis
    return out


def shared_parts(relations: Sequence[Relation]) -> list[Relation]:
    """Coarsen every relation to the prime powers at which the others together can see it.

    Loses nothing for the question which classes of one relation are compatible with all the others: that
    depends on L/(K_c + K') only, K' the meet of the others.  Cuts off, say, a prime factor of one group order
    that no other shares.  Returns the relations in the given order, with `coarsen` applied to each.
    """
    keep: list[dict[int, int]] = [{} for _ in relations]
    for ell in sorted({ell for r in relations for ell in r.by_prime}):
        holders = [(i, r.by_prime[ell]) for i, r in enumerate(relations) if ell in r.by_prime]
        if len(holders) < 2:
            continue
        before = [Characters(ell, (), ())]
        after = [Characters(ell, (), ())]
        for _, part in holders:
            before.append(_plus(before[-1], part))
        for _, part in reversed(holders):
            after.append(_plus(after[-1], part))
        for k, (i, part) in enumerate(holders):
            others = _plus(before[k], after[len(holders) - 1 - k])
            if others.rows:
                keep[i][ell] = max(intersect(part, others).basis.exponents, default=0)
    return [coarsen(r, exponents) for r, exponents in zip(relations, keep, strict=True)]


def _plus(a: Characters, b: Characters) -> Characters:
    return adapt(a.prime, a.rows + b.rows, a.exponents + b.exponents).basis


def log_pass(count: int, log_common: float) -> float:
    """log of the fraction of classes that a semijoin is expected to let pass."""
    if count == 0:
        return -inf
    if log_common <= 0:
        return 0.0
    load = count * exp(-log_common)
    return log1p(-exp(-load)) if load < 30 else 0.0


class Outlook:
    """What the waiting conditions can do for a state: common quotients and expected shrinking."""

    def __init__(self, pool: Sequence[Relation], parts: Parts) -> None:
        self.pool = pool
        self.parts = dict(parts)
        # for each condition and each of its primes the length of the common part
        self.meets = [{part.prime: self._length(part, self.parts.get(part.prime)) for part in r.parts}
                      for r in pool]
        self.common = [self.log_order(meets) for meets in self.meets]

    @staticmethod
    def _length(part: Characters, state: Characters | None) -> int:
        if state is None or not state.rows:
            return 0
        if len(state.rows) == len(state.rows[0]) and min(state.exponents) >= max(part.exponents):
            return part.length
        return intersection_length(part, state)

    @staticmethod
    def log_order(meets: Mapping[int, int]) -> float:
        """log of the product of the l^length."""
        return sum(length * log(ell) for ell, length in meets.items())

    def absorbed(self, place: int) -> bool:
        """Whether the condition has nothing beyond the quotient of the state: a semijoin then says it all."""
        return all(part.length == self.meets[place][part.prime] for part in self.pool[place].parts)

    def joint_primes(self, used: Collection[str]) -> set[int]:
        """The primes at which the waiting conditions together meet the state, even if none of them does
        alone.

        In Z^2 modulo 2 the characters x, y and x + y are such a case.
        """
        out = set()
        for ell, part in self.parts.items():
            rest = Characters(ell, (), ())
            for place, relation in enumerate(self.pool):
                other = relation.by_prime.get(ell)
                if other is not None and relation.name not in used and not self.absorbed(place):
                    rest = _plus(rest, other)
            if rest.rows and self._length(rest, part):
                out.add(ell)
        return out

    def after(self, option: Relation, used: Collection[str]) -> float:
        """log of the fraction expected to survive the waiting conditions once `option` has been joined."""
        parts = sum_of_parts(self.parts, option)
        changed = [ell for ell in option.by_prime if parts[ell] != self.parts.get(ell)]
        total = 0.0
        for place, waiting in enumerate(self.pool):
            if waiting.name in used or waiting.name == option.name:
                continue
            common = self.common[place]
            for ell in changed:
                part = waiting.by_prime.get(ell)
                if part is not None:
                    more = self._length(part, parts[ell]) - self.meets[place][ell]
                    common += more * log(ell)
            total += log_pass(waiting.count, common)
        return total


#: coarser forms of conditions by the primes kept, for as long as the condition lives
_coarser: WeakKeyDictionary[Relation, dict[tuple[int, ...], Relation]] = WeakKeyDictionary()


def _restricted(relation: Relation, primes: Sequence[int]) -> Relation:
    """The condition at some of its primes only."""
    known = _coarser.setdefault(relation, {})
    key = tuple(primes)
    if key not in known:
        known[key] = coarsen(relation, {ell: relation.exponents[ell] for ell in primes})
    return known[key]


def _variants(relation: Relation, primes_wanted: Collection[int]) -> list[Relation]:
    """The condition and its coarser forms by leaving out primes; each still has one of the wanted primes."""
    out = [relation]
    primes = sorted(relation.by_prime)
    if 1 < len(primes) <= 4:
        for mask in range(1, 2 ** len(primes) - 1):
            chosen = [ell for k, ell in enumerate(primes) if mask >> k & 1]
            if any(ell in primes_wanted for ell in chosen):
                out.append(_restricted(relation, chosen))
    return out


@dataclass(frozen=True, eq=False)
class Choice:
    """A proposed join: the condition (possibly coarser), its size as expected and as found, its score (small
    wins)."""

    relation: Relation
    expected: float
    size: float
    score: float

    @property
    def key(self) -> tuple[float, float, str, int]:
        """What choices are compared by."""
        return (self.score, self.size, self.relation.name, -self.relation.index)


Option = tuple[float, str, int, float, Relation]


def _options(outlook: Outlook, used: Collection[str], joint: Collection[int]) -> list[Option]:
    """(rough score, name, number of the variant, log of the common index, condition) for what may be joined.

    A condition that does not meet the state is an option at the `joint` primes only.
    """
    out: list[Option] = []
    for place, relation in enumerate(outlook.pool):
        if relation.name in used:
            continue
        meets = outlook.meets[place]
        wanted = {ell for ell, length in meets.items() if length}.union(joint)
        if wanted.isdisjoint(meets):
            continue
        for number, option in enumerate(_variants(relation, wanted)):
            if all(part.length == meets[part.prime] for part in option.parts):
                continue
            common = Outlook.log_order({ell: meets[ell] for ell in option.by_prime})
            growth = log(max(option.count, 1)) - common
            gain = log(option.index) - log(max(option.count, 1))
            out.append((growth - gain / 2, option.name, number, common, option))
    return sorted(out, key=lambda t: t[:3])


def choose(outlook: Outlook, size: float, used: Collection[str], width: int, exact: Relation | None = None,
           cap: float = inf, premium: float = PREMIUMS[0]) -> Choice | None:
    """The best next join, or None when nothing that interacts with the state fits below the cap.

    Arguments: the outlook of the state; its number of classes; names not to be used; how many options to look
    at closely; the state itself when exact sizes are wanted; the largest size allowed; the premium on new
    parts.  Ties are broken by size, name and index.
    """
    options = _options(outlook, used, ()) or _options(outlook, used, outlook.joint_primes(used))
    best: Choice | None = None
    looked_at = 0
    for _, _, _, common, option in options:
        expected = size * option.count * exp(-common)
        if expected > 3 * cap or looked_at == width:
            continue
        looked_at += 1
        found = expected if exact is None else float(match(exact, option).size)
        if found > cap:
            continue
        score = (log(found) if found > 0 else -inf) + outlook.after(option, used)
        score -= premium * (log(option.index) - common)
        if best is None or (score, found, option.name, -option.index) < best.key:
            best = Choice(option, expected, found, score)
    return best


def choose_start(pool: Sequence[Relation], cap: float = inf,
                 premium: float = PREMIUMS[0]) -> Relation | None:
    """The condition to begin with, by the same measure as `choose`; None if all of them exceed the cap."""
    best: tuple[float, str] | None = None
    chosen = None
    outlook = Outlook(pool, {})
    for relation in pool:
        if relation.count > cap:
            continue
        score = (log(relation.count) if relation.count else -inf) + outlook.after(relation, ())
        score -= premium * log(relation.index)
        if best is None or (score, relation.name) < best:
            best, chosen = (score, relation.name), relation
    return chosen
