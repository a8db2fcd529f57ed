"""The case file: what the user says about the curve and its Jacobian, read and checked for form.

Nothing here knows a curve; `resolve` turns what was read into points and divisors of one.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import Any

import flint

from sieve.curves.notation import (
    Origin,
    ParsedPoint,
    parse_point,
    parse_polynomial_point,
    parse_univariate,
    quote,
)
from sieve.errors import NotSupported
from sieve.files.equation import WrittenEquation, read_equation
from sieve.files.reading import Table, as_table, check_integer, describe, read_toml

FORMAT = "sieve-case/1"
MAX_RANK = 50
MAX_MULTIPLICITY = 10**6
MAX_ORDER = 10**9
KEYS = ("format", "name", "known_points", "integral", "curve", "field", "jacobian")
JACOBIAN_KEYS = (
    "rank", "rank_source", "base", "index_prime_to", "index_source", "generators", "generators_from",
    "torsion",
)  # fmt: skip
_POINT = "a point '(X : Y : Z)' or '(x, y)'"
_PLACE = "a point, or a table with root_of and point, or a table with mumford"
HALF_FIBRE = "half a fibre"
"""The base of a curve without a known divisor of degree 1: [2 P - U] takes the place of [P - B]."""


@dataclass(frozen=True)
class WrittenPoint:
    """A rational point as written."""

    point: ParsedPoint[Fraction]
    text: str
    origin: Origin


@dataclass(frozen=True)
class WrittenClosedPoint:
    """All conjugates of `point`, whose coordinates are polynomials in a root t of `modulus`."""

    modulus: tuple[Fraction, ...]
    point: ParsedPoint[tuple[Fraction, ...]]
    origin: Origin


@dataclass(frozen=True)
class WrittenMumford:
    """The divisor u(x) = 0, y = w(x); coefficients low degree first."""

    u: tuple[Fraction, ...]
    w: tuple[Fraction, ...]
    origin: Origin


@dataclass(frozen=True)
class WrittenFibres:
    """`count` whole fibres of the map (x, y) -> x; `half`: half of them is meant (as a base)."""

    count: int
    origin: Origin
    half: bool = False


WrittenPlace = WrittenPoint | WrittenClosedPoint | WrittenMumford | WrittenFibres


@dataclass(frozen=True)
class WrittenDivisor:
    """Multiplicities and places as written, in order; at least one, no zero multiplicity."""

    terms: tuple[tuple[int, WrittenPlace], ...]
    origin: Origin


@dataclass(frozen=True)
class Case:
    """The content of a case file.

    Fields: `equation`; `integral`, whether the integral points of the affine equation are asked for and not
    all rational points; `base` (one point is a divisor with one term, half a fibre is one whole fibre);
    `index_prime_to` (sorted primes that do not divide [J(Q) : G] on the user's word); `generators` (as many
    as the rank, or none); `generators_from` ("known_points" or None); `torsion` (pairs of an order >= 2 and
    a divisor).
    """

    path: str
    sha256: str
    name: str
    equation: WrittenEquation
    integral: bool
    known_points: tuple[WrittenPoint, ...]
    rank: int
    rank_source: str
    base: WrittenDivisor
    index_prime_to: tuple[int, ...]
    index_source: str
    generators: tuple[WrittenDivisor, ...]
    generators_from: str | None
    torsion: tuple[tuple[int, WrittenDivisor], ...]

    @property
    def origin(self) -> Origin:
        """The file, for messages about the case as a whole."""
        return Origin(self.path)


def load_case(path: str | Path) -> Case:
    """Read a case file.

    Returns the case; raises `InputError` (place and what was expected) for anything that the format does
    not allow, `NotSupported` for curve models and base fields that this version does not treat.
    """
    document = read_toml(path)
    table = document.table
    check_format(table, FORMAT)
    table.restrict(KEYS)
    name = _name(table)
    if table.has("field"):
        _refuse_field(table)
    equation = read_equation(table)
    integral = table.has("integral") and table.boolean("integral")
    points = table.array("known_points", "a list of points", [])
    known = tuple(_point(entry, table.at(f"known_points no. {i}")) for i, entry in enumerate(points, 1))

    jacobian = table.table("jacobian", "a table [jacobian]", JACOBIAN_KEYS)
    rank = jacobian.integer("rank", 0, MAX_RANK)
    rank_source = jacobian.text("rank_source", "where the upper bound on the rank is proved")
    base = _base(jacobian)
    index, index_source = _index(jacobian)
    generators = tuple(
        _divisor(entry.value("divisor", "a divisor"), entry.at("divisor"))
        for entry in _tables(jacobian, "generators", ["divisor"])
    )
    torsion = tuple(
        (
            entry.integer("order", 2, MAX_ORDER),
            _divisor(entry.value("divisor", "a divisor"), entry.at("divisor")),
        )
        for entry in _tables(jacobian, "torsion", ["order", "divisor"])
    )
    source = _generators_from(jacobian, rank, len(generators))
    return Case(
        str(path), document.sha256, name, equation, integral, known, rank, rank_source, base, index,
        index_source, generators, source, torsion,
    )  # fmt: skip


@dataclass(frozen=True)
class Sketch:
    """The part of a case file that says what the curve is; the rank and its source where they are given."""

    name: str
    equation: WrittenEquation
    integral: bool
    rank: int | None
    rank_source: str


def load_sketch(path: str | Path) -> Sketch:
    """Read the curve, and the rank if it is there, of a case file that may lack everything else.

    Raises `InputError` and `NotSupported` as `load_case` does.
    """
    table = read_toml(path).table
    check_format(table, FORMAT)
    table.restrict(KEYS)
    name = _name(table)
    if table.has("field"):
        _refuse_field(table)
    equation = read_equation(table)
    integral = table.has("integral") and table.boolean("integral")
    rank, source = None, ""
    if table.has("jacobian"):
        jacobian = table.table("jacobian", "a table [jacobian]", JACOBIAN_KEYS)
        if jacobian.has("rank"):
            rank = jacobian.integer("rank", 0, MAX_RANK)
        if jacobian.has("rank_source"):
            source = jacobian.text("rank_source", blank=True)
    return Sketch(name, equation, integral, rank, source)


def check_format(table: Table, known: str) -> None:
    """Refuse a file whose `format` is not `known`, before anything else is read from it."""
    value = table.text("format", f"format = {quote(known)}")
    if value != known:
        raise table.at("format").error(quote(value), quote(known))


def is_prime(value: int) -> bool:
    """Whether an integer below 2^64 is a prime; proved, not probable."""
    return value > 1 and bool(flint.fmpz(value).is_prime())


def _name(table: Table) -> str:
    name = table.text("name", "a name for the case")
    # the name becomes a directory name
    if len(name) > 100 or name[0] == "." or name != name.strip() or not name.isprintable():
        raise table.at("name").error(quote(name), "at most 100 printable characters, no '.' or blank first")
    if any(c in name for c in "/\\:"):
        raise table.at("name").error(quote(name), "a name without '/', '\\' and ':'")
    return name


def _refuse_field(table: Table) -> None:
    field = table.table("field", "a table [field]", ["minimal_polynomial"])
    text, origin = field.notation("minimal_polynomial", "a polynomial in a")
    degree = len(parse_univariate(text, "a", origin)) - 1
    if degree < 2:
        found = f"a polynomial of degree {max(degree, 0)}"
        raise origin.error(found, "degree at least 2, or no table [field]")
    raise NotSupported(origin.file, origin.place, "a number field", "a curve over Q in this version")


def _point(value: object, origin: Origin) -> WrittenPoint:
    if not isinstance(value, str):
        raise origin.error(describe(value), f"{_POINT}, as a text")
    point = parse_point(value, origin)
    check_coordinates(point, origin)
    return WrittenPoint(point, value, origin)


def check_coordinates(point: ParsedPoint[Any], origin: Origin) -> None:
    """Refuse a point that has not three coordinates, or two when they are affine."""
    wanted = 2 if point.affine else 3
    if len(point.entries) != wanted:
        kind = "affine" if point.affine else "projective"
        raise origin.error(f"{len(point.entries)} coordinates", f"{wanted} {kind} coordinates")


def _place(value: object, origin: Origin) -> WrittenPlace:
    if isinstance(value, str):
        return _point(value, origin)
    table = as_table(value, origin, _PLACE, ["root_of", "point", "mumford", "fibres"])
    if table.has("fibres"):
        if len(table.data) > 1:
            raise origin.error("fibres together with other keys", _PLACE)
        return WrittenFibres(table.integer("fibres", 1, MAX_MULTIPLICITY), origin)
    if table.has("mumford"):
        if len(table.data) > 1:
            raise origin.error("mumford together with other keys", _PLACE)
        pair = table.array("mumford", "a list of two polynomials u and w")
        if len(pair) != 2:
            raise table.at("mumford").error(describe(pair), "two polynomials u and w")
        parts = []
        for key, text in zip("uw", pair, strict=True):
            if not isinstance(text, str):
                raise table.at("mumford").at(key).error(describe(text), "a polynomial in x, as a text")
            parts.append(parse_univariate(text, "x", table.at("mumford").at(key)))
        return WrittenMumford(parts[0], parts[1], origin)
    text, where = table.notation("root_of", "a polynomial in t")
    modulus = parse_univariate(text, "t", where)
    text, where = table.notation("point", "a point with coordinates in t")
    point = parse_polynomial_point(text, "t", where)
    check_coordinates(point, where)
    return WrittenClosedPoint(modulus, point, origin)


def _divisor(value: object, origin: Origin) -> WrittenDivisor:
    if not isinstance(value, list):
        raise origin.error(describe(value), "a list of pairs [multiplicity, place]")
    if not 1 <= len(value) <= 1000:
        raise origin.error(describe(value), "1 to 1000 pairs [multiplicity, place]")
    terms = []
    for i, term in enumerate(value, 1):
        place = origin.at(f"term {i}")
        if not isinstance(term, list) or len(term) != 2:
            raise place.error(describe(term), "a pair [multiplicity, place]")
        multiplicity = check_integer(term[0], place, -MAX_MULTIPLICITY, MAX_MULTIPLICITY, "a multiplicity")
        if multiplicity == 0:
            raise place.error("the multiplicity 0", "a nonzero one")
        terms.append((multiplicity, _place(term[1], place)))
    return WrittenDivisor(tuple(terms), origin)


def _base(jacobian: Table) -> WrittenDivisor:
    value = jacobian.value("base", "a rational point or a divisor of degree 1")
    if value == HALF_FIBRE:
        return WrittenDivisor(((1, WrittenFibres(1, jacobian.at("base"), True)),), jacobian.at("base"))
    if isinstance(value, list):
        return _divisor(value, jacobian.at("base"))
    point = _point(value, jacobian.at("base"))
    return WrittenDivisor(((1, point),), jacobian.at("base"))


def _index(jacobian: Table) -> tuple[tuple[int, ...], str]:
    source = jacobian.text("index_source", blank=True) if jacobian.has("index_source") else ""
    primes = set()
    for i, value in enumerate(jacobian.array("index_prime_to", "a list of primes", []), 1):
        place = jacobian.at(f"index_prime_to no. {i}")
        prime = check_integer(value, place, 2, 2**62, "a prime")
        if not is_prime(prime):
            raise place.error(f"the integer {prime}", "a prime")
        primes.add(prime)
    if primes and not source.strip():
        raise jacobian.at("index_source").error("nothing", "where it is proved that index_prime_to holds")
    return tuple(sorted(primes)), source


def _tables(jacobian: Table, key: str, keys: list[str]) -> list[Table]:
    entries = jacobian.array(key, f"tables [[jacobian.{key}]]", [])
    return [
        as_table(entry, jacobian.at(f"{key} no. {i}"), f"a table [[jacobian.{key}]]", keys)
        for i, entry in enumerate(entries, 1)
    ]


def _generators_from(jacobian: Table, rank: int, count: int) -> str | None:
    place = jacobian.at("generators")
    if not jacobian.has("generators_from"):
        if count != rank:
            found = f"{count or 'no'} generator{'s' * (count != 1)} for rank {rank}"
            expected = f"{rank} of them" + ("" if count else ", or generators_from")
            raise place.error(found, expected)
        return None
    source = jacobian.text("generators_from", "'known_points'")
    if source != "known_points":
        raise jacobian.at("generators_from").error(quote(source), "'known_points'")
    if count:
        raise place.error("generators and generators_from", "one of the two")
    return source
