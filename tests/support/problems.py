"""Reference curves as problems for the engine."""

from __future__ import annotations

from collections.abc import Sequence

from sieve.curves.divisors import Divisor
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.engine.investigation import Investigation
from sieve.engine.problem import Problem
from sieve.exact.primes import primes_below
from tests.support.reference_cases import ReferenceCase, reference_cases


def curve_of(case: ReferenceCase) -> HyperellipticCurve:
    return HyperellipticCurve(case.f, case.h)


def with_relations() -> list[ReferenceCase]:
    """The cases whose known points have stored coordinates."""
    return [case for case in reference_cases() if case.relation_points]


def rank_of(case: ReferenceCase) -> int:
    """The rank of the group that the known points generate, as stored."""
    return len(case.relation_coordinates[0]) - len(case.torsion)


def known_point_problem(case: ReferenceCase) -> Problem:
    """The group of the known points; the base is that of the stored coordinates."""
    curve = curve_of(case)
    base = Divisor.of([(1, curve.place_of_point(curve.normalise(*case.relation_points[0])))])
    known = tuple(sorted({curve.normalise(*p) for p in (*case.known_points, *case.relation_points)}))
    return Problem(case.id, curve, base, (), (), known, rank_of(case), "stored", from_known_points=True)


def investigate(problem: Problem, bound: int = 110, primes: Sequence[int] = ()) -> Investigation:
    """Established from the auxiliary primes below `bound` and the given ones."""
    investigation = Investigation(problem)
    investigation.gather([*primes_below(bound), *primes])
    investigation.establish(lambda primes: None)
    return investigation
