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
import sys
import unicodedata
from collections.abc import Callable, Iterable, Iterator, Sequence
from fractions import Fraction
from math import gcd, isqrt, lcm, prod
from typing import Any, BinaryIO

Row = list[int]
Vector = tuple[int, ...]
Point = tuple[int, int, int]

FORMAT = "sieve-proof/1"
MAX_LINE, MAX_FILE, MAX_DEPTH, MAX_DIGITS = 4_000_000, 400_000_000, 8, 4000
MAX_RECORDS, MAX_CLASSES, MAX_PRIME, MAX_ELL = 50_000, 400_000, 2**20, 2**64
MAX_GENUS, MAX_RANK, MAX_BASE, MAX_TERMS, MAX_BITS, MAX_FIELD = 12, 60, 400, 5000, 4000, 200_000
MAX_SECTION, MAX_PLACES, MAX_HEIGHT, MAX_SERIES = 100, 100, 200_000, 400_000
MAX_WORK = 3 * 10**9
"""Elementary steps, about a microsecond each."""


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
        if self.done > MAX_WORK:
            raise Declined("more work than this checker does")


def need(holds: bool, code: str, reason: str) -> None:
    """Reject the record unless the side condition holds."""
    if not holds:
        raise Rejected(code, reason)


# ---- text to values ----------------------------------------------------------------------------------


def _integer_token(token: str) -> int:
    if len(token) > MAX_DIGITS:
        raise Declined(f"an integer of more than {MAX_DIGITS} digits")
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
            if depth > MAX_DEPTH:
                raise Declined(f"nesting deeper than {MAX_DEPTH}")
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


def section(value: Any, low: int | None = None, high: int | None = None) -> Row:
    """The coefficients of a section."""
    if len(items(value)) > MAX_SECTION:
        raise Declined(f"a section with more than {MAX_SECTION} coefficients")
    return integers(value, low, high)


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
    odd, twos = n - 1, 0
    while odd % 2 == 0:
        odd, twos = odd // 2, twos + 1
    for base in bases:
        power = pow(base, odd, n)
        if power in (1, n - 1):
            continue
        for _ in range(twos - 1):
            power = power * power % n
            if power == n - 1:
                break
        else:
            return False
    return True


def prime(value: Any, bound: int) -> int:
    """A prime below the bound."""
    integer(value, 2)
    if value >= bound:
        raise Declined(f"a prime beyond {bound}")
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
    """Coefficients modulo the modulus, low degree first, without trailing zeros."""
    out = [c % modulus for c in a]
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
    """Quotient and remainder by b, whose leading coefficient is a unit."""
    rest, inverse = [c % modulus for c in a], pow(b[-1], -1, modulus)
    quotient = [0] * max(0, len(a) - len(b) + 1)
    for i in reversed(range(len(quotient))):
        quotient[i] = rest[i + len(b) - 1] * inverse % modulus
        for j, c in enumerate(b):
            rest[i + j] = (rest[i + j] - quotient[i] * c) % modulus
    return quotient, trim(rest, modulus)


def common(a: Row, b: Row, v: int) -> Row:
    """A greatest common divisor over F_v."""
    while b:
        a, b = b, divide(a, b, v)[1]
    return a


def derivative(a: Sequence[int]) -> Row:
    """The derivative."""
    return [i * c for i, c in enumerate(a)][1:]


def squarefree(a: Row, v: int) -> bool:
    """Is the polynomial over F_v, not 0, prime to its derivative?"""
    return len(common(a, trim(derivative(a), v), v)) == 1


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


# ---- lattices ----------------------------------------------------------------------------------------


def insert(basis: list[Row], row: Row, modulus: int = 0) -> Row:
    """Add a row to a lattice given by rows with positive pivots on the diagonal; returns what is left.

    The rest is zero in the columns that have a pivot.  With a modulus, a multiple of the exponent of the
    quotient, entries are kept small.
    """
    for j, pivot in enumerate(basis):
        a, b = pivot[j], row[j]
        if b % a == 0:
            quotient = b // a
            row = [x - quotient * y for x, y in zip(row, pivot)] if quotient else row
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


