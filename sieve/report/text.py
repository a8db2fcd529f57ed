"""The report of a run, as plain text for a mathematician."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from sieve.files.notation_out import divisor_text, equation_text, structure_text
from sieve.files.result import Result, Verdict
from sieve.proof.writer import ProofLog


def _table(header: Sequence[str], rows: Sequence[Sequence[str]], right: Sequence[bool]) -> list[str]:
    widths = [
        max(len(header[i]), *(len(row[i]) for row in rows)) if rows else len(header[i])
        for i in range(len(header))
    ]

    def line(cells: Sequence[str]) -> str:
        parts = [c.rjust(w) if r else c.ljust(w) for c, w, r in zip(cells, widths, right, strict=True)]
        return "  " + "  ".join(parts).rstrip()

    return [line(header), "  " + "  ".join("-" * w for w in widths), *map(line, rows)]


def _wrap(text: str, width: int = 96, indent: str = "  ") -> list[str]:
    lines, current = [], ""
    for word in text.split():
        if current and len(current) + 1 + len(word) > width:
            lines.append(indent + current)
            current = word
        else:
            current = f"{current} {word}".strip()
    return lines + ([indent + current] if current else [])


def report_text(summary: dict[str, Any]) -> str:
    """The whole report.

    Arguments: the plain data collected by the run command (result, curve, generators, coordinates, lists,
    plan, ..).
    """
    result: Result = summary["result"]
    curve, case = summary["curve"], summary["case"]
    kind = "Integral" if case.integral else "Rational"
    lines = [f"{kind} points: {result.name}", "=" * (17 + len(result.name)), ""]
    lines += _wrap(result.statement, indent="")
    if summary["stopped"]:
        lines += ["", f"Note: {summary['stopped']}."]
    for warning in summary["warnings"]:
        lines += ["", *_wrap(f"Warning: {warning}.", indent="")]
    lines += ["", "The curve", "---------"]
    lines += [f"  X: {case.equation.text}"]
    if equation_text(curve).replace(" ", "") != case.equation.text.replace(" ", ""):
        lines.append(f"  integral model: {equation_text(curve)}")
    lines.append(f"  genus {curve.genus}, base divisor B = {divisor_text(curve, summary['base'])}")
    rank = len(summary["generators"]) - len(summary["orders"])
    for i, divisor in enumerate(summary["generators"]):
        name = f"D{i + 1}" if i < rank else f"T{i + 1 - rank}"
        tail = "" if i < rank else f", order {summary['orders'][i - rank]}"
        lines.append(f"  {name} = {divisor_text(curve, divisor)}{tail}")
    if summary["coordinates"]:
        lines += ["", "  Known rational points P and the coordinates of [P - B]:"]
        rows = []
        for point, found in summary["coordinates"].items():
            coefficients = ", ".join(str(c) for c in found.coefficients)
            torsion = ", ".join(map(str, found.torsion))
            rows.append(
                [
                    curve.format_point(point),
                    f"({coefficients})" + (f" + torsion ({torsion})" if torsion else ""),
                ]
            )
        lines += _table(["P", "[P - B]"], rows, [False, False])
    lines += ["", "Premises", "--------"]
    for premise in result.premises:
        if premise.status == "assumed":
            lines += _wrap(f"[assumed] {premise.statement or premise.id}. Source: {premise.source}")
        else:
            primes = ", ".join(map(str, premise.primes))
            lines += _wrap(
                f"[proved] {premise.statement or premise.id}"
                + (f" (reduction at v = {primes})" if primes else "")
            )
    if summary["lists"]:
        lines += ["", "Candidates", "----------"]
        for p, count, complete, source, precision in summary["lists"]:
            kind = "complete list" if complete else "list"
            lines += _wrap(f"p = {p}: {kind} of {count} candidates, {precision} digits. Source: {source}")
        lines += _verdict_lines(result.verdicts)
    lines += ["", "Auxiliary primes", "----------------"]
    used = sorted(
        {v for verdict in result.verdicts for v in verdict.primes}
        | set(_source_primes(summary["relation_sources"]))
    )
    groups = {g.prime: g for g in result.local}
    rows = [
        [
            str(v),
            str(groups[v].points),
            structure_text(groups[v].structure),
            _images(summary["images"].get(v, ())),
        ]
        for v in used
        if v in groups
    ]
    usable = (
        f"{len(result.local)} primes are usable; those that some verdict or the surviving classes rest on:"
    )
    lines += [f"  {usable}"] + _table(
        ["v", "#X(F_v)", "J(F_v)", "images of the generators"], rows, [True, True, False, False]
    )
    if summary["skipped"]:
        lines += _wrap("Not used: " + "; ".join(f"v = {v} ({reason})" for v, reason in summary["skipped"]))
    survivors = result.survivors
    if survivors is not None:
        lines += ["", "Surviving classes without candidates", "------------------------------------"]
        where = f"modulo a subgroup of index {survivors.quotient}"
        lines.append(f"  {survivors.count} classes {where}; largest set met: {summary['largest']}")
        for step in summary["plan"]:
            lines.append(f"    {step}")
        if survivors.vectors:
            shown = survivors.vectors[:40]
            lines.append(
                "  shortest vectors: " + ", ".join("(" + ", ".join(map(str, v)) + ")" for v in shown)
            )
            if len(survivors.vectors) > len(shown):
                lines.append(f"  and {survivors.count - len(shown)} more")
        if survivors.barrier is not None:
            lines += _wrap(
                "Barrier: the coefficient vector of any other rational point has Euclidean norm at least "
                f"{survivors.barrier}."
            )
    if "proof" in summary:
        lines += ["", "Proof log", "---------"] + _proof_lines(summary["proof"])
    return "\n".join(lines) + "\n"


def _proof_lines(proof: ProofLog) -> list[str]:
    primes = ", ".join(map(str, proof.primes)) or "none"
    return [
        f"  {proof.records} of {proof.all_records} records kept, {proof.size} bytes",
        *_wrap(f"auxiliary primes ({len(proof.primes)} of {proof.all_primes}): {primes}"),
        "  `sieve check proof.jsonl` re-checks it, `sieve appendix proof.jsonl -o FILE` prints it",
    ]


def _images(images: Sequence[Sequence[int]]) -> str:
    return "; ".join("(" + ", ".join(map(str, row)) + ")" for row in images)


def _source_primes(sources: Sequence[str]) -> list[int]:
    return [int(s.split("=")[1].split(",")[0]) for s in sources if s.startswith("v")]


def _verdict_lines(verdicts: Sequence[Verdict]) -> list[str]:
    counts = {name: sum(v.verdict == name for v in verdicts) for name in ("eliminated", "rational", "open")}
    lines = [f"  {counts['eliminated']} eliminated, {counts['rational']} rational, {counts['open']} open", ""]
    rows = []
    for v in verdicts:
        if v.verdict == "eliminated":
            what = "v = " + ", ".join(map(str, v.primes)) if v.primes else "not in the image"
            if v.reason.startswith("not integral"):
                what = v.reason
        elif v.verdict == "rational":
            what = v.point + ("" if v.given else " (found)") + ("" if v.sole else " (perhaps not alone)")
        else:
            what = v.reason
        rows.append([str(v.prime), v.id, v.verdict, what])
    lines += _table(["p", "candidate", "verdict", "because of"], rows, [True, False, False, False])
    for v in verdicts:
        if v.verdict == "open" and v.hint:
            lines += _wrap(f"{v.id}: {v.hint}")
        elif v.verdict == "rational" and v.reason:
            lines += _wrap(f"{v.id}: {v.reason}")
    return lines
