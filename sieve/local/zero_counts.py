"""How many rational points a p-adic ball can hold, for r < g: zeros of annihilating integrals, counted.

For an annihilating differential w with coefficient vector e, and B the base divisor, of degree d, the
function f(t) = e . (d Log(point t) - Log(B)) on a residue disc is 0 at every rational point.  With t = p s it
is a power series with coefficients that tend to 0 and are integral but perhaps the constant one; the number
of its zeros in a ball t0 + p^n Z_p (over the completed algebraic closure, with multiplicity) is the degree of
its reduction on that ball, divided by the largest power of p (Strassman 1928).  So a ball on which some f has
degree 0 holds no rational point, and one on which some f has degree k holds k at most.

Which differentials.  Let D_1..D_r be the free generators, r an upper bound for the rank of J(Q), the rows
Log(D_i) scaled to be integral and primitive, known modulo p^A.  If the minor of some r columns (the pivots)
has valuation s < A, the logarithms are independent; so the rank is r, the D_i generate a subgroup of finite
index, and e annihilates Log J(Q) exactly when it annihilates their logarithms.  For each other column j one
e* has a 1 there and 0 at the rest of the other columns.  An integral e of that shape with e . Log(D_i) = 0
modulo p^A for all i agrees with e* modulo p^(A - s): by Cramer's rule, for the equations for e - e*.

Double zeros.  A differential that annihilates exactly (`exact_annihilators`) and is a^m times a regular one,
in the chart coordinates (a, b) with parameter t = a, has an integral with a zero of order m + 1 at t = 0, if
that is a rational point.  When it has no further zero in the ball, no other rational point is there.
(Coleman 1985; Stoll 2006.)
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from flint import fmpz_mat, fmpz_poly

from sieve.curves.discs import ResidueDisc
from sieve.curves.divisors import Divisor
from sieve.curves.protocol import Curve
from sieve.errors import InternalError, PrecisionLost
from sieve.exact.padic_linear import PadicVector
from sieve.exact.padic_number import valuation
from sieve.exact.series import coefficients, integral_length
from sieve.local.annihilators import Annihilator, annihilators, exact_annihilators
from sieve.local.chabauty import LocatedCandidate
from sieve.local.logarithms import PadicIntegrals
from sieve.local.picard import PicardGroup, picard_group

EXTRA_DIGITS = 4
"""Digits computed beyond those of the candidates, at first."""

LARGEST_FACTOR = 4
"""At most about this many times the digits of the candidates are computed."""

DEEPEST = 3
"""Without candidates t is looked at modulo p^(DEEPEST + 1), with candidates to their digits."""

Ball = tuple[int, int, int]
"""(disc, value, digits): the points of a disc whose parameter is `value` modulo p^digits, digits >= 1."""


@dataclass(frozen=True)
class BallBound:
    """What is proved about the ball of one candidate.

    `at_most`, the bound on rational points in it, or None; `central`: if the point with parameter 0 is
    rational, the ball holds no other rational point.
    """

    id: str
    at_most: int | None
    central: bool = False


@dataclass(frozen=True)
class ZeroProof:
    """What the annihilating integrals prove about a list of candidates at p, given the rank.

    `digits`, those of the logarithms in use; `pivots`, the columns in which the annihilators depend on the
    logarithms; `counts`, for every disc its number and the least number of zeros of one integral there;
    `bounds`, for the candidates that are points or discs; `missing`, balls outside all candidates that may
    hold a rational point.
    """

    prime: int
    digits: int
    annihilators: tuple[Annihilator, ...]
    pivots: tuple[int, ...]
    counts: tuple[tuple[int, int | None], ...]
    bounds: tuple[BallBound, ...]
    missing: tuple[Ball, ...]

    @property
    def complete(self) -> bool:
        """Whether every rational point (every one that was asked for) is near some candidate."""
        return not self.missing

    def bound(self, name: str) -> BallBound:
        """What is proved about one candidate."""
        return next((b for b in self.bounds if b.id == name), BallBound(name, None))


class Integrals:
    """The annihilating integrals of one curve at an odd prime, as power series on the discs.

    Arguments: `integrals`; `base`, of degree 1 or 2; `generators`, r < g of them, independent.
    Raises `PrecisionLost`, `BadReduction`, `Uncertified`, `Inconsistent`.
    """

    def __init__(self, integrals: PadicIntegrals, base: Divisor, generators: Sequence[Divisor]) -> None:
        if integrals.prime == 2:
            raise InternalError("zeros are counted at odd primes")
        self.integrals, self.prime, self.degree = integrals, integrals.prime, base.degree
        curve, logs = integrals.curve, [integrals.log_divisor(d) for d in generators]
        found = annihilators(logs, self.prime, curve.genus, integrals.digits)
        #: the columns in which the annihilators depend on the logarithms
        self.pivots = tuple(sorted(set(range(curve.genus)) - {a.free for a in found}))
        # what the text above allows for vectors known as well as these; a proof log rests on no more
        lost = _valuation_of_minor(logs, self.pivots, self.prime)
        found = [replace(a, precision=a.precision - lost) for a in found]
        self.forms = tuple(exact_annihilators(curve, logs, found))
        self.base_log = integrals.log_divisor(base)

    def series(self, disc: int) -> tuple[list[fmpz_poly], int]:
        """(series, A): f(p s) times a power of p, one for each form, all coefficients modulo p^A.

        The omitted coefficients are 0 modulo p^A.
        """
        p, digits = self.prime, self.integrals.digits
        constant = self.degree * self.integrals.log_parameter(disc, 0, digits) - self.base_log
        shift = constant.shift
        # terms with t carry at least one factor p more than the differentials are known to
        inexact = [a.precision - shift for a in self.forms if not a.exact]
        precision = min([constant.precision, digits, *inexact])
        if precision < 1:
            raise PrecisionLost(p, precision, 1, f"the integrals over disc {disc}")
        length, modulus = integral_length(p, 1, precision), p ** (precision + shift)
        forms = self.integrals.discs[disc].expansion(precision, max(1, length)).forms
        terms = [coefficients(form, length) for form in forms]
        return [self._one(a, constant, terms, modulus) for a in self.forms], precision + shift

    def _one(
        self, form: Annihilator, constant: PadicVector, terms: Sequence[Sequence[int]], modulus: int
    ) -> fmpz_poly:
        p, scale = self.prime, self.degree * self.prime**constant.shift
        out = [sum(e * n for e, n in zip(form.coefficients, constant.numerators, strict=True)) % modulus]
        for k in range(1, len(terms[0]) + 1):
            v = valuation(k, p)
            value = sum(e * term[k - 1] for e, term in zip(form.coefficients, terms, strict=True))
            out.append(value * scale * p ** (k - v) * pow(k // p**v, -1, modulus) % modulus)
        return fmpz_poly(out)

    def order_at_centre(self, form: Annihilator, disc: ResidueDisc) -> int:
        """The order of vanishing at the centre that an exact monomial form has there at least."""
        if not form.exact or disc.ramified or disc.residue[0]:
            return 0
        i, k = disc.pairs[form.free]
        return disc.degree - disc.weight - 2 - i - disc.weight * k if disc.chart == "x" else i


def _valuation_of_minor(logs: Sequence[PadicVector], columns: Sequence[int], prime: int) -> int:
    """The valuation of a minor that is not 0, of the logarithms scaled to be integral and primitive."""
    rows = []
    for log in logs:
        least = min(valuation(c, prime) for c in log.numerators if c)
        rows.append([log.numerators[j] // prime**least for j in columns])
    return valuation(int(fmpz_mat(rows).det()), prime) if rows else 0


def _reduced(series: fmpz_poly, prime: int, precision: int) -> list[int] | None:
    """The series divided by its content, modulo p, without trailing zeros; None for 0 modulo p^precision."""
    entries = [int(c) for c in series.coeffs()]
    least = min((valuation(c, prime) for c in entries if c), default=precision)
    if least >= precision:
        return None
    reduced = [c // prime**least % prime for c in entries]
    while not reduced[-1]:
        reduced.pop()
    return reduced


def _inside(series: Sequence[fmpz_poly], value: int, factor: int, modulus: int) -> list[fmpz_poly]:
    """The series at value + factor * s."""
    line = fmpz_poly([value, factor])
    return [fmpz_poly([int(c) % modulus for c in f(line).coeffs()]) for f in series]


def uncovered(
    series: Sequence[fmpz_poly], prime: int, precision: int, covered: Sequence[tuple[int, int]], deepest: int
) -> list[tuple[int, int]]:
    """Balls (value, digits) outside the covered ones in which all series may have a common zero.

    Arguments: series in s over Z/p^precision, omitted coefficients 0; `covered`, balls value + p^digits Z_p
    of s, 0 <= digits <= deepest; no smaller ball than p^-deepest is looked at.  An empty answer means that
    every common zero in Z_p is covered.

    >>> uncovered([fmpz_poly([-6, 1, 1])], 5, 4, [(2, 1)], 1)  # (s - 2)(s + 3)
    []
    >>> uncovered([fmpz_poly([-6, 1, 1])], 5, 4, [(2, 2)], 2)  # -3 is 22 modulo 25
    [(22, 2)]
    """
    out: list[tuple[int, int]] = []
    todo = [(list(series), 0, 0)]
    while todo:
        here, value, digits = todo.pop()
        if any(n <= digits and (value - v) % prime**n == 0 for v, n in covered):
            continue
        reduced = [r for f in here if (r := _reduced(f, prime, precision)) is not None]
        if any(len(r) == 1 for r in reduced):
            continue
        # without any known coefficient only a covered ball inside is a reason to look closer
        if digits >= deepest or not (reduced or any((value - v) % prime**digits == 0 for v, _ in covered)):
            out.append((value, digits))
            continue
        for s in range(prime):
            if all(_value(r, s, prime) == 0 for r in reduced):
                inner = _inside(here, s, prime, prime**precision)
                todo.append((inner, value + s * prime**digits, digits + 1))
    return sorted(out)


def _value(reduced: Sequence[int], s: int, prime: int) -> int:
    total = 0
    for c in reversed(reduced):
        total = (total * s + c) % prime
    return total


def count_zeros(
    series: Sequence[fmpz_poly], prime: int, precision: int, value: int, digits: int
) -> list[int | None]:
    """The number of zeros of each series in the ball value + p^digits Z_p of s; None where it is not known.

    >>> [count_zeros([fmpz_poly([-6, 1, 1])], 5, 4, 2, digits) for digits in (0, 1, 2)]
    [[2], [2], [1]]
    """
    inner = _inside(series, value, prime**digits, prime**precision)
    degrees = [_reduced(f, prime, precision) for f in inner]
    return [None if r is None else len(r) - 1 for r in degrees]


def zero_proof(
    curve: Curve,
    base: Divisor,
    generators: Sequence[Divisor],
    prime: int,
    candidates: Sequence[LocatedCandidate],
    group: PicardGroup | None = None,
    integral: bool = False,
) -> ZeroProof:
    """What is proved about a list of candidates at an odd prime of good reduction.

    Arguments: `generators`, r < g free ones; candidates of kind "coefficients" are left aside; `group`, the
    certified Picard group at the prime; `integral`: only discs that are not at infinity are looked at.  The
    working precision grows until the list is proved complete and every bound is at most the multiplicity of
    its candidate, or to `LARGEST_FACTOR` times the digits of the candidates.
    Raises `PrecisionLost` when not even then the annihilators are known; `BadReduction`, `Uncertified`,
    `Inconsistent`.
    """
    group = picard_group(curve.modulo(prime)) if group is None else group
    digits = max([c.digits for c in candidates if c.kind != "coefficients"], default=DEEPEST + 1)
    limit = LARGEST_FACTOR * digits + 20
    working = digits + EXTRA_DIGITS
    while True:
        try:
            found = Integrals(PadicIntegrals(curve, prime, working, group), base, generators)
            proof = prove(found, candidates, integral)
        except PrecisionLost:
            if working >= limit:
                raise
        else:
            most = {c.id: c.multiplicity for c in candidates}
            few = all(b.at_most is not None and b.at_most <= most[b.id] for b in proof.bounds)
            if working >= limit or (proof.complete and few):
                return proof
        working = min(limit, 2 * working)


def prove(found: Integrals, candidates: Sequence[LocatedCandidate], integral: bool = False) -> ZeroProof:
    """What the given integrals prove about a list of candidates, see `zero_proof`."""
    p, discs = found.prime, found.integrals.discs
    balls: dict[int, list[LocatedCandidate]] = {}
    for c in candidates:
        if c.kind != "coefficients" and c.disc is not None:
            balls.setdefault(c.disc, []).append(c)
    deepest = max((c.digits - 1 for here in balls.values() for c in here), default=DEEPEST)
    counts: list[tuple[int, int | None]] = []
    bounds: dict[str, BallBound] = {}
    missing: list[Ball] = []
    for disc in discs:
        if integral and disc.at_infinity:
            continue
        series, precision = found.series(disc.number)
        whole = [n for n in count_zeros(series, p, precision, 0, 0) if n is not None]
        counts.append((disc.number, min(whole, default=None)))
        here = balls.get(disc.number, [])
        covered = [(c.parameter % p**c.digits // p, c.digits - 1) for c in here]
        for value, digits in uncovered(series, p, precision, covered, deepest):
            missing.append((disc.number, p * value, digits + 1))
        for c, (value, digits) in zip(here, covered, strict=True):
            zeros = count_zeros(series, p, precision, value, digits)
            known = [n for n in zeros if n is not None]
            central = value == 0 and any(
                n is not None and n == found.order_at_centre(form, disc) + 1
                for form, n in zip(found.forms, zeros, strict=True)
            )
            bounds[c.id] = BallBound(c.id, min(known, default=None), central)
    ordered = tuple(bounds[c.id] for c in candidates if c.id in bounds)
    return ZeroProof(
        p, found.integrals.digits, found.forms, found.pivots, tuple(counts), ordered, tuple(missing)
    )
