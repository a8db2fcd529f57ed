"""`sieve candidates`: a complete candidate file by linear Chabauty, for a rank below the genus."""

from __future__ import annotations

from collections.abc import Sequence
from concurrent.futures import Executor
from dataclasses import dataclass
from typing import Any

from sieve import __version__
from sieve.commands.common import Progress, StoredInvestigation, problem_of
from sieve.curves.divisors import Divisor, Point
from sieve.curves.protocol import Curve
from sieve.curves.search import search_points
from sieve.engine.algebraic import recognise_algebraic
from sieve.engine.investigation import Investigation
from sieve.errors import BadReduction, Inconsistent, InputError, PrecisionLost, Uncertified
from sieve.exact.padic_number import PadicNumber, valuation
from sieve.exact.primes import is_prime, primes_below
from sieve.files.candidates import FORMAT, MAX_PRECISION
from sieve.files.resolve import ResolvedCase, read_case
from sieve.local.chabauty import LocatedCandidate
from sieve.local.linear_chabauty import ChabautyZeros, chabauty_zeros
from sieve.local.records import divisor_log
from sieve.proof.statement import closed_places
from sieve.proof.witness_padic import Inexpressible, PadicEvidence

TRIED = 6
"""Without --prime so many good odd primes that suit the sieve are tried, the smallest ones .."""
MOST_TRIED = 20
""".. but at most so many altogether."""
SEARCH_HEIGHT = 200
DEFAULT_SIZE = 10**12
"""Without --precision p^N is the first power above this."""
MAX_PRIME = 10**4


@dataclass(frozen=True)
class Trial:
    """One prime: its zeros and which rational points each candidate agrees with, or why it was not used.

    `unsuited`: why the sieve could do nothing with candidates at this prime (or empty); `algebraic`, how many
    candidates are recognised as points over a small field, which often cannot be eliminated.
    """

    prime: int
    zeros: ChabautyZeros | None
    points: dict[str, tuple[Point, ...]]
    reason: str = ""
    unsuited: str = ""
    algebraic: int = 0

    @property
    def spurious(self) -> int:
        """How many candidates agree with no known rational point."""
        return 0 if self.zeros is None else self.zeros.count - len(self.points)


@dataclass(frozen=True)
class CandidateSearch:
    """The outcome of `sieve candidates`: the prime that was chosen, and all trials by prime."""

    resolved: ResolvedCase
    chosen: Trial
    zeros: ChabautyZeros
    trials: tuple[Trial, ...]
    found_points: tuple[Point, ...]


def default_precision(prime: int) -> int:
    """The digits computed when none are asked for."""
    digits = 1
    while prime**digits < DEFAULT_SIZE:
        digits += 1
    return digits


def check_prime(curve: Curve, prime: int) -> None:
    """Refuse a prime that cannot be used; raises `InputError`."""
    if not 2 <= prime <= MAX_PRIME or not is_prime(prime):
        raise InputError("--prime", "", str(prime), f"an odd prime up to {MAX_PRIME}")
    if prime == 2:
        raise InputError("--prime", "", "2", "an odd prime (zeros at 2 are not certified)")
    if not curve.is_smooth(prime):
        found = f"{prime}, where the curve is not smooth"
        raise InputError("--prime", "", found, "a prime of good reduction")
    if valuation(curve.y_scale, prime):
        found = f"{prime}, which divides the change of variables to an integral equation"
        raise InputError("--prime", "", found, "another prime")


def generators_in_use(
    resolved: ResolvedCase, executor: Executor | None, progress: Progress | None
) -> list[Divisor]:
    """The generators, free ones first: those of the case, or of the group that the known points generate."""
    if resolved.case.generators_from is None:
        return [*resolved.generators, *[divisor for _, divisor in resolved.torsion]]
    investigation = Investigation(problem_of(resolved), executor, progress)
    investigation.establish(StoredInvestigation(investigation, None).gather)
    return investigation.generators


def why_unsuited(zeros: ChabautyZeros, curve: Curve, divisors: Sequence[Divisor]) -> str:
    """Why base and generators do not reduce at the prime so that the sieve and its proof log can use them."""
    group = zeros.integrals.group
    try:
        for divisor in divisors:
            divisor_log(group, divisor)
        PadicEvidence(curve, group, closed_places(divisors))
    except (BadReduction, Uncertified) as error:
        return error.reason
    except Inexpressible as error:
        return f"the proof log cannot express {error}"
    return ""


