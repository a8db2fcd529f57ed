"""`sieve run`: the main job, from files to verdicts, report and result."""

from __future__ import annotations

import time
from collections.abc import Callable, Mapping, Sequence
from concurrent.futures import Executor
from dataclasses import dataclass, field, replace
from pathlib import Path

from sieve.commands.common import Progress, StoredInvestigation, problem_of
from sieve.commands.deep import add_deep
from sieve.commands.premises import premises_of
from sieve.commands.prooflog import proof_of, restrict_to_log
from sieve.commands.pursue import pursue, reach_of
from sieve.curves.divisors import Point
from sieve.curves.protocol import Curve
from sieve.curves.search import by_height, search_points
from sieve.engine.investigation import FIRST_BOUND, Investigation
from sieve.engine.plan import Step
from sieve.engine.verdicts import (
    CandidateList,
    Decision,
    Outlook,
    decide_candidates,
    match_rational,
    prove_list,
    surviving_classes,
)
from sieve.errors import BadReduction, InputError, PrecisionLost, Uncertified
from sieve.exact.primes import primes_below
from sieve.files.candidates import (
    CandidateFile,
    check_candidates,
    disc_residues,
    load_candidates,
    model_coordinates,
)
from sieve.files.case import load_case
from sieve.files.resolve import ResolvedCase, read_case
from sieve.files.result import (
    LocalGroup,
    Result,
    Survivors,
    Verdict,
    json_text,
    make_directory,
    write_result,
    write_whole,
)
from sieve.files.store import Store
from sieve.local.chabauty import ChabautyPlace, LocatedCandidate
from sieve.proof.writer import decided_list, points_of
from sieve.report.text import report_text

SEARCH_HEIGHT = 200
"""Rational points up to this height of x are looked for, to recognise candidates not listed in the case."""


def default_stages(curve: Curve, candidates: bool) -> list[int]:
    """Bounds for the auxiliary primes, tried one after the other until every candidate is decided."""
    if curve.weight == 1 and curve.degree == 4 and candidates:
        # quickly found groups, no quick orders that would tell which of them to look at
        return [FIRST_BOUND, 400, 1000, 2000]
    return [FIRST_BOUND, 400, 1000] if curve.weight in (1, 3) else [FIRST_BOUND, 300]


def case_name(case_path: str) -> str:
    """The name in a case file, for the default output directory."""
    return load_case(case_path).name


def default_store(directory: Path) -> Path:
    """The store inside the output directory (made if needed), so that an interrupted run can go on."""
    return make_directory(directory) / "local.sqlite"


@dataclass
class Run:
    """One run and everything it found."""

    resolved: ResolvedCase
    investigation: Investigation
    lists: list[CandidateList]
    files: list[CandidateFile]
    found_points: list[Point]
    ells: list[int] = field(default_factory=list)
    decisions: list[Decision] = field(default_factory=list)
    outlook: Outlook | None = None
    bound: int = 0
    stopped: str = ""
    warnings: list[str] = field(default_factory=list)
    steps: list[Step] = field(default_factory=list)

    @property
    def exit_code(self) -> int:
        """0 when everything is decided, 1 when something stays open."""
        if self.lists:
            return 1 if any(d.verdict == "open" for d in self.decisions) else 0
        return 0 if self.outlook is not None and self.outlook.empty else 1


