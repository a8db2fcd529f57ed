"""Random curves with rational points planted on them, and what the engine must never say about these points.

Points first: for q, h of degree <= g + 1 and r of degree 2 g + 2 - k the curve y^2 + h y = q^2 + h q + l_1 ..
l_k r, l_i = b_i x - a_i, passes through (a_i / b_i, q(a_i / b_i)) and the conjugates, and through two points
at infinity when r has a smaller degree.
"""

from __future__ import annotations

import random
from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from fractions import Fraction
from math import gcd

from flint import fmpz_poly

from sieve.curves.divisors import Divisor, Point
from sieve.curves.hyperelliptic import HyperellipticCurve, SingularCurve
from sieve.curves.protocol import Curve
from sieve.curves.search import points_over
from sieve.engine.coordinates import PointCoordinates, basis_of_classes
from sieve.engine.investigation import Investigation
from sieve.engine.problem import Problem
from sieve.engine.verdicts import CandidateList, decide_candidates, match_rational
from sieve.errors import BadReduction, Inconsistent, PrecisionLost, Uncertified
from sieve.exact.padic_linear import combine
from sieve.exact.padic_number import PadicNumber
from sieve.exact.primes import primes_below
from sieve.local.chabauty import ChabautyPlace, LocatedCandidate

BOUND = 70
"""Auxiliary primes of these tests are below this."""

PADIC_PRIMES = (2, 3, 5, 7)


def random_polynomial(rng: random.Random, degree: int, size: int) -> fmpz_poly:
    return fmpz_poly([rng.randint(-size, size) for _ in range(degree + 1)])


def planted_curve(rng: random.Random, genus: int) -> tuple[HyperellipticCurve, tuple[Point, ...]]:
    """A smooth curve of the genus with at least two planted rational points."""
    while True:
        odd = rng.random() < 0.4
        places: list[tuple[int, int]] = []
        while len(places) < rng.choice([2, 3, 3, 4]):
            b = rng.choice([1, 1, 1, 1, 2, 3])
            a = rng.randint(-4, 4)
            if gcd(a, b) == 1 and (a, b) not in places:
                places.append((a, b))
        product = fmpz_poly([1])
        for a, b in places:
            product *= fmpz_poly([-a, b])
        top = genus if odd else genus + 1
        h = random_polynomial(rng, top, 1) if rng.random() < 0.5 else fmpz_poly([])
        q = random_polynomial(rng, top, 2)
        if rng.random() < 0.3:
            # Weierstrass points among the planted ones: y = 0 there, h = 0
            factor = fmpz_poly([-places[0][0], places[0][1]])
            if rng.random() < 0.6:
                factor *= fmpz_poly([-places[1][0], places[1][1]])
            q, h = factor * random_polynomial(rng, top - factor.degree(), 2), fmpz_poly([])
        if odd:
            room = 2 * genus + 1 - len(places)
        else:
            room = 2 * genus + 2 - len(places) - rng.choice([0, 1, 1, 2])
        r = random_polynomial(rng, room, 2)
        f = q * q + h * q + product * r
        try:
            curve = HyperellipticCurve([int(c) for c in f.coeffs()], [int(c) for c in h.coeffs()])
        except (SingularCurve, ValueError):
            continue
        if curve.genus != genus or max(map(abs, curve.f)) > 5000:
            continue
        points: list[Point] = points_over(curve, None)
        for a, b in places:
            points += points_over(curve, Fraction(a, b))
        return curve, tuple(sorted(set(points)))


@dataclass
class Planted:
    """A planted curve with an investigation whose group contains all its planted points.

    `group` was made from the known points; `coordinates` of every planted point in its generators.
    """

    curve: HyperellipticCurve
    points: tuple[Point, ...]
    base: Divisor
    group: Investigation

    @property
    def rank(self) -> int:
        return self.group.problem.rank

    @property
    def coordinates(self) -> dict[Point, PointCoordinates]:
        return self.group.coordinates

    def with_group(
        self, rows: Sequence[Sequence[int]], rank: int, orders: Sequence[int], known: Sequence[Point] = ()
    ) -> Investigation:
        """The same curve with other generators, integer combinations of those in use; records are reused.

        The first `rank` rows are free generators, the others torsion generators of the claimed orders.
        """
        divisors = []
        for row in rows:
            total = Divisor(())
            for a, divisor in zip(row, self.group.generators, strict=True):
                if a:
                    total = total + a * divisor
            divisors.append(total)
        torsion = tuple(zip(orders, divisors[rank:], strict=True))
        problem = Problem(
            "planted", self.curve, self.base, tuple(divisors[:rank]), torsion, tuple(known), rank, "a premise"
        )
        other = Investigation(problem)
        for record in self.group.records.values():
            if not record.usable:
                other.add(record)
                continue
            images = []
            for row in rows:
                total_image = [0] * len(record.invariants)
                for a, image in zip(row, self.group.images(record), strict=True):
                    total_image = [
                        (t + a * c) % d for t, c, d in zip(total_image, image, record.invariants, strict=True)
                    ]
                images.append(tuple(total_image))
            for point in known:
                images.append(record.images[self.points.index(point)])
            other.add(replace(record, images=tuple(images)))
        other.establish(lambda primes: None)
        return other


