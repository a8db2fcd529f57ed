"""Local data at one auxiliary prime: the group, the images of divisors, the classes of all points.

A record is plain data (integers, tuples, one array), so that worker processes and stores can pass it on.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import Executor
from dataclasses import dataclass
from functools import partial

import numpy as np
from numpy.typing import NDArray

from sieve.curves.divisors import ClosedPlace, Divisor, MumfordPlace
from sieve.curves.protocol import Curve
from sieve.errors import BadReduction, SieveError, Uncertified
from sieve.local.condition import Condition
from sieve.local.picard import PicardGroup, picard_group
from sieve.local.rational_sections import present, section_through


@dataclass(frozen=True, eq=False)
class LocalRecord:
    """What is known at the good prime `prime`, or why nothing is.

    Fields: `points`, #X(F_v) (-1 when not counted); `order`, `invariants` of J(F_v); `images`, one row for
    every divisor of degree 0 that was asked for, in the product of Z/invariants[i]; `allowed`, int64 (object
    for large groups), shape (count, len(invariants)), the classes of P - B for P in X(F_v), distinct and
    sorted; `reason`, how completeness was proved; `skipped`, when not empty, says why the prime is not used,
    and then the other fields are empty; `expressible`, whether sections with rational zeros prove all this,
    as proof logs need.
    """

    prime: int
    points: int
    order: int
    invariants: tuple[int, ...]
    images: tuple[tuple[int, ...], ...]
    allowed: NDArray[np.int64]
    reason: str
    skipped: str = ""
    expressible: bool = True

    @property
    def usable(self) -> bool:
        """Whether the prime gives a condition."""
        return not self.skipped

    def condition(self, images: Sequence[Sequence[int]] | None = None) -> Condition:
        """The condition at v; `images` (of the generators of L) defaults to the images in the record."""
        rows = self.images if images is None else tuple(tuple(row) for row in images)
        return Condition(f"v = {self.prime}", self.prime, self.invariants, rows, self.allowed)


def class_bytes(record: LocalRecord) -> bytes:
    """The allowed classes as little-endian signed integers of one size, 8 bytes or as many as are needed."""
    size = _entry_size(record.invariants)
    if size == 8:
        return np.ascontiguousarray(record.allowed.astype(np.int64), dtype="<i8").tobytes()
    return b"".join(int(c).to_bytes(size, "little", signed=True) for row in record.allowed for c in row)


def classes_from_bytes(data: bytes, count: int, invariants: Sequence[int]) -> NDArray[np.int64]:
    """The array that `class_bytes` wrote down."""
    shape, size = (count, len(invariants)), _entry_size(invariants)
    if size == 8:
        return np.frombuffer(data, dtype="<i8").astype(np.int64).reshape(shape)
    entries = [int.from_bytes(data[k : k + size], "little", signed=True) for k in range(0, len(data), size)]
    return np.array(entries, dtype=object).reshape(shape)


def _entry_size(invariants: Sequence[int]) -> int:
    return 8 * (1 + (invariants[-1].bit_length() // 64 if invariants else 0))


def _skip(v: int, reason: str, points: int = -1) -> LocalRecord:
    return LocalRecord(v, points, 0, (), (), np.zeros((0, 0), dtype=np.int64), "", reason)


def divisor_log(group: PicardGroup, divisor: Divisor) -> tuple[int, ...]:
    """The class of D - deg(D) P0 in J(F_v) for a divisor over Q.

    Raises `BadReduction` when it does not reduce, `Uncertified` when a closed point cannot be expressed.
    """
    total = [0] * len(group.invariants)
    for multiplicity, place in divisor.terms:
        group.add(total, multiplicity, group.log(group.curve.reduce(place)))
    return tuple(total)


def expressible(group: PicardGroup, base: Divisor, divisors: Sequence[Divisor]) -> bool:
    """Whether the group and the classes of the divisors can be shown by sections with rational zeros."""
    places = dict.fromkeys(place for d in (base, *divisors) for _, place in d.terms)
    closed = [place for place in places if isinstance(place, MumfordPlace | ClosedPlace)]
    if not all(section_through(group.curve, place) for place in closed):
        return False
    return group.distinct_points or present(group) is not None


def local_record(
    curve: Curve, base: Divisor, divisors: Sequence[Divisor], v: int, integral: bool = False
) -> LocalRecord:
    """The record at the prime v.

    Arguments: `base` of degree 1 or 2, `divisors` of degree 0, v a prime below 2^20.  Never raises for a
    prime that cannot be used: the record says why.  A prime without points gives a record with no allowed
    class.
    The allowed classes are those of deg(B) P - B, P in X(F_v); with `integral` only affine P count, to which
    every integral point of the affine model reduces.
    """
    try:
        reduced = curve.modulo(v)
        if reduced.count == 0:
            nothing = np.zeros((0, 0), dtype=np.int64)
            return LocalRecord(v, 0, 1, (), ((),) * len(divisors), nothing, "X has no point modulo v")
        group = picard_group(reduced)
        shown = expressible(group, base, divisors)
        images = tuple(divisor_log(group, divisor) for divisor in divisors)
        origin = np.array(divisor_log(group, base), dtype=group.point_logs.dtype)
    except (BadReduction, Uncertified) as error:
        return _skip(v, error.reason)
    kind = group.point_logs.dtype
    moduli = np.array(group.invariants, dtype=kind)
    # affine points come first
    logs = group.point_logs[: reduced.affine_count] if integral else group.point_logs
    shifted = (base.degree * logs - origin) % moduli
    if not len(moduli):
        allowed = np.zeros((min(1, len(logs)), 0), dtype=np.int64)
    elif kind == np.int64:
        allowed = np.unique(shifted, axis=0)
    else:
        rows = sorted({tuple(int(c) for c in row) for row in shifted})
        allowed = np.array(rows, dtype=object).reshape(len(rows), len(moduli))
    return LocalRecord(
        v, reduced.count, group.order, group.invariants, images, allowed, group.reason, expressible=shown
    )


def _guarded(
    curve: Curve, base: Divisor, divisors: Sequence[Divisor], integral: bool, v: int
) -> LocalRecord:
    try:
        return local_record(curve, base, divisors, v, integral)
    except SieveError:
        raise
    except Exception as error:  # name the prime: the traceback of a worker would not
        raise RuntimeError(f"local data at v = {v}: {type(error).__name__}: {error}") from error


def local_records(
    curve: Curve,
    base: Divisor,
    divisors: Sequence[Divisor],
    primes: Sequence[int],
    executor: Executor | None = None,
    progress: Callable[[int], None] | None = None,
    integral: bool = False,
) -> Iterator[LocalRecord]:
    """Records for the given primes, in their order, through any executor (None: in this process)."""
    work = partial(_guarded, curve, base, tuple(divisors), integral)
    results = map(work, primes) if executor is None else executor.map(work, primes, chunksize=4)
    for record in results:
        if progress is not None:
            progress(record.prime)
        yield record
