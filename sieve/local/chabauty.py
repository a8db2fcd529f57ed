"""Conditions from the candidates at a Chabauty prime p.

A p-adic point z has a class in J(F_p) and a vector of abelian integrals Log(z - B) in Q_p^g; both together
are the image of iota(z) under a homomorphism defined on J(Q).  Modulo p^n it is a condition like any other,
whose allowed classes carry the labels of the candidates.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from sieve.curves.divisors import Divisor, Point
from sieve.curves.protocol import Curve
from sieve.errors import PrecisionLost
from sieve.exact.padic_number import PadicNumber
from sieve.local.condition import Condition
from sieve.local.logarithms import PadicIntegrals, PadicVector
from sieve.local.picard import PicardGroup, picard_group
from sieve.local.records import divisor_log


@dataclass(frozen=True)
class LocatedCandidate:
    """A candidate in terms of the curve.

    Fields: `kind` ("point", "disc", "coefficients"); `disc`, the number of its residue disc (None when
    unknown); `parameter` modulo p^`digits`, the local parameter in the disc (kind "point"; for a whole disc
    the digits are 1 and the parameter is 0); `coordinates` as p-adic numbers in the model (kind "point");
    `coefficients` and `torsion` (kind "coefficients"; torsion empty when not given); `multiplicity`;
    `at_most`.
    """

    id: str
    kind: str
    disc: int | None
    parameter: int = 0
    digits: int = 1
    coordinates: tuple[PadicNumber, PadicNumber, PadicNumber] | None = None
    coefficients: tuple[PadicNumber, ...] = ()
    torsion: tuple[int, ...] = ()
    multiplicity: int = 1
    at_most: int | None = None


def useful_digits(p: int) -> int:
    """The largest n with p^n < 2^30: no finer p-part is ever used."""
    n, q = 0, p
    while q < 2**30:
        n, q = n + 1, q * p
    return max(n, 1)


class ChabautyPlace:
    """The homomorphism L -> J(F_p) x Q_p^g at a prime p of good reduction.

    Arguments: `digits` wanted in the integrals (relative to the candidates); `base`, `generators` as
    divisors.  Raises `Uncertified` (the group J(F_p)), `BadReduction` (a divisor does not reduce),
    `PrecisionLost`.
    """

    def __init__(self, curve: Curve, p: int, digits: int) -> None:
        self.curve = curve
        self.prime = p
        self.group: PicardGroup = picard_group(curve.modulo(p))
        self.integrals = PadicIntegrals(curve, p, min(digits, useful_digits(p)), self.group)

        #: whether the class in J(F_p) is part of the conditions
        self.reduction = True

    def attach(self, base: Divisor, generators: Sequence[Divisor]) -> None:
        """Compute the images of the generators and of the base divisor."""
        self.degree = base.degree
        self.base_class = divisor_log(self.group, base)
        self.base_log = self.integrals.log_divisor(base)
        self.classes = [divisor_log(self.group, d) for d in generators]
        self.logs = [self.integrals.log_divisor(d) for d in generators]

    def at_infinity(self, disc: int) -> bool:
        """Whether a residue disc, by number, lies at infinity: none of its points is integral."""
        return disc >= self.group.curve.affine_count

    # ---- coordinates of points ------------------------------------------------------------------------

    def class_of_disc(self, disc: int) -> tuple[int, ...]:
        """The class of deg(B) P - B in J(F_p) for P in the disc."""
        invariants = self.group.invariants
        return tuple(
            (self.degree * int(a) - b) % d
            for a, b, d in zip(self.group.point_logs[disc], self.base_class, invariants, strict=True)
        )

    def coefficients_of_point(self, point: Point, rank: int) -> list[PadicNumber] | None:
        """The coefficients c with iota(P) = sum c_i D_i in J(Q_p) up to torsion, for r <= g independent logs.

        `rank`: r, the number of free generators; the logarithms of torsion generators are zero.  Returns None
        where the logs of the free generators are dependent to the known precision or r > g.
        """
        target = self.degree * self.integrals.log_point(point) - self.base_log
        return _solve(self.prime, [log.numbers for log in self.logs[:rank]], target.numbers)

    # ---- conditions -----------------------------------------------------------------------------------

    def conditions(
        self, candidates: Sequence[LocatedCandidate], rank: int, orders: Sequence[int], complete: bool
    ) -> list[Condition]:
        """One labelled condition for each kind of group that the candidates live in (same number of digits).

        `complete`: the list claims to be; it is passed on only when all candidates fit in one condition.
        """
        batches: dict[tuple[object, ...], list[LocatedCandidate]] = {}
        for candidate in candidates:
            if candidate.kind == "coefficients":
                key: tuple[object, ...] = (
                    "c",
                    tuple(min(c.precision, useful_digits(self.prime)) for c in candidate.coefficients),
                    bool(candidate.torsion),
                    candidate.disc is not None,
                )
            else:
                key = ("p", min(candidate.digits, useful_digits(self.prime)))
            batches.setdefault(key, []).append(candidate)
        out = []
        for number, key in enumerate(sorted(batches, key=repr), start=1):
            name = f"p = {self.prime}" if len(batches) == 1 else f"p = {self.prime}, part {number}"
            whole = complete and len(batches) == 1
            if key[0] == "c":
                out.append(self._from_coefficients(name, batches[key], rank, orders, whole))
            else:
                out.append(self._from_logs(name, batches[key], whole))
        return out

    def _from_logs(self, name: str, candidates: Sequence[LocatedCandidate], complete: bool) -> Condition:
        p, g = self.prime, self.curve.genus
        digits = min(min(c.digits for c in candidates), useful_digits(p))
        known = min([log.precision for log in self.logs] + [self.base_log.precision, digits])
        vectors = []
        for c in candidates:
            log = self.integrals.log_parameter(int(c.disc or 0), c.parameter, c.digits)
            known = min(known, log.precision)
            vectors.append(self.degree * log - self.base_log)
        if known < min(digits, 1):
            raise PrecisionLost(p, known, 1, "abelian integrals")
        # multiply by p^shift: every value becomes an integer modulo p^(known + shift)
        shift = max([0] + [v.shift for v in self.logs] + [v.shift for v in vectors])
        exponent = known + shift
        while exponent > useful_digits(p):
            exponent -= 1
        q = p**exponent if exponent > 0 else 1
        images, rows = [], []
        for reduced, log in zip(self.classes, self.logs, strict=True):
            head = tuple(reduced) if self.reduction else ()
            images.append(head + (_scaled(log, shift, q) if q > 1 else ()))
        for c, vector in zip(candidates, vectors, strict=True):
            head = self.class_of_disc(int(c.disc or 0)) if self.reduction else ()
            rows.append(head + (_scaled(vector, shift, q) if q > 1 else ()))
        moduli = (self.group.invariants if self.reduction else ()) + ((q,) * g if q > 1 else ())
        return _labelled(name, p, moduli, images, rows, [c.id for c in candidates], complete)

    def _from_coefficients(
        self,
        name: str,
        candidates: Sequence[LocatedCandidate],
        rank: int,
        orders: Sequence[int],
        complete: bool,
    ) -> Condition:
        p = self.prime
        first = candidates[0]
        exponents = [min(c.precision, useful_digits(p)) for c in first.coefficients]
        moduli = [p**e for e in exponents]
        free = [i for i, m in enumerate(moduli) if m > 1]
        torsion = list(range(len(orders))) if first.torsion else []
        disc = first.disc is not None and self.reduction
        images = []
        for i in range(rank + len(orders)):
            row = [int(i == j) % moduli[j] for j in free] + [int(i == rank + j) % orders[j] for j in torsion]
            images.append(tuple(row) + (tuple(self.classes[i]) if disc else ()))
        rows = []
        for c in candidates:
            row = [c.coefficients[j].residue(exponents[j]) for j in free]
            row += [c.torsion[j] % orders[j] for j in torsion]
            rows.append(tuple(row) + (self.class_of_disc(int(c.disc or 0)) if disc else ()))
        sizes = tuple(moduli[j] for j in free) + tuple(orders[j] for j in torsion)
        sizes += self.group.invariants if disc else ()
        return _labelled(name, p, sizes, images, rows, [c.id for c in candidates], complete)


def _scaled(vector: PadicVector, shift: int, modulus: int) -> tuple[int, ...]:
    """p^shift times the vector, modulo a power of p; shift >= vector.shift."""
    factor = vector.prime ** (shift - vector.shift)
    return tuple(a * factor % modulus for a in vector.numerators)


def _labelled(
    name: str,
    p: int,
    moduli: tuple[int, ...],
    images: Sequence[tuple[int, ...]],
    rows: Sequence[tuple[int, ...]],
    ids: Sequence[str],
    complete: bool,
) -> Condition:
    labels: dict[tuple[int, ...], list[str]] = {}
    for row, name_of in zip(rows, ids, strict=True):
        labels.setdefault(row, []).append(name_of)
    ordered = sorted(labels)
    allowed = np.array(ordered, dtype=np.int64).reshape(len(ordered), len(moduli))
    return Condition(
        name, p, moduli, tuple(images), allowed, tuple(tuple(sorted(labels[r])) for r in ordered), complete
    )


def _solve(
    p: int, columns: Sequence[Sequence[PadicNumber]], target: Sequence[PadicNumber]
) -> list[PadicNumber] | None:
    """Solve sum x_i columns[i] = target over Q_p, pivots of least valuation; None if not unique."""
    count, height = len(columns), len(target)
    rows = [[columns[i][k] for i in range(count)] + [target[k]] for k in range(height)]
    pivots: list[int] = []
    for step in range(count):
        found = [
            (rows[k][j].valuation, k, j)
            for k in range(step, height)
            for j in range(count)
            if j not in pivots and not rows[k][j].is_zero
        ]
        if not found:
            return None
        _, k, j = min(found)
        rows[step], rows[k] = rows[k], rows[step]
        inverse = rows[step][j].inverse()
        rows[step] = [a * inverse for a in rows[step]]
        for other in range(height):
            if other != step and not rows[other][j].is_zero:
                factor = rows[other][j]
                rows[other] = [
                    PadicNumber.zero(p, (a - factor * b).precision) if i == j else a - factor * b
                    for i, (a, b) in enumerate(zip(rows[other], rows[step], strict=True))
                ]
        pivots.append(j)
    if any(not rows[k][count].is_zero for k in range(count, height)):
        return None
    return [rows[pivots.index(j)][count] for j in range(count)]
