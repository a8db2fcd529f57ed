"""The candidate file: the finite list of p-adic points that a Chabauty computation left.

`load_candidates` reads the form; `check_candidates` compares with a curve, a rank and a torsion group.
"""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Literal

from sieve.curves.notation import Origin, ParsedPoint, parse_padic, parse_padic_point, quote
from sieve.curves.protocol import Curve
from sieve.errors import NotSupported
from sieve.exact.padic_number import PadicNumber, valuation
from sieve.files.case import check_coordinates, check_format, is_prime
from sieve.files.coordinates import (
    PadicPoint,
    chart_coordinates,
    form_value,
    nonzero_text,
    residue_value,
    scaled,
    weighted,
    zeros_text,
)
from sieve.files.reading import Table, as_table, check_integer, describe, read_json

FORMAT = "sieve-candidates/1"
MAX_PRIME = 2**31
MAX_PRECISION = 1000
MAX_COUNT = 10**6
Kind = Literal["point", "disc", "coefficients"]
_KEYS = ["id", "point", "disc", "coefficients", "torsion", "multiplicity", "at_most"]


@dataclass(frozen=True)
class Candidate:
    """One candidate as written.

    Fields: `kind`, what locates it; `point` (kind "point": coordinates in the user's equation, as written,
    each with its precision); `disc` (kind "disc", optional for "coefficients": the coordinates modulo p, each
    with precision 1); `coefficients` (p-adic integers with their precisions) and `torsion` (integers, not
    reduced); `multiplicity` >= 1; `at_most`, a proved bound on the rational points there, or None.
    """

    id: str
    kind: Kind
    point: ParsedPoint[PadicNumber] | None
    disc: ParsedPoint[PadicNumber] | None
    coefficients: tuple[PadicNumber, ...]
    torsion: tuple[int, ...]
    multiplicity: int
    at_most: int | None
    origin: Origin


@dataclass(frozen=True)
class CandidateFile:
    """The candidates at one prime; `complete` claims that every rational point is near one of them."""

    path: str
    sha256: str
    prime: int
    precision: int
    complete: bool
    source: str
    candidates: tuple[Candidate, ...]

    @property
    def origin(self) -> Origin:
        """The file, for messages about the list as a whole."""
        return Origin(self.path)


def load_candidates(path: str | Path) -> CandidateFile:
    """Read a candidate file.

    Raises `InputError` for anything the format does not allow, and for an empty list that does not claim to
    be complete (it would say nothing); `NotSupported` for candidates over a number field.
    """
    document = read_json(path)
    table = document.table
    check_format(table, FORMAT)
    table.restrict(["format", "prime", "precision", "complete", "source", "candidates", "places"])
    if table.has("places"):
        raise NotSupported(table.origin.file, "places", "chosen places", "a curve over Q in this version")
    prime = table.integer("prime", 2, MAX_PRIME, "a prime")
    if not is_prime(prime):
        raise table.at("prime").error(f"the integer {prime}", "a prime")
    precision = table.integer("precision", 1, MAX_PRECISION)
    complete = table.boolean("complete")
    source = table.text("source", "the computation this list came from")
    entries = table.array("candidates", "a list of candidates")
    if not entries and not complete:
        raise table.at("candidates").error("an empty list that is not complete", "candidates")
    candidates = []
    seen: dict[str, int] = {}
    for i, entry in enumerate(entries, 1):
        origin = table.at(f"candidates no. {i}")
        candidate = _candidate(as_table(entry, origin, "a candidate", ()), prime, precision)
        if candidate.id in seen:
            first = seen[candidate.id]
            raise candidate.origin.error(f"the id of candidate no. {first} again", "different ids")
        seen[candidate.id] = i
        candidates.append(candidate)
    name, listed = str(path), tuple(candidates)
    return CandidateFile(name, document.sha256, prime, precision, complete, source, listed)


