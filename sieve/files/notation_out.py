"""Mathematical objects as interface files write them."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from typing import Any

from sieve.curves.divisors import ClosedPlace, Divisor, MumfordPlace, RationalPlace
from sieve.curves.notation import format_univariate
from sieve.curves.protocol import Curve


def divisor_document(curve: Curve, divisor: Divisor) -> list[list[Any]]:
    """A divisor in the notation of case files, in the user's coordinates: a list of [multiplicity, place]."""
    out: list[list[Any]] = []
    for multiplicity, place in divisor.terms:
        if isinstance(place, RationalPlace):
            out.append([multiplicity, curve.format_point(place.point)])
        elif isinstance(place, MumfordPlace):
            w = [c / curve.y_scale for c in place.w]
            pair = [format_univariate(place.u, "x"), format_univariate(w, "x")]
            out.append([multiplicity, {"mumford": pair}])
        elif isinstance(place, ClosedPlace):
            y = [c / curve.y_scale for c in place.y]
            shown = " : ".join(format_univariate(part, "t") for part in (place.x, y, place.z))
            out.append([multiplicity, {"root_of": format_univariate(place.u, "t"), "point": f"({shown})"}])
        else:
            out.append([multiplicity, {"fibres": place.count}])
    return out


def divisor_text(curve: Curve, divisor: Divisor) -> str:
    """A divisor on one line, for reports."""
    parts = []
    for multiplicity, place in divisor_document(curve, divisor):
        if isinstance(place, str):
            name = place
        elif "mumford" in place:
            name = "[" + ", ".join(place["mumford"]) + "]"
        elif "root_of" in place:
            name = f"[{place['point']}, {place['root_of']} = 0]"
        else:
            count = place["fibres"]
            name = "(a fibre of x)" if count == 1 else f"({count} fibres of x)"
        sign = "-" if multiplicity < 0 else "+"
        size = "" if abs(multiplicity) == 1 else f"{abs(multiplicity)}*"
        parts.append(f"{sign} {size}{name}")
    text = " ".join(parts) or "0"
    return text[2:] if text.startswith("+ ") else text


def equation_text(curve: Curve) -> str:
    """The equation of the integral model."""
    if curve.weight == 1:
        return f"{form_text(curve)} = 0"
    f = format_univariate([Fraction(-c) for c in curve.rows[0]], "x")
    h = format_univariate([Fraction(c) for c in curve.rows[1]], "x")
    if h == "0":
        return f"y^2 = {f}"
    middle = {"1": "y", "-1": "-y"}.get(h, f"({h})*y")
    return f"y^2 + {middle} = {f}".replace("+ -", "- ")


def plane_terms(curve: Curve) -> list[tuple[int, tuple[int, int, int]]]:
    """The nonzero coefficients of the form of a plane curve with their exponents, x first."""
    terms = [
        (c, (i, k, curve.degree - i - k)) for k, row in enumerate(curve.rows) for i, c in enumerate(row) if c
    ]
    return sorted(terms, key=lambda term: term[1], reverse=True)


def form_text(curve: Curve) -> str:
    """The form F of a plane curve in its variables.

    >>> from sieve.curves.plane import PlaneCurve
    >>> form_text(PlaneCurve({(3, 1, 0): 1, (0, 3, 1): 1, (1, 0, 3): 1}, ("u", "v", "w")))
    'u^3*v + u*w^3 + v^3*w'
    """
    text = ""
    for c, exponents in plane_terms(curve):
        powers = [
            name if e == 1 else f"{name}^{e}" for name, e in zip(curve.variables, exponents, strict=True) if e
        ]
        size = [] if abs(c) == 1 else [str(abs(c))]
        sign = (" - " if c < 0 else " + ") if text else ("-" if c < 0 else "")
        text += sign + "*".join(size + powers)
    return text


def structure_text(invariants: Sequence[int]) -> str:
    """A finite abelian group as a product of cyclic groups."""
    return " x ".join(f"Z/{d}" for d in invariants) or "0"
