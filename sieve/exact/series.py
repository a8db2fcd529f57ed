"""Power series modulo p^N and t^T, factors lifted from their reductions, and integrals summed over small
roots.

A series is an `fmpz_mod_poly` over Z/p^N of degree < T.  Only ring operations, division by monic polynomials
and inverses of series with a unit constant term are used on it: the modulus is no prime.

Sums over roots.  Let W be distinguished of degree m over Z_p (monic, W = t^m modulo p), s_k the sum of the
k-th powers of its roots.  All roots have valuation >= 1/m, so v(s_k) >= ceil(k/m), and for a series sum a_k
t^k over Z_p the sum over the roots of its termwise integral is sum a_{k-1} s_k / k.  Known modulo p^N, cut
after k = T: the terms are known modulo p^(N - floor(log_p T)), and what is cut off vanishes modulo p^M when
ceil(k/m) - floor(log_p k) >= M for all k > T; `integral_length` returns such a T.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import lru_cache

from flint import fmpz, fmpz_mat, fmpz_mod, fmpz_mod_poly, fmpz_mod_poly_ctx

from sieve.errors import InternalError
from sieve.exact.padic_number import valuation


@lru_cache(maxsize=256)
def _ring(modulus: int) -> fmpz_mod_poly_ctx:
    """The polynomial ring over Z/modulus, one object per modulus."""
    return fmpz_mod_poly_ctx(modulus)


def polynomial(values: Sequence[int], modulus: int) -> fmpz_mod_poly:
    """The polynomial over Z/modulus (modulus > 1) with the given coefficients, low degree first.

    >>> polynomial([10, 4], 9)
    4*x + 1
    """
    entries: list[int | fmpz | fmpz_mod] = list(values)
    return _ring(modulus)(entries)


def coefficients(poly: fmpz_mod_poly, length: int) -> list[int]:
    """The first `length` coefficients as integers in [0, modulus).

    >>> coefficients(polynomial([1, 10, 5], 9), 2)
    [1, 1]
    """
    out = [int(c) for c in poly.coeffs()[:length]]
    return out + [0] * (length - len(out))


def floor_log(n: int, prime: int) -> int:
    """The largest e with prime^e <= n, for n >= 1.

    >>> floor_log(26, 3), floor_log(27, 3)
    (2, 3)
    """
    e, power = 0, prime
    while power <= n:
        e, power = e + 1, power * prime
    return e


def evaluate_at(poly: Sequence[int], series: fmpz_mod_poly, length: int) -> fmpz_mod_poly:
    """The series poly(series) modulo t^length, by Horner's rule; `poly` low degree first.

    >>> coefficients(evaluate_at([1, 0, 1], polynomial([2, 1], 25), 2), 2)
    [5, 4]
    """
    modulus = int(series.modulus())
    if series.degree() <= 1:
        return polynomial(poly, modulus).compose(series).truncate(length)
    value = polynomial([0], modulus)
    for c in reversed(poly):
        value = value.mul_low(series, length) + c
    return value


def integral_length(prime: int, roots: int, precision: int) -> int:
    """The least T with ceil(k / roots) - floor(log_p k) >= precision for all k > T.

    Arguments: `roots` m >= 1, `precision` M >= 1.  Between p^j and p^(j+1) the condition fails exactly for
    k <= m (M + j - 1); once p^j exceeds that bound (j >= 1) it does so for all larger j.

    >>> integral_length(3, 1, 4), integral_length(2, 2, 3)
    (4, 10)
    """
    last, j, power = 0, 0, 1
    while True:
        bound = roots * (precision + j - 1)
        if bound >= power:
            last = min(bound, power * prime - 1)
        elif j >= 1:
            return last
        j, power = j + 1, power * prime


def lift_factor(poly: fmpz_mod_poly, factor: Sequence[int], prime: int, exponent: int) -> fmpz_mod_poly:
    """The monic factor of `poly` modulo prime^exponent that reduces to `factor` modulo the prime.

    Arguments: `poly` over Z/prime^exponent; `factor` monic, low degree first, of degree >= 1, coprime modulo
    the prime to its cofactor (which must be nonzero).  Newton's iteration on the remainder (Hensel's lemma);
    the lift is unique. Raises `InternalError` when `factor` does not divide modulo the prime or is not
    coprime to its cofactor.

    >>> W = lift_factor(polynomial([9, 1, 2, 5], 3**4), [0, 1], 3, 4)
    >>> coefficients(W, 2)
    [9, 1]
    """
    modulus = prime**exponent
    reduced, start = polynomial(coefficients(poly, poly.length()), prime), polynomial(factor, prime)
    cofactor, rest = divmod(reduced, start)
    common, inverse, _ = (cofactor % start).xgcd(start)
    if not rest.is_zero() or common.degree() != 0:
        raise InternalError(f"no factorisation to lift modulo {prime}")
    inverse = inverse * pow(int(common[0]), -1, prime)
    monic = polynomial(factor, modulus)
    inverted = polynomial(coefficients(inverse, inverse.length()), modulus)
    known = 1
    while True:
        quotient, remainder = divmod(poly, monic)
        if remainder.is_zero():
            return monic
        if known > 4 * exponent:
            raise InternalError("the lift of a factor does not converge")
        inverted = inverted * (2 - quotient * inverted) % monic
        monic = monic + remainder * inverted % monic
        known *= 2


def inverse_modulo(value: fmpz_mod_poly, u: fmpz_mod_poly, prime: int, exponent: int) -> fmpz_mod_poly:
    """The inverse of `value` modulo the monic u over Z/prime^exponent, by Newton's iteration.

    Raises `InternalError` when it is no unit modulo the prime.

    >>> coefficients(inverse_modulo(polynomial([0, 1], 9), polynomial([1, 0, 1], 9), 3, 2), 2)
    [0, 8]
    """
    if value.degree() == 0:
        return polynomial([pow(int(value[0]), -1, prime**exponent)], prime**exponent)
    low, modulus = (polynomial(coefficients(c, c.length()), prime) for c in (value, u))
    common, start, _ = (low % modulus).xgcd(modulus)
    if common.degree() != 0:
        raise InternalError("no unit modulo a polynomial")
    start = start * pow(int(common[0]), -1, prime)
    inverse = polynomial(coefficients(start, start.length()), prime**exponent)
    for _ in range(exponent.bit_length() + 1):
        inverse = inverse * (2 - value * inverse % u) % u
    return inverse


def multiplication(value: fmpz_mod_poly, u: fmpz_mod_poly) -> list[list[int]]:
    """The matrix of multiplication by `value` modulo the monic u: row i for t^i."""
    degree, out, power = int(u.degree()), [], value % u
    x = polynomial([0, 1], int(u.modulus()))
    for _ in range(degree):
        out.append(coefficients(power, degree))
        power = power * x % u
    return out


def characteristic(value: fmpz_mod_poly, u: fmpz_mod_poly) -> list[int]:
    """The characteristic polynomial of `value` modulo the monic u, coefficients low degree first.

    >>> characteristic(polynomial([1, 1], 25), polynomial([-3, 0, 1], 25))
    [23, 23, 1]
    """
    modulus = int(u.modulus())
    if u.degree() == 1:
        return [-int((value % u)[0]) % modulus, 1]
    return [int(c) % modulus for c in fmpz_mat(multiplication(value, u)).charpoly().coeffs()]


def distinguished_polynomial(series: fmpz_mod_poly, prime: int, exponent: int) -> fmpz_mod_poly:
    """The distinguished factor of a series given modulo (p^exponent, t^T): its zeros are those with |t| < 1.

    The degree is m, the order of vanishing modulo p; exact modulo p^exponent when T > m * exponent, because
    t^T is a multiple of p^floor(T/m) modulo the factor.  Raises `InternalError` if it vanishes modulo p.
    Source: the Weierstrass preparation theorem.

    >>> coefficients(distinguished_polynomial(polynomial([5, 1, 1], 25), 5, 2), 2)
    [5, 1]
    """
    entries = coefficients(series, series.length())
    order = next((k for k, c in enumerate(entries) if c % prime), None)
    if order is None:
        raise InternalError("a series vanishes modulo p")
    if order == 0:
        return polynomial([1], prime**exponent)
    return lift_factor(series, [0] * order + [1], prime, exponent)


def power_sums(monic: Sequence[int], count: int, modulus: int) -> list[int]:
    """The sums of the k-th powers of the roots, k = 1..count, modulo `modulus`, by Newton's identities.

    `monic`: coefficients low degree first, the last one 1.

    >>> power_sums([2, -3, 1], 3, 1000)
    [3, 5, 9]
    """
    degree = len(monic) - 1
    if degree == 0:
        return [0] * count
    if degree == 1:
        root, power, out = -monic[0] % modulus, 1, []
        for _ in range(count):
            power = power * root % modulus
            out.append(power)
        return out
    top = [monic[degree - i] for i in range(1, degree + 1)]
    sums: list[int] = []
    for k in range(1, count + 1):
        value = k * top[k - 1] if k <= degree else 0
        for i in range(1, min(k - 1, degree) + 1):
            value += top[i - 1] * sums[k - 1 - i]
        sums.append(-value % modulus)
    return sums


def integral_terms(form: fmpz_mod_poly, count: int, prime: int, exponent: int, shift: int) -> list[int]:
    """The numbers p^shift a_{k-1} / k, k = 1..count, modulo p^exponent, for a form sum a_k t^k dt.

    Requires shift >= floor(log_p count).  The a_k are known modulo p^exponent, so the k-th number is known
    modulo p^(exponent + shift - v_p(k)), which is no less.

    >>> integral_terms(polynomial([1, 1, 1], 27), 3, 3, 3, 1)
    [3, 15, 1]
    """
    modulus = prime**exponent
    out = []
    for k, a in enumerate(coefficients(form, count), start=1):
        v = valuation(k, prime)
        out.append(a * prime ** (shift - v) * pow(k // prime**v, -1, modulus) % modulus)
    return out
