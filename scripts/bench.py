"""Ratios, taken in one run on one core: this engine next to the usual ways.

    python scripts/bench.py [--quick] [local] [joins]

local   J(F_v) with the logarithms of all points of X(F_v), next to PARI's point count alone
        (`hyperellcharpoly`) and to the textbook way (order by PARI, Cantor arithmetic, Pohlig-Hellman for
        each point).
joins   the sieve by joins next to lift-and-filter (Bruin and Stoll 2010) on the same conditions, up to the
        modulus that the joins reach.

Times are the minimum of several runs.  Every table carries a count that shows that the work was done.  Needs
the test packages (`pip install -e '.[test]'`).
"""

from __future__ import annotations

import os
import sys
import time
from collections.abc import Callable, Sequence
from math import exp, lcm, log, prod
from pathlib import Path
from typing import TypeVar

os.environ.update(OMP_NUM_THREADS="1", OPENBLAS_NUM_THREADS="1")
sys.path.insert(0, str(Path(__file__).resolve().parent.parent))

import numpy as np
from cypari import pari
from flint import fmpz

from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.engine.lift_filter import lift_and_filter
from sieve.engine.plan import run_plan, sieve_classes
from sieve.engine.relation import Relation, coarsen, relation_from_condition
from sieve.errors import LimitReached
from sieve.local.condition import Condition
from sieve.local.picard import PicardGroup, picard_group
from tests.support.cantor import CantorJacobian
from tests.support.pohlig_hellman import GroupOracle
from tests.support.reference_cases import ReferenceCase, reference_case, reference_cases

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


# ---- joins -----------------------------------------------------------------------------------------------


def conditions(case: ReferenceCase, bound: int) -> list[Condition]:
    """The conditions at good v < bound for the generators and base point stored with the case."""
    curve = HyperellipticCurve(case.f, case.h)
    stored = case.raw["sieve"]
    base = case.from_stored(*stored["base"])
    out = []
    for v in case.good_primes(bound, 3):
        group = picard_group(curve.modulo(v))
        logs, d = group.point_logs, group.invariants

        def at(point: Sequence[int], v: int = v, group: PicardGroup = group) -> list[int]:
            return [int(c) for c in group.point_logs[group.curve.index_of(*(int(c) % v for c in point))]]

        images = []
        for divisor in stored["gens"]:
            rows = [(m, at(case.from_stored(*place))) for m, place in divisor]
            images.append(tuple(sum(m * row[j] for m, row in rows) % d[j] for j in range(len(d))))
        allowed = (logs - np.array(at(base), dtype=np.int64)) % np.array(d, dtype=np.int64)
        out.append(Condition(f"v = {v}", v, d, tuple(images), allowed))
    return out


def greedy_path(relations: Sequence[Relation], modulus: int) -> list[int]:
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


def bench_joins(quick: bool) -> None:
    """The same conditions both ways: sizes and times."""
    smooth = [2, 3, 5, 7, 11, 13]
    print("\njoins next to lift-and-filter on the same conditions (v < 420, 13-smooth parts, rank 2)")
    cases = [c for c in reference_cases() if c.rank == 2 and "sieve" in c.raw]
    for case in cases[: 1 if quick else None]:
        relations = [relation_from_condition(c, smooth) for c in conditions(case, 420)]
        seconds, outcome = best(lambda r=relations: sieve_classes(r), 1 if quick else 3)  # type: ignore[misc]
        final = outcome.relation
        modulus = lcm(1, *final.moduli)
        path = greedy_path(relations, modulus)
        again, _ = best(lambda r=relations, p=outcome.plan: run_plan(p, r), 3)  # type: ignore[misc]
        joins = sum(step.kind == "join" for step in outcome.plan.steps)
        print(f"{case.id}: {joins} joins, {final.count} classes of {final.index:.3e}, largest set "
              f"{outcome.largest}, {seconds * 1e3:.1f} ms to plan and join, {again * 1e3:.1f} ms to join")
        where = f"  lift-and-filter modulo {modulus}, steps {path}"
        try:
            slow, lifted = best(lambda r=relations, p=path: lift_and_filter(r, p, 3 * 10**7), 1)  # type: ignore[misc]
        except LimitReached as limit:
            print(f"{where}: stopped at {limit.partial} classes, "
                  f"{int(str(limit.partial)) / outcome.largest:.0f} times the largest set", flush=True)
            continue
        print(f"{where}: {len(lifted.vectors)} classes, largest set {lifted.largest}, {slow * 1e3:.0f} ms: "
              f"{lifted.largest / outcome.largest:.0f} times the set, {slow / seconds:.1f} times the time",
              flush=True)


def main() -> None:
    words = sys.argv[1:]
    quick = "--quick" in words
    wanted = [w for w in words if w != "--quick"] or ["local", "joins"]
    for word in wanted:
        {"local": bench_local, "joins": bench_joins}[word](quick)


if __name__ == "__main__":
    main()
