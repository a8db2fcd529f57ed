"""The part of an appendix that says why a list of candidates is complete without anybody's word."""

from __future__ import annotations

from typing import Any

from sieve.curves.divisors import Point
from sieve.errors import SieveError
from sieve.local.logarithms import PadicIntegrals
from sieve.local.zero_counts import Integrals, prove
from sieve.proof.reader import LogView
from sieve.report import mathematics as m
from sieve.report.blocks import Block, Paragraph, Table

DIGITS = 12
"""Digits with which the zeros of whole discs are counted again for the table."""

SHOWN = 4
"""Digits of the differentials that are printed."""


def covered(view: LogView, p: int) -> bool:
    """Whether the candidates at p are all residue discs (with integral points in question: affine ones)."""
    discs = {tuple(c["point"]) for c in view.of("candidate") if c["prime"] == p and c["form"] == "disc"}
    if not discs:
        return False
    reduced = view.curve.modulo(p)
    count = reduced.affine_count if view.integral else reduced.count
    return discs.issuperset(_residue(reduced.points[i]) for i in range(count))


def completeness(view: LogView, p: int) -> str:
    """How a list at p is known to be complete, as the end of a sentence about it."""
    if any(r["id"] == f"complete {p}" for r in view.of("premise")):
        return " and is complete by assumption."
    if any(r["prime"] == p for r in view.of("zeros")):
        return ". It is complete, see below."
    if covered(view, p):
        kind = "affine residue discs" if view.integral else "residue discs"
        return f" and is complete: these are all {kind}."
    return " and need not be complete."


def zero_counts(view: LogView, p: int) -> list[Block]:
    """The annihilating differentials at p, and for every residue disc the zeros of their integrals."""
    record = next((r for r in view.of("zeros") if r["prime"] == p), None)
    if record is None:
        return []
    forms = record["annihilators"]
    shown = ", ".join(f"${_form(view, e, p)}$" for e in forms)
    point = "integral point" if view.integral else "rational point"
    since = "The logarithms of the free generators are independent, so given the rank " if view.free else (
        "Since $J(\\mathbb{Q})$ is finite, ")
    text = (
        f"{since}the integrals of {shown} (coefficients modulo ${p}^{{{SHOWN}}}$) over ${_degree(view)}$ are "
        f"$0$ for every {point} $P$. Their zeros in a ball are counted by the reduction of a power series; "
        f"subdividing the residue discs shows that every {point} agrees with a candidate, and bounds the "
        "number of those that do."
    )
    out: list[Block] = [Paragraph(text)]
    rows = _rows(view, p)
    if rows:
        header = ("residue disc", "zeros", "candidates", f"{point}s")
        caption = f"Zeros of an annihilating integral in the residue discs at {p}"
        out.append(Table(caption, header, tuple(rows), "lrlr"))
    return out


def _degree(view: LogView) -> str:
    d = view.base.degree
    return "P - B" if d == 1 else f"{d} P - B"


def _form(view: LogView, e: list[int], p: int) -> str:
    """A differential with coefficients modulo p^SHOWN."""
    curve, modulus = view.curve, p**SHOWN
    top = curve.degree - curve.weight - 2
    pairs = [(i, k) for k in range(top // curve.weight + 1) for i in range(top - curve.weight * k + 1)]
    x, y = (m.name(v) for v in curve.variables[:2])
    terms = []
    for c, (i, k) in zip(e, pairs, strict=True):
        c = c % modulus if c % modulus <= modulus // 2 else c % modulus - modulus
        power = "".join(f"{v}^{{{n}}}" if n > 1 else v for v, n in ((x, i), (y, k)) if n)
        if c:
            size = str(abs(c)) if abs(c) > 1 or not power else ""
            terms.append((" - " if c < 0 else " + ") + size + power)
    text = "".join(terms).removeprefix(" + ") or "0"
    text = "-" + text.removeprefix(" - ") if text.startswith(" - ") else text
    bracket = f"({text})" if len(terms) > 1 else "" if text == "1" else text
    if curve.weight > 1:
        h = any(curve.rows[1])
        return f"{bracket}\\,d{x}/(2{y} + h)" if h else f"{bracket}\\,d{x}/2{y}"
    return f"{bracket}\\,d{x}/F_{{{y}}}"


def _rows(view: LogView, p: int) -> list[tuple[str, ...]]:
    try:
        integrals = PadicIntegrals(view.curve, p, DIGITS)
        counts = dict(prove(Integrals(integrals, view.base, view.free), [], view.integral).counts)
    except SieveError:
        return []
    named: dict[Point, list[str]] = {}
    found: dict[Point, set[Point]] = {}
    fates = {r["id"]: r for r in view.of("fate") if r["prime"] == p}
    for c in view.of("candidate"):
        if c["prime"] == p and c["form"] != "coefficients":
            here = _residue([a % p for a in c["point"]])
            named.setdefault(here, []).append(c["id"])
            found.setdefault(here, set()).update(map(_residue, fates[c["id"]].get("points", [])))
    out: list[tuple[str, ...]] = []
    for disc in integrals.discs:
        zeros = counts.get(disc.number)
        if disc.number in counts:
            point = _residue(disc.point)
            ids = ", ".join(named.get(point, [])) or "none"
            x, y, z = point
            shown = f"({x}, {y})" if z == 1 and view.curve.weight > 1 else f"({x} : {y} : {z})"
            count = "?" if zeros is None else str(zeros)
            out.append((f"${shown}$", count, ids, str(len(found.get(point, ())))))
    return out


def _residue(point: Any) -> Point:
    """Three integers as a point."""
    x, y, z = (int(c) for c in point)
    return x, y, z
