"""The proof log of a run: statement, premises, evidence, fates, in the format of FORMAT.md.

First all records are laid out without their evidence, then the layout is trimmed, then evidence is made for
what is kept.  Nothing is written that the engine has not checked; the checker trusts none of it.
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from sieve.curves.divisors import ClosedPlace, Divisor, FibrePlace, MumfordPlace, Place, RationalPlace
from sieve.curves.search import by_height
from sieve.engine.verdicts import CandidateList, Decision
from sieve.errors import InternalError
from sieve.local.chabauty import LocatedCandidate, useful_digits
from sieve.local.deep import DIGITS as DEEP_DIGITS
from sieve.local.picard import picard_group
from sieve.local.zero_counts import ZeroProof
from sieve.proof.saturation_choice import Chosen, choose_saturation
from sieve.proof.statement import ProofInput
from sieve.proof.steps import Elimination, Steps, class_steps, eliminations
from sieve.proof.trim import Record, trim
from sieve.proof.witness_local import local_document
from sieve.proof.witness_padic import PadicEvidence

FORMAT = "sieve-proof/1"
VECTOR_LIMIT = 1000


@dataclass(frozen=True)
class ProofLog:
    """A log: its `text`, the `records` in it and in the untrimmed log, likewise auxiliary `primes`."""

    text: str
    records: int
    all_records: int
    primes: tuple[int, ...]
    all_primes: int

    @property
    def size(self) -> int:
        """The number of bytes."""
        return len(self.text.encode())


def write_proof(source: ProofInput, full: bool = False) -> ProofLog:
    """The log of a run.

    Arguments: `full`, keep all usable primes and all allowed l, not only what the fates need.  Raises
    `InternalError` when evidence that was found before is not found now.
    """
    layout, image_ells = _layout(source)
    kept = layout if full else trim(layout, image_ells)
    lines = [json.dumps(_with_evidence(source, record), separators=(",", ":")) for record in kept]
    primes = tuple(r["prime"] for r in kept if r["kind"] == "local")
    everything = sum(r["kind"] == "local" for r in layout)
    return ProofLog("".join(line + "\n" for line in lines), len(kept), len(layout), primes, everything)


# ---- layout --------------------------------------------------------------------------------------------


def _layout(source: ProofInput) -> tuple[list[Record], set[int]]:
    """All records of the untrimmed log, local and padic ones without evidence; the l that empty uses need."""
    steps = Steps(source)
    dead = eliminations(steps)
    classes = class_steps(steps)
    fates = [_fate(d, dead) for d in source.decisions]
    needed = {ell for e in dead.values() for ell in e.ells}
    image_ells = {ell for e in dead.values() if not e.steps for ell in e.ells}
    in_use = {s.name for e in dead.values() for s in e.steps if isinstance(s.name, int)}
    if classes is not None and not source.lists:
        needed |= {ell for step in classes[0] for ell, _ in step.exponents}
        in_use |= {step.name for step in classes[0] if isinstance(step.name, int)}
    in_use |= {x.place.prime for x in source.lists if _needs_group(x) and x.place.prime in source.records}
    chosen = _saturation_records(source, needed, in_use)
    records: list[Record] = [_header(source), _group(source)]
    records += [_premise(p) for p in source.premises]
    records += [_candidate(listing, c) for listing in source.lists for c in listing.candidates]
    primes = {v for v, r in source.records.items() if r.usable}
    records += [{"kind": "local", "prime": v} for v in sorted(primes)]
    if source.branch is not None and source.two_torsion is not None:
        factors = [list(q) for q in source.branch.factors]
        records.append({"kind": "branch", "factors": factors, "primes": list(source.branch.primes)})
    records += [
        {"kind": "padic", "prime": x.place.prime, "reduction": _reduction(source, x)}
        for x in source.lists
        if _located(x)
    ]
    listed = {x.place.prime for x in source.lists if _located(x)}
    for q in sorted(set(source.deep) - listed):
        records.append({"kind": "padic", "prime": q, "reduction": True})
    records += [_zeros(x.proof) for x in source.lists if x.proof is not None and x.proof.complete]
    for choice in chosen:
        records += _saturated(choice)
    records += fates
    empty = False
    if classes is not None:
        found, relation = classes
        vectors = [[int(c) for c in s.vector] for s in source.vectors[:VECTOR_LIMIT]]
        vectors = [row for row in vectors if len(row) == source.size]
        empty = relation.count == 0
        records.append(
            {
                "kind": "classes",
                "uses": [step.document() for step in found],
                "count": relation.count,
                "index": relation.index,
                "vectors": vectors
                # a finer quotient has other representatives
                if source.outcome
                and relation.count == source.outcome.relation.count
                and relation.index == source.outcome.relation.index
                else [],
            }
        )
    records.append(_end(source, fates, empty, len(records)))
    return records, image_ells


def _saturation_records(source: ProofInput, needed: set[int], in_use: set[int]) -> list[Chosen]:
    """For every allowed l that is not merely stated a choice of primes; those in use come first."""
    found: dict[int, Chosen] = {}
    busy = set(in_use)
    # large l have the fewest primes to choose from
    for ell in sorted(source.ells, key=lambda q: (q not in needed, -q)):
        if ell in source.stated:
            continue
        choice = choose_saturation(source, ell, busy)
        if choice is None:
            raise InternalError(f"saturation at {ell} was proved before and is not now")
        found[ell] = choice
        if ell in needed:
            busy |= choice.all_primes
    return [found[ell] for ell in sorted(found)]


def _located(listing: CandidateList) -> bool:
    """Whether the list has points or discs that integrals can tell apart."""
    counted = listing.proof is not None and listing.proof.complete
    return not listing.blocked and (counted or any(c.kind != "coefficients" for c in listing.candidates))


def _needs_group(listing: CandidateList) -> bool:
    return listing.place.reduction and (
        _located(listing) or any(c.disc is not None for c in listing.candidates)
    )


def _zeros(proof: ZeroProof) -> Record:
    forms = [list(form.coefficients) for form in proof.annihilators]
    return {"kind": "zeros", "prime": proof.prime, "pivots": list(proof.pivots), "annihilators": forms}


def _reduction(source: ProofInput, listing: CandidateList) -> bool:
    return listing.place.reduction and listing.place.prime in source.records


def _text(value: str) -> str:
    return " ".join(value.split())


def _header(source: ProofInput) -> Record:
    curve = source.curve
    return {
        "kind": "header",
        "format": FORMAT,
        "program": source.program,
        "case": {"name": _text(source.case_name), "sha256": source.case_sha256},
        "equation": [list(row) for row in curve.rows],
        "weight": curve.weight,
        "genus": curve.genus,
        "y_scale": str(curve.y_scale),
        "variables": list(curve.variables),
    }


def _group(source: ProofInput) -> Record:
    r = source.rank
    return {
        "kind": "group",
        "rank": r,
        "base": _divisor(source.base),
        "free": [_divisor(d) for d in source.generators[:r]],
        "torsion": [[t, _divisor(d)] for t, d in zip(source.orders, source.generators[r:], strict=True)],
        "integral": source.integral,
    }


def _divisor(divisor: Divisor) -> list[list[Any]]:
    return [[m, _place(place)] for m, place in divisor.terms]


def _place(place: Place) -> dict[str, Any]:
    if isinstance(place, RationalPlace):
        return {"point": list(place.point)}
    if isinstance(place, FibrePlace):
        return {"fibres": place.count}
    if isinstance(place, MumfordPlace):
        # x = t modulo u
        x = (Fraction(0), Fraction(1)) if place.degree > 1 else (-place.u[0],)
        place = ClosedPlace(place.u, x, place.w, (Fraction(1),))
    return {"closed": [[str(c) for c in part] for part in (place.u, place.x, place.y, place.z)]}


def _premise(premise: Any) -> Record:
    head = {"kind": "premise", "id": premise.id, "statement": _text(premise.statement)}
    return head | {"source": _text(premise.source)} | dict(premise.keys)


def _candidate(listing: CandidateList, c: LocatedCandidate) -> Record:
    place = listing.place
    p = place.prime
    head: Record = {"kind": "candidate", "prime": p, "id": c.id, "form": c.kind}
    if c.kind == "coefficients":
        pairs = []
        for value in c.coefficients:
            digits = max(0, min(value.precision, useful_digits(p)))
            pairs.append([value.residue(digits) if digits else 0, digits])
        orders = [int(e) for e in c.torsion] or None
        disc = None if c.disc is None else list(place.group.curve.points[c.disc])
        return head | {"coefficients": pairs, "torsion": orders, "disc": disc}
    assert c.disc is not None
    if c.kind == "disc":
        return (
            head
            | {"point": [int(a) for a in place.group.curve.points[c.disc]]}
            | {"multiplicity": c.multiplicity}
        )
    point = place.integrals.point_at(c.disc, c.parameter, c.digits)
    modulus = p**c.digits
    return head | {
        "point": [a % modulus for a in point],
        "digits": c.digits,
        "multiplicity": c.multiplicity,
    }


def _saturated(choice: Chosen) -> list[Record]:
    by: int | str = "branch" if choice.torsion_by is None else choice.torsion_by
    return [
        {"kind": "torsion", "ell": choice.ell, "dimension": choice.dimension, "by": by},
        {"kind": "saturated", "ell": choice.ell, "primes": list(choice.primes)},
    ]


def _fate(decision: Decision, dead: dict[tuple[int, str], Elimination]) -> Record:
    head: Record = {"kind": "fate", "prime": decision.prime, "id": decision.id, "verdict": decision.verdict}
    if decision.verdict == "eliminated":
        return head | {"uses": [step.document() for step in dead[decision.prime, decision.id].steps]}
    if decision.verdict == "rational":
        points = [list(p) for p in decision.points]
        return head | {"points": points, "given": decision.given, "sole": decision.sole}
    return head | {"reason": _text(decision.reason)}


def _end(source: ProofInput, fates: Sequence[Record], empty: bool, records: int) -> Record:
    eliminated = [[f["prime"], f["id"]] for f in fates if f["verdict"] == "eliminated"]
    conclusion: str = "none"
    points: list[list[int]] = []
    decided = decided_list(source.lists, source.decisions)
    if decided is not None:
        found = points_of(decided, source.decisions)
        conclusion, points = ("points", [list(p) for p in found]) if found else ("empty", [])
    elif empty and not source.lists:
        conclusion = "empty"
    return {
        "kind": "end",
        "records": records,
        "eliminated": eliminated,
        "conclusion": conclusion,
        "points": points,
    }


def decided_list(lists: Iterable[CandidateList], decisions: Sequence[Decision]) -> CandidateList | None:
    """The first complete list all of whose candidates are eliminated or rational with no company."""
    for listing in lists:
        own = [d for d in decisions if d.prime == listing.place.prime]
        if listing.complete and all(
            d.verdict == "eliminated" or (d.verdict == "rational" and d.sole) for d in own
        ):
            return listing
    return None


def points_of(listing: CandidateList, decisions: Sequence[Decision]) -> list[tuple[int, int, int]]:
    """The rational points behind the candidates of a list, by height."""
    found = {p for d in decisions if d.prime == listing.place.prime for p in d.points}
    return by_height(listing.place.curve, found)


# ---- evidence ------------------------------------------------------------------------------------------


def _with_evidence(source: ProofInput, record: Record) -> Record:
    if record["kind"] == "local":
        return local_document(source.curve, record["prime"], source.places())
    if record["kind"] == "padic":
        p = record["prime"]
        listing = next((x for x in source.lists if x.place.prime == p and _located(x)), None)
        if listing is None:
            group = picard_group(source.curve.modulo(p))
            evidence = PadicEvidence(source.curve, group, source.places())
            return evidence.record(range(group.curve.count), DEEP_DIGITS + 1, True)
        place = listing.place
        evidence = PadicEvidence(source.curve, place.group, source.places())
        discs = {c.disc for c in listing.candidates if c.kind != "coefficients" and c.disc is not None}
        discs |= evidence.discs_of([source.base, *source.generators])
        digits = place.integrals.digits + 1
        if listing.proof is not None and listing.proof.complete:
            # zeros are counted in every disc
            discs |= set(range(place.group.curve.count))
            digits = max(digits, listing.proof.digits + 1)
        if p in source.deep:
            discs |= set(range(place.group.curve.count))
            digits = max(digits, DEEP_DIGITS + 1)
        return evidence.record(discs, digits, record["reduction"])
    return record


__all__ = ["FORMAT", "ProofLog", "decided_list", "points_of", "write_proof"]
