"""Relations between points modulo p, and the sections that show them, checked on the norm of the section."""

from __future__ import annotations

from itertools import product

import flint
import pytest

from sieve.curves.discs import ResidueDisc
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.errors import InternalError
from sieve.exact.series import polynomial
from sieve.local.centres import contact_orders
from sieve.local.disc_integrals import DiscIntegrals
from sieve.local.picard import picard_group
from sieve.local.supported_sections import Scheme, SupportedSection, find_section, relation_lattice

X0_67 = HyperellipticCurve([1, -4, 2, -2, 1, 2, 1])
CURVES = [
    (X0_67, 3),
    (X0_67, 7),
    (HyperellipticCurve([0, -1, 0, 4, -4, 1], [1]), 2),
    (HyperellipticCurve([0, 60, -112, 65, -14, 1]), 7),
    (HyperellipticCurve([4, 8, 1, 3, 7, -2, 2, 1]), 3),
]


def zeros_of(curve: HyperellipticCurve, p: int, section: SupportedSection) -> dict[tuple[int, int, int], int]:
    """The zeros of a section that vanishes on F_p-points, no two of them conjugate: read off its norm."""
    even, odd = (flint.nmod_poly(list(c), p) for c in section.through(Scheme.empty(p)))
    f, h = (flint.nmod_poly([a % p for a in c], p) for c in (curve.f, curve.h))
    norm = even * even - h * even * odd - f * odd * odd
    zeros: dict[tuple[int, int, int], int] = {}
    for factor, multiplicity in norm.factor()[1]:
        assert factor.degree() == 1
        x = -int(factor[0]) % p
        zeros[x, -int(even(x)) * pow(int(odd(x)), -1, p) % p, 1] = int(multiplicity)
    missing = 2 * section.multiple - norm.degree()
    if missing:
        lead = int(odd[section.multiple - curve.genus - 1])
        zeros[1, -int(even[section.multiple]) * pow(lead, -1, p) % p, 0] = missing
    return zeros


@pytest.mark.parametrize(("curve", "p"), CURVES)
def test_relations_are_all_vectors_of_trivial_class(curve: HyperellipticCurve, p: int) -> None:
    """All vectors with entries -1, 0, 1 over at most four points, against the class in the group."""
    group = picard_group(curve.modulo(p))
    numbers = list(range(min(4, group.curve.count)))
    basis = relation_lattice(group, numbers)
    assert len(basis) == len(numbers)
    lattice = flint.fmpz_mat(basis)
    for vector in product((-1, 0, 1), repeat=len(numbers)):
        degree = sum(vector)
        total = [0] * len(group.invariants)
        group.add(total, -(degree // 2), group.unit_log)
        for n, i in zip(vector, numbers, strict=True):
            group.add(total, n, group.point_logs[i])
        trivial = degree % 2 == 0 and not any(total)
        solution = lattice.transpose().solve(flint.fmpz_mat([[n] for n in vector]))
        assert trivial == all(int(solution[i, 0].q) == 1 for i in range(len(numbers)))


@pytest.mark.parametrize(("curve", "p"), CURVES)
def test_sections_have_the_prescribed_zeros(curve: HyperellipticCurve, p: int) -> None:
    group = picard_group(curve.modulo(p))
    integrals = DiscIntegrals(curve, group.curve)
    checked = 0
    for row in relation_lattice(group, integrals.leaders + integrals.ramified):
        contacts = contact_orders(integrals, row)
        if not contacts:
            continue
        section = find_section(integrals.discs, contacts, Scheme.empty(p), p, curve.genus)
        expected = {integrals.discs[i].point: e for i, e in contacts.items()}
        assert zeros_of(curve, p, section) == expected
        checked += 1
    assert checked


def test_a_section_through_a_divisor_vanishes_on_it() -> None:
    """x^2 + 1 = 0, y = w: f = (x + 2)^2 - (x^2 + 1)(x^4 + 3) is a curve with such a divisor."""
    f = [a - b for a, b in zip([4, 4, 1, 0, 0, 0, 0], [3, 0, 3, 0, 1, 0, 1], strict=True)]
    curve, p = HyperellipticCurve(f), 7
    group = picard_group(curve.modulo(p))
    integrals = DiscIntegrals(curve, group.curve)
    place = curve.mumford([1, 0, 1], [2, 1])
    local = group.curve.reduce(place)
    numbers = integrals.leaders + integrals.ramified
    first, *rest = relation_lattice(group, numbers, [2, *group.log(local)])
    assert first[0] >= 1 and all(row[0] == 0 for row in rest)
    assert [row[1:] for row in rest] == relation_lattice(group, numbers)
    modulus, scheme = p**5, Scheme(polynomial([1, 0, 1], p**5), polynomial([2, 1], p**5))
    assert first[0] == 1
    section = find_section(integrals.discs, contact_orders(integrals, first[1:]), scheme.reduced(p), p, 2)
    even, odd = (polynomial(c, modulus) for c in section.through(scheme))
    assert ((even + odd * scheme.w) % scheme.u).is_zero()
    assert even.degree() <= section.multiple and odd.degree() <= section.multiple - 3


def test_zeros_of_nontrivial_class_are_refused() -> None:
    group = picard_group(X0_67.modulo(7))
    discs = [ResidueDisc(X0_67.f, X0_67.h, 2, 7, point, i) for i, point in enumerate(group.curve.points)]
    for contacts in ({0: 6}, {0: 3}, {0: 2, 2: 4}):
        with pytest.raises(InternalError):
            find_section(discs, contacts, Scheme.empty(7), 7, 2)
