"""What the layers above ask of a curve model: three small protocols.

`Curve` (equation, points, smoothness, reduction), `ReducedCurve` (a linear system over F_v with all rational
points) and `Disc` (centres, parameters, expansions at p).  `HyperellipticCurve`, `ReducedHyperelliptic` and
`ResidueDisc` implement them, and `tests/curves/test_protocol.py` checks that.  So does every new model.
"""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from sieve.curves.divisors import Divisor, Place, Point

IntArray = NDArray[np.int64]
Rows = tuple[tuple[int, ...], ...]
HigherPlace = Any
"""A place of degree >= 2 over F_v: a sortable tuple whose first entry is a polynomial of its degree."""


class LocalDivisorLike(Protocol):
    """An effective divisor over F_v: `units` times U, points by number, other places, with multiplicities."""

    @property
    def units(self) -> int:
        """The multiple of U."""

    @property
    def points(self) -> tuple[tuple[int, int], ...]:
        """Pairs (point number, multiplicity)."""

    @property
    def places(self) -> tuple[tuple[Any, int], ...]:
        """Pairs (place of degree >= 2, multiplicity)."""


class ReducedCurve(Protocol):
    """A smooth curve over F_v with a linear system and all its rational points, numbered 0 .. count - 1.

    The class of point i is sign[i] * (class of the first point of orbit[i]) + fibre[i] * U, where U is a
    fixed class such that a section has class `section_units` * U.  Without an involution every point is its
    own orbit, sign 1, fibre 0, and U is the section class.  `ramified` lists orbits with 2 P ~ U.

    `unit_degree`: the degree of U; `involution`: conjugate places add up to multiples of U;
    `extension_limit`: the largest field over which points are counted.
    """

    prime: int
    genus: int
    unit_degree: int
    involution: bool
    extension_limit: int
    count: int
    affine_count: int
    orbit_count: int
    section_units: int
    orbit: IntArray
    sign: IntArray
    fibre: IntArray
    ramified: IntArray

    # ---- sections through distinct points, in bulk -------------------------------------------------

    @property
    def drawn_count(self) -> int:
        """Points with smaller numbers are drawn for sections."""

    @property
    def plentiful(self) -> bool:
        """Are there likely enough sections through distinct points to give the group?"""

    @property
    def section_limit(self) -> int:
        """How many sections are tried where exact divisors of sections give the group."""

    @property
    def base_size(self) -> int:
        """How many orbits are the base of relations."""

    @property
    def batch_size(self) -> int:
        """How many rows of points are tried at a time."""

    def usable(self, choice: IntArray) -> NDArray[np.bool_]:
        """Rows of point numbers, shape (T, k), that fix a section; k = `points_per_section`."""

    @property
    def points_per_section(self) -> int:
        """How many points fix a section."""

    def residuals(self, choice: IntArray) -> IntArray:
        """The other zeros of sections through usable rows, one row each; -1 where not all are rational."""

    def split_sections(self) -> IntArray | None:
        """Many sections with rational zeros alone, one row each, if these are easy to list; else None."""

    # ---- single sections ---------------------------------------------------------------------------

    def through(self, points: Sequence[int]) -> Any:
        """The section through a usable row (the first `points_per_section` numbers), or with these zeros."""

    def encode(self, section: Any) -> tuple[int, Rows]:
        """The multiple n of U that the section has, and the rows of its form, as logs write them."""

    def random_section(self, rng: np.random.Generator, extra: int, places: Sequence[Any] = ()) -> Any:
        """A random section, of a higher multiple for `extra` > 0, often through points and given places."""

    def section_divisor(self, section: Any) -> LocalDivisorLike | None:
        """All zeros with multiplicities, `units` the class; None where they are not worked out."""

    def section_through(self, place: Place) -> tuple[Any, tuple[int, ...]] | None:
        """A section that vanishes on a closed place over Q and its other zeros, all rational; or None."""

    def extension_count(self, degree: int) -> int:
        """#X(F_{v^degree}) by enumeration, for small fields."""

    # ---- places ------------------------------------------------------------------------------------

    def places_of_degree(self, degree: int) -> list[Any]:
        """All places of degree 2 or 3 (one of every pair of conjugates), multiples of U left out."""

    def reduce(self, place: Place) -> LocalDivisorLike:
        """The reduction of a place over Q; raises `BadReduction`."""

    def higher_partner(self, place: Any) -> Any:
        """The conjugate of a place of degree >= 2 (itself for a model without an involution)."""

    def substitute(
        self, place: Any, rng: np.random.Generator
    ) -> tuple[Any, LocalDivisorLike | None] | None:
        """A section through a place of degree >= 2 and the divisor of its zeros, where known; or None."""

    @property
    def points(self) -> list[tuple[int, int, int]]:
        """All points in normalised coordinates, in the order of their numbers."""

    def index_of(self, x: int, y: int, z: int) -> int:
        """The number of a point given by coordinates modulo v."""


