"""The fate of every candidate: eliminated by which conditions, or alive and why.

A candidate is a label on some classes of a labelled relation.  It is eliminated when no vector of L lies in
one of its classes and satisfies all of a few conditions; the conditions responsible are kept as few as
possible.  Nothing is ever dropped without a `Fate` that says why.
"""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass

from sieve.engine.join import join, match, project, semijoin, semijoin_mask
from sieve.engine.outlook import PREMIUMS, Outlook, shared_parts, sum_of_parts
from sieve.engine.plan import Outcome, Reporter, Step, informative, sieve_run
from sieve.engine.relation import Relation, coarsen
from sieve.errors import Inconsistent, InternalError
from sieve.exact.primary import Characters

Exponents = tuple[tuple[int, int], ...]

SHARE = 2
"""Labels that a run together leaves open are tried one by one if it came this close to the largest size."""


@dataclass(frozen=True)
class Use:
    """One condition of an elimination: its name, the exponents (l, e) it was coarsened to, join or
    semijoin."""

    name: str
    exponents: Exponents
    kind: str


@dataclass(frozen=True)
class Fate:
    """What became of one candidate.

    Fields: `condition`, the candidate relation; `label`; `kind`:
      "image": no class of the candidate lies in the image of L (no other condition is needed);
      "single": one condition excludes all its classes;
      "several": the conditions together exclude them (`uses`, joined in this order, end with no class);
      "shared": open, and it will stay so with these conditions, since in the part of the group that they see
      it has a
        class in common with the labels `same_as`, which are rational points;
      "unseen": open, since no condition sees any part of its group;
      "open": open, `classes` classes are left in a quotient of order `index` after the conditions in `uses`;
        `exhausted` says that no condition is left that bears on them, so that only new conditions can help;
        otherwise a limit was reached.
    `exponents`: the part of the candidate's group that the conditions see, as pairs (l, e).
    """

    condition: str
    label: str
    kind: str
    uses: tuple[Use, ...] = ()
    same_as: tuple[str, ...] = ()
    classes: int = 0
    index: int = 1
    exponents: Exponents = ()
    exhausted: bool = True

    @property
    def eliminated(self) -> bool:
        """Whether the candidate is proved not to be rational (given that the conditions hold)."""
        return self.kind in ("image", "single", "several")

    @property
    def conditions(self) -> tuple[str, ...]:
        """The names of the conditions in `uses`, in order, without repetition."""
        return tuple(dict.fromkeys(use.name for use in self.uses))


    @property
    def reason(self) -> str:
        """The fate in words, without the name of the candidate."""
        names = ", ".join(self.conditions)
        seen = " * ".join(f"{ell}^{e}" if e > 1 else str(ell) for ell, e in self.exponents)
        if self.kind == "image":
            return "none of its classes lies in the image of the group"
        if self.kind == "single":
            return f"excluded by {names}"
        if self.kind == "several":
            return f"excluded by {names} together"
        if self.kind == "shared":
            return (f"in one class with {', '.join(self.same_as)} as far as the conditions see "
                    f"(exponent {seen}, quotient of order {self.index})")
        if self.kind == "unseen":
            return "no condition sees any part of its group"
        left = f"{self.classes} classes in a quotient of order {self.index}"
        used = f" after {names}" if names else ""
        if self.exhausted:
            return f"all conditions that bear on it allow {left}{used}"
        return f"a limit was reached with {left}{used}"


def visible_view(candidates: Relation, pool: Sequence[Relation]) -> Relation:
    """The candidates in the part of their group that the conditions see, L/(K + K_pool); loses nothing."""
    parts: dict[int, Characters] = {}
    for relation in pool:
        parts = sum_of_parts(parts, relation)
    return project(candidates, parts)


def replay(start: Relation, uses: Sequence[Use], by_name: Mapping[str, Relation],
           cap: int) -> Relation | None:
    """Apply the uses in order; None when a join exceeds the cap.  Stops as soon as no class is left."""
    state = start
    for use in uses:
        if state.count == 0:
            break
        condition = coarsen(by_name[use.name], dict(use.exponents))
        if use.kind == "semijoin":
            state = semijoin(state, condition)
        else:
            found = match(state, condition)
            if found.size > cap:
                return None
            state = join(state, condition, matching=found)
    return state


