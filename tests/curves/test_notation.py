"""The notation of the files: what is read, what is refused and where."""

from __future__ import annotations

import random
from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sieve.curves import notation
from sieve.curves.notation import (
    Origin,
    dense,
    format_univariate,
    parse_equation,
    parse_padic,
    parse_padic_point,
    parse_point,
    parse_polynomial,
    parse_polynomial_point,
    parse_rational,
    parse_univariate,
    quote,
)
from sieve.errors import InputError
from sieve.exact.padic_number import PadicNumber

settings.register_profile("repeatable", derandomize=True, deadline=None)
settings.load_profile("repeatable")

HERE = Origin("case.toml", "curve.equation")


def evaluate(polynomial: notation.Polynomial, values: tuple[Fraction, ...]) -> Fraction:
    total = Fraction(0)
    for exponents, coefficient in polynomial.items():
        for value, exponent in zip(values, exponents, strict=True):
            coefficient *= value**exponent
        total += coefficient
    return total


@st.composite
def expressions(draw: st.DrawFn, depth: int = 3) -> tuple[str, str]:
    """An expression in the notation, and the same with Python's operators on Fractions."""
    kind = draw(st.sampled_from(["number", "x", "y", "+", "-", "*", "/", "^"])) if depth else "x"
    if kind == "number":
        n = draw(st.integers(0, 99))
        return str(n), f"F({n})"
    if kind in "xy":
        return kind, kind
    left, left_python = draw(expressions(depth - 1))
    if kind == "/":
        n = draw(st.integers(1, 9))
        return f"({left})/{n}", f"(({left_python})/F({n}))"
    if kind == "^":
        n = draw(st.integers(0, 3))
        return f"({left})^{n}", f"(({left_python})**{n})"
    right, right_python = draw(expressions(depth - 1))
    if kind == "*":
        return f"({left})*({right})", f"(({left_python})*({right_python}))"
    return f"{left} {kind} ({right})", f"({left_python} {kind} ({right_python}))"


@given(expressions(), st.fractions(-3, 3, max_denominator=5), st.fractions(-3, 3, max_denominator=5))
def test_values_of_random_expressions(pair: tuple[str, str], x: Fraction, y: Fraction) -> None:
    # the oracle evaluates text this test has built itself
    text, python = pair
    expected = eval(python, {"F": Fraction, "x": x, "y": y})
    assert evaluate(parse_polynomial(text, ["x", "y"], HERE), (x, y)) == expected


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("-x^2", {(2,): -1}),
        ("1/2*x", {(1,): Fraction(1, 2)}),
        ("1/2^2", {(0,): Fraction(1, 4)}),
        ("6/2/3", {(0,): 1}),
        ("2*x/4*x", {(2,): Fraction(1, 2)}),
        ("x - x", {}),
        ("0^0", {(0,): 1}),
        ("+x", {(1,): 1}),
        ("\tx\n+ 1", {(1,): 1, (0,): 1}),
        ("(x^2)^3", {(6,): 1}),
        ("x^100", {(100,): 1}),
        ("((((x))))", {(1,): 1}),
        ("2^1000/2^999", {(0,): 2}),
    ],
)
def test_polynomials(text: str, expected: notation.Polynomial) -> None:
    assert parse_polynomial(text, ["x"], HERE) == expected


