"""Why a candidate is still open, and what would help: in words, with the numbers that say so."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from sieve.curves.protocol import Curve
from sieve.engine.algebraic import AlgebraicPoint, recognise_algebraic
from sieve.engine.prime_hunt import Hunt
from sieve.local.chabauty import LocatedCandidate


@dataclass(frozen=True)
class Explanation:
    """The cause, in one word, with a reason and a hint for the report.

    `cause`: "algebraic" (a point over a small field, `point`), "saturation" (the p-part may not be used),
    "precision" (the class of a rational point to all known digits), "power" (no group seen carries the power
    of p it takes), "size" (groups that carry it were seen, and more are needed).
    """

    cause: str
    reason: str
    hint: str
    point: AlgebraicPoint | None = None


def explain(curve: Curve, prime: int, candidate: LocatedCandidate, hunt: Hunt | None, *,
            bound: int, ells: Sequence[int], why_not: str = "", following: int | None = None) -> Explanation:
    """The first cause that applies, in the order of `Explanation`.

    Arguments: the Chabauty prime and the candidate; the hunt it took part in (None: it took part in none);
    `bound`, primes below it were looked at; `ells`, the primes l whose parts are in use; `why_not`, why p is
    not among them; `following`, a prime beyond the bound that is expected to help.
    """
    if candidate.kind == "point" and candidate.coordinates is not None:
        point = recognise_algebraic(curve, prime, candidate.coordinates)
        if point is not None:
            field = f"a field of degree {point.degree}"
            return Explanation(
                "algebraic",
                f"to all its digits it is the point {point}, which lies on the curve over {field}; "
                "such points can survive every sieve",
                "show that the zero of the Chabauty function is this point (or compute more digits)", point)
    if prime not in ells:
        return Explanation("saturation", f"the {prime}-part of the group is not used: "
                           + (why_not or f"it is not proved that {prime} does not divide the index"),
                           f"saturate the group at {prime}, or state the index (index_prime_to)")
    power = None if hunt is None else hunt.powers.get(candidate.id)
    if hunt is None or power is None:
        return Explanation("size", "", "add auxiliary primes (a larger --bound)")
    if candidate.id in hunt.hopeless:
        return Explanation(
            "precision", f"modulo {prime}^{hunt.top} of the group, all that its digits determine, it has the "
            "class of a rational point",
            f"compute the candidate to at least {max(candidate.digits, hunt.top) + 1} digits")
    seen = hunt.largest_power
    beyond = "" if following is None else f"; v = {following} is expected to help (--bound {following + 1})"
    needed = f"{prime}^{power}" if power > 1 else str(prime)
    wanted = f"auxiliary primes whose group carries {needed} are needed"
    hint = f"auxiliary primes above {bound}{beyond or ', or another Chabauty prime'}"
    if seen < power:
        return Explanation("power", f"{wanted}, and none below {bound} does", hint)
    left = hunt.classes_left(candidate.id)
    return Explanation("size", f"{wanted}; those below {bound} leave {left} of its classes", hint)


__all__ = ["Explanation", "explain"]
