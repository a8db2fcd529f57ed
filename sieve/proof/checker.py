"""Independent checker of proof logs in the format `sieve-proof/1`, described in FORMAT.md.

Run as `python -I -S -O checker.py PROOF [--json]`.  This one file needs nothing but the Python standard
library (3.11 or later) and shares no code with the program that writes the logs.  It trusts the statement and
the premises, prints both, and checks everything else.

Exit codes: 0 accepted; 3 rejected or malformed (line, record, reason code and reason on standard output); 2
declined (beyond a limit or of an unknown version), unreadable, or with a verdict that cannot be printed, one
line on standard error.  Nothing is accepted by default: the verdict is built after the last record has been
checked.
"""

# ruff: noqa: B905
from __future__ import annotations

import json
import os
import re
import struct
import sys
import unicodedata
from collections.abc import Iterable, Iterator, Sequence
from fractions import Fraction
from math import gcd, isqrt, lcm, prod
from typing import Any, BinaryIO

Row = list[int]
Vector = tuple[int, ...]
Point = tuple[int, int, int]
Form = list[tuple[int, int, int, int]]
"""A form as terms (c, i, k, j) for c X^i Y^k Z^j; X, Y, Z have weights 1, w, 1."""
Poly = dict[tuple[int, int], int]
"""A polynomial in chart coordinates: (i, k) -> coefficient of a^i b^k."""

FORMAT = "sieve-proof/1"
MAX_LINE, MAX_FILE, MAX_DEPTH, MAX_DIGITS = 4_000_000, 400_000_000, 8, 4000
MAX_RECORDS, MAX_CLASSES, MAX_PRIME, MAX_ELL = 50_000, 400_000, 2**20, 2**64
MAX_GENUS, MAX_RANK, MAX_BASE, MAX_TERMS, MAX_BITS, MAX_FIELD = 12, 60, 400, 5000, 4000, 200_000
MAX_MULTIPLE, MAX_PLACES, MAX_HEIGHT, MAX_SERIES = 60, 100, 200_000, 400_000
MAX_ENTRIES, MAX_WORK = 20_000_000, 3 * 10**9
"""Elementary steps, about a microsecond each."""
LARGE_PRIMES = (2**61 - 1, 2**89 - 1, 2**107 - 1)
"""What holds modulo one of these holds over Q: smoothness, independence."""


class Fault(Exception):
    """A stable reason code and the reason in words; the line and the record are added by the reader."""

    def __init__(self, code: str, reason: str) -> None:
        reason = "".join(c if c.isprintable() else "?" for c in reason[:300])
        super().__init__(reason)
        self.code, self.reason, self.line, self.record = code, reason, 0, ""


class Malformed(Fault):
    """The text is no log of this format."""


class Rejected(Fault):
    """A record claims something that does not hold."""


class Declined(Exception):
    """A limit of this checker, or a version it does not know."""


class Work:
    """Counts elementary steps, so that no log keeps the checker busy without end."""

    def __init__(self) -> None:
        self.done = 0

    def spend(self, steps: int) -> None:
        """Add steps."""
        self.done += steps
        limit(self.done <= MAX_WORK, "more work than this checker does")


def need(holds: bool, code: str, reason: str) -> None:
    """Reject the record unless the side condition holds."""
    if not holds:
        raise Rejected(code, reason)


def limit(holds: bool, reason: str) -> None:
    """Decline the log unless it is within a limit."""
    if not holds:
        raise Declined(reason)


# ---- text to values ----------------------------------------------------------------------------------


def _integer_token(token: str) -> int:
    limit(len(token) <= MAX_DIGITS, f"an integer of more than {MAX_DIGITS} digits")
    return int(token)


def _no_number(token: str) -> int:
    raise Malformed("number", f"{token[:20]} is not an integer")