def shorten(start: Relation, uses: Sequence[Use], by_name: Mapping[str, Relation],
            cap: int) -> tuple[Use, ...]:
    """Leave out uses, the latest first, as long as the start still dies; the uses must kill it to begin with.

    A shorter list may need larger sets on the way: up to twice the largest one of the full list, and
    `cap`.
    """
    states, kept = [start], []
    for use in uses:
        state = replay(states[-1], [use], by_name, cap)
        if state is None:
            return tuple(uses)
        if use.kind == "semijoin" and state.count == states[-1].count:
            continue
        kept.append(use)
        states.append(state)
        if state.count == 0:
            break
    limit = min(cap, 1000 + 2 * max(state.count for state in states))
    # states[i] is the state after the first i kept uses, which the rounds to come do not touch
    for i in reversed(range(len(kept) - 1)):
        end = replay(states[i], kept[i + 1:], by_name, limit)
        if end is not None and end.count == 0:
            del kept[i]
    return tuple(kept)


def _last(outcomes: Iterator[Outcome]) -> Outcome:
    """The end of a run."""
    for outcome in outcomes:
        end = outcome
    return end


def _uses(steps: Sequence[Step]) -> tuple[Use, ...]:
    return tuple(Use(step.name, step.exponents, step.kind) for step in steps)


def _full(relation: Relation) -> Exponents:
    return tuple(sorted(relation.exponents.items()))


def _single_kills(view: Relation, wanted: Collection[str], pool: Sequence[Relation]) -> dict[str, str]:
    """For labels that one condition alone excludes the name of such a condition; few names overall (greedy
    cover)."""
    kills: dict[str, set[str]] = {}
    for condition in pool:
        mask = semijoin_mask(view, condition)
        if not mask.all():
            dead = set(wanted).difference(view.select(mask).labels)
            if dead:
                kills[condition.name] = dead
    chosen: dict[str, str] = {}
    while kills:
        name = min(kills, key=lambda k: (-len(kills[k]), k))
        for label in kills[name]:
            chosen[label] = name
        gone = set(kills.pop(name))
        kills = {k: left for k, dead in kills.items() if (left := dead - gone)}
    return chosen


def decide(candidates: Sequence[Relation], auxiliary: Sequence[Relation],
           rational: Collection[tuple[str, str]] = (), *, cap: int = 100_000, max_joins: int = 40,
           width: int = 12, report: Reporter | None = None) -> list[Fate]:
    """Decide every candidate as far as the conditions go.

    Arguments: labelled relations with distinct names (one for each Chabauty prime, or several where
    precisions differ); the conditions at auxiliary primes, names distinct from all others; pairs (relation
    name, label) of the candidates known to be rational; limits and the reporter as in `sieve_classes`. A
    candidate relation that is `complete` also serves as a condition for the others.  It must then have a
    class for every rational point of X. Returns: one fate for each label that is not known to be rational, by
    relation in the given order, then by label. Raises: Inconsistent (witness = the label) when a candidate
    known to be rational is excluded.
    """
    names = [r.name for r in [*candidates, *auxiliary]]
    if len(set(names)) != len(names):
        raise InternalError("two conditions have the same name")
    fates: list[Fate] = []
    for relation in candidates:
        others = [r.unlabelled() for r in candidates if r is not relation and r.complete]
        pool = informative(shared_parts([*auxiliary, *others, relation])[:-1])
        known = {label for name, label in rational if name == relation.name}
        fates.extend(_decide_one(relation, pool, known, cap, max_joins, width, report))
    return fates


