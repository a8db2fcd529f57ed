"""`sieve advise`: which auxiliary primes, or which Chabauty primes, are worth the work."""

from __future__ import annotations

from collections.abc import Sequence
from concurrent.futures import Executor
from dataclasses import dataclass, field
from math import log

from sieve.commands.common import Progress, StoredInvestigation, problem_of
from sieve.commands.pursue import make_hunts
from sieve.commands.run import chabauty_place, locate
from sieve.engine.advice import Advice, Offer, advise
from sieve.engine.fates import visible_view
from sieve.engine.investigation import FIRST_BOUND, Investigation
from sieve.engine.plan import sieve_classes
from sieve.engine.prime_hunt import Hunt, ranked
from sieve.engine.relation import Relation, relation_from_condition
from sieve.engine.verdicts import CandidateList, decide_candidates, match_rational
from sieve.errors import InputError, PrecisionLost, SieveError
from sieve.exact.primes import primes_below
from sieve.files.candidates import check_candidates, load_candidates
from sieve.files.resolve import read_case
from sieve.files.store import Store
from sieve.local.chabauty import ChabautyPlace, LocatedCandidate

DEFAULT_BOUND = 1000

ALL_BELOW = 1500
"""Below this every prime is tried (genus 2); above, those whose order promises something."""

MOST_DIGITS = 6
"""Precisions up to this are compared for Chabauty primes."""


@dataclass(frozen=True)
class ChabautyAdvice:
    """A Chabauty prime: J(F_p), the digits worth computing, the expected number of classes for a candidate
    elsewhere, and in words."""

    prime: int
    structure: tuple[int, ...]
    precision: int
    expected: float
    reason: str


@dataclass
class Advised:
    """What `sieve advise` found: `start` classes (or open candidates) it began with."""

    name: str
    start: str
    advice: list[Advice] = field(default_factory=list)
    chabauty: list[ChabautyAdvice] = field(default_factory=list)


def local_seconds(genus: int, v: int) -> float:
    """What the local data at v cost, roughly, in seconds (measured on one core)."""
    return 0.004 + 6e-6 * v if genus == 2 else 0.01 + 6e-5 * v


def execute(case_path: str, candidate_paths: Sequence[str], *, bound: int | None = None, top: int = 10,
            chabauty_bound: int | None = None, store: Store | None = None, executor: Executor | None = None,
            progress: Progress | None = None) -> Advised:
    """Everything `sieve advise` computes.

    The state it starts from: the primes below `FIRST_BOUND` that every run begins with; with candidates, what
    they leave of those not decided; without (or when all are decided) the classes of the whole sieve.
    """
    resolved = read_case(case_path)
    investigation = Investigation(problem_of(resolved), executor, progress)
    stored = StoredInvestigation(investigation, store)
    investigation.establish(stored.gather)
    lists = []
    for path in candidate_paths:
        file = load_candidates(path)
        check_candidates(file, resolved.curve, resolved.case.rank, investigation.orders)
        place = chabauty_place(investigation, file.prime, file.precision, file.path)
        lists.append(CandidateList(place, locate(place, file), file.complete, file.source, file.path))
    ells = investigation.allowed_ells([listing.place.prime for listing in lists])
    limit = bound or DEFAULT_BOUND
    hunts: list[Hunt] = []
    if lists:
        matched = match_rational(investigation, lists)
        decisions = decide_candidates(investigation, lists, matched, ells, FIRST_BOUND)
        hunts = [hunt for _, hunt in make_hunts(investigation, lists, decisions, ells, FIRST_BOUND)
                 if hunt.open]
    if hunts:
        states = [trail.relation for hunt in hunts for trail in hunt.trails]
        labels = sum(len(hunt.open) for hunt in hunts)
        start = f"{labels} open candidates, primes below {FIRST_BOUND} used"
    else:
        outcome = sieve_classes(investigation.relations(ells, FIRST_BOUND))
        states = [outcome.relation]
        start = (f"{outcome.relation.count} classes of {outcome.relation.index}, primes below {FIRST_BOUND} "
                 "used")
    out = Advised(resolved.case.name, start)
    offers = _offers(stored, hunts, limit)
    known = [c.vector for c in investigation.coordinates.values() if c.denominator == 1]
    out.advice = advise(states, offers, top, known)
    if chabauty_bound is not None:
        out.chabauty = chabauty_advice(investigation, chabauty_bound, top)
    return out