def _pairs(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    if len({key for key, _ in pairs}) != len(pairs):
        raise Malformed("duplicate-key", "a key occurs twice")
    return dict(pairs)


def decode(line: bytes) -> dict[str, Any]:
    """One line without its newline to a record."""
    try:
        text = line.decode("utf-8")
    except UnicodeDecodeError:
        raise Malformed("encoding", "not UTF-8") from None
    depth = 0
    for outside in text.replace("\\\\", "").replace('\\"', "").split('"')[::2]:
        for bracket in re.findall(r"[\[\]{}]", outside):
            depth += 1 if bracket in "[{" else -1
            limit(depth <= MAX_DEPTH, f"nesting deeper than {MAX_DEPTH}")
    try:
        value = json.loads(text, parse_int=_integer_token, parse_float=_no_number, parse_constant=_no_number,
                           object_pairs_hook=_pairs)
    except json.JSONDecodeError as error:
        raise Malformed("json", error.msg) from None
    except RecursionError:
        raise Declined(f"nesting deeper than {MAX_DEPTH}") from None
    spellings = (json.dumps(value, separators=(",", ":"), ensure_ascii=escaped) for escaped in (False, True))
    if text not in spellings:
        raise Malformed("spelling", "not in the compact form")
    if type(value) is not dict or type(value.get("kind")) is not str or next(iter(value)) != "kind":
        raise Malformed("record", 'no object that begins with "kind"')
    return value


def integer(value: Any, low: int | None = None, high: int | None = None) -> int:
    """An integer, low <= value <= high."""
    if type(value) is not int:
        raise Malformed("type", "an integer is expected")
    if (low is not None and value < low) or (high is not None and value > high):
        raise Malformed("range", f"an integer out of range, expected {low} to {high}")
    return value


def boolean(value: Any) -> bool:
    """true or false."""
    if type(value) is not bool:
        raise Malformed("type", "true or false is expected")
    return value


def text(value: Any) -> str:
    """A text that is not empty and prints on one line."""
    if type(value) is not str:
        raise Malformed("type", "a text is expected")
    if not value.strip() or any(unicodedata.category(c) in ("Cc", "Cf", "Cs", "Zl", "Zp") for c in value):
        raise Malformed("text", "an empty text or one with control characters")
    return value


def items(value: Any, count: int | None = None) -> list[Any]:
    """A list, of the given length."""
    if type(value) is not list:
        raise Malformed("type", "a list is expected")
    if count is not None and len(value) != count:
        raise Malformed("length", f"a list of {len(value)}, expected {count}")
    return value


def integers(value: Any, low: int | None = None, high: int | None = None, count: int | None = None) -> Row:
    """A list of integers."""
    return [integer(c, low, high) for c in items(value, count)]


def rational(value: Any) -> Fraction:
    """A rational number written as text, "3" or "-7/4", in lowest terms."""
    if type(value) is not str or not re.fullmatch(r"-?[0-9]+(/[0-9]+)?", value):
        raise Malformed("type", 'a rational number like "-7/4" is expected')
    parts = [_integer_token(part) for part in value.split("/")]
    if parts[-1] == 0 and len(parts) == 2:
        raise Malformed("range", "a denominator 0")
    number = Fraction(*parts)
    if str(number) != value:
        raise Malformed("spelling", "a rational number not in lowest terms")
    return number


def fields(record: dict[str, Any], *keys: str) -> list[Any]:
    """The values of exactly these keys, which follow `kind` in this order."""
    if list(record) != ["kind", *keys]:
        raise Malformed("keys", f"keys {', '.join(record)}, expected kind, {', '.join(keys)}")
    return [record[key] for key in keys]


# ---- numbers and polynomials -------------------------------------------------------------------------


def is_prime(n: int) -> bool:
    """Is n < 2^64 a prime?  Miller-Rabin with the first twelve primes as bases (Sorenson-Webster 2015)."""
    bases = (2, 3, 5, 7, 11, 13, 17, 19, 23, 29, 31, 37)
    if n < 41:
        return n in bases
    twos = valuation(n - 1, 2)
    return all(pow(base, n - 1 >> twos, n) == 1
               or any(pow(base, n - 1 >> k, n) == n - 1 for k in range(1, twos + 1)) for base in bases)


def prime(value: Any, bound: int) -> int:
    """A prime below the bound."""
    limit(integer(value, 2) < bound, f"a prime beyond {bound}")
    need(is_prime(value), "not-prime", f"{value} is not a prime")
    return int(value)


def valuation(n: int, p: int) -> int:
    """The exponent of p in n != 0."""
    count = 0
    while n % p == 0:
        n, count = n // p, count + 1
    return count


def part(n: int, primes: Iterable[int]) -> int:
    """The largest divisor of n >= 1 with no other prime factors than these."""
    return prod(ell ** valuation(n, ell) for ell in primes)


def trim(a: Iterable[int], modulus: int) -> Row:
    """Coefficients modulo the modulus (0: over Z), low degree first, without trailing zeros."""
    out = [c % modulus for c in a] if modulus else list(a)
    while out and out[-1] == 0:
        out.pop()
    return out


def value_at(a: Sequence[int], x: int, modulus: int) -> int:
    """a(x)."""
    total = 0
    for c in reversed(a):
        total = (total * x + c) % modulus
    return total


def times(a: Sequence[int], b: Sequence[int]) -> Row:
    """The product over Z."""
    out = [0] * max(0, len(a) + len(b) - 1)
    for i, c in enumerate(a):
        for j, d in enumerate(b):
            out[i + j] += c * d
    return out


def plus(a: Sequence[int], b: Sequence[int], factor: int = 1) -> Row:
    """a + factor * b over Z."""
    length = max(len(a), len(b))
    return [(a[i] if i < len(a) else 0) + factor * (b[i] if i < len(b) else 0) for i in range(length)]


def divide(a: Sequence[int], b: Sequence[int], modulus: int) -> tuple[Row, Row]:
    """Quotient and remainder by b, whose leading coefficient is a unit (over Z, modulus 0: is 1)."""
    rest, inverse = list(a), pow(b[-1], -1, modulus) if modulus else 1
    quotient = [0] * max(0, len(a) - len(b) + 1)
    for i in reversed(range(len(quotient))):
        lead = rest[i + len(b) - 1] * inverse
        quotient[i] = lead % modulus if modulus else lead
        for j, c in enumerate(b):
            rest[i + j] -= quotient[i] * c
    return quotient, trim(rest[: len(b) - 1], modulus)


def common(a: Row, b: Row, v: int) -> Row:
    """A greatest common divisor over F_v."""
    while b:
        a, b = b, divide(a, b, v)[1]
    return a


def squarefree(a: Row, v: int) -> bool:
    """Is the polynomial over F_v, not 0, prime to its derivative?"""
    return len(common(a, trim([i * c for i, c in enumerate(a)][1:], v), v)) == 1


def factor_degrees(a: Row, v: int) -> Row:
    """The degrees of the irreducible factors of a squarefree polynomial over F_v."""
    degrees, step, power = [], 0, [0, 1]
    while len(a) - 1 >= 2 * (step + 1):
        step += 1
        base, result, exponent = divide(power, a, v)[1], [1], v
        while exponent:
            if exponent % 2:
                result = divide(times(result, base), a, v)[1]
            base, exponent = divide(times(base, base), a, v)[1], exponent // 2
        power = result
        found = common(a, trim(plus(power, [0, 1], -1), v), v)
        degrees += [step] * ((len(found) - 1) // step)
        a = divide(a, found, v)[0]
    return degrees + ([len(a) - 1] if len(a) > 1 else [])


# ---- linear algebra and lattices ---------------------------------------------------------------------


def independent(rows: Iterable[Row], v: int, enough: int) -> Row:
    """The numbers of rows that are independent over F_v of those before them; stops when there are enough."""
    basis: list[tuple[int, Row]] = []
    chosen: Row = []
    for number, row in enumerate(rows):
        if len(chosen) == enough:
            break
        row = [c % v for c in row]
        for place, known in basis:
            factor = row[place]
            if factor:
                row = [(x - factor * y) % v for x, y in zip(row, known)]
        first = next((i for i, c in enumerate(row) if c), None)
        if first is not None:
            inverse = pow(row[first], -1, v)
            basis.append((first, [c * inverse % v for c in row]))
            chosen.append(number)
    return chosen


def insert(basis: list[Row], row: Row, modulus: int = 0) -> Row:
    """Add a row to a lattice given by rows with positive pivots on the diagonal; returns what is left.

    The rest is zero in the columns that have a pivot.  With a modulus, a multiple of the exponent of the
    quotient, entries are kept small.
    """
    for j, pivot in enumerate(basis):
        a, b = pivot[j], row[j]
        if b == 0:
            continue
        if b % a == 0:
            quotient = b // a
            row = [x - quotient * y for x, y in zip(row, pivot)]
        else:
            divisor, s, t = bezout(a, b)
            basis[j] = [s * y + t * x for x, y in zip(row, pivot)]
            row = [a // divisor * x - b // divisor * y for x, y in zip(row, pivot)]
            if modulus:
                basis[j] = [x if i <= j else x % modulus for i, x in enumerate(basis[j])]
        if modulus:
            row = [x % modulus if i > j else x for i, x in enumerate(row)]
    return row


def bezout(a: int, b: int) -> tuple[int, int, int]:
    """(d, s, t) with d = s a + t b > 0 the greatest common divisor, a > 0."""
    s, next_s, d, rest = 1, 0, a, b
    while rest:
        q = d // rest
        d, rest, s, next_s = rest, d - q * rest, next_s, s - q * next_s
    if d < 0:
        d, s = -d, -s
    return d, s, (d - s * a) // b


def remainder(basis: list[Row], row: Row) -> Row:
    """The representative with entries below the pivots, the same for all rows of a class."""
    for j, pivot in enumerate(basis):
        quotient = row[j] // pivot[j]
        if quotient:
            row = [x - quotient * y for x, y in zip(row, pivot)]
    return row


def diagonal(entries: Sequence[int]) -> list[Row]:
    """A diagonal matrix."""
    return [[c if i == j else 0 for j in range(len(entries))] for i, c in enumerate(entries)]


def index_of(basis: list[Row]) -> int:
    """The index of a lattice given by a triangular basis."""
    return prod(row[i] for i, row in enumerate(basis))


def lattice_index(rows: list[Row], width: int, order: int, work: Work) -> int:
    """The index in Z^width of the lattice that the rows span, a multiple of `order`; 0 for infinite index.

    It divides every minor.  Fraction-free elimination (Bareiss 1968) gives one minor d, and Cramer's rule
    those that differ from it in one row; mostly their greatest common divisor is the index already.
    """
    work.spend(width**2 * (width + len(rows)) // 4)
    rows = sorted(rows, key=lambda row: (sum(map(abs, row)), row))
    table, d = [list(column) for column in zip(*rows)], 1
    pivots: Row = []
    for c in range(len(rows)):
        k = len(pivots)
        place = next((i for i in range(k, width) if table[i][c]), None)
        if place is None:
            continue
        table[k], table[place] = table[place], table[k]
        top, pivot = table[k][c:], table[k][c]
        for row in table[k + 1 :]:
            factor = row[c]
            row[c:] = [(pivot * x - factor * y) // d for x, y in zip(row[c:], top)]
        pivots.append(c)
        d = pivot
    if len(pivots) < width:
        return 0
    divisor = abs(d)
    for c in sorted(set(range(len(rows))) - set(pivots)):
        if divisor == order:
            return order
        solution: Row = []
        for row, c_pivot in zip(table[::-1], pivots[::-1]):
            known = sum(row[q] * x for q, x in zip(pivots[::-1], solution))
            solution.append((d * row[c] - known) // row[c_pivot])
        divisor = gcd(divisor, *solution)
    basis = diagonal([divisor] * width)
    for row in rows:
        insert(basis, row, divisor)
    return index_of(basis)


def determinant(matrix: list[Row]) -> int:
    """The absolute value of the determinant, by fraction-free elimination (Bareiss 1968)."""
    rows, previous = [row[:] for row in matrix], 1
    for k in range(len(rows) - 1):
        place = next((i for i in range(k, len(rows)) if rows[i][k]), None)
        if place is None:
            return 0
        rows[k], rows[place] = rows[place], rows[k]
        top, pivot = rows[k], rows[k][k]
        for i in range(k + 1, len(rows)):
            row, factor = rows[i], rows[i][k]
            rows[i] = [(pivot * x - factor * y) // previous for x, y in zip(row, top)]
        previous = pivot
    return abs(rows[-1][-1]) if rows else 1


# ---- forms and series --------------------------------------------------------------------------------


def homogeneous(rows: Sequence[Sequence[int]], weight: int, degree: int) -> Form:
    """The form of weighted degree `degree` that is sum rows[k][i] x^i y^k where Z = 1."""
    form = [(c, i, k, degree - i - weight * k) for k, row in enumerate(rows) for i, c in enumerate(row) if c]
    need(all(j >= 0 for _, _, _, j in form), "form-degree", f"a term of weighted degree above {degree}")
    return form


def partials(form: Form) -> list[Form]:
    """The derivatives by X, Y and Z."""
    by_x = [(c * i, i - 1, k, j) for c, i, k, j in form if i]
    by_y = [(c * k, i, k - 1, j) for c, i, k, j in form if k]
    return [by_x, by_y, [(c * j, i, k, j - 1) for c, i, k, j in form if j]]


def evaluate(form: Form, point: Point, modulus: int) -> int:
    """The value of a form at a point, modulo the modulus (0: over Z)."""
    x, y, z = point
    if modulus:
        return sum(c * pow(x, i, modulus) * pow(y, k, modulus) * pow(z, j, modulus)
                   for c, i, k, j in form) % modulus
    return sum(c * x**i * y**k * z**j for c, i, k, j in form)


def chart_of(point: Point) -> int:
    """0 for Z = 1, with coordinates (x, y); 1 for X = 1, with (Z, Y); 2 for Y = 1, with (X, Z)."""
    return 0 if point[2] else 1 if point[0] else 2


def in_chart(form: Form, chart: int) -> Poly:
    """A form in the coordinates (a, b) of a chart."""
    return {((i, k), (j, k), (i, j))[chart]: c for c, i, k, j in form}


class Series:
    """(Z/q)[t] modulo t^length."""

    def __init__(self, modulus: int, length: int, work: Work) -> None:
        self.modulus, self.length, self.work = modulus, length, work
        self.width = (2 * modulus.bit_length() + length.bit_length() + 8) // 8

    def reduce(self, a: Row) -> Row:
        """Coefficients modulo q, as many as the length."""
        return [c % self.modulus for c in a[: self.length]] + [0] * (self.length - len(a))

    def product(self, a: Sequence[int], b: Sequence[int]) -> Row:
        """The product, through one product of large integers (Kronecker)."""
        w, q = self.width, self.modulus
        self.work.spend(self.length + int((self.length * w / 60) ** 1.6))
        x, y = (int.from_bytes(b"".join((c % q).to_bytes(w, "little") for c in s), "little") for s in (a, b))
        packed = (x * y).to_bytes(w * (len(a) + len(b) + 1), "little")
        return [int.from_bytes(packed[i * w : (i + 1) * w], "little") % q for i in range(self.length)]

    def compose(self, poly: Poly, a: list[Row], b: list[Row]) -> Row:
        """A polynomial at two series, which are given by their powers; these lists grow as needed."""
        for place, known in enumerate((a, b)):
            while len(known) <= max((key[place] for key in poly), default=0):
                known.append(self.product(known[-1], known[1]))
        rows: dict[int, Row] = {}
        for (i, k), c in poly.items():
            rows[k] = plus(rows.get(k, []), a[i], c)
        total: Row = []
        for k, row in rows.items():
            total = plus(total, self.product(row, b[k]) if k else row)
        return self.reduce(total)

    def inverse(self, a: Row) -> Row:
        """The inverse of a series with a unit constant term."""
        out = self.reduce([pow(a[0], -1, self.modulus)])
        for _ in range(self.length.bit_length()):
            out = self.product(out, plus([2], self.product(a, out), -1))
        return out


class Disc:
    """The points near a point of the curve over F_p: chart coordinates and differentials in a parameter t.

    The parameter is a - a0 where the derivative by b is a unit, else (*vertical*) b - b0; a0 and b0 are in
    0..p-1, and the centre is t = 0.
    """

    def __init__(self, curve: Curve, series: Series, p: int, point: Point) -> None:
        x, y, z = point
        self.curve, self.series, self.chart = curve, series, chart_of(point)
        first, second = ((x, y) if z else (0, y) if x else (0, 0))
        equation, mod = in_chart(curve.form, self.chart), series.modulus
        slope = sum(c * k * first**i * second ** (k - 1) for (i, k), c in equation.items() if k)
        self.vertical = slope % p == 0
        if self.vertical:
            first, second = second, first
            equation = {(k, i): c for (i, k), c in equation.items()}
        derivative = {(i, k - 1): c * k for (i, k), c in equation.items() if k}
        start = sum(c * first**i * second**k for (i, k), c in derivative.items())
        need(start % p != 0, "expansion", "a residue disc was not expanded")
        one, inverse, other = series.reduce([1]), series.reduce([pow(start, -1, p)]), series.reduce([second])
        moving = [one, series.reduce([first, 1])]
        # Newton's iteration for the other coordinate and for the inverse of the slope; both are verified
        for _ in range(mod.bit_length() + series.length.bit_length() + 2):
            powers = [one, other]
            value = series.compose(equation, moving, powers)
            check = series.product(series.compose(derivative, moving, powers), inverse)
            if not any(value) and check == one:
                break
            inverse = series.product(inverse, plus([2], check, -1))
            other = series.reduce(plus(other, series.product(value, inverse), -1))
        else:
            raise Rejected("expansion", "a residue disc was not expanded")
        self.powers = (powers, moving) if self.vertical else (moving, powers)
        self.centre, self.slope = (self.powers[0][1][0], self.powers[1][1][0]), inverse

    def restrict(self, form: Form) -> Row:
        """A form, divided by a power of the coordinate that is 1 in the chart, as a series."""
        return self.series.compose(in_chart(form, self.chart), *self.powers)

    def differentials(self) -> list[Row]:
        """x^i y^k dx / F_y in t; the sign changes on other charts than Z = 1, and where t = b - b0."""
        sign = -1 if (self.chart > 0) != self.vertical else 1
        regular = (self.restrict([(sign, *key)]) for key in self.curve.exponents)
        return [self.series.product(form, self.slope) for form in regular]


# ---- the curve ---------------------------------------------------------------------------------------


class Curve:
    """F(X, Y, Z) = 0 over Q, F of weighted degree D with weights 1, w, 1, smooth.

    A plane curve (w = 1), or y^2 + h(x) y = f(x) with w = g + 1.  The class U is that of the zeros of X, of
    degree D / w; the zeros of a form of weighted degree n have the class n U.
    """

    def __init__(self, rows: list[Row], weight: int, genus: int, work: Work) -> None:
        self.weight, self.genus, self.work = weight, genus, work
        need(len(rows) > 0 and len(rows[-1]) > 0 and all(row[-1] for row in rows if row), "trailing-zero",
             "a leading coefficient 0, or no equation")
        degree = max(len(row) - 1 + weight * k for k, row in enumerate(rows) if row)
        if weight > 1:
            need(len(rows) == 3 and rows[2] == [1], "model", "an equation of an unknown model")
            need(degree == 2 * weight, "degree", "f or h of too large a degree")
        limit(degree <= 2 * MAX_GENUS + 2, "an equation of too large a degree")
        self.degree, self.unit = degree, degree // weight
        self.form = homogeneous(rows, weight, degree)
        # the regular differentials x^i y^k dx / F_y, with the exponent of Z that makes them homogeneous
        top = degree - weight - 2
        self.exponents = [(i, k, top - i - weight * k) for k in range(top // weight + 1)
                          for i in range(top - weight * k + 1)]
        need(len(self.exponents) == genus, "genus", f"the genus is {len(self.exponents)}")
        self.tested: dict[int, bool] = {}
        need(any(self.smooth(v) for v in LARGE_PRIMES), "singular", "the curve is not smooth")
        self.rows = rows
        # 4 f + h^2 of y^2 + h y = f
        self.square = trim(plus(times(rows[1], rows[1]), rows[0], -4), 0) if weight > 1 else []

    def smooth(self, v: int) -> bool:
        """Is the model smooth over F_v?  Exactly if F and its derivatives have no common zero.

        Then three of their combinations form a regular sequence of weighted degrees D, D - 1, D - w (or less
        in sum), and all forms of degree 3 D - 2 w - 2 are in the ideal (Macaulay 1916).
        """
        if v not in self.tested:
            d, w = self.degree, self.weight
            top = 3 * d - 2 * w - 2
            column = {key: n for n, key in enumerate(monomials(top, w))}
            self.work.spend(len(column) ** 3 // 3)

            def multiples() -> Iterator[Row]:
                for form, degree in zip([self.form, *partials(self.form)], (d, d - 1, d - w, d - 1)):
                    for i, k, j in monomials(top - degree, w):
                        row = [0] * len(column)
                        for c, *key in form:
                            row[column[key[0] + i, key[1] + k, key[2] + j]] = c
                        yield row

            self.tested[v] = len(independent(multiples(), v, len(column))) == len(column)
        return self.tested[v]

    def residue(self, point: Point, modulus: int, p: int) -> Point:
        """A point modulo a power of p in normal form: Z = 1; else X = 1, p | Z; else Y = 1, p | X and Z."""
        x, y, z = point
        scale = pow(z if z % p else x if x % p else y, -1, modulus)
        return x * scale % modulus, y * scale**self.weight % modulus, z * scale % modulus


def monomials(degree: int, weight: int) -> list[tuple[int, int, int]]:
    """The exponents (i, k, j) of all monomials of a weighted degree."""
    return [(i, k, degree - i - weight * k) for k in range(degree // weight + 1)
            for i in range(degree - weight * k + 1)]


class Section:
    """A form of weighted degree `multiple`; its zeros have the class `multiple` U."""

    def __init__(self, curve: Curve, value: Any, low: int | None = None, high: int | None = None) -> None:
        if not items(value):
            raise Malformed("length", "a section without its degree")
        self.multiple = integer(value[0], 1)
        limit(self.multiple <= MAX_MULTIPLE, f"a section of degree above {MAX_MULTIPLE}")
        size = max([len(value) - 1, *(len(items(row)) for row in value[1:])])
        need(size <= self.multiple + 1, "form-degree", "more coefficients than its degree has")
        rows = [integers(row, low, high) for row in value[1:]]
        self.form = homogeneous(rows, curve.weight, self.multiple)

    def proper(self, curve: Curve, v: int) -> bool:
        """Does its degree show that it is not 0 on the curve over F_v?"""
        return self.multiple < curve.degree and any(c % v for c, *_ in self.form)


class Reduction:
    """The points of the curve over F_v in their numbering, and the divisors of sections."""

    def __init__(self, curve: Curve, v: int) -> None:
        need(curve.smooth(v), "not-smooth", f"the model is not smooth modulo {v}")
        self.curve, self.prime = curve, v
        curve.work.spend(v * (curve.degree + 2) + (0 if curve.weight > 1 else v * v // 10))
        lines = [[value_at(row, x, v) for row in curve.rows] for x in range(v)]
        lines.append([sum(c for c, i, k, j in curve.form if (k, j) == (n, 0)) % v
                      for n in range(len(curve.rows))])
        ys = quadratic_roots(lines, v) if curve.weight > 1 and v > 2 else all_roots(lines, v)
        self.points: list[Point] = [(x, y, 1) for x in range(v) for y in ys[x]]
        self.points += [(1, s, 0) for s in ys[v]]
        if evaluate(curve.form, (0, 1, 0), v) == 0:
            self.points.append((0, 1, 0))
        self.number = {point: i for i, point in enumerate(self.points)}
        self.discs: dict[int, Disc] = {}

    def conjugate(self, i: int) -> int | None:
        """The number of the conjugate point, if there is a conjugation."""
        (x, y, z), w, v = self.points[i], self.curve.weight, self.prime
        if w == 1:
            return None
        h = evaluate([term for term in self.curve.form if term[2] == 1], (x, 1, z), v)
        return self.number[(x, (-y - h) % v, z)]

    def disc(self, i: int, length: int) -> Disc:
        """The expansion over F_v at a point, to at least a length."""
        if i not in self.discs or self.discs[i].series.length < length:
            series = Series(self.prime, max(length, 4), self.curve.work)
            self.discs[i] = Disc(self.curve, series, self.prime, self.points[i])
        return self.discs[i]

    def order_reaches(self, form: Form, i: int, order: int) -> bool:
        """Does the form vanish at the point to this order?"""
        if order <= 1:
            return order < 1 or evaluate(form, self.points[i], self.prime) == 0
        return not any(self.disc(i, order).restrict(form)[:order])

    def divisor(self, section: Section, zeros: Row, place: dict[int, int], degree: int) -> None:
        """Check that the zeros of a section are `zeros` and a place of this degree and with these points."""
        count = section.multiple * self.curve.unit - degree
        self.curve.work.spend(len(section.form) * (len(zeros) + 1))
        need(zeros == sorted(zeros), "zeros-order", "the zeros are not sorted")
        need(len(zeros) == count, "zeros-count", f"{len(zeros)} zeros, expected {count}")
        orders = {i: zeros.count(i) + place.get(i, 0) for i in zeros}
        for i, order in orders.items():
            need(0 <= i < len(self.points), "zero-number", f"no point has number {i}")
            need(self.order_reaches(section.form, i, 1), "zero", f"point {i} is no zero of the section")
            need(self.order_reaches(section.form, i, order), "zero-multiplicity",
                 f"point {i} is no zero of this multiplicity")
        if not section.proper(self.curve, self.prime):
            i = zeros[0] if zeros else 0
            more = self.order_reaches(section.form, i, orders.get(i, place.get(i, 0)) + 1)
            need(not more, "section-vanishes", "the section vanishes on the curve, or to a higher order")


def all_roots(lines: list[Row], v: int) -> list[Row]:
    """The roots in F_v of every polynomial: its values at 0..v-1 side by side in one large integer."""
    degree = max(map(len, lines))
    table = [int.from_bytes(struct.pack(f"<{v}Q", *(pow(y, k, v) for y in range(v))), "little")
             for k in range(degree)]
    out = []
    for line in lines:
        packed = sum(c * powers for c, powers in zip(line, table)).to_bytes(8 * v, "little")
        out.append([y for y, value in enumerate(struct.unpack(f"<{v}Q", packed)) if value % v == 0])
    return out


def quadratic_roots(lines: list[Row], v: int) -> list[Row]:
    """The roots of monic quadratic polynomials over F_v, v odd."""
    roots: dict[int, Row] = {}
    for root in range(v):
        roots.setdefault(root * root % v, []).append(root)
    return [sorted((root - h) * (v + 1) // 2 % v for root in roots.get((h * h - 4 * c) % v, ()))
            for c, h, _ in lines]


# ---- orders of Jacobians over F_v --------------------------------------------------------------------


def weil_lower_bound(v: int, g: int, points: int) -> int:
    """A lower bound for #J(F_v) = prod (v + 1 - x_i), |x_i| <= 2 sqrt v, sum x_i = v + 1 - #X(F_v).

    The logarithm is concave, so the minimum is at a vertex: all x_i but one are at the ends.  Weil 1948.
    """
    scale = 10**12
    low, high = Fraction(isqrt(4 * v * scale**2), scale), Fraction(isqrt(4 * v * scale**2) + 1, scale)
    q, total = v + 1, v + 1 - points
    values = []
    for a in range(g):
        b = g - 1 - a
        last = sorted(total + (b - a) * s for s in (low, high))
        if last[0] <= high and last[1] >= -high:
            values.append((q - high) ** a * (q + low) ** b * (q - min(last[1], high)))
    bound = max((q - high) ** g, min(values) if values else Fraction(0))
    return max(1, -(-bound.numerator // bound.denominator))


class Field:
    """F_q, q = v^degree, degree >= 2: elements are logarithms to a generator, -1 stands for 0."""

    def __init__(self, v: int, degree: int) -> None:
        self.v, self.size, self.order = v, v**degree, v**degree - 1
        powers: Row = []
        for tail in range(1, self.size):
            # powers of t modulo t^degree - (low), as codes in base v, until t is a generator
            low = [tail // v**i % v for i in range(degree)]
            powers, element = [1], [0, 1] + [0] * (degree - 2)
            while element[0] != 1 or any(element[1:]):
                powers.append(sum(c * v**i for i, c in enumerate(element)))
                if powers[-1] == 0 or len(powers) == self.size:
                    break
                top = element[-1]
                element = [(a + top * c) % v for a, c in zip([0, *element[:-1]], low)]
            if len(powers) == self.order and powers[-1]:
                break
        else:
            raise Rejected("field", f"no field of order {self.size} was found")
        self.logs = [-1] * self.size
        for i, code in enumerate(powers):
            self.logs[code] = i
        # the logarithms of 1 + x (Zech)
        self.zech = [self.logs[code - v + 1 if code % v == v - 1 else code + 1] for code in powers]

    def add(self, a: int, b: int) -> int:
        """The sum."""
        if a < 0 or b < 0:
            return max(a, b)
        c = self.zech[(a - b) % self.order]
        return -1 if c < 0 else (b + c) % self.order

    def value(self, coefficients: Row, x: int) -> int:
        """A polynomial over F_v, with integer coefficients, at x."""
        total = -1
        for c in reversed(coefficients):
            total = self.add((total + x) % self.order if total >= 0 and x >= 0 else -1, self.logs[c % self.v])
        return total

    def divide(self, a: Row, b: Row) -> Row:
        """The remainder of a by b, whose leading coefficient is not 0; without trailing zeros."""
        rest = a[:]
        shift = (0 if self.v == 2 else self.order // 2) - b[-1]
        while len(rest) >= len(b):
            lead = rest.pop()
            if lead >= 0:
                offset = len(rest) + 1 - len(b)
                for j, c in enumerate(b[:-1]):
                    if c >= 0:
                        rest[offset + j] = self.add(rest[offset + j], (lead + shift + c) % self.order)
        while rest and rest[-1] < 0:
            rest.pop()
        return rest

    def times(self, a: Row, b: Row) -> Row:
        """The product of polynomials."""
        out = [-1] * max(0, len(a) + len(b) - 1)
        for i, c in enumerate(a):
            for j, d in enumerate(b):
                if c >= 0 and d >= 0:
                    out[i + j] = self.add(out[i + j], (c + d) % self.order)
        return out

    def count_roots(self, a: Row) -> int:
        """The number of different roots of a polynomial, not 0: the degree of its gcd with Y^q - Y."""
        a = self.divide(a, [-1] * len(a) + [0])
        power: Row = [0]
        for bit in bin(self.size)[2:]:
            power = self.divide(self.times(power, power), a)
            if bit == "1":
                power = self.divide([-1, *power], a)
        minus = 0 if self.v == 2 else self.order // 2
        b = power + [-1] * (2 - len(power))
        b[1] = self.add(b[1], minus)
        b = self.divide(b, a)
        while b:
            a, b = b, self.divide(a, b)
        return len(a) - 1


def extension_points(curve: Curve, v: int, degree: int) -> int:
    """#X(F_{v^degree}), degree >= 2; conjugate values of x have as many points."""
    size = v**degree
    curve.work.spend(size * (20 + 4 * curve.degree**2 * size.bit_length() // degree))
    field = Field(v, degree)
    total = int(evaluate(curve.form, (0, 1, 0), v) == 0)
    total += field.count_roots([field.logs[sum(c for c, i, k, j in curve.form if (k, j) == (n, 0)) % v]
                                for n in range(len(curve.rows))])
    for x in range(-1, field.order):
        orbit = {x * v**i % field.order for i in range(degree)} if x > 0 else {x}
        if x == min(orbit):
            total += len(orbit) * field.count_roots([field.value(row, x) for row in curve.rows])
    return total


def jacobian_order(v: int, g: int, counts: Row) -> int:
    """#J(F_v) from the numbers of points over the first g extensions (Newton's identities)."""
    a = [1] + [0] * (2 * g)
    for k in range(1, g + 1):
        a[k] = sum((counts[j - 1] - v**j - 1) * a[k - j] for j in range(1, k + 1)) // k
    for k in range(g):
        a[2 * g - k] = v ** (g - k) * a[k]
    return sum(a)


# ---- divisors ----------------------------------------------------------------------------------------


class Place:
    """The points (x(t) : y(t) : z(t)) over Q, t a root of u; more exactly the subscheme Q[t]/u of the curve.

    Where all is integral at v and the reduction is still a closed subscheme, Z_(v)[t]/u is one, and flat: the
    class of the place reduces to that of its reduction, and a section that vanishes there has it as zeros.
    """

    def __init__(self, curve: Curve, u: list[Fraction], coordinates: list[list[Fraction]]) -> None:
        need(len(u) > 1 and u[-1] == 1, "place-monic", "u is not monic of positive degree")
        need(all(len(c) < len(u) and c[-1:] != [0] for c in coordinates), "place-degree",
             "a coordinate of no smaller degree than u")
        self.curve, self.u, self.coordinates, self.degree = curve, u, coordinates, len(u) - 1
        numbers = [*u, *(c for row in coordinates for c in row)]
        self.denominator = lcm(*(c.denominator for c in numbers))
        size = max(c.numerator.bit_length() for c in numbers) + self.denominator.bit_length()
        small = self.degree <= MAX_MULTIPLE and size * (self.degree + curve.degree) <= MAX_HEIGHT
        limit(small, "a place of too large a height or degree")
        bits = size * self.degree * curve.weight * curve.degree
        curve.work.spend(len(curve.form) * self.degree**2 * (1 + int((bits / 600) ** 1.6)))
        # with t = T / s, and the coordinates multiplied by s^e, s^(e w), s^e, all is integral
        s, e = self.denominator, self.degree
        big_u = [int(c * s ** (e - i)) for i, c in enumerate(u)]
        big = [[int(c * s ** (e * weight) / s**i) for i, c in enumerate(row)]
               for row, weight in zip(coordinates, (1, curve.weight, 1))]
        need(not on_place(curve.form, big_u, big, 0), "place-off-curve", "a place that is not on the curve")
        need(any(self.closed(v) for v in LARGE_PRIMES if s % v), "place-collapses",
             "different roots of u are the same point")

    def modulo(self, p: int, modulus: int) -> tuple[Row, list[Row]]:
        """u and the coordinates modulo a power of p."""
        need(self.denominator % p != 0, "place-denominator", f"a place has a denominator divisible by {p}")
        u, *coordinates = ([c.numerator * pow(c.denominator, -1, modulus) % modulus for c in row]
                           for row in (self.u, *self.coordinates))
        return u, coordinates

    def spans(self, v: int, degree: int) -> bool:
        """Do the forms of a weighted degree restrict onto all of F_v[t]/u?

        Then u has different points as roots, and a section over Z_v of this degree that vanishes on the place
        modulo v^N is, modulo v^N, one that vanishes on it.
        """
        u, coordinates = self.modulo(v, v)
        e, keys = self.degree, monomials(degree, self.curve.weight)
        self.curve.work.spend(len(keys) * e**2)
        x, y, z = powers_on_place(keys, u, coordinates, v)
        products = (divide(times(divide(times(x[i], y[k]), u, v)[1], z[j]), u, v)[1] for i, k, j in keys)
        return len(independent((row + [0] * (e - len(row)) for row in products), v, e)) == e

    def closed(self, v: int) -> bool:
        """Is F_v[t]/u a closed subscheme of the curve?  Polynomials of degree e - 1 in the charts decide."""
        return self.spans(v, max(1, self.curve.weight * (self.degree - 1)))

    def points(self, reduction: Reduction) -> dict[int, int]:
        """The rational points of the reduction, with multiplicities."""
        v, out = reduction.prime, {}
        u, coordinates = self.modulo(v, v)
        self.curve.work.spend(v * self.degree)
        for t in range(v):
            multiplicity = 0
            while len(u) > 1 and value_at(u, t, v) == 0:
                u, multiplicity = divide(u, [-t, 1], v)[0], multiplicity + 1
            if multiplicity:
                x, y, z = (value_at(c, t, v) for c in coordinates)
                out[reduction.number[self.curve.residue((x, y, z), v, v)]] = multiplicity
        return out


def powers_on_place(
    keys: Iterable[Sequence[int]], u: Row, coordinates: list[Row], modulus: int
) -> list[list[Row]]:
    """The powers of the coordinates modulo u that monomials with these exponents need."""
    powers: list[list[Row]] = []
    for row, exponents in zip(coordinates, zip(*keys)):
        powers.append([[1]])
        for _ in range(max(exponents)):
            powers[-1].append(divide(times(powers[-1][-1], row), u, modulus)[1])
    return powers


def on_place(form: Form, u: Row, coordinates: list[Row], modulus: int) -> Row:
    """A form at (x(t), y(t), z(t)) modulo u, over Z or modulo a number."""
    total: Row = []
    if form:
        x, y, z = powers_on_place([key for _, *key in form], u, coordinates, modulus)
    for c, i, k, j in form:
        product = times(divide(times(x[i], y[k]), u, modulus)[1], z[j])
        total = plus(total, divide(product, u, modulus)[1], c)
    return trim(total, modulus)


Divisor = list[tuple[int, str, Any]]
"""Triples (multiplicity, "point", point), (.., "closed", number of the place), (.., "fibres", how many)."""


# ---- J(F_v) from sections: the record `local` ---------------------------------------------------------


class Local:
    """A checked record `local`: the class of every point of X(F_v) and of the places over Q."""

    def __init__(self, proof: Proof, record: dict[str, Any]) -> None:
        v, invariants, origin, unit, base, define, close, places, counts = fields(
            record, "prime", "invariants", "origin", "unit", "base", "define", "close", "places", "counts")
        self.proof, self.curve, self.prime = proof, proof.curve, prime(v, MAX_PRIME)
        need(self.prime not in proof.locals, "duplicate", f"a second record for {v}")
        self.reduction = Reduction(proof.curve, self.prime)
        self.moduli = integers(invariants, 2)
        need(len(self.moduli) <= 2 * self.curve.genus, "invariants", "more than 2 g invariants")
        self.points, self.unit = len(self.reduction.points), [0] * len(self.moduli)
        self.logs: dict[int, Row] = {}
        self.places: list[Row] = []
        if self.points == 0:
            empty = origin is None and counts == 0 and type(counts) is int
            empty = empty and all(x == [] for x in (invariants, unit, base, define, close, places))
            need(empty, "empty-record", "there is no point modulo the prime, and the record claims more")
            return
        # a character of J(F_v) constant on X(F_v) has a sum of N terms and an L-polynomial of degree 2 g - 2
        need(self.points**2 > (2 * self.curve.genus - 2) ** 2 * self.prime, "generation",
             "too few points to generate the group")
        need(all(place.closed(self.prime) for place in proof.places), "place-collapses",
             "different points of a place meet modulo v")
        need(all(b % a == 0 for a, b in zip(self.moduli, self.moduli[1:])), "invariants",
             "the invariants do not divide each other")
        self.unit = self.element(unit)
        limit(len(items(base)) <= MAX_BASE, f"more than {MAX_BASE} base points")
        self.width = 1 + len(base)
        limit(self.width * self.points <= MAX_ENTRIES, "too many points in terms of the base")
        self.vectors: dict[int, Row] = {}
        self.learn(integer(origin, 0, self.points - 1), [0] * len(self.moduli), [0] * self.width)
        generators = [self.unit]
        for k, entry in enumerate(base, start=1):
            i, log = items(entry, 2)
            need(integer(i, 0, self.points - 1) not in self.logs, "base", f"base point {i} is known before")
            self.learn(i, self.element(log), [int(j == k) for j in range(self.width)])
            generators.append(self.logs[i])
        for entry in items(define):
            n, zeros = self.section(entry)
            unknown = [i for i in zeros if i not in self.logs]
            need(len(unknown) == 1, "define", f"{len(unknown)} unknown zeros, expected 1")
            known = [i for i in zeros if i in self.logs]
            self.learn(unknown[0], self.rest(n, known), self.vector(n, known))
        need(len(self.logs) == self.points, "undefined-point", "some point of X(F_v) has no class")
        relations = [self.relation(*self.section(entry)) for entry in items(close)]
        own = (i for i in range(self.points) if self.reduction.conjugate(i) == i)
        relations += [self.relation(1, [i, i]) for i in own]
        self.certify(generators, relations, integer(counts))
        for k, entry in enumerate(items(places, len(proof.places))):
            number, *entry = items(entry, 3)
            need(integer(number) == k, "place-order", "the places are not listed in their order")
            self.places.append(self.rest(*self.section(entry, proof.places[k])))

    def section(self, entry: Any, place: Place | None = None) -> tuple[int, Row]:
        """The degree of a section, and its zeros other than the place."""
        form, zeros = items(entry, 2)
        section, zeros = Section(self.curve, form, 0, self.prime - 1), integers(zeros)
        inside: dict[int, int] = {}
        if place is not None:
            u, coordinates = place.modulo(self.prime, self.prime)
            missed = on_place(section.form, u, coordinates, self.prime)
            need(not missed, "place-section", "the section misses the place")
            inside = place.points(self.reduction)
        self.reduction.divisor(section, zeros, inside, place.degree if place else 0)
        return section.multiple, zeros

    def element(self, value: Any) -> Row:
        """An element of A, entries reduced."""
        row = integers(value, 0, None, len(self.moduli))
        need(all(a < d for a, d in zip(row, self.moduli)), "not-reduced", "an entry beyond its modulus")
        return row

    def sum(self, terms: Iterable[tuple[int, Row]]) -> Row:
        """A combination of elements of A."""
        total = [0] * len(self.moduli)
        for k, row in terms:
            total = [t + k * a for t, a in zip(total, row)]
        return [t % d for t, d in zip(total, self.moduli)]

    def rest(self, n: int, zeros: Row) -> Row:
        """The class of n U less the zeros."""
        return self.sum([(n, self.unit), *((-1, self.logs[i]) for i in zeros)])

    def vector(self, n: int, zeros: Row) -> Row:
        """n U less some points in the columns (U, base points); the origin is 0."""
        row = [n] + [0] * (self.width - 1)
        self.curve.work.spend(len(zeros) * self.width // 10)
        for i in zeros:
            row = plus(row, self.vectors[i], -1)
        limit(not max(map(abs, row)) >> MAX_BITS, "points far from the base")
        return row

    def learn(self, i: int, log: Row, vector: Row) -> None:
        """Enter a point and its conjugate: the class, and how it is expressed in the columns."""
        self.logs[i], self.vectors[i] = log, vector
        other = self.reduction.conjugate(i)
        if other is not None and other != i:
            self.logs[other], self.vectors[other] = self.rest(1, [i]), self.vector(1, [i])

    def relation(self, n: int, zeros: Row) -> Row:
        """Points that are all known and n U are equivalent: a relation in the columns, checked in A."""
        need(not any(self.rest(n, zeros)), "relation-log", "the logarithms do not satisfy a closing relation")
        return self.vector(n, zeros)

    def certify(self, generators: list[Row], relations: list[Row], counts: int) -> None:
        """A is J(F_v): the logarithms are onto, the relations have index #J(F_v)."""
        v, g, order = self.prime, self.curve.genus, prod(self.moduli)
        image = diagonal(self.moduli)
        for row in generators:
            insert(image, row)
        need(index_of(image) == 1, "not-onto", "the logarithms do not generate the group")
        index = lattice_index(relations, self.width, order, self.curve.work)
        need(index == order, "index", "the index of the relations is not the order of the group")
        need(counts in (0, g), "counts", f"counts is {counts}, expected 0 or {g}")
        if counts == 0:
            need(index < 2 * weil_lower_bound(v, g, self.points), "bound", "a multiple of #J is possible")
        else:
            limit(v**g <= MAX_FIELD, f"a field of more than {MAX_FIELD} elements")
            tower = [self.points] + [extension_points(self.curve, v, i) for i in range(2, g + 1)]
            need(index == jacobian_order(v, g, tower), "order", "the index is not #J(F_v)")

    def log(self, divisor: Divisor) -> Row:
        """The class of a divisor over Q, less its degree times the origin."""
        terms = []
        for k, kind, what in divisor:
            if kind == "point":
                terms.append((k, self.class_of(what)))
            else:
                terms.append((k, self.places[what]) if kind == "closed" else (k * what, self.unit))
        return self.sum(terms)

    def class_of(self, point: Point) -> Row:
        """The class of a rational point."""
        return self.logs[self.reduction.number[self.curve.residue(point, self.prime, self.prime)]]

    def shifted(self, log: Row) -> Vector:
        """The class of iota(P) = d P - B from that of P."""
        return tuple(self.sum([(self.proof.degree, log), (-1, self.log(self.proof.base))]))


# ---- p-adic integrals: the record `padic` --------------------------------------------------------------


class Ball:
    """The vector numerators / p^shift + O(p^precision) over Q_p."""

    def __init__(self, p: int, numerators: Sequence[int], shift: int, precision: int) -> None:
        modulus = p ** max(0, precision + shift)
        self.numerators, self.shift, self.precision = [c % modulus for c in numerators], shift, precision


class Padic:
    """A checked record `padic`: Log of centres, of rational points and of the places over Q.

    Log(D) is the integral of the regular differentials over D - (deg D / deg U) U, so that it is 0 for the
    zeros of a section.
    """

    def __init__(self, proof: Proof, record: dict[str, Any]) -> None:
        p, digits, terms, sections, discs, places, reduction = fields(
            record, "prime", "digits", "terms", "sections", "discs", "places", "reduction")
        self.proof, self.curve, self.prime = proof, proof.curve, prime(p, MAX_PRIME)
        self.digits, length = integer(digits, 1), integer(terms, 2)
        need(self.prime not in proof.padics, "duplicate", f"a second record for {p}")
        bits = self.digits * self.prime.bit_length()
        limit(length <= MAX_TERMS and bits <= MAX_BITS and bits * length <= MAX_SERIES,
              "more terms or digits than this checker handles")
        need(length >= self.digits, "terms", "fewer terms than digits")
        self.series = Series(self.prime**self.digits, length, self.curve.work)
        self.reduced = boolean(reduction)
        if self.reduced:
            proof.group_at(self.prime)
        self.reduction = Reduction(self.curve, self.prime)
        self.discs: dict[int, Disc] = {}
        self.forms: dict[int, list[Row]] = {}
        self.logs: dict[int, Ball] = {}
        self.sections: list[tuple[dict[int, int], Ball]] = []
        for entry in items(sections):
            section = Section(self.curve, entry)
            orders, integrals = self.vanishing(section, set())
            need(sum(orders.values()) == section.multiple * self.curve.unit, "section-zeros",
                 "not all zeros of a section are rational modulo p")
            self.sections.append((orders, self.combine([(1, ball) for ball in integrals.values()])))
        for entry in items(discs):
            self.solve(entry)
        self.places: list[Ball] = []
        for k, entry in enumerate(items(places, len(proof.places))):
            number, form = items(entry, 2)
            need(integer(number) == k, "place-order", "the places are not listed in their order")
            self.places.append(self.place(proof.places[k], Section(self.curve, form)))

    def combine(self, terms: Sequence[tuple[int, Ball]], divisor: int = 1) -> Ball:
        """A combination with integer coefficients, divided by an integer."""
        p, used = self.prime, [(c, ball) for c, ball in terms if c]
        shift = max([ball.shift for _, ball in used], default=0)
        precision = min([ball.precision + valuation(c, p) for c, ball in used], default=self.digits)
        total = [0] * self.curve.genus
        for c, ball in used:
            factor = c * p ** (shift - ball.shift)
            total = [t + factor * a for t, a in zip(total, ball.numerators)]
        e = valuation(divisor, p)
        unit = pow(divisor // p**e, -1, p ** max(1, precision + shift))
        return Ball(p, [t * unit for t in total], shift + e, precision - e)

    # -- discs and sections

    def disc(self, i: int) -> Disc:
        """The expansion of the disc of point i."""
        if i not in self.discs:
            self.discs[i] = Disc(self.curve, self.series, self.prime, self.reduction.points[i])
        return self.discs[i]

    def small_roots(self, series: Row) -> Row:
        """The monic polynomial whose roots are the zeros of the series in the disc (Weierstrass)."""
        ring, p, q = self.series, self.prime, self.series.modulus
        m = next((k for k, c in enumerate(series) if c % p), None)
        if m is None:
            raise Rejected("section-vanishes", "a section vanishes modulo p on a disc")
        need(ring.length >= m * self.digits, "terms", "too few terms for the zeros of a section")
        low, inverse = series[:m], ring.inverse(ring.reduce(series[m:]))
        quotient = inverse
        for _ in range(self.digits):
            rest = ring.product(quotient, low)
            quotient = ring.product(inverse, plus([1], rest[m:], -1))
        rest = ring.product(quotient, low)
        monic = [c % q for c in rest[:m]] + [1]
        need(divide(series, monic, q)[1] == [] and not any(c % p for c in monic[:m]), "roots",
             "the zeros of a section were not separated")
        return monic

    def integral(self, i: int, monic: Row) -> Ball:
        """The integrals from the centre of a disc, summed over the roots of t^m + .. = t^m modulo p.

        The terms are a_{k-1} s_k / k, s_k the sum of the k-th powers of the roots, v(s_k) >= k / m.  Those
        with k <= K = m N are known modulo p^(N - e), p^e <= K < p^(e+1).  The others vanish there: if
        p^(e+j) <= k < p^(e+j+1), j >= 1, then k / m > p^(j-1) N >= N + j - 1, so v(s_k / k) >= N - e.
        """
        p, q, m = self.prime, self.series.modulus, len(monic) - 1
        if not any(monic[:m]):
            return Ball(p, [0] * self.curve.genus, 0, self.digits)
        length, lost = m * self.digits, 0
        while p ** (lost + 1) <= length:
            lost += 1
        self.curve.work.spend(length * (m + self.curve.genus))
        sums: Row = []
        for k in range(1, length + 1):
            total = k * monic[m - k] if k <= m else 0
            total += sum(monic[m - i] * sums[k - 1 - i] for i in range(1, min(k - 1, m) + 1))
            sums.append(-total % q)
        weights = []
        for k, s in enumerate(sums, start=1):
            e = valuation(k, p)
            weights.append(s * p ** (lost - e) * pow(k // p**e, -1, q))
        numerators = [sum(a * b for a, b in zip(form, weights)) for form in self.differentials(i)]
        return Ball(p, numerators, lost, self.digits - lost)

    def differentials(self, i: int) -> list[Row]:
        """The regular differentials in the disc of point i."""
        if i not in self.forms:
            self.forms[i] = self.disc(i).differentials()
        return self.forms[i]

    def vanishing(self, section: Section, apart: set[int]) -> tuple[dict[int, int], dict[int, Ball]]:
        """The order of vanishing on every disc that is not set apart, and the integrals S_c."""
        points = self.reduction.points
        self.curve.work.spend(len(section.form) * (len(points) + 1))
        need(len(apart) < len(points) or section.proper(self.curve, self.prime), "section-vanishes",
             "nothing shows that the section is not 0 modulo p")
        orders, integrals = {}, {}
        for i in sorted(set(range(len(points))) - apart):
            if evaluate(section.form, points[i], self.prime) == 0:
                monic = self.small_roots(self.disc(i).restrict(section.form))
                orders[i], integrals[i] = len(monic) - 1, self.integral(i, monic)
        return orders, integrals

    def solve(self, entry: Any) -> None:
        """n Log(centre) = - sum of k S_c, for a combination of sections that leaves n times this disc."""
        i, n, combination = items(entry, 3)
        integer(i, 0, len(self.reduction.points) - 1)
        need(i not in self.logs and integer(n) != 0, "disc", f"point {i} was treated before, or 0 times it")
        weights: dict[int, int] = {}
        terms = []
        for s, k in (integers(pair, None, None, 2) for pair in items(combination)):
            need(0 <= s < len(self.sections), "disc", f"there is no section {s}")
            orders, total = self.sections[s]
            terms.append((-k, total))
            for c, m in orders.items():
                weights[c] = weights.get(c, 0) + k * m
        need({c: w for c, w in weights.items() if w} == {i: n}, "combination",
             "the combination does not isolate the disc")
        self.logs[i] = self.combine(terms, n)

    def place(self, place: Place, section: Section) -> Ball:
        """Log of a place: minus that of the other zeros of a section, all in discs that the place avoids.

        Modulo p^N the section is one that vanishes on the place.
        """
        p, q = self.prime, self.series.modulus
        u, coordinates = place.modulo(p, q)
        need(place.spans(p, section.multiple), "place-collapses",
             "the place meets itself, or its degree is too large for the section")
        missed = on_place(section.form, u, coordinates, q)
        need(not missed, "place-section", "the section misses the place")
        orders, integrals = self.vanishing(section, set(place.points(self.reduction)))
        rest = section.multiple * self.curve.unit - place.degree
        need(sum(orders.values()) == rest, "section-zeros", "other zeros are irrational or near the place")
        centres = [(-m, self.centre_log(i)) for i, m in orders.items()]
        return self.combine([*centres, *((-1, ball) for ball in integrals.values())])

    # -- logarithms

    def centre_log(self, i: int) -> Ball:
        """Log of the centre of a disc."""
        need(i in self.logs, "disc-missing", f"Log is not given for the disc of point {i}")
        return self.logs[i]

    def log_at(self, i: int, t: int, digits: int) -> Ball:
        """Log of the point with parameter t, known modulo p^digits, in the disc of point i."""
        inside = self.integral(i, [-t % self.series.modulus, 1])
        inside.precision = min(inside.precision, digits)
        return self.combine([(1, self.centre_log(i)), (1, inside)])

    def log_residue(self, point: Point, digits: int) -> Ball:
        """Log of a point given modulo p^digits in normal form."""
        x, y, z = (c % self.prime for c in point)
        i = self.reduction.number[x, y, z]
        return self.log_at(i, self.parameter(self.disc(i), point), min(digits, self.digits))

    def parameter(self, disc: Disc, point: Point) -> int:
        """The parameter of a point in normal form."""
        x, y, z = point
        own = (z, y) if disc.chart == 1 else (x, z) if disc.chart == 2 else (x, y)
        return own[disc.vertical] - disc.centre[disc.vertical]

    def log(self, divisor: Divisor) -> Ball:
        """Log of a divisor over Q."""
        terms: list[tuple[int, Ball]] = []
        for k, kind, what in divisor:
            if kind == "point":
                residue = self.curve.residue(what, self.series.modulus, self.prime)
                terms.append((k, self.log_residue(residue, self.digits)))
            elif kind == "closed":
                terms.append((k, self.places[what]))
        return self.combine(terms)


class Zeros:
    """A checked record `zeros`: where the rational points can lie at p, by zeros of annihilating integrals.

    If e . Log is 0 on J(Q), the function e . (d Log(point t) - Log(B)) on a disc is 0 at rational points.
    With t = p s it is a power series, integral but for the constant, and its zeros in a ball are counted by
    the degree of its reduction there, after division by the largest power of p (Strassman 1928).

    Which e.  The logarithms of the free generators are independent (a minor is not 0), so that, given the
    rank, the generators have finite index, and e is as wanted if e . Log(D_i) = 0 for all i.  An integral e
    with the right entries off the columns of the minor that satisfies this modulo p^M agrees with such an e
    modulo p^(M - s), s the valuation of the minor (Cramer), the logarithms integral and primitive.

    Exactly known: changes of sign of the coordinates in which all exponents of the equation are even act on
    the curve, on J(Q) (x) Q, and by a character on each x^i y^k dx / F_y.  When the logarithms of the r
    generators have components of r characters, the other eigenspaces of J(Q) (x) Q are 0, and the
    differentials of the other characters annihilate.
    """

    def __init__(self, proof: Proof, record: dict[str, Any]) -> None:
        p, pivots, annihilators = fields(record, "prime", "pivots", "annihilators")
        padic, g, r = proof.padics.get(integer(p)), proof.curve.genus, proof.rank
        if padic is None:
            raise Rejected("no-padic", f"no logarithms at {p}")
        need(p not in proof.zeros, "duplicate", f"a second record for {p}")
        self.proof, self.padic, self.prime = proof, padic, padic.prime
        chosen = integers(pivots, 0, g - 1, r)
        need(r < g and chosen == sorted(set(chosen)), "pivots", "no columns for a minor, or none are left")
        logs, known = [], padic.digits
        for log in (padic.log(d) for d in proof.generators[:r]):
            need(log.precision + log.shift > 0 and any(log.numerators), "dependent", "a logarithm may be 0")
            low = min(valuation(c, p) for c in log.numerators if c)
            known = min(known, log.precision + log.shift - low)
            logs.append([c // p**low for c in log.numerators])
        minor = determinant([[row[j] for j in chosen] for row in logs]) % p**known
        need(minor != 0, "dependent", "the logarithms of the generators may be dependent")
        free = [j for j in range(g) if j not in chosen]
        even = [n for n in range(3) if not any(term[n + 1] % 2 for term in proof.curve.form)]
        signs = [tuple(key[n] % 2 for n in even) for key in proof.curve.exponents]
        present = {sign for row in logs for sign, c in zip(signs, row) if c % p**known}
        self.forms: list[Row] = []
        self.exact: list[int | None] = []
        for j, entry in zip(free, items(annihilators, len(free))):
            e = integers(entry, 0, p**padic.digits, g)
            need([e[i] for i in free] == [int(i == j) for i in free], "annihilator", "not in the normal form")
            self.forms.append(e)
            other = len(present) >= r and signs[j] not in present
            self.exact.append(j if sum(e) == 1 and other else None)
        values = [sum(a * b for a, b in zip(e, row)) % p**known for e in self.forms for row in logs]
        self.known = min([known, *(valuation(c, p) for c in values if c)]) - valuation(minor, p)
        need(self.known > 0, "annihilator", "a differential does not annihilate the generators")
        self.origin = padic.log(proof.base)
        here = [c for c in proof.candidates.values() if c.prime == p and c.form != "coefficients"]
        self.deepest = max([c.digits - 1 for c in here], default=3)
        self.bounds: dict[str, int] = {}
        self.central: set[str] = set()
        for i, point in enumerate(padic.reduction.points):
            if point[2] or not proof.integral:
                near = [c for c in here if c.point and tuple(a % p for a in c.point) == point]
                self.disc(i, near)

    def disc(self, i: int, candidates: list[Candidate]) -> None:
        """No rational point in the disc of point i is away from the candidates; how many are near each."""
        p, disc, balls = self.prime, self.padic.disc(i), []
        functions, known = self.functions(i)
        for c in candidates:
            need(c.digits <= self.padic.digits, "terms", "a candidate has more digits than the logarithms")
            t = self.padic.parameter(disc, c.point or (0, 0, 0))
            balls.append((t % p**c.digits // p, c.digits - 1))
        todo = [(functions, 0, 0)]
        while todo:
            here, value, depth = todo.pop()
            if any(n <= depth and (value - v) % p**n == 0 for v, n in balls):
                continue
            leading = self.leading(here, known)
            if any(len(row) == 1 for row in leading):
                continue
            inside = any((value - v) % p**depth == 0 for v, _ in balls)
            need(depth < self.deepest and (inside or bool(leading)), "zeros-open",
                 f"rational points away from the candidates are possible near point {i}")
            self.proof.work.spend(p * sum(map(len, leading)) + p)
            for s in range(p):
                if not any(value_at(row, s, p) for row in leading):
                    inner = [self.moved(f, s, p, known) for f in here]
                    todo.append((inner, value + s * p**depth, depth + 1))
        for c, (value, n) in zip(candidates, balls):
            counts = []
            for f, j in zip(functions, self.exact):
                for row in self.leading([self.moved(f, value, p**n, known)], known):
                    counts.append(len(row) - 1)
                    # an exact form, a multiple of a^m, vanishes so often where a = t = 0
                    if j is not None and not disc.vertical and disc.centre[0] == value == 0:
                        x, _, z = self.proof.curve.exponents[j]
                        if counts[-1] == (z if disc.chart == 1 else x) + 1:
                            self.central.add(c.id)
            if counts:
                self.bounds[c.id] = min(counts)

    def functions(self, i: int) -> tuple[list[Row], int]:
        """The functions in s on a disc, times a power of p, and the precision A of all their coefficients.

        Those beyond the end are 0 modulo p^A: p^k / k is, as k - log_p(k) >= A does not decrease.
        """
        p, degree, padic = self.prime, self.proof.degree, self.padic
        constant = padic.combine([(degree, padic.centre_log(i)), (-1, self.origin)])
        length, shift, numerators, e = padic.series.length, constant.shift, constant.numerators, 0
        while shift > 0 and not any(c % p for c in numerators):
            shift, numerators = shift - 1, [c // p for c in numerators]
        while p ** (e + 1) <= length + 1:
            e += 1
        known = min(constant.precision, padic.digits, length + 1 - e)
        if None in self.exact:
            known = min(known, self.known - shift)
        need(known > 0, "digits", "too few digits to count zeros")
        forms, out, modulus = padic.differentials(i), [], p ** (known + shift)
        self.proof.work.spend(2 * length * self.proof.curve.genus * len(self.forms))
        for vector in self.forms:
            row = [sum(a * b for a, b in zip(vector, numerators))]
            for k in range(1, length + 1):
                v = valuation(k, p)
                value = sum(a * form[k - 1] for a, form in zip(vector, forms)) * degree
                row.append(value * pow(p, k - v + shift, modulus) * pow(k // p**v, -1, modulus))
            out.append(trim(row, modulus))
        return out, known + shift

    def leading(self, functions: list[Row], known: int) -> list[Row]:
        """The reductions of those that are not 0 to the known precision, after division by powers of p."""
        out, p = [], self.prime
        for f in functions:
            low = min((valuation(c, p) for c in f if c), default=known)
            if low < known:
                out.append(trim([c // p**low for c in f], p))
        return out

    def moved(self, f: Row, value: int, factor: int, known: int) -> Row:
        """A function at value + factor s."""
        total: Row = []
        modulus = self.prime**known
        self.proof.work.spend(len(f) ** 2 * (1 + modulus.bit_length() // 600))
        for c in reversed(f):
            total = trim(plus([c], times(total, [value, factor])), modulus)
        return total


# ---- the sieve ---------------------------------------------------------------------------------------


class Condition:
    """A map from L to a product of cyclic groups, and the classes that are allowed there."""

    def __init__(self, moduli: Row, images: list[Row], allowed: list[Vector]) -> None:
        self.moduli, self.images, self.allowed = moduli, images, allowed

    def restricted(self, primes: Iterable[int]) -> Condition:
        """The parts at some primes."""
        known = list(primes)
        sizes = [part(d, known) for d in self.moduli]
        columns = [j for j, m in enumerate(sizes) if m > 1]
        images = [[row[j] % sizes[j] for j in columns] for row in self.images]
        allowed = sorted({tuple(row[j] % sizes[j] for j in columns) for row in self.allowed})
        return Condition([sizes[j] for j in columns], images, allowed)

    def value(self, vector: Sequence[int]) -> Row:
        """The image of a vector of L."""
        total = [0] * len(self.moduli)
        for c, row in zip(vector, self.images):
            if c:
                total = [t + c * a for t, a in zip(total, row)]
        return [t % m for t, m in zip(total, self.moduli)]


class State:
    """A set of classes of L modulo a subgroup K; K by a triangular basis, classes by their remainders."""

    def __init__(self, basis: list[Row], exponent: int, classes: list[Vector]) -> None:
        self.basis, self.exponent, self.classes = basis, exponent, classes


class Table:
    """The images of K in a group, triangular, each row with a vector of K above it; and the kernel."""

    def __init__(self, state: State, condition: Condition, coarse: dict[int, int], work: Work) -> None:
        self.condition, n = condition, len(state.basis)
        self.width = len(condition.moduli)
        whole = lcm(1, *condition.moduli)
        self.exponent = state.exponent * whole
        self.kernel = [[whole * c for c in row] for row in state.basis]
        self.rows = [row + [0] * n for row in diagonal(condition.moduli)]
        added = []
        for ell, e in coarse.items():
            # ell^e times the image of L, in the ell-part alone
            factor = whole // part(whole, [ell]) * ell**e
            added += [[factor * c % m for c, m in zip(row, condition.moduli)] + [0] * n
                      for row in condition.images]
        added += [condition.value(row) + row for row in state.basis]
        work.spend(3 * len(added) * (self.width + n) ** 2 + 20 * len(condition.allowed) * (1 + self.width))
        for row in added:
            left = insert(self.rows, row)[self.width :]
            insert(self.kernel, [c % self.exponent for c in left], self.exponent)
            for i, old in enumerate(self.rows):
                self.rows[i] = old[: self.width] + remainder(self.kernel, old[self.width :])
        self.buckets: dict[Vector, list[Row]] = {}
        for value in condition.allowed:
            key, vector = self.split(list(value), n)
            self.buckets.setdefault(key, []).append(vector)

    def split(self, value: Row, n: int) -> tuple[Vector, Row]:
        """A value as its class modulo the image of K, and minus a vector of K for the difference."""
        row = remainder(self.rows, value + [0] * n)
        return tuple(row[: self.width]), row[self.width :]


def apply(state: State, table: Table, join: bool, work: Work) -> State:
    """Keep the classes with an allowed vector; for a join also refine them."""
    kept: list[Vector] = []
    joined: set[Vector] = set()
    n = len(state.basis)
    for vector in state.classes:
        key, correction = table.split(table.condition.value(vector), n)
        found = table.buckets.get(key, [])
        work.spend(4 * table.width + 4 * n * len(found) if join else 4 * table.width)
        if found:
            kept.append(vector)
        if join:
            for other in found:
                moved = [a + b - c for a, b, c in zip(vector, correction, other)]
                joined.add(tuple(remainder(table.kernel, moved)))
            limit(len(joined) <= MAX_CLASSES, f"more than {MAX_CLASSES} classes")
    if join:
        return State(table.kernel, table.exponent, sorted(joined))
    return State(state.basis, state.exponent, kept)


# ---- the proof ---------------------------------------------------------------------------------------


class Candidate:
    """A candidate of the statement, and its fate once that is known."""

    def __init__(self, p: int, name: str, form: str) -> None:
        self.prime, self.id, self.form = p, name, form
        self.point: Point | None = None
        self.digits, self.multiplicity = 1, 1
        self.coefficients: list[tuple[int, int]] = []
        self.torsion: Row | None = None
        self.verdict, self.sole, self.proved = "", False, False
        self.points: list[Point] = []


STAGES = {"header": 0, "group": 1, "premise": 2, "candidate": 3, "local": 4, "branch": 4, "padic": 4,
          "zeros": 4, "torsion": 4, "saturated": 4, "fate": 5, "classes": 6, "end": 7}
"""The order of the kinds of records; those of stages 2 to 5 may be repeated."""
FURTHER = {"rank": [], "index": ["ell"], "complete": ["prime"], "bound": ["prime", "candidate", "at_most"]}
"""The further keys of premises, by the first word of the id."""


class Proof:
    """Everything that was read and checked, in the order of the log."""

    def __init__(self) -> None:
        self.work = Work()
        self.stage, self.records, self.rank, self.integral = -1, 0, 0, False
        self.curve: Curve
        self.base: Divisor = []
        self.degree = 1
        self.torsion: Row = []
        self.generators: list[Divisor] = []
        self.places: list[Place] = []
        self.premises: dict[str, dict[str, Any]] = {}
        self.candidates: dict[tuple[int, str], Candidate] = {}
        self.names: list[tuple[int, str]] = []
        self.locals: dict[int, Local] = {}
        self.padics: dict[int, Padic] = {}
        self.zeros: dict[int, Zeros] = {}
        self.two_torsion: int | None = None
        self.bounds: dict[int, int] = {}
        self.saturated: list[int] = []
        self.fates: list[Candidate] = []
        self.count: int | None = None
        self.conclusion, self.case, self.program = "", "", ""
        self.points: list[Point] = []
        self.tables: dict[Any, Table] = {}

    def read(self, record: dict[str, Any]) -> None:
        """Check one record; the kinds come in a fixed order."""
        kind = record["kind"]
        if kind not in STAGES:
            raise Malformed("kind", "an unknown kind of record")
        stage = STAGES[kind]
        late = stage < self.stage or (stage == self.stage and stage not in (2, 3, 4, 5))
        need(not late and min(stage, 2) <= self.stage + 1, "order", "a record out of order")
        need(not stage > 2 >= self.stage or "rank" in self.premises, "no-rank", "no premise on the rank")
        need(stage <= 5 or len(self.fates) == len(self.candidates), "fate-missing", "a candidate has no fate")
        self.stage = stage
        getattr(self, f"read_{kind}")(record)
        self.records += 1
        limit(self.records <= MAX_RECORDS, f"more than {MAX_RECORDS} records")

    # -- statement

    def read_header(self, record: dict[str, Any]) -> None:
        """The format and the curve."""
        limit(record.get("format") == FORMAT, f"not the format {FORMAT}")
        _, program, case, equation, weight, genus, scale, variables = fields(
            record, "format", "program", "case", "equation", "weight", "genus", "y_scale", "variables")
        self.program = text(program)
        if type(case) is not dict or list(case) != ["name", "sha256"]:
            raise Malformed("keys", "a case is a name and a digest")
        self.case, digest = text(case["name"]), text(case["sha256"])
        need(re.fullmatch("[0-9a-f]{64}", digest) is not None, "digest", "no SHA-256 digest")
        limit(max(integer(genus, 2), integer(weight, 1) - 1) <= MAX_GENUS, f"a genus above {MAX_GENUS}")
        self.scale = rational(scale)
        need(self.scale != 0, "scale", "a scale 0")
        self.variables = [text(name) for name in items(variables, 3)]
        good = all(re.fullmatch("[A-Za-z][A-Za-z0-9_]{0,30}", name) for name in self.variables)
        need(good and len(set(self.variables)) == 3, "variables", "no names of three variables")
        self.curve = Curve([integers(row) for row in items(equation)], weight, genus, self.work)

    def read_group(self, record: dict[str, Any]) -> None:
        """The base divisor and the generators; whether rational points are asked for, or integral ones."""
        rank, base, free, torsion, integral = fields(record, "rank", "base", "free", "torsion", "integral")
        self.rank = integer(rank, 0)
        self.base, self.degree = self.divisor(base)
        need(1 <= self.degree <= self.curve.unit, "divisor-degree", "a base of degree 0 or above that of U")
        generators = items(free)
        need(len(generators) == self.rank, "rank", "the number of free generators is not the rank")
        for entry in items(torsion):
            order, divisor = items(entry, 2)
            self.torsion.append(integer(order, 2))
            generators = [*generators, divisor]
        limit(len(generators) <= MAX_RANK, f"more than {MAX_RANK} generators")
        for value in generators:
            divisor, degree = self.divisor(value)
            need(degree == 0, "divisor-degree", "a generator of degree other than 0")
            self.generators.append(divisor)
        self.integral = boolean(integral)

    def divisor(self, value: Any) -> tuple[Divisor, int]:
        """A divisor over Q and its degree."""
        out: Divisor = []
        total = 0
        for entry in items(value):
            k, place = items(entry, 2)
            if type(place) is not dict or len(place) != 1:
                raise Malformed("place", "no place")
            ((kind, what),) = place.items()
            if kind == "point":
                out.append((integer(k), kind, self.point_of_curve(what)))
                total += k
            elif kind == "closed":
                out.append((integer(k), kind, self.place(what)))
                total += k * self.places[out[-1][2]].degree
            elif kind == "fibres":
                out.append((integer(k), kind, integer(what)))
                total += self.curve.unit * k * what
            else:
                raise Malformed("place", "an unknown kind of place")
        return out, total

    def place(self, value: Any) -> int:
        """The number of a place; a new one is checked."""
        u, *coordinates = ([rational(c) for c in items(row)] for row in items(value, 4))
        for number, known in enumerate(self.places):
            if (known.u, known.coordinates) == (u, coordinates):
                return number
        limit(len(self.places) < MAX_PLACES, f"more than {MAX_PLACES} places")
        self.places.append(Place(self.curve, u, coordinates))
        return len(self.places) - 1

    def point_of_curve(self, value: Any) -> Point:
        """A rational point of the curve in normal form."""
        x, y, z = integers(value, None, None, 3)
        if self.curve.weight == 1:
            normal = gcd(x, y, z) == 1 and (z > 0 or (z == 0 and (x > 0 or (x == 0 and y == 1))))
        else:
            normal = gcd(x, z) == 1 and (z > 0 or (z == 0 and x == 1))
        need(normal, "point-form", "a point not in normal form")
        on_curve = evaluate(self.curve.form, (x, y, z), 0) == 0
        need(on_curve, "point-off-curve", "a point that is not on the curve")
        return x, y, z

    def answer(self, value: Any) -> Point:
        """A rational point, an integral one where only these are asked for."""
        point = self.point_of_curve(value)
        need(not self.integral or point[2] == 1, "not-integral", "a point that is not integral")
        return point

    def read_premise(self, record: dict[str, Any]) -> None:
        """A premise; what it says follows from its id, the text is for the reader."""
        name = text(record.get("id"))
        word = name.split(" ")[0]
        if word not in FURTHER:
            raise Malformed("premise", "an unknown kind of premise")
        _, statement, source, *values = fields(record, "id", "statement", "source", *FURTHER[word])
        if values:
            values[0] = prime(values[0], MAX_ELL if word == "index" else MAX_PRIME)
        if word == "bound":
            text(values[1])
            integer(values.pop(), 0)
        need(name == " ".join([word, *map(str, values)]), "premise-id", "the id is not that of its values")
        need(name not in self.premises, "duplicate", "a premise occurs twice")
        text(statement)
        text(source)
        self.premises[name] = record

    def read_candidate(self, record: dict[str, Any]) -> None:
        """A candidate of the statement."""
        p, name, form = prime(record.get("prime"), MAX_PRIME), text(record.get("id")), record.get("form")
        new = Candidate(p, name, form if type(form) is str else "")
        need((p, name) not in self.candidates, "duplicate", "a candidate occurs twice")
        need(self.curve.smooth(p), "not-smooth", f"the model is not smooth modulo {p}")
        if form == "point":
            point, digits, k = fields(record, "prime", "id", "form", "point", "digits", "multiplicity")[3:]
            new.digits, new.multiplicity = integer(digits, 1), integer(k, 1)
            limit(new.digits * p.bit_length() <= MAX_BITS, "more digits than this checker handles")
            new.point = self.residue(point, p, new.digits)
        elif form == "disc":
            point, k = fields(record, "prime", "id", "form", "point", "multiplicity")[3:]
            new.point, new.multiplicity = self.residue(point, p, 1), integer(k, 1)
        elif form == "coefficients":
            values, torsion, disc = fields(record, "prime", "id", "form", form, "torsion", "disc")[3:]
            for entry in items(values, self.rank):
                c, digits = integers(entry, 0, None, 2)
                limit(digits * p.bit_length() <= MAX_BITS, "more digits than this checker handles")
                need(c < p**digits, "not-reduced", "a coefficient beyond its digits")
                new.coefficients.append((c, digits))
            if torsion is not None:
                new.torsion = integers(torsion, 0, None, len(self.torsion))
                need(all(e < t for e, t in zip(new.torsion, self.torsion)), "not-reduced", "beyond the order")
            new.point = None if disc is None else self.residue(disc, p, 1)
        else:
            raise Malformed("form", "an unknown form of candidate")
        self.candidates[p, name] = new
        self.names.append((p, name))

    def residue(self, value: Any, p: int, digits: int) -> Point:
        """A point modulo p^digits in normal form."""
        modulus = p**digits
        x, y, z = integers(value, 0, modulus - 1, 3)
        normal = z == 1 or (z % p == 0 and (x == 1 or (x % p == 0 and y == 1)))
        need(normal, "point-form", "a residue not in normal form")
        on_curve = evaluate(self.curve.form, (x, y, z), modulus) == 0
        need(on_curve, "point-off-curve", "a residue that is not on the curve")
        return x, y, z

    # -- evidence

    def read_local(self, record: dict[str, Any]) -> None:
        """A group J(F_v)."""
        new = Local(self, record)
        self.locals[new.prime] = new

    def read_padic(self, record: dict[str, Any]) -> None:
        """Logarithms at p."""
        new = Padic(self, record)
        self.padics[new.prime] = new

    def read_zeros(self, record: dict[str, Any]) -> None:
        """A list is complete at p, given the rank."""
        new = Zeros(self, record)
        self.zeros[new.prime] = new

    def covered(self, p: int) -> bool:
        """Every residue disc at p, or every one with integral points, is a candidate."""
        own = {c.point for c in self.candidates.values() if c.prime == p and c.form == "disc"}
        asked = (x for x in Reduction(self.curve, p).points if x[2] or not self.integral)
        return bool(own) and own.issuperset(asked)

    def proved_bounds(self, candidate: Candidate, points: list[Point]) -> list[int]:
        """Bounds on the number of points near a candidate that these agree with, by premise or proof."""
        p, name, zeros = candidate.prime, candidate.id, self.zeros.get(candidate.prime)
        premise = self.premises.get(f"bound {p} {name}")
        out = [premise["at_most"]] if premise else []
        if zeros and candidate.form != "coefficients" and name in zeros.bounds:
            out.append(zeros.bounds[name])
            x, _, z = points[0]
            if name in zeros.central and len(points) == 1 and (z if z % p == 0 and x % p else x) == 0:
                out.append(1)
        return out

    def group_at(self, v: Any) -> Local:
        """The group J(F_v) of a record with points."""
        local = self.locals.get(integer(v))
        if local is None or local.points == 0:
            raise Rejected("no-local", f"no group at {v}")
        return local

    def read_branch(self, record: dict[str, Any]) -> None:
        """dim J(Q)[2] from irreducible factors of 4 f + h^2 (Mumford 1984, IIIa)."""
        factors, primes = fields(record, "factors", "primes")
        need(self.two_torsion is None, "duplicate", "a second record on the branch points")
        need(self.curve.weight > 1, "branch", "the curve is not of the form y^2 + h y = f")
        total, degrees = [1], []
        need(len(items(factors)) <= len(self.curve.square), "factor", "too many factors")
        for entry in items(factors):
            factor = integers(entry)
            total = times(total, factor)
            need(len(total) <= len(self.curve.square), "factor", "the factors have another product")
            if len(factor) > 1:
                degrees.append(len(factor) - 1)
        need(total == self.curve.square, "factor", "the factors have another product")
        known = [prime(v, MAX_PRIME) for v in items(primes)]
        self.work.spend(10_000 * len(known) * len(factors))
        for factor in (integers(entry) for entry in factors if len(entry) > 2):
            factor = [c // gcd(*factor) for c in factor]
            possible = set(range(1, len(factor) - 1))
            for v in known:
                reduced = trim(factor, v)
                if len(reduced) == len(factor) and squarefree(reduced, v):
                    sums = {0}
                    for d in factor_degrees(reduced, v):
                        sums |= {s + d for s in sums}
                    possible &= sums
            need(not possible, "irreducible", "the primes do not show that a factor is irreducible")
        if sum(degrees) == 2 * self.curve.genus + 1:
            degrees.append(1)
        odd = any(d % 2 for d in degrees)
        need(odd or self.curve.genus % 2 == 0, "branch", "odd genus and no factor of odd degree")
        self.two_torsion = len(degrees) - (2 if odd else 1)

    def read_torsion(self, record: dict[str, Any]) -> None:
        """dim J(Q)[l] <= d: torsion prime to v injects into J(F_v), for v = l too if odd (Katz 1981)."""
        ell, dimension, by = fields(record, "ell", "dimension", "by")
        ell, dimension = prime(ell, MAX_ELL), integer(dimension, 0)
        need(ell not in self.bounds, "duplicate", f"a second bound for {ell}")
        if by == "branch":
            need(ell == 2 and self.two_torsion is not None, "no-branch", "no record on the branch points")
            found = self.two_torsion
        else:
            found = sum(d % ell == 0 for d in self.group_at(by).moduli)
            need(by != 2 or ell != 2, "torsion-two", "2-torsion may vanish modulo 2")
        need(found == dimension, "dimension", f"the dimension is {found}, not {dimension}")
        self.bounds[ell] = dimension

    def read_saturated(self, record: dict[str, Any]) -> None:
        """Z_l (x) L -> Z_l (x) J(Q) is onto: L/lL injects and dim J(Q)/l <= r + dim J(Q)[l] <= dim L/lL."""
        ell, primes = fields(record, "ell", "primes")
        ell = prime(ell, MAX_ELL)
        need(ell not in self.saturated, "duplicate", f"a second record for {ell}")
        need(ell in self.bounds, "no-torsion", f"no bound for the {ell}-torsion")
        places = range(len(self.generators))
        rows = [i for i in places if i < self.rank or self.torsion[i - self.rank] % ell == 0]
        need(self.bounds[ell] <= len(rows) - self.rank, "torsion", f"more {ell}-torsion is possible")
        columns: list[Row] = []
        need(len(set(integers(primes))) == len(primes), "duplicate", "a prime occurs twice")
        self.work.spend(100 * len(primes) * len(rows) ** 2)
        for v in primes:
            local = self.group_at(v)
            images = [local.log(d) for d in self.generators]
            for image, order in zip(images[self.rank :], self.torsion):
                need(not any(order * c % d for c, d in zip(image, local.moduli)), "torsion-order",
                     f"a torsion generator has another order modulo {v}")
            columns += [[images[i][j] % ell for i in rows]
                        for j, d in enumerate(local.moduli) if d % ell == 0]
        # the columns generate F_l^rows exactly if the map from L/lL is injective
        injective = len(independent(columns, ell, len(rows))) == len(rows)
        need(injective, "not-injective", f"a class that is no multiple of {ell} looks like one")
        self.saturated.append(ell)

    # -- conditions and fates

    def allowed_primes(self) -> Row:
        """The primes l for which l-parts may be used."""
        stated = [r["ell"] for r in self.premises.values() if "ell" in r]
        return sorted({*self.saturated, *stated})

    def condition_at(self, v: int) -> Condition:
        """X(F_v) in J(F_v)."""
        local = self.locals.get(v)
        if local is None:
            raise Rejected("no-local", f"no record at {v}")
        if local.points == 0:
            return Condition([], [[] for _ in self.generators], [])
        images = [local.log(d) for d in self.generators]
        allowed = sorted({local.shifted(log) for i, log in local.logs.items()
                          if local.reduction.points[i][2] == 1 or not self.integral})
        return Condition(local.moduli, images, allowed)

    def candidate_condition(self, p: int, candidates: list[Candidate], primes: Row) -> Condition:
        """What candidates at p say about vectors of L: the allowed values, in the order of the candidates."""
        kinds = {c.form == "coefficients" for c in candidates}
        need(len(kinds) == 1, "mixed-list", "the candidates are of different forms, or there are none")
        n = len(self.generators)
        moduli: Row = []
        columns: list[Row] = []
        values: list[Row] = [[] for _ in candidates]
        padic, local = self.padics.get(p), self.locals.get(p)
        with_class = local is not None and local.points > 0 and (padic is None or padic.reduced)
        if True in kinds:
            for i in range(self.rank):
                moduli.append(p ** min(c.coefficients[i][1] for c in candidates))
                columns.append([int(i == j) for j in range(n)])
                values = [row + [c.coefficients[i][0]] for row, c in zip(values, candidates)]
            if all(c.torsion is not None for c in candidates):
                moduli += self.torsion
                columns += [[int(self.rank + i == j) for j in range(n)] for i in range(len(self.torsion))]
                values = [row + (c.torsion or []) for row, c in zip(values, candidates)]
            with_class = local is not None and local.points > 0 and all(c.point for c in candidates)
        elif padic is not None and p in primes:
            logs = [padic.log(d) for d in self.generators]
            base = padic.log(self.base)
            targets = [padic.combine([(self.degree, padic.log_residue(c.point, c.digits)), (-1, base)])
                       for c in candidates if c.point is not None]
            shift = max(ball.shift for ball in logs + targets)
            known = min(ball.precision for ball in logs + targets) + shift
            if known > 0:
                scaled = [[a * p ** (shift - ball.shift) for a in ball.numerators]
                          for ball in logs + targets]
                moduli += [p**known] * self.curve.genus
                columns += [[row[k] for row in scaled[:n]] for k in range(self.curve.genus)]
                values = [row + more for row, more in zip(values, scaled[n:])]
        if with_class and local is not None:
            moduli = moduli + local.moduli
            images = [local.log(d) for d in self.generators]
            columns += [[row[k] for row in images] for k in range(len(local.moduli))]
            numbers = [local.reduction.number[(c.point[0] % p, c.point[1] % p, c.point[2] % p)]
                       for c in candidates if c.point is not None]
            values = [row + list(local.shifted(local.logs[i])) for row, i in zip(values, numbers)]
        rows = [[column[i] for column in columns] for i in range(n)]
        # no integral point reduces to a point at infinity
        near = [not (self.integral and c.point is not None and c.point[2] != 1) for c in candidates]
        return Condition(moduli, rows, [tuple(row) for row, possible in zip(values, near) if possible])

    def whole(self) -> State:
        """The one class of L/L."""
        n = len(self.generators)
        return State(diagonal([1] * n), 1, [(0,) * n])

    def restrict(self, state: State, condition: Condition, join: bool) -> State:
        """Apply a condition in its parts at all allowed primes."""
        table = Table(state, condition.restricted(self.allowed_primes()), {}, self.work)
        return apply(state, table, join, self.work)

    def use(self, state: State, entry: Any) -> State:
        """Apply one use: the condition, the parts with their exponents, join or semijoin."""
        name, parts, how = items(entry, 3)
        if how not in ("join", "semijoin"):
            raise Malformed("use", "neither join nor semijoin")
        if type(parts) is not dict or not all(re.fullmatch("[1-9][0-9]{0,19}", key) for key in parts):
            raise Malformed("use", "no primes with exponents")
        exponents = {int(key): integer(e, 1) for key, e in parts.items()}
        need(list(exponents) == sorted(exponents), "use-order", "the primes are not in order")
        allowed = self.allowed_primes()
        for ell in exponents:
            need(ell in allowed, "not-allowed", f"no record or premise allows the {ell}-part")
        key = (tuple(map(tuple, state.basis)), name, tuple(exponents.items()))
        if key not in self.tables:
            if type(name) is int:
                condition = self.condition_at(name)
            elif text(name).startswith("deep "):
                condition = self.deep_condition(name)
            else:
                condition = self.list_condition(name, list(exponents))
            for ell, e in exponents.items():
                top = max([valuation(d, ell) for d in condition.moduli], default=0)
                need(e <= top, "exponent", f"the group has no elements of order {ell}^{e}")
            if len(self.tables) > 400:
                self.tables.clear()
            self.tables[key] = Table(state, condition.restricted(exponents), exponents, self.work)
        return apply(state, self.tables[key], how == "join", self.work)

    def deep_condition(self, name: str) -> Condition:
        """The points of X modulo q^2: classes in J(F_q) and logarithms, known modulo q^2."""
        if not re.fullmatch("deep [1-9][0-9]{0,6}", name):
            raise Malformed("use", "no condition of this name")
        q, n = int(name[5:]), len(self.generators)
        padic = self.padics.get(q)
        if padic is None:
            raise Rejected("no-padic", f"no logarithms at {q}")
        local, points = self.group_at(q), padic.reduction.points
        allowed = [i for i in range(len(points)) if points[i][2] or not self.integral]
        base = padic.log(self.base)
        balls = [padic.log(d) for d in self.generators]
        balls += [padic.combine([(self.degree, padic.log_at(i, q * k, 2)), (-1, base)])
                  for i in allowed for k in range(q)]
        shift = max(ball.shift for ball in balls)
        known = min(ball.precision for ball in balls) + shift
        need(known > 0, "digits", "too few digits of the logarithms")
        rows = [[a * q ** (shift - ball.shift) % q**known for a in ball.numerators] for ball in balls]
        images = [row + local.log(d) for row, d in zip(rows, self.generators)]
        classes = [local.shifted(local.logs[i]) for i in allowed for _ in range(q)]
        values = {(*row, *found) for row, found in zip(rows[n:], classes)}
        return Condition([q**known] * self.curve.genus + local.moduli, images, sorted(values))

    def list_condition(self, name: str, primes: Row) -> Condition:
        """A complete list at another Chabauty prime."""
        if not re.fullmatch("p = [1-9][0-9]{0,6}", name):
            raise Malformed("use", "no condition of this name")
        q = int(name[4:])
        need(f"complete {q}" in self.premises or q in self.zeros or self.covered(q), "no-complete",
             f"nothing shows that the list at {q} is complete")
        return self.candidate_condition(q, [c for c in self.candidates.values() if c.prime == q], primes)

    def read_fate(self, record: dict[str, Any]) -> None:
        """The verdict on the next candidate."""
        p, name, verdict = integer(record.get("prime")), text(record.get("id")), record.get("verdict")
        waiting = self.names[len(self.fates) : len(self.fates) + 1]
        need((p, name) in waiting, "fate-order", "not the fate of the next one")
        candidate = self.candidates[p, name]
        if verdict == "eliminated":
            uses = items(fields(record, "prime", "id", "verdict", "uses")[3])
            condition = self.candidate_condition(p, [candidate], self.allowed_primes())
            state = self.restrict(self.whole(), condition, True)
            for entry in uses:
                state = self.use(state, entry)
            need(not state.classes, "not-eliminated", f"{len(state.classes)} classes are left")
        elif verdict == "rational":
            points, given, sole = fields(record, "prime", "id", "verdict", "points", "given", "sole")[3:]
            boolean(given)
            candidate.points, candidate.sole = [self.answer(x) for x in items(points)], boolean(sole)
            need(0 < len(set(candidate.points)) == len(points), "points", "no point, or one twice")
            if candidate.sole:
                candidate.proved = len(points) in self.proved_bounds(candidate, candidate.points)
                simple = candidate.form == "point" and candidate.multiplicity == len(points) == 1
                need(simple or candidate.proved, "not-sole", "the disc may hide another point")
            for point in candidate.points:
                self.agrees(candidate, point)
        elif verdict == "open":
            text(fields(record, "prime", "id", "verdict", "reason")[3])
        else:
            raise Malformed("verdict", "an unknown verdict")
        candidate.verdict = verdict
        self.fates.append(candidate)

    def agrees(self, candidate: Candidate, point: Point) -> None:
        """A rational point lies where the candidate says."""
        p, digits = candidate.prime, candidate.digits
        if candidate.point is not None:
            near = self.curve.residue(point, p**digits, p) == candidate.point
            need(near, "point-elsewhere", "the point does not agree with the candidate")
        if candidate.form != "coefficients":
            return
        # the vectors of L that the point can be, as far as the log tells
        state = self.whole()
        for local in self.locals.values():
            images = [local.log(d) for d in self.generators]
            if local.points:
                value = local.shifted(local.class_of(point))
                state = self.restrict(state, Condition(local.moduli, images, [value]), True)
        condition = self.candidate_condition(p, [candidate], self.allowed_primes())
        possible = self.restrict(state, condition, False).classes
        need(bool(possible), "point-elsewhere", "the point does not have the coefficients of the candidate")
        if candidate.sole:
            wanted = [[a % m for a, m in zip(value, condition.moduli)] for value in condition.allowed]
            same = all([condition.value(vector)] == wanted for vector in state.classes)
            need(same and not any(any(condition.value(row)) for row in state.basis), "not-determined",
                 "the log does not determine the coefficients of the point to the digits of the candidate")

    def read_classes(self, record: dict[str, Any]) -> None:
        """The classes of L that satisfy some conditions."""
        uses, count, index, vectors = fields(record, "uses", "count", "index", "vectors")
        state = self.whole()
        for entry in items(uses):
            state = self.use(state, entry)
        need(integer(count) == len(state.classes), "count", f"{len(state.classes)} classes are left")
        need(integer(index) == index_of(state.basis), "index", "another index")
        classes, seen = set(state.classes), set()
        limit(len(items(vectors)) <= 1000, "more than 1000 vectors")
        for entry in vectors:
            vector = tuple(remainder(state.basis, integers(entry, None, None, len(self.generators))))
            need(vector in classes and vector not in seen, "vector", "a vector of no class, or a class twice")
            seen.add(vector)
        self.count = count

    def read_end(self, record: dict[str, Any]) -> None:
        """What the log claims must be what was checked."""
        records, eliminated, conclusion, points = fields(
            record, "records", "eliminated", "conclusion", "points")
        need(integer(records) == self.records, "records", f"{self.records} records come before")
        pairs = [[integer(p), text(name)] for p, name in (items(entry, 2) for entry in items(eliminated))]
        need(pairs == [[c.prime, c.id] for c in self.fates if c.verdict == "eliminated"], "claim",
             "the eliminated candidates are others")
        self.points = [self.answer(x) for x in items(points)]
        need(len(set(self.points)) == len(points), "points", "a point occurs twice")
        claimed = {r["prime"] for k, r in self.premises.items() if k.startswith("complete ")}
        known = []
        at = claimed | {c.prime for c in self.fates} | set(self.zeros)
        for p in sorted(at if conclusion != "none" else ()):
            listing = [c for c in self.fates if c.prime == p]
            decided = all(c.verdict == "eliminated" or (c.verdict == "rational" and c.sole and (
                c.proved or p in claimed)) for c in listing)
            if decided and (p in claimed or p in self.zeros or self.covered(p)):
                known.append({x for c in listing for x in c.points})
        no_points = any(local.points == 0 for local in self.locals.values())
        if conclusion == "points":
            need(set(self.points) in known and bool(points), "conclusion", "the points are not decided")
        elif conclusion == "empty":
            need(self.count == 0 or no_points or set() in known, "conclusion", "emptiness is not shown")
            need(not points, "conclusion", "points of an empty set")
        elif conclusion == "none":
            need(not points, "conclusion", "points without a conclusion")
        else:
            raise Malformed("conclusion", "an unknown conclusion")
        self.conclusion = conclusion


# ---- the verdict in words ----------------------------------------------------------------------------


def polynomial_words(form: Iterable[tuple[int, ...]], names: Sequence[str]) -> str:
    """A polynomial, terms (coefficient, exponents of the variables), as text."""
    out = ""
    for c, *exponents in form:
        power = "*".join(name if e == 1 else f"{name}^{e}" for name, e in zip(names, exponents) if e)
        size = str(abs(c)) if abs(c) != 1 or not power else ""
        sign = (" - " if c < 0 else " + ") if out else ("-" if c < 0 else "")
        out += sign + size + ("*" if size and power else "") + power
    return out or "0"


def equation_words(proof: Proof) -> str:
    """The equation of the curve as text."""
    curve, names = proof.curve, proof.variables
    if curve.weight == 1:
        form = sorted(curve.form, key=lambda term: term[1:], reverse=True)
        return f"{polynomial_words(form, names)} = 0"
    x, y = names[:2]
    f = polynomial_words([(-c, i) for i, c in reversed(list(enumerate(curve.rows[0]))) if c], [x])
    h = polynomial_words([(c, i) for i, c in reversed(list(enumerate(curve.rows[1]))) if c], [x])
    return f"{y}^2" + (f" + ({h})*{y}" if curve.rows[1] else "") + f" = {f}"


def point_words(point: Point) -> str:
    """A point as text."""
    return f"({point[0]} : {point[1]} : {point[2]})"


def premise_words(proof: Proof, name: str) -> str:
    """What a premise says, from its id alone."""
    record, word = proof.premises[name], name.split(" ")[0]
    kind = "integral" if proof.integral else "rational"
    if word == "rank":
        return f"the rank of J(Q) is at most {proof.rank}"
    if word == "index":
        return f"{record['ell']} does not divide the index in J(Q) of the subgroup of the generators"
    if word == "complete":
        return (f"every {kind} point agrees with a candidate of the list at {record['prime']}, and at most "
                "one with each candidate of form point and multiplicity 1")
    where = f"candidate {record['candidate']} at {record['prime']}"
    return f"at most {record['at_most']} {kind} points agree with {where}"


def statement(proof: Proof) -> str:
    """The theorem, true under the premises."""
    kind, points_of = ("integral", "X(Z)") if proof.integral else ("rational", "X(Q)")
    out = [f"X: {equation_words(proof)}, of genus {proof.curve.genus}."]
    if proof.integral:
        out.append("X(Z) are the points ({} : {} : 1) with integer coordinates.".format(*proof.variables))
    dead = [c for c in proof.fates if c.verdict == "eliminated"]
    if dead:
        out.append(f"No {kind} point agrees with the candidates "
                   + ", ".join(f"{c.id} (p = {c.prime})" for c in dead) + ".")
    for c in proof.fates:
        if c.verdict == "rational":
            where = ", ".join(map(point_words, c.points))
            shown = c.sole and (c.proved or f"complete {c.prime}" in proof.premises)
            alone = f", the only {kind} point{'s' * (len(c.points) > 1)} there" if shown else ""
            out.append(f"Candidate {c.id} (p = {c.prime}) agrees with {where}{alone}.")
    for p in sorted(proof.zeros):
        how = "zeros of annihilating integrals are counted"
        where = f"Every {kind} point agrees with a candidate"
        if not any(c.prime == p for c in proof.fates):
            where = f"No {kind} point is in a residue disc"
        out.append(f"{where} at {p}: {how}.")
    if proof.conclusion == "points":
        points = ", ".join(map(point_words, proof.points))
        count = len(proof.points)
        out.append(f"{points_of} has exactly {count} point{'s' * (count > 1)}: {points}.")
    elif proof.conclusion == "empty":
        out.append(f"{points_of} is empty.")
    still = sum(c.verdict == "open" for c in proof.fates)
    if still:
        out.append(f"Candidates that stay open: {still}.")
    if proof.count:
        out.append(f"{points_of} lies in {proof.count} classes of the group of the generators.")
    return " ".join(out)


def report(proof: Proof) -> dict[str, Any]:
    """The verdict as plain data."""
    return {
        "valid": True, "statement": statement(proof),
        "premises": [{"id": name, "statement": premise_words(proof, name), "source": record["source"]}
                     for name, record in proof.premises.items()],
        "eliminated": [{"prime": c.prime, "id": c.id} for c in proof.fates if c.verdict == "eliminated"],
        "conclusion": proof.conclusion, "records": proof.records, "case": proof.case,
        "program": proof.program, "local": sorted(proof.locals), "padic": sorted(proof.padics),
        "zeros": sorted(proof.zeros), "saturated": sorted(proof.saturated),
    }


def lines_of(stream: BinaryIO) -> Iterator[bytes]:
    """The lines of a log without their newlines."""
    total = 0
    while line := stream.readline(MAX_LINE + 2):
        total += len(line)
        if len(line) > MAX_LINE + 1 or total > MAX_FILE:
            raise Declined(f"a line beyond {MAX_LINE} bytes or a file beyond {MAX_FILE}")
        if not line.endswith(b"\n"):
            raise Malformed("cut", "the last line has no end")
        yield line[:-1]


def check(stream: BinaryIO) -> Proof:
    """Check a log; returns only if it is accepted.

    Raises `Malformed` or `Rejected`, with line, record and reason code, or `Declined`.
    """
    proof = Proof()
    number, kind = 0, ""
    try:
        lines = lines_of(stream)
        while True:
            number, kind = number + 1, ""
            line = next(lines, None)
            if line is None:
                break
            record = decode(line)
            kind = record["kind"]
            proof.read(record)
        if proof.stage != STAGES["end"]:
            raise Malformed("no-end", "the log has no end")
    except Fault as fault:
        fault.line, fault.record = number, kind if re.fullmatch("[a-z]{1,20}", kind) else ""
        raise
    except Declined as reason:
        raise Declined(f"line {number}: {reason}") from None
    return proof


def complain(place: str, found: str, expected: str) -> int:
    """One line on standard error; returns the exit code."""
    sys.stderr.write(f"sieve: error: {place}: {found}, expected {expected}\n")
    return 2


def run(path: str, as_json: bool) -> int:
    """Check a file and print the verdict; returns the exit code."""
    try:
        with open(path, "rb") as stream:
            proof = check(stream)
    except Fault as fault:
        verdict = "malformed" if isinstance(fault, Malformed) else "rejected"
        if as_json:
            print(json.dumps({"valid": False, "verdict": verdict, "line": fault.line, "record": fault.record,
                              "code": fault.code, "reason": fault.reason}))
        else:
            record = f"record {fault.record}, " if fault.record else ""
            print(f"{verdict}: line {fault.line}, {record}{fault.code}: {fault.reason}")
        return 3
    except Declined as reason:
        return complain(path, f"{reason}: declined", "a log within the limits")
    except OSError as error:
        return complain(path, str(error.strerror), "a readable proof log")
    except (ArithmeticError, LookupError, MemoryError, TypeError, ValueError) as error:
        # never an acceptance: something that this program should have refused by name
        return complain(path, type(error).__name__, "a valid log")
    result = report(proof)
    if as_json:
        print(json.dumps(result))
        return 0
    print(f"accepted: {result['records']} records checked\n\nStatement\n  {result['statement']}\n\nPremises")
    for premise in result["premises"]:
        print(f"  {premise['id']}: {premise['statement']}\n    source: {premise['source']}")
    print(f"\nChecked\n  J(F_v) at v = {', '.join(map(str, result['local'])) or 'no prime'}")
    print(f"  integrals at p = {', '.join(map(str, result['padic'])) or 'no prime'}")
    print(f"  saturation at l = {', '.join(map(str, result['saturated'])) or 'no prime'}")
    return 0


def main(arguments: list[str]) -> int:
    """The command line."""
    paths = [a for a in arguments if a != "--json"]
    if len(paths) != 1:
        return complain("command line", f"{len(paths)} files", "checker.py PROOF [--json]")
    for output in (sys.stdout, sys.stderr):
        output.reconfigure(encoding="utf-8", errors="backslashreplace")  # type: ignore[union-attr]
    try:
        code = run(paths[0], "--json" in arguments)
        sys.stdout.flush()
    except OSError as error:
        # nobody saw the verdict, so it is none; what is left in the buffer must not be written at exit
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return complain("standard output", str(error.strerror), "somebody who reads it")
    return code


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
