"""Numbers and objects as mathematicians write them, in the small part of LaTeX that all renderers know.

The commands used: ^{..}, _{..}, \\cdot, \\times, \\mathbb{Q}, \\mathbb{F}, \\mathbb{Z}, \\colon, \\sim,
\\nmid, \\in, \\varnothing, \\infty, \\tfrac{a}{b}, \\mathrm{..}.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from fractions import Fraction

from sieve.curves.divisors import ClosedPlace, Divisor, MumfordPlace, Point, RationalPlace
from sieve.curves.protocol import Curve
from sieve.files.notation_out import plane_terms


def fraction(value: Fraction | int) -> str:
    """A rational number.

    >>> fraction(Fraction(-7, 4)), fraction(3)
    ('-\\\\tfrac{7}{4}', '3')
    """
    value = Fraction(value)
    if value.denominator == 1:
        return str(value.numerator)
    sign = "-" if value < 0 else ""
    return f"{sign}\\tfrac{{{abs(value.numerator)}}}{{{value.denominator}}}"


def power(base: str, exponent: int) -> str:
    """base^exponent, without a trivial exponent."""
    return base if exponent == 1 else f"{base}^{{{exponent}}}"


def polynomial(coefficients: Sequence[Fraction | int], variable: str = "x") -> str:
    """A polynomial, highest degree first; coefficients low degree first.

    >>> polynomial([9, 0, -2, 1])
    'x^{3} - 2x^{2} + 9'
    """
    terms: list[str] = []
    for degree in reversed(range(len(coefficients))):
        c = Fraction(coefficients[degree])
        if c:
            monomial = power(variable, degree) if degree else ""
            size = "" if abs(c) == 1 and degree else fraction(abs(c))
            sign = "-" if c < 0 else "+"
            terms.append(f"{sign} {size}{monomial}")
    text = " ".join(terms) or "0"
    return (
        text[2:] if text.startswith("+ ") else text.replace("- ", "-", 1) if text.startswith("- ") else text
    )


def equation(curve: Curve) -> str:
    """The equation of the model."""
    if curve.weight == 1:
        return f"{_form(curve)} = 0"
    f, h = polynomial([-c for c in curve.rows[0]]), polynomial(curve.rows[1])
    if h == "0":
        return f"y^{{2}} = {f}"
    middle = {"1": "+ y", "-1": "- y"}.get(h, f"+ ({h})\\,y")
    return f"y^{{2}} {middle} = {f}"


def name(variable: str) -> str:
    """A variable: one letter, or a letter with an index, or upright.

    >>> name("x"), name("x10"), name("alpha_1")
    ('x', 'x_{10}', '\\\\mathrm{alpha1}')
    """
    found = re.fullmatch(r"([A-Za-z])_?(\d*)", variable)
    if found is None:
        return "\\mathrm{" + variable.replace("_", "") + "}"
    return found[1] + (f"_{{{found[2]}}}" if found[2] else "")


def _form(curve: Curve) -> str:
    names = [name(v) for v in curve.variables]
    text = ""
    for c, exponents in plane_terms(curve):
        monomial = "".join(power(v, e) for v, e in zip(names, exponents, strict=True) if e)
        size = "" if abs(c) == 1 else str(abs(c))
        text += ((" - " if c < 0 else " + ") if text else ("-" if c < 0 else "")) + size + monomial
    return text


def rational_point(curve: Curve, point: Point) -> str:
    """A rational point in the user's coordinates: projective on a plane curve, else affine or (1 : s : 0)."""
    x, y, z = curve.to_user(point)
    if curve.weight == 1 or z == 0:
        return f"({fraction(x)} : {fraction(y)} : {fraction(z)})"
    return f"({fraction(x / z)}, {fraction(y / z**curve.weight)})"


def expansion(value: int, p: int, digits: int) -> str:
    """A p-adic integer known modulo p^digits.

    >>> expansion(3 + 2 * 7, 7, 4)
    '3 + 2\\\\cdot 7 + O(7^{4})'
    """
    terms = []
    rest = value % p**digits
    for k in range(digits):
        rest, digit = divmod(rest, p)
        if digit:
            unit = power(str(p), k) if k else ""
            if not unit:
                terms.append(str(digit))
            else:
                terms.append(unit if digit == 1 else f"{digit}\\cdot {unit}")
    return " + ".join([*terms, f"O({power(str(p), digits)})"])


