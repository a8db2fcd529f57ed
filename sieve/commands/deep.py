"""Deep information for a run: conditions modulo q^2 that its proof log can express."""

from __future__ import annotations

from collections.abc import Collection

from sieve.engine.investigation import Investigation
from sieve.errors import BadReduction, PrecisionLost, Uncertified
from sieve.local.deep import DEEP_PRIMES, deep_condition
from sieve.local.picard import picard_group
from sieve.proof.statement import closed_places
from sieve.proof.witness_padic import Inexpressible, PadicEvidence


def add_deep(
    investigation: Investigation, ells: Collection[int], allowed: Collection[int] | None,
    lists: Collection[int] = (),
) -> bool:
    """Give the sieve the points modulo q^2 for small q; says whether there are any.

    Arguments: `ells`, whose parts may be used (others than q gain nothing); `allowed`, auxiliary primes that
    may be used (None: all); `lists`, primes with complete lists, which say more.
    """
    problem = investigation.problem
    generators = investigation.generators
    places = closed_places([problem.base, *generators])
    for q in DEEP_PRIMES:
        if q not in ells or q in lists or (allowed is not None and q not in allowed):
            continue
        investigation.gather([q])
        record = investigation.records[q]
        if not investigation.serves(record) or not record.points:
            continue
        try:
            condition = deep_condition(problem.curve, problem.base, generators, q, problem.integral)
            PadicEvidence(problem.curve, picard_group(problem.curve.modulo(q)), places)
        except (BadReduction, Uncertified, PrecisionLost, Inexpressible):
            continue
        investigation.deep[q] = condition
    return bool(investigation.deep)
