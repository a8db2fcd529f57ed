"""Conditions for sieving in stages: auxiliary primes whose group may exclude something, by its order."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence

from sieve.engine.investigation import Investigation
from sieve.engine.relation import Relation, coarsen, relation_from_condition
from sieve.engine.staged import may_exclude
from sieve.exact.primes import primes_below
from sieve.local.quick_order import quick_order
from sieve.local.records import local_record
from tests.support.problems import curve_of, known_point_problem
from tests.support.reference_cases import reference_case

TOPS = {2: 5, 3: 3, 5: 2, 7: 1, 11: 1, 13: 1}
"""The largest exponents of the modulus."""

FURTHER = {2: 1, 3: 1, 5: 1, 7: 1, 17: 1, 19: 1, 23: 1}
"""What the modulus grows by when few classes are left."""

START = 150
"""Primes below this are used in any case; the coordinates of the known points come from them."""


def gather(name: str, bound: int, report: Callable[[int, int], None] | None = None
           ) -> tuple[Investigation, list[Relation]]:
    """The group of the known points of a reference curve, and its conditions at the useful primes.

    Arguments: id of a curve of genus 2; a bound for the auxiliary primes; `report` receives the prime and the
    number of groups so far.  The conditions have the parts at those primes of `TOPS` and `FURTHER` where the
    group is proved saturated.
    """
    problem = known_point_problem(reference_case(name))
    investigation = Investigation(problem)
    investigation.gather(primes_below(START))
    investigation.establish(lambda primes: None)
    curve = curve_of(reference_case(name))
    for v in primes_below(bound, START):
        quick = quick_order(curve.f, curve.h, v)
        if quick is not None and may_exclude(quick.points, quick.orders, TOPS):
            investigation.add(local_record(curve, problem.base, investigation.asked, v))
            if report is not None:
                report(v, len(investigation.records))
    ells = [ell for ell in sorted({*TOPS, *FURTHER}) if investigation.saturation_at(ell).proved]
    relations = [relation_from_condition(record.condition(investigation.images(record)), ells)
                 for record in investigation.usable]
    return investigation, [r for r in relations if r.count < r.index]


def proved(investigation: Investigation, tops: Mapping[int, int]) -> dict[int, int]:
    """The exponents at the primes where the group is proved saturated."""
    return {ell: e for ell, e in tops.items() if investigation.saturation_at(ell).proved}


def down_to_known(relation: Relation, known: Sequence[Sequence[int]]) -> Relation:
    """The relation, or the finest of its coarsenings l by l that has no class but those of known vectors."""
    def excess(r: Relation) -> int:
        return r.count - len({tuple(c for part in r.parts for c in part.values(x)) for x in known})

    while excess(relation):
        options = [coarsen(relation, {**relation.exponents, ell: e - 1})
                   for ell, e in sorted(relation.exponents.items())]
        relation = min(options, key=lambda r: (excess(r) / r.count, -r.index))
    return relation
