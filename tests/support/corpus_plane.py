"""Bad logs: plane curves, closed places, integral points."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

from tests.support.corpus_edits import Edit, Log, Traps, add, put, whole


def _own_equation(log: Log) -> int:
    """F itself as a section: it vanishes at every point to every order."""
    i = log.find("local", prime=5)
    rows = [[c % 5 for c in row] for row in log.records[0]["equation"]]
    log.records[i]["close"][0] = [[4, *rows], [0] * 16]
    return i


def _twice_at_infinity(log: Log) -> int:
    """The last point at infinity instead of another zero of a section that vanishes there."""
    i = log.find("local", prime=7)
    last = max(z for _, zeros in log.records[i]["close"] for z in zeros)
    entry = next(e for e in log.records[i]["close"] if e[1].count(last) == 1)
    entry[1] = [*entry[1][1:], last]
    return i


def _smaller_degree(log: Log) -> int:
    """A conic as a section of degree 1."""
    i = log.find("local", prime=5)
    conics = (e for e in log.records[i]["close"] if e[0][0] == 2)
    entry = next(e for e in conics if any(k + len(row) > 2 for k, row in enumerate(e[0][1:])))
    entry[0][0], entry[1] = 1, entry[1][:4]
    return i


def _hidden_degree(log: Log) -> int:
    """x y as a section of degree 1, in no more rows and columns than a line has."""
    i = log.find("local", prime=5)
    log.records[i]["close"][0] = [[1, [0], [0, 1]], [0, 0, 0, 0]]
    return i


def _closed(u: list[str], x: list[str], y: list[str], z: list[str]) -> Edit:
    """Another closed place in the third generator."""

    def edit(log: Log) -> int:
        i = log.find("group")
        log.records[i]["free"][2][0][1] = {"closed": [u, x, y, z]}
        return i

    return edit


def _scaled(factor: Fraction, blame: int) -> Edit:
    """The closed place in the variable T = factor t, its coordinates multiplied by the numerator."""

    def edit(log: Log) -> int:
        (place,) = log.records[log.find("group")]["free"][2][0][1].values()
        e, s = len(place[0]) - 1, factor.numerator
        place[0] = [str(Fraction(c) * factor ** (e - k)) for k, c in enumerate(place[0])]
        place[1:] = [[str(s * Fraction(c) / factor**k) for k, c in enumerate(row)] for row in place[1:]]
        return log.find("local", prime=blame)

    return edit


def _place_zero(log: Log) -> int:
    """Another point as a zero of the section through the place."""
    i = log.find("local", prime=7)
    zeros = log.records[i]["places"][0][2]
    zeros[:] = sorted([*zeros[1:], zeros[-1]])
    return i


def _padic_section(change: Any) -> Edit:
    """Another section through the place modulo p^N."""

    def edit(log: Log) -> int:
        i = log.find("padic")
        entry = log.records[i]["places"][0]
        entry[1] = change(entry[1])
        log.records[i]["terms"] = 60
        return i

    return edit


def _times_line(section: list[Any]) -> list[Any]:
    """The line x = y once more, which contains the place."""
    n, *rows = section
    out = [[0] * (n + 2) for _ in range(len(rows) + 1)]
    for k, row in enumerate(rows):
        for i, c in enumerate(row):
            out[k][i + 1] += c
            out[k + 1][i] -= c
    return [n + 1, *out]


def _times_quadratic(section: list[Any]) -> list[Any]:
    """x^2 + 2, which has no rational zeros modulo 5."""
    n, *rows = section
    out = []
    for row in rows:
        wide = [2 * c for c in row] + [0, 0]
        out.append([a + b for a, b in zip(wide, [0, 0, *row], strict=True)])
    return [n + 2, *out]


def _branch(log: Log) -> int:
    i = log.find("local")
    log.records.insert(i, {"kind": "branch", "factors": [[1]], "primes": [3]})
    return i


def _called_rational(log: Log) -> int:
    """The point at infinity as an integral point."""
    i = log.find("fate")
    record = log.records[i]
    log.records[i] = {
        "kind": "fate",
        "prime": record["prime"],
        "id": record["id"],
        "verdict": "rational",
        "points": [[1, 0, 0]],
        "given": True,
        "sole": True,
    }
    return i


def _all_points(log: Log) -> int:
    """Rational points are asked for, and the candidate at infinity still has no uses."""
    log.records[log.find("group")]["integral"] = False
    return log.find("fate")


def _integral_point_eliminated(log: Log) -> int:
    """An integral point by all the uses that some other candidate has."""
    uses = max((r["uses"] for r in log.records if r.get("uses")), key=len)
    i = log.find("fate", verdict="rational")
    p, name = log.records[i]["prime"], log.records[i]["id"]
    log.records[i] = {"kind": "fate", "prime": p, "id": name, "verdict": "eliminated", "uses": uses}
    return i


def traps() -> Traps:
    """All of this file."""
    out = Traps()
    rejected = out.rejected
    # the curve
    rejected("plane_genus", "genus", put("header", "genus", value=4), "plane_points")
    rejected("plane_weight", "model", put("header", "weight", value=2), "plane_points")
    rejected(
        "plane_of_genus_three_as_hyperelliptic", "model", put("header", "weight", value=4), "plane_points"
    )
    rejected(
        "plane_fourfold_line", "singular", put("header", "equation", value=[[0, 0, 0, 0, 1]]), "plane_points"
    )
    product = [[-1, 0, 0, 0, 1], [], [], [], [1]]
    rejected("plane_without_equation", "trailing-zero", put("header", "equation", value=[]), "plane_points")
    rejected(
        "plane_with_a_node",
        "singular",
        put("header", "equation", value=[[0, 0, 1, 0, 1], [], [-1]]),
        "plane_points",
    )
    rejected(
        "plane_another_curve",
        "point-off-curve",
        put("header", "equation", value=product, blame="group"),
        "plane_points",
    )
    rejected("variable_twice", "variables", put("header", "variables", value=["x", "y", "x"]), "plane_points")
    rejected("variable_with_a_sign", "variables", put("header", "variables", 2, value="-z"), "plane_points")
    rejected(
        "plane_sign_of_a_point",
        "point-form",
        put("group", "base", 0, 1, "point", value=lambda p: [-c for c in p]),
        "plane_points",
    )
    rejected(
        "plane_common_factor",
        "point-form",
        put("group", "base", 0, 1, "point", value=[0, 0, 2]),
        "plane_points",
    )
    rejected(
        "plane_base_of_degree_five", "divisor-degree", put("group", "base", 0, 0, value=5), "plane_points"
    )
    rejected(
        "plane_chart_of_a_candidate",
        "point-form",
        put("candidate", "point", value=[2, 1, 0], id="d5"),
        "plane_discs",
    )
    rejected("plane_at_a_bad_prime", "not-smooth", put("local", "prime", value=13), "plane_points")
    rejected("plane_branch", "branch", whole(_branch), "plane_points")
    # sections
    rejected("section_that_is_the_equation", "section-vanishes", whole(_own_equation), "plane_points")
    rejected(
        "section_that_is_zero",
        "section-vanishes",
        put("local", "close", 0, value=[[1, [0]], [0, 0, 0, 0]]),
        "plane_points",
    )
    rejected("point_at_infinity_twice", "zero-multiplicity", whole(_twice_at_infinity), "plane_points")
    rejected(
        "point_eightfold_after_simpler_zeros",
        "zero-multiplicity",
        put("local", "close", 16, 1, value=[5] * 8, prime=7),
        "plane_points",
    )
    rejected("section_of_smaller_degree", "form-degree", whole(_smaller_degree), "plane_points")
    rejected("section_of_hidden_degree", "form-degree", whole(_hidden_degree), "plane_points")
    out.malformed("section_of_degree_zero", "range", put("local", "close", 0, 0, 0, value=0), "plane_points")
    out.malformed("section_without_a_degree", "length", put("local", "close", 0, 0, value=[]), "plane_points")
    rejected(
        "plane_combination", "combination", put("padic", "discs", 0, 2, 0, 1, value=add(1)), "plane_points"
    )
    rejected(
        "plane_logarithm",
        "relation-log",
        put("local", "base", 0, 1, 0, value=lambda a: (a + 1) % 659, prime=7),
        "plane_points",
    )
    rejected(
        "section_with_more_zeros_than_its_degree_has",
        "form-degree",
        put("local", "close", 0, 0, 1, value=lambda row: [*row, *[0] * 20]),
        "plane_points",
    )
    out.declined(
        "equation_of_degree_27", put("header", "equation", value=[[0] * 27 + [1], [1]]), "plane_points"
    )
    # places
    place = "plane_closed_place"
    rejected(
        "place_of_one_point_twice", "place-collapses", _closed(["-1", "0", "0", "1"], [], ["1"], []), place
    )
    rejected(
        "place_zero_at_a_root", "place-collapses", _closed(["0", "0", "-1", "1"], [], ["0", "1"], []), place
    )
    rejected("place_of_zeros", "place-collapses", _closed(["-1", "0", "0", "1"], [], [], []), place)
    rejected(
        "plane_place_off_the_curve",
        "place-off-curve",
        _closed(["-1", "0", "0", "1"], ["0", "1"], ["1"], ["1"]),
        place,
    )
    rejected("place_that_collapses_modulo_seven", "place-collapses", _scaled(Fraction(7), 7), place)
    rejected("place_not_integral_at_seven", "place-denominator", _scaled(Fraction(1, 7), 7), place)
    rejected(
        "plane_section_misses_the_place",
        "place-section",
        put("local", "places", 0, 1, 1, 0, value=lambda c: (c + 1) % 7, prime=7),
        place,
    )
    rejected("plane_place_with_another_zero", "zero-multiplicity", whole(_place_zero), place)
    rejected("place_section_twice_near_the_place", "section-zeros", _padic_section(_times_line), place)
    rejected("place_section_with_conjugate_zeros", "section-zeros", _padic_section(_times_quadratic), place)
    rejected(
        "plane_section_misses_the_place_modulo_p_n",
        "place-section",
        _padic_section(lambda s: [s[0], [5**4, *s[1][1:]], *s[2:]]),
        place,
    )
    rejected(
        "place_section_divisible_by_p",
        "section-vanishes",
        _padic_section(lambda s: [s[0], *([5**5 * c for c in row] for row in s[1:])]),
        place,
    )
    # integral points
    rejected(
        "integral_point_eliminated", "not-eliminated", whole(_integral_point_eliminated), "integral_points"
    )
    rejected("point_at_infinity_called_integral", "not-integral", whole(_called_rational), "integral_points")
    rejected("infinity_left_out_of_rational_points", "not-eliminated", whole(_all_points), "integral_points")
    return out
