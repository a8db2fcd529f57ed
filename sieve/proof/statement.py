"""What a proof log says, as plain data: handed over by the run, turned into records by the writer."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from sieve.curves.branch import BranchFactors
from sieve.curves.divisors import ClosedPlace, Divisor, MumfordPlace
from sieve.curves.protocol import Curve
from sieve.engine.fates import Use
from sieve.engine.plan import Outcome
from sieve.engine.survivors import Survivor
from sieve.engine.verdicts import CandidateList, Decision
from sieve.local.condition import Condition
from sieve.local.records import LocalRecord


@dataclass(frozen=True)
class ProofPremise:
    """A premise: `id` and the keys that belong to it (`ell`, or `prime`, `candidate`, `at_most`)."""

    id: str
    statement: str
    source: str
    keys: tuple[tuple[str, int | str], ...] = ()


@dataclass
class ProofInput:
    """Everything a log is made of.

    Fields: `program`, `case_name`, `case_sha256` for the header; `generators`, r free ones, then torsion
    generators of the `orders`; `premises`; `lists` with their `decisions`, in the order of the candidates;
    `records` of the usable primes and the `images` of the generators there; `ells`, the allowed primes l,
    `stated` those among them that rest on the user's word; `outcome` and `vectors`, the classes left without
    candidates (None: not part of the log); `branch`, the factors of the branch polynomial where they tell
    J(Q)[2]; `integral`, whether integral points of the affine equation are meant; `deep`, conditions modulo
    q^2 by q.
    """

    program: str
    case_name: str
    case_sha256: str
    curve: Curve
    rank: int
    base: Divisor
    generators: Sequence[Divisor]
    orders: Sequence[int]
    premises: Sequence[ProofPremise]
    lists: Sequence[CandidateList]
    decisions: Sequence[Decision]
    records: Mapping[int, LocalRecord]
    images: Mapping[int, Sequence[Sequence[int]]]
    ells: Sequence[int]
    stated: Sequence[int]
    outcome: Outcome | None = None
    vectors: Sequence[Survivor] = field(default_factory=tuple)
    branch: BranchFactors | None = None
    two_torsion: int | None = None
    integral: bool = False
    deep: Mapping[int, Condition] = field(default_factory=dict)

    @property
    def size(self) -> int:
        """n = r + s."""
        return len(self.generators)

    def places(self) -> list[MumfordPlace | ClosedPlace]:
        """The different closed places in the order of the `group` record."""
        return closed_places([self.base, *self.generators])


def closed_places(divisors: Sequence[Divisor]) -> list[MumfordPlace | ClosedPlace]:
    """The different places given by a polynomial, in order of first occurrence."""
    found = [p for d in divisors for _, p in d.terms if isinstance(p, MumfordPlace | ClosedPlace)]
    return list(dict.fromkeys(found))


@dataclass(frozen=True)
class Step:
    """One use of a condition in a log: `name` is an auxiliary prime, or "p = q", or "deep q"."""

    name: int | str
    exponents: tuple[tuple[int, int], ...]
    kind: str

    def document(self) -> list[object]:
        """As the log writes it."""
        return [self.name, {str(ell): e for ell, e in self.exponents}, self.kind]


def step_of(use: Use) -> Step:
    """The step of an engine's use."""
    kind = "semijoin" if use.kind == "semijoin" else "join"
    name: int | str = use.name
    if use.name.startswith(("v", "deep")):
        word, number = use.name.split(" = ")
        name = int(number) if word == "v" else f"deep {number}"
    return Step(name, use.exponents, kind)
