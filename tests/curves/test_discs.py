"""Residue discs: centres, parameters and expansions satisfy the equations that define them."""

from __future__ import annotations

import pytest

from sieve.curves.discs import ResidueDisc
from sieve.errors import InternalError
from sieve.exact.series import coefficients, evaluate_at, polynomial
from tests.support.quartics import quartics

# (f, h, genus, p): even and odd degree, h zero and not, p = 2, rational and ramified points at infinity
CURVES = [
    ([1, -4, 2, -2, 1, 2, 1], [], 2, 3),
    ([1, -4, 2, -2, 1, 2, 1], [], 2, 13),
    ([0, 60, -112, 65, -14, 1], [], 2, 7),
    ([0, -1, -1, 3, 1, -3, 1], [1], 2, 2),
    ([6, 9, 0, -5, -1, 1], [1, 1, 0, 1], 2, 2),
    ([0, -1, 0, 4, -4, 1], [1], 2, 2),
    ([4, 8, 1, 3, 7, -2, 2, 1], [], 3, 5),
]


def points(f: list[int], h: list[int], genus: int, p: int) -> list[tuple[int, int, int]]:
    """All points modulo p, by trying every pair."""

    def on(x: int, y: int, z: int) -> bool:
        hx = sum(c * x**i * z ** (genus + 1 - i) for i, c in enumerate(h))
        fx = sum(c * x**i * z ** (2 * genus + 2 - i) for i, c in enumerate(f))
        return (y * y + hx * y - fx) % p == 0

    affine = [(x, y, 1) for x in range(p) for y in range(p) if on(x, y, 1)]
    return affine + [(1, y, 0) for y in range(p) if on(1, y, 0)]


def discs(f: list[int], h: list[int], genus: int, p: int) -> list[ResidueDisc]:
    rows = [[-c for c in f], h, [1]]
    return [
        ResidueDisc(rows, genus + 1, 2 * genus + 2, p, point, i)
        for i, point in enumerate(points(f, h, genus, p))
    ]


def chart_parts(disc: ResidueDisc) -> tuple[list[int], list[int]]:
    """f and h in the chart of the disc, read off its equation b^2 + h(a) b - f(a)."""
    assert disc.rows[2] == [1]
    return [-c for c in disc.rows[0]], disc.rows[1]


@pytest.mark.parametrize("curve", CURVES)
def test_expansions_satisfy_the_equation(curve: tuple[list[int], list[int], int, int]) -> None:
    p = curve[3]
    for disc in discs(*curve):
        series, (f, h) = disc.expansion(9, 25), chart_parts(disc)
        value = series.b.mul_low(series.b + evaluate_at(h, series.a, 25), 25)
        assert value == evaluate_at(f, series.a, 25)
        assert (int(series.a[0]), int(series.b[0])) == disc.centre(9)
        assert (int(series.a[0]) % p, int(series.b[0]) % p) == disc.residue
        parameter = series.b if disc.ramified else series.a
        assert coefficients(parameter, 25)[1:] == [1] + [0] * 23


@pytest.mark.parametrize("curve", CURVES)
def test_differentials_are_the_given_ones(curve: tuple[list[int], list[int], int, int]) -> None:
    """(2b + h) times the form is a^i da/dt; at infinity x^j dx/(2y+h) = -a^(g-1-j) da/(2b+h)."""
    genus, p = curve[2], curve[3]
    for disc in discs(*curve):
        series = disc.expansion(8, 20)
        slope = 2 * series.b + evaluate_at(chart_parts(disc)[1], series.a, 20)
        da = series.a.derivative()
        power = polynomial([1], p**8)
        forms = [-form for form in series.forms[::-1]] if disc.at_infinity else series.forms
        assert len(forms) == genus
        for form in forms:
            assert form.mul_low(slope, 19) == power.mul_low(da, 19)
            power = power * series.a


