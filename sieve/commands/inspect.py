"""`sieve inspect`: what the case says and what is true of it, without candidates."""

from __future__ import annotations

from collections.abc import Sequence
from concurrent.futures import Executor
from dataclasses import dataclass
from typing import Any

from sieve.commands.common import Progress, StoredInvestigation, problem_of
from sieve.commands.premises import hypothesis_premises
from sieve.commands.run import chabauty_place
from sieve.engine.investigation import FIRST_BOUND, Investigation
from sieve.errors import InputError
from sieve.exact.primes import is_prime, primes_below
from sieve.files.notation_out import divisor_document, divisor_text, equation_text, structure_text
from sieve.files.resolve import ResolvedCase, read_case
from sieve.files.store import Store
from sieve.local.chabauty import ChabautyPlace

SHOWN_ELL = 100
"""Saturation is reported for primes l below this that divide at least two groups."""


@dataclass
class Inspection:
    """The outcome of `sieve inspect`."""

    resolved: ResolvedCase
    investigation: Investigation
    primes: list[int]
    padic: list[tuple[int, int, ChabautyPlace]]


def parse_padic_option(text: str) -> tuple[int, int]:
    """P:N; raises `InputError`."""
    words = text.split(":")
    if len(words) != 2 or not all(w.isascii() and w.isdigit() and len(w) < 10 for w in words):
        raise InputError("--padic", "", repr(text), "P:N, a prime and a number of digits, like 7:10")
    p, n = int(words[0]), int(words[1])
    if not is_prime(p):
        raise InputError("--padic", "", f"{p}, which is not a prime", "P:N with a prime P")
    if not 1 <= n <= 1000:
        raise InputError("--padic", "", f"{n} digits", "between 1 and 1000 digits")
    return p, n


def execute(
    case_path: str,
    *,
    bound: int | None = None,
    primes: Sequence[int] | None = None,
    padic: Sequence[str] = (),
    store: Store | None = None,
    executor: Executor | None = None,
    progress: Progress | None = None,
) -> Inspection:
    """Compute everything that `sieve inspect` shows."""
    wanted_padic = [parse_padic_option(text) for text in padic]
    resolved = read_case(case_path)
    investigation = Investigation(problem_of(resolved), executor, progress)
    stored = StoredInvestigation(investigation, store)
    shown = list(primes) if primes is not None else primes_below(bound or FIRST_BOUND)
    investigation.establish(stored.gather)
    stored.gather(shown)
    places = []
    for p, n in wanted_padic:
        if not resolved.curve.is_smooth(p):
            raise InputError(
                "--padic", "", f"{p}, where the curve is not smooth", "a prime of good reduction"
            )
        places.append((p, n, chabauty_place(investigation, p, n, "--padic")))
    return Inspection(resolved, investigation, shown, places)


def document(inspection: Inspection) -> dict[str, Any]:
    """The JSON document of interface page, for `--json`."""
    curve, investigation = inspection.resolved.curve, inspection.investigation
    order = 1
    for t in investigation.orders:
        order *= t
    ells = [ell for ell in investigation.relevant_ells() if ell < SHOWN_ELL]
    saturated = [ell for ell in ells if investigation.saturation_at(ell).proved]
    primes = []
    for v in inspection.primes:
        record = investigation.records[v]
        if record.usable:
            primes.append(
                {
                    "prime": v,
                    "points": record.points,
                    "order": str(record.order),
                    "structure": [str(d) for d in record.invariants],
                    "certified": True,
                    "reason": record.reason,
                }
            )
        elif curve.is_smooth(v):
            primes.append(
                {
                    "prime": v,
                    "points": record.points,
                    "order": None,
                    "structure": None,
                    "certified": False,
                    "reason": record.skipped,
                }
            )
    known = []
    for point, found in investigation.coordinates.items():
        known.append(
            {
                "point": curve.format_point(point),
                "coefficients": [str(c) for c in found.coefficients],
                "torsion": list(found.torsion),
            }
        )
    return {
        "genus": curve.genus,
        "equation": equation_text(curve),
        "bad_primes": list(curve.bad_primes),
        "bad_primes_complete": curve.unfactored == 1,
        "primes": primes,
        "torsion": {"order": str(order), "proved": investigation.torsion_proved()},
        "independent": bool(saturated) or not inspection.resolved.case.rank,
        "generators": [divisor_document(curve, d) for d in investigation.generators],
        "torsion_orders": [str(t) for t in investigation.orders],
        "saturated_at": saturated,
        "not_saturated_at": [ell for ell in ells if ell not in saturated],
        "saturation": [
            {
                "prime": ell,
                "proved": investigation.saturation_at(ell).proved,
                "reason": investigation.saturation_at(ell).reason,
                "combination": investigation.saturation_at(ell).combination,
            }
            for ell in ells
        ],
        "known_points": known,
        "padic": [_padic_document(inspection, p, n, place) for p, n, place in inspection.padic],
        "premises": [
            p.document()
            for p in hypothesis_premises(
                investigation,
                [
                    e
                    for e in ells
                    if investigation.saturation_at(e).proved or e in investigation.problem.index_prime_to
                ],
            )
        ],
    }


