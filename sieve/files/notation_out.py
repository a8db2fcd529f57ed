"""Mathematical objects as interface files write them."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from typing import Any

from sieve.curves.divisors import Divisor, FibrePlace, MumfordPlace, RationalPlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.notation import format_univariate


def divisor_document(curve: HyperellipticCurve, divisor: Divisor) -> list[list[Any]]:
    """A divisor in the notation of case files, in the user's coordinates: a list of [multiplicity, place]."""
    out: list[list[Any]] = []
    for multiplicity, place in divisor.terms:
        if isinstance(place, RationalPlace):
            out.append([multiplicity, curve.format_point(place.point)])
        elif isinstance(place, MumfordPlace):
            w = [c / curve.y_scale for c in place.w]
            out.append(
                [
                    multiplicity,
                    {"mumford": [format_univariate(list(place.u), "x"), format_univariate(w, "x")]},
                ]
            )
        elif isinstance(place, FibrePlace):
            out.append([multiplicity, {"fibres": place.count}])
    return out


def divisor_text(curve: HyperellipticCurve, divisor: Divisor) -> str:
    """A divisor on one line, for reports."""
    parts = []
    for multiplicity, place in divisor_document(curve, divisor):
        if isinstance(place, str):
            name = place
        elif "mumford" in place:
            name = "[" + ", ".join(place["mumford"]) + "]"
        else:
            count = place["fibres"]
            name = "(a fibre of x)" if count == 1 else f"({count} fibres of x)"
        sign = "-" if multiplicity < 0 else "+"
        size = "" if abs(multiplicity) == 1 else f"{abs(multiplicity)}*"
        parts.append(f"{sign} {size}{name}")
    text = " ".join(parts) or "0"
    return text[2:] if text.startswith("+ ") else text


def equation_text(curve: HyperellipticCurve) -> str:
    """The equation of the integral model."""
    f = format_univariate([Fraction(c) for c in curve.f], "x")
    if not curve.h:
        return f"y^2 = {f}"
    h = format_univariate([Fraction(c) for c in curve.h], "x")
    middle = {"1": "y", "-1": "-y"}.get(h, f"({h})*y")
    return f"y^2 + {middle} = {f}".replace("+ -", "- ")


def structure_text(invariants: Sequence[int]) -> str:
    """A finite abelian group as a product of cyclic groups."""
    return " x ".join(f"Z/{d}" for d in invariants) or "0"
