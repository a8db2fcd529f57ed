"""p-adic numbers: every operation against exact rational members of the balls."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from sieve.errors import BadReduction, InternalError, PrecisionLost
from sieve.exact.padic_number import PadicNumber, valuation

settings.register_profile("repeatable", derandomize=True, deadline=None)
settings.load_profile("repeatable")

PRIMES = st.sampled_from([2, 3, 5, 7, 13, 101])
RATIONALS = st.fractions(min_value=-10**6, max_value=10**6, max_denominator=10**4)


def contains(ball: PadicNumber, value: Fraction) -> bool:
    """Slow obvious membership: value - centre is divisible by p^precision."""
    centre = ball.unit * Fraction(ball.prime) ** ball.valuation
    difference = value - centre
    return difference == 0 or valuation(difference, ball.prime) >= ball.precision


@st.composite
def balls(draw: st.DrawFn, prime: int) -> tuple[PadicNumber, list[Fraction]]:
    """A ball and a few rational members of it."""
    centre = draw(RATIONALS)
    precision = draw(st.integers(-3, 8))
    steps = draw(st.lists(st.integers(-50, 50), min_size=2, max_size=4))
    members = [centre + step * Fraction(prime) ** precision for step in steps]
    return PadicNumber.from_fraction(centre, prime, precision), members


@given(st.data(), PRIMES)
def test_operations_contain_what_they_must(data: st.DataObject, prime: int) -> None:
    left, lefts = data.draw(balls(prime))
    right, rights = data.draw(balls(prime))
    for a in lefts:
        assert contains(left, a)
        assert contains(-left, -a)
        assert contains(left**2, a * a) and contains(left**3, a**3)
        if not left.is_zero:
            assert contains(left.inverse(), 1 / a)
            assert contains(left**-2, 1 / a**2)
        for b in rights:
            assert contains(left + right, a + b)
            assert contains(left - right, a - b)
            assert contains(left * right, a * b)
            assert contains(left + b, a + b) and contains(b - left, b - a)
            assert contains(left * b, a * b) and contains(b * left, a * b)
            if not right.is_zero:
                assert contains(left / right, a / b)
            if b:
                assert contains(left / b, a / b)


@given(st.data(), PRIMES)
def test_precision_is_the_best_possible(data: st.DataObject, prime: int) -> None:
    # moving one operand by one step of its own ball must move the result by exactly one step of some ball
    left, _ = data.draw(balls(prime))
    right, _ = data.draw(balls(prime))
    assume(not left.is_zero and not right.is_zero)
    a = left.unit * Fraction(prime) ** left.valuation
    b = right.unit * Fraction(prime) ** right.valuation
    da, db = Fraction(prime) ** left.precision, Fraction(prime) ** right.precision
    assert (left + right).precision == min(valuation(da, prime), valuation(db, prime))
    assert (left * right).precision == min(valuation(a * db, prime), valuation(b * da, prime))
    assert left.inverse().precision == valuation(1 / a - 1 / (a + da), prime)
    assert (left * b).precision == valuation(da * b, prime)


@given(RATIONALS, PRIMES, st.integers(-4, 12))
def test_from_fraction_and_text(value: Fraction, prime: int, precision: int) -> None:
    number = PadicNumber.from_fraction(value, prime, precision)
    assert contains(number, value) and number.precision == precision
    # read the text back with plain arithmetic
    text = str(number)
    total = Fraction(0)
    for term in text.split(" + ")[:-1]:
        digit, _, power = term.partition("*") if "*" in term else ("1", "", term)
        if "^" in power:
            base, _, exponent = power.partition("^")
            total += int(digit) * Fraction(int(base)) ** int(exponent)
        elif power == str(prime):
            total += int(digit) * prime
        else:
            total += int(power)
    assert PadicNumber.from_fraction(total, prime, precision) == number


@given(st.integers(-30, 30), st.integers(1, 30), PRIMES, st.integers(-3, 3))
def test_reconstruction_finds_small_fractions(top: int, bottom: int, prime: int, shift: int) -> None:
    assume(top != 0)
    value = Fraction(top, bottom)
    unit = value / Fraction(prime) ** valuation(value, prime)
    digits = 1
    while prime**digits <= 2 * 900:
        digits += 1
    value = unit * Fraction(prime) ** shift
    number = PadicNumber.from_fraction(value, prime, shift + digits)
    assert number.rational_reconstruction() == value
    height = max(abs(unit.numerator), unit.denominator)
    assert number.rational_reconstruction(height) == value
    if height > 1:
        assert number.rational_reconstruction(height - 1) is None


@pytest.mark.parametrize(("prime", "digits"), [(2, 6), (3, 4), (7, 2)])
def test_reconstruction_agrees_with_search(prime: int, digits: int) -> None:
    modulus = prime**digits
    bound = 0
    while 2 * (bound + 1) ** 2 < modulus:
        bound += 1
    for unit in range(1, modulus):
        if unit % prime == 0:
            continue
        found = {
            Fraction(a, b)
            for b in range(1, bound + 1)
            for a in range(-bound, bound + 1)
            if b % prime and a % prime and (a - unit * b) % modulus == 0
        }
        assert len(found) <= 1
        expected = found.pop() if found else None
        assert PadicNumber(prime, unit, 0, digits).rational_reconstruction() == expected


def test_residues_and_refusals() -> None:
    half = PadicNumber.from_fraction(Fraction(1, 2), 7, 3)
    assert half.residue(0) == 0 and half.residue(1) == 4 and half.residue(3) == pow(2, -1, 343)
    with pytest.raises(PrecisionLost):
        half.residue(4)
    with pytest.raises(BadReduction):
        PadicNumber.from_fraction(Fraction(1, 7), 7, 3).residue(1)
    with pytest.raises(PrecisionLost):
        PadicNumber.zero(7, 3).inverse()
    with pytest.raises(InternalError):
        half + PadicNumber.zero(5, 3)
    with pytest.raises(InternalError):
        half / 0
    with pytest.raises(InternalError):
        valuation(0, 7)
    for fields in [(7, 7, 0, 3), (7, 0, 0, 3), (7, 50, 0, 2), (7, 1, 3, 3), (7, -1, 0, 3)]:
        with pytest.raises(InternalError):
            PadicNumber(*fields)


def test_text_forms() -> None:
    assert str(PadicNumber.padic(7, 5 + 3 * 7 + 2 * 343, 0, 6)) == "5 + 3*7 + 2*7^3 + O(7^6)"
    assert str(PadicNumber.padic(7, 1 + 7 + 49, -1, 2)) == "7^-1 + 1 + 7 + O(7^2)"
    assert str(PadicNumber.zero(7, 0)) == "O(1)"
    assert str(PadicNumber.zero(7, -2)) == "O(7^-2)"


def test_agreement_and_lowering() -> None:
    six = PadicNumber.padic(5, 6, 0, 4)
    assert six.agrees(6) and six.agrees(6 + 5**4) and not six.agrees(7)
    assert six.agrees(PadicNumber.padic(5, 1, 0, 1))
    assert six.to_precision(1) == PadicNumber.padic(5, 1, 0, 1)
    assert six.to_precision(9) is six
    assert six.to_precision(0) == PadicNumber.zero(5, 0)