class Disc(Protocol):
    """A residue disc at p: centre, local parameter t, expansions of coordinates and regular differentials."""

    prime: int
    genus: int
    number: int
    ramified: bool

    def centre(self, exponent: int) -> tuple[int, int]:
        """Chart coordinates of the centre modulo p^exponent."""

    def coordinates(self, t: int, exponent: int) -> tuple[int, int]:
        """Chart coordinates of the point with parameter t, p | t."""

    def parameter(self, a: int, b: int, exponent: int) -> int:
        """The parameter of a point given by chart coordinates modulo p^exponent."""

    def expansion(self, exponent: int, length: int) -> Any:
        """Coordinates and differentials as series modulo (p^exponent, t^length)."""


class Curve(Protocol):
    """A smooth curve of genus >= 2 over Q in a weighted projective plane, given by an integral equation.

    F(X, Y, Z) = 0 is weighted homogeneous of degree `degree` for the weights 1, `weight`, 1; rows[k] holds
    the coefficients of y^k in F(x, y, 1), low degree first. The user's y is the model's divided by
    `y_scale`.
    """

    genus: int

    @property
    def rows(self) -> tuple[tuple[int, ...], ...]:
        """The equation."""

    @property
    def weight(self) -> int:
        """The weight of Y: 1 for plane curves."""

    @property
    def degree(self) -> int:
        """The weighted degree of F."""

    @property
    def variables(self) -> tuple[str, ...]:
        """Three names."""

    @property
    def y_scale(self) -> Fraction:
        """The model's y over the user's."""

    @property
    def square_form(self) -> tuple[int, ...]:
        """4 f + h^2, whose factors tell J[2]; empty for a model without it."""

    @property
    def bad_primes(self) -> tuple[int, ...]:
        """The primes at which the model is not smooth, found with bounded effort, see `unfactored`."""

    @property
    def unfactored(self) -> int:
        """A number whose prime factors `bad_primes` may lack (1: none; 0: any large prime)."""

    @property
    def key(self) -> str:
        """A text that determines the model."""

    def contains(self, point: Sequence[int]) -> bool:
        """Is this tuple of integers a point of the curve?"""

    def normalise(self, x: Fraction, y: Fraction, z: Fraction) -> Point:
        """Normalised integer coordinates of a rational point; raises `ValueError` when it is none."""

    def from_user(self, x: Fraction, y: Fraction, z: Fraction = Fraction(1)) -> Point:
        """A point in the user's coordinates, normalised; raises `ValueError` when it is none."""

    def to_user(self, point: Point) -> tuple[Fraction, Fraction, Fraction]:
        """The same point in the user's coordinates."""

    def closed_point(
        self, modulus: Sequence[Fraction], x: Sequence[Fraction], y: Sequence[Fraction], z: Sequence[Fraction]
    ) -> Place:
        """All conjugates of (x(t) : y(t) : z(t)), t a root of `modulus`; raises `ValueError`."""

    def format_point(self, point: Point) -> str:
        """The point as interface files write it."""

    def is_smooth(self, v: int) -> bool:
        """Is the reduction of the model modulo the prime v smooth?"""

    def modulo(self, v: int) -> ReducedCurve:
        """The reduction; raises `BadReduction` when it is not smooth."""

    def difference(self, point: Point, base: Divisor) -> Divisor:
        """The divisor P - B, or d P - B for a base divisor of degree d."""

    def two_torsion_dimension(self) -> int | None:
        """dim J(Q)[2], where the model tells (with a proof that the log can express), else None."""
