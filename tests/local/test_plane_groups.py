"""J(F_v) of smooth plane curves: orders, elliptic quotients, other models, principal divisors, evidence."""

from __future__ import annotations

import json
import random
from functools import cache

import numpy as np
import pytest
from cypari import pari
from flint import fmpz, fmpz_mat

from sieve.curves.divisors import ClosedPlace, Divisor, RationalPlace
from sieve.curves.plane import PlaneCurve, SingularPlaneCurve
from sieve.curves.plane_forms import monomials
from sieve.errors import BadReduction, Uncertified
from sieve.local.picard import PicardGroup, picard_group
from sieve.local.rational_sections import Section, present, section_through
from sieve.local.records import class_bytes, classes_from_bytes, divisor_log, local_record
from sieve.proof.witness_local import local_document
from tests.support.plane_cases import moved
from tests.support.quartics import DATA, line_places, quartics, random_line
from tests.support.sweep import full_sweep

NAMES = sorted(quartics())
DIAGONAL = [(1, 1, -17, 0, 0, 0), (1, 1, -1, 0, 0, 0), (1, -1, 2, 0, -1, -2), (1, -2, -2, 1, 1, 1)]


@cache
def group_of(name: str, v: int) -> PicardGroup | None:
    curve = quartics()[name][0]
    return picard_group(curve.modulo(v)) if curve.is_smooth(v) else None


def primes(low: int, high: int) -> list[int]:
    return [v for v in range(low, high) if fmpz(v).is_prime()]


# ---- orders --------------------------------------------------------------------------------------------


def test_stored_orders() -> None:
    """#J(F_v) = L(1) at all stored primes, v = 2 and 3 included; source: data/reference/quartics.json."""
    compared = 0
    for case in json.loads(DATA.read_text()):
        for v, coefficients in case["Lpoly"].items():
            group = group_of(case["id"], int(v))
            assert group is not None and group.order == sum(coefficients)
            compared += 1
    assert compared == 60


@pytest.mark.parametrize("coefficients", DIAGONAL)
def test_orders_of_products_of_elliptic_curves(coefficients: tuple[int, ...]) -> None:
    """a x^4 + b y^4 + c z^4 + d x^2 y^2 + e y^2 z^2 + f x^2 z^2: J is isogenous to the product of three
    elliptic curves, the quotients by the three involutions; their orders are PARI's."""
    a, b, c, d, e, f = coefficients
    curve = PlaneCurve({
        (4, 0, 0): a, (0, 4, 0): b, (0, 0, 4): c, (2, 2, 0): d, (0, 2, 2): e, (2, 0, 2): f,
    })
    quotients = []
    for first, second, third in (
        (d * d - 4 * a * b, 2 * d * f - 4 * a * e, f * f - 4 * a * c),
        (d * d - 4 * a * b, 2 * d * e - 4 * b * f, e * e - 4 * b * c),
        (e * e - 4 * b * c, 2 * e * f - 4 * c * d, f * f - 4 * a * c),
    ):
        quotients.append(pari(f"ellinit([0,{second},0,{first * third},0])"))
    for v in [*primes(5, 80), 101, 199, 293]:
        if curve.is_smooth(v):
            expected = 1
            for quotient in quotients:
                expected *= v + 1 - int(quotient.ellap(v))
            assert picard_group(curve.modulo(v)).order == expected


@pytest.mark.parametrize("v", [*primes(2, 60), 101, 251, 499, 997])
def test_level_thirteen(v: int) -> None:
    """The Jacobians of the two curves of level 13 are isogenous: equal orders."""
    first, second = group_of("level13_split", v), group_of("level13_S4", v)
    assert (first is None) == (second is None) == (v == 13)
    if first is not None and second is not None:
        assert first.order == second.order


@pytest.mark.parametrize("name", NAMES)
def test_certified(name: str) -> None:
    """Every prime of good reduction gives a certified group, and evidence for it, where points generate."""
    curve = quartics()[name][0]
    tried = [31, 43, 53, 61, 89, 127, 211, 307]
    for v in tried:
        if curve.is_smooth(v):
            group = group_of(name, v)
            assert group is not None and "index" in group.reason
            bound = 4 * v**0.5
            assert group.rational_generation == (group.curve.count > bound)
            assert (present(group) is not None) == group.rational_generation


