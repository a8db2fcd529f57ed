"""From candidate lists and an investigation to a verdict for every candidate."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass, field
from typing import Literal

from sieve.curves.divisors import Point
from sieve.engine.fates import Fate, decide
from sieve.engine.investigation import Investigation
from sieve.engine.plan import Outcome, Reporter, sieve_classes
from sieve.engine.recognise import matching_points, reconstruct
from sieve.engine.relation import Relation, relation_from_condition
from sieve.engine.survivors import Barrier, Survivor, barrier, short_vectors
from sieve.errors import BadReduction, Inconsistent, PrecisionLost, Uncertified
from sieve.local.chabauty import ChabautyPlace, LocatedCandidate
from sieve.local.condition import Condition
from sieve.local.zero_counts import ZeroProof, zero_proof

LARGEST_COUNTED = 100
"""Zeros are counted at primes up to this: the log then needs logarithms in every residue disc."""

VerdictKind = Literal["eliminated", "rational", "open"]


@dataclass
class CandidateList:
    """The candidates at one Chabauty prime; `complete`: every rational point in question is near one.

    `blocked`: when not empty, why points and discs of this list cannot be eliminated (in words); `claimed`:
    the user says that it is complete.  Once `proved_complete`, it needs no claim, but then only `at_most` and
    `proof` (what annihilating integrals prove) bound the number of rational points near a candidate.
    """

    place: ChabautyPlace
    candidates: list[LocatedCandidate]
    complete: bool
    source: str
    name: str
    blocked: str = ""
    claimed: bool = True
    proved_complete: bool = False
    proof: ZeroProof | None = None

    def __post_init__(self) -> None:
        self.claimed = self.complete

    def conditions(self, rank: int, orders: Sequence[int]) -> list[Condition]:
        """The labelled conditions of the candidates that are not blocked."""
        usable = [c for c in self.candidates if not self.blocked or c.kind == "coefficients"]
        whole = self.complete and len(usable) == len(self.candidates)
        return self.place.conditions(usable, rank, orders, whole)

    def covers(self, integral: bool) -> bool:
        """Whether every residue disc (with `integral` every affine one) is a candidate."""
        curve = self.place.group.curve
        discs = {c.disc for c in self.candidates if c.kind == "disc"}
        return discs.issuperset(range(curve.affine_count if integral else curve.count))

    def proved_bound(self, candidate: LocatedCandidate, points: Sequence[Point] = ()) -> int | None:
        """What is proved about the number of rational points near a candidate, `points` among them."""
        found = None if self.proof is None else self.proof.bound(candidate.id)
        if found is None:
            return None
        if found.central and candidate.disc is not None and len(points) == 1:
            x, _, z = points[0]
            if (z if self.place.integrals.discs[candidate.disc].chart == "x" else x) == 0:
                return 1
        return found.at_most

    def rests_on_claim(self, decisions: Sequence[Decision]) -> bool:
        """Whether the claim to be complete is needed: for that, or for rational points to be alone."""
        if not self.proved_complete:
            return self.claimed
        found = {d.id: d for d in decisions if d.prime == self.place.prime and d.sole}
        return self.claimed and any(
            len(found[c.id].points) not in (c.at_most, self.proved_bound(c, found[c.id].points))
            for c in self.candidates if c.id in found
        )


@dataclass(frozen=True)
class Decision:
    """The verdict on one candidate: "eliminated", "rational" or "open".

    `primes` responsible (residue characteristics, in order); `points`: the rational points it stands for;
    `given`: all of them are known points of the case; `sole`: no other rational point can hide there;
    `fate`: what the sieve found.
    """

    prime: int
    id: str
    verdict: VerdictKind
    reason: str
    primes: tuple[int, ...] = ()
    points: tuple[Point, ...] = ()
    given: bool = False
    sole: bool = False
    hint: str = ""
    fate: Fate | None = None


@dataclass
class Outlook:
    """The classes of L that survive all conditions, without candidates."""

    outcome: Outcome
    vectors: list[Survivor]
    barrier: Barrier | None
    empty: bool = field(default=False)


def prove_list(investigation: Investigation, listing: CandidateList) -> None:
    """Find out what can be proved about a list without the user's word: that it is complete, bounds.

    A list that names every residue disc is complete.  For a rank below the genus zeros of annihilating
    integrals are counted.  Raises `Inconsistent` when the logarithms contradict the rank.
    """
    problem, place = investigation.problem, listing.place
    listing.proved_complete = listing.covers(problem.integral)
    located = not listing.candidates or any(c.kind != "coefficients" for c in listing.candidates)
    countable = problem.rank < problem.curve.genus and 2 < place.prime <= LARGEST_COUNTED
    if countable and located and not listing.blocked:
        try:
            listing.proof = zero_proof(
                problem.curve, problem.base, investigation.generators[: problem.rank], place.prime,
                listing.candidates, place.group, problem.integral,
            )  # fmt: skip
        except (PrecisionLost, BadReduction, Uncertified):
            return
        listing.proved_complete |= listing.proof.complete
    listing.complete |= listing.proved_complete


def match_rational(
    investigation: Investigation,
    lists: Sequence[CandidateList],
    found: Sequence[Point] = (),
    missed: list[tuple[int, Point]] | None = None,
) -> dict[tuple[int, str], tuple[Point, ...]]:
    """The rational points behind the candidates, by (list number, id); integral ones if those are sought.

    Arguments: `found`, rational points that are not among the known ones; `missed` receives (list number,
    point) for those of them that a list misses although it claims to be complete.  Raises `Inconsistent`,
    naming the point, when it is a known one, or any without `missed`.
    """
    problem = investigation.problem
    points: dict[Point, object] = {}
    for point in filter(problem.asks_for, [*problem.known_points, *found]):
        points[point] = investigation.coordinates.get(point)
    matched: dict[tuple[int, str], tuple[Point, ...]] = {}
    for number, listing in enumerate(lists):
        covered: set[Point] = set()
        for candidate in listing.candidates:
            here = matching_points(listing.place, candidate, points, investigation.orders)  # type: ignore[arg-type]
            here = here or tuple(filter(problem.asks_for, reconstruct(listing.place, candidate)))
            if here:
                matched[number, candidate.id] = here
                covered |= set(here)
        if listing.complete:
            unlocated = any(c.kind == "coefficients" for c in listing.candidates)
            for point in points:
                if point in covered or (unlocated and investigation.coordinates.get(point) is None):
                    continue
                doubtful = missed is not None and point not in problem.known_points
                if missed is not None and doubtful and not listing.proved_complete:
                    missed.append((number, point))
                    continue
                shown = problem.curve.format_point(point)
                what = f"no candidate is near the rational point {shown}"
                claim = "the list claims to be complete"
                if not listing.claimed:
                    claim = "counting zeros proves the list complete, given the rank"
                raise Inconsistent(
                    f"{claim}, but {what}",
                    shown,
                    "a candidate near every rational point",
                    listing.name,
                )
    return matched


def candidate_relations(
    investigation: Investigation, lists: Sequence[CandidateList], ells: Sequence[int]
) -> tuple[list[Relation], dict[str, int]]:
    """The labelled relations of all lists, and for the name of each the number of its list."""
    labelled: list[Relation] = []
    lists_of: dict[str, int] = {}
    for number, listing in enumerate(lists):
        for condition in listing.conditions(investigation.problem.rank, investigation.orders):
            relation = relation_from_condition(condition, ells)
            labelled.append(relation)
            lists_of[condition.name] = number
    return labelled, lists_of


def prime_of(name: str) -> int:
    """The residue characteristic in a condition's name ("v = 59", "p = 7, part 2")."""
    return int(name.split("=")[1].split(",")[0])


