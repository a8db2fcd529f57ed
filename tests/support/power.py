"""How many random p-adic points the sieve eliminates among the known points of a reference curve."""

from __future__ import annotations

import random
from collections import Counter
from dataclasses import dataclass

from sieve.engine.investigation import Investigation
from sieve.engine.verdicts import CandidateList, decide_candidates, match_rational
from sieve.local.chabauty import ChabautyPlace, LocatedCandidate


@dataclass
class Power:
    """The verdicts on the random points at one p, the kinds of fate of the open ones, known points lost."""

    eliminated: int
    rational: int
    open_kinds: Counter[str]
    known_lost: int

    @property
    def total(self) -> int:
        return self.eliminated + self.rational + self.open_kinds.total()


def power(investigation: Investigation, p: int, bound: int, count: int = 40, digits: int = 6) -> Power:
    """Known points and `count` seeded random points over Q_p, decided with all primes below `bound`."""
    problem = investigation.problem
    place = ChabautyPlace(problem.curve, p, digits)
    place.attach(problem.base, investigation.generators)
    rng = random.Random(f"{problem.name} {p}")
    candidates = []
    for i, point in enumerate(problem.known_points):
        t, known = place.integrals.parameter_of_point(point, digits)
        disc = place.integrals.disc_of(point)
        candidates.append(LocatedCandidate(f"known {i}", "point", disc, t, known))
    discs = len(place.group.point_logs)
    for i in range(count):
        t = p * rng.randrange(p ** (digits - 1))
        candidates.append(LocatedCandidate(f"random {i}", "point", rng.randrange(discs), t, digits))
    listing = CandidateList(place, candidates, False, "random points", "random points")
    ells = investigation.allowed_ells([p])
    matched = match_rational(investigation, [listing])
    decisions = decide_candidates(investigation, [listing], matched, ells, bound)
    kinds: Counter[str] = Counter()
    eliminated = rational = lost = 0
    for (_, name), decision in decisions.items():
        if name.startswith("known"):
            lost += decision.verdict != "rational"
        elif decision.verdict == "eliminated":
            eliminated += 1
        elif decision.verdict == "rational":
            rational += 1
        else:
            assert decision.reason and decision.hint and decision.fate is not None
            kinds[decision.fate.kind] += 1
    return Power(eliminated, rational, kinds, lost)