@pytest.mark.parametrize(
    ("text", "column", "found", "expected"),
    [
        ("", 1, "end of the text", "a number"),
        ("2x", 2, "'x' right after a factor", "'*'"),
        ("x y", 3, "'y' right after a factor", "'*'"),
        ("2 3", 3, "'3' right after a factor", "'*'"),
        ("(x+1)(x-1)", 6, "'(' right after a factor", "'*'"),
        ("x**2", 2, "'**'", "'^'"),
        ("x^-1", 3, "'-'", "nonnegative integer"),
        ("x^y", 3, "'y'", "nonnegative integer"),
        ("x^(2)", 3, "'('", "nonnegative integer"),
        ("x^2^3", 4, "power of a power", "parentheses"),
        ("x^999999999", 3, "999999999", "at most 1000"),
        ("x^101", 2, "degree 101", "at most 100"),
        ("(x^60)*(y^60)", 7, "degree 120", "at most 100"),
        ("1/x", 2, "division by a polynomial", "nonzero number"),
        ("1/0", 2, "division by zero", "nonzero number"),
        ("1/(2-2)", 2, "division by zero", "nonzero number"),
        ("x + ", 5, "end of the text", "a number"),
        ("x + + y", 5, "'+'", "a number"),
        ("x * -y", 5, "'-'", "a number"),
        ("(x", 3, "end of the text", "')'"),
        ("x)", 2, "')'", "operator"),
        ("()", 2, "')'", "a number"),
        ("x = y", 3, "'='", "operator"),
        ("xy", 1, "unknown name 'xy'", "'x' or 'y'"),
        ("X", 1, "unknown name 'X'", "'x' or 'y'"),
        ("a*x", 1, "unknown name 'a'", "'x' or 'y'"),
        ("1.5*x", 2, "'.'", "fraction"),
        ("x − 1", 3, "'−'", "-"),
        ("x²", 2, "'²'", "^2"),
        ("٣*x", 1, "'٣'", "a number"),
        ("x;y", 2, "';'", "a number"),
        ("x\x00", 2, "'\\x00'", "a number"),
        ("__import__('os')", 12, "'''", "a number"),
        ("(" * 200 + "x" + ")" * 200, 51, "51 nested", "at most 50"),
        ("9" * 5000, 1, "5000 digits", "at most 4000"),
        ("(2^1000)^100/(2^1000)^100", 13, "too large", "20000 bits"),
        ("(9^1000)^1000", 14, "too large", "20000 bits"),
    ],
)
def test_refusals_name_the_column(text: str, column: int, found: str, expected: str) -> None:
    with pytest.raises(InputError) as caught:
        parse_polynomial(text, ["x", "y"], HERE)
    error = caught.value
    assert error.file == "case.toml"
    assert error.place == f"curve.equation, column {column}"
    assert found in error.found and expected in error.expected
    assert "\n" not in str(error) and len(str(error)) < 250


def test_work_is_bounded() -> None:
    with pytest.raises(InputError, match="too large to expand"):
        parse_polynomial("(a+b+c+d+e+f+g)^99", list("abcdefg"), HERE)
    with pytest.raises(InputError, match="characters"):
        parse_polynomial("1+" * 200_000 + "1", [], HERE)
    with pytest.raises(InputError, match="too large"):
        parse_polynomial(f"1/1{'0' * 3998}1 + 1/1{'0' * 3998}3", [], HERE)
    with pytest.raises(InputError, match="4000 terms"):
        parse_padic("1+" * 5000 + "1", 7, 6, HERE)


@given(st.text(alphabet="xy0123456789+-*/^()=:, tO.\u00b2", max_size=30))
def test_any_text_is_read_or_refused(text: str) -> None:
    for reader in (
        lambda: parse_polynomial(text, ["x", "y"], HERE),
        lambda: parse_equation(text, ["x", "y"], HERE),
        lambda: parse_point(text, HERE),
        lambda: parse_polynomial_point(text, "t", HERE),
        lambda: parse_padic(text, 7, 5, HERE),
        lambda: parse_padic_point(text, 7, 5, HERE),
    ):
        try:
            reader()
        except InputError:
            pass


def test_equations() -> None:
    two = parse_equation("y^2 + x*y = x^5 - 1/3", ["x", "y"], HERE)
    assert two == {(0, 2): 1, (1, 1): 1, (5, 0): -1, (0, 0): Fraction(1, 3)}
    for text, message in [
        ("y^2 - x^5", "'=' and the other side"),
        ("y^2 == x^5", "expected a number"),
        ("y = x = 1", "end of the equation"),
        ("y = y", "equal"),
        ("y^2 =", "end of the text"),
        ("= x", "'='"),
    ]:
        with pytest.raises(InputError, match=message):
            parse_equation(text, ["x", "y"], HERE)


def test_dense_coefficients() -> None:
    assert parse_univariate("x^3 - 1/2", "x", HERE) == (Fraction(-1, 2), 0, 0, 1)
    assert parse_univariate("x - x", "x", HERE) == ()
    assert dense({(2, 0): Fraction(3)}) == (0, 0, 3)


@given(st.lists(st.fractions(-20, 20, max_denominator=4), max_size=6))
def test_formatted_polynomials_are_read_back(coefficients: list[Fraction]) -> None:
    while coefficients and coefficients[-1] == 0:
        coefficients.pop()
    assert parse_univariate(format_univariate(coefficients, "x"), "x", HERE) == tuple(coefficients)