@pytest.mark.slow
@pytest.mark.parametrize("name", NAMES)
def test_certified_everywhere(name: str) -> None:
    curve = quartics()[name][0]
    for v in primes(29, 500)[:: 1 if full_sweep() else 8]:
        if curve.is_smooth(v):
            group = picard_group(curve.modulo(v))
            if group.rational_generation:
                assert present(group) is not None


# ---- structure and logarithms ---------------------------------------------------------------------------


@pytest.mark.parametrize("name", ["level13_S4", "X0p151", "fourth_powers_17", "x2y3z7_C3"])
def test_other_models(name: str) -> None:
    """A random projective change of coordinates: same groups, same relations between the known points."""
    curve, points = quartics()[name]
    rng = random.Random(name)
    while True:
        matrix = [[rng.randint(-2, 2) for _ in range(3)] for _ in range(3)]
        determinant = int(fmpz_mat(matrix).det())
        if determinant:
            break
    image = moved(curve, matrix)
    adjugate = fmpz_mat(matrix).inv()
    images = []
    for point in points:
        x, y, z = (sum(adjugate[i, j] * point[j] for j in range(3)) for i in range(3))
        images.append(image.normalise(*(_fraction(c) for c in (x, y, z))))
    for v in [7, 11, 17, 31, 59, 103]:
        if determinant % v and curve.is_smooth(v):
            here, there = picard_group(curve.modulo(v)), picard_group(image.modulo(v))
            assert here.invariants == there.invariants
            assert relations(here, points) == relations(there, images)


def _fraction(c: object) -> object:
    from fractions import Fraction

    return Fraction(int(c.p), int(c.q))


def relations(group: PicardGroup, points: list[tuple[int, int, int]]) -> list[list[int]]:
    """The lattice of all integer relations between the differences P - P0, in Hermite form."""
    logs = [group.point_logs[group.curve.index_of(*p)].tolist() for p in points]
    n, width = len(points) - 1, len(group.invariants)
    rows = [[*(a - b for a, b in zip(log, logs[0], strict=True))] for log in logs[1:]]
    whole = [[*row, *(int(i == k) for k in range(n))] for i, row in enumerate(rows)]
    whole += [[m if i == j else 0 for j in range(width)] + [0] * n for i, m in enumerate(group.invariants)]
    form = fmpz_mat(whole).hnf().tolist()
    return [[int(c) for c in row[width:]] for row in form if not any(row[:width]) and any(row)]


@pytest.mark.parametrize("name", NAMES)
def test_every_form_is_principal(name: str) -> None:
    """The zeros of lines, conics, cubics and quartics, of all multiplicities, add up to n times U."""
    seen_higher = seen_multiple = 0
    for v in (3, 5, 7, 11, 17, 29):
        group = group_of(name, v)
        if group is None:
            continue
        reduced = group.curve
        rng = np.random.default_rng(v)
        for k in range(40):
            divisor = reduced.section_divisor(reduced.random_section(rng, k % 4))
            if divisor is None or any(p not in group.higher_logs for p, _ in divisor.places):
                continue
            total = [0] * len(group.invariants)
            group.add(total, -divisor.units, group.unit_log)
            for i, m in divisor.points:
                group.add(total, m, group.point_logs[i])
                seen_multiple += m > 1
            for place, m in divisor.places:
                group.add(total, m, group.higher_logs[place])
                seen_higher += 1
            assert not any(total)
            degree = sum(m for _, m in divisor.points) + sum(m * (len(p[0]) - 1) for p, m in divisor.places)
            assert degree == 4 * divisor.units
    assert seen_higher and seen_multiple


