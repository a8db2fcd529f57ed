"""Lattices against enumeration of small boxes."""

from __future__ import annotations

import random
from itertools import product

import pytest

from sieve.exact.lattice import Cosets, Found, ReducedLattice, hermite, kernel_lattice, right_inverse
from sieve.exact.primary import adapt


def random_modules(rng, n, primes=(2, 3)):
    out = []
    for prime in primes:
        m = rng.randint(0, 3)
        exponents = [rng.randint(1, 2) for _ in range(m)]
        rows = [[rng.randrange(prime**e) for _ in range(n)] for e in exponents]
        basis = adapt(prime, rows, exponents).basis
        if basis.rows:
            out.append(basis)
    return out


@pytest.mark.parametrize("seed", range(5))
def test_kernel_and_representatives(seed):
    rng = random.Random(seed)
    for _ in range(25):
        n = rng.randint(1, 3)
        modules = random_modules(rng, n)
        kernel = kernel_lattice(n, modules)
        index = 1
        for i in range(n):
            index *= kernel[i][i]
        order = 1
        for module in modules:
            order *= module.order
        assert index == order
        assert all(not any(module.values(row)) for module in modules for row in kernel)
        cosets = Cosets(n, modules)
        codes = tuple(rng.randrange(q) for module in modules for q in module.moduli)
        lifted = cosets.lift(codes)
        assert tuple(c for module in modules for c in module.values(lifted)) == codes


def test_right_inverse_of_nothing():
    assert right_inverse(5, 0, []) == []
    assert Cosets(3, []).lift(()) == (0, 0, 0)


def shortest_by_box(rows, target, exclude, radius):
    r = len(target)
    lattice = hermite(rows)

    def member(v):
        v = list(v)
        for i in range(r):
            factor, rest = divmod(v[i], lattice[i][i])
            if rest:
                return False
            v = [a - factor * b for a, b in zip(v, lattice[i], strict=True)]
        return not any(v)

    found = [Found(sum(a * a for a in x), x) for x in product(range(-radius, radius + 1), repeat=r)
             if member([a - b for a, b in zip(x, target, strict=True)]) and x not in exclude]
    return min(found, key=lambda f: (f.norm, f.vector))


@pytest.mark.parametrize("seed", range(6))
def test_shortest_vector_of_a_coset(seed):
    rng = random.Random(10 + seed)
    for _ in range(20):
        r = rng.randint(1, 3)
        rows = [[rng.randint(-6, 6) for _ in range(r)] for _ in range(r + rng.randint(0, 1))]
        if len(hermite(rows)) < r:
            continue
        lattice = ReducedLattice(rows)
        target = tuple(rng.randint(-10**6, 10**6) for _ in range(r))
        exclude: set[tuple[int, ...]] = set()
        for _ in range(3):
            found = lattice.shortest(target, exclude)
            assert found is not None
            # a box of this radius contains every vector that could be shorter
            radius = int(found.norm**0.5) + 1
            if (2 * radius + 1) ** r > 60000:
                break
            assert found == shortest_by_box(rows, target, exclude, radius)
            assert lattice.shortest(target, exclude, found.norm) == found
            assert found.norm == 0 or lattice.shortest(target, exclude, found.norm - 1) is None
            exclude.add(found.vector)


def test_rounding_is_not_enough_but_enumeration_is():
    """Seeded search for a coset where rounding plane by plane misses the shortest vector."""
    rng = random.Random(3)
    missed = 0
    for _ in range(200):
        rows = [[rng.randint(-50, 50) for _ in range(4)] for _ in range(4)]
        if len(hermite(rows)) < 4:
            continue
        lattice = ReducedLattice(rows)
        target = [rng.randint(0, 10**5) for _ in range(4)]
        rounded = lattice.reduce(target)
        found = lattice.shortest(target)
        assert found is not None and found.norm <= sum(a * a for a in rounded)
        missed += found.norm < sum(a * a for a in rounded)
    assert missed > 0


def test_huge_index_is_exact():
    q = 10**100 + 267
    step = 3 * 10**49 + 1
    lattice = ReducedLattice([(1, step), (0, q)])
    small = (-5, 7)
    far = (small[0] + 10**60, small[1] + step * 10**60 + q * 10**50)
    found = lattice.shortest(far)
    assert found == Found(74, small)
    second = lattice.shortest(far, {small})
    assert second is not None and second.norm > 74


def test_rank_zero_and_deficient():
    nothing = ReducedLattice([])
    assert nothing.shortest(()) == Found(0, ()) and nothing.shortest((), {()}) is None
    with pytest.raises(ValueError):
        ReducedLattice([(1, 2), (2, 4)])