def test_points() -> None:
    assert parse_point("(1 : -7/4 : 0)", HERE).entries == (1, Fraction(-7, 4), 0)
    assert not parse_point("(1:2:3)", HERE).affine
    assert parse_point(" ( 1/2 , 3 ) ", HERE) == notation.ParsedPoint((Fraction(1, 2), Fraction(3)), True)
    closed = parse_polynomial_point("(t : 2*t + 1 : 1)", "t", HERE)
    assert closed.entries == ((0, 1), (1, 2), (1,))
    assert parse_rational("-7/4", HERE) == Fraction(-7, 4)
    for text, message in [
        ("1 : 2 : 3", "a point"),
        ("(1 : 2, 3)", "':' or '\\)'"),
        ("(1, 2 : 3)", "',' or '\\)'"),
        ("(1 : 2 : 3", "':' or '\\)'"),
        ("(1)", "between the coordinates"),
        ("(1 : 2 : 3) x", "nothing after the point"),
        ("(t : 1 : 1)", "unknown name 't'"),
        ("( : 1 : 1)", "a number"),
        ("", "a point"),
    ]:
        with pytest.raises(InputError, match=message):
            parse_point(text, HERE)


@pytest.mark.parametrize(
    ("text", "value", "precision"),
    [
        ("3", Fraction(3), 10),
        ("-7/4", Fraction(-7, 4), 10),
        ("5/49", Fraction(5, 49), 10),
        ("5 + 3*7 + 2*7^3 + O(7^6)", Fraction(5 + 21 + 2 * 343), 6),
        ("2*7^-1 + 3", Fraction(2, 7) + 3, 10),
        ("7^-2 + O(7)", Fraction(1, 49), 1),
        ("7^(-2) - 7 + O(7^(2))", Fraction(1, 49) - 7, 2),
        ("7", Fraction(7), 10),
        ("7^2", Fraction(49), 10),
        ("8*7", Fraction(56), 10),
        ("1/2*7 + O(7^3)", Fraction(7, 2), 3),
        ("O(7^6)", Fraction(0), 6),
        ("O(1)", Fraction(0), 0),
        ("5 + 7^8 + O(7^2)", Fraction(5), 2),
        ("5 + O(7^12)", Fraction(5), 10),
        ("0", Fraction(0), 10),
    ],
)
def test_padic_numbers(text: str, value: Fraction, precision: int) -> None:
    assert parse_padic(text, 7, 10, HERE) == PadicNumber.from_fraction(value, 7, precision)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("5 + 3*5 + O(5^6)", "'5', expected a power of the prime 7"),
        ("3*11", "'11', expected a power of the prime 7"),
        ("5^2", "'5', expected a power of the prime 7"),
        ("5 + O(5^6)", "power of the prime 7"),
        ("5 - O(7^6)", "'-' before an O-term"),
        ("O(7^6) + 5", "O-term at the end"),
        ("5 + O(7^6) + O(7^3)", "O-term at the end"),
        ("5 + O(7^6", "'\\)' after the O-term"),
        ("5 + O 7^6", "'\\(' after O"),
        ("5 + O()", "power of the prime"),
        ("5 + 7^x", "an integer as exponent"),
        ("5 + 7^5000", "at most 1000"),
        ("1/0", "denominator 0"),
        ("7^2/3", "'/'"),
        ("1/7^2", "a power of a fraction"),
        ("5 3*7", "right after a term"),
        ("", "end of the text"),
        ("x", "an integer, a fraction"),
        ("5 + 1.5*7", "fraction"),
        ("(5 + 3*7)", "an integer, a fraction"),
    ],
)
def test_padic_refusals(text: str, message: str) -> None:
    with pytest.raises(InputError, match=message):
        parse_padic(text, 7, 10, HERE)


def test_padic_text_is_read_back() -> None:
    rng = random.Random(7)
    for _ in range(300):
        prime = rng.choice([2, 3, 7, 101])
        precision = rng.randint(-3, 9)
        number = PadicNumber.padic(prime, rng.randrange(10**9), rng.randint(-4, 4), precision)
        assert parse_padic(str(number), prime, 20, HERE) == number


def test_padic_points() -> None:
    point = parse_padic_point("(3 + 2*7 + O(7^6), 1 + 4*7)", 7, 4, HERE)
    assert point.affine
    assert point.entries == (PadicNumber.padic(7, 17, 0, 4), PadicNumber.padic(7, 29, 0, 4))
    assert not parse_padic_point("(1 : 3 : O(7^2))", 7, 4, HERE).affine


def test_quoting() -> None:
    assert quote("a\nb\x1b[0m") == "'a\\nb\\x1b[0m'"
    assert len(quote("x" * 10**6)) < 60


def test_origins() -> None:
    assert str(HERE.at("column 3").error("this", "that")) == (
        "case.toml: curve.equation, column 3: this, expected that"
    )
    assert Origin("f").at("key").place == "key"
