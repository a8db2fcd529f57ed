"""What must hold for a proof: torsion, independence, saturation (design of every verdict).

L = Z^r (+) T maps to J(Q).  For a prime l the following proves that Z_l (x) L -> Z_l (x) J(Q) is onto: the
rank of J(Q) is at most r (a premise), dim J(Q)[l] <= dim T[l], and L/lL -> (+)_v J(F_v)/l is injective for
some good primes v. For then J(Q)/l has dimension r + dim J(Q)[l] <= dim L/lL, and L/lL injects into it, so
L -> J(Q)/l is onto; Nakayama's lemma does the rest.  In particular the generators are independent and the
l-part of the torsion is that of T. (The method is common practice; see Siksek 1995 for elliptic curves,
Flynn-Smart 1997 for genus 2.)
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from sieve.exact.primes import valuation_of
from sieve.local.records import LocalRecord


@dataclass(frozen=True)
class Saturation:
    """The outcome at one prime l.

    `proved`; `primes`, auxiliary primes whose groups suffice; when not proved `reason`, and `combination`,
    coefficients modulo l on the generators of L of an element that looks divisible by l at every prime
    tried (or None).
    """

    ell: int
    proved: bool
    primes: tuple[int, ...] = ()
    reason: str = ""
    combination: tuple[int, ...] | None = None


@dataclass(frozen=True)
class TorsionBound:
    """Bounds for J(Q)[l]: `dimension` over F_l and the primes (or the word "factors") that prove it."""

    ell: int
    dimension: int
    primes: tuple[int, ...]


def torsion_dimension(ell: int, records: Sequence[LocalRecord], exact_two: int | None = None) -> TorsionBound:
    """The best bound for dim J(Q)[l] from reduction.

    J(Q)[l] injects into J(F_v) for good v not equal to l, and for v = l odd (Katz 1981, appendix).
    `exact_two` is dim J(Q)[2] where it is known from the factors of 4 f + h^2.
    """
    best: TorsionBound | None = None
    if ell == 2 and exact_two is not None:
        best = TorsionBound(2, exact_two, ())
    for record in records:
        if not record.usable or record.points == 0 or (ell == 2 and record.prime == 2):
            continue
        dimension = sum(1 for d in record.invariants if d % ell == 0)
        if best is None or dimension < best.dimension:
            best = TorsionBound(ell, dimension, (record.prime,))
            if dimension == 0:
                break
    return best if best is not None else TorsionBound(ell, 10**6, ())


def torsion_order_bound(ell: int, records: Sequence[LocalRecord]) -> int:
    """An upper bound for the exponent of l in #J(Q)_tors: the componentwise minimum of the l-parts.

    0 when there is no record to tell.
    """
    best: list[int] | None = None
    for record in records:
        if not record.usable or record.points == 0 or (ell == 2 and record.prime == 2):
            continue
        exponents = sorted((valuation_of(d, ell) for d in record.invariants), reverse=True)
        if best is None:
            best = exponents
        else:
            best = [min(a, b) for a, b in zip(best, exponents)]  # noqa: B905  (the shorter one bounds)
    return sum(best) if best else 0


def _columns(
    record: LocalRecord, images: Sequence[Sequence[int]], ell: int, rows: Sequence[int]
) -> list[list[int]]:
    """The maps L -> Z/l through the invariant factors divisible by l, one list (over `rows`) for each."""
    return [[images[i][j] % ell for i in rows] for j, d in enumerate(record.invariants) if d % ell == 0]


class _Echelon:
    """Rows over F_l in echelon form, for ranks that grow one row at a time."""

    def __init__(self, ell: int) -> None:
        self.ell = ell
        self.rows: dict[int, list[int]] = {}

    def add(self, row: list[int]) -> bool:
        row = row[:]
        for pivot, known in self.rows.items():
            if row[pivot]:
                factor = row[pivot]
                row = [(a - factor * b) % self.ell for a, b in zip(row, known, strict=True)]
        pivot_of = next((i for i, a in enumerate(row) if a), None)
        if pivot_of is None:
            return False
        inverse = pow(row[pivot_of], -1, self.ell)
        row = [a * inverse % self.ell for a in row]
        for other, known in list(self.rows.items()):
            if known[pivot_of]:
                factor = known[pivot_of]
                self.rows[other] = [(a - factor * b) % self.ell for a, b in zip(known, row, strict=True)]
        self.rows[pivot_of] = row
        return True

    def kernel_vector(self, width: int) -> list[int] | None:
        """A nonzero vector on which all rows vanish, or None."""
        free = next((i for i in range(width) if i not in self.rows), None)
        if free is None:
            return None
        vector = [0] * width
        vector[free] = 1
        for pivot, row in self.rows.items():
            vector[pivot] = -row[free] % self.ell
        return vector


def rank_of_columns(ell: int, columns: Sequence[Sequence[int]]) -> int:
    """The rank over F_l of rows of integers of one length.

    >>> rank_of_columns(3, [[1, 2], [2, 1], [0, 1]])
    2
    """
    echelon = _Echelon(ell)
    return sum(echelon.add([c % ell for c in column]) for column in columns)


def saturation(
    ell: int,
    rank: int,
    torsion: Sequence[int],
    records: Sequence[LocalRecord],
    images: Sequence[Sequence[Sequence[int]]],
    exact_two: int | None = None,
) -> Saturation:
    """Is the image of L saturated at l in J(Q), and L/lL injective?

    Arguments: `rank` r, `torsion` orders t_1 .., usable `records` and, for each, the images of the r + s
    generators. Returns a `Saturation`; never raises.
    """
    rows = list(range(rank)) + [rank + j for j, t in enumerate(torsion) if t % ell == 0]
    bound = torsion_dimension(ell, records, exact_two)
    claimed = len(rows) - rank
    if bound.dimension > claimed:
        return Saturation(
            ell,
            False,
            reason=f"J(Q)[{ell}] may have dimension {bound.dimension}, the torsion given has {claimed}",
        )
    echelon = _Echelon(ell)
    used: set[int] = set(bound.primes)
    for record, image in zip(records, images, strict=True):
        if len(echelon.rows) == len(rows):
            break
        if record.usable and record.points:
            if sum(echelon.add(column) for column in _columns(record, image, ell, rows)):
                used.add(record.prime)
    if len(echelon.rows) == len(rows):
        return Saturation(ell, True, tuple(sorted(used)))
    vector = echelon.kernel_vector(len(rows)) or []
    combination = [0] * (rank + len(torsion))
    for i, value in zip(rows, vector, strict=True):
        combination[i] = value if value <= ell // 2 else value - ell
    return Saturation(
        ell,
        False,
        reason=f"an element of the group looks divisible by {ell} at every prime tried",
        combination=tuple(combination),
    )
