"""Relations between points modulo p, and the sections that show them, checked on the norm of the section."""

from __future__ import annotations

from itertools import product

import flint
import pytest

from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.protocol import Curve
from sieve.errors import InternalError
from sieve.exact.lattice import hermite
from sieve.exact.series import polynomial
from sieve.local.centres import relation_basis
from sieve.local.disc_integrals import DiscIntegrals
from sieve.local.effective import EffectiveRelations, unit_vectors
from sieve.local.picard import picard_group
from sieve.local.supported_sections import SupportedSection, find_section, relation_lattice, scheme_of
from tests.support.quartics import quartics

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
    rows = [*section.rows, []]
    even, odd = (flint.nmod_poly(list(c), p) for c in rows[:2])
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


def conjugate_pairs(curve: HyperellipticCurve, p: int, vector: tuple[int, ...]) -> bool:
    """Whether both points of some fibre occur, or a ramified point twice."""
    partner = curve.modulo(p).partner.tolist()
    return any(n and vector[partner[i]] and (i != partner[i] or n > 1) for i, n in enumerate(vector))


@pytest.mark.parametrize(("curve", "p"), CURVES)
def test_sections_have_the_prescribed_zeros(curve: HyperellipticCurve, p: int) -> None:
    group = picard_group(curve.modulo(p))
    integrals = DiscIntegrals(curve, group.curve)
    basis = relation_basis(integrals, group)
    checked = 0
    for row in basis.rows:
        section = find_section(integrals.discs, integrals.model, row)
        expected = {integrals.discs[i].point: e for i, e in enumerate(row) if e}
        orders = [disc.order(section.rows, section.multiple, 30) for disc in integrals.discs]
        assert orders == list(row)
        if not conjugate_pairs(curve, p, row):
            assert zeros_of(curve, p, section) == expected
            checked += 1
    assert checked


PLANE = [(quartics()[name][0], p) for name, p in (("X0p97", 3), ("X0p97", 7), ("X0p151", 3), ("X0p113", 5))]


@pytest.mark.parametrize(("curve", "p"), [*CURVES, *PLANE])
def test_effective_relations_span_all_relations(curve: Curve, p: int) -> None:
    """The index of the effective vectors in Z^n equals that of the kernel of the class map."""
    group = picard_group(curve.modulo(p))
    integrals = DiscIntegrals(curve, group.curve)
    basis = relation_basis(integrals, group)
    everything = relation_lattice(group, range(group.curve.count))
    assert all(n >= 0 for row in basis.rows for n in row)
    rows = hermite([*basis.rows, *basis.relations.units])
    assert rows == hermite(everything)


@pytest.mark.parametrize(("curve", "p"), PLANE)
def test_sections_of_plane_curves(curve: Curve, p: int) -> None:
    """Forms of degree 1 and more have the prescribed zeros and no others; units are all split lines."""
    group = picard_group(curve.modulo(p))
    integrals = DiscIntegrals(curve, group.curve)
    for row in relation_basis(integrals, group).rows:
        section = find_section(integrals.discs, integrals.model, row)
        orders = [disc.order(section.rows, section.multiple, 40) for disc in integrals.discs]
        assert orders == list(row) and sum(orders) == 4 * section.multiple
    lines = {
        tuple(disc.order([[c, a], [b]], 1, 5) for disc in integrals.discs)
        for a, b, c in product(range(p), repeat=3) if (a, b, c) != (0, 0, 0)
    }
    assert set(unit_vectors(integrals.discs, integrals.model)) == {v for v in lines if sum(v) == 4}


@pytest.mark.parametrize(("curve", "p"), [*CURVES[1:], *PLANE])
def test_relations_that_avoid_discs(curve: Curve, p: int) -> None:
    group = picard_group(curve.modulo(p))
    integrals = DiscIntegrals(curve, group.curve)
    discs, model = integrals.discs, integrals.model
    units = unit_vectors(discs, model)
    for avoid in ({0}, {0, len(discs) - 1}):
        relations = EffectiveRelations(discs, model, group, units, avoid)
        for vector in relations.relations:
            for least in (0, 20):
                found = relations.effective(vector, least)
                assert min(found) >= 0 and not any(found[i] for i in avoid) and sum(found) >= least
                # the class is a multiple of U still: there is a section
                find_section(discs, model, found)


def test_a_section_through_a_divisor_vanishes_on_it() -> None:
    """x^2 + 1 = 0, y = w: f = (x + 2)^2 - (x^2 + 1)(x^4 + 3) is a curve with such a divisor."""
    f = [a - b for a, b in zip([4, 4, 1, 0, 0, 0, 0], [3, 0, 3, 0, 1, 0, 1], strict=True)]
    curve, p = HyperellipticCurve(f), 7
    group = picard_group(curve.modulo(p))
    integrals = DiscIntegrals(curve, group.curve)
    place = curve.mumford([1, 0, 1], [2, 1])
    local = group.curve.reduce(place)
    numbers = list(range(group.curve.count))
    first, *rest = relation_lattice(group, numbers, [2, *group.log(local)])
    assert first[0] >= 1 and all(row[0] == 0 for row in rest)
    assert [row[1:] for row in rest] == relation_lattice(group, numbers)
    modulus = p**5
    scheme = scheme_of(place, modulus)
    assert first[0] == 1
    relations = EffectiveRelations(
        integrals.discs, integrals.model, group, unit_vectors(integrals.discs, integrals.model)
    )
    extra = relation_lattice(group, relations.heads, [2, *group.log(local)])[0]
    vector = relations.effective(extra[1:])
    section = find_section(integrals.discs, integrals.model, vector, scheme.reduced(p))
    rows = [*section.through(scheme, p), []]
    even, odd = (polynomial(c, modulus) for c in rows[:2])
    assert ((even + odd * scheme.y) % scheme.u).is_zero()
    assert even.degree() <= section.multiple and odd.degree() <= section.multiple - 3
    pairs = [pair for x, y in zip(rows[:-1], section.rows, strict=True) for pair in zip(x, y, strict=True)]
    assert all((a - b) % p == 0 for a, b in pairs)


def test_zeros_of_nontrivial_class_are_refused() -> None:
    group = picard_group(X0_67.modulo(7))
    integrals = DiscIntegrals(X0_67, group.curve)
    for contacts in ({0: 6}, {0: 3}, {0: 2, 2: 4}):
        with pytest.raises(InternalError):
            find_section(integrals.discs, integrals.model, contacts)
