"""Ratios, taken in one run on one core: this engine next to the usual ways.

    python scripts/bench.py [--quick] [local] [plane] [joins] [store] [cores] [advice] [check]

local   J(F_v) with the logarithms of all points of X(F_v), next to PARI's point count alone
        (`hyperellcharpoly`) and to the textbook way (order by PARI, Cantor arithmetic, Pohlig-Hellman for
        each point).
plane   J(F_v) of smooth plane curves: quartics near v = 100, 300, 1000 with the growth of the time, a quintic
        and a sextic; next to the enumeration of the points alone.
joins   the sieve by joins next to lift-and-filter (Bruin and Stoll 2010) on the same conditions, up to the
        modulus that the joins reach, along the best path for it.
store   local data computed next to local data read back.
cores   local data with one and with two processes.
advice  what the primes advised first remove, next to the best ones of all.
check   checking the proof log, trimmed and full, next to the cold run that wrote it.

Times are the minimum of several runs.  Every table carries a count that shows that the work was done.  Needs
the test packages (`pip install -e '.[test]'`).
"""

from __future__ import annotations

import io
import os
import sys
import time
import tracemalloc
from collections.abc import Callable, Sequence
from concurrent.futures import Executor, ProcessPoolExecutor
from functools import cache, partial
from heapq import heappop, heappush
from math import exp, lcm, log, prod
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import TypeVar

os.environ.update(OMP_NUM_THREADS="1", OPENBLAS_NUM_THREADS="1")
sys.path.insert(0, str(Path(__file__).resolve().parent.parent))

from cypari import pari
from flint import fmpz

from sieve.commands import run as run_command
from sieve.commands.prooflog import proof_of
from sieve.curves.divisors import Divisor
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.plane import PlaneCurve
from sieve.engine.advice import Offer, advise
from sieve.engine.investigation import FIRST_BOUND, Investigation
from sieve.engine.join import semijoin
from sieve.engine.lift_filter import Lifted, lift_and_filter
from sieve.engine.plan import run_plan, sieve_classes
from sieve.engine.problem import Problem
from sieve.engine.relation import Relation, coarsen, relation_from_condition
from sieve.errors import LimitReached
from sieve.exact.primes import primes_below
from sieve.files.store import Store
from sieve.local.picard import PicardGroup, picard_group
from sieve.local.records import LocalRecord, local_records
from sieve.proof import checker
from tests.support.cantor import CantorJacobian
from tests.support.plane_cases import quartic_case, write_plane_candidates, write_quartic
from tests.support.pohlig_hellman import GroupOracle
from tests.support.quartics import quartics
from tests.support.reference_cases import ReferenceCase, reference_case, reference_cases
from tests.support.run_files import RUNNABLE, chabauty_prime, write_candidates, write_case

T = TypeVar("T")


def best(work: Callable[[], T], times: int) -> tuple[float, T]:
    """The shortest of several runs in seconds, and the last value."""
    shortest = float("inf")
    for _ in range(times):
        start = time.perf_counter()
        value = work()
        shortest = min(shortest, time.perf_counter() - start)
    return shortest, value


def mean(ratios: Sequence[float]) -> float:
    """The geometric mean."""
    return exp(sum(map(log, ratios)) / len(ratios))


# ---- local data ------------------------------------------------------------------------------------------


def engine_group(case: ReferenceCase, v: int) -> PicardGroup:
    """Cold: enumeration of the points included, nothing kept from an earlier run."""
    return picard_group(HyperellipticCurve(case.f, case.h).modulo(v))


def textbook(case: ReferenceCase, v: int, order: int) -> GroupOracle:
    """The group from its order, and one discrete logarithm for every point."""
    J = CantorJacobian(v, case.f, case.h, case.genus)
    group = GroupOracle(J, order)
    logs = {group.logarithm(J.of_point(point)) for point in J.points}
    assert len(logs) == len(J.points)
    return group