def decide_candidates(
    investigation: Investigation,
    lists: Sequence[CandidateList],
    matched: dict[tuple[int, str], tuple[Point, ...]],
    ells: Sequence[int],
    bound: int | None,
    primes: Collection[int] | None = None,
    report: Reporter | None = None,
) -> dict[tuple[int, str], Decision]:
    """A decision for every candidate, by (list number, id).

    Auxiliary primes: those below `bound` (among `primes`).
    """
    labelled, lists_of = candidate_relations(investigation, lists, ells)
    rational = [
        (relation.name, label)
        for relation in labelled
        for label in {*relation.labels, *relation.outside}
        if (lists_of[relation.name], label) in matched
    ]
    auxiliary = investigation.relations(ells, bound, primes)
    out: dict[tuple[int, str], Decision] = {}
    known = set(investigation.problem.known_points)
    for number, listing in enumerate(lists):
        for candidate in listing.candidates:
            points = matched.get((number, candidate.id))
            disc = candidate.disc
            if investigation.problem.integral and disc is not None and listing.place.at_infinity(disc):
                reason = "not integral: it lies in a residue disc at infinity"
                out[number, candidate.id] = Decision(listing.place.prime, candidate.id, "eliminated", reason)
            elif points:
                out[number, candidate.id] = _rational(listing, candidate, points, known)
            elif listing.blocked and candidate.kind != "coefficients":
                out[number, candidate.id] = Decision(
                    listing.place.prime, candidate.id, "open", listing.blocked, hint="another Chabauty prime"
                )
    for fate in decide(labelled, auxiliary, rational, report=report):
        number = lists_of[fate.condition]
        if (number, fate.label) not in out:
            out[number, fate.label] = from_fate(lists[number].place.prime, fate)
    return out