def group_of_points(curve: Curve, points: tuple[Point, ...], base: Divisor) -> Investigation:
    """The group that the differences of the points generate, of whatever rank it is."""
    first = Investigation(
        Problem("planted", curve, base, (), (), points, 0, "a premise", from_known_points=True)
    )
    first.gather(primes_below(BOUND))
    rank = len(basis_of_classes(len(points), first._functionals(None)).free)
    group = Investigation(replace(first.problem, rank=rank))
    for record in first.records.values():
        group.add(record)
    group.establish(lambda primes: None)
    return group


def plant(rng: random.Random, genus: int) -> Planted:
    """A random curve, a base among its planted points or a divisor, the group of the differences."""
    curve, points = planted_curve(rng, genus)
    place = curve.place_of_point
    base = Divisor.of([(1, place(rng.choice(points)))])
    if rng.random() < 0.2:
        # a divisor of degree 1 that is no rational point
        base = Divisor.of(
            [(1, place(rng.choice(points))), (1, place(rng.choice(points))), (1, place(rng.choice(points)))]
        )
        base = base - Divisor.of([(1, curve.double_cover_place())])
    elif rng.random() < 0.15:
        # a fibre, of degree 2
        base = Divisor.of([(1, curve.double_cover_place())])
    return Planted(curve, points, base, group_of_points(curve, points, base))


# ---- candidates ---------------------------------------------------------------------------------------


def located(
    rng: random.Random,
    place: ChabautyPlace,
    point: Point,
    kind: str,
    coordinates: PointCoordinates | None,
    name: str,
) -> LocatedCandidate | None:
    """A planted point as a candidate of the given kind, with a random number of digits.

    None for coefficients that are not known or have p in a denominator.
    """
    p = place.prime
    disc = place.integrals.disc_of(point)
    if kind == "disc":
        return LocatedCandidate(name, kind, disc)
    digits = rng.randint(1, 6)
    if kind == "point":
        x, y, z = (PadicNumber.padic(p, c, 0, digits) for c in point)
        number, parameter, known = place.integrals.parameter_of_padic(x, y, z)
        assert number == disc
        return LocatedCandidate(name, kind, disc, parameter, known, (x, y, z))
    if coordinates is None or coordinates.denominator % p == 0:
        return None
    inverse = pow(coordinates.denominator, -1, p**digits)
    coefficients = tuple(PadicNumber.padic(p, c * inverse, 0, digits) for c in coordinates.free)
    whole = coordinates.denominator == 1
    return LocatedCandidate(
        name,
        kind,
        disc if rng.random() < 0.5 else None,
        coefficients=coefficients,
        torsion=coordinates.torsion if whole and rng.random() < 0.5 else (),
    )


def spurious(rng: random.Random, place: ChabautyPlace, count: int) -> list[LocatedCandidate]:
    """Random p-adic points."""
    p, discs = place.prime, len(place.group.point_logs)
    return [
        LocatedCandidate(f"random {i}", "point", rng.randrange(discs), p * rng.randrange(p**5), 6)
        for i in range(count)
    ]


@dataclass
class Tally:
    """What happened in a sweep; `wrong` lists what must not happen."""

    counts: Counter[str] = field(default_factory=Counter)
    wrong: list[str] = field(default_factory=list)

    def __str__(self) -> str:
        return ", ".join(f"{k}: {v}" for k, v in sorted(self.counts.items()))


def survive(
    rng: random.Random,
    planted: Planted,
    investigation: Investigation,
    coordinates: Mapping[Point, PointCoordinates],
    tally: Tally,
    family: str = "",
) -> None:
    """Decide planted and random candidates at every smooth p of `PADIC_PRIMES`.

    `coordinates` of planted points in the generators of the investigation, as far as known.
    """
    curve = planted.curve
    for p in PADIC_PRIMES if not family else sorted(rng.sample(PADIC_PRIMES, 2)):
        if not curve.is_smooth(p):
            continue
        try:
            place = ChabautyPlace(curve, p, rng.randint(1, 7))
            place.attach(planted.base, investigation.generators)
        except (BadReduction, Uncertified, PrecisionLost) as error:
            tally.counts[f"{family}no place ({type(error).__name__})"] += 1
            continue
        if not family:
            check_logarithms(planted, place, tally)
        candidates: list[LocatedCandidate] = []
        named: dict[str, Point] = {}
        for number, point in enumerate(rng.sample(planted.points, min(2, len(planted.points)))):
            for kind in ("point", "disc", "coefficients"):
                name = f"{kind} {number}"
                one = located(rng, place, point, kind, coordinates.get(point), name)
                if one is not None:
                    candidates.append(one)
                    named[name] = point
        candidates += spurious(rng, place, 3)
        rng.shuffle(candidates)
        listing = CandidateList(place, candidates, False, "planted", "planted")
        ells = investigation.allowed_ells([p])
        # without rational labels the sieve itself must keep the planted points
        told = rng.random() < 0.3
        matched = match_rational(investigation, [listing]) if told else {}
        for (_, name), decision in decide_candidates(investigation, [listing], matched, ells, BOUND).items():
            tally.counts[f"{family}{name.split()[0]} {decision.verdict}"] += 1
            if name not in named:
                continue
            known = named[name] in investigation.problem.known_points
            if decision.verdict == "eliminated":
                tally.wrong.append(f"{curve}, p = {p}: {named[name]} eliminated as {name}: {decision.reason}")
            elif told and known and named[name] not in decision.points:
                tally.wrong.append(f"{curve}, p = {p}: {named[name]} not recognised as {name}")