def locate(place: ChabautyPlace, file: CandidateFile) -> list[LocatedCandidate]:
    """The candidates of a file in terms of residue discs and parameters."""
    out = []
    for c in file.candidates:
        if c.kind == "point":
            x, y, z = model_coordinates(place.curve, c)
            try:
                disc, parameter, digits = place.integrals.parameter_of_padic(x, y, z)
            except ValueError as error:
                raise c.origin.at("point", ".").error(str(error), "a p-adic point of the curve") from None
            out.append(
                LocatedCandidate(
                    c.id,
                    "point",
                    disc,
                    parameter,
                    digits,
                    (x, y, z),
                    multiplicity=c.multiplicity,
                    at_most=c.at_most,
                )
            )
            continue
        disc_number = None
        if c.disc is not None:
            disc_number = place.group.curve.index_of(*disc_residues(place.curve, c))
        if c.kind == "disc":
            out.append(
                LocatedCandidate(c.id, "disc", disc_number, multiplicity=c.multiplicity, at_most=c.at_most)
            )
        else:
            out.append(
                LocatedCandidate(
                    c.id,
                    "coefficients",
                    disc_number,
                    coefficients=c.coefficients,
                    torsion=c.torsion,
                    multiplicity=c.multiplicity,
                    at_most=c.at_most,
                )
            )
    return out


def chabauty_place(investigation: Investigation, p: int, digits: int, name: str) -> ChabautyPlace:
    """The Chabauty prime with the images of the generators; errors name the file or option `name`."""
    try:
        place = ChabautyPlace(investigation.problem.curve, p, digits)
        place.attach(investigation.problem.base, investigation.generators)
    except (BadReduction, Uncertified) as error:
        raise InputError(name, "prime", f"{p} cannot be used: {error.reason}", "another prime") from None
    except PrecisionLost as error:
        raise InputError(name, "precision", str(error), "more digits, or another prime") from None
    return place


def execute(
    case_path: str,
    candidate_paths: Sequence[str],
    *,
    bound: int | None = None,
    primes: Sequence[int] | None = None,
    seconds: float | None = None,
    store: Store | None = None,
    executor: Executor | None = None,
    progress: Progress | None = None,
) -> Run:
    """Everything `sieve run` computes; writes nothing but the store."""
    started = time.monotonic()
    say: Callable[[str], None] = progress.say if progress else (lambda text: None)
    resolved = read_case(case_path)
    files = [load_candidates(path) for path in candidate_paths]
    for i, file in enumerate(files):
        if file.prime in [f.prime for f in files[:i]]:
            raise InputError(file.path, "prime", f"a second list for {file.prime}", "one list for each prime")
        if not resolved.curve.is_smooth(file.prime):
            check_candidates(file, resolved.curve, resolved.case.rank, ())
    investigation = Investigation(problem_of(resolved), executor, progress, expressible=True)
    deadline = None if seconds is None else started + seconds
    stored = StoredInvestigation(investigation, store)
    investigation.establish(stored.gather)
    stored.deadline = deadline
    lists = []
    for file in files:
        check_candidates(file, resolved.curve, resolved.case.rank, investigation.orders)
        place = chabauty_place(investigation, file.prime, file.precision, file.path)
        lists.append(CandidateList(place, locate(place, file), file.complete, file.source, file.path))
        restrict_to_log(investigation, lists[-1])
        prove_list(investigation, lists[-1])
    known = set(resolved.known_points)
    asked = investigation.problem.asks_for
    found = [p for p in search_points(resolved.curve, SEARCH_HEIGHT) if p not in known and asked(p)]
    run = Run(resolved, investigation, lists, files, found)
    missed: list[tuple[int, Point]] = []
    matched = match_rational(investigation, lists, found, missed)
    for points in matched.values():
        for point in points:
            if point not in known and point not in found:
                found.append(point)
    for point in found:
        kind = "integral" if resolved.case.integral else "rational"
        run.warnings.append(f"the {kind} point {resolved.curve.format_point(point)} is not in the case")
    for i, point in missed:
        # the claim is refuted: nothing may rest on it
        lists[i].complete = lists[i].claimed = False
        files[i] = replace(files[i], complete=False)
        run.warnings.append(
            f"{files[i].path} claims to be complete but misses the rational point "
            f"{resolved.curve.format_point(point)}: it is used as an incomplete list"
        )
    stages = default_stages(resolved.curve, bool(files))
    if bound is not None:
        # beyond the usual stages only primes that open candidates can use are looked at
        last = [] if files and bound > stages[-1] and reach_of(resolved.curve, bound, seconds) else [bound]
        stages = [b for b in stages if b < bound] + last
    if primes is not None:
        stages = [max(primes) + 1]
    chabauty_primes = [listing.place.prime for listing in lists]
    wanted = None if primes is None else set(primes)
    for stage in stages:
        todo = primes_below(stage) if wanted is None else sorted(wanted)
        finished = stored.gather(todo)
        run.bound = stage
        run.ells = investigation.allowed_ells(chabauty_primes)
        say(f"auxiliary primes below {stage}: {len(investigation.usable)} usable, parts at l = {run.ells}")
        if lists:
            decisions = decide_candidates(investigation, lists, matched, run.ells, stage, wanted)
            if any(d.verdict == "open" for d in decisions.values()) and not investigation.deep and add_deep(
                investigation, run.ells, wanted, [x.place.prime for x in lists if x.complete]
            ):
                say(f"points modulo q^2 at q = {sorted(investigation.deep)}")
                decisions = decide_candidates(investigation, lists, matched, run.ells, stage, wanted)
            run.decisions = in_order(lists, decisions)
        if lists and all(d.verdict != "open" for d in run.decisions):
            break
        if not finished:
            run.stopped = f"the time limit of {seconds:g} s stopped the run"
            break
        if not lists:
            run.outlook = surviving_classes(investigation, run.ells, stage, wanted, run.steps.append)
            if not run.outlook.empty and not investigation.deep and add_deep(investigation, run.ells, wanted):
                run.outlook = surviving_classes(investigation, run.ells, stage, wanted, run.steps.append)
            if run.outlook.empty:
                break
    if any(d.verdict == "open" for d in run.decisions):
        reach = run.bound
        if primes is None and not run.stopped:
            reach = max(reach, reach_of(resolved.curve, bound, seconds))
        pursuit = pursue(lists, decisions, run.ells, run.bound, reach, stored, wanted, deadline, say)
        run.decisions = in_order(lists, pursuit.decisions)
        if pursuit.stopped:
            run.stopped = f"the time limit of {seconds:g} s stopped the run"
    if run.outlook is None:
        run.outlook = surviving_classes(investigation, run.ells, run.bound, wanted, run.steps.append)
    return run


