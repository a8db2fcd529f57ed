"""Sieving in stages, the plan: from L to M L one character at a time, in an order found from counts alone.

In high rank sizes multiply until the common quotients outgrow the point counts, so the whole of L/M L must be
met, M growing by small primes.  Between M L and l M L lies a flag of subgroups, each the kernel of one more
character of order l.  A condition at v sees the next subgroup exactly if the character, modulo those before
it, is one of J(F_v); so the number of classes expected modulo any of these subgroups is known from the point
counts: [L : K] times the product of the densities.  Stages are found by a shortest-path search over the M,
the characters of a stage by a beam search over flags; both minimise the total number of classes met.
(Lifting modulus by modulus: Bruin and Stoll 2010; what is new is that a stage is split into characters.)
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from heapq import heappop, heappush
from math import exp, expm1, inf, log, log1p, prod

import numpy as np
from numpy.typing import NDArray

from sieve.engine.relation import Relation
from sieve.engine.stage_characters import StageCharacters

Exponents = tuple[int, ...]
FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

LARGEST_PRIME = 61
"""The modulus grows by primes up to this one (a set of residues modulo l is one machine word)."""

LARGEST_MODULUS = 1 << 29
"""M stays below this: coordinates of classes are 32-bit integers."""


@dataclass(frozen=True)
class Lift:
    """One step from a subgroup K to the kernel K' of a character of K of prime order.

    Fields: `prime` l and `level` a: at l, K lies between l^(a+1) L and l^a L; `character`, n residues modulo
    l: K' = {x in K : sum character_i x_i / l^a = 0 mod l}; `names`, the conditions that see more of K' than
    of K and are expected to exclude something, the strongest first; `log_index`, log [L : K']; `log_size`,
    log of the number of classes expected modulo K'; `last`, whether K' = M L for an integer M.
    """

    prime: int
    level: int
    character: tuple[int, ...]
    names: tuple[str, ...]
    log_index: float
    log_size: float
    last: bool


Ladder = tuple[Lift, ...]


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
        load = thrown(relation) * exp(-order)
        if load < 20:
            total += log(max(-expm1(-load), 1e-300))
    return max(total, log(max(known, 1)))


def thrown(relation: Relation) -> float:
    """The number of classes that, thrown at random, leave as many of the quotient empty as the condition."""
    if relation.count >= relation.index:
        return inf
    return -log1p(-relation.count / relation.index) * relation.index


def log_density(load: FloatArray) -> FloatArray:
    """log(1 - exp(-load)), 0 from a load of 25 on, at least log 1e-300."""
    with np.errstate(all="ignore"):
        value = np.log(np.maximum(-np.expm1(-load), 1e-300))
    return np.where(load > 25, 0.0, value)


def may_exclude(points: int, orders: Sequence[int], tops: Mapping[int, int], least: float = 0.02) -> bool:
    """Whether the prime v can be worth its local data, from #X(F_v) and the possible orders of J(F_v).

    The part of J(F_v) at the primes of `tops` must be so large that a share `least` of its classes, at least,
    is expected to be free of points.

    >>> may_exclude(100, [2**3 * 3 * 5 * 83], {2: 3, 3: 2, 5: 1}), may_exclude(100, [2 * 4999], {2: 3, 3: 2})
    (True, False)
    """
    for order in orders:
        part = 1
        for ell in tops:
            while order % ell == 0:
                order, part = order // ell, part * ell
        if -float(log_density(np.array(points / part))) > least:
            return True
    return False


@dataclass(frozen=True, eq=False)
class _Node:
    """A subgroup on the way: log sizes, total so far, log orders of the images in each group, the lifts."""

    log_index: float
    log_size: float
    log_total: float
    log_orders: FloatArray
    lifts: Ladder


@dataclass(frozen=True, eq=False)
class _Flag:
    """A node within a stage: the characters left for each prime, and the gain still hoped for, credited."""

    node: _Node
    left: dict[int, StageCharacters]
    credit: float


class Forecast:
    """Expected sizes for conditions given by counts, and the search for stages and flags.

    Arguments: conditions with distinct names over the same L = Z^n; the largest exponent for each prime up
    to `LARGEST_PRIME` (a prime beyond it is refused with ValueError).
    """

    def __init__(self, relations: Sequence[Relation], tops: Mapping[int, int]) -> None:
        if any(ell > LARGEST_PRIME for ell in tops):
            raise ValueError(f"the modulus grows by primes up to {LARGEST_PRIME} only")
        self.relations = [r for r in relations if 0 < r.count < r.index]
        self.n = relations[0].n if relations else 0
        self.primes = sorted(tops)
        self.tops = dict(tops)
        self.thrown = np.array([thrown(r) for r in self.relations], dtype=np.float64)
        self._starts: dict[tuple[int, int], StageCharacters] = {}

    def start(self) -> _Node:
        """L itself."""
        return _Node(0.0, float(log_density(self.thrown).sum()), -inf, np.zeros(len(self.relations)), ())

    def characters(self, ell: int, level: int) -> StageCharacters:
        """What the conditions see of the characters of order l of M L, for l^level exactly dividing M."""
        if (ell, level) not in self._starts:
            found: dict[int, list[tuple[int, list[tuple[int, ...]]]]] = {}
            for k, relation in enumerate(self.relations):
                part = relation.by_prime.get(ell)
                rows = [] if part is None else [
                    tuple(x % ell for x in row)
                    for row, e in zip(part.rows, part.exponents, strict=True) if e > level]
                if rows:
                    found.setdefault(len(rows), []).append((k, rows))
            spaces = {rank: (np.array([k for k, _ in some], dtype=np.int64),
                             np.array([rows for _, rows in some], dtype=np.int64))
                      for rank, some in found.items()}
            self._starts[ell, level] = StageCharacters.of(ell, tuple(range(self.n)), spaces)
        return self._starts[ell, level]

    def stage(self, node: _Node, primes: Sequence[int], exponents: Mapping[int, int], width: int = 5,
              least: float = 0.02) -> _Node:
        """From M L to M l L (or M l l' L): the flag with the least total that a beam search finds.

        Arguments: the node of M L; distinct primes; the exponents of M; how many flags are kept for each of
        three ways to compare them; a condition is named where it is expected to exclude this share at least.
        """
        left = {ell: self.characters(ell, exponents.get(ell, 0)) for ell in primes}
        # the search must not depend on the way to M, not even in the last digits
        begin = _Node(node.log_index, round(node.log_size, 9), -inf, np.round(node.log_orders, 9), ())
        worth = self._worth(begin, left)
        beam = [_Flag(begin, left, 0.0)]
        length = self.n * len(primes)
        for number in range(length):
            options: list[tuple[float, float, float, int, int, int]] = []
            for place, flag in enumerate(beam):
                options.extend(self._options(place, flag, worth))
            chosen: dict[tuple[float, float], tuple[float, float, float, int, int, int]] = {}
            for share in (0.0, 0.5, 1.0):
                # equal sizes and credits are the same flag in another order, nearly always
                ordered = sorted(options, key=lambda o: (o[0] - share * o[1] if share else o[2], o))
                fresh: dict[tuple[float, float], tuple[float, float, float, int, int, int]] = {}
                for option in ordered:
                    fresh.setdefault((round(option[0], 7), round(option[1], 7)), option)
                    if len(fresh) == width:
                        break
                chosen.update(fresh)
            last = number == length - 1
            beam = [self._take(beam[o[3]], o, exponents, last, least) for o in chosen.values()]
        end = min(beam, key=lambda f: f.node.log_total).node
        total = float(np.logaddexp(node.log_total, end.log_total))
        return replace(end, log_total=total, lifts=(*node.lifts, *end.lifts))

    def _worth(self, node: _Node, left: Mapping[int, StageCharacters]) -> FloatArray:
        """For each condition what it will exclude in the stage, for each unit of log order that it gains."""
        growth = np.zeros(len(self.relations))
        for ell, seen in left.items():
            for rank, (who, _) in seen.spaces.items():
                growth[who] += rank * log(ell)
        now = self.thrown * np.exp(-node.log_orders)
        gain = log_density(now) - log_density(now * np.exp(-growth))
        return np.where(growth > 0, gain / np.maximum(growth, 1e-9), 0.0)

    def _options(self, place: int, flag: _Flag, worth: FloatArray,
                 top: int = 8) -> list[tuple[float, float, float, int, int, int]]:
        """(log size, credit, log total, place in the beam, prime, line; -1: a line that nobody sees)."""
        node, out = flag.node, []
        load = self.thrown * np.exp(-node.log_orders)
        before = log_density(load)
        for ell, seen in sorted(flag.left.items()):
            if not seen.columns:
                continue
            if not len(seen.lines):
                size = node.log_size + log(ell)
                out.append((size, flag.credit, float(np.logaddexp(node.log_total, size)), place, ell, -1))
                continue
            gain = np.bincount(seen.line, (log_density(load / ell) - before)[seen.owner])
            hope = np.bincount(seen.line, worth[seen.owner]) * log(ell)
            for share in (0.0, 0.3, 1.0):
                for k in np.argsort(gain - share * hope, kind="stable")[:top].tolist():
                    size = float(node.log_size + log(ell) + gain[k])
                    total = float(np.logaddexp(node.log_total, size))
                    out.append((size, float(flag.credit + hope[k]), total, place, ell, k))
        return out

    def _take(self, flag: _Flag, option: tuple[float, float, float, int, int, int],
              exponents: Mapping[int, int], last: bool, least: float) -> _Flag:
        size, credit, total, _, ell, line = option
        node, seen = flag.node, flag.left[ell]
        short = seen.vector(line) if line >= 0 else seen.any_line()
        owners = np.unique(seen.owner[seen.line == line])
        orders = node.log_orders.copy()
        orders[owners] += log(ell)
        load = self.thrown[owners] * np.exp(-orders[owners])
        gain = log_density(load * ell) - log_density(load)
        names = [self.relations[int(owners[k])].name for k in np.argsort(-gain, kind="stable")
                 if gain[k] > least]
        character = [0] * self.n
        for column, value in zip(seen.columns, short, strict=True):
            character[column] = value
        index = node.log_index + log(ell)
        lift = Lift(ell, exponents.get(ell, 0), tuple(character), tuple(names), index, size, last)
        pivot = next(j for j, value in enumerate(short) if value)
        rest = seen.without(line) if line >= 0 else StageCharacters.of(
            ell, tuple(c for j, c in enumerate(seen.columns) if j != pivot), {})
        return _Flag(_Node(index, size, total, orders, (*node.lifts, lift)), {**flag.left, ell: rest}, credit)


def plan_ladder(relations: Sequence[Relation], tops: Mapping[int, int], least_index: float, *,
                rest: float = 1.0, width: int = 5, pairs: bool = True, limit: int = 400,
                report: Callable[[int, Ladder], None] | None = None) -> Ladder:
    """The lifts from L to M L with the least total number of classes expected on the way.

    Arguments: conditions with distinct names; for each prime its largest exponent in M; log of the index
    that M L must have at least; so many classes (besides those of points) may be expected in the end; the
    width of the beams; whether two primes may share a stage; so many M are looked at; `report` receives each
    M with its lifts.  Returns the cheapest ladder that meets both aims, or the one with the fewest classes
    among the largest enough if none was found, or the one with the largest index.
    Method: shortest paths over M; see the module.
    """
    forecast = Forecast(relations, tops)
    primes = forecast.primes
    heap: list[tuple[float, float, Exponents, int]] = [(0.0, 0.0, (0,) * len(primes), 0)]
    nodes = [forecast.start()]
    done: set[Exponents] = set()
    best: tuple[bool, float, Ladder] | None = None
    while heap and len(done) < limit:
        *_, here, number = heappop(heap)
        if here in done:
            continue
        done.add(here)
        node = nodes[number]
        modulus = dict(zip(primes, here, strict=True))
        if report is not None:
            report(prod(ell**e for ell, e in modulus.items()), node.lifts)
        reached = node.log_index >= least_index - 1e-9
        if reached and node.log_size <= (log(rest) if rest > 0 else -inf):
            return node.lifts
        merit = -node.log_size if reached else node.log_index
        if best is None or (reached, merit) > best[:2]:
            best = (reached, merit, node.lifts)
        groups: list[tuple[int, ...]] = [(ell,) for ell in primes]
        if pairs and node.log_index > 18:
            groups += [(a, b) for a in primes for b in primes if a < b <= 7]
        for group in groups:
            there = tuple(e + (ell in group) for ell, e in zip(primes, here, strict=True))
            if prod(ell**e for ell, e in zip(primes, there, strict=True)) >= LARGEST_MODULUS:
                continue
            if there in done or any(e > forecast.tops[ell] for ell, e in zip(primes, there, strict=True)):
                continue
            found = forecast.stage(node, group, modulus, width if len(group) == 1 else max(2, width // 2))
            nodes.append(found)
            # totals below one class are all the same: then the largest index comes first
            heappush(heap, (round(max(found.log_total, 0.0), 9), -round(found.log_index, 9), there,
                            len(nodes) - 1))
    return best[2] if best else ()


__all__ = ["LARGEST_MODULUS", "LARGEST_PRIME", "Forecast", "Ladder", "Lift", "expected_log_size",
           "log_density", "may_exclude", "plan_ladder", "thrown"]
