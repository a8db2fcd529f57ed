"""Certified Picard groups of curves over prime fields, from sections of a linear system.

Pic(X/F_v) modulo the class of one rational point P0 is Pic^0 = J(F_v): the class of D stands for D - deg(D)
P0. Factor base = some rational points; every section whose zeros are known is a relation.  Sections with
one unknown zero define it as a short combination of the base; the others close the lattice.

The group is proved complete by two facts.  Generation: if N_e = #X(F_{v^e}) > (2g-2) v^{e/2}, the places of
degree dividing e generate Pic^0 (a nontrivial character constant on them would have a character sum N_e,
but its L-polynomial has degree 2g-2 and inverse roots of size sqrt v; Weil 1948).  So do all but k of these
N_e points if N_e - 2 k is larger than that, too.  Index: the relations
found span a lattice whose index is a multiple of #J(F_v), and it is below twice a lower bound for #J(F_v),
or equal to the exact order.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from math import isqrt

import flint
import numpy as np
from numpy.typing import NDArray

from sieve.curves.local_divisors import place_degree
from sieve.curves.protocol import HigherPlace, LocalDivisorLike, ReducedCurve
from sieve.errors import InternalError, Uncertified
from sieve.exact.abelian import FiniteQuotient, quotient_by
from sieve.local.exact_sections import close_lattice
from sieve.local.order_bounds import exact_order, order_lower_bound
from sieve.local.peeling import combinations, peel

IntArray = NDArray[np.int64]

SMALL_INVARIANT = 2**55
"""Classes modulo numbers up to this are held in int64, modulo larger ones as Python integers."""


@dataclass
class PicardGroup:
    """J(F_v) with the classes of all rational points.

    `invariants`: invariant factors > 1, each dividing the next.  `point_logs`: int64 (large groups: object),
    shape (N, len(invariants)), the class of P - P0 for every point in the curve's numbering.  `unit_log`: the
    class of U (the fibre or section class). `reason` says how completeness was proved; `rational_generation`,
    whether rational points alone are known to generate; `distinct_points`, whether sections through distinct
    points sufficed.
    """

    curve: ReducedCurve
    invariants: tuple[int, ...]
    order: int
    point_logs: IntArray
    unit_log: tuple[int, ...]
    reason: str
    higher_logs: dict[HigherPlace, tuple[int, ...]] = field(default_factory=dict)
    sections_used: int = 0
    rational_generation: bool = True
    distinct_points: bool = False

    @property
    def prime(self) -> int:
        """The residue characteristic v."""
        return self.curve.prime

    def add(self, total: list[int], multiplicity: int, log: tuple[int, ...] | IntArray) -> None:
        """total += multiplicity * log, in place, reduced."""
        for i, d in enumerate(self.invariants):
            total[i] = (total[i] + multiplicity * int(log[i])) % d

    def log(self, divisor: LocalDivisorLike) -> tuple[int, ...]:
        """The class of D - deg(D) P0 for an effective divisor over F_v.

        Places of higher degree are replaced through sections; raises `Uncertified` if none is found.
        """
        total = [0] * len(self.invariants)
        self.add(total, divisor.units, self.unit_log)
        for index, multiplicity in divisor.points:
            self.add(total, multiplicity, self.point_logs[index])
        for place, multiplicity in divisor.places:
            self.add(total, multiplicity, self._higher(place, 0))
        return tuple(total)

    def _higher(self, place: HigherPlace, depth: int) -> tuple[int, ...]:
        known = self.higher_logs.get(place)
        if known is not None:
            return known
        partner = self.curve.higher_partner(place)
        other = self.higher_logs.get(partner)
        total = [0] * len(self.invariants)
        if other is not None:
            self.add(total, place_degree(place), self.unit_log)
            self.add(total, -1, other)
        else:
            divisor = self._rational_relation(place, depth)
            self.add(total, divisor.units, self.unit_log)
            for index, multiplicity in divisor.points:
                self.add(total, -multiplicity, self.point_logs[index])
            for rest, multiplicity in divisor.places:
                if rest != place:
                    self.add(total, -multiplicity, self._higher(rest, depth + 1))
        self.higher_logs[place] = tuple(total)
        return tuple(total)

    def _rational_relation(self, place: HigherPlace, depth: int) -> LocalDivisorLike:
        seed = [c for k, part in enumerate(place) for c in ((7, *part) if k else part)]
        rng = np.random.default_rng([self.prime, *seed])
        for _ in range(4000):
            found = self.curve.substitute(place, rng)
            if found is None:
                break
            _, divisor = found
            if divisor is None or dict(divisor.places).get(place) != 1:
                continue
            rest = [p for p, _ in divisor.places if p != place]
            lower = all(p in self.higher_logs or place_degree(p) < place_degree(place) for p in rest)
            if not rest or (depth < 20 and place_degree(place) > self.curve.genus + 1 and lower):
                return divisor
            if all(p in self.higher_logs or self.curve.higher_partner(p) in self.higher_logs for p in rest):
                return divisor
        raise Uncertified(
            self.prime, "no section through a generator's closed point has rational remaining zeros"
        )


def picard_group(curve: ReducedCurve) -> PicardGroup:
    """The certified group J(F_v) and the logarithms of all its rational points.

    Raises `Uncertified` (with the reason) when completeness cannot be proved, in particular when there is no
    rational point.  Deterministic: random choices are seeded by v.
    """
    if curve.count == 0:
        raise Uncertified(curve.prime, "no points modulo v")
    v, g = curve.prime, curve.genus
    generated = curve.count**2 > (2 * g - 2) ** 2 * v
    if generated and curve.plentiful:
        sections = curve.split_sections()
        group = _from_point_sections(curve) if sections is None else _from_all_sections(curve, sections)
        if group is not None:
            return group
    return _from_exact_sections(curve, generated)


# ---- large v: vectorised sections through distinct points ------------------------------------------


class _Definitions:
    """What is known of every orbit: combinations of the base, and definitions to be evaluated later."""

    def __init__(self, curve: ReducedCurve, base: IntArray) -> None:
        self.curve = curve
        self.base = base
        self.width = 1 + len(base)
        self.known = np.zeros(curve.orbit_count, dtype=bool)
        self.combination = np.zeros((curve.orbit_count, self.width), dtype=np.int64)
        self.short = np.zeros(curve.orbit_count, dtype=bool)
        for column, orbit in enumerate(base.tolist(), start=1):
            self.combination[orbit, column] = 1
        self.known[base] = True
        self.short[base] = True
        # rounds of (orbit, sign, unit coefficient, other orbits, their signs), for the logarithms
        self.rounds: list[tuple[IntArray, IntArray, IntArray, IntArray, IntArray]] = []

    def lengthen(self) -> None:
        """Write every known orbit as a combination of the base, the later rounds (longer ones) too."""
        for target, own_sign, units, others, signs in self.rounds:
            combination = np.zeros((len(target), self.width), dtype=np.int64)
            combination[:, 0] = units
            for k in range(others.shape[1]):
                combination -= signs[:, k, None] * self.combination[others[:, k]]
            self.combination[target] = own_sign[:, None] * combination
        self.short = self.known.copy()

    def enlarge(self) -> bool:
        """Add an orbit that nothing reaches to the base: the base generates a proper subgroup."""
        missing = np.flatnonzero(~self.known)
        if not len(missing):
            return False
        self.base = np.append(self.base, missing[0])
        self.width += 1
        self.combination = np.pad(self.combination, ((0, 0), (0, 1)))
        self.combination[missing[0], -1] = 1
        self.known[missing[0]] = self.short[missing[0]] = True
        return True


def _from_point_sections(curve: ReducedCurve) -> PicardGroup | None:
    v, g = curve.prime, curve.genus
    rng = np.random.default_rng([v, g])
    permutation = rng.permutation(curve.orbit_count)
    # ramified points and those that `usable` never draws would hardly meet any relation
    unfit = set(curve.ramified.tolist()) | set(curve.orbit[curve.drawn_count :].tolist())
    size = min(curve.orbit_count, curve.base_size)
    through = curve.points_per_section
    base = np.array([o for o in permutation.tolist() if o not in unfit][:size], dtype=np.int64)
    if len(base) < through:
        return None
    state = _Definitions(curve, base)
    lower = order_lower_bound(v, g, curve.count)
    closing: list[IntArray] = []
    group: FiniteQuotient | None = None
    sections = 0
    for attempt in range(40):
        # closing relations need short combinations throughout; unknown points need many known ones
        wanted = state.short if state.known.all() or attempt % 2 == 0 else state.known
        pool = np.flatnonzero(wanted[curve.orbit][: curve.drawn_count])
        choice = pool[rng.integers(0, len(pool), (curve.batch_size, through))]
        choice = choice[curve.usable(choice)]
        rest = curve.residuals(choice)
        split = rest[:, 0] >= 0
        divisors = np.concatenate([choice[split], rest[split]], axis=1)
        sections += len(divisors)
        rounds = len(state.rounds)
        closing.extend(_use(curve, state, divisors, through))
        if group is None:
            group = _close(curve, state, closing, lower)
        if group is None and state.known.all() and attempt >= 4:
            state.lengthen()
        stalled = attempt > 3 and len(state.rounds) == rounds and not state.known.all()
        if stalled or (group is not None and group.order < lower):
            if not state.enlarge():
                raise InternalError(f"v = {v}: index {group and group.order} below the Weil bound {lower}")
            closing = [np.append(row, 0) for row in closing]
            group = None
        if group is not None and state.known.all():
            break
    if group is None or not state.known.all():
        return None
    return _finish(curve, state, group, sections)


def _use(curve: ReducedCurve, state: _Definitions, divisors: IntArray, chosen: int) -> list[IntArray]:
    """Define unknown orbits from sections with one unknown zero; return closing relations of short ones."""
    orbit, sign, fibre = curve.orbit[divisors], curve.sign[divisors], curve.fibre[divisors]
    unknown = ~state.known[orbit]
    missing = unknown.sum(axis=1)
    units = curve.section_units - fibre.sum(axis=1)
    single = np.flatnonzero(missing == 1)
    if len(single):
        column = unknown[single].argmax(axis=1)
        target = orbit[single, column]
        order = np.lexsort((np.where(state.short[orbit[single]].sum(axis=1) >= chosen, 0, 1), target))
        firsts = order[np.unique(target[order], return_index=True)[1]]
        rows, column, target = single[firsts], column[firsts], target[firsts]
        others = np.ones((len(rows), divisors.shape[1]), dtype=bool)
        others[np.arange(len(rows)), column] = False
        other_orbit = orbit[rows][others].reshape(len(rows), -1)
        other_sign = sign[rows][others].reshape(len(rows), -1)
        own_sign = sign[rows, column]
        state.rounds.append((target, own_sign, units[rows], other_orbit, other_sign))
        short = state.short[other_orbit].all(axis=1)
        if short.any() and len(state.rounds) <= 2:
            s = np.flatnonzero(short)
            combination = np.zeros((len(s), state.width), dtype=np.int64)
            combination[:, 0] = units[rows[s]]
            for k in range(other_orbit.shape[1]):
                combination -= other_sign[s, k, None] * state.combination[other_orbit[s, k]]
            state.combination[target[s]] = own_sign[s, None] * combination
            if len(state.rounds) == 1:
                state.short[target[s]] = True
        state.known[target] = True
    usable = np.flatnonzero((missing <= 1) & state.short[orbit].all(axis=1))
    if not len(usable):
        return []
    relation = np.zeros((len(usable), state.width), dtype=np.int64)
    relation[:, 0] = -units[usable]
    for k in range(divisors.shape[1]):
        relation += sign[usable, k, None] * state.combination[orbit[usable, k]]
    relation = relation[relation.any(axis=1)]
    return list(relation)


def _close(
    curve: ReducedCurve, state: _Definitions, closing: list[IntArray], lower: int
) -> FiniteQuotient | None:
    """Pic / <P0> from the closing relations, or None while their index is not yet certainly #J(F_v)."""
    n = state.width - 1
    rows = sorted((tuple(row.tolist()) for row in closing), key=lambda r: (sum(map(abs, r)), r))
    rows = list(dict.fromkeys(rows))
    for orbit in curve.ramified.tolist():
        if state.short[orbit]:
            row = [2 * int(c) for c in state.combination[orbit]]
            row[0] -= 1
            rows.insert(0, tuple(row))
    # P0 is the first base point: its column is dropped
    reduced = [row[:1] + row[2:] for row in rows]
    for take in (n + 6, n + 16, n + 40, len(reduced)):
        if len(reduced) < n + 3:
            return None
        quotient = quotient_by(n, reduced[: min(take, len(reduced))])
        if quotient is not None and quotient.order < 2 * lower:
            return quotient
        if take >= len(reduced):
            break
    return None


