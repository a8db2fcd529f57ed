"""Local data, generators in use and hypotheses of one problem, growing with the auxiliary primes."""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterable, Sequence
from concurrent.futures import Executor
from dataclasses import replace
from math import gcd, lcm

from sieve.curves.branch import branch_factors
from sieve.curves.divisors import Divisor, Point
from sieve.engine.coordinates import (
    PointCoordinates,
    basis_of_classes,
    generator_relations,
    point_coordinates,
)
from sieve.engine.hypotheses import Saturation, saturation, torsion_dimension, torsion_order_bound
from sieve.engine.problem import Problem
from sieve.engine.relation import Relation, relation_from_condition
from sieve.errors import Inconsistent
from sieve.exact.primes import prime_factors, primes_below
from sieve.local.condition import Condition
from sieve.local.records import LocalRecord, local_records

LARGEST_ELL = 2000
"""Primes l above this are not used in conditions: no two groups are likely to share them."""

FIRST_BOUND = 150
"""Auxiliary primes below this are looked at in any case, to establish coordinates and saturation."""

Functional = tuple[int, list[int]]
Progress = Callable[[str, int], None]


class Investigation:
    """Everything the engine knows of a problem so far.

    Use: `gather(primes)` adds auxiliary primes; `establish()` fixes the generators in use and checks the
    data, once; then `generators`, `orders`, `coordinates`, `saturation_at`, `relations` answer.  With
    `expressible` only primes are used whose data a proof log can express.  All
    methods raise `Inconsistent` when the data contradict each other, naming the witness.
    """

    def __init__(
        self,
        problem: Problem,
        executor: Executor | None = None,
        progress: Progress | None = None,
        expressible: bool = False,
    ) -> None:
        self.problem = problem
        self.expressible = expressible
        self.executor = executor
        self.progress = progress
        self.records: dict[int, LocalRecord] = {}
        self.differences = [problem.curve.difference(point, problem.base) for point in problem.known_points]
        explicit = [] if problem.from_known_points else list(problem.generators)
        self.asked: list[Divisor] = [*explicit, *[d for _, d in problem.torsion], *self.differences]
        self._explicit = len(explicit)
        self.rows: list[list[int]] = []
        self.orders: tuple[int, ...] = ()
        self.coordinates: dict[Point, PointCoordinates] = {}
        #: conditions modulo q^2 (see `sieve.local.deep`) by q, for the generators in use
        self.deep: dict[int, Condition] = {}
        self._saturation: dict[int, tuple[int, Saturation]] = {}
        self.branch = branch_factors(problem.curve.square_form)
        #: dim J(Q)[2], where factors that are proved irreducible tell it
        self.exact_two = problem.curve.two_torsion_dimension() if self.branch else None

    # ---- local data ---------------------------------------------------------------------------------

    def add(self, record: LocalRecord) -> None:
        """Add a record that was computed for the divisors `asked`."""
        self.records[record.prime] = record
        self._saturation.clear()

    def gather(self, primes: Iterable[int], save: Callable[[LocalRecord], None] | None = None) -> None:
        """Add the records of the given primes not known yet, by prime; `save` sees each new one."""
        missing = sorted(v for v in set(primes) if v not in self.records)
        if not missing:
            return
        # starting worker processes costs more than a few small primes
        executor = self.executor if len(missing) > 12 and missing[-1] > 100 else None
        progress = self.progress
        report = None if progress is None else (lambda v: progress("local data", v))
        problem = self.problem
        for record in local_records(
            problem.curve, problem.base, self.asked, missing, executor, report, problem.integral
        ):
            self.add(record)
            if save is not None:
                save(record)

    @property
    def sought(self) -> dict[Point, PointCoordinates]:
        """The coordinates of the known points in question (see `Problem.asks_for`)."""
        return {p: c for p, c in self.coordinates.items() if self.problem.asks_for(p)}

    @property
    def usable(self) -> list[LocalRecord]:
        """The records that give conditions, by prime."""
        return [self.records[v] for v in sorted(self.records) if self.serves(self.records[v])]

    def serves(self, record: LocalRecord) -> bool:
        """Whether the record gives a condition here."""
        return record.usable and (record.expressible or not self.expressible)

    @property
    def skipped(self) -> list[LocalRecord]:
        """The primes that were not used, with their reasons."""
        out = []
        for v in sorted(self.records):
            record = self.records[v]
            if not record.usable:
                out.append(record)
            elif not self.serves(record):
                out.append(replace(record, skipped="no sections with rational zeros present the group"))
        return out

    def images(self, record: LocalRecord) -> tuple[tuple[int, ...], ...]:
        """The images of the generators of L (free, then torsion) in J(F_v)."""
        out = []
        for row in self.rows:
            total = [0] * len(record.invariants)
            for a, image in zip(row, record.images, strict=True):
                if a:
                    total = [t + a * c for t, c in zip(total, image, strict=True)]
            out.append(tuple(t % d for t, d in zip(total, record.invariants, strict=True)))
        return tuple(out)

    # ---- generators ---------------------------------------------------------------------------------

    @property
    def size(self) -> int:
        """The number n = r + s of generators of L."""
        return len(self.rows)

    @property
    def generators(self) -> list[Divisor]:
        """The divisors in use: r free generators, then the torsion generators."""
        out = []
        for row in self.rows:
            total = Divisor(())
            for a, divisor in zip(row, self.asked, strict=True):
                if a:
                    total = total + a * divisor
            out.append(total)
        return out

    def _functionals(self, rows: Sequence[Sequence[int]] | None) -> list[Functional]:
        """The maps to cyclic groups: on the asked divisors (None) or on combinations of them."""
        out: list[Functional] = []
        for record in self.usable:
            for j, d in enumerate(record.invariants):
                values = [image[j] for image in record.images]
                if rows is not None:
                    values = [sum(a * b for a, b in zip(row, values, strict=True)) % d for row in rows]
                out.append((d, values))
        return out

    def establish(self, gather: Callable[[list[int]], object] | None = None) -> None:
        """Fix the generators in use, check relations and orders, compute the coordinates of the known points.

        `gather` replaces the method of that name (a store may stand behind it).  Raises `Inconsistent`:
        dependent generators, wrong torsion orders, a rank that does not match the known points, a known
        point that is no combination of the generators.
        """
        problem = self.problem
        gather = gather or self.gather
        gather(primes_below(FIRST_BOUND))
        bound = FIRST_BOUND
        while len([r for r in self.usable if r.points]) < 12 and bound < 2000:
            bound *= 2
            gather(primes_below(bound))
        total = len(self.asked)
        unit = [[int(i == j) for j in range(total)] for i in range(total)]
        if problem.from_known_points:
            self._basis_from_points(unit)
        else:
            self.rows = unit[: self._explicit + len(problem.torsion)]
            self.orders = tuple(order for order, _ in problem.torsion)
            generator_relations(problem.rank, self.orders, self._functionals(self.rows))
        for k, point in enumerate(problem.known_points):
            row = unit[self._explicit + len(problem.torsion) + k]
            found = point_coordinates(problem.rank, self.orders, self._functionals([*self.rows, row]))
            shown = problem.curve.format_point(point)
            if found is None:
                raise Inconsistent(
                    f"known point {shown}: no combination of small height of the generators",
                    shown,
                    "generators of a group of finite index, the rank and the base that belong to them",
                )
            # what is left of P - B after an integer combination of free generators would be torsion
            if found.denominator > 1 and all(a % found.denominator == 0 for a in found.free):
                what = f"the known point {shown} gives a torsion class outside the group that is claimed"
                raise Inconsistent(f"torsion: {what}", shown, "generators of all torsion of J(Q)")
            self.coordinates[point] = found

    def _basis_from_points(self, unit: list[list[int]]) -> None:
        problem = self.problem
        count = len(problem.torsion) + len(self.differences)
        basis = basis_of_classes(count, self._functionals(None))
        if len(basis.free) != problem.rank:
            raise Inconsistent(
                f"known_points: their differences generate a group of rank {len(basis.free)}",
                "known_points",
                f"the claimed rank {problem.rank}",
            )
        for j, (order, _) in enumerate(problem.torsion):
            free, torsion = basis.coordinates[j]
            name = f"torsion generator no. {j + 1}"
            found = lcm(1, *[t // gcd(t, c) for t, c in zip(basis.orders, torsion, strict=True)])
            if any(free) or found != order:
                what = "of infinite order" if any(free) else f"of order {found}"
                raise Inconsistent(f"{name}: {what}", name, f"the claimed order {order}")
        self.rows = [list(row) for row in (*basis.free, *basis.torsion)]
        self.orders = basis.orders

    # ---- hypotheses ---------------------------------------------------------------------------------

    def saturation_at(self, ell: int) -> Saturation:
        """Whether L is proved saturated at l with the primes gathered so far."""
        known = self._saturation.get(ell)
        if known is not None:
            return known[1]
        denominators = [p for p, c in self.coordinates.items() if c.denominator % ell == 0]
        records = self.usable
        if denominators:
            shown = self.problem.curve.format_point(denominators[0])
            found = Saturation(
                ell,
                False,
                reason=f"{ell} divides the index: the coefficients of {shown} have this denominator",
            )
        else:
            found = saturation(
                ell,
                self.problem.rank,
                self.orders,
                records,
                [self.images(r) for r in records],
                self.exact_two,
            )
        self._saturation[ell] = (len(records), found)
        return found

    def relevant_ells(self, extra: Iterable[int] = ()) -> list[int]:
        """The primes l that divide the order of at least two groups (or `extra`), up to `LARGEST_ELL`."""
        seen: dict[int, int] = {}
        for record in self.usable:
            for ell in prime_factors(record.invariants[-1]) if record.invariants else []:
                seen[ell] = seen.get(ell, 0) + 1
        return sorted({ell for ell, k in seen.items() if k >= 2 and ell <= LARGEST_ELL} | set(extra))

    def allowed_ells(self, extra: Iterable[int] = ()) -> list[int]:
        """The primes l whose parts may be used: proved saturated, or stated by the user."""
        return [
            ell
            for ell in self.relevant_ells(extra)
            if ell in self.problem.index_prime_to or self.saturation_at(ell).proved
        ]

    def torsion_proved(self) -> bool:
        """Whether the torsion of J(Q) is proved to be what the generators say, at every prime."""
        order = 1
        for t in self.orders:
            order *= t
        candidates = set(prime_factors(order)) if order > 1 else set()
        bound = 0
        for record in self.usable:
            if record.points and record.prime != 2:
                bound = gcd(bound, record.order)
        candidates |= set(prime_factors(bound)) if bound > 1 else set()
        if bound == 0:
            return False
        for ell in candidates:
            claimed = sum(1 for t in self.orders if t % ell == 0)
            if torsion_dimension(ell, self.usable, self.exact_two).dimension == claimed == 0:
                continue
            exponent = 0
            rest = order
            while rest % ell == 0:
                rest //= ell
                exponent += 1
            if torsion_order_bound(ell, self.usable) == exponent:
                continue
            if not self.saturation_at(ell).proved:
                return False
        return True

    def relations(
        self, ells: Sequence[int], bound: int | None = None, primes: Collection[int] | None = None
    ) -> list[Relation]:
        """The relations of the usable primes (below `bound`, among `primes`), restricted to these l-parts."""
        out = []
        for record in self.usable:
            if (bound is None or record.prime < bound) and (primes is None or record.prime in primes):
                out.append(relation_from_condition(record.condition(self.images(record)), ells))
        out += [relation_from_condition(self.deep[q], ells) for q in sorted(self.deep)]
        return out