def execute(
    case_path: str,
    *,
    prime: int | None = None,
    precision: int | None = None,
    executor: Executor | None = None,
    progress: Progress | None = None,
) -> CandidateSearch:
    """Everything that `sieve candidates` computes.

    Raises `InputError` for a rank that is not below the genus, for a bad prime, and when the precision is too
    low; `Inconsistent` when a rational point is not among the zeros (wrong rank, generators or base).
    """
    resolved = read_case(case_path)
    curve, rank = resolved.curve, resolved.case.rank
    if rank >= curve.genus:
        raise InputError(
            case_path, "jacobian.rank", f"rank {rank} for genus {curve.genus}",
            "a rank below the genus (else another method must supply the candidates)",
        )
    if precision is not None and not 1 <= precision <= MAX_PRECISION:
        raise InputError("--precision", "", str(precision), f"between 1 and {MAX_PRECISION} digits")
    if prime is not None:
        check_prime(curve, prime)
        primes = [prime]
    else:
        good = (p for p in primes_below(1000) if p > 2 and curve.is_smooth(p))
        primes = [p for p in good if valuation(curve.y_scale, p) == 0][:MOST_TRIED]
    known = set(resolved.known_points)
    found = tuple(p for p in search_points(curve, SEARCH_HEIGHT) if p not in known)
    generators = generators_in_use(resolved, executor, progress)
    trials: list[Trial] = []
    for p in primes:
        if progress is not None:
            progress.say(f"zeros at p = {p}")
        digits = precision or default_precision(p)
        trials.append(_trial(resolved, generators, found, p, digits, prime is None))
        if sum(t.zeros is not None and not t.unsuited for t in trials) == TRIED:
            break
    usable = [t for t in trials if t.zeros is not None]
    if not usable:
        reasons = "; ".join(t.reason for t in trials) or "no good prime"
        what = f"no prime can be used ({reasons})"
        raise InputError("--prime", "", what, "more digits, or a prime by hand")
    chosen = min(usable, key=lambda t: (bool(t.unsuited), t.spurious, t.algebraic, t.prime))
    assert chosen.zeros is not None
    return CandidateSearch(resolved, chosen, chosen.zeros, tuple(trials), found)


def _trial(
    resolved: ResolvedCase, generators: Sequence[Divisor], found: Sequence[Point], p: int, digits: int,
    several: bool,
) -> Trial:
    """One prime; with `several` a prime that cannot be used is no error."""
    free = generators[: resolved.case.rank]
    try:
        zeros = chabauty_zeros(resolved.curve, resolved.base, free, p, digits)
    except PrecisionLost as error:
        if several:
            return Trial(p, None, {}, error.line)
        raise InputError(
            "--precision", "", f"{digits} digits, which are too few ({error})",
            f"more digits, like --precision {2 * digits}, or another prime",
        ) from None
    except (BadReduction, Uncertified) as error:
        if several:
            return Trial(p, None, {}, error.line)
        raise InputError("--prime", "", f"{p} cannot be used: {error.reason}", "another prime") from None
    points: dict[str, list[Point]] = {}
    candidates = zeros.candidates()
    for point in [*resolved.known_points, *found]:
        near = [c for c in candidates if _agrees(zeros, c, point)]
        if not near:
            shown = resolved.curve.format_point(point)
            raise Inconsistent(
                f"the rational point {shown} is no zero of the integrals at {p} "
                "(wrong generators, rank or base)", shown,
            )
        points.setdefault(near[0].id, []).append(point)
    unsuited = why_unsuited(zeros, resolved.curve, [resolved.base, *generators])
    algebraic = sum(_is_algebraic(zeros, c) for c in candidates if c.id not in points) if several else 0
    named = {name: tuple(sorted(here)) for name, here in points.items()}
    return Trial(p, zeros, named, unsuited=unsuited, algebraic=algebraic)


def _is_algebraic(zeros: ChabautyZeros, candidate: LocatedCandidate) -> bool:
    curve, n = zeros.integrals.curve, candidate.digits
    x, y, z = zeros.integrals.point_at(int(candidate.disc or 0), candidate.parameter, n)
    point = tuple(PadicNumber.padic(zeros.prime, c, 0, n) for c in (x, y, z))
    return recognise_algebraic(curve, zeros.prime, (point[0], point[1], point[2])) is not None


def _agrees(zeros: ChabautyZeros, candidate: LocatedCandidate, point: Point) -> bool:
    if zeros.integrals.disc_of(point) != candidate.disc:
        return False
    parameter, _ = zeros.integrals.parameter_of_point(point, candidate.digits)
    return (parameter - candidate.parameter) % zeros.prime**candidate.digits == 0


# ---- output ----------------------------------------------------------------------------------------------


def _point_text(curve: Curve, zeros: ChabautyZeros, candidate: LocatedCandidate) -> str:
    """The candidate in the user's coordinates, each to the candidate's digits."""
    p, n = zeros.prime, candidate.digits
    x, y, z = zeros.integrals.point_at(int(candidate.disc or 0), candidate.parameter, n)
    scale = curve.y_scale
    y = y * scale.denominator * pow(scale.numerator, -1, p**n)
    entries = [str(PadicNumber.padic(p, c, 0, n)) for c in (x, y, z)]
    if z == 1:
        return f"({entries[0]}, {entries[1]})"
    # in normal form another coordinate is exactly 1
    entries[0 if x == 1 else 1] = "1"
    return f"({' : '.join(entries)})"


