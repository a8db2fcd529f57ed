"""`sieve inspect CASE --propose`: a base divisor and generators for a case file that lacks them."""

from __future__ import annotations

import json
from concurrent.futures import Executor
from dataclasses import dataclass
from typing import Any

from sieve.curves.divisors import Divisor, RationalPlace
from sieve.curves.protocol import Curve
from sieve.engine.proposal import Proposal, propose
from sieve.errors import Inconsistent
from sieve.files.case import FORMAT, HALF_FIBRE, Sketch, load_sketch
from sieve.files.notation_out import divisor_document
from sieve.files.resolve import curve_of


@dataclass(frozen=True)
class Proposed:
    """A case file in part, its curve, and what was found for it."""

    sketch: Sketch
    curve: Curve
    proposal: Proposal


def execute(case_path: str, executor: Executor | None = None) -> Proposed:
    """Read the curve and perhaps the rank, search; raises `Inconsistent` when more generators are found."""
    sketch = load_sketch(case_path)
    curve = curve_of(sketch.equation)
    found = propose(curve, sketch.rank, executor=executor)
    if sketch.rank is not None and len(found.generators) > sketch.rank:
        raise Inconsistent(
            f"{len(found.generators)} independent divisor classes for rank {sketch.rank}", "jacobian.rank"
        )
    return Proposed(sketch, curve, found)


def _base(done: Proposed) -> Any:
    base = done.proposal.base
    if base.degree == 2:
        return HALF_FIBRE
    if len(base.terms) == 1 and isinstance(base.terms[0][1], RationalPlace):
        return done.curve.format_point(base.terms[0][1].point)
    return divisor_document(done.curve, base)


def document(done: Proposed) -> dict[str, Any]:
    """The document of `--json`: what a case file would say, in its notation."""
    proposal, curve = done.proposal, done.curve
    return {
        "known_points": [curve.format_point(p) for p in proposal.points],
        "base": _base(done),
        "generators": [divisor_document(curve, d) for d in proposal.generators],
        "torsion": [{"order": t, "divisor": divisor_document(curve, d)} for t, d in proposal.torsion],
        "rank": done.sketch.rank,
        "size": proposal.size,
    }


def _toml(value: Any) -> str:
    if isinstance(value, dict):
        return "{ " + ", ".join(f"{key} = {_toml(item)}" for key, item in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(map(_toml, value)) + "]"
    return json.dumps(value, ensure_ascii=False)


def _variables(sketch: Sketch) -> list[str]:
    """The order of the variables of a plane curve, where it is not the usual one."""
    names = list(sketch.equation.variables)
    return [f"variables = {_toml(names)}"] if names != ["x", "y", "z"] else []


def text(done: Proposed) -> str:
    """A case file; comments say what is missing and what the user must supply."""
    sketch, proposal, curve = done.sketch, done.proposal, done.curve
    found = len(proposal.generators)
    rank = found if sketch.rank is None else sketch.rank
    where = "lines" if curve.weight == 1 else "y = c(x)/d"
    lines = [
        f"# Proposed from a search for closed points on {where} with coefficients up to {proposal.size}.",
        f'format = "{FORMAT}"',
        f"name = {_toml(sketch.name)}",
        f"known_points = {_toml([curve.format_point(p) for p in proposal.points])}",
        *(["integral = true"] if sketch.integral else []),
        "",
        "[curve]",
        f"equation = {_toml(sketch.equation.text)}",
        *_variables(sketch),
        "",
        "[jacobian]",
    ]
    if sketch.rank is None:
        lines.append(f"# {found} independent divisors were found; a proof that this is the rank is missing")
    elif found != rank:
        lines.append(f"# {found} independent divisors were found, not {rank}: this file is not complete")
    elif proposal.unsaturated:
        ells = ", ".join(map(str, proposal.unsaturated))
        lines.append(f"# whether the index of this group in J(Q) is prime to {ells} is not known")
    if proposal.base.degree == 2:
        lines.append("# no closed point of odd degree was found: [2 P - U], U a fibre of x, replaces [P - B]")
    lines += [
        f"rank = {rank}",
        f"rank_source = {_toml(sketch.rank_source)}",
        f"base = {_toml(_base(done))}",
    ]

    def table(name: str, divisor: Divisor, order: int | None) -> None:
        lines.extend(["", f"[[jacobian.{name}]]"])
        if order is not None:
            lines.append(f"order = {order}")
        lines.append(f"divisor = {_toml(divisor_document(curve, divisor))}")

    for divisor in proposal.generators:
        table("generators", divisor, None)
    for order, divisor in proposal.torsion:
        table("torsion", divisor, order)
    return "\n".join(lines) + "\n"