def bench_local(quick: bool) -> None:
    """One line for each curve and prime, then the geometric means."""
    names = ["X0p67", "X0p103_lmfdb", "lmfdb13689", "integral_g2", "y2_minus_y_x5_minus_x"]
    print("local data: J(F_v), structure and logarithms of all points; times in milliseconds")
    print(f"{'curve':24}{'v':>6}{'points':>8}{'sections':>10}{'engine':>9}{'count':>9}{'ratio':>7}{'textbook':>10}{'ratio':>7}")
    for near in ((97, 101, 103), (991, 997, 1009)):
        counted, slower = [], []
        for name in names[: 2 if quick else None]:
            case = reference_case(name)
            for v in [p for p in near if p not in case.bad_primes][: 1 if quick else None]:
                ours, group = best(lambda c=case, p=v: engine_group(c, p), 5)  # type: ignore[misc]
                pair = pari(f"Mod(1,{v})*[{text(case.f)}, {text(case.h)}]")
                theirs, polynomial = best(lambda q=pair: pari.hyperellcharpoly(q), 5)  # type: ignore[misc]
                order = int(pari.subst(polynomial, "x", 1))
                slow, oracle = best(lambda c=case, p=v, n=order: textbook(c, p, n), 1)  # type: ignore[misc]
                slow += theirs
                if group.order != order or list(group.invariants) != oracle.invariants():
                    raise SystemExit(f"{name}, v = {v}: the groups differ")
                counted.append(ours / theirs)
                slower.append(slow / ours)
                print(f"{name:24}{v:6}{len(group.point_logs):8}{group.sections_used:10}{ours * 1e3:9.2f}"
                      f"{theirs * 1e3:9.2f}{counted[-1]:7.1f}{slow * 1e3:10.0f}{slower[-1]:7.1f}", flush=True)
        print(f"near {near[0]}: engine / count {mean(counted):.2f} (worst {max(counted):.2f}), "
              f"textbook / engine {mean(slower):.1f} (worst {min(slower):.1f})")


def text(c: Sequence[int]) -> str:
    return "+".join(f"({a})*x^{i}" for i, a in enumerate(c)) or "0"


def bench_plane(quick: bool) -> None:
    """One line for each curve and prime; the growth is the slope of log time against log v."""
    print("plane curves: J(F_v), structure and logarithms of all points; times in milliseconds")
    print(f"{'curve':16}{'v':>6}{'points':>8}{'sections':>10}{'engine':>9}{'count':>9}{'ratio':>7}")
    means: list[tuple[float, float]] = []
    names = ["X0p97", "X0p113", "X0p139", "X0p151", "X0p239", "level13_split", "level13_S4"]
    for near in ((97, 101, 103), (293, 307, 311), (991, 997, 1009)):
        times = []
        for name in names[: 2 if quick else None]:
            curve = quartics()[name][0]
            for v in [p for p in near if curve.is_smooth(p)][: 1 if quick else None]:
                times.append((v, _plane_line(name, curve, v)))
        value = mean([t for _, t in times])
        means.append((mean([float(v) for v, _ in times]), value))
        print(f"near {means[-1][0]:.0f}: {value * 1e3:.1f} ms (worst {max(t for _, t in times) * 1e3:.1f})")
    (low, first), (high, last) = means[0], means[-1]
    print(f"growth: time as v^{log(last / first) / log(high / low):.2f}")
    for degree, near in ((5, (199, 499)), (6, (1009, 1499))):
        terms = {(degree, 0, 0): 1, (0, degree, 0): 2, (0, 0, degree): -3, (degree - 1, 0, 1): 1,
                 (0, degree - 1, 1): -1, (3, 1, degree - 4): 2, (1, degree - 3, 2): -2}
        for v in near[: 1 if quick else None]:
            _plane_line(f"degree {degree}", PlaneCurve(terms), v)


def _plane_line(name: str, curve: PlaneCurve, v: int) -> float:
    ours, group = best(lambda: picard_group(curve.modulo(v)), 3)
    count, _ = best(lambda: curve.modulo(v), 3)
    print(f"{name:16}{v:6}{len(group.point_logs):8}{group.sections_used:10}{ours * 1e3:9.1f}"
          f"{count * 1e3:9.2f}{ours / count:7.1f}", flush=True)
    return ours


# ---- joins -----------------------------------------------------------------------------------------------


