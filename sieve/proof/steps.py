"""The steps that kill candidates, as the log tells them: checked again, with as few primes l as possible.

The log names, for each use of a condition, the l-parts it takes, modulo l^e times the image of L.  That is
what coarsening does in the engine, except that the engine also drops allowed classes outside the image of L
in l-parts that a use does not name; such parts are added here where they matter.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from sieve.engine.fates import Use
from sieve.engine.join import join, match, semijoin
from sieve.engine.relation import Relation, coarsen, relation_from_condition, trivial
from sieve.errors import InternalError
from sieve.local.condition import Condition
from sieve.proof.statement import ProofInput, Step, step_of

CAP = 400_000
"""The largest number of classes in a state of the log."""

EFFORT = 20_000
"""Dropping primes l is tried while (number of primes) * (number of eliminated candidates) is at most this."""


@dataclass(frozen=True)
class Elimination:
    """Why a candidate is not rational: its steps, and the primes l that they need."""

    condition: str
    label: str
    steps: tuple[Step, ...]
    ells: frozenset[int]


class Steps:
    """Conditions of one run by their names in the log, and replays of steps."""

    def __init__(self, source: ProofInput) -> None:
        self.source = source
        self.candidates: dict[str, Condition] = {}
        self.complete: dict[str, Condition] = {}
        for listing in source.lists:
            for condition in listing.conditions(source.rank, source.orders):
                self.candidates[condition.name] = condition
                if condition.complete:
                    self.complete[condition.name] = condition
        self._relations: dict[tuple[object, ...], Relation] = {}

    def condition(self, name: int | str) -> Condition:
        """The condition that a step names."""
        if isinstance(name, str):
            word, number = name.split(" ", 1)
            return self.source.deep[int(number)] if word == "deep" else self.complete[name]
        return self.source.records[name].condition(self.source.images[name])

    def relation(self, step: Step) -> Relation:
        """The relation of a step: the named l-parts only, coarsened, without labels."""
        key = (step.name, step.exponents)
        if key not in self._relations:
            whole = self._part(step.name, tuple(ell for ell, _ in step.exponents))
            self._relations[key] = coarsen(whole, dict(step.exponents)).unlabelled()
        return self._relations[key]

    def _part(self, name: int | str, ells: tuple[int, ...]) -> Relation:
        key = (name, ells, "part")
        if key not in self._relations:
            self._relations[key] = relation_from_condition(self.condition(name), ells)
        return self._relations[key]

    def start(self, name: str, label: str, ells: Sequence[int]) -> Relation:
        """The classes of one candidate in the given l-parts (none when it is outside the image of L)."""
        key = (name, tuple(ells), "start")
        if key not in self._relations:
            self._relations[key] = relation_from_condition(self.candidates[name], ells)
        return self._relations[key].with_labels([label])

    def replay(self, state: Relation, steps: Sequence[Step], cap: int = CAP) -> Relation | None:
        """Apply steps; None beyond the cap."""
        for step in steps:
            if state.count == 0:
                break
            other = self.relation(step)
            if step.kind == "semijoin":
                state = semijoin(state, other)
            else:
                found = match(state, other)
                if found.size > cap:
                    return None
                state = join(state, other, matching=found)
        return state

    def dies(self, name: str, label: str, steps: Sequence[Step], cap: int = CAP) -> bool:
        """Whether the steps leave nothing of a candidate, with only the primes l that they name."""
        start = self.start(name, label, sorted({ell for step in steps for ell, _ in step.exponents}))
        end = self.replay(start, steps, cap)
        return end is not None and end.count == 0

    def completed(self, steps: Sequence[Step]) -> tuple[Step, ...]:
        """The steps with those l-parts added in which allowed classes lie outside the image of L."""
        out = []
        for step in steps:
            named = dict(step.exponents)
            for ell in self.source.ells:
                if ell not in named and self._part(step.name, (ell,)).outside_count:
                    named[ell] = 1
            out.append(Step(step.name, tuple(sorted(named.items())), step.kind))
        return tuple(out)


def eliminations(steps: Steps) -> dict[tuple[int, str], Elimination]:
    """The eliminated candidates of a run, by (prime, id), each checked by a replay.

    Raises `InternalError` when a replay does not end with the empty set.
    """
    out: dict[tuple[int, str], Elimination] = {}
    for decision in steps.source.decisions:
        fate = decision.fate
        if decision.verdict != "eliminated":
            continue
        if fate is None:
            # a candidate at infinity where integral points are sought
            out[decision.prime, decision.id] = Elimination("", decision.id, (), frozenset())
            continue
        name, label = fate.condition, fate.label
        if fate.kind == "image":
            ell = next((q for q in steps.source.ells if not steps.start(name, label, [q]).count), None)
            if ell is None:
                raise InternalError(f"candidate {label} is in the image at every prime")
            out[decision.prime, label] = Elimination(name, label, (), frozenset({ell}))
            continue
        found = tuple(step_of(use) for use in fate.uses)
        if not steps.dies(name, label, found):
            found = steps.completed(found)
            if not steps.dies(name, label, found):
                raise InternalError(f"the steps that eliminate candidate {label} do not")
        out[decision.prime, label] = _elimination(name, label, found)
    return _with_few_primes(steps, out)


def _elimination(name: str, label: str, found: tuple[Step, ...]) -> Elimination:
    return Elimination(name, label, found, frozenset(ell for step in found for ell, _ in step.exponents))


def _with_few_primes(
    steps: Steps, found: dict[tuple[int, str], Elimination]
) -> dict[tuple[int, str], Elimination]:
    """Drop every prime l that no candidate needs, the largest first."""
    out = dict(found)
    ells = sorted({ell for e in found.values() if e.steps for ell in e.ells}, reverse=True)
    fixed = {ell for e in found.values() if not e.steps for ell in e.ells}
    if len(ells) * len(out) > EFFORT:
        return out
    for ell in ells:
        if ell in fixed:
            continue
        changed: dict[tuple[int, str], Elimination] = {}
        for key, e in out.items():
            if ell in e.ells:
                shorter = tuple(
                    Step(s.name, tuple(x for x in s.exponents if x[0] != ell), s.kind) for s in e.steps
                )
                if any(not s.exponents for s in shorter) or not steps.dies(
                    e.condition, e.label, shorter, 20_000
                ):
                    break
                changed[key] = _elimination(e.condition, e.label, shorter)
        else:
            out.update(changed)
    return out


def class_steps(steps: Steps) -> tuple[tuple[Step, ...], Relation] | None:
    """The steps from all of L to the classes that are left, and these classes; None beyond the limits."""
    outcome = steps.source.outcome
    if outcome is None:
        return None
    found = tuple(
        step_of(Use(s.name, s.exponents, "semijoin" if s.kind == "semijoin" else "join"))
        for s in outcome.plan.steps
    )
    start = trivial(steps.source.size)
    end = steps.replay(start, found)
    if end is None or end.count != outcome.relation.count:
        found = steps.completed(found)
        end = steps.replay(start, found)
    if end is None:
        return None
    if end.count == 0:
        found = _fewer(steps, start, found)
    return found, end


def _fewer(steps: Steps, start: Relation, found: tuple[Step, ...]) -> tuple[Step, ...]:
    """Leave out steps, the latest first, as long as nothing is left in the end."""
    kept = list(found)
    for i in reversed(range(len(kept))):
        shorter = kept[:i] + kept[i + 1 :]
        end = steps.replay(start, shorter, 50_000)
        if end is not None and end.count == 0:
            kept = shorter
    return tuple(kept)
