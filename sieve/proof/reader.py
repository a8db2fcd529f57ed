"""A proof log as plain data, for appendices and drawings.

Reading is not checking: the log is parsed, its records are sorted by kind and keys are looked at, no claim
in it is verified.  That is the checker's work, and every text made from a log says so.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np

from sieve.curves.divisors import ClosedPlace, Divisor, FibrePlace, MumfordPlace, Place, RationalPlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.plane import PlaneCurve
from sieve.curves.protocol import Curve
from sieve.errors import InputError, SieveError
from sieve.local.condition import Condition
from sieve.proof.statement import closed_places

FORMAT = "sieve-proof/1"
LONGEST_LOG = 400_000_000

_KEYS: dict[str, tuple[str, ...]] = {
    "header": ("format", "program", "case", "equation", "weight", "genus", "y_scale", "variables"),
    "group": ("rank", "base", "free", "torsion", "integral"),
    "premise": ("id", "statement", "source"),
    "candidate": ("prime", "id", "form"),
    "local": ("prime", "invariants", "origin", "unit", "base", "define", "close", "places", "counts"),
    "branch": ("factors", "primes"),
    "padic": ("prime", "digits", "terms", "sections", "discs", "places", "reduction"),
    "zeros": ("prime", "pivots", "annihilators"),
    "torsion": ("ell", "dimension", "by"),
    "saturated": ("ell", "primes"),
    "fate": ("prime", "id", "verdict"),
    "classes": ("uses", "count", "index", "vectors"),
    "end": ("records", "eliminated", "conclusion", "points"),
}

Record = dict[str, Any]


@dataclass
class LogView:
    """What a log says.

    Fields: `sha256` and `size` of the file; `lines`, the number of records; `curve`, `base`, `free`,
    `torsion` (pairs of order and divisor) in model coordinates; `integral`, whether integral points are
    meant; the records of the other kinds as they stand.
    """

    sha256: str
    size: int
    lines: int
    header: Record
    curve: Curve
    base: Divisor
    free: list[Divisor]
    torsion: list[tuple[int, Divisor]]
    integral: bool
    records: dict[str, list[Record]]

    def of(self, kind: str) -> list[Record]:
        """The records of one kind, in order."""
        return self.records.get(kind, [])

    @property
    def end(self) -> Record:
        """The last record."""
        return self.of("end")[0]

    @property
    def generators(self) -> list[Divisor]:
        """Free generators, then torsion generators."""
        return [*self.free, *[d for _, d in self.torsion]]

    def allowed_ells(self) -> list[int]:
        """The primes l whose parts are used: saturated, or on the user's word."""
        stated = {r["ell"] for r in self.of("premise") if "ell" in r}
        return sorted({r["ell"] for r in self.of("saturated")} | stated)

    def condition(self, local: Record) -> Condition:
        """The condition at v that a `local` record describes, as far as one believes it."""
        return _condition(self, local)


def read_log(path: str | Path) -> LogView:
    """Read a log.

    Raises `InputError` for a file that is no proof log of this version, naming the line.
    """
    name = str(path)
    if Path(path).is_dir():
        raise InputError(name, "", "a directory", "a proof log")
    if Path(path).stat().st_size > LONGEST_LOG:
        raise InputError(name, "", "a very large file", f"at most {LONGEST_LOG} bytes")
    data = Path(path).read_bytes()
    try:
        text = data.decode("utf-8")
    except UnicodeDecodeError as error:
        raise InputError(name, f"byte {error.start}", "bytes that are not UTF-8", "a proof log") from None
    records: dict[str, list[Record]] = {}
    lines = text.splitlines()
    for number, line in enumerate(lines, 1):
        record = _record(name, number, line)
        records.setdefault(record["kind"], []).append(record)
    for kind in ("header", "group", "end"):
        if len(records.get(kind, [])) != 1:
            count = len(records.get(kind, []))
            raise InputError(name, kind, f"{count} records of this kind", "exactly one (a whole proof log)")
    digest = hashlib.sha256(data).hexdigest()
    try:
        return _view(digest, len(data), len(lines), records)
    except (
        KeyError,
        TypeError,
        IndexError,
        AttributeError,
        ValueError,
        ZeroDivisionError,
        SieveError,
    ) as error:
        found = f"a record that does not make sense ({type(error).__name__})"
        raise InputError(name, "", found, "a log that `sieve check` accepts") from None


def _record(name: str, number: int, line: str) -> Record:
    place = f"line {number}"
    try:
        record = json.loads(line)
    except (ValueError, RecursionError):
        raise InputError(name, place, "no JSON object", "a record of a proof log") from None
    if not isinstance(record, dict) or not isinstance(record.get("kind"), str):
        raise InputError(name, place, "no record", "a JSON object with a kind")
    if record["kind"] not in _KEYS:
        raise InputError(name, place, f"kind {record['kind'][:40]!r}", "a kind of this version")
    if number == 1 and (record["kind"] != "header" or record.get("format") != FORMAT):
        raise InputError(name, place, "another format", f"a header with format {FORMAT}")
    missing = [key for key in _KEYS[record["kind"]] if key not in record]
    if missing:
        raise InputError(name, place, f"a record {record['kind']} without {missing[0]}", "all its keys")
    return record


