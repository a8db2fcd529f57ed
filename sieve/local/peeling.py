"""A small base for relations with few points each: sections that define all other points one after another.

Given many sections with rational zeros alone, base points are chosen greedily: whenever no section
has exactly one unknown point, the point that the most sections with two unknown points share joins the base.
What is left over are relations between base points (structured elimination, as for any sparse system).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

IntArray = NDArray[np.int64]


@dataclass(frozen=True)
class Peeling:
    """`base`: points; `steps`: (section, the point it defines), in order; `rest`: the other sections.

    The rest is ordered by how many steps its points take.
    """

    base: tuple[int, ...]
    steps: tuple[tuple[int, int], ...]
    rest: tuple[int, ...]


def peel(sections: IntArray, count: int) -> Peeling:
    """Order sections by what they define.

    Arguments: `sections`, int64, shape (L, m), rows of zeros with repetition, numbers below `count`.
    """
    known = np.zeros(count, dtype=bool)
    depth = np.zeros(count, dtype=np.int64)
    used = np.zeros(len(sections), dtype=bool)
    base: list[int] = []
    steps: list[tuple[int, int]] = []
    while not known.all():
        unknown = ~known[sections]
        missing = unknown.sum(axis=1)
        single = np.flatnonzero(missing == 1)
        if len(single):
            targets = sections[single][unknown[single]]
            height = np.where(unknown[single], 0, depth[sections[single]]).max(axis=1)
            order = np.lexsort((single, height, targets))
            firsts = order[np.unique(targets[order], return_index=True)[1]]
            for k in firsts.tolist():
                steps.append((int(single[k]), int(targets[k])))
            used[single[firsts]] = True
            depth[targets[firsts]] = 1 + height[firsts]
            known[targets[firsts]] = True
            continue
        double = np.flatnonzero(missing == 2)
        gain = np.bincount(sections[double][unknown[double]], minlength=count) * (len(sections) + 1)
        gain = gain + np.bincount(sections[unknown], minlength=count)
        gain[known] = -1
        base.append(int(gain.argmax()))
        known[base[-1]] = True
    left = np.flatnonzero(~used)
    order = np.lexsort((left, depth[sections[left]].sum(axis=1)))
    return Peeling(tuple(base), tuple(steps), tuple(left[order].tolist()))


def combinations(
    sections: IntArray, peeling: Peeling, columns: dict[int, int], width: int, multiple: int
) -> NDArray[np.object_]:
    """Every point as a combination of (U, base points), integers of any size; shape (count, width).

    Arguments: `columns`, the column of every base point that has one (the others are 0); sections have the
    class `multiple` times U, which is column 0.
    """
    count = len(peeling.base) + len(peeling.steps)
    out = np.zeros((count, width), dtype=object)
    for point, column in columns.items():
        out[point, column] = 1
    for number, target in peeling.steps:
        others = [i for i in sections[number].tolist() if i != target]
        row = -out[others].sum(axis=0)
        row[0] += multiple
        out[target] = row
    return out


__all__ = ["Peeling", "combinations", "peel"]
