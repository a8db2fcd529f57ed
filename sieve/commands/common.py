"""What all subcommands share: the problem from its files, workers, progress, one-line errors."""

from __future__ import annotations

import os
import sys
import time
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import Executor, ProcessPoolExecutor
from contextlib import contextmanager
from dataclasses import dataclass, field
from functools import partial

from sieve.engine.investigation import Investigation
from sieve.engine.problem import Problem
from sieve.errors import InputError
from sieve.exact.primes import is_prime
from sieve.files.resolve import ResolvedCase
from sieve.files.store import Store, problem_key
from sieve.local.quick_order import QuickOrder, quick_order
from sieve.local.records import LocalRecord


def problem_of(resolved: ResolvedCase) -> Problem:
    """The mathematical problem behind a case."""
    case = resolved.case
    return Problem(
        case.name,
        resolved.curve,
        resolved.base,
        resolved.generators,
        resolved.torsion,
        resolved.known_points,
        case.rank,
        case.rank_source,
        case.index_prime_to,
        case.index_source,
        case.generators_from is not None,
        case.integral,
    )


def parse_primes(text: str) -> list[int]:
    """The primes in `--primes 59,73`; raises `InputError` for anything else."""
    out = []
    for word in text.split(","):
        word = word.strip()
        if not word.isascii() or not word.isdigit() or len(word) > 9 or not is_prime(int(word)):
            raise InputError("--primes", "", f"{word!r}", "primes below 10^9 separated by commas")
        if int(word) >= 2**20:
            raise InputError("--primes", "", word, "primes below 2^20")
        out.append(int(word))
    return sorted(set(out))


class Progress:
    """A line on a terminal, nothing elsewhere unless verbose."""

    def __init__(self, verbose: bool) -> None:
        self.verbose = verbose
        self.terminal = sys.stderr.isatty()
        self.last = 0.0

    def __call__(self, what: str, value: int) -> None:
        now = time.monotonic()
        if self.terminal and now - self.last > 0.1:
            self.last = now
            sys.stderr.write(f"\r{what}: v = {value}   ")
            sys.stderr.flush()

    def say(self, text: str) -> None:
        """A message for `-v`."""
        if self.verbose:
            sys.stderr.write(("\r" if self.terminal else "") + text + "\n")

    def close(self) -> None:
        """Clear the line."""
        if self.terminal:
            sys.stderr.write("\r" + " " * 40 + "\r")
            sys.stderr.flush()


@contextmanager
def workers(jobs: int) -> Iterator[Executor | None]:
    """An executor with that many processes (0: all cores), or None for one."""
    count = jobs or os.cpu_count() or 1
    if count == 1:
        yield None
        return
    pool = ProcessPoolExecutor(max_workers=count)
    try:
        yield pool
    finally:
        # wait even when interrupted: a pool left behind is woken through closed pipes at exit; the few
        # primes in work are soon done, the others are cancelled
        pool.shutdown(wait=True, cancel_futures=True)


@dataclass
class StoredInvestigation:
    """An investigation whose local data go through a store, with a deadline.

    `gather` returns False when the deadline stopped it before all primes were done.
    """

    investigation: Investigation
    store: Store | None
    deadline: float | None = None
    block: int = field(default=32)

    def gather(self, primes: Sequence[int]) -> bool:
        """Add the primes, from the store where possible; records computed are saved at once, by blocks."""
        inner = self.investigation
        key = ""
        if self.store is not None:
            problem = inner.problem
            key = problem_key(problem.curve, problem.base, inner.asked, problem.integral)
            known = self.store.load(key, [v for v in primes if v not in inner.records])
            for v in sorted(known):
                inner.add(known[v])
        missing = [v for v in primes if v not in inner.records]
        for low in range(0, len(missing), self.block):
            if self.deadline is not None and time.monotonic() > self.deadline:
                return False
            part = missing[low : low + self.block]
            inner.gather(part, self._saver(key))
        return True

    def quick_orders(self, primes: Sequence[int]) -> dict[int, QuickOrder]:
        """The possible orders of J(F_v) for those of the primes where they are known, through the store."""
        curve, executor = self.investigation.problem.curve, self.investigation.executor
        if curve.weight != 3:
            # only genus 2 has a quick way to the order
            return {}
        known = {} if self.store is None else self.store.load_orders(curve.key, primes)
        missing = [v for v in primes if v not in known]
        work = partial(quick_order, [-c for c in curve.rows[0]], curve.rows[1])
        found = map(work, missing) if executor is None or len(missing) < 50 else executor.map(
            work, missing, chunksize=16)
        new = dict(zip(missing, found, strict=True))
        if self.store is not None:
            self.store.save_orders(curve.key, new)
        return {v: order for v in primes if (order := known.get(v) or new.get(v)) is not None}

    def _saver(self, key: str) -> Callable[[LocalRecord], None] | None:
        store = self.store
        if store is None:
            return None
        return lambda record: store.save(key, record)