@pytest.mark.parametrize("name", NAMES)
def test_lines_over_the_rationals(name: str) -> None:
    """The divisor of a line over Q, with closed points of all degrees up to 4, reduces to the class U."""
    curve, points = quartics()[name]
    rng = random.Random(name)
    degrees: set[int] = set()
    for _ in range(8):
        terms = random_line(curve, points, rng)
        degrees |= {place.degree for _, place in terms}
        for v in (5, 11, 19, 31, 67, 151):
            group = group_of(name, v)
            if group is None:
                continue
            try:
                assert divisor_log(group, Divisor.of(terms)) == group.unit_log
            except BadReduction:
                continue
            for _, place in terms:
                if isinstance(place, ClosedPlace):
                    check_through(curve, group, place)
    assert max(degrees) > 1


def check_through(curve: PlaneCurve, group: PicardGroup, place: ClosedPlace) -> None:
    """A section through a place shows its class: n U - (the other zeros)."""
    section = section_through(group.curve, place)
    if section is None:
        assert group.curve.count < 12
        return
    check_zeros(curve, group, section, place.degree)
    total = [0] * len(group.invariants)
    group.add(total, section.multiple, group.unit_log)
    for i in section.zeros:
        group.add(total, -1, group.point_logs[i])
    assert tuple(total) == group.log(group.curve.reduce(place))


def check_zeros(curve: PlaneCurve, group: PicardGroup, section: Section, missing: int = 0) -> None:
    v, degree = group.prime, section.multiple
    assert len(section.zeros) + missing == degree * curve.degree
    assert section.zeros == tuple(sorted(section.zeros))
    for i in section.zeros:
        x, y, z = group.curve.points[i]
        terms = ((j, k, c) for k, row in enumerate(section.rows) for j, c in enumerate(row) if c)
        assert sum(c * x**j * y**k * z ** (degree - j - k) for j, k, c in terms) % v == 0


@pytest.mark.parametrize("v", [3, 5, 7, 17, 29, 43, 61, 113, 241])
def test_presentation(v: int) -> None:
    """The sections of a presentation define every point and span all relations."""
    tried = 0
    for name in NAMES:
        group = group_of(name, v)
        found = None if group is None else present(group)
        if group is None or found is None:
            assert group is None or not group.rational_generation or v < 11
            continue
        tried += 1
        curve = quartics()[name][0]
        columns = {i: k for k, i in enumerate(found.base, start=1)}
        known = {i: [int(k == c) for c in range(len(found.base) + 1)] for i, k in columns.items()}
        known[found.origin] = [0] * (len(found.base) + 1)
        for section in found.define:
            check_zeros(curve, group, section)
            unknown = [i for i in section.zeros if i not in known]
            assert len(unknown) == 1
            row = [-sum(known[i][c] for i in section.zeros if i in known) for c in range(len(columns) + 1)]
            row[0] += section.multiple
            known[unknown[0]] = row
        assert len(known) == group.curve.count
        relations = []
        for section in found.close:
            check_zeros(curve, group, section)
            row = [sum(known[i][c] for i in section.zeros) for c in range(len(columns) + 1)]
            row[0] -= section.multiple
            relations.append(row)
        form = fmpz_mat(relations).hnf()
        index = 1
        for c in range(len(columns) + 1):
            index *= int(form[c, c])
        assert index == group.order
    assert tried


def test_document() -> None:
    """The record of the log: the closed places in order, every number a plain integer."""
    curve = quartics()["X0p113"][0]
    places = [p for _, p in line_places(curve, (1, 2, 5), (2, 1, 1)) if isinstance(p, ClosedPlace)]
    assert places
    document = local_document(curve, 53, places)
    assert [k for k, _, _ in document["places"]] == list(range(len(places)))
    for k, section, zeros in document["places"]:
        assert len(zeros) + places[k].degree == 4 * section[0]
    assert document["counts"] == 0 and document == json.loads(json.dumps(document))
    assert local_document(curve, 53, places) == document


def test_records() -> None:
    curve, points = quartics()["X0p97"]
    base = Divisor.of([(1, RationalPlace(points[0]))])
    divisors = [curve.difference(p, base) for p in points[1:4]]
    for v in (5, 19, 53, 97, 151):
        record = local_record(curve, base, divisors, v)
        if v == 97:
            assert record.skipped
            continue
        assert record.usable and record.points == curve.modulo(v).count
        # 19: places of degree 2 are needed; all else can be shown by sections with rational zeros
        assert record.expressible == (v != 19)
        allowed = {tuple(row) for row in record.allowed.tolist()}
        assert all(image in allowed for image in record.images) and (0,) * len(record.invariants) in allowed
        affine = local_record(curve, base, divisors, v, integral=True)
        assert len(affine.allowed) <= curve.modulo(v).affine_count