def in_order(lists: Sequence[CandidateList], decisions: Mapping[tuple[int, str], Decision]) -> list[Decision]:
    """The decisions in the order of the candidate files."""
    return [decisions[i, c.id] for i, listing in enumerate(lists) for c in listing.candidates]


def statement(run: Run) -> str:
    """The final statement, true under the premises."""
    curve, integral = run.resolved.curve, run.resolved.case.integral
    all_of_them, kind = ("X(Z)", "integral") if integral else ("X(Q)", "rational")
    if not run.lists:
        if run.outlook is not None and run.outlook.empty:
            return f"{all_of_them} is empty."
        count = run.outlook.outcome.relation.count if run.outlook else 0
        index = run.outlook.outcome.relation.index if run.outlook else 1
        where = f"modulo a subgroup of index {index} of the known group"
        return f"Every {kind} point of X has one of {count} classes {where}."
    eliminated = sum(d.verdict == "eliminated" for d in run.decisions)
    left = [d for d in run.decisions if d.verdict == "open"]
    points = rational_points(run)
    shown = ", ".join(curve.format_point(p) for p in points)
    decided = decided_list(run.lists, run.decisions)
    if decided is not None:
        why = f"({reason_of(run, decided, kind)})"
        exact = points_of(decided, run.decisions)
        if not exact:
            return f"{all_of_them} is empty. {why}"
        how_many = f"{len(exact)} point" + ("s" if len(exact) > 1 else "")
        shown = ", ".join(map(curve.format_point, exact))
        return f"{all_of_them} has exactly {how_many}: {shown}. {why}"
    text = f"Candidates proved not to be {kind}: {eliminated}."
    if left:
        text += f" Candidates that stay open: {len(left)}."
    if points:
        text += f" {kind.capitalize()} points met: {shown}."
    return text