def _rational(
    listing: CandidateList, candidate: LocatedCandidate, points: tuple[Point, ...], known: set[Point]
) -> Decision:
    curve = listing.place.curve
    notes = []
    if len(points) > 1:
        notes.append(
            "it cannot be told apart from "
            + ", ".join(curve.format_point(p) for p in points[1:])
            + " at its precision"
        )
    if candidate.multiplicity > 1:
        notes.append(f"multiplicity {candidate.multiplicity}: the disc may hide a second rational point")
    if candidate.kind == "disc" and candidate.at_most != 1:
        notes.append("a whole residue disc without the bound at_most = 1 may hold other rational points")
    if candidate.kind == "coefficients":
        notes.append("other rational points may have coefficients that agree to the digits given")
    if not listing.claimed and not notes:
        # the multiplicity of a point is part of the claim to be complete, and a premise with it
        notes.append("nothing bounds the number of rational points that agree with it")
    bounds = (candidate.at_most, listing.proved_bound(candidate, points))
    sole = not notes or (candidate.kind != "coefficients" and len(points) in bounds)
    return Decision(
        listing.place.prime,
        candidate.id,
        "rational",
        "; ".join(notes),
        points=points,
        given=all(p in known for p in points),
        sole=sole,
    )


def from_fate(p: int, fate: Fate) -> Decision:
    """The decision that a fate means for a candidate at the Chabauty prime p."""
    primes = tuple(dict.fromkeys(prime_of(name) for name in fate.conditions))
    moduli = [f"{prime_of(name)}{'^2' * name.startswith('deep')}" for name in fate.conditions]
    if fate.kind == "image":
        reason = f"its class modulo {p} and its {p}-adic integrals are not in the image of J(Q)"
        return Decision(p, fate.label, "eliminated", reason, (), fate=fate)
    if fate.kind == "single":
        reason = f"no point of X modulo {moduli[0]} has a class compatible with it"
        return Decision(p, fate.label, "eliminated", reason, primes, fate=fate)
    if fate.kind == "several":
        reason = "no class of the group is compatible with it and with the points modulo " + ", ".join(moduli)
        return Decision(p, fate.label, "eliminated", reason, primes, fate=fate)
    hint = "add auxiliary primes (a larger --bound)"
    if fate.kind == "shared":
        parts = " * ".join(f"{ell}^{e}" for ell, e in fate.exponents)
        reason = (
            "in the part of the group that the auxiliary primes see (exponent "
            + parts
            + ") it has the same class as "
            "the rational candidate" + ("s " if len(fate.same_as) > 1 else " ") + ", ".join(fate.same_as)
        )
        hint = f"auxiliary primes whose group has a higher power of {p}, or candidates with more digits"
    elif fate.kind == "unseen":
        reason = "no auxiliary prime sees any part of its group"
    elif fate.exhausted:
        reason = f"{fate.classes} classes modulo a subgroup of index {fate.index} satisfy every condition"
    else:
        left = f"{fate.classes} classes modulo a subgroup of index {fate.index}"
        reason = f"a size limit stopped the sieve with {left}"
        hint = "fewer, better auxiliary primes (--primes)"
    return Decision(p, fate.label, "open", reason, primes, hint=hint, fate=fate)


def surviving_classes(
    investigation: Investigation,
    ells: Sequence[int],
    bound: int | None,
    primes: Collection[int] | None = None,
    report: Reporter | None = None,
) -> Outlook:
    """The classes of L that satisfy the auxiliary conditions below `bound` (among `primes`), and the barrier.

    Raises `Inconsistent` when a known point is excluded.
    """
    relations = investigation.relations(ells, bound, primes)
    outcome = sieve_classes(relations, report=report)
    relation = outcome.relation
    known = [c.vector for c in investigation.sought.values() if c.denominator == 1]
    outside = [c for c in investigation.sought.values() if c.denominator > 1]
    vectors = short_vectors(relation, investigation.orders) if relation.count <= 5000 else []
    found: Barrier | None = None
    if relation.count and relation.count <= 5000 and not outside:
        found = barrier(relation, known, investigation.orders)
    return Outlook(outcome, vectors, found, relation.count == 0)