# ---- higher degree --------------------------------------------------------------------------------------


def random_curve(seed: str, degree: int) -> PlaneCurve:
    rng = random.Random(seed)
    while True:
        try:
            return PlaneCurve({e: rng.randint(-2, 2) for e in monomials(degree)})
        except SingularPlaneCurve:
            pass


@pytest.mark.parametrize(
    ("degree", "v"),
    [(4, 83), (4, 499), (5, 173), (5, 179), (5, 197), pytest.param(6, 1109, marks=pytest.mark.slow)],
)
def test_fermat_curves(degree: int, v: int) -> None:
    """x^m + y^m = z^m: #J(F_v) = (1 + v^e)^(g/e) where v^e = -1 modulo m (Weil 1949)."""
    curve = PlaneCurve({(degree, 0, 0): 1, (0, degree, 0): 1, (0, 0, degree): -1})
    half = next(e for e in range(1, degree) if (v**e + 1) % degree == 0)
    group = picard_group(curve.modulo(v))
    assert group.order == (1 + v**half) ** (curve.genus // half)
    assert group.curve.count == v + 1


@pytest.mark.parametrize(("degree", "v"), [(5, 163), (5, 251)])
def test_quintics(degree: int, v: int) -> None:
    """All lines add up to U, also those that were not used; another model has the same group; evidence."""
    curve = next(c for c in (random_curve(f"quintic {k}", degree) for k in range(99)) if c.is_smooth(v))
    group = picard_group(curve.modulo(v))
    lines = group.curve.split_sections()
    assert lines is not None
    moduli = np.array(group.invariants, dtype=group.point_logs.dtype)
    sums = group.point_logs[lines].sum(axis=1) % moduli
    assert (sums == np.array(group.unit_log, dtype=group.point_logs.dtype)).all()
    matrix = [[1, 2, 0], [0, 1, -1], [3, 0, 1]]
    assert picard_group(moved(curve, matrix).modulo(v)).invariants == group.invariants
    found = present(group)
    assert found is not None and len(found.base) < group.curve.count // 3
    for section in (*found.define, *found.close):
        check_zeros(curve, group, section)


def test_classes_modulo_large_numbers() -> None:
    """Invariants beyond 64 bits: classes are Python integers, exactly; records are sorted and distinct."""
    v = 997
    curve = PlaneCurve({
        (6, 0, 0): 1, (0, 6, 0): 2, (0, 0, 6): -3, (3, 2, 1): 1, (1, 1, 4): -1, (5, 0, 1): 1, (0, 5, 1): -1,
    })
    base = Divisor.of([(1, RationalPlace((1, 1, 1)))])
    record = local_record(curve, base, [], v)
    group = picard_group(curve.modulo(v))
    assert record.invariants == group.invariants and group.invariants[-1] > 2**64
    assert group.point_logs.dtype == object and record.allowed.dtype == object
    rows = [tuple(row) for row in record.allowed.tolist()]
    assert rows == sorted(set(rows)) and len(rows) == record.points and rows[0] == (0,) * len(rows[0])
    back = classes_from_bytes(class_bytes(record), len(rows), record.invariants)
    assert back.dtype == object and (back == record.allowed).all()
    lines = group.curve.split_sections()
    assert lines is not None
    for row in lines[:200].tolist():
        total = [sum(int(group.point_logs[i, j]) for i in row) % d for j, d in enumerate(group.invariants)]
        assert tuple(total) == group.unit_log


def test_refusals() -> None:
    """Where too few points, or too few sections, are at hand, the prime is not used."""
    sextic = random_curve("sextic", 6)
    for v in (5, 31, 101):
        if sextic.is_smooth(v):
            with pytest.raises(Uncertified):
                picard_group(sextic.modulo(v))
