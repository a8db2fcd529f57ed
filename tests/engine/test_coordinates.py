"""Coordinates and bases from images in many groups, on made-up groups where the truth is known."""

from __future__ import annotations

import random
from collections.abc import Sequence
from fractions import Fraction
from math import prod

import pytest
from flint import fmpz_mat

from sieve.engine.coordinates import (
    basis_of_classes,
    generator_relations,
    point_coordinates,
    true_relations,
    vanishing_lattice,
)
from sieve.errors import Inconsistent

Functional = tuple[int, list[int]]


def functionals(
    rng: random.Random, rank: int, orders: Sequence[int], classes: Sequence[Sequence[int]], count: int = 40
) -> list[Functional]:
    """Random maps Z^rank x prod Z/t -> Z/m, evaluated at classes given by their coordinates."""
    out = []
    for _ in range(count):
        modulus = rng.randint(50, 5000) * prod(orders)
        values = [rng.randrange(modulus) for _ in range(rank)]
        values += [rng.randrange(t) * (modulus // t) for t in orders]
        out.append((modulus, [sum(a * b for a, b in zip(c, values, strict=True)) % modulus for c in classes]))
    return out


def unit(n: int) -> list[list[int]]:
    return [[int(i == j) for j in range(n)] for i in range(n)]


@pytest.mark.parametrize("seed", range(20))
def test_vanishing_lattice_against_enumeration(seed: int) -> None:
    """All basis vectors vanish, and the index is the number of elements of the image of Z^3."""
    rng = random.Random(seed)
    maps = [(m, [rng.randrange(m) for _ in range(3)]) for m in (rng.randint(2, 9) for _ in range(3))]
    basis, _ = vanishing_lattice(3, maps)

    def image(vector: Sequence[int]) -> tuple[int, ...]:
        return tuple(sum(a * c for a, c in zip(vector, row, strict=True)) % m for m, row in maps)

    assert all(not any(image(row)) for row in basis)
    steps = [image(row) for row in unit(3)]
    seen, todo = {image([0, 0, 0])}, [image([0, 0, 0])]
    while todo:
        here = todo.pop()
        for step in steps:
            there = tuple((a + b) % m for a, b, (m, _) in zip(here, step, maps, strict=True))
            if there not in seen:
                seen.add(there)
                todo.append(there)
    assert abs(int(fmpz_mat(basis).det())) == len(seen)


@pytest.mark.parametrize("seed", range(30))
def test_point_coordinates(seed: int) -> None:
    rng = random.Random(seed)
    rank, orders = rng.randint(0, 3), rng.choice([[], [2], [3], [2, 6], [5]])
    free = [rng.randint(-30, 30) for _ in range(rank)]
    torsion = [rng.randrange(t) for t in orders]
    maps = functionals(rng, rank, orders, [*unit(rank + len(orders)), [*free, *torsion]])
    found = point_coordinates(rank, orders, maps)
    assert found is not None and found.denominator == 1
    assert found.vector == (*free, *torsion)
    assert found.coefficients == tuple(Fraction(a) for a in free)


@pytest.mark.parametrize("denominator", [2, 3, 4, 6])
def test_points_outside_a_group_of_finite_index(denominator: int) -> None:
    rng = random.Random(denominator)
    point = [rng.choice([1, -1, 5]), rng.randint(-9, 9)]
    maps = functionals(rng, 2, [], [[denominator, 0], [0, denominator], point])
    found = point_coordinates(2, [], maps)
    assert found is not None and found.denominator == denominator
    assert found.coefficients == tuple(Fraction(a, denominator) for a in point)


def test_a_point_that_is_independent_has_no_coordinates() -> None:
    rng = random.Random(1)
    assert point_coordinates(1, [], functionals(rng, 2, [], [[1, 0], [0, 1]])) is None
    assert point_coordinates(0, [], functionals(rng, 1, [], [[1]])) is None


@pytest.mark.parametrize("seed", range(30))
def test_basis_of_classes(seed: int) -> None:
    """The basis generates what the classes generate: coordinates reproduce the classes, and conversely."""
    rng = random.Random(seed)
    rank, orders = rng.randint(0, 4), rng.choice([(), (2,), (2, 2), (3,), (2, 10), (19,), (8, 2)])
    width = rank + len(orders)
    count = rng.randint(max(1, width), width + 5)
    classes = [
        [*(rng.randint(-3, 3) for _ in range(rank)), *(rng.randrange(t) for t in orders)]
        for _ in range(count)
    ]
    basis = basis_of_classes(count, functionals(rng, rank, orders, classes, 60))
    periods = [[t if j == rank + i else 0 for j in range(width)] for i, t in enumerate(orders)]

    def combine(row: Sequence[int]) -> list[int]:
        total = [sum(a * c[j] for a, c in zip(row, classes, strict=True)) for j in range(width)]
        return total[:rank] + [a % t for a, t in zip(total[rank:], orders, strict=True)]

    free, torsion = [combine(row) for row in basis.free], [combine(row) for row in basis.torsion]
    for (a, b), one in zip(basis.coordinates, classes, strict=True):
        total = [
            sum(c * g[j] for c, g in zip([*a, *b], [*free, *torsion], strict=True)) for j in range(width)
        ]
        assert total[:rank] == one[:rank]
        assert all((x - y) % t == 0 for x, y, t in zip(total[rank:], one[rank:], orders, strict=True))
    # independent, of the stated orders: the index of the subgroup tells
    span = fmpz_mat([*classes, *periods] or [[0]]) if width else fmpz_mat([[0]])
    assert len(basis.free) == fmpz_mat([c[:rank] for c in classes]).rank() if rank else not basis.free
    for t, generator in zip(basis.orders, torsion, strict=True):
        assert generator[:rank] == [0] * rank and t > 1
        assert all(t * a % m == 0 for a, m in zip(generator[rank:], orders, strict=True))
    assert all(b % a == 0 for a, b in zip(basis.orders, basis.orders[1:], strict=False))
    if len(basis.free) == rank and width:
        lattice = fmpz_mat([*free, *torsion, *periods]).hnf().table()[:width]
        assert [[int(c) for c in row] for row in lattice] == [
            [int(c) for c in row] for row in span.hnf().table()[:width]
        ]


def test_relations_of_generators() -> None:
    rng = random.Random(2)
    generator_relations(0, [], [])
    generator_relations(2, [], functionals(rng, 2, [], unit(2)))
    generator_relations(1, [2, 6], functionals(rng, 1, [2, 6], unit(3)))
    with pytest.raises(Inconsistent, match=r"2\*D1 - D2 = 0") as caught:
        generator_relations(2, [], functionals(rng, 1, [], [[1], [2]]))
    assert caught.value.expected == "independent generators"
    with pytest.raises(Inconsistent, match=r"no\. 1: not of order 3"):
        generator_relations(1, [3], functionals(rng, 1, [6], unit(2)))
    with pytest.raises(Inconsistent, match="a group of order 6, where the claimed orders give 12"):
        generator_relations(1, [12], functionals(rng, 1, [6], unit(2)))
    with pytest.raises(Inconsistent, match="a group of order 2"):
        generator_relations(0, [2, 2], functionals(rng, 0, [2], [[1], [1]]))


def test_relations_stand_out_or_not_at_all() -> None:
    assert true_relations([[1, 1, 0], [5000, 3, 1], [1, -4000, 90]], False) == [[1, 1, 0]]
    assert true_relations([[900, 1], [20, 700]], False) == []
    assert true_relations([[2, 0], [0, 3]], True) == [[2, 0], [0, 3]]
    # far from anything short: no relation
    assert true_relations([[10**6, 1], [1, 10**6]], False) == []