def _finish(curve: ReducedCurve, state: _Definitions, group: FiniteQuotient, sections: int) -> PicardGroup:
    invariants = group.invariants
    # sums of as many classes as a section has zeros must fit
    large = bool(invariants) and invariants[-1] > SMALL_INVARIANT
    kind = object if large else np.int64
    moduli = np.array(invariants, dtype=kind)
    logs = np.zeros((curve.orbit_count, len(invariants)), dtype=kind)
    # columns: U, then the base without its first point, which is P0
    unit = group.coordinates[0]
    for k, orbit in enumerate(state.base.tolist()[1:], start=1):
        logs[orbit] = group.coordinates[k]
    unit_row = np.array(unit, dtype=kind)
    for target, own_sign, units, others, signs in state.rounds:
        value = units[:, None] * unit_row
        for k in range(others.shape[1]):
            value = value - signs[:, k, None] * logs[others[:, k]]
        logs[target] = (own_sign[:, None] * value) % moduli
    point_logs = (curve.sign[:, None] * logs[curve.orbit] + curve.fibre[:, None] * unit_row) % moduli
    return PicardGroup(
        curve,
        invariants,
        group.order,
        point_logs,
        unit,
        "rational points generate (N > (2g-2) sqrt v); index below twice the Weil bound",
        sections_used=sections,
        distinct_points=True,
    )