def _offers(stored: StoredInvestigation, hunts: Sequence[Hunt], limit: int) -> list[Offer]:
    investigation = stored.investigation
    genus = investigation.problem.curve.genus
    wanted = [v for v in primes_below(min(limit, ALL_BELOW)) if v >= FIRST_BOUND]
    if limit > ALL_BELOW and genus == 2 and hunts:
        beyond = [v for v in primes_below(limit) if v >= ALL_BELOW]
        orders = stored.quick_orders(beyond)
        promising = ranked(hunts, {v: (q.points, q.orders) for v, q in orders.items()})
        wanted += sorted(p.prime for p in promising[:200])
    stored.gather(wanted)
    ells = investigation.allowed_ells([hunt.prime for hunt in hunts])
    out = []
    for v in wanted:
        record = investigation.records[v]
        if investigation.serves(record):
            relation = relation_from_condition(record.condition(investigation.images(record)), ells)
            out.append(Offer(v, relation, record.invariants, local_seconds(genus, v)))
    return out


def chabauty_advice(investigation: Investigation, bound: int, top: int) -> list[ChabautyAdvice]:
    """Chabauty primes up to the bound, those first at which the sieve tells most about a candidate.

    For every good p the part of J(Q_p) that the auxiliary primes gathered see, by number of digits; the
    expected number of classes is that of the whole sieve over the order of this part.
    """
    problem = investigation.problem
    out = []
    for p in primes_below(bound + 1):
        if not problem.curve.is_smooth(p):
            continue
        ells = investigation.allowed_ells([p])
        pool = investigation.relations(ells, None)
        try:
            place = ChabautyPlace(problem.curve, p, MOST_DIGITS)
            place.attach(problem.base, investigation.generators)
            views = [_view(investigation, place, digits, ells, pool) for digits in range(1, MOST_DIGITS + 1)]
        except (SieveError, PrecisionLost):
            continue
        orders = [1 if view is None else view.index for view in views]
        useful = orders.index(max(orders)) + 1
        state = sieve_classes([r for r in pool if r.name != f"v = {p}"]).relation
        expected = state.count / max(orders)
        used = "is used" if p in ells else f"is not used (no proof that {p} does not divide the index)"
        digits = f"{useful} digit{'s' if useful > 1 else ''}"
        reason = (f"the auxiliary primes see a quotient of order {max(orders)} of the group at {p}, reached "
                  f"with {digits}; its {p}-part {used}")
        structure = place.group.invariants
        out.append(ChabautyAdvice(p, structure, useful, expected, reason))
    return sorted(out, key=lambda a: (log(a.expected) if a.expected else -99.0, a.prime))[:top]


def _view(investigation: Investigation, place: ChabautyPlace, digits: int, ells: Sequence[int],
          pool: Sequence[Relation]) -> Relation | None:
    """What the pool sees of the group at p for candidates with that many digits."""
    candidates = [LocatedCandidate("0", "point", 0, 0, digits)]
    conditions = place.conditions(candidates, investigation.problem.rank, investigation.orders, False)
    if not conditions:
        return None
    return visible_view(relation_from_condition(conditions[0], ells), pool)


def document(done: Advised) -> dict[str, object]:
    """The JSON document of `sieve advise`."""
    out: dict[str, object] = {
        "advice": [{"prime": a.prime, "structure": [str(d) for d in a.structure],
                    "predicted_survivors": a.left, "estimated_survivors": float(f"{a.estimated:.4g}"),
                    "predicted_seconds": float(f"{a.seconds:.3g}"), "decides": list(a.labels),
                    "reason": a.reason} for a in done.advice],
        "start": done.start,
    }
    if done.chabauty:
        out["chabauty"] = [{"prime": a.prime, "structure": [str(d) for d in a.structure],
                            "precision": a.precision, "predicted_survivors": float(f"{a.expected:.4g}"),
                            "reason": a.reason} for a in done.chabauty]
    return out


def text(done: Advised) -> str:
    """The printed answer."""
    lines = [f"{done.name}: {done.start}"]
    if not done.advice:
        lines.append("No prime below the bound removes anything.")
    for a in done.advice:
        group = " x ".join(map(str, a.structure)) or "1"
        lines.append(f"  v = {a.prime}: J(F_v) = {group}; {a.reason} (expected from sizes "
                     f"{a.estimated:.3g}); about {a.seconds:.2g} s")
    if done.chabauty:
        lines.append("Chabauty primes:")
    for c in done.chabauty:
        group = " x ".join(map(str, c.structure)) or "1"
        lines.append(f"  p = {c.prime}: J(F_p) = {group}; {c.reason}; about {c.expected:.2g} classes "
                     f"expected for a candidate at {c.precision} digits")
    return "\n".join(lines) + "\n"


def check_top(value: int) -> int:
    """The value of `--top`; raises `InputError` unless it is at least 1."""
    if value < 1:
        raise InputError("--top", "", str(value), "a number of primes, at least 1")
    return value


__all__ = ["Advised", "ChabautyAdvice", "check_top", "document", "execute", "text"]