def check_logarithms(planted: Planted, place: ChabautyPlace, tally: Tally) -> None:
    """Log(d P - B) = sum a_i Log(D_i), d = deg B, and the same in J(F_p), for all planted points."""
    for point, coordinates in planted.coordinates.items():
        left = place.degree * place.integrals.log_point(point) - place.base_log
        terms = [(Fraction(a), log) for a, log in zip(coordinates.vector, place.logs, strict=True)]
        total = [0] * len(place.group.invariants)
        for a, image in zip(coordinates.vector, place.classes, strict=True):
            place.group.add(total, a, image)
        same_log = left.agrees(combine(terms)) if terms else not any(left.numerators)
        if not same_log or tuple(total) != place.class_of_disc(place.integrals.disc_of(point)):
            tally.wrong.append(f"{planted.curve}, p = {place.prime}: wrong logarithm of {point}")
        tally.counts["logarithms"] += 1


# ---- the second family: groups that are too small, torsion claims that are wrong ------------------------


def spoil(rng: random.Random, planted: Planted, tally: Tally) -> None:
    """Feed a wrong group on purpose: it must be refused, or the planted points must survive all the same."""
    group = planted.group
    rank, orders = planted.rank, list(group.orders)
    n = rank + len(orders)
    unit = [[int(i == j) for j in range(n)] for i in range(n)]
    kinds = ["multiple", "sublattice"] if rank else []
    if rank:
        kinds += ["infinite torsion", "dependent"]
    if orders:
        kinds += ["torsion dropped", "torsion order", "torsion order"]
    if not kinds:
        # the trivial group has no wrong subgroup
        return
    kind = rng.choice(kinds)
    rows, claimed_rank, claimed = unit, rank, orders
    if kind == "multiple":
        i, k = rng.randrange(rank), rng.choice([2, 3, 5])
        rows = [[k * a for a in row] if j == i else row for j, row in enumerate(unit)]
    elif kind == "sublattice":
        matrix = [[rng.randint(-2, 2) + 3 * (i == j) for j in range(rank)] for i in range(rank)]
        rows = [row + [0] * len(orders) for row in matrix] + unit[rank:]
    elif kind == "infinite torsion":
        rows, claimed_rank = unit[1:rank] + unit[:1] + unit[rank:], rank - 1
        claimed = [rng.randint(2, 12), *orders]
    elif kind == "dependent":
        rows = [[2 * a + b for a, b in zip(unit[0], unit[-1], strict=True)], *unit]
        claimed_rank = rank + 1
    elif kind == "torsion dropped":
        rows, claimed = unit[:rank], []
    else:
        i = rng.randrange(len(orders))
        t = rng.choice(
            [orders[i] * rng.choice([2, 3]), *[d for d in range(2, orders[i]) if orders[i] % d == 0]]
        )
        claimed = [t if j == i else order for j, order in enumerate(orders)]
    known = planted.points if rng.random() < 0.4 else ()
    try:
        other = planted.with_group(rows, claimed_rank, claimed, known)
    except Inconsistent:
        tally.counts[f"{kind}: refused"] += 1
        return
    tally.counts[f"{kind}: accepted"] += 1
    if kind in ("infinite torsion", "dependent", "torsion order"):
        tally.wrong.append(f"{planted.curve}: the false claim of kind {kind} was accepted")
    survive(rng, planted, other, other.coordinates, tally, f"{kind}, ")


def sweep(seed: str, count: int) -> Tally:
    """`count` random curves, a third of them of genus 3, each with the right group and with a wrong one."""
    tally = Tally()
    for i in range(count):
        rng = random.Random(f"{seed} {i}")
        genus = 3 if i % 3 == 2 else 2
        try:
            planted = plant(rng, genus)
        except Inconsistent as error:
            tally.counts[f"refused: {str(error)[:60]}"] += 1
            continue
        tally.counts[f"genus {genus}"] += 1
        tally.counts[f"rank {planted.rank}"] += 1
        known = rng.random() < 0.5
        investigation = planted.group
        if not known:
            n = investigation.size
            unit = [[int(i == j) for j in range(n)] for i in range(n)]
            investigation = planted.with_group(unit, planted.rank, investigation.orders)
        tally.counts["points known" if known else "points not known"] += 1
        survive(rng, planted, investigation, planted.coordinates, tally)
        spoil(rng, planted, tally)
    return tally
