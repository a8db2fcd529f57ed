"""Reading the notation of the files: rational numbers, polynomials, equations, points, p-adic expansions.

A tokenizer and a recursive-descent parser; nothing is ever evaluated as program text.  Every refusal names
the column and what was expected there, and every size is bounded before work is done on it.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Generic, NoReturn, TypeVar

from sieve.errors import InputError
from sieve.exact.padic_number import PadicNumber

MAX_TEXT = 200_000
"""Characters in one text."""
MAX_DIGITS = 4000
"""Decimal digits in one number."""
MAX_BITS = 20_000
"""Bits in a coefficient."""
MAX_DEGREE = 100
"""Total degree of a polynomial."""
MAX_DEPTH = 50
"""Nested parentheses."""
MAX_EXPONENT = 1000
"""Absolute value of an exponent, of a polynomial or of a p-adic power."""
MAX_WORK = 300_000
"""Products of terms while one text is expanded."""
MAX_TERMS = 4 * MAX_EXPONENT
"""Terms of one p-adic expansion."""

Polynomial = dict[tuple[int, ...], Fraction]
"""Exponent tuple (one entry for each variable, in order) to nonzero coefficient."""

Entry = TypeVar("Entry")

_DIGITS = "0123456789"
_LETTERS = "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ_"
_SYMBOLS = "+-*/^()=:,"
_LOOKALIKES = {
    "−": "'-'", "–": "'-'", "·": "'*'", "×": "'*'", "²": "'^2'", "³": "'^3'", ".": "a fraction such as 1/2",
}  # fmt: skip
_OPERAND = "a number, a variable or '('"


def quote(text: str, limit: int = 40) -> str:
    """Text from a file, in quotes, shortened, with control characters escaped, fit for a one-line message.

    >>> print(quote("x" * 50, 8), quote("tab\\t"))
    'xxxxxxxx...' 'tab\\t'
    """
    shown = text if len(text) <= limit else text[:limit] + "..."
    return "'" + "".join(c if c.isprintable() else repr(c)[1:-1] for c in shown) + "'"


def alternatives(names: Sequence[str]) -> str:
    """Names as a message offers them; at least one.

    >>> print(alternatives(["x", "y", "z"]))
    'x', 'y' or 'z'
    """
    quoted = [quote(name) for name in names]
    return " or ".join([", ".join(quoted[:-1]), quoted[-1]] if len(quoted) > 1 else quoted)


@dataclass(frozen=True)
class Origin:
    """Where a text comes from: `file` and `place` (table and key) as error messages show them."""

    file: str
    place: str = ""

    def at(self, detail: str, joint: str = ", ") -> Origin:
        """A place inside this one."""
        return Origin(self.file, f"{self.place}{joint}{detail}" if self.place else detail)

    def error(self, found: str, expected: str) -> InputError:
        """The refusal of what was found here."""
        return InputError(self.file, self.place, found, expected)


@dataclass(frozen=True)
class ParsedPoint(Generic[Entry]):
    """A point as written: `entries` in order, `affine` for commas, projective for colons."""

    entries: tuple[Entry, ...]
    affine: bool


@dataclass(frozen=True)
class _Token:
    kind: str  # "number", "name", a symbol, or "end"
    text: str
    column: int

    @property
    def shown(self) -> str:
        return "the end of the text" if self.kind == "end" else quote(self.text)


def _tokens(text: str, origin: Origin) -> list[_Token]:
    if len(text) > MAX_TEXT:
        raise origin.error(f"a text of {len(text)} characters", f"at most {MAX_TEXT}")
    out: list[_Token] = []
    i = 0
    while i < len(text):
        c = text[i]
        start = i
        if c in " \t\n\r":
            i += 1
            continue
        if c in _DIGITS:
            while i < len(text) and text[i] in _DIGITS:
                i += 1
            if i - start > MAX_DIGITS:
                place = origin.at(f"column {start + 1}")
                raise place.error(f"a number of {i - start} digits", f"at most {MAX_DIGITS}")
            out.append(_Token("number", text[start:i], start + 1))
        elif c in _LETTERS:
            while i < len(text) and text[i] in _LETTERS + _DIGITS:
                i += 1
            out.append(_Token("name", text[start:i], start + 1))
        elif c in _SYMBOLS:
            i += 1
            out.append(_Token(c, c, start + 1))
        else:
            expected = _LOOKALIKES.get(c, "a number, a variable or one of + - * / ^ ( )")
            raise origin.at(f"column {start + 1}").error(f"the character {quote(c)}", expected)
    out.append(_Token("end", "", len(text) + 1))
    return out


class _Parser:
    """One text being read; the methods consume tokens from left to right."""

    def __init__(self, text: str, origin: Origin) -> None:
        self.origin = origin
        self.tokens = _tokens(text, origin)
        self.index = 0
        self.depth = 0
        self.work = 0

    # ---- tokens

    @property
    def next(self) -> _Token:
        return self.tokens[self.index]

    def take(self) -> _Token:
        token = self.tokens[self.index]
        self.index += 1
        return token

    def refuse(self, token: _Token, found: str, expected: str) -> NoReturn:
        raise self.origin.at(f"column {token.column}").error(found, expected)

    def expect(self, kind: str, expected: str) -> _Token:
        if self.next.kind != kind:
            self.refuse(self.next, self.next.shown, expected)
        return self.take()

    def skip(self, kind: str) -> bool:
        if self.next.kind != kind:
            return False
        self.index += 1
        return True

    # ---- polynomials

    def expression(self, variables: Sequence[str]) -> Polynomial:
        total: Polynomial = {}
        sign = -1 if self.next.kind == "-" else 1
        if self.next.kind in "+-":
            self.take()
        while True:
            for exponents, coefficient in self.product(variables).items():
                value = total.get(exponents, Fraction(0)) + sign * coefficient
                if value:
                    self.check_size(value)
                    total[exponents] = value
                else:
                    del total[exponents]
            if self.next.kind not in ("+", "-"):
                return total
            sign = -1 if self.take().kind == "-" else 1

    def product(self, variables: Sequence[str]) -> Polynomial:
        total = self.power(variables)
        while True:
            token = self.next
            if token.kind == "*":
                self.take()
                if self.next.kind == "*":
                    self.refuse(token, "'**'", "'^' for a power")
                total = self.multiply(total, self.power(variables), token)
            elif token.kind == "/":
                self.take()
                divisor = self.power(variables)
                if any(any(exponents) for exponents in divisor):
                    self.refuse(token, "a division by a polynomial", "a nonzero number after '/'")
                if not divisor:
                    self.refuse(token, "a division by zero", "a nonzero number after '/'")
                (value,) = divisor.values()
                total = self.multiply(total, {(0,) * len(variables): 1 / value}, token)
            elif token.kind in ("number", "name", "("):
                self.refuse(token, f"{token.shown} right after a factor", "'*' between factors")
            else:
                return total

    def power(self, variables: Sequence[str]) -> Polynomial:
        base = self.atom(variables)
        if self.next.kind != "^":
            return base
        token = self.take()
        if self.next.kind != "number":
            self.refuse(self.next, self.next.shown, "a nonnegative integer as exponent")
        number = self.take()
        exponent = int(number.text)
        if exponent > MAX_EXPONENT:
            self.refuse(number, f"the exponent {quote(number.text)}", f"at most {MAX_EXPONENT}")
        if self.next.kind == "^":
            self.refuse(self.next, "a power of a power", "parentheses around the inner one")
        result: Polynomial = {(0,) * len(variables): Fraction(1)}
        for bit in bin(exponent)[2:]:
            result = self.multiply(result, result, token)
            if bit == "1":
                result = self.multiply(result, base, token)
        return result

    def atom(self, variables: Sequence[str]) -> Polynomial:
        token = self.take()
        if token.kind == "number":
            value = Fraction(int(token.text))
            return {(0,) * len(variables): value} if value else {}
        if token.kind == "name":
            if token.text not in variables:
                known = alternatives(variables) if variables else "a number"
                self.refuse(token, f"the unknown name {quote(token.text)}", known)
            place = variables.index(token.text)
            return {tuple(int(i == place) for i in range(len(variables))): Fraction(1)}
        if token.kind == "(":
            self.depth += 1
            if self.depth > MAX_DEPTH:
                self.refuse(token, f"{self.depth} nested parentheses", f"at most {MAX_DEPTH}")
            inside = self.expression(variables)
            self.expect(")", "an operator or ')'")
            self.depth -= 1
            return inside
        self.refuse(token, token.shown, _OPERAND)

    def multiply(self, left: Polynomial, right: Polynomial, token: _Token) -> Polynomial:
        degree = sum(max((sum(e) for e in side), default=0) for side in (left, right))
        if left and right and degree > MAX_DEGREE:
            self.refuse(token, f"degree {degree}", f"degree at most {MAX_DEGREE}")
        self.work += len(left) * len(right)
        if self.work > MAX_WORK:
            self.refuse(token, "a product too large to expand", f"at most {MAX_WORK} products of terms")
        result: Polynomial = {}
        for e1, c1 in left.items():
            for e2, c2 in right.items():
                exponents = tuple(a + b for a, b in zip(e1, e2, strict=True))
                result[exponents] = result.get(exponents, Fraction(0)) + c1 * c2
        for coefficient in result.values():
            self.check_size(coefficient)
        return {exponents: c for exponents, c in result.items() if c}

    def check_size(self, value: Fraction) -> None:
        if max(value.numerator.bit_length(), value.denominator.bit_length()) > MAX_BITS:
            self.refuse(self.next, "a coefficient that is too large", f"at most {MAX_BITS} bits")

    # ---- p-adic numbers

    def padic(self, prime: int, precision: int) -> PadicNumber:
        total = PadicNumber.zero(prime, precision)
        count = 0
        sign = -1 if self.next.kind == "-" else 1
        if self.next.kind in "+-":
            self.take()
        while True:
            if self.next.kind == "name" and self.next.text == "O":
                if sign < 0:
                    self.refuse(self.next, "'-' before an O-term", "'+'")
                self.take()
                self.expect("(", "'(' after O")
                order = 0 if self.next.text == "1" else self.prime_power(prime)
                if self.next.text == "1":
                    self.take()
                self.expect(")", "')' after the O-term")
                if self.next.kind in ("+", "-"):
                    self.refuse(self.next, f"{self.next.shown} after the O-term", "the O-term at the end")
                return total.to_precision(order)
            count += 1
            if count > MAX_TERMS:
                self.refuse(self.next, "a longer expansion", f"at most {MAX_TERMS} terms")
            value = sign * self.padic_term(prime)
            total = total + PadicNumber.from_fraction(value, prime, precision)
            if self.next.kind not in ("+", "-"):
                return total
            sign = -1 if self.take().kind == "-" else 1

    def padic_term(self, prime: int) -> Fraction:
        following = self.tokens[self.index + 1] if self.next.kind == "number" else self.next
        if following.kind == "^":
            return Fraction(prime) ** self.prime_power(prime)
        number = self.expect("number", "an integer, a fraction, a digit times a power of the prime, or O(..)")
        value = Fraction(int(number.text))
        if self.skip("/"):
            divisor = self.expect("number", "a denominator")
            if int(divisor.text) == 0:
                self.refuse(divisor, "a denominator 0", "a nonzero one")
            value /= int(divisor.text)
        if self.next.kind == "^":
            self.refuse(self.next, "a power of a fraction", f"a digit times a power of {prime}")
        if self.skip("*"):
            value *= Fraction(prime) ** self.prime_power(prime)
        if self.next.kind in ("number", "name", "("):
            self.refuse(self.next, f"{self.next.shown} right after a term", "'+', '-' or '*'")
        return value

    def prime_power(self, prime: int) -> int:
        """Read p or p^k and return k."""
        base = self.expect("number", f"a power of the prime {prime}")
        if int(base.text) != prime:
            self.refuse(base, quote(base.text), f"a power of the prime {prime}")
        if not self.skip("^"):
            return 1
        bracket = self.skip("(")
        sign = -1 if self.skip("-") else 1
        number = self.expect("number", "an integer as exponent")
        if bracket:
            self.expect(")", "')' after the exponent")
        if int(number.text) > MAX_EXPONENT:
            self.refuse(number, f"the exponent {quote(number.text)}", f"at most {MAX_EXPONENT}")
        return sign * int(number.text)

    # ---- points

    def point(self, entry: Callable[[], Entry]) -> ParsedPoint[Entry]:
        self.expect("(", "a point, '(X : Y : Z)' or '(x, y)'")
        entries = [entry()]
        if self.next.kind not in (":", ","):
            self.refuse(self.next, self.next.shown, "':' or ',' between the coordinates")
        separator = self.next.kind
        while self.skip(separator):
            entries.append(entry())
        if self.next.kind != ")":
            self.refuse(self.next, self.next.shown, f"'{separator}' or ')'")
        self.take()
        self.finish("nothing after the point")
        return ParsedPoint(tuple(entries), separator == ",")

    def finish(self, expected: str) -> None:
        if self.next.kind != "end":
            self.refuse(self.next, self.next.shown, expected)


def parse_polynomial(text: str, variables: Sequence[str], origin: Origin) -> Polynomial:
    """A polynomial with rational coefficients in the given variables.

    Arguments: `text` with + - * ^ ( ) and / by nonzero numbers; `variables` in the order of the exponents.
    Returns exponent tuple -> nonzero coefficient; zero is the empty dictionary.
    Raises `InputError` with the column, also when a limit of this module is passed.

    >>> parse_polynomial("(x - 1/2)*y^2", ["x", "y"], Origin("here"))
    {(1, 2): Fraction(1, 1), (0, 2): Fraction(-1, 2)}
    """
    parser = _Parser(text, origin)
    result = parser.expression(variables)
    parser.finish("an operator, or the end of the polynomial")
    return result


def names_in(text: str, origin: Origin) -> tuple[str, ...]:
    """The different names in a text, in the order in which they occur; errors as for `parse_polynomial`.

    >>> names_in("u^3*v = w^4 - u^4", Origin("here"))
    ('u', 'v', 'w')
    """
    return tuple(dict.fromkeys(token.text for token in _tokens(text, origin) if token.kind == "name"))


def parse_equation(text: str, variables: Sequence[str], origin: Origin) -> Polynomial:
    """An equation, as left side minus right side.

    Arguments and errors as for `parse_polynomial`; exactly one `=`; sides that are equal are refused.

    >>> parse_equation("y^2 = x^5 + 1", ["x", "y"], Origin("here"))
    {(0, 2): Fraction(1, 1), (5, 0): Fraction(-1, 1), (0, 0): Fraction(-1, 1)}
    """
    parser = _Parser(text, origin)
    left = parser.expression(variables)
    parser.expect("=", "an operator, or '=' and the other side")
    right = parser.expression(variables)
    parser.finish("an operator, or the end of the equation")
    for exponents, coefficient in right.items():
        left[exponents] = left.get(exponents, Fraction(0)) - coefficient
    difference = {exponents: c for exponents, c in left.items() if c}
    if not difference:
        raise origin.error("an equation whose two sides are equal", "the equation of a curve")
    return difference


def parse_univariate(text: str, variable: str, origin: Origin) -> tuple[Fraction, ...]:
    """A polynomial in one variable: its coefficients, low degree first, the last one nonzero.

    Errors as for `parse_polynomial`; zero is the empty tuple.

    >>> parse_univariate("x^2 - x/3", "x", Origin("here"))
    (Fraction(0, 1), Fraction(-1, 3), Fraction(1, 1))
    """
    return dense(parse_polynomial(text, [variable], origin))


def dense(polynomial: Polynomial, index: int = 0) -> tuple[Fraction, ...]:
    """The coefficients of a polynomial that involves the variable `index` alone, low degree first."""
    degree = max((exponents[index] for exponents in polynomial), default=-1)
    out = [Fraction(0)] * (degree + 1)
    for exponents, coefficient in polynomial.items():
        out[exponents[index]] += coefficient
    return tuple(out)


def format_univariate(coefficients: Sequence[int | Fraction], variable: str) -> str:
    """A polynomial in one variable, coefficients low degree first, as `parse_univariate` reads it.

    >>> format_univariate([Fraction(-1, 2), 0, 1, -3], "x")
    '-3*x^3 + x^2 - 1/2'
    """
    terms = []
    for degree in range(len(coefficients) - 1, -1, -1):
        value = Fraction(coefficients[degree])
        if value:
            power = "" if degree == 0 else variable if degree == 1 else f"{variable}^{degree}"
            size = str(abs(value))
            body = size if not power else power if size == "1" else f"{size}*{power}"
            terms.append(("-" if value < 0 else "+", body))
    if not terms:
        return "0"
    text = "".join(f" {sign} {body}" for sign, body in terms)[1:]
    return text[2:] if text[0] == "+" else "-" + text[2:]


def parse_rational(text: str, origin: Origin) -> Fraction:
    """A rational number, `3` or `-7/4`; arithmetic on numbers such as `2^5/3` is read too.

    >>> parse_rational("-7/4", Origin("here"))
    Fraction(-7, 4)
    """
    return parse_polynomial(text, [], origin).get((), Fraction(0))


def parse_point(text: str, origin: Origin) -> ParsedPoint[Fraction]:
    """A point with rational coordinates, `(X : Y : Z)` or `(x, y)`; any number >= 2 of coordinates.

    >>> parse_point("(1/2, -3)", Origin("here"))
    ParsedPoint(entries=(Fraction(1, 2), Fraction(-3, 1)), affine=True)
    """
    parser = _Parser(text, origin)
    return parser.point(lambda: parser.expression([]).get((), Fraction(0)))


def parse_polynomial_point(text: str, variable: str, origin: Origin) -> ParsedPoint[tuple[Fraction, ...]]:
    """A point whose coordinates are polynomials in one variable (coefficients low degree first)."""
    parser = _Parser(text, origin)
    return parser.point(lambda: dense(parser.expression([variable])))


def parse_padic(text: str, prime: int, precision: int, origin: Origin) -> PadicNumber:
    """A p-adic number: an integer, a fraction, or an expansion with an optional O-term at its end.

    Arguments: `prime`, the only base of powers in the text; `precision`, the absolute precision of a value
    that states none.  An O-term lowers the precision and never raises it.  Digits need not be reduced;
    terms beyond the precision are absorbed.  Raises `InputError` with the column.

    >>> str(parse_padic("5 + 3*7 + 2*7^3 + O(7^6)", 7, 10, Origin("here")))
    '5 + 3*7 + 2*7^3 + O(7^6)'
    >>> str(parse_padic("-1/7", 7, 2, Origin("here")))
    '6*7^-1 + 6 + 6*7 + O(7^2)'
    """
    parser = _Parser(text, origin)
    result = parser.padic(prime, precision)
    parser.finish("'+', '-' or the end of the number")
    return result


def parse_padic_point(text: str, prime: int, precision: int, origin: Origin) -> ParsedPoint[PadicNumber]:
    """A point with p-adic coordinates, each read as by `parse_padic`."""
    parser = _Parser(text, origin)
    return parser.point(lambda: parser.padic(prime, precision))
