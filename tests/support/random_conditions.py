"""Random conditions with planted vectors, and slow ways to say what they allow."""

from __future__ import annotations

import random
from collections.abc import Iterator, Sequence
from dataclasses import replace
from itertools import product
from math import lcm

import numpy as np

from sieve.local.condition import Condition

Vector = tuple[int, ...]


def image(condition: Condition, vector: Sequence[int]) -> Vector:
    """The image of an integer vector in A, with Python integers."""
    return tuple(
        sum(int(x) * row[j] for x, row in zip(vector, condition.images, strict=True)) % m
        for j, m in enumerate(condition.moduli)
    )


def allows(condition: Condition, vector: Sequence[int]) -> bool:
    """Whether the image of an integer vector is allowed, by comparing lists."""
    return list(image(condition, vector)) in condition.allowed.tolist()


def make(name: str, moduli: Sequence[int], images: Sequence[Sequence[int]], allowed: Sequence[Sequence[int]],
         labels: Sequence[Sequence[str]] | None = None, complete: bool = True) -> Condition:
    """A condition from plain lists."""
    return Condition(
        name, 0, tuple(moduli), tuple(tuple(row) for row in images),
        np.array(allowed, dtype=np.int64).reshape(len(allowed), len(moduli)),
        None if labels is None else tuple(tuple(ids) for ids in labels), complete)


def random_condition(rng: random.Random, name: str, n: int, *,
                     moduli: Sequence[int] = (2, 3, 4, 5, 6, 8, 9, 12), planted: Sequence[Vector] = (),
                     density: float | None = None, factors: int = 2) -> Condition:
    """Up to `factors` cyclic factors from `moduli`, random images, a random allowed set with the planted
    vectors."""
    m = [rng.choice(list(moduli)) for _ in range(rng.randint(1, factors))]
    images = [[rng.randrange(q) for q in m] for _ in range(n)]
    everything = list(product(*(range(q) for q in m)))
    share = rng.random() if density is None else density
    allowed = {t for t in everything if rng.random() < share}
    empty = make(name, m, images, [])
    allowed |= {image(empty, x) for x in planted}
    return make(name, m, images, sorted(allowed))


def labelled(rng: random.Random, condition: Condition, count: int) -> Condition:
    """The same condition with labels z0 .. z(count-1) spread over its rows at random, one to three on
    each."""
    ids = [f"z{k}" for k in range(count)]
    labels = tuple(tuple(sorted(rng.sample(ids, rng.randint(1, min(3, count)))))
                   for _ in range(condition.count))
    return replace(condition, labels=labels)


def exponent(conditions: Sequence[Condition]) -> int:
    """A modulus N such that all conditions are about Z^n modulo N."""
    return lcm(*(m for condition in conditions for m in condition.moduli))


def box(n: int, modulus: int) -> Iterator[Vector]:
    """All vectors of Z^n modulo a modulus."""
    return product(range(modulus), repeat=n)


def survivors(conditions: Sequence[Condition], n: int) -> set[Vector]:
    """All vectors modulo the exponent that every condition allows, one by one."""
    return {x for x in box(n, exponent(conditions)) if all(allows(c, x) for c in conditions)}
