"""Plans: which conditions are joined in which order, predicted, executed, printed.

A plan is data: `make_plan` predicts one from counts and subgroups alone, `run_plan` executes it, and
`sieve_classes` plans with the exact sizes as it goes.  Sizes are kept below a cap by using coarser
conditions.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Sequence
from dataclasses import dataclass, replace
from math import exp, log, prod

from sieve.engine.join import join, match, semijoin
from sieve.engine.outlook import Outlook, Parts, choose, choose_start, log_pass, sum_of_parts
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
              cap: float = 2e5, max_joins: int = 16, width: int = 12) -> Plan:
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
    return condition if condition.parts else None


def sieve_classes(relations: Sequence[Relation], start: Relation | None = None, *, cap: int = 200_000,
                  max_joins: int = 16, width: int = 12, comfort: int | None = 20_000,
                  report: Reporter | None = None,
                  finished: Callable[[Relation], bool] | None = None) -> Outcome:
    """Sieve with the exact size of every option in view, from `start` or from the best first condition.

    Arguments: conditions with distinct names; the relation to start from (labels are carried along); the
    largest number of classes; the largest number of joins; how many options each choice compares; `comfort`,
    see below; a reporter that receives each executed step; a predicate that ends the run early. Returns: with
    `comfort` None the last relation; otherwise the relation on the way with the largest log([L : K] / |W|),
    that is with the strongest statement, among those with at most `comfort` classes (or the first one if
    there is none).  The plan has the steps up to that relation.  An empty relation proves that no vector
    satisfies the conditions in its sources.
    """
    pool = informative(relations)
    steps: list[Step] = []

    def record(step: Step) -> None:
        steps.append(step)
        if report is not None:
            report(step)

    def result(relation: Relation, count: int) -> Outcome:
        return Outcome(relation, Plan(tuple(steps[:count])), largest)

    largest = 1
    if start is None:
        empty = next((r for r in pool if r.count == 0), None)
        start = empty if empty is not None else choose_start(pool, cap)
        if start is None:
            return result(trivial(relations[0].n if relations else 0), 0)
        record(Step("start", start.name, _exponents(start), float(start.count), start.index, start.count))
    state, used = start, {start.name}
    largest = state.count
    best: tuple[float, Relation, int] | None = None
    for number in range(max_joins + 1):
        outlook = Outlook(pool, state.by_prime)
        for place, relation in _waiting(outlook, used):
            expected = state.count * exp(log_pass(relation.count, outlook.common[place]))
            smaller = semijoin(state, relation)
            if smaller is not state:
                state = smaller
                record(Step("semijoin", relation.name, _exponents(relation), expected, state.index,
                            state.count))
            if state.count == 0:
                return result(state, len(steps))
        used |= _spent(outlook)
        merit = log(state.index) - log(state.count)
        if best is None or (merit > best[0] and (comfort is None or state.count <= comfort)):
            best = (merit, state, len(steps))
        if number == max_joins or (finished is not None and finished(state)):
            break
        choice = choose(outlook, float(state.count), used, width, exact=state, cap=cap)
        if choice is None:
            break
        state = join(state, choice.relation)
        largest = max(largest, state.count)
        record(Step("join", choice.relation.name, _exponents(choice.relation), choice.expected, state.index,
                    state.count))
        if state.count == 0:
            return result(state, len(steps))
    if comfort is None or best is None:
        return result(state, len(steps))
    return result(best[1], best[2])