def reason_of(run: Run, listing: CandidateList, kind: str) -> str:
    """Why the points of a decided list are all, in one sentence."""
    p = listing.place.prime
    if listing.covers(run.resolved.case.integral):
        affine = "affine " if kind == "integral" else ""
        text = f"Every {affine}residue disc at {p} without one of them holds no {kind} point"
        if any(d.verdict == "rational" for d in run.decisions):
            text += f", and the others hold no other {kind} point"
        return f"{text}."
    if not listing.rests_on_claim(run.decisions):
        if not listing.candidates:
            return f"The annihilating integrals at {p} have no common zero, as counting zeros proves."
        return (
            f"Every {kind} point is near a candidate at {p}, as counting zeros of annihilating integrals "
            "proves, and every candidate is decided."
        )
    return f"The {p}-adic list is complete and every candidate in it is decided."


def rational_points(run: Run) -> list[Point]:
    """The rational points known, found or recognised, sorted by height."""
    points = set(run.resolved.known_points) | set(run.found_points)
    for decision in run.decisions:
        points |= set(decision.points)
    return by_height(run.resolved.curve, filter(run.investigation.problem.asks_for, points))


def result_of(run: Run) -> Result:
    """The content of result.json."""
    curve = run.resolved.curve
    verdicts = tuple(
        Verdict(
            d.prime,
            d.id,
            d.verdict,
            d.reason,
            d.primes,
            curve.format_point(d.points[0]) if d.points else "",
            d.given,
            d.sole,
            d.hint,
        )
        for d in run.decisions
    )
    local = tuple(LocalGroup(r.prime, r.points, r.order, r.invariants) for r in run.investigation.usable)
    survivors = None
    if run.outlook is not None:
        relation = run.outlook.outcome.relation
        vectors = tuple(s.vector for s in run.outlook.vectors[:1000])
        value = run.outlook.barrier.value if run.outlook.barrier else None
        survivors = Survivors(relation.index, relation.count, vectors, value)
    points = tuple(curve.format_point(p) for p in rational_points(run))
    return Result(
        run.resolved.case.name,
        run.resolved.case.sha256,
        verdicts,
        tuple(premises_of(run)),
        local,
        survivors,
        points,
        statement(run),
    )


def write_files(run: Run, directory: str | Path, full_proof: bool = False) -> Result:
    """Write result.json, proof.jsonl and report.txt into the directory (made if needed)."""
    path = make_directory(directory)
    result = result_of(run)
    proof = proof_of(run, full_proof)
    write_whole(path / "proof.jsonl", proof.text)
    write_whole(path / "report.txt", report_text(run_summary(run, result) | {"proof": proof}))
    write_result(path / "result.json", result)
    return result


def run_summary(run: Run, result: Result) -> dict[str, object]:
    """What the report prints, as plain data."""
    curve = run.resolved.curve
    relation = run.outlook.outcome.relation if run.outlook else None
    return {
        "result": result,
        "curve": curve,
        "case": run.resolved.case,
        "generators": run.investigation.generators,
        "orders": run.investigation.orders,
        "coordinates": run.investigation.coordinates,
        "base": run.resolved.base,
        "lists": [
            (f.prime, len(f.candidates), listing.complete, f.source, f.precision)
            for f, listing in zip(run.files, run.lists, strict=True)
        ],
        "skipped": [(r.prime, r.skipped) for r in run.investigation.skipped],
        "ells": run.ells,
        "plan": [str(s) for s in run.outlook.outcome.plan.steps] if run.outlook else [],
        "largest": run.outlook.outcome.largest if run.outlook else 0,
        "relation_sources": relation.sources if relation else (),
        "found": [curve.format_point(p) for p in run.found_points],
        "stopped": run.stopped,
        "warnings": run.warnings,
        "images": {r.prime: run.investigation.images(r) for r in run.investigation.usable},
    }


__all__ = ["Run", "execute", "json_text", "result_of", "statement", "write_files"]