def _from_all_sections(curve: ReducedCurve, sections: IntArray) -> PicardGroup | None:
    """The group from listed sections with rational zeros alone, where every point is its own orbit."""
    lower = order_lower_bound(curve.prime, curve.genus, curve.count)
    plan = peel(sections, curve.count)
    # the first base point is P0, whose class is 0
    columns = {point: k for k, point in enumerate(plan.base[1:], start=1)}
    width = len(plan.base)
    points = combinations(sections, plan, columns, width, curve.section_units)
    rows = [points[sections[k]].sum(axis=0) for k in plan.rest[: 3 * width + 40]]
    for row in rows:
        row[0] -= curve.section_units
    distinct = sorted({tuple(int(c) for c in row) for row in rows if row.any()})
    closing = sorted(distinct, key=lambda row: sum(map(abs, row)))
    if len(closing) < width or _rank(closing) < width:
        return None  # some point is on too few lines
    for take in (width + 6, width + 30, len(closing)):
        group = quotient_by(width, closing[: min(take, len(closing))])
        if group is None or group.order >= 2 * lower:
            continue
        if group.order < lower:
            raise InternalError(f"v = {curve.prime}: index {group.order} below the Weil bound {lower}")
        kind = object if group.invariants and group.invariants[-1] > SMALL_INVARIANT else np.int64
        logs = [group.reduce([int(c) for c in row]) for row in points]
        return PicardGroup(
            curve,
            group.invariants,
            group.order,
            np.array(logs, dtype=kind).reshape(curve.count, len(group.invariants)),
            group.coordinates[0],
            "rational points generate (N > (2g-2) sqrt v); index below twice the Weil bound",
            sections_used=len(sections),
            distinct_points=True,
        )
    return None