def differential_text(curve: Curve, coefficients: Sequence[int]) -> str:
    """A regular differential, coefficients on the basis of the model, in affine coordinates."""
    top = curve.degree - curve.weight - 2
    basis = [(i, k) for k in range(len(curve.rows)) for i in range(top - curve.weight * k + 1)]
    x, y, z = curve.variables
    if curve.weight == 1:
        below, x, y = f"dX/F_Y (X = {x}/{z}, Y = {y}/{z})", "X", "Y"
    else:
        below = "dx/(2y + h)"
    terms = []
    for c, (i, k) in zip(coefficients, basis, strict=True):
        if c:
            powers = [name if e == 1 else f"{name}^{e}" for name, e in ((x, i), (y, k)) if e]
            terms.append("*".join([str(c), *powers]))
    return f"({' + '.join(terms) or '0'}) {below}"


def candidate_document(search: CandidateSearch) -> dict[str, Any]:
    """The candidate file as a JSON document."""
    case, zeros = search.resolved.case, search.zeros
    count = len(zeros.annihilators)
    forms = "differential" if count == 1 else "differentials"
    source = (
        f"linear Chabauty (residue-sieve {__version__}): zeros of the integrals of {count} annihilating "
        f"{forms}, their number certified in every residue disc; given that J(Q) has rank at most {case.rank}"
        f" ({case.rank_source})"
    )
    entries = []
    for candidate in zeros.candidates():
        entry: dict[str, Any] = {
            "id": candidate.id,
            "point": _point_text(search.resolved.curve, zeros, candidate),
            "multiplicity": candidate.multiplicity,
        }
        if candidate.at_most is not None:
            entry["at_most"] = candidate.at_most
        entries.append(entry)
    return {
        "format": FORMAT, "prime": zeros.prime, "precision": zeros.digits, "complete": True,
        "source": source, "candidates": entries,
    }


def document(search: CandidateSearch) -> dict[str, Any]:
    """The document of `--json`: the candidate file, and how it was found."""
    curve, zeros = search.resolved.curve, search.zeros
    out = candidate_document(search)
    out["differentials"] = [
        {"coefficients": [str(c) for c in a.coefficients], "precision": a.precision, "exact": a.exact}
        for a in zeros.annihilators
    ]
    out["working_precision"] = zeros.working
    out["discs"] = [
        {"point": list(d.point), "zeros": d.count, "candidates": len(d.balls)} for d in zeros.discs
    ]
    out["rational"] = {
        name: [curve.format_point(p) for p in points] for name, points in search.chosen.points.items()
    }
    out["spurious"] = search.chosen.spurious
    out["tried"] = [
        {"prime": t.prime, "candidates": None, "spurious": None, "reason": t.reason}
        if t.zeros is None
        else {"prime": t.prime, "candidates": t.zeros.count, "spurious": t.spurious, "reason": t.unsuited}
        for t in search.trials
    ]
    out["not_in_case"] = [curve.format_point(p) for p in search.found_points]
    return out


def text(search: CandidateSearch) -> str:
    """The report."""
    curve, zeros = search.resolved.curve, search.zeros
    p, count = zeros.prime, len(zeros.annihilators)
    lines = [f"Case {search.resolved.case.name}: linear Chabauty, rank {search.resolved.case.rank}, genus "
             f"{curve.genus}", ""]
    if len(search.trials) > 1:
        lines.append("Primes tried:")
        for t in search.trials:
            shown = t.reason if t.zeros is None else f"{t.zeros.count} zeros, {t.spurious} spurious"
            shown += f" (unsuited: {t.unsuited})" if t.unsuited else ""
            lines.append(f"{t.prime:>6}  {shown}" + ("  (chosen)" if t is search.chosen else ""))
        lines.append("")
    lines.append(f"p = {p}, {zeros.digits} digits, {count} annihilating differential{'s' * (count != 1)}:")
    for a in zeros.annihilators:
        known = "exactly" if a.exact else f"modulo {p}^{a.precision}"
        lines.append(f"  {differential_text(curve, a.coefficients)}, {known}")
    lines += ["", "Residue discs: zeros over the algebraic closure with |t| <= 1/p, candidates over Q_p"]
    names = iter(zeros.candidates())
    for d in zeros.discs:
        shown = " : ".join(map(str, d.point))
        parts = []
        for _ in d.balls:
            c = next(names)
            points = search.chosen.points.get(c.id, ())
            what = ", ".join(curve.format_point(q) for q in points) or "spurious or unknown"
            more = "" if c.multiplicity == 1 else f", multiplicity {c.multiplicity}"
            parts.append(f"{c.id} = {what}{more}")
        counted = f"{d.count} zero{'s' * (d.count != 1)}"
        lines.append("; ".join([f"  ({shown}): {counted}", *parts]))
    lines += ["", f"{zeros.count} candidates, {search.chosen.spurious} of them near no known rational point. "
              "The list is complete: every number of zeros is certified."]
    for q in search.found_points:
        lines.append(f"Warning: the rational point {curve.format_point(q)} is not among the known_points.")
    return "\n".join(lines) + "\n"