def check_candidates(
    file: CandidateFile, curve: Curve, rank: int, torsion_orders: tuple[int, ...]
) -> None:
    """Compare a candidate file with its case.

    Arguments: `rank`, the number of free generators; `torsion_orders`, one for each torsion generator in use.
    Raises `InputError` for a prime at which the model is not smooth, a point or disc off the curve, and a
    wrong number of coefficients.
    """
    place = file.origin.at("prime")
    if not curve.is_smooth(file.prime):
        raise place.error(f"{file.prime}, where the curve is not smooth", "a prime of good reduction")
    if valuation(curve.y_scale, file.prime) != 0:
        found = f"{file.prime}, which divides the change of variables to an integral equation"
        raise place.error(found, "another prime, or an equation with integer coefficients")
    for candidate in file.candidates:
        if candidate.point is not None:
            check_on_curve(curve, candidate)
        if candidate.disc is not None:
            disc_residues(curve, candidate)
        if candidate.kind == "coefficients":
            _check_counts(candidate, rank, torsion_orders)


def check_on_curve(curve: Curve, candidate: Candidate) -> None:
    """Refuse a candidate point that is not on the curve modulo its known digits."""
    model_coordinates(curve, candidate)


def model_coordinates(curve: Curve, candidate: Candidate) -> PadicPoint:
    """The candidate's point in weighted coordinates of the integral model.

    Returns (X, Y, Z), known at least modulo p, integral, X or Z (on a plane curve X, Y or Z) a unit. The
    unit is 1 to more digits than the others have when the point was given in affine coordinates with x
    integral. Raises `InputError` when some residue of the normalised point is not known or when it is not
    on the curve.
    """
    if candidate.point is None:
        raise candidate.origin.error("no point", "a candidate given by a point")
    weight = curve.weight
    x, y, z = weighted(candidate.point, weight)
    origin = candidate.origin.at("point", ".")
    y = y * curve.y_scale
    charts = chart_coordinates(curve)
    if all((x, y, z)[i].is_zero for i in charts):
        found = "X, Y and Z" if len(charts) == 3 else "X and Z"
        raise origin.error(f"{found} that are zero to the known digits", nonzero_text(curve))
    point = scaled(weight, (x, y, z), min((x, y, z)[i].valuation for i in charts))
    units = [point[i] for i in charts]
    if not any(c.digits > 0 and c.valuation == 0 for c in units) or min(c.precision for c in point) < 1:
        found = "a point of which no residue modulo the prime is known"
        raise origin.error(found, f"coordinates, {nonzero_text(curve)}, with more digits")
    outcome = form_value(curve, point)
    if not outcome.is_zero:
        found = f"a point that is not on the curve (the equation has valuation {outcome.valuation})"
        raise origin.error(found, f"agreement modulo {outcome.prime}^{outcome.precision}")
    return point


def disc_residues(curve: Curve, candidate: Candidate) -> tuple[int, int, int]:
    """The point modulo p that names the candidate's residue disc, in the integral model.

    Returns (x, y, 1), (1, y, 0) or, on a plane curve, (0, 1, 0), entries in [0, p). Raises `InputError`
    when it is not on the curve modulo p or when X and Z (and Y) are zero.
    """
    if candidate.disc is None:
        raise candidate.origin.error("no disc", "a candidate given by a residue disc")
    origin = candidate.origin.at("disc", ".")
    x, y, z = weighted(candidate.disc, curve.weight)
    p = x.prime
    residues = [x.residue(1), (y * curve.y_scale).residue(1), z.residue(1)]
    unit = next((residues[i] for i in chart_coordinates(curve) if residues[i]), 0)
    if not unit:
        raise origin.error(zeros_text(curve), f"{nonzero_text(curve)} modulo {p}")
    inverse = pow(unit, -1, p)
    a, b, c = residues
    a, b, c = a * inverse % p, b * pow(inverse, curve.weight, p) % p, c * inverse % p
    if residue_value(curve, (a, b, c), p):
        raise origin.error(f"a point that is not on the curve modulo {p}", "a point of the reduced curve")
    return a, b, c