def _decide_one(relation: Relation, pool: Sequence[Relation], known: set[str], cap: int, max_joins: int,
                width: int, report: Reporter | None) -> list[Fate]:
    name = relation.name
    by_name = {r.name: r for r in pool}
    for label in sorted(known.intersection(relation.outside)):
        raise Inconsistent(f"{name}: the rational candidate {label} is not in the image of the group", label)
    found = {label: Fate(name, label, "image") for label in relation.outside}
    view = visible_view(relation, pool)
    seen = _full(view)
    labels = [label for label in relation.labels if label not in known]
    known_view = view.with_labels(known)
    for condition in pool:
        kept = known_view.select(semijoin_mask(known_view, condition)).labels
        for label in sorted(known.intersection(view.labels).difference(kept)):
            raise Inconsistent(
                f"{name}: the rational candidate {label} is excluded by {condition.name}", label)
    if all(condition.count for condition in pool):
        shared = _shared(view, known)
        for label in labels:
            if not view.parts:
                found[label] = Fate(name, label, "unseen", classes=1)
            elif label in shared:
                found[label] = Fate(name, label, "shared", same_as=shared[label], classes=1, index=view.index,
                                    exponents=seen)

    todo = [label for label in labels if label not in found]
    for label, killer in _single_kills(view.with_labels(todo), todo, pool).items():
        use = Use(killer, _full(by_name[killer]), "semijoin")
        found[label] = Fate(name, label, "single", (use,), exponents=seen)

    todo = [label for label in todo if label not in found]
    known_state = _Known(known_view, known)
    end: Outcome | None = None
    for premium in PREMIUMS:
        todo = [label for label in todo if label not in found]
        if not todo or (end is not None and _exhausted(end.relation, pool)):
            break
        start = view.with_labels(todo)
        end = _last(sieve_run(pool, start, cap=cap, max_joins=max_joins, width=width, premium=premium,
                              report=report))
        uses = _uses(end.plan.steps)
        known_state.check(uses, by_name, cap)
        for label in set(todo).difference(end.relation.labels):
            found[label] = _several(view, label, uses, by_name, cap)
    todo = [label for label in todo if label not in found]
    for label in todo:
        assert end is not None
        # alone a label has room for more classes
        alone = _one(view, label, pool, by_name, cap, max_joins, width, report) if (
            len(todo) > 1 and SHARE * end.relation.count > cap) else None
        found[label] = alone or _open(view, label, end, pool)
    return [found[label] for label in sorted(found)]


class _Known:
    """The rational candidates, which go the same way as the others, as a check on the data."""

    def __init__(self, view: Relation, known: set[str]) -> None:
        self.view, self.known = view, known

    def check(self, uses: Sequence[Use], by_name: Mapping[str, Relation], cap: int) -> None:
        """Raise `Inconsistent` if the uses exclude one of them."""
        state = self.view
        for use in uses:
            following = replay(state, [use], by_name, cap)
            if following is None:
                break
            missing = self.known.intersection(self.view.labels).difference(following.labels)
            for label in sorted(missing):
                raise Inconsistent(f"{self.view.name}: the rational candidate {label} is excluded by "
                                   f"{', '.join(dict.fromkeys(u.name for u in uses))}", label)
            state = following


def _open(view: Relation, label: str, end: Outcome, pool: Sequence[Relation]) -> Fate:
    """The fate of a label that a run left over."""
    left = end.relation.with_labels([label])
    return Fate(view.name, label, "open", _uses(end.plan.steps), classes=left.count, index=left.index,
                exponents=_full(view), exhausted=_exhausted(end.relation, pool))


def _one(view: Relation, label: str, pool: Sequence[Relation], by_name: Mapping[str, Relation], cap: int,
         max_joins: int, width: int, report: Reporter | None) -> Fate:
    """Sieve one label by itself."""
    end = _last(sieve_run(pool, view.with_labels([label]), cap=cap, max_joins=max_joins, width=width,
                          premium=PREMIUMS[0], report=report))
    if end.relation.count == 0:
        return _several(view, label, _uses(end.plan.steps), by_name, cap)
    return _open(view, label, end, pool)


def _several(view: Relation, label: str, uses: Sequence[Use], by_name: Mapping[str, Relation],
             cap: int) -> Fate:
    short = shorten(view.with_labels([label]), uses, by_name, cap)
    kind = "single" if len({use.name for use in short}) == 1 else "several"
    return Fate(view.name, label, kind, short, exponents=_full(view))


def _exhausted(end: Relation, pool: Sequence[Relation]) -> bool:
    """Whether the end of a run is independent of all conditions that do not live on its quotient."""
    outlook = Outlook(pool, end.by_prime)
    return not outlook.joint_primes(())


def _shared(view: Relation, known: set[str]) -> dict[str, tuple[str, ...]]:
    """For labels with a class in common with rational candidates these candidates."""
    out: dict[str, set[str]] = {}
    for labels in view.label_sets:
        rational = known.intersection(labels)
        if rational:
            for label in labels:
                if label not in known:
                    out.setdefault(label, set()).update(rational)
    return {label: tuple(sorted(names)) for label, names in out.items()}