def survivors_by_modulus(relations: Sequence[Relation], modulus: int, cap: int,
                         seconds: float = 20.0) -> list[int] | None:
    """The order of lifts whose largest set is least, found by best-first search with the real sizes.

    The vectors that survive modulo M do not depend on the path to M: a path is as bad as its worst lift.
    None when no path stays below the cap, or after some seconds (then `expected_path` has to do).
    """
    n = relations[0].n
    factors = {int(ell): int(e) for ell, e in fmpz(modulus).factor()}
    heap: list[tuple[int, float, tuple[int, ...]]] = [(1, 0.0, ())]
    sizes: dict[int, int] = {1: 1}
    done: set[int] = set()
    began = time.perf_counter()
    while heap:
        peak, _, path = heappop(heap)
        m = prod(path)
        if m in done:
            continue
        done.add(m)
        if m == modulus:
            return list(path)
        if time.perf_counter() - began > seconds:
            return None
        if m not in sizes:
            sizes[m] = len(lift_and_filter(relations, path, cap).vectors)
        for ell, e in factors.items():
            if e and modulus % (m * ell) == 0:
                lifted = sizes[m] * ell**n
                if lifted <= cap:
                    heappush(heap, (max(peak, lifted), -log(m * ell), (*path, ell)))
    return None


def expected_path(relations: Sequence[Relation], modulus: int) -> list[int]:
    """The order of lifts with the smallest expected size at each step."""
    n = relations[0].n
    left = [int(ell) for ell, e in fmpz(modulus).factor() for _ in range(int(e))]
    path: list[int] = []

    def expected(m: int) -> float:
        visible = {int(ell): int(e) for ell, e in fmpz(m).factor()}
        small = [coarsen(r, visible) for r in relations]
        return n * log(m) + sum(log(r.count) - log(r.index) for r in small if r.count)

    while left:
        q = min(sorted(set(left)), key=lambda q: (expected(prod(path) * q), q))
        path.append(q)
        left.remove(q)
    return path


def peak_memory(work: Callable[[], object]) -> float:
    """The most memory that one run holds, in MB (not timed: tracing slows it down)."""
    tracemalloc.start()
    try:
        work()
    except LimitReached:
        pass
    found = tracemalloc.get_traced_memory()[1] / 1e6
    tracemalloc.stop()
    return found


