"""Bases and coordinates of known points: as stored, and the same integers at every prime."""

from __future__ import annotations

import itertools

import pytest
from flint import fmpz_mat

from sieve.exact.padic_linear import combine
from sieve.exact.primes import primes_below
from sieve.local.chabauty import ChabautyPlace
from sieve.local.records import local_record
from tests.support.problems import investigate, known_point_problem, rank_of, with_relations
from tests.support.reference_cases import ReferenceCase
from tests.support.sweep import full_sweep

CASES = with_relations()
PADIC_PRIMES = (3, 5, 7, 11, 13, 17, 19)


def hermite(rows: list[list[int]]) -> list[list[int]]:
    form = [[int(c) for c in row] for row in fmpz_mat(rows).hnf().table()]
    return [row for row in form if any(row)]


def kernel_and_image(
    coordinates: list[tuple[int, ...]], rank: int, orders: tuple[int, ...]
) -> tuple[list[list[int]], list[list[int]]]:
    """All relations between elements of Z^rank x prod Z/t, and the lattice that they and the periods span."""
    width = rank + len(orders)
    periods = [[t if j == rank + i else 0 for j in range(width)] for i, t in enumerate(orders)]
    stacked = [*map(list, coordinates), *periods]
    unit = [[int(i == k) for k in range(len(stacked))] for i in range(len(stacked))]
    form = hermite([row + one for row, one in zip(stacked, unit, strict=True)])
    kernel = [row[width : width + len(coordinates)] for row in form if not any(row[:width])]
    return hermite(kernel) if kernel else [], hermite([row for row in stacked if any(row)] or [[0] * width])


@pytest.mark.parametrize("case", CASES, ids=lambda c: c.id)
def test_basis_of_the_known_points(case: ReferenceCase) -> None:
    """Rank, torsion and coordinates are the stored ones up to a change of basis.

    The points generate either group with the same relations: so an isomorphism matches the coordinates.
    """
    problem = known_point_problem(case)
    investigation = investigate(problem)
    rank = rank_of(case)
    assert len(investigation.rows) - len(investigation.orders) == rank
    ours = investigation.orders
    assert all(b % a == 0 for a, b in itertools.pairwise(ours))
    points = [problem.curve.normalise(*p) for p in case.relation_points]
    found = [investigation.coordinates[p] for p in points]
    assert all(c.denominator == 1 for c in found)
    kernel, image = kernel_and_image([c.vector for c in found], rank, ours)
    stored_kernel, stored_image = kernel_and_image(list(case.relation_coordinates), rank, case.torsion)
    assert kernel == stored_kernel
    for lattice, width in ((image, rank + len(ours)), (stored_image, rank + len(case.torsion))):
        assert not width or lattice == [[int(i == j) for j in range(width)] for i in range(width)]


def reproduce(case: ReferenceCase, padic: tuple[int, ...], auxiliary: list[int]) -> tuple[int, int]:
    """Check the coordinates at Chabauty and auxiliary primes; returns how many of each were used."""
    problem = known_point_problem(case)
    investigation = investigate(problem)
    curve, rank = problem.curve, rank_of(case)
    places = 0
    for p in padic:
        if not curve.is_smooth(p):
            continue
        place = ChabautyPlace(curve, p, 8)
        place.attach(problem.base, investigation.generators)
        places += 1
        for point, coordinates in investigation.coordinates.items():
            integers = coordinates.vector
            image = [0] * len(place.group.invariants)
            for a, log in zip(integers, place.classes, strict=True):
                place.group.add(image, a, log)
            assert tuple(image) == place.class_of_disc(place.integrals.disc_of(point))
            left = place.integrals.log_point(point) - place.base_log
            if any(integers):
                assert left.agrees(combine(list(zip(integers, place.logs, strict=True))))
            found = place.coefficients_of_point(point, rank)
            # more logarithms than their space has dimensions are dependent
            assert (found is None) == (rank > curve.genus)
            for c, a in zip(found or [], integers[: rank if found else 0], strict=True):
                assert c.precision >= 3 and c.agrees(a)
    used = 0
    for v in auxiliary:
        record = local_record(curve, problem.base, investigation.asked, v)
        if not record.usable:
            continue
        used += 1
        images = investigation.images(record)
        allowed = {tuple(row) for row in record.allowed.tolist()}
        for k, point in enumerate(problem.known_points):
            value = tuple(
                sum(
                    a * row[j] for a, row in zip(investigation.coordinates[point].vector, images, strict=True)
                )
                % d
                for j, d in enumerate(record.invariants)
            )
            assert value == record.images[k] and value in allowed
    return places, used


@pytest.mark.parametrize("name", ["X0p67", "integral_g2", "bielliptic_137", "X1_16"])
def test_the_same_integers_at_some_primes(name: str) -> None:
    case = next(case for case in CASES if case.id == name)
    places, used = reproduce(case, (3, 7, 11), case.good_primes(200, 120))
    assert places >= 1 and used >= 12


@pytest.mark.slow
@pytest.mark.parametrize("case", CASES, ids=lambda c: c.id)
def test_the_same_integers_everywhere(case: ReferenceCase) -> None:
    if full_sweep():
        auxiliary = [v for v in primes_below(1000) if v > 110 and v not in case.bad_primes][:100]
        places, used = reproduce(case, PADIC_PRIMES, auxiliary)
        assert used >= 98
    else:
        places, used = reproduce(case, (5, 13), case.good_primes(150, 110))
    assert places >= 1
