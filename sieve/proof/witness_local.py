"""Evidence for J(F_v): the `local` record, with sections that define every point and close the lattice."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from sieve.curves.divisors import Place
from sieve.curves.protocol import Curve
from sieve.errors import InternalError
from sieve.local.order_bounds import order_lower_bound
from sieve.local.picard import picard_group
from sieve.local.rational_sections import Section, present, section_through


def local_document(curve: Curve, v: int, places: Sequence[Place]) -> dict[str, Any]:
    """The `local` record at a good prime v whose group and places are expressible.

    Arguments: `places`, the closed places of the statement in order.  Raises `InternalError` when sections
    that were found before are not found now.
    """
    reduced = curve.modulo(v)
    if reduced.count == 0:
        return _document(v, [], None, [], [], [], [], [], 0)
    group = picard_group(reduced)
    found = present(group)
    if found is None:
        raise InternalError(f"v = {v}: no sections with rational zeros present the group")
    shown = []
    for k, place in enumerate(places):
        section = section_through(reduced, place)
        if section is None:
            raise InternalError(f"v = {v}: no section with rational zeros through closed point {k}")
        shown.append([k, *_pair(section)])
    sharp = group.order < 2 * order_lower_bound(v, curve.genus, reduced.count)
    base = [[number, [int(c) for c in group.point_logs[number]]] for number in found.base]
    return _document(
        v,
        list(group.invariants),
        found.origin,
        list(group.unit_log),
        base,
        [_pair(s) for s in found.define],
        [_pair(s) for s in found.close],
        shown,
        0 if sharp else curve.genus,
    )


def _pair(section: Section) -> list[list[Any]]:
    """A section as [n, row0, row1, ..], and zeros."""
    return [[section.multiple, *(list(row) for row in section.rows)], list(section.zeros)]


def _document(
    v: int,
    invariants: list[int],
    origin: int | None,
    unit: list[int],
    base: list[list[Any]],
    define: list[list[list[Any]]],
    close: list[list[list[Any]]],
    places: list[list[Any]],
    counts: int,
) -> dict[str, Any]:
    return {
        "kind": "local",
        "prime": v,
        "invariants": invariants,
        "origin": origin,
        "unit": unit,
        "base": base,
        "define": define,
        "close": close,
        "places": places,
        "counts": counts,
    }
