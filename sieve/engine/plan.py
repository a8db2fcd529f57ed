"""Plans: which conditions are joined in which order, predicted, executed, printed.

A plan is data: `make_plan` predicts one from counts and subgroups alone, `run_plan` executes it, and
`sieve_classes` plans with the exact sizes as it goes.  Sizes are kept below a cap by using coarser
conditions.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterator, Sequence
from dataclasses import dataclass, replace
from math import exp, log, prod

from sieve.engine.join import join, match, semijoin
from sieve.engine.outlook import (
    PREMIUMS,
    Outlook,
    Parts,
    choose,
    choose_start,
    log_pass,
    shared_parts,
    sum_of_parts,
)
from sieve.engine.relation import Relation, coarsen, trivial
from sieve.exact.primary import Characters


@dataclass(frozen=True)
class Step:
    """One step of a plan.

    Fields: `kind` ("start", "join" or "semijoin"); `name` of the condition; `exponents`, the pairs (l, e) it
    was coarsened to; `predicted`, the expected number of classes afterwards; `actual`, the number found (None
    before execution); `index`, the order of the quotient afterwards.
    """

    kind: str
    name: str
    exponents: tuple[tuple[int, int], ...]
    predicted: float
    index: int
    actual: int | None = None

    def __str__(self) -> str:
        found = "" if self.actual is None else f", found {self.actual}"
        parts = " * ".join(f"{ell}^{e}" if e > 1 else str(ell) for ell, e in self.exponents)
        return (f"{self.kind:8} {self.name} (exponent {parts or 1}): expected {self.predicted:.3g}{found} "
                f"classes of {self.index}")


Reporter = Callable[[Step], None]


@dataclass(frozen=True)
class Plan:
    """The steps in order; printing it gives one line for each."""

    steps: tuple[Step, ...]

    def __str__(self) -> str:
        return "\n".join(map(str, self.steps))

    @property
    def names(self) -> tuple[str, ...]:
        """The conditions used, in order of first use."""
        return tuple(dict.fromkeys(step.name for step in self.steps))


@dataclass(frozen=True, eq=False)
class Outcome:
    """What a run left: the relation, the executed plan, the largest number of classes met on the way."""

    relation: Relation
    plan: Plan
    largest: int


def _exponents(relation: Relation) -> tuple[tuple[int, int], ...]:
    return tuple(sorted(relation.exponents.items()))


def informative(relations: Sequence[Relation]) -> list[Relation]:
    """The conditions that exclude something, sorted by name."""
    return sorted((r for r in relations if r.count < r.index), key=lambda r: r.name)


def make_plan(relations: Sequence[Relation], start: Relation | None = None, *, known: int = 1,
              cap: float = 2e5, max_joins: int = 24, width: int = 12) -> Plan:
    """Predict a plan from the counts and subgroups of the conditions alone; no classes are touched.

    Arguments: the conditions (distinct names); a relation to start from (None: the planner picks one); how
    many classes are expected to survive everything (the known points); the largest predicted number of
    classes; the largest number of joins; how many options each choice compares.
    """
    pool = informative(relations)
    steps: list[Step] = []
    if start is None:
        start = choose_start(pool, cap)
        if start is None:
            return Plan(())
        steps.append(Step("start", start.name, _exponents(start), float(start.count), start.index))
    parts: dict[int, Characters] = dict(start.by_prime)
    size, used = float(start.count), {start.name}
    for number in range(max_joins + 1):
        outlook = Outlook(pool, parts)
        index = _order(parts)
        for place, relation in _waiting(outlook, used):
            size = max(size * exp(log_pass(relation.count, outlook.common[place])), float(min(known, size)))
            steps.append(Step("semijoin", relation.name, _exponents(relation), size, index))
        used |= _spent(outlook)
        if size == 0 or number == max_joins:
            break
        choice = choose(outlook, size, used, width, cap=cap)
        if choice is None:
            break
        parts, size = sum_of_parts(parts, choice.relation), choice.size
        steps.append(Step("join", choice.relation.name, _exponents(choice.relation), size, _order(parts)))
    return Plan(tuple(steps))


def _waiting(outlook: Outlook, used: Collection[str]) -> list[tuple[int, Relation]]:
    """The conditions worth a semijoin with the state: expected to remove at least one class in a thousand."""
    return [(place, relation) for place, relation in enumerate(outlook.pool)
            if relation.name not in used and log_pass(relation.count, outlook.common[place]) < -1e-3]


def _spent(outlook: Outlook) -> set[str]:
    """The conditions that live on the quotient of the state: after a semijoin they have said everything."""
    return {relation.name for place, relation in enumerate(outlook.pool) if outlook.absorbed(place)}


def _order(parts: Parts) -> int:
    return prod(part.order for part in parts.values())


def run_plan(plan: Plan, relations: Sequence[Relation], start: Relation | None = None, *, cap: int = 10**6,
             report: Reporter | None = None) -> Outcome:
    """Execute a plan on the classes; the same names as in `make_plan`.

    A join that would exceed `cap` classes is done with the condition coarsened prime by prime until it fits
    (left out if it never does).  Steps of the executed plan carry the sizes found; semijoins that removed
    nothing are left out.
    """
    by_name = {r.name: r for r in relations}
    state = start
    largest = 0 if start is None else start.count
    done: list[Step] = []
    for step in plan.steps:
        condition = coarsen(by_name[step.name], dict(step.exponents))
        if state is None:
            state, used = condition, condition
        elif step.kind == "semijoin":
            smaller, used = semijoin(state, condition), condition
            if smaller is state:
                continue
            state = smaller
        else:
            fitting = fit(state, condition, cap)
            if fitting is None:
                continue
            used = fitting
            state = join(state, used)
        largest = max(largest, state.count)
        done.append(replace(step, exponents=_exponents(used), index=state.index, actual=state.count))
        if report is not None:
            report(done[-1])
        if state.count == 0:
            break
    if state is None:
        state = trivial(relations[0].n if relations else 0)
    return Outcome(state, Plan(tuple(done)), largest)


def fit(state: Relation, condition: Relation, cap: int) -> Relation | None:
    """The condition, coarsened as little as it takes for the join with the state to have at most `cap`
    classes.

    Lowers the exponent of the prime with the largest part first.  None when even the last step does not fit
    or nothing is left.
    """
    while condition.parts and match(state, condition).size > cap:
        exponents = dict(condition.exponents)
        worst = max(exponents, key=lambda ell: (condition.by_prime[ell].order, ell))
        exponents[worst] -= 1
        condition = coarsen(condition, exponents)
    return condition if condition.parts or not condition.count else None


def sieve_classes(relations: Sequence[Relation], start: Relation | None = None, *, cap: int = 200_000,
                  max_joins: int = 24, width: int = 12, comfort: int = 20_000,
                  premiums: Sequence[float] = PREMIUMS, report: Reporter | None = None) -> Outcome:
    """The strongest statement about the vectors that all conditions allow, with exact sizes of every option
    in view.

    Arguments: conditions with distinct names; the relation to start from (labels are carried along); the
    largest number of classes; the largest number of joins; how many options each choice compares; `comfort`,
    see below; the premiums on new parts of the quotient, one run for each; a reporter that receives each
    executed step. Returns: of all relations met between joins, in all runs, the one with the largest log([L :
    K] / |W|) among those with at most `comfort` classes (or the first one if there is none), with the plan
    that leads to it.  An empty relation ends the work: no vector satisfies the conditions in its sources.
    """
    given = list(relations) if start is None else [*relations, start]
    pool = informative(shared_parts(given)[:len(relations)]) or informative(relations) or list(relations)
    best: tuple[float, Outcome] | None = None
    for premium in premiums:
        for outcome in sieve_run(pool, start, cap=cap, max_joins=max_joins, width=width, premium=premium,
                                 report=report):
            relation = outcome.relation
            if relation.count == 0:
                return outcome
            merit = log(relation.index) - log(relation.count)
            if best is None or (merit > best[0] + 1e-9 and relation.count <= comfort):
                best = (merit, outcome)
    assert best is not None
    return best[1]


def sieve_run(relations: Sequence[Relation], start: Relation | None = None, *, cap: int = 200_000,
              max_joins: int = 24, width: int = 12, premium: float = PREMIUMS[0],
              report: Reporter | None = None) -> Iterator[Outcome]:
    """One greedy run; yields the state whenever all semijoins are done, that is before each join and at the
    end.

    Arguments as in `sieve_classes`.  The last outcome has the plan of the whole run.  It ends when the set is
    empty, when no condition is left that adds anything, or at a limit.
    """
    pool = informative(relations)
    steps: list[Step] = []

    def record(kind: str, relation: Relation, expected: float) -> None:
        steps.append(Step(kind, relation.name, _exponents(relation), expected, state.index, state.count))
        if report is not None:
            report(steps[-1])

    if start is None:
        first = next((r for r in pool if r.count == 0), None) or choose_start(pool, cap, premium)
        if first is None:
            yield Outcome(trivial(relations[0].n if relations else 0), Plan(()), 1)
            return
        state = first
        record("start", first, float(first.count))
    else:
        state = start
    used, largest = {state.name}, state.count
    for number in range(max_joins + 1):
        outlook = Outlook(pool, state.by_prime)
        for place, relation in _waiting(outlook, used):
            expected = state.count * exp(log_pass(relation.count, outlook.common[place]))
            smaller = semijoin(state, relation)
            if smaller is not state:
                state = smaller
                record("semijoin", relation, expected)
            if state.count == 0:
                break
        used |= _spent(outlook)
        yield Outcome(state, Plan(tuple(steps)), largest)
        if number == max_joins or state.count == 0:
            return
        choice = choose(outlook, float(state.count), used, width, state, cap, premium)
        if choice is None:
            return
        state = join(state, choice.relation)
        largest = max(largest, state.count)
        record("join", choice.relation, choice.expected)