def divisor(curve: Curve, value: Divisor) -> str:
    """A divisor in the user's coordinates; a Mumford pair as <u, w>, a closed point as <u; (x : y : z)>, a
    fibre of x as F."""
    parts = []
    for multiplicity, place in value.terms:
        if isinstance(place, RationalPlace):
            shown = rational_point(curve, place.point)
        elif isinstance(place, MumfordPlace):
            w = [c / curve.y_scale for c in place.w]
            shown = f"\\langle {polynomial(place.u)},\\ {polynomial(w)}\\rangle"
        elif isinstance(place, ClosedPlace):
            y = [c / curve.y_scale for c in place.y]
            point = " : ".join(polynomial(part, "t") for part in (place.x, y, place.z))
            shown = f"\\langle {polynomial(place.u, 't')};\\ ({point})\\rangle"
        else:
            multiplicity, shown = multiplicity * place.count, "F"
        size = "" if abs(multiplicity) == 1 else f"{abs(multiplicity)}\\,"
        parts.append(f"{'-' if multiplicity < 0 else '+'} {size}{shown}")
    text = " ".join(parts) or "0"
    return text[2:] if text.startswith("+ ") else text


def group(invariants: Sequence[int]) -> str:
    """A finite abelian group; equal cyclic factors are collected."""
    parts: list[str] = []
    for d in dict.fromkeys(invariants):
        count = list(invariants).count(d)
        cyclic = f"\\mathbb{{Z}}/{d}"
        parts.append(cyclic if count == 1 else f"({cyclic})^{{{count}}}")
    return " \\times ".join(parts) or "0"


def vector(values: Sequence[int]) -> str:
    """A tuple of integers; one integer stands alone."""
    return str(values[0]) if len(values) == 1 else "(" + ", ".join(map(str, values)) + ")"


def factored(exponents: Sequence[tuple[int, int]]) -> str:
    """A product of prime powers."""
    return "\\cdot ".join(power(str(ell), e) for ell, e in exponents) or "1"


# ---- other renderings of the same formulas ------------------------------------------------------------

_SYMBOLS = {
    "\\cdot ": "·", "\\times": "×", "\\mathbb{Q}": "ℚ", "\\mathbb{F}": "𝔽", "\\mathbb{Z}": "ℤ",
    "\\colon": ":", "\\sim": "∼", "\\nmid": "∤", "\\in": "∈", "\\varnothing": "∅", "\\infty": "∞",
    "\\langle": "⟨", "\\rangle": "⟩", "\\,": " ", "\\ ": " ", "\\{": "{", "\\}": "}", "\\ldots": "…",
    "\\emptyset": "∅", "\\#": "#", "\\varphi": "φ", "\\cong": "≅", "\\le": "≤", "\\ell": "ℓ",
}  # fmt: skip


def as_html(formula: str) -> str:
    """A formula with HTML tags for exponents and indices.

    >>> as_html("x^{3} - 2x \\\\in \\\\mathbb{Q}")
    '<i>x</i><sup>3</sup> − 2<i>x</i> ∈ ℚ'
    """
    text = formula.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;")
    text = re.sub(r"\\tfrac\{(\d+)\}\{(\d+)\}", r"\1/\2", text)
    text = re.sub(r"\\mathrm\{([^{}]*)\}", r"[[\1]]", text)
    for command in sorted(_SYMBOLS, key=len, reverse=True):
        text = text.replace(command, _SYMBOLS[command])
    text = re.sub(r"(?<![A-Za-z&\[])([A-Za-z])(?![A-Za-z;\]])", r"<i>\1</i>", text)
    text = text.replace("[[", "").replace("]]", "")
    while True:
        after = re.sub(r"\^\{([^{}]*)\}", r"<sup>\1</sup>", text)
        after = re.sub(r"_\{([^{}]*)\}", r"<sub>\1</sub>", after)
        if after == text:
            return text.replace(" - ", " − ").replace("(-", "(−")
        text = after
