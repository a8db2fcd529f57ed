"""From a finished run to its proof log."""

from __future__ import annotations

from typing import TYPE_CHECKING

from sieve import __version__
from sieve.commands.premises import bound_is_proved
from sieve.engine.investigation import Investigation
from sieve.engine.verdicts import CandidateList
from sieve.proof.statement import ProofInput, ProofPremise, closed_places
from sieve.proof.witness_padic import Inexpressible, PadicEvidence
from sieve.proof.writer import ProofLog, write_proof

if TYPE_CHECKING:
    from sieve.commands.run import Run


def restrict_to_log(investigation: Investigation, listing: CandidateList) -> None:
    """Let a list use only what the proof log can express (its `blocked`, `reduction` of its place)."""
    place = listing.place
    investigation.gather([place.prime])
    record = investigation.records[place.prime]
    place.reduction = record.usable and record.expressible
    if all(c.kind == "coefficients" for c in listing.candidates):
        return
    places = closed_places([investigation.problem.base, *investigation.generators])
    try:
        PadicEvidence(place.curve, place.group, places)
    except Inexpressible as error:
        listing.blocked = f"the proof log cannot express {error}"


def premises_in_log(run: Run) -> list[ProofPremise]:
    """The rank, stated indices, complete lists and bounds, with the user's sources."""
    problem = run.investigation.problem
    rank = f"J(Q) has rank at most {problem.rank}"
    out = [ProofPremise("rank", rank, problem.rank_source)]
    for ell in stated_ells(run):
        text = f"{ell} does not divide the index of the given group in J(Q)"
        out.append(ProofPremise(f"index {ell}", text, problem.index_source, (("ell", ell),)))
    kind = "integral" if problem.integral else "rational"
    for file, listing in zip(run.files, run.lists, strict=True):
        p = file.prime
        if listing.rests_on_claim(run.decisions):
            text = f"every {kind} point of X is near one of the {len(file.candidates)} candidates at {p}"
            out.append(ProofPremise(f"complete {p}", text, file.source, (("prime", p),)))
        for c in listing.candidates:
            if c.at_most is not None and not bound_is_proved(run, listing, c):
                text = f"at most {c.at_most} {kind} points are near {c.id}"
                keys: tuple[tuple[str, int | str], ...]
                keys = (("prime", p), ("candidate", c.id), ("at_most", c.at_most))
                out.append(ProofPremise(f"bound {p} {c.id}", text, file.source, keys))
    return out


def stated_ells(run: Run) -> list[int]:
    """The primes l in use that rest on the user's word alone."""
    return [ell for ell in run.ells if not run.investigation.saturation_at(ell).proved]


def proof_of(run: Run, full: bool) -> ProofLog:
    """The log of a run: trimmed, or with every usable prime."""
    investigation = run.investigation
    problem = investigation.problem
    usable = investigation.usable
    outlook = run.outlook
    return write_proof(
        ProofInput(
            program=f"residue-sieve {__version__}",
            case_name=run.resolved.case.name,
            case_sha256=run.resolved.case.sha256,
            curve=problem.curve,
            rank=problem.rank,
            base=problem.base,
            generators=investigation.generators,
            orders=investigation.orders,
            premises=premises_in_log(run),
            lists=run.lists,
            decisions=run.decisions,
            records={r.prime: r for r in usable},
            images={r.prime: investigation.images(r) for r in usable},
            ells=run.ells,
            stated=stated_ells(run),
            outcome=None if outlook is None else outlook.outcome,
            vectors=[] if outlook is None else outlook.vectors,
            branch=investigation.branch,
            two_torsion=investigation.exact_two,
            integral=problem.integral,
            deep=investigation.deep,
        ),
        full,
    )