def _rank(rows: Sequence[Sequence[int]]) -> int:
    """The rank modulo a large prime: at most that of the rows."""
    p = 2**61 - 1
    return int(flint.nmod_mat(len(rows), len(rows[0]), [c % p for row in rows for c in row], p).rank())


# ---- small v: exact divisors of sections, contact orders and places of higher degree ----------------


def _from_exact_sections(curve: ReducedCurve, generated: bool) -> PicardGroup:
    v, g = curve.prime, curve.genus
    if not curve.section_limit:
        raise Uncertified(v, "too few sections with rational zeros alone to find all relations")
    counts = [curve.count]
    higher_degree, spare = 1, 0
    reason = "rational points generate (N > (2g-2) sqrt v)"
    if not generated:
        for degree in (2, 3):
            if v**degree > 2500:
                break
            count = curve.extension_count(degree)
            if count * count > (2 * g - 2) ** 2 * v**degree:
                higher_degree = degree
                reason = f"places of degree dividing {degree} generate (N_{degree} > (2g-2) v^({degree}/2))"
                # 2 k < N_e - (2g-2) v^(e/2), a place or a pair of conjugate ones being e or 2 e points
                rest = count - isqrt((2 * g - 2) ** 2 * v**degree) - 1
                spare = max(0, rest - 1) // (2 * degree * (2 if curve.involution else 1))
                break
        else:
            raise Uncertified(v, "places of degree at most 3 are not known to generate J(F_v)")
        if higher_degree == 1:
            raise Uncertified(v, f"too few points ({curve.count}) to know that they generate J(F_v)")
    lower, exact = order_lower_bound(v, g, curve.count), False
    if order_upper_exceeds(v, g, curve.count, 2 * lower):
        if v**g > curve.extension_limit:
            raise Uncertified(
                v, "the Weil bound is not sharp enough and the extension fields are too large to count"
            )
        counts += [curve.extension_count(e) for e in range(2, g + 1)]
        lower, exact = exact_order(curve, counts), True
    places = curve.places_of_degree(higher_degree) if higher_degree > 1 else []
    closed = close_lattice(curve, places, lower, exact, curve.section_limit, spare)
    if closed is None:
        raise Uncertified(v, "sections of low degree do not close the relation lattice")
    moduli = np.array(closed.invariants, dtype=np.int64)
    orbit_logs = np.array([closed.logs[i] for i in range(curve.orbit_count)], dtype=np.int64)
    orbit_logs = orbit_logs.reshape(curve.orbit_count, len(moduli))
    unit = np.array(closed.unit, dtype=np.int64)
    point_logs = (curve.sign[:, None] * orbit_logs[curve.orbit] + curve.fibre[:, None] * unit) % moduli
    how = "index equals the order from point counts" if exact else "index below twice the Weil bound"
    return PicardGroup(
        curve,
        closed.invariants,
        closed.order,
        point_logs,
        closed.unit,
        f"{reason}; {how}",
        {key: log for key, log in closed.logs.items() if not isinstance(key, int)},
        closed.sections,
        generated,
    )


def order_upper_exceeds(v: int, genus: int, points: int, bound: int) -> bool:
    """Can #J(F_v) reach `bound`?  By prod (v + 1 - x_i) <= ((v + 1) - mean x)^g."""
    total = genus * (v + 1) - (v + 1 - points)
    return total**genus >= bound * genus**genus