@pytest.mark.parametrize("curve", CURVES)
def test_conjugate_discs_have_conjugate_centres(curve: tuple[list[int], list[int], int, int]) -> None:
    p = curve[3]
    by_residue = {(disc.at_infinity, disc.residue): disc for disc in discs(*curve)}
    for (at_infinity, (a, b)), disc in by_residue.items():
        h = chart_parts(disc)[1]
        ha = sum(c * a**i for i, c in enumerate(h))
        partner = by_residue[at_infinity, (a, (-b - ha) % p)]
        a0, b0 = disc.centre(12)
        value = sum(c * a0**i for i, c in enumerate(h))
        if not disc.ramified:
            assert partner.centre(12) == (a0, (-b0 - value) % p**12)
        else:
            assert partner is disc
            if p > 2:
                assert (2 * b0 + value) % p**12 == 0


@pytest.mark.parametrize("curve", CURVES)
def test_points_of_a_disc(curve: tuple[list[int], list[int], int, int]) -> None:
    p = curve[3]
    for disc in discs(*curve):
        series = disc.expansion(7, 8)
        for t in (0, p, 5 * p, p**3):
            a, b = disc.coordinates(t, 7)
            assert disc.equation(a, b, p**7) == 0
            assert (a - int(series.a(t))) % p**7 == 0 and (b - int(series.b(t))) % p**7 == 0
            assert disc.parameter(a, b, 7) == t
            x, y, z = disc.weighted(a, b)
            assert (x % p, y % p, z % p) == disc.point
        assert disc.centre(3) == tuple(c % p**3 for c in disc.centre(10))


def test_sections_restrict_to_their_values() -> None:
    """x^3 + 2 x + (x - 1) y, a section of multiple 4, at a point of every disc."""
    f, h, genus, p = [1, -4, 2, -2, 1, 2, 1], [0, 1], 2, 7
    for disc in discs(f, h, genus, p):
        series = disc.restrict([[0, 2, 0, 1], [-1, 1]], 4, 6, 10)
        a, b = disc.coordinates(3 * p, 6)
        if disc.at_infinity:
            # a = 1/x, y = b/a^3, divided by x^4
            expected = a + 2 * a**3 + (1 - a) * b
        else:
            expected = a**3 + 2 * a + (a - 1) * b
        assert (int(series(3 * p)) - expected) % p**6 == 0


def test_the_numbering_of_discs_is_checked() -> None:
    with pytest.raises(InternalError):
        ResidueDisc([[-1, 0, 0, 0, 0, -1], [], [1]], 3, 6, 7, (0, 3, 1), 0)


# ---- plane curves ----------------------------------------------------------------------------------------


def plane_discs(name: str, p: int) -> list[ResidueDisc]:
    curve = quartics()[name][0]
    return [ResidueDisc(curve.rows, 1, 4, p, point, i) for i, point in enumerate(curve.modulo(p).points)]


@pytest.mark.parametrize(("name", "p"), [("X0p97", 2), ("X0p97", 3), ("X0p113", 5), ("level13_split", 7)])
def test_discs_of_plane_curves(name: str, p: int) -> None:
    """Points of every disc: on the curve (as a form), in the disc, with the parameter they were made from."""
    curve = quartics()[name][0]
    kinds = set()
    for disc in plane_discs(name, p):
        kinds.add((disc.chart, disc.ramified))
        series = disc.expansion(7, 10)
        parameter = series.b if disc.ramified else series.a
        assert coefficients(parameter, 10)[1:] == [1] + [0] * 8
        assert disc.centre(5)[disc.ramified] == disc.residue[disc.ramified]
        for t in (0, p, 3 * p, p**3):
            a, b = disc.coordinates(t, 7)
            x, y, z = disc.weighted(a, b)
            assert tuple(c % p for c in (x, y, z)) == disc.point
            assert sum(c * x**i * y**j * z**k for (i, j, k), c in curve.terms.items()) % p**7 == 0
            assert disc.parameter(a, b, 7) == t
            assert (a - int(series.a(t))) % p**7 == 0 and (b - int(series.b(t))) % p**7 == 0
            # 2 x^2 + x y - 3 y z + z^2 as a form of degree 2
            form = disc.restrict([[1, 0, 2], [-3, 1]], 2, 7, 10)
            assert (int(form(t)) - (2 * x * x + x * y - 3 * y * z + z * z)) % p**7 == 0
    assert {chart for chart, _ in kinds} >= {"z", "x"} and any(ramified for _, ramified in kinds)