def _check_counts(candidate: Candidate, rank: int, torsion_orders: tuple[int, ...]) -> None:
    if len(candidate.coefficients) != rank:
        found = f"a list of {len(candidate.coefficients)}"
        raise candidate.origin.at("coefficients", ".").error(found, f"{rank}, one for each generator")
    if len(candidate.torsion) != len(torsion_orders):
        found = f"a list of {len(candidate.torsion)}"
        expected = f"{len(torsion_orders)}, one for each torsion generator"
        raise candidate.origin.at("torsion", ".").error(found, expected)


def _candidate(table: Table, prime: int, precision: int) -> Candidate:
    name = table.text("id", "an id, as a text")
    origin = table.origin.at(quote(name), " ")
    if len(name) > 100 or not name.isprintable():
        raise table.at("id").error(quote(name), "at most 100 printable characters")
    table.origin = origin
    if table.has("places") or table.has("points"):
        raise NotSupported(origin.file, origin.place, "points at chosen places", "one point in this version")
    table.restrict(_KEYS)
    given = [key for key in ("point", "disc", "coefficients") if table.has(key)]
    if not given:
        raise origin.error("no point, disc or coefficients", "one of them")
    if "point" in given and len(given) > 1:
        raise origin.error(" and ".join(given), "one of them (a disc may accompany coefficients)")
    kind: Kind = "coefficients" if "coefficients" in given else "point" if "point" in given else "disc"
    if table.has("torsion") and kind != "coefficients":
        raise table.at("torsion").error("torsion without coefficients", "both or none")
    point = _point(table, prime, precision) if kind == "point" else None
    disc = _disc(table, prime) if "disc" in given else None
    coefficients = _coefficients(table, prime, precision) if kind == "coefficients" else ()
    torsion = tuple(
        check_integer(value, table.at(f"torsion no. {i}"), -(10**9), 10**9)
        for i, value in enumerate(table.array("torsion", "a list of integers", []), 1)
    )
    multiplicity = table.integer("multiplicity", 1, MAX_COUNT) if table.has("multiplicity") else 1
    at_most = table.integer("at_most", 0, MAX_COUNT) if table.has("at_most") else None
    return Candidate(name, kind, point, disc, coefficients, torsion, multiplicity, at_most, origin)


def _point(table: Table, prime: int, precision: int) -> ParsedPoint[PadicNumber]:
    text, origin = table.notation("point", "a point with p-adic coordinates")
    point = parse_padic_point(text, prime, precision, origin)
    check_coordinates(point, origin)
    for name, value in zip("xy" if point.affine else "XYZ", point.entries, strict=True):
        if value.is_zero and value.precision < 1:
            raise origin.error(f"{name} = {value}, of which no digit is known", "at least one digit")
    return point


def _disc(table: Table, prime: int) -> ParsedPoint[PadicNumber]:
    text, origin = table.notation("disc", f"a point modulo {prime}")
    point = parse_padic_point(text, prime, 1, origin)
    check_coordinates(point, origin)
    for name, value in zip("xy" if point.affine else "XYZ", point.entries, strict=True):
        if value.precision < 1 or not value.is_integral:
            raise origin.error(f"{name} = {value}", f"a residue modulo {prime}")
    return point


def _coefficients(table: Table, prime: int, precision: int) -> tuple[PadicNumber, ...]:
    out = []
    for i, value in enumerate(table.array("coefficients", "a list of p-adic integers"), 1):
        origin = table.at(f"coefficients no. {i}")
        if isinstance(value, bool) or not isinstance(value, (int, str)):
            raise origin.error(describe(value), "a p-adic integer, as a text")
        number = parse_padic(str(value), prime, precision, origin)
        if not number.is_integral or number.precision < 1:
            raise origin.error(str(number), "a p-adic integer with at least one digit")
        out.append(number)
    return tuple(out)