def _view(digest: str, size: int, lines: int, records: dict[str, list[Record]]) -> LogView:
    header, group = records["header"][0], records["group"][0]
    curve = _curve(header)
    if curve.genus != header["genus"] or not isinstance(group["integral"], bool):
        raise ValueError("genus, integral")
    free = [_divisor(d, curve.weight) for d in group["free"]]
    torsion = [(_int(t), _divisor(d, curve.weight)) for t, d in group["torsion"]]
    for fate in records.get("fate", []):
        if fate["verdict"] not in ("eliminated", "rational", "open"):
            raise ValueError(fate["verdict"])
    base, integral = _divisor(group["base"], curve.weight), group["integral"]
    return LogView(digest, size, lines, header, curve, base, free, torsion, integral, records)


def _curve(header: Record) -> Curve:
    rows = [[_int(c) for c in row] for row in header["equation"]]
    if _int(header["weight"]) == 1:
        x, y, z = (str(name) for name in header["variables"])
        return PlaneCurve(rows, (x, y, z))
    f, h, one = rows
    if one != [1]:
        raise ValueError("an equation of another form")
    return HyperellipticCurve([-c for c in f], h, Fraction(header["y_scale"]))


def _int(value: Any) -> int:
    if not isinstance(value, int) or isinstance(value, bool):
        raise TypeError("an integer")
    return value


def _divisor(terms: Any, weight: int) -> Divisor:
    return Divisor.of((_int(m), _place(place, weight)) for m, place in terms)


def _place(place: Any, weight: int) -> Place:
    if "point" in place:
        a, b, c = (_int(entry) for entry in place["point"])
        return RationalPlace((a, b, c))
    if "closed" in place:
        u, x, y, z = (tuple(Fraction(entry) for entry in part) for part in place["closed"])
        parameter = [Fraction(0), Fraction(1)] if len(u) > 2 else [-u[0]]
        if weight > 1 and list(z) == [1] and list(x) == parameter:
            return MumfordPlace(u, y)
        return ClosedPlace(u, x, y, z)
    return FibrePlace(_int(place["fibres"]))


# ---- local records -------------------------------------------------------------------------------------


def _condition(view: LogView, local: Record) -> Condition:
    v = _int(local["prime"])
    curve = view.curve.modulo(v)
    moduli = tuple(_int(d) for d in local["invariants"])
    if curve.count == 0:
        nothing = np.zeros((0, 0), dtype=np.int64)
        return Condition(f"v = {v}", v, (), ((),) * len(view.generators), nothing)
    logs = _point_logs(view, local)
    places = closed_places([view.base, *view.generators])
    unit = list(local["unit"])
    closed: dict[Place, list[int]] = {}
    for k, section, zeros in local["places"]:
        n = _int(section[0])
        closed[places[k]] = [n * a - sum(logs[i][j] for i in zeros) for j, a in enumerate(unit)]

    def log(divisor: Divisor) -> list[int]:
        total = [0] * len(moduli)
        for multiplicity, place in divisor.terms:
            if isinstance(place, RationalPlace):
                value = logs[curve.index_of(*place.point)]
            elif isinstance(place, FibrePlace):
                value = [place.count * a for a in unit]
            else:
                value = closed[place]
            total = [t + multiplicity * a for t, a in zip(total, value, strict=True)]
        return [t % d for t, d in zip(total, moduli, strict=True)]

    origin, degree = log(view.base), view.base.degree
    meant = logs[: curve.affine_count] if view.integral else logs
    rows = sorted(
        {tuple((degree * a - b) % d for a, b, d in zip(row, origin, moduli, strict=True)) for row in meant}
    )
    allowed = np.array(rows, dtype=np.int64).reshape(len(rows), len(moduli))
    return Condition(f"v = {v}", v, moduli, tuple(tuple(log(d)) for d in view.generators), allowed)


def _point_logs(view: LogView, local: Record) -> list[list[int]]:
    """The classes of all points from the base and the defining sections."""
    curve = view.curve.modulo(local["prime"])
    moduli, unit = local["invariants"], local["unit"]
    orbits: dict[int, list[int]] = {}
    for i, orbit in enumerate(curve.orbit.tolist()):
        orbits.setdefault(orbit, []).append(i)
    known: dict[int, list[int]] = {}

    def learn(number: int, value: Sequence[int]) -> None:
        # the class of a point is sign * (class of the first of its orbit) + fibre * U
        known[number] = [a % d for a, d in zip(value, moduli, strict=True)]
        sign, fibre = int(curve.sign[number]), int(curve.fibre[number])
        first = [sign * (a - fibre * u) for a, u in zip(value, unit, strict=True)]
        for other in orbits[int(curve.orbit[number])]:
            if other != number:
                s, f = int(curve.sign[other]), int(curve.fibre[other])
                known[other] = [(s * a + f * u) % d for a, u, d in zip(first, unit, moduli, strict=True)]

    learn(local["origin"], [0] * len(moduli))
    for number, value in local["base"]:
        learn(number, value)
    for section, zeros in local["define"]:
        (target,) = [i for i in zeros if i not in known]
        total = [_int(section[0]) * u for u in unit]
        for i in zeros:
            if i != target:
                total = [t - a for t, a in zip(total, known[i], strict=True)]
        learn(target, total)
    return [known[i] for i in range(curve.count)]


__all__ = ["LogView", "read_log"]
