"""The classes of a group of high rank down to the known points, modulo a subgroup of large index.

    python scripts/high_rank.py                                the rank-6 curve of genus 2, index above 10^20
    python scripts/high_rank.py lmfdb440509 --bound 3000       another reference curve, fewer primes
    python scripts/high_rank.py --plan                         expected sizes only

The group is the one that the known points generate. Auxiliary primes are those below the bound whose J(F_v)
may have a large part at the primes 2, 3, 5, 7, 11, 13 by its order; a ladder of subgroups is planned from the
counts, and all classes climb it depth first.  Prints what is proved of the group, the plan, progress, and how
many classes are left besides those of known points.
"""

from __future__ import annotations

import argparse
import resource
import sys
import time
from collections.abc import Sequence
from math import exp, log, log10, prod
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parent.parent))

from sieve.engine.depth_first import Rung, climb
from sieve.engine.higher import climb_further
from sieve.engine.relation import Relation
from sieve.engine.staged import Ladder, plan_ladder
from tests.support.high_rank import FURTHER, TOPS, down_to_known, gather, proved


def say(text: str) -> None:
    print(text, flush=True)


class Progress:
    """One line every so many seconds."""

    def __init__(self, seconds: float) -> None:
        self.begun = self.last = time.monotonic()
        self.seconds = seconds

    @property
    def elapsed(self) -> float:
        return time.monotonic() - self.begun

    def line(self, text: str) -> None:
        now = time.monotonic()
        if now - self.last >= self.seconds:
            self.last = now
            say(f"  {self.elapsed:.0f} s: {text}")

    def groups(self, v: int, count: int) -> None:
        self.line(f"{count} groups, v = {v}")

    def classes(self, rungs: Sequence[Rung]) -> None:
        met = [rung.met for rung in rungs]
        self.line(f"{sum(met):.4g} classes met, {max(met):.3g} on one step; in memory "
                  f"{sum(rung.count for rung in rungs)}")


def show_plan(ladder: Ladder) -> None:
    exponents: dict[int, int] = {}
    for lift in ladder:
        exponents[lift.prime] = lift.level + 1
        if lift.last:
            modulus = prod(ell**e for ell, e in exponents.items())
            say(f"  M = {modulus}: index {exp(lift.log_index):.3g}, expected {exp(lift.log_size):.3g}")
    names = {name for lift in ladder for name in lift.names}
    sizes = [exp(lift.log_size) for lift in ladder]
    say(f"plan: {len(ladder)} steps, {len(names)} conditions, {sum(sizes):.3g} classes expected in all, "
        f"{max(sizes):.3g} on one step at most")


def classes_of(relation: Relation, vectors: Sequence[Sequence[int]]) -> int:
    """In how many classes the vectors lie."""
    return len({tuple(c for part in relation.parts for c in part.values(x)) for x in vectors})


def show_classes(left: Relation, known: Sequence[Sequence[int]]) -> Relation:
    """Prints how many there are; returns the finest coarsening with classes of known points alone."""
    say(f"{left.count} classes are left modulo a subgroup of index {left.index} = "
        f"10^{log10(left.index):.1f}, {classes_of(left, known)} of them those of known points")
    alone = down_to_known(left, known)
    if alone.index < left.index:
        say(f"modulo a subgroup of index {alone.index} = 10^{log10(alone.index):.1f} none but these")
    return alone


def main(arguments: Sequence[str]) -> int:
    parser = argparse.ArgumentParser(description=(__doc__ or "").split("\n")[0])
    parser.add_argument("name", nargs="?", default="binomial_y2_x5")
    parser.add_argument("--bound", type=int, default=40_000, help="auxiliary primes below this")
    parser.add_argument("--index", type=float, default=1e20, help="the index to be reached, at least")
    parser.add_argument("--further", action="store_true", help="sieve on from the classes that are left")
    parser.add_argument("--plan", action="store_true", help="stop after the plan")
    given = parser.parse_args(arguments)
    progress = Progress(30)
    investigation, relations = gather(given.name, given.bound, progress.groups)
    tops, more = proved(investigation, TOPS), proved(investigation, FURTHER)
    known = [c.vector for c in investigation.coordinates.values()]
    ells = ", ".join(map(str, sorted({*tops, *more})))
    say(f"rank {investigation.problem.rank}, torsion {investigation.orders} (proved: "
        f"{investigation.torsion_proved()}), saturated at {ells}; {len(known)} known points; "
        f"{len(investigation.records)} groups, {len(relations)} conditions, {progress.elapsed:.0f} s")
    ladder = plan_ladder(relations, tops, log(given.index), rest=1e-3)
    show_plan(ladder)
    if given.plan:
        return 0
    progress = Progress(30)
    result = climb(relations, ladder, known=known, report=progress.classes)
    left = result.relation
    share = 2 if result.halved else 1
    for lift, met in zip(ladder[:-1], result.sizes[1:], strict=True):
        if lift.last and met > 100:
            found = f"{exp(lift.log_size):.4g}, found {share * met:.4g}"
            say(f"  index {exp(lift.log_index):.3g}: expected {found}")
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 2**20
    say(f"{sum(result.sizes):.4g} classes met{' (one of each pair)' if result.halved else ''}, "
        f"{max(result.sizes):.4g} on one step at most, {result.most_held} in memory at a time; "
        f"{progress.elapsed:.0f} s, peak memory {peak:.2f} GiB")
    left = show_classes(left, known)
    if given.further and left.count <= 500:
        most = left.n * sum(e * log(ell) for ell, e in more.items())
        left, _ = climb_further(relations, left, more, most, known=known)
        say(f"{progress.elapsed:.0f} s:")
        show_classes(left, known)
    return 0


if __name__ == "__main__":
    raise SystemExit(main(sys.argv[1:]))