def lattice_index(rows: list[Row], width: int, work: Work) -> int:
    """The index in Z^width of the lattice that the rows span; 0 for infinite index."""
    work.spend(width**2 * (width + len(rows)) // 4)
    q = 2**61 - 1
    rows = sorted(rows, key=lambda row: (sum(map(abs, row)), row))
    chosen: list[Row] = []
    reduced: list[tuple[int, Row]] = []
    for row in rows:
        image = [c % q for c in row]
        for place, known in reduced:
            if image[place]:
                factor = image[place]
                image = [(x - factor * y) % q for x, y in zip(image, known)]
        first = next((i for i, c in enumerate(image) if c), None)
        if first is not None:
            inverse = pow(image[first], -1, q)
            reduced.append((first, [c * inverse % q for c in image]))
            chosen.append(row)
    if len(chosen) < width:
        return 0
    multiple = determinant(chosen)
    basis = diagonal([multiple] * width)
    for row in rows:
        insert(basis, row, multiple)
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


# ---- the curve ---------------------------------------------------------------------------------------


class Curve:
    """y^2 + h(x) y = f(x) over Q, integer coefficients."""

    def __init__(self, f: Row, h: Row, genus: int) -> None:
        self.f, self.h, self.genus = f, h, genus
        self.square = times(h, h)
        self.square = plus(self.square, f, 4)
        while self.square and self.square[-1] == 0:
            self.square.pop()
        need(not (f and f[-1] == 0) and not (h and h[-1] == 0), "trailing-zero", "a leading coefficient 0")
        need(len(f) <= 2 * genus + 3 and len(h) <= genus + 2, "degree", "f or h of too large a degree")
        need(len(self.square) in (2 * genus + 2, 2 * genus + 3), "genus", "4 f + h^2 has another degree")
        self.full_f = f + [0] * (2 * genus + 3 - len(f))
        self.full_h = h + [0] * (genus + 2 - len(h))
        small = (v for v in range(3, 10_000, 2) if is_prime(v) and self.square[-1] % v)
        need(any(squarefree(trim(self.square, v), v) for v in small), "singular",
             "no prime below 10000 shows that 4 f + h^2 is squarefree")

    def smooth(self, v: int) -> bool:
        """Is the model smooth over F_v?"""
        g = self.genus
        if v > 2:
            square = trim(self.square, v)
            return len(square) >= 2 * g + 2 and squarefree(square, v)
        # v = 2: singular where h(x) = 0 and h'(x) y = f'(x); y^2 = f(x) there
        f, h = trim(self.f, 2), trim(self.h, 2)
        df, dh = trim(derivative(f), 2), trim(derivative(h), 2)
        test = trim(plus(times(times(dh, dh), f), times(df, df), -1), 2)
        if len(common(h, test, 2)) != 1:
            return False
        lead = self.full_h[g] * self.full_f[2 * g + 2] - self.full_f[2 * g + 1]
        return self.full_h[g + 1] % 2 == 1 or lead % 2 == 1

    def contains(self, point: Point, modulus: int = 0) -> bool:
        """Is the point with weighted coordinates on the curve (modulo the modulus)?"""
        x, y, z = point
        top = 2 * self.genus + 2
        left = y * y + sum(c * x**i * z ** (self.genus + 1 - i) for i, c in enumerate(self.full_h)) * y
        value = left - sum(c * x**i * z ** (top - i) for i, c in enumerate(self.full_f))
        return value % modulus == 0 if modulus else value == 0

    def residue(self, point: Point, modulus: int, p: int) -> Point:
        """A rational point modulo a power of p in the normal form (x, y, 1) or (1, s, z), p | z."""
        x, y, z = point
        scale = pow(z if z % p else x, -1, modulus)
        y = y * scale ** (self.genus + 1) % modulus
        return (x * scale % modulus, y, 1) if z % p else (1, y, z * scale % modulus)


class Reduction:
    """The points of the curve over F_v in their numbering, and their conjugates."""

    def __init__(self, curve: Curve, v: int, work: Work) -> None:
        need(curve.smooth(v), "not-smooth", f"the model is not smooth modulo {v}")
        work.spend(v * (curve.genus + 2))
        self.curve, self.prime = curve, v
        self.f, self.h = [c % v for c in curve.full_f], [c % v for c in curve.full_h]
        top = (self.h[-1], self.f[-1])
        roots: dict[int, Row] = {}
        for root in range(v):
            roots.setdefault(root * root % v, []).append(root)

        def fibre(h: int, f: int) -> Row:
            """The solutions of y^2 + h y = f."""
            if v == 2:
                return [y for y in (0, 1) if (y * y + h * y - f) % 2 == 0]
            return sorted((root - h) * (v + 1) // 2 % v for root in roots.get((h * h + 4 * f) % v, ()))

        self.points: list[Point] = []
        for x in range(v):
            ys = fibre(value_at(self.h, x, v), value_at(self.f, x, v))
            self.points += [(x, y, 1) for y in ys]
        self.points += [(1, s, 0) for s in fibre(*top)]
        self.number = {point: i for i, point in enumerate(self.points)}

    def conjugate(self, i: int) -> int:
        """The number of the conjugate point."""
        x, y, z = self.points[i]
        h = value_at(self.h, x, self.prime) if z else self.h[-1]
        return self.number[(x, (-y - h) % self.prime, z)]

    def zeros(self, c: Row, zeros: Row, u: Row) -> int:
        """Check that the zeros of y - c(x) are the divisor (u, c) and the points given; returns m."""
        v, g = self.prime, self.curve.genus
        c = trim(c, v)
        m = max(len(c) - 1, g + 1)
        norm = trim(plus(plus(times(c, c), times(self.h, c)), self.f, -1), v)
        rest = divide(norm, u, v)[0]
        need(zeros == sorted(zeros), "zeros-order", "the zeros are not sorted")
        need(len(zeros) == 2 * m - len(u) + 1, "zeros-count", f"{len(zeros)} zeros, the degree is {2 * m}")
        infinite = 2 * m + 1 - len(norm)
        for i in zeros:
            need(0 <= i < len(self.points), "zero-number", f"no point has number {i}")
            x, y, z = self.points[i]
            if z == 0:
                need(m == g + 1 and y == (c[m] if len(c) > m else 0), "zero", f"point {i} is no zero")
                infinite -= 1
            else:
                need(value_at(c, x, v) == y, "zero", f"point {i} is no zero of the section")
                rest, left = divide(rest, [-x, 1], v)
                need(not left, "zero-multiplicity", f"point {i} is no zero of this multiplicity")
        need(infinite == 0, "zeros-infinity", "a wrong number of zeros at infinity")
        return m


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


def field_tables(v: int, degree: int) -> tuple[Row, Row]:
    """Powers of a generator of F_{v^degree}, degree >= 2, as codes (base v digits); logarithms of codes."""
    size = v**degree
    for tail in range(1, size):
        low = [tail // v**i % v for i in range(degree)]
        powers, element = [1], [0, 1] + [0] * (degree - 2)
        while element[0] != 1 or any(element[1:]):
            powers.append(sum(c * v**i for i, c in enumerate(element)))
            if powers[-1] == 0 or len(powers) == size:
                break
            top = element[-1]
            element = [(a - top * c) % v for a, c in zip([0, *element[:-1]], low)]
        if len(powers) == size - 1 and powers[-1]:
            logs = [-1] * size
            for i, code in enumerate(powers):
                logs[code] = i
            return powers, logs
    raise Rejected("field", f"no field of order {size} was found")


def extension_points(reduction: Reduction, degree: int, work: Work) -> int:
    """#X(F_{v^degree}), from tables of powers and of the logarithms of 1 + x (Zech)."""
    v = reduction.prime
    size = v**degree
    work.spend(size * (reduction.curve.genus + 2) * 2)
    powers, logs = field_tables(v, degree)
    order = size - 1
    zech = [logs[code - v + 1 if code % v == v - 1 else code + 1] for code in powers]

    def add(a: int, b: int) -> int:
        """The logarithm of a sum; -1 stands for 0."""
        if a < 0 or b < 0:
            return max(a, b)
        c = zech[(a - b) % order]
        return -1 if c < 0 else (b + c) % order

    def evaluate(coefficients: Row, x: int) -> int:
        total = -1
        for c in reversed(coefficients):
            total = add((total + x) % order if total >= 0 and x >= 0 else -1, logs[c % v])
        return total

    def solutions(h: int, f: int) -> int:
        """The number of y with y^2 + h y = f; arguments are logarithms."""
        if v > 2:
            square = add(2 * h % order if h >= 0 else -1, (f + logs[4 % v]) % order if f >= 0 else -1)
            return 1 if square < 0 else 2 * (square % 2 == 0)
        if h < 0:
            return 1
        return 2 * ((f - 2 * h) % order in traceless if f >= 0 else 1)

    traceless = {add(2 * z % order, z) for z in range(order)} if v == 2 else set()
    affine = sum(solutions(evaluate(reduction.h, x), evaluate(reduction.f, x)) for x in range(-1, order))
    return affine + solutions(logs[reduction.h[-1]], logs[reduction.f[-1]])


def jacobian_order(v: int, g: int, counts: Row) -> int:
    """#J(F_v) from the numbers of points over the first g extensions (Newton's identities)."""
    a = [1] + [0] * (2 * g)
    for k in range(1, g + 1):
        a[k] = sum((counts[j - 1] - v**j - 1) * a[k - j] for j in range(1, k + 1)) // k
    for k in range(g):
        a[2 * g - k] = v ** (g - k) * a[k]
    return sum(a)


# ---- divisors ----------------------------------------------------------------------------------------


class Mumford:
    """The effective divisor u(x) = 0, y = w(x) over Q."""

    def __init__(self, curve: Curve, u: list[Fraction], w: list[Fraction]) -> None:
        need(len(u) > 1 and u[-1] == 1, "place-monic", "u is not monic of positive degree")
        need(len(w) < len(u) and not (w and w[-1] == 0), "place-degree", "w has no smaller degree than u")
        self.u, self.w, self.degree = u, w, len(u) - 1
        scale = lcm(*(c.denominator for c in u + w))
        size = max(c.numerator.bit_length() for c in u + w) + scale.bit_length()
        if size * (self.degree + 2 * curve.genus) > MAX_HEIGHT:
            raise Declined("a place of too large a height or degree")
        # with x = X / scale all is integral
        top = 2 * curve.genus + 2
        big_u = [int(c * scale ** (self.degree - i)) for i, c in enumerate(u)]
        big_w = [int(c * scale ** (curve.genus + 1 + self.degree) / scale**i) for i, c in enumerate(w)]
        extra = scale**self.degree
        big_h = [c * scale ** (curve.genus + 1 - i) * extra for i, c in enumerate(curve.full_h)]
        big_f = [c * scale ** (top - i) * extra**2 for i, c in enumerate(curve.full_f)]
        norm = plus(plus(times(big_w, big_w), times(big_h, big_w)), big_f, -1)
        for i in reversed(range(self.degree, len(norm))):
            lead = norm[i]
            for j, c in enumerate(big_u):
                norm[i - self.degree + j] -= lead * c
        need(not any(norm), "place-off-curve", "u does not divide w^2 + h w - f")

    def modulo(self, p: int, modulus: int) -> tuple[Row, Row]:
        """u and w modulo a power of p."""
        denominators = lcm(*(c.denominator for c in self.u + self.w))
        need(denominators % p != 0, "place-denominator", f"a place has a denominator divisible by {p}")
        u, w = ([c.numerator * pow(c.denominator, -1, modulus) % modulus for c in a]
                for a in (self.u, self.w))
        return u, w


Divisor = list[tuple[int, str, Any]]
"""Triples (multiplicity, "point", point), (.., "mumford", number of the place), (.., "fibres", how many)."""


# ---- J(F_v) from sections: the record `local` ---------------------------------------------------------


class Local:
    """A checked record `local`: the class of every point of X(F_v) and of the places over Q."""

    def __init__(self, proof: Proof, record: dict[str, Any]) -> None:
        v, invariants, origin, unit, base, define, close, mumford, counts = fields(
            record, "prime", "invariants", "origin", "unit", "base", "define", "close", "mumford", "counts")
        self.prime = prime(v, MAX_PRIME)
        need(self.prime not in proof.locals, "duplicate", f"a second record for {v}")
        self.reduction = Reduction(proof.curve, self.prime, proof.work)
        self.moduli = integers(invariants, 2)
        need(len(self.moduli) <= 2 * proof.curve.genus, "invariants", "more than 2 g invariants")
        self.points, self.unit = len(self.reduction.points), [0] * len(self.moduli)
        self.logs: dict[int, Row] = {}
        self.places: list[Row] = []
        if self.points == 0:
            empty = origin is None and counts == 0 and type(counts) is int
            empty = empty and all(x == [] for x in (invariants, unit, base, define, close, mumford))
            need(empty, "empty-record", "there is no point modulo the prime, and the record claims more")
            return
        # a character of J(F_v) constant on X(F_v) has a sum of N terms and an L-polynomial of degree 2 g - 2
        need(self.points**2 > (2 * proof.curve.genus - 2) ** 2 * self.prime, "generation",
             "too few points to generate the group")
        reduced = [place.modulo(self.prime, self.prime) for place in proof.places]
        need(all(b % a == 0 for a, b in zip(self.moduli, self.moduli[1:])), "invariants",
             "the invariants do not divide each other")
        self.unit = self.element(unit)
        self.column: dict[int, int | tuple[int, Row]] = {}
        self.vectors: dict[int, Row] = {}
        self.learn(integer(origin, 0, self.points - 1), [0] * len(self.moduli), 0)
        if len(items(base)) > MAX_BASE:
            raise Declined(f"more than {MAX_BASE} base points")
        self.width = 1 + len(base)
        for k, entry in enumerate(base, start=1):
            i, log = items(entry, 2)
            need(integer(i, 0, self.points - 1) not in self.logs, "base", f"base point {i} is known before")
            self.learn(i, self.element(log), k)
        for entry in items(define):
            self.define(*items(entry, 2))
        need(len(self.logs) == self.points, "undefined-point", "some point of X(F_v) has no class")
        relations = [self.relation(*items(entry, 2)) for entry in items(close)]
        for i in range(self.points):
            if self.reduction.conjugate(i) == i:
                need(not any(self.sum([(2, self.logs[i]), (-1, self.unit)])), "relation-log",
                     "the logarithms do not satisfy 2 P = U")
                relations.append(plus([2 * c for c in self.vector(i)], [1], -1))
        self.certify(relations, proof, integer(counts))
        for k, entry in enumerate(items(mumford, len(proof.places))):
            number, c, zeros = items(entry, 3)
            need(integer(number) == k, "place-order", "the places are not listed in their order")
            u, w = reduced[k]
            c, zeros = section(c, 0, self.prime - 1), integers(zeros)
            missed = divide(plus(c, w, -1), u, self.prime)[1]
            need(not missed, "place-section", "the section misses the place")
            m = self.reduction.zeros(c, zeros, u)
            self.places.append(self.sum([(m, self.unit), *((-1, self.logs[i]) for i in zeros)]))

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

    def learn(self, i: int, log: Row, origin: int | tuple[int, Row]) -> None:
        """Enter a point and its conjugate: the class, and how it is expressed in the columns."""
        other = self.reduction.conjugate(i)
        self.logs[i], self.column[i] = log, origin
        if other != i:
            self.logs[other], self.column[other] = self.sum([(1, self.unit), (-1, log)]), (1, [i])

    def define(self, c: Any, zeros: Any) -> None:
        """A section with one unknown zero defines its class."""
        c, zeros = section(c, 0, self.prime - 1), integers(zeros)
        m = self.reduction.zeros(c, zeros, [1])
        unknown = [i for i in zeros if i not in self.logs]
        need(len(unknown) == 1, "define", f"{len(unknown)} unknown zeros, expected 1")
        known = [i for i in zeros if i in self.logs]
        log = self.sum([(m, self.unit), *((-1, self.logs[i]) for i in known)])
        self.learn(unknown[0], log, (m, known))

    def vector(self, i: int) -> Row:
        """A point in the columns (U, base points); the origin is 0."""
        todo = [i]
        while todo:
            j, origin = todo[-1], self.column[todo[-1]]
            if type(origin) is int:
                self.vectors[j] = [int(origin == k > 0) for k in range(self.width)]
            elif type(origin) is tuple:
                m, known = origin
                missing = [k for k in known if k not in self.vectors]
                if missing:
                    todo += missing
                    continue
                row = [m] + [0] * (self.width - 1)
                for k in known:
                    row = [a - b for a, b in zip(row, self.vectors[k])]
                self.vectors[j] = row
                if max(map(abs, row)) >> MAX_BITS:
                    raise Declined("points far from the base")
            todo.pop()
        return self.vectors[i]

    def relation(self, c: Any, zeros: Any) -> Row:
        """A section whose zeros are all known: a relation, checked in A."""
        c, zeros = section(c, 0, self.prime - 1), integers(zeros)
        m = self.reduction.zeros(c, zeros, [1])
        log = self.sum([(-m, self.unit), *((1, self.logs[i]) for i in zeros)])
        need(not any(log), "relation-log", "the logarithms do not satisfy a closing relation")
        row = [-m] + [0] * (self.width - 1)
        for i in zeros:
            row = [a + b for a, b in zip(row, self.vector(i))]
        return row

    def certify(self, relations: list[Row], proof: Proof, counts: int) -> None:
        """A is J(F_v): the logarithms are onto, the relations have index #J(F_v)."""
        v, g, order = self.prime, proof.curve.genus, prod(self.moduli)
        image = diagonal(self.moduli)
        for row in [self.unit, *(self.logs[i] for i, k in self.column.items() if type(k) is int)]:
            insert(image, row)
        need(index_of(image) == 1, "not-onto", "the logarithms do not generate the group")
        index = lattice_index(relations, self.width, proof.work)
        need(index == order, "index", "the index of the relations is not the order of the group")
        need(counts in (0, g), "counts", f"counts is {counts}, expected 0 or {g}")
        if counts == 0:
            need(index < 2 * weil_lower_bound(v, g, self.points), "bound", "a multiple of #J is possible")
        else:
            if v**g > MAX_FIELD:
                raise Declined(f"a field of more than {MAX_FIELD} elements")
            tower = [self.points] + [extension_points(self.reduction, i, proof.work) for i in range(2, g + 1)]
            need(index == jacobian_order(v, g, tower), "order", "the index is not #J(F_v)")

    def log(self, divisor: Divisor, proof: Proof) -> Row:
        """The class of a divisor over Q, less its degree times the origin."""
        terms = []
        for k, kind, what in divisor:
            if kind == "point":
                terms.append((k, self.class_of(what, proof)))
            elif kind == "mumford":
                terms.append((k, self.places[what]))
            elif kind == "fibres":
                terms.append((k * what, self.unit))
        return self.sum(terms)

    def class_of(self, point: Point, proof: Proof) -> Row:
        """The class of a rational point."""
        return self.logs[self.reduction.number[proof.curve.residue(point, self.prime, self.prime)]]

    def shifted(self, log: Row, proof: Proof) -> Vector:
        """The class of iota(P) = d P - B from that of P."""
        return tuple(self.sum([(proof.degree, log), (-1, self.log(proof.base, proof))]))


# ---- p-adic integrals: the record `padic` --------------------------------------------------------------


class Ball:
    """The vector numerators / p^shift + O(p^precision) over Q_p."""

    def __init__(self, p: int, numerators: Sequence[int], shift: int, precision: int) -> None:
        modulus = p ** max(0, precision + shift)
        self.numerators, self.shift, self.precision = [c % modulus for c in numerators], shift, precision


class Disc:
    """A residue disc: chart coordinates a, b and differentials as series in the parameter.

    Affine: a = x, b = y; at infinity a = 1/x, b = y/x^(g+1).  The parameter is a - a0, or b - b0 where 2 b +
    h(a) vanishes modulo p (ramified).
    """

    def __init__(self, padic: Padic, point: Point) -> None:
        self.padic, p, q, length = padic, padic.prime, padic.modulus, padic.terms
        f, h = padic.proof.curve.full_f, padic.proof.curve.full_h
        self.infinite = point[2] == 0
        self.f, self.h = (f[::-1], h[::-1]) if self.infinite else (f, h)
        a0, b0 = (0, point[1]) if self.infinite else (point[0], point[1])
        df, dh = derivative(self.f), derivative(self.h)
        self.ramified = (2 * b0 + value_at(self.h, a0, p)) % p == 0
        if self.ramified and p > 2:
            # the centre is a Weierstrass point
            square = plus(times(self.h, self.h), self.f, 4)
            slope = derivative(square)
            for _ in range(q.bit_length()):
                a0 = (a0 - value_at(square, a0, q) * pow(value_at(slope, a0, q), -1, q)) % q
            b0 = -value_at(self.h, a0, q) * pow(2, -1, q) % q
        variable = [0, 1] + [0] * (length - 2)
        constant = [0] * (length - 1)
        self.a, self.b = [a0, *constant], [b0, *constant]
        moving = self.b if self.ramified else self.a
        moving[:] = plus(moving, variable)
        start = value_at(dh, a0, p) * b0 - value_at(df, a0, p) if self.ramified else 2 * b0 + value_at(
            self.h, a0, p)
        inverse = [pow(start, -1, p), *constant]
        one = [1, *constant]
        # Newton's iteration for the other coordinate and for the inverse of the slope; both are verified
        for _ in range(q.bit_length() + length.bit_length() + 2):
            ha, fa = padic.compose(self.h, self.a), padic.compose(self.f, self.a)
            value = padic.reduce(plus(padic.product(self.b, plus(self.b, ha)), fa, -1))
            if self.ramified:
                slope_series = padic.product(padic.compose(dh, self.a), self.b)
                slope_series = plus(slope_series, padic.compose(df, self.a), -1)
            else:
                slope_series = plus(ha, self.b, 2)
            check = padic.product(slope_series, inverse)
            if not any(value) and check == one:
                break
            inverse = padic.product(inverse, padic.reduce(plus([2, *constant], check, -1)))
            step = padic.reduce(padic.product(value, inverse))
            if self.ramified:
                self.a = padic.reduce(plus(self.a, step, -1))
            else:
                self.b = padic.reduce(plus(self.b, step, -1))
        else:
            raise Rejected("expansion", "a residue disc was not expanded")
        self.centre = (self.a[0], self.b[0])
        # dx / (2 y + h), or - db over the derivative of the equation by a
        first = padic.reduce([-c for c in inverse]) if self.ramified else inverse
        self.forms = [first]
        for _ in range(1, padic.proof.curve.genus):
            self.forms.append(padic.product(self.forms[-1], self.a))
        if self.infinite:
            self.forms = [padic.reduce([-c for c in form]) for form in reversed(self.forms)]

    def section(self, even: Row, odd: Row, m: int) -> Row:
        """even(x) + odd(x) y, at infinity divided by x^m, as a series."""
        if self.infinite:
            even = (even + [0] * (m + 1 - len(even)))[::-1]
            odd = (odd + [0] * (m - self.padic.proof.curve.genus - len(odd)))[::-1]
        left = self.padic.compose(even, self.a)
        return self.padic.reduce(plus(left, self.padic.product(self.padic.compose(odd, self.a), self.b)))

    def small_roots(self, series: Row) -> Row:
        """The monic polynomial whose roots are the zeros of the series in the disc (Weierstrass)."""
        padic, p, q = self.padic, self.padic.prime, self.padic.modulus
        m = next((k for k, c in enumerate(series) if c % p), None)
        if m is None:
            raise Rejected("section-vanishes", "a section vanishes modulo p on a disc")
        need(padic.terms >= m * padic.digits, "terms", "too few terms for the zeros of a section")
        low, high = series[:m], series[m:] + [0] * m
        inverse = padic.inverse(high)
        quotient = inverse
        for _ in range(padic.digits):
            rest = padic.product(quotient, low + [0] * (padic.terms - m))
            quotient = padic.product(inverse, plus([1], rest[m:] + [0] * m, -1))
        rest = padic.product(quotient, low + [0] * (padic.terms - m))
        monic = [c % q for c in rest[:m]] + [1]
        need(divide(series, monic, q)[1] == [] and not any(c % p for c in monic[:m]), "roots",
             "the zeros of a section were not separated")
        return monic

    def integral(self, monic: Row) -> Ball:
        """The integrals from the centre, summed over the roots of a polynomial t^m + .. = t^m modulo p.

        The terms are a_{k-1} s_k / k, s_k the sum of the k-th powers of the roots, v(s_k) >= k / m.  Those
        with k <= K = m N are known modulo p^(N - e), p^e <= K < p^(e+1).  The others vanish there: if
        p^(e+j) <= k < p^(e+j+1), j >= 1, then k / m > p^(j-1) N >= N + j - 1, so v(s_k / k) >= N - e.
        """
        padic, p, q, m = self.padic, self.padic.prime, self.padic.modulus, len(monic) - 1
        g = padic.proof.curve.genus
        if not any(monic[:m]):
            return Ball(p, [0] * g, 0, padic.digits)
        length, lost = m * padic.digits, 0
        need(length <= padic.terms, "terms", f"{padic.terms} terms, more are needed for {m} zeros")
        while p ** (lost + 1) <= length:
            lost += 1
        sums: Row = []
        for k in range(1, length + 1):
            total = k * monic[m - k] if k <= m else 0
            total += sum(monic[m - i] * sums[k - 1 - i] for i in range(1, min(k - 1, m) + 1))
            sums.append(-total % q)
        weights = []
        for k, s in enumerate(sums, start=1):
            e = valuation(k, p)
            weights.append(s * p ** (lost - e) * pow(k // p**e, -1, q))
        numerators = [sum(a * b for a, b in zip(form, weights)) for form in self.forms]
        return Ball(p, numerators, lost, padic.digits - lost)


class Padic:
    """A checked record `padic`: Log of centres, of rational points and of the places over Q.

    Log(P) is half the integral from the conjugate of P to P; Log of the zeros of a section is 0.
    """

    def __init__(self, proof: Proof, record: dict[str, Any]) -> None:
        p, digits, terms, sections, discs, mumford, reduction = fields(
            record, "prime", "digits", "terms", "sections", "discs", "mumford", "reduction")
        self.prime = prime(p, MAX_PRIME)
        self.digits, self.terms = integer(digits, 1), integer(terms, 2)
        need(self.prime not in proof.padics, "duplicate", f"a second record for {p}")
        bits = self.digits * self.prime.bit_length()
        if self.terms > MAX_TERMS or bits > MAX_BITS or bits * self.terms > MAX_SERIES:
            raise Declined("more terms or digits than this checker handles")
        self.proof, self.modulus = proof, self.prime**self.digits
        self.width = (2 * self.modulus.bit_length() + self.terms.bit_length() + 8) // 8
        self.reduced = boolean(reduction)
        if self.reduced:
            local = proof.locals.get(self.prime)
            need(local is not None and local.points > 0, "no-local", f"no group at {p}")
        self.reduction = Reduction(proof.curve, self.prime, proof.work)
        self.known: dict[int, Disc] = {}
        self.logs: dict[int, Ball] = {}
        self.sections = [self.section(*(section(c) for c in items(entry, 2))) for entry in items(sections)]
        totals = [self.total(*section[:2]) for section in self.sections]
        for entry in items(discs):
            self.solve(entry, totals)
        self.places: list[Ball | None] = [None] * len(proof.places)
        given = [integer(items(entry, 3)[0], 0, len(proof.places) - 1) for entry in items(mumford)]
        need(given == sorted(set(given)), "place-order", "the places are not listed in their order")
        sources = {k: (section(even), section(odd)) for k, even, odd in mumford}
        for k in range(len(proof.places)):
            self.places[k] = self.place(proof.places[k], sources.get(k))

    # -- series modulo (p^N, t^T)

    def reduce(self, a: Row) -> Row:
        """Coefficients modulo p^N, T of them."""
        return [c % self.modulus for c in a[: self.terms]]

    def product(self, a: Sequence[int], b: Sequence[int]) -> Row:
        """The product, through one product of large integers (Kronecker)."""
        w, q, length = self.width, self.modulus, self.terms
        self.proof.work.spend(length + int((length * w / 60) ** 1.6))
        x, y = (int.from_bytes(b"".join((c % q).to_bytes(w, "little") for c in s), "little") for s in (a, b))
        packed = (x * y).to_bytes(w * (len(a) + len(b) + 1), "little")
        return [int.from_bytes(packed[i * w : (i + 1) * w], "little") % q for i in range(length)]

    def compose(self, coefficients: Row, series: Row) -> Row:
        """A polynomial at a series."""
        total = [0] * self.terms
        for c in reversed(coefficients):
            total = self.product(total, series)
            total[0] = (total[0] + c) % self.modulus
        return total

    def inverse(self, a: Row) -> Row:
        """The inverse of a series with a unit constant term."""
        out = [pow(a[0], -1, self.modulus)] + [0] * (self.terms - 1)
        for _ in range(self.terms.bit_length()):
            out = self.product(out, self.reduce(plus([2], self.product(a, out), -1)))
        return out

    def combine(self, terms: Sequence[tuple[int, Ball]], divisor: int = 1) -> Ball:
        """A combination with integer coefficients, divided by an integer."""
        p, used = self.prime, [(c, ball) for c, ball in terms if c]
        shift = max([ball.shift for _, ball in used], default=0)
        precision = min([ball.precision + valuation(c, p) for c, ball in used], default=self.digits)
        total = [0] * self.proof.curve.genus
        for c, ball in used:
            factor = c * p ** (shift - ball.shift)
            total = [t + factor * a for t, a in zip(total, ball.numerators)]
        e = valuation(divisor, p)
        unit = pow(divisor // p**e, -1, p ** max(1, precision + shift))
        return Ball(p, [t * unit for t in total], shift + e, precision - e)

    # -- discs and sections

    def disc(self, i: int) -> Disc:
        """The expansion of the disc of point i."""
        if i not in self.known:
            self.known[i] = Disc(self, self.reduction.points[i])
        return self.known[i]

    def section(self, even: Row, odd: Row) -> tuple[dict[int, int], dict[int, Ball], int]:
        """The order of vanishing on every disc, the integrals S_c, and what is missing to the degree."""
        orders, integrals, missing = self.vanishing(even, odd)
        need(missing == 0, "section-zeros", "not all zeros of a section are rational modulo p")
        return orders, integrals, missing

    def vanishing(self, even: Row, odd: Row) -> tuple[dict[int, int], dict[int, Ball], int]:
        """As `section`, for sections with other zeros too."""
        p, g = self.prime, self.proof.curve.genus
        m = multiple(even, odd, g)
        even, odd = even[: m + 1], odd[: max(0, m - g)]
        orders, integrals = {}, {}
        for i, (x, y, z) in enumerate(self.reduction.points):
            if z:
                value = value_at(even, x, p) + value_at(odd, x, p) * y
            else:
                value = sum(even[m:]) + sum(odd[max(0, m - g - 1) :]) * y
            if value % p == 0:
                monic = self.disc(i).small_roots(self.disc(i).section(even, odd, m))
                orders[i], integrals[i] = len(monic) - 1, self.disc(i).integral(monic)
        return orders, integrals, 2 * m - sum(orders.values())

    def total(self, orders: dict[int, int], integrals: dict[int, Ball]) -> Ball:
        """The sum of the S_c and of the known m_c Log(centre c), c ramified."""
        terms = [(1, ball) for ball in integrals.values()]
        terms += [(m, self.centre_log(i)) for i, m in orders.items() if self.disc(i).ramified]
        return self.combine(terms)

    def centre_log(self, i: int) -> Ball:
        """Log of the centre of a disc."""
        if i not in self.logs and self.disc(i).ramified:
            # half the integral from the conjugate of the centre; 0 at a Weierstrass point
            a, b = self.disc(i).centre
            t = (-2 * b - value_at(self.disc(i).h, a, self.modulus)) % self.modulus
            self.logs[i] = self.combine([(-1, self.disc(i).integral([-t % self.modulus, 1]))], 2)
        need(i in self.logs, "disc-missing", f"Log is not given for the disc of point {i}")
        return self.logs[i]

    def solve(self, entry: Any, totals: list[Ball]) -> None:
        """n Log(centre) = minus a combination of the known parts of sections."""
        i, n, combination = items(entry, 3)
        integer(i, 0, len(self.reduction.points) - 1)
        other = self.reduction.conjugate(i)
        need(other != i and i not in self.logs, "disc", f"point {i} is ramified or was treated before")
        need(integer(n) != 0, "disc", "a multiple 0")
        weights: dict[int, int] = {}
        used = []
        for s, k in (integers(pair, None, None, 2) for pair in items(combination)):
            need(0 <= s < len(totals) and s not in used, "disc", f"section {s} is missing or occurs twice")
            used.append(s)
            for c, m in self.sections[s][0].items():
                conjugate = self.reduction.conjugate(c)
                weights[c] = weights.get(c, 0) + k * m
                weights[conjugate] = weights.get(conjugate, 0) - k * m
        wanted = {i: n, other: -n}
        need({c: w for c, w in weights.items() if w} == wanted, "combination",
             "the combination does not isolate the disc")
        self.logs[i] = self.combine([(-k, totals[s]) for s, k in combination], n)
        self.logs[other] = self.combine([(-1, self.logs[i])])

    # -- logarithms

    def log_at(self, i: int, t: int, digits: int) -> Ball:
        """Log of the point with parameter t, known modulo p^digits, in the disc of point i."""
        inside = self.disc(i).integral([-t % self.modulus, 1])
        inside.precision = min(inside.precision, digits)
        ball = self.combine([(1, self.centre_log(i)), (1, inside)])
        return Ball(self.prime, ball.numerators, ball.shift, ball.precision)

    def log_residue(self, point: Point, digits: int) -> Ball:
        """Log of a point given modulo p^digits in normal form."""
        p, (x, y, z) = self.prime, point
        i = self.reduction.number[(x % p, y % p, 1) if z == 1 else (1, y % p, 0)]
        a, b = (x, y) if z == 1 else (z, y)
        centre = self.disc(i).centre
        t = b - centre[1] if self.disc(i).ramified else a - centre[0]
        return self.log_at(i, t, min(digits, self.digits))

    def place(self, place: Mumford, source: tuple[Row, Row] | None) -> Ball:
        """Log of a place: minus the logarithms of the other zeros of a section through it."""
        p, q = self.prime, self.modulus
        u, w = place.modulo(p, q)
        inside: dict[int, int] = {}
        rest = [c % p for c in u]
        for x in range(p):
            while value_at(rest, x, p) == 0:
                i = self.reduction.number[(x, value_at(w, x, p), 1)]
                inside[i], rest = inside.get(i, 0) + 1, divide(rest, [-x, 1], p)[0]
        terms: list[tuple[int, Ball]] = []
        if source is None:
            need(len(rest) == 1, "place-missing", "no section through a place with irrational points")
            orders: dict[int, int] = {}
        else:
            even, odd = source
            need(place.degree <= multiple(even, odd, self.proof.curve.genus) + 1, "place-section",
                 "a section of too small a degree for the place")
            missed = divide(plus(even, times(odd, w)), u, q)[1]
            need(not missed, "place-section", "the section misses the place")
            orders, integrals, missing = self.vanishing(even, odd)
            need(missing == len(rest) - 1, "section-zeros", "the section has other irrational zeros")
        for i in sorted({*orders, *inside}):
            if source is not None and orders.get(i, 0) == inside.get(i, 0):
                continue
            if i in orders:
                terms += [(-1, integrals[i]), (-orders[i], self.centre_log(i))]
            if i in inside:
                need(not self.disc(i).ramified, "place-ramified", "a place meets a ramified disc")
                shifted = [0] * self.terms
                for c in reversed(u):
                    shifted = plus([c], plus([0, *shifted], shifted, self.disc(i).centre[0]))[: self.terms]
                monic = self.disc(i).small_roots(self.reduce(shifted))
                need(len(monic) - 1 == inside[i], "place-roots", "the points of a place were not separated")
                terms += [(1, self.disc(i).integral(monic)), (inside[i], self.centre_log(i))]
        return self.combine(terms)

    def log(self, divisor: Divisor) -> Ball:
        """Log of a divisor over Q."""
        terms: list[tuple[int, Ball]] = []
        for k, kind, what in divisor:
            if kind == "point":
                residue = self.proof.curve.residue(what, self.modulus, self.prime)
                terms.append((k, self.log_residue(residue, self.digits)))
            elif kind == "mumford":
                terms.append((k, self.places[what] or self.combine([])))
        return self.combine(terms)


def multiple(even: Row, odd: Row, g: int) -> int:
    """The least m for which even(x) + odd(x) y is a section of m U."""
    degrees = [i for i, c in enumerate(even) if c] + [i + g + 1 for i, c in enumerate(odd) if c]
    need(bool(degrees), "section", "a section is 0")
    return max(degrees)


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
            if len(joined) > MAX_CLASSES:
                raise Declined(f"more than {MAX_CLASSES} classes")
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
        self.verdict, self.sole = "", False
        self.points: list[Point] = []


class Proof:
    """Everything that was read and checked, in the order of the log."""

    ORDER = ("header", "group", "premise", "candidate", "evidence", "fate", "classes", "end")

    def __init__(self) -> None:
        self.work = Work()
        self.stage, self.records, self.rank = -1, 0, 0
        self.curve: Curve
        self.base: Divisor = []
        self.degree = 1
        self.torsion: Row = []
        self.generators: list[Divisor] = []
        self.places: list[Mumford] = []
        self.premises: dict[str, dict[str, Any]] = {}
        self.candidates: dict[tuple[int, str], Candidate] = {}
        self.names: list[tuple[int, str]] = []
        self.locals: dict[int, Local] = {}
        self.padics: dict[int, Padic] = {}
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
        handlers: dict[str, tuple[str, Callable[[dict[str, Any]], None]]] = {
            "header": ("header", self.header), "group": ("group", self.group),
            "premise": ("premise", self.premise), "candidate": ("candidate", self.candidate),
            "local": ("evidence", self.local), "branch": ("evidence", self.branch),
            "padic": ("evidence", self.padic), "torsion": ("evidence", self.torsion_bound),
            "saturated": ("evidence", self.saturate), "fate": ("fate", self.fate),
            "classes": ("classes", self.surviving), "end": ("end", self.end),
        }
        if record["kind"] not in handlers:
            raise Malformed("kind", "an unknown kind of record")
        name, handler = handlers[record["kind"]]
        stage = self.ORDER.index(name)
        repeats = name in ("premise", "candidate", "evidence", "fate")
        late = stage < self.stage or (stage == self.stage and not repeats)
        need(not late and min(stage, 2) <= self.stage + 1, "order", "a record out of order")
        if stage > 2 >= self.stage:
            need("rank" in self.premises, "no-rank", "no premise on the rank")
        if stage > 5:
            need(len(self.fates) == len(self.candidates), "fate-missing", "a candidate has no fate")
        self.stage = stage
        handler(record)
        self.records += 1
        if self.records > MAX_RECORDS:
            raise Declined(f"more than {MAX_RECORDS} records")

    # -- statement

    def header(self, record: dict[str, Any]) -> None:
        """The format and the curve."""
        if record.get("format") != FORMAT:
            raise Declined(f"not the format {FORMAT}")
        _, program, case, f, h, genus, scale = fields(
            record, "format", "program", "case", "f", "h", "genus", "y_scale")
        self.program = text(program)
        if type(case) is not dict or list(case) != ["name", "sha256"]:
            raise Malformed("keys", "a case is a name and a digest")
        self.case, digest = text(case["name"]), text(case["sha256"])
        need(re.fullmatch("[0-9a-f]{64}", digest) is not None, "digest", "no SHA-256 digest")
        if integer(genus, 2) > MAX_GENUS:
            raise Declined(f"a genus above {MAX_GENUS}")
        self.scale = rational(scale)
        need(self.scale != 0, "scale", "a scale 0")
        self.curve = Curve(integers(f), integers(h), genus)

    def group(self, record: dict[str, Any]) -> None:
        """The base divisor and the generators."""
        rank, base, free, torsion = fields(record, "rank", "base", "free", "torsion")
        self.rank = integer(rank, 0)
        self.base = self.divisor(base, None)
        self.generators = [self.divisor(d, 0) for d in items(free)]
        need(len(self.generators) == self.rank, "rank", "the number of free generators is not the rank")
        for entry in items(torsion):
            order, divisor = items(entry, 2)
            self.torsion.append(integer(order, 2))
            self.generators.append(self.divisor(divisor, 0))
        if len(self.generators) > MAX_RANK:
            raise Declined(f"more than {MAX_RANK} generators")

    def divisor(self, value: Any, degree: int | None) -> Divisor:
        """A divisor over Q of the given degree; None for the base, of degree 1 or 2."""
        out: Divisor = []
        total = 0
        for entry in items(value):
            k, place = items(entry, 2)
            if type(place) is not dict or len(place) != 1:
                raise Malformed("place", "no place")
            ((kind, what),) = place.items()
            if kind == "point":
                out.append((integer(k), kind, self.rational_point(what)))
                total += k
            elif kind == "mumford":
                u, w = ([rational(c) for c in items(a)] for a in items(what, 2))
                same = (i for i, known in enumerate(self.places) if (known.u, known.w) == (u, w))
                number = next(same, None)
                if number is None:
                    number = len(self.places)
                    if number == MAX_PLACES:
                        raise Declined(f"more than {MAX_PLACES} places")
                    self.places.append(Mumford(self.curve, u, w))
                out.append((integer(k), kind, number))
                total += k * (len(u) - 1)
            elif kind == "fibres":
                out.append((integer(k), kind, integer(what)))
                total += 2 * k * what
            else:
                raise Malformed("place", "an unknown kind of place")
        if degree is None:
            need(total in (1, 2), "divisor-degree", "a base of another degree than 1 or 2")
            self.degree = total
        else:
            need(total == degree, "divisor-degree", "a generator of degree other than 0")
        return out

    def rational_point(self, value: Any) -> Point:
        """A rational point of the curve in normal form."""
        x, y, z = integers(value, None, None, 3)
        need(gcd(x, z) == 1 and (z > 0 or (z == 0 and x == 1)), "point-form", "a point not in normal form")
        need(self.curve.contains((x, y, z)), "point-off-curve", "a point that is not on the curve")
        return x, y, z

    def premise(self, record: dict[str, Any]) -> None:
        """A premise; what it says follows from its id, the text is for the reader."""
        name = text(record.get("id"))
        word = name.split(" ")[0]
        if word == "rank":
            fields(record, "id", "statement", "source")
            expected = "rank"
        elif word == "index":
            ell = prime(fields(record, "id", "statement", "source", "ell")[3], MAX_ELL)
            expected = f"index {ell}"
        elif word == "complete":
            p = prime(fields(record, "id", "statement", "source", "prime")[3], MAX_PRIME)
            expected = f"complete {p}"
        elif word == "bound":
            extra = fields(record, "id", "statement", "source", "prime", "candidate", "at_most")[3:]
            expected = f"bound {prime(extra[0], MAX_PRIME)} {text(extra[1])}"
            integer(extra[2], 0)
        else:
            raise Malformed("premise", "an unknown kind of premise")
        need(name == expected, "premise-id", f"the id is not {expected}")
        need(name not in self.premises, "duplicate", "a premise occurs twice")
        text(record["statement"])
        text(record["source"])
        self.premises[name] = record

    def candidate(self, record: dict[str, Any]) -> None:
        """A candidate of the statement."""
        p, name, form = prime(record.get("prime"), MAX_PRIME), text(record.get("id")), record.get("form")
        new = Candidate(p, name, form if type(form) is str else "")
        need((p, name) not in self.candidates, "duplicate", "a candidate occurs twice")
        need(self.curve.smooth(p), "not-smooth", f"the model is not smooth modulo {p}")
        if form == "point":
            names = ("point", "digits", "multiplicity")
            point, digits, k = fields(record, "prime", "id", "form", *names)[3:]
            new.digits, new.multiplicity = integer(digits, 1), integer(k, 1)
            if new.digits * p.bit_length() > MAX_BITS:
                raise Declined("more digits than this checker handles")
            new.point = self.residue(point, p, new.digits)
        elif form == "disc":
            point, k = fields(record, "prime", "id", "form", "point", "multiplicity")[3:]
            new.point, new.multiplicity = self.residue(point, p, 1), integer(k, 1)
        elif form == "coefficients":
            names = ("coefficients", "torsion", "disc")
            values, torsion, disc = fields(record, "prime", "id", "form", *names)[3:]
            for entry in items(values, self.rank):
                c, digits = integers(entry, 0, None, 2)
                if digits * p.bit_length() > MAX_BITS:
                    raise Declined("more digits than this checker handles")
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
        need(z == 1 or (x == 1 and z % p == 0), "point-form", "a residue not in normal form")
        need(self.curve.contains((x, y, z), modulus), "point-off-curve", "a residue that is not on the curve")
        return x, y, z

    # -- evidence

    def local(self, record: dict[str, Any]) -> None:
        """A group J(F_v)."""
        new = Local(self, record)
        self.locals[new.prime] = new

    def padic(self, record: dict[str, Any]) -> None:
        """Logarithms at p."""
        new = Padic(self, record)
        self.padics[new.prime] = new

    def branch(self, record: dict[str, Any]) -> None:
        """dim J(Q)[2] from irreducible factors of 4 f + h^2 (Mumford 1984, IIIa)."""
        factors, primes = fields(record, "factors", "primes")
        need(self.two_torsion is None, "duplicate", "a second record on the branch points")
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

    def torsion_bound(self, record: dict[str, Any]) -> None:
        """dim J(Q)[l] <= d: torsion prime to v injects into J(F_v), for v = l too if odd (Katz 1981)."""
        ell, dimension, by = fields(record, "ell", "dimension", "by")
        ell, dimension = prime(ell, MAX_ELL), integer(dimension, 0)
        need(ell not in self.bounds, "duplicate", f"a second bound for {ell}")
        if by == "branch":
            need(ell == 2 and self.two_torsion is not None, "no-branch", "no record on the branch points")
            found = self.two_torsion
        else:
            local = self.locals.get(integer(by))
            need(local is not None and local.points > 0, "no-local", f"no group at {by}")
            need(by != 2 or ell != 2, "torsion-two", "2-torsion may vanish modulo 2")
            found = sum(d % ell == 0 for d in local.moduli) if local else None
        need(found == dimension, "dimension", f"the dimension is {found}, not {dimension}")
        self.bounds[ell] = dimension

    def saturate(self, record: dict[str, Any]) -> None:
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
            local = self.locals.get(v)
            if local is None or local.points == 0:
                raise Rejected("no-local", f"no group at {v}")
            images = [local.log(d, self) for d in self.generators]
            for image, order in zip(images[self.rank :], self.torsion):
                need(not any(order * c % d for c, d in zip(image, local.moduli)), "torsion-order",
                     f"a torsion generator has another order modulo {v}")
            columns += [[images[i][j] % ell for i in rows]
                        for j, d in enumerate(local.moduli) if d % ell == 0]
        basis = diagonal([ell] * len(rows))
        for column in columns:
            insert(basis, column, ell)
        # the columns generate F_l^rows exactly if the map from L/lL is injective
        need(index_of(basis) == 1, "not-injective", f"a class that is no multiple of {ell} looks like one")
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
        images = [local.log(d, self) for d in self.generators]
        allowed = sorted({local.shifted(log, self) for log in local.logs.values()})
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
            images = [local.log(d, self) for d in self.generators]
            columns += [[row[k] for row in images] for k in range(len(local.moduli))]
            numbers = [local.reduction.number[(c.point[0] % p, c.point[1] % p, c.point[2] % p)]
                       for c in candidates if c.point is not None]
            values = [row + list(local.shifted(local.logs[i], self)) for row, i in zip(values, numbers)]
        rows = [[column[i] for column in columns] for i in range(n)]
        return Condition(moduli, rows, [tuple(row) for row in values])

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
            else:
                condition = self.list_condition(text(name), list(exponents))
            for ell, e in exponents.items():
                top = max([valuation(d, ell) for d in condition.moduli], default=0)
                need(e <= top, "exponent", f"the group has no elements of order {ell}^{e}")
            if len(self.tables) > 400:
                self.tables.clear()
            self.tables[key] = Table(state, condition.restricted(exponents), exponents, self.work)
        return apply(state, self.tables[key], how == "join", self.work)

    def list_condition(self, name: str, primes: Row) -> Condition:
        """A complete list at another Chabauty prime."""
        match = re.fullmatch("p = ([1-9][0-9]{0,6})", name)
        if match is None:
            raise Malformed("use", "no condition of this name")
        q = int(match.group(1))
        need(f"complete {q}" in self.premises, "no-complete", f"no premise that the list at {q} is complete")
        return self.candidate_condition(q, [c for c in self.candidates.values() if c.prime == q], primes)

    def fate(self, record: dict[str, Any]) -> None:
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
            candidate.points, candidate.sole = [self.rational_point(x) for x in items(points)], boolean(sole)
            need(0 < len(set(candidate.points)) == len(points), "points", "no point, or one twice")
            if candidate.sole:
                bound = self.premises.get(f"bound {p} {name}", {}).get("at_most") == 1
                simple = candidate.form == "point" and candidate.multiplicity == 1
                need(len(points) == 1 and (simple or bound), "not-sole", "the disc may hide a second point")
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
            images = [local.log(d, self) for d in self.generators]
            if local.points:
                value = local.shifted(local.class_of(point, self), self)
                state = self.restrict(state, Condition(local.moduli, images, [value]), True)
        condition = self.candidate_condition(p, [candidate], self.allowed_primes())
        possible = self.restrict(state, condition, False).classes
        need(bool(possible), "point-elsewhere", "the point does not have the coefficients of the candidate")
        if candidate.sole:
            wanted = [[a % m for a, m in zip(value, condition.moduli)] for value in condition.allowed]
            same = all([condition.value(vector)] == wanted for vector in state.classes)
            need(same and not any(any(condition.value(row)) for row in state.basis), "not-determined",
                 "the log does not determine the coefficients of the point to the digits of the candidate")

    def surviving(self, record: dict[str, Any]) -> None:
        """The classes of L that satisfy some conditions."""
        uses, count, index, vectors = fields(record, "uses", "count", "index", "vectors")
        state = self.whole()
        for entry in items(uses):
            state = self.use(state, entry)
        need(integer(count) == len(state.classes), "count", f"{len(state.classes)} classes are left")
        need(integer(index) == index_of(state.basis), "index", "another index")
        classes, seen = set(state.classes), set()
        if len(items(vectors)) > 1000:
            raise Declined("more than 1000 vectors")
        for entry in vectors:
            vector = tuple(remainder(state.basis, integers(entry, None, None, len(self.generators))))
            need(vector in classes and vector not in seen, "vector", "a vector of no class, or a class twice")
            seen.add(vector)
        self.count = count

    def end(self, record: dict[str, Any]) -> None:
        """What the log claims must be what was checked."""
        records, eliminated, conclusion, points = fields(
            record, "records", "eliminated", "conclusion", "points")
        need(integer(records) == self.records, "records", f"{self.records} records come before")
        pairs = [[integer(p), text(name)] for p, name in (items(entry, 2) for entry in items(eliminated))]
        need(pairs == [[c.prime, c.id] for c in self.fates if c.verdict == "eliminated"], "claim",
             "the eliminated candidates are others")
        self.points = [self.rational_point(x) for x in items(points)]
        need(len(set(self.points)) == len(points), "points", "a point occurs twice")
        lists = [[c for c in self.fates if f"complete {p}" in self.premises and c.prime == p]
                 for p in sorted({r["prime"] for k, r in self.premises.items() if k.startswith("complete ")})]
        decided = [listing for listing in lists
                   if all(c.verdict == "eliminated" or (c.verdict == "rational" and c.sole) for c in listing)]
        known = [{x for c in listing for x in c.points} for listing in decided]
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


def polynomial_words(coefficients: Row) -> str:
    """A polynomial in x as text."""
    out = ""
    for i, c in reversed(list(enumerate(coefficients))):
        if c:
            power = "" if i == 0 else "x" if i == 1 else f"x^{i}"
            size = str(abs(c)) if abs(c) != 1 or i == 0 else ""
            sign = (" - " if c < 0 else " + ") if out else ("-" if c < 0 else "")
            out += sign + size + ("*" if size and power else "") + power
    return out or "0"


def point_words(point: Point) -> str:
    """A point as text."""
    return f"({point[0]} : {point[1]} : {point[2]})"


def premise_words(proof: Proof, name: str) -> str:
    """What a premise says, from its id alone."""
    record, word = proof.premises[name], name.split(" ")[0]
    if word == "rank":
        return f"the rank of J(Q) is at most {proof.rank}"
    if word == "index":
        return f"{record['ell']} does not divide the index in J(Q) of the subgroup of the generators"
    if word == "complete":
        return (f"every rational point agrees with a candidate of the list at {record['prime']}, and at most "
                "one with each candidate of form point and multiplicity 1")
    where = f"candidate {record['candidate']} at {record['prime']}"
    return f"at most {record['at_most']} rational points agree with {where}"


def statement(proof: Proof) -> str:
    """The theorem, true under the premises."""
    curve = proof.curve
    h = f" + ({polynomial_words(curve.h)})*y" if curve.h else ""
    out = [f"X: y^2{h} = {polynomial_words(curve.f)}, of genus {curve.genus}."]
    dead = [c for c in proof.fates if c.verdict == "eliminated"]
    if dead:
        out.append("No rational point agrees with the candidates "
                   + ", ".join(f"{c.id} (p = {c.prime})" for c in dead) + ".")
    for c in proof.fates:
        if c.verdict == "rational":
            where = ", ".join(map(point_words, c.points))
            alone = ", the only rational point there" if c.sole else ""
            out.append(f"Candidate {c.id} (p = {c.prime}) agrees with {where}{alone}.")
    if proof.conclusion == "points":
        points = ", ".join(map(point_words, proof.points))
        out.append(f"X(Q) has exactly {len(proof.points)} points: {points}.")
    elif proof.conclusion == "empty":
        out.append("X(Q) is empty.")
    still = sum(c.verdict == "open" for c in proof.fates)
    if still:
        out.append(f"{still} candidates stay open.")
    if proof.count:
        out.append(f"Rational points of X lie in {proof.count} classes of the group of the generators.")
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
        "saturated": sorted(proof.saturated),
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
        if proof.stage != len(Proof.ORDER) - 1:
            raise Malformed("no-end", "the log has no end")
    except Fault as fault:
        fault.line, fault.record = number, kind if re.fullmatch("[a-z]{1,20}", kind) else ""
        raise
    except Declined as reason:
        raise Declined(f"line {number}: {reason}") from None
    return proof


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
        sys.stderr.write(f"sieve: error: {path}: {reason}: declined, expected a log within the limits\n")
        return 2
    except OSError as error:
        sys.stderr.write(f"sieve: error: {path}: {error.strerror}, expected a readable proof log\n")
        return 2
    except (ArithmeticError, LookupError, MemoryError, TypeError, ValueError) as error:
        # never an acceptance: something that this program should have refused by name
        sys.stderr.write(f"sieve: error: {path}: {type(error).__name__}, expected a valid log\n")
        return 2
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
        sys.stderr.write("sieve: error: command line: expected checker.py PROOF [--json]\n")
        return 2
    for output in (sys.stdout, sys.stderr):
        output.reconfigure(encoding="utf-8", errors="backslashreplace")  # type: ignore[union-attr]
    try:
        code = run(paths[0], "--json" in arguments)
        sys.stdout.flush()
    except OSError as error:
        # nobody saw the verdict, so it is none; what is left in the buffer must not be written at exit
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        sys.stderr.write(f"sieve: error: standard output: {error.strerror}, expected somebody who reads it\n")
        return 2
    return code


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
