"""Trimming: walk back from the fates and the classes, keep what they need.

Works on records with or without their evidence, so that evidence is made only for what is kept.  Premises and
candidates are part of the statement and stay; index premises stay when a kept step needs them.
"""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass, field
from typing import Any

Record = dict[str, Any]


@dataclass
class _Needs:
    """What some fate or class rests on."""

    ells: set[int] = field(default_factory=set)
    primes: set[int] = field(default_factory=set)
    padic: set[int] = field(default_factory=set)
    every_ell: bool = False


def trim(records: Sequence[Record], image_ells: Collection[int] | None = None) -> list[Record]:
    """The records that the fates and classes need, in their order, with the new number in `end`.

    Arguments: a whole log; `image_ells`, primes l that suffice for the eliminated fates without uses (None:
    unknown, then all are kept).  Classes are dropped where there are candidates.  Trimming twice
    changes nothing.
    """
    needs = _Needs()
    fates = [r for r in records if r["kind"] == "fate"]
    end = next(r for r in records if r["kind"] == "end")
    counted = {r["prime"] for r in records if r["kind"] == "zeros"}
    claimed = {r["prime"] for r in records if r["kind"] == "premise" and r["id"].startswith("complete ")}
    listed = claimed | counted
    wants_classes = not fates and not (end["conclusion"] == "empty" and listed)
    padic = {r["prime"]: r for r in records if r["kind"] == "padic"}
    local = {r["prime"] for r in records if r["kind"] == "local"}
    forms = _forms(records)
    for fate in fates:
        if fate["verdict"] == "eliminated":
            _need_place(fate["prime"], padic, local, forms, needs)
            _need_uses(fate["uses"], padic, local, forms, needs)
            if not fate["uses"]:
                needs.ells |= set(image_ells or ())
                needs.every_ell |= image_ells is None
    for p in counted:
        needs.padic.add(p)
        if padic.get(p, {}).get("reduction"):
            needs.primes.add(p)
    for record in records:
        if record["kind"] == "classes" and wants_classes:
            _need_uses(record["uses"], padic, local, forms, needs)
    saturated = {r["ell"]: r for r in records if r["kind"] == "saturated"}
    torsion = {r["ell"]: r for r in records if r["kind"] == "torsion"}
    kept_ells = set(saturated) if needs.every_ell else needs.ells & set(saturated)
    branch = False
    for ell in kept_ells:
        needs.primes |= set(saturated[ell]["primes"])
        by = torsion[ell]["by"]
        branch |= by == "branch"
        if by != "branch":
            needs.primes.add(by)
    keep = {
        "local": lambda r: r["prime"] in needs.primes,
        "padic": lambda r: r["prime"] in needs.padic,
        "branch": lambda r: branch,
        "torsion": lambda r: r["ell"] in kept_ells,
        "saturated": lambda r: r["ell"] in kept_ells,
        "classes": lambda r: wants_classes,
        "premise": lambda r: "ell" not in r or needs.every_ell or r["ell"] in needs.ells - kept_ells,
    }
    out = [dict(r) for r in records if r["kind"] not in keep or keep[r["kind"]](r)]
    out[-1]["records"] = len(out) - 1
    return out


def _forms(records: Sequence[Record]) -> dict[int, tuple[bool, bool]]:
    """For each Chabauty prime: are there points or discs, are there coefficients with a disc?"""
    out: dict[int, tuple[bool, bool]] = {}
    for r in records:
        if r["kind"] == "candidate":
            points, discs = out.get(r["prime"], (False, False))
            located = r["form"] != "coefficients"
            out[r["prime"]] = (points or located, discs or (not located and r["disc"] is not None))
    return out


def _need_place(
    p: int, padic: dict[int, Record], local: set[int], forms: dict[int, tuple[bool, bool]], needs: _Needs
) -> None:
    points, discs = forms.get(p, (False, False))
    reduction = discs
    if points:
        if p in padic:
            needs.padic.add(p)
            reduction |= padic[p]["reduction"]
        else:
            reduction = True
    if reduction and p in local:
        needs.primes.add(p)


def _need_uses(
    uses: Sequence[Sequence[Any]],
    padic: dict[int, Record],
    local: set[int],
    forms: dict[int, tuple[bool, bool]],
    needs: _Needs,
) -> None:
    for name, exponents, _ in uses:
        needs.ells |= {int(ell) for ell in exponents}
        if isinstance(name, int):
            needs.primes.add(name)
        elif name.startswith("deep "):
            needs.primes.add(int(name[5:]))
            needs.padic.add(int(name[5:]))
        else:
            _need_place(int(name.split("=")[1]), padic, local, forms, needs)


__all__ = ["Record", "trim"]