def bench_joins(quick: bool) -> None:
    """The same conditions both ways: largest sets, memory, times; estimates next to sizes found."""
    smooth, cap = [2, 3, 5, 7, 11, 13], 2 * 10**7
    print("\njoins next to lift-and-filter on the same conditions (v < 420, 13-smooth parts, rank 2)")
    cases = [c for c in reference_cases() if c.genus == 2 and c.rank == 2][: 2 if quick else 9]
    factors: list[float] = []
    ratios: list[tuple[float, float, float]] = []
    for case in cases:
        relations = relations_of(case, 420, smooth)
        seconds, outcome = best(lambda r=relations: sieve_classes(r), 1 if quick else 3)  # type: ignore[misc]
        final = outcome.relation
        again, _ = best(lambda r=relations, p=outcome.plan: run_plan(p, r), 3)  # type: ignore[misc]
        memory = peak_memory(lambda r=relations: sieve_classes(r))  # type: ignore[misc]
        steps = [s for s in outcome.plan.steps if s.kind == "join" and s.actual is not None]
        here = [max(s.predicted, 1) / max(s.actual or 0, 1) for s in steps]
        factors += [max(x, 1 / x) for x in here]
        print(f"{case.id}: {len(steps)} joins, {final.count} classes of {final.index:.3e}, largest set "
              f"{outcome.largest}, {memory:.1f} MB, {seconds * 1e3:.0f} ms to plan and join, "
              f"{again * 1e3:.1f} ms to join")
        modulus = lcm(1, *final.moduli)
        began = time.perf_counter()
        searched = survivors_by_modulus(relations, modulus, cap)
        search = time.perf_counter() - began
        path = searched or expected_path(relations, modulus)
        how = f"best path (found in {search:.1f} s)" if searched else "path by expected sizes"
        where = f"  lift-and-filter modulo {modulus}, {how} {path}"

        def lift(r: Sequence[Relation] = relations, p: Sequence[int] = path) -> Lifted:
            return lift_and_filter(r, p, cap)

        memory_there = peak_memory(lift)
        try:
            slow, lifted = best(lift, 1)
        except LimitReached as limit:
            print(f"{where}: stopped at {limit.partial} classes, {memory_there:.0f} MB, "
                  f"{int(str(limit.partial)) / outcome.largest:.0f} times the largest set", flush=True)
            ratios.append((int(str(limit.partial)) / outcome.largest, memory_there / memory, 0.0))
            continue
        ratios.append((lifted.largest / outcome.largest, memory_there / memory, slow / again))
        print(f"{where}: {len(lifted.vectors)} classes, largest set {lifted.largest}, "
              f"{memory_there:.0f} MB, {slow * 1e3:.0f} ms: {ratios[-1][0]:.0f} times the set, "
              f"{ratios[-1][1]:.1f} times the memory, {ratios[-1][2]:.1f} times the time to join", flush=True)
    factors.sort()
    timed = [r[2] for r in ratios if r[2]]
    print(f"largest set: lift-and-filter / joins {mean([r[0] for r in ratios]):.0f} (least "
          f"{min(r[0] for r in ratios):.1f}); memory {mean([r[1] for r in ratios]):.1f}; "
          f"time {mean(timed) if timed else float('nan'):.1f} (where it ended)")
    if factors:
        middle = factors[len(factors) // 2]
        print(f"estimate against size of {len(factors)} joins: median factor {middle:.2f}, worst "
              f"{factors[-1]:.1f}")


# ---- store, cores, hunts, advice -------------------------------------------------------------------------


def problem_of(case: ReferenceCase) -> Problem:
    """The problem whose generators come from the known points."""
    curve = HyperellipticCurve(case.f, case.h)
    base = Divisor.of([(1, curve.place_of_point(case.known_points[0]))])
    return Problem(case.id, curve, base, (), (), case.known_points, case.rank or 0, "literature",
                   from_known_points=True)


@cache
def investigated(name: str, bound: int) -> Investigation:
    """The investigation of a reference case with all primes below the bound."""
    found = Investigation(problem_of(reference_case(name)))
    found.gather(primes_below(bound))
    found.establish()
    return found


def relations_of(case: ReferenceCase, bound: int, ells: Sequence[int]) -> list[Relation]:
    """The relations at v < bound in the group that the known points generate."""
    found = investigated(case.id, bound)
    return found.relations([ell for ell in found.allowed_ells() if ell in ells], bound)


def all_records(name: str, bound: int, executor: Executor | None = None) -> list[LocalRecord]:
    """The local data of a reference case below the bound, computed."""
    problem = problem_of(reference_case(name))
    asked = Investigation(problem).asked
    return list(local_records(problem.curve, problem.base, asked, primes_below(bound), executor))


def bench_store(quick: bool) -> None:
    """Local data below 1000: computed, and read from a warm store."""
    print("\nstore: local data at v < 1000, computed and read back; seconds")
    ratios = []
    for name in ["X0p67", "lmfdb13689", "integral_g2"][: 1 if quick else None]:
        cold, records = best(partial(all_records, name, 1000), 2)
        with TemporaryDirectory() as directory:
            path = Path(directory) / "store"
            with Store(path) as store:
                for record in records:
                    store.save("key", record)

            def read(path: Path = path) -> int:
                with Store(path) as store:
                    return len(store.load("key", primes_below(1000)))

            warm, count = best(read, 5)
        ratios.append(cold / warm)
        print(f"{name:24}{count:5} records {cold:8.3f} {warm:8.4f} {ratios[-1]:7.0f} times")
    print(f"computed / read: {mean(ratios):.0f} (least {min(ratios):.0f})")


def bench_cores(quick: bool) -> None:
    """Local data below 1000 with one and with two processes."""
    print("\ncores: local data at v < 1000 for one and two processes (started before); seconds")
    ratios = []
    for name in ["X0p67", "lmfdb13689", "integral_g2"][: 1 if quick else None]:
        with ProcessPoolExecutor(2) as pool:
            list(pool.map(abs, range(4)))
            two, records = best(partial(all_records, name, 1000, pool), 3)
        one, again = best(partial(all_records, name, 1000), 3)
        if [(r.prime, r.order) for r in records] != [(r.prime, r.order) for r in again]:
            raise SystemExit(f"{name}: one and two processes differ")
        ratios.append(one / two)
        print(f"{name:24}{len(records):5} primes {one:8.3f} {two:8.3f} {ratios[-1]:7.2f} times")
    print(f"one / two: {mean(ratios):.2f} (least {min(ratios):.2f})")


def bench_advice(quick: bool) -> None:
    """The first five primes advised next to the five that remove most when tried alone, 150 <= v < 1000."""
    print("\nadvice: classes removed by the first five advised, by the best five of all tried alone")
    shares, factors = [], []
    cases = [c for c in reference_cases() if c.genus == 2 and c.rank and c.known_points]
    for case in cases[: 2 if quick else 14]:
        found = investigated(case.id, 1000)
        ells = found.allowed_ells()
        state = sieve_classes(found.relations(ells, FIRST_BOUND)).relation
        offers = [
            Offer(r.prime, relation_from_condition(r.condition(found.images(r)), ells), r.invariants, 0.01)
            for r in found.usable if r.prime >= FIRST_BOUND
        ]
        known = [c.vector for c in found.coordinates.values() if c.denominator == 1]
        advice = advise([state], offers, 5, known)
        alone = sorted(offers, key=lambda o: (semijoin(state, o.relation).count, o.prime))[:5]
        after = state
        for offer in alone:
            after = semijoin(after, offer.relation)
        removed, most = state.count - (advice[-1].left if advice else state.count), state.count - after.count
        if not most:
            continue
        shares.append(removed / most)
        here = [a.estimated / max(a.left, 1) for a in advice]
        factors += [max(x, 1 / x) for x in here if x]
        print(f"{case.id:24} {state.count:6} classes: {removed:6} removed, best five alone {most:6}, "
              f"share {shares[-1]:.2f}; advised {[a.prime for a in advice]}", flush=True)
    factors.sort()
    print(f"share: least {min(shares):.2f} on {len(shares)} curves; estimate from sizes against classes "
          f"left: median factor {factors[len(factors) // 2]:.2f}")


def bench_check(quick: bool) -> None:
    """A run with 10 random candidates, then the checker on both its logs; one process, no store."""
    quartics_at = {"level13_split": 7, "level13_S4": 5, "X0p97": 7, "X0p239": 3}
    names = [*RUNNABLE[: 4 if quick else None], *list(quartics_at)[: 1 if quick else None]]
    print("check: seconds of a cold run, of checking its log (trimmed, full), kB, primes in the logs")
    ratios = []
    for name in names:
        with TemporaryDirectory() as directory:
            folder = Path(directory)
            if name in quartics_at:
                case = write_quartic(quartic_case(name), folder)
                candidates = write_plane_candidates(case, folder / "c.json", quartics_at[name], 5, 10)
            else:
                known = reference_case(name)
                case = write_case(known, folder)
                candidates = write_candidates(known, folder, chabauty_prime(known), 4, 10)
            start = time.perf_counter()
            done = run_command.execute(str(case), [str(candidates)], bound=400)
            run_command.write_files(done, folder / "out")
            run = time.perf_counter() - start
            logs = [proof_of(done, full) for full in (False, True)]
        texts = [log.text.encode() for log in logs]
        seconds = [best(lambda text=text: checker.check(io.BytesIO(text)), 3)[0] for text in texts]
        ratios.append(seconds[0] / run)
        times = f"run {run:6.2f}  check {seconds[0]:5.2f} {seconds[1]:6.2f}  ratio {ratios[-1]:.2f}"
        print(f"  {name:24} {times}  {len(texts[0]) / 1000:6.1f} {len(texts[1]) / 1000:7.1f} kB  "
              f"{len(logs[0].primes)} of {len(logs[1].primes)} primes")
    print(f"  check / run: mean {mean(ratios):.2f}, worst {max(ratios):.2f} (goal 0.5, limit 1)")


def main() -> None:
    words = sys.argv[1:]
    quick = "--quick" in words
    sections = {"local": bench_local, "plane": bench_plane, "joins": bench_joins, "store": bench_store,
                "cores": bench_cores, "advice": bench_advice, "check": bench_check}
    for word in [w for w in words if w != "--quick"] or list(sections):
        sections[word](quick)


if __name__ == "__main__":
    main()
