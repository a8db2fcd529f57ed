"""Which auxiliary primes prove saturation and torsion at l in the log: as few new ones as possible."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

from sieve.engine.hypotheses import rank_of_columns
from sieve.local.records import LocalRecord
from sieve.proof.statement import ProofInput


@dataclass(frozen=True)
class Chosen:
    """dim J(Q)[l] <= `dimension` by the prime `torsion_by` (None: by the factors of 4 f + h^2); L/lL injects
    into the groups at `primes`."""

    ell: int
    dimension: int
    torsion_by: int | None
    primes: tuple[int, ...]

    @property
    def all_primes(self) -> set[int]:
        """The auxiliary primes in use."""
        return set(self.primes) | (set() if self.torsion_by is None else {self.torsion_by})


def choose_saturation(source: ProofInput, ell: int, preferred: Collection[int]) -> Chosen | None:
    """Primes that prove saturation at l, preferred ones first; None when it is not proved.

    Greedy: the prime with the largest gain in rank, the smallest of these.
    """
    rows = [*range(source.rank), *(source.rank + j for j, t in enumerate(source.orders) if t % ell == 0)]
    usable = [v for v in sorted(source.records) if source.records[v].points > 0]
    columns = {v: _columns(source, v, ell, rows) for v in usable}
    chosen: list[int] = []
    found: list[list[int]] = []
    rank = 0
    for pool in ([v for v in usable if v in preferred], usable):
        while rank < len(rows):
            gains = [
                (-rank_of_columns(ell, [*found, *columns[v]]), v)
                for v in pool
                if columns[v] and v not in chosen
            ]
            best = min(gains, default=(0, 0))
            if -best[0] <= rank:
                break
            rank, v = -best[0], best[1]
            chosen.append(v)
            found += columns[v]
    if rank < len(rows):
        return None
    claimed = len(rows) - source.rank
    fitting = [v for v in usable if _dimension(source.records[v], ell) <= claimed and not (v == ell == 2)]
    near = [v for v in fitting if v in preferred or v in chosen]
    if near:
        return Chosen(ell, _dimension(source.records[near[0]], ell), near[0], tuple(sorted(chosen)))
    if ell == 2 and source.branch is not None and source.two_torsion is not None:
        if source.two_torsion <= claimed:
            return Chosen(ell, source.two_torsion, None, tuple(sorted(chosen)))
    if fitting:
        return Chosen(ell, _dimension(source.records[fitting[0]], ell), fitting[0], tuple(sorted(chosen)))
    return None


def _dimension(record: LocalRecord, ell: int) -> int:
    return sum(d % ell == 0 for d in record.invariants)


def _columns(source: ProofInput, v: int, ell: int, rows: list[int]) -> list[list[int]]:
    """The maps L/lL -> Z/l through J(F_v)."""
    images = source.images[v]
    invariants = source.records[v].invariants
    columns = [[images[i][j] % ell for i in rows] for j, d in enumerate(invariants) if d % ell == 0]
    return [c for c in columns if any(c)]