def _padic_document(inspection: Inspection, p: int, n: int, place: ChabautyPlace) -> dict[str, Any]:
    coefficients = []
    for point in inspection.resolved.known_points:
        found = place.coefficients_of_point(point, inspection.investigation.problem.rank)
        coefficients.append(
            {
                "point": inspection.resolved.curve.format_point(point),
                "coefficients": None if found is None else [str(c) for c in found],
            }
        )
    return {
        "prime": p,
        "precision": min([log.precision for log in place.logs] or [n]),
        "group": [str(d) for d in place.group.invariants],
        "coefficients": coefficients,
    }


def _proved(value: bool) -> str:
    return "proved" if value else "NOT proved"


def text(inspection: Inspection) -> str:
    """The report of `sieve inspect`."""
    data = document(inspection)
    curve, investigation = inspection.resolved.curve, inspection.investigation
    lines = [
        f"Case {inspection.resolved.case.name}: {data['equation']}, genus {data['genus']}",
        f"Bad primes of this model: {', '.join(map(str, data['bad_primes'])) or 'none'}"
        + ("" if curve.unfactored == 1 else f"; perhaps also prime factors of {curve.unfactored}"),
        f"Torsion: order {data['torsion']['order']}, " + _proved(data["torsion"]["proved"]),
    ]
    for i, divisor in enumerate(investigation.generators):
        name = f"D{i + 1}" if i < investigation.problem.rank else f"T{i + 1 - investigation.problem.rank}"
        tail = (
            ""
            if i < investigation.problem.rank
            else f"  (order {investigation.orders[i - investigation.problem.rank]})"
        )
        lines.append(f"  {name} = {divisor_text(curve, divisor)}{tail}")
    lines.append(f"Independent: {_proved(data['independent'])}")
    lines.append("Saturated at l = " + (", ".join(map(str, data["saturated_at"])) or "none"))
    for row in data["saturation"]:
        if not row["proved"]:
            combination = (
                "" if row["combination"] is None else f" ({', '.join(map(str, row['combination']))})"
            )
            lines.append(f"  not proved at {row['prime']}: {row['reason']}{combination}")
    lines.append("")
    lines.append(f"{'v':>6} {'#X(F_v)':>8} {'#J(F_v)':>14}  J(F_v)")
    for row in data["primes"]:
        if row["certified"]:
            group = structure_text([int(d) for d in row["structure"]])
            lines.append(f"{row['prime']:>6} {row['points']:>8} {row['order']:>14}  {group}")
        else:
            lines.append(f"{row['prime']:>6}  not used: {row['reason']}")
    if data["known_points"]:
        lines += ["", "Known points, coefficients on the generators:"]
        for row in data["known_points"]:
            tail = f"  torsion {row['torsion']}" if row["torsion"] else ""
            lines.append(f"  {row['point']}: ({', '.join(row['coefficients'])}){tail}")
    for row in data["padic"]:
        group = structure_text([int(d) for d in row["group"]])
        lines += ["", f"p = {row['prime']}: J(F_p) = {group}, {row['precision']} digits known"]
        for entry in row["coefficients"]:
            shown = (
                "dependent logarithms" if entry["coefficients"] is None else "; ".join(entry["coefficients"])
            )
            lines.append(f"  {entry['point']}: {shown}")
    return "\n".join(lines) + "\n"
