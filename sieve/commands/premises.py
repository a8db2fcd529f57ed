"""What the verdicts rest on: assumed by the user's word, or proved, with the primes that prove it."""

from __future__ import annotations

from math import gcd
from typing import TYPE_CHECKING

from sieve.engine.investigation import Investigation
from sieve.engine.verdicts import CandidateList
from sieve.files.result import Premise
from sieve.local.chabauty import LocatedCandidate

if TYPE_CHECKING:
    from sieve.commands.run import Run


def hypothesis_premises(investigation: Investigation, ells: list[int]) -> list[Premise]:
    """The rank, the torsion, independence and saturation at the primes l in use."""
    problem = investigation.problem
    out = [Premise("rank", "assumed", f"J(Q) has rank at most {problem.rank}", problem.rank_source)]
    order = 1
    for t in investigation.orders:
        order *= t
    if investigation.torsion_proved():
        statement = f"the torsion of J(Q) has order {order}"
        out.append(Premise("torsion", "proved", statement, "", _torsion_primes(investigation)))
    for ell in ells:
        saturation = investigation.saturation_at(ell)
        if saturation.proved:
            out.append(
                Premise(
                    f"saturated at {ell}",
                    "proved",
                    f"{ell} does not divide the index [J(Q) : G]",
                    "",
                    saturation.primes,
                )
            )
        elif ell in problem.index_prime_to:
            out.append(
                Premise(
                    f"saturated at {ell}",
                    "assumed",
                    f"{ell} does not divide the index [J(Q) : G]",
                    problem.index_source,
                )
            )
    proved = [ell for ell in ells if investigation.saturation_at(ell).proved]
    if proved and problem.rank:
        out.insert(
            1,
            Premise(
                "independence",
                "proved",
                "the free generators are independent",
                "",
                investigation.saturation_at(proved[-1]).primes,
            ),
        )
    return out


def _torsion_primes(investigation: Investigation) -> tuple[int, ...]:
    """A few primes whose group orders have the same greatest common divisor as all of them."""
    records = [r for r in investigation.usable if r.points and r.prime != 2]
    goal = 0
    for record in records:
        goal = gcd(goal, record.order)
    used, value = [], 0
    for record in records:
        if gcd(value, record.order) != value:
            value = gcd(value, record.order)
            used.append(record.prime)
        if value == goal:
            break
    return tuple(used)


def premises_of(run: Run) -> list[Premise]:
    """All premises of a run, in a fixed order."""
    out = hypothesis_premises(run.investigation, run.ells)
    kind = "integral" if run.investigation.problem.integral else "rational"
    for file, listing in zip(run.files, run.lists, strict=True):
        name = f"complete at {file.prime}"
        among = f"the {len(file.candidates)} candidates at {file.prime}"
        statement = f"every {kind} point of X is near one of {among}"
        if listing.rests_on_claim(run.decisions):
            out.append(Premise(name, "assumed", statement, file.source))
        elif listing.proved_complete:
            discs = listing.covers(run.investigation.problem.integral)
            how = "they are all residue discs" if discs else "zeros of annihilating integrals are counted"
            out.append(Premise(name, "proved", f"{statement} ({how})", ""))
        for c in listing.candidates:
            if c.at_most is not None:
                name = f"bound in {c.id} at {file.prime}"
                statement = f"at most {c.at_most} {kind} points are near {c.id}"
                if bound_is_proved(run, listing, c):
                    out.append(Premise(name, "proved", statement, ""))
                else:
                    out.append(Premise(name, "assumed", statement, file.source))
    return out


def bound_is_proved(run: Run, listing: CandidateList, candidate: LocatedCandidate) -> bool:
    """Whether the bound on the rational points near a candidate needs no user's word."""
    points = next((d.points for d in run.decisions
                   if (d.prime, d.id) == (listing.place.prime, candidate.id)), ())
    bound = listing.proved_bound(candidate, points)
    return bound is not None and candidate.at_most is not None and bound <= candidate.at_most
