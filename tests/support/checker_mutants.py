"""Mutants of the checker itself: every refusal deleted, every comparison negated.  The corpus must notice.

Run as `python -m tests.support.checker_mutants [START STOP]` for the list of mutants that no corpus file
notices.
"""

from __future__ import annotations

import ast
import csv
import io
import json
import re
import resource
import signal
import sys
from collections import Counter
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from types import CodeType, ModuleType
from typing import Any

ROOT = Path(__file__).resolve().parents[2]
SOURCE = ROOT / "sieve" / "proof" / "checker.py"
CORPUS = ROOT / "data" / "proofs"
SECONDS = 20
"""A mutant that takes longer on one log is noticed."""

NEGATED: dict[type[ast.cmpop], type[ast.cmpop]] = {
    ast.Eq: ast.NotEq,
    ast.NotEq: ast.Eq,
    ast.Lt: ast.GtE,
    ast.GtE: ast.Lt,
    ast.Gt: ast.LtE,
    ast.LtE: ast.Gt,
    ast.In: ast.NotIn,
    ast.NotIn: ast.In,
    ast.Is: ast.IsNot,
    ast.IsNot: ast.Is,
}


@dataclass(frozen=True)
class Mutant:
    """`name`: function, source and change; `code`: the reason code that is touched, or ""."""

    name: str
    line: int
    code: str
    module: Callable[[], CodeType]


def judge(checker: Any, data: bytes) -> tuple[int, int, str]:
    """(exit code, line, reason code) of a checker module for a log; "accepted" has line 0."""
    try:
        checker.check(io.BytesIO(data))
    except checker.Fault as fault:
        return 3, fault.line, fault.code
    except checker.Declined as reason:
        found = re.match(r"line (\d+)", str(reason))
        return 2, int(found.group(1)) if found else 0, "declined"
    return 0, 0, "accepted"


def expected() -> list[tuple[bytes, tuple[int, int, str], str]]:
    """Every log of the corpus with the verdict it must get and its name."""
    rows = [
        (path.read_bytes(), (0, 0, "accepted"), path.stem)
        for path in sorted((CORPUS / "accepted").glob("*.jsonl"))
    ]
    with (CORPUS / "expected.tsv").open(encoding="utf-8") as file:
        for row in csv.DictReader(file, delimiter="\t"):
            data = (CORPUS / row["file"]).read_bytes()
            rows.append((data, (int(row["exit"]), int(row["line"]), row["code"]), row["file"]))
    return rows


def refusals(tree: ast.AST) -> Iterator[tuple[ast.stmt, str]]:
    """Every `raise` and every call of `need` or `limit`, with the reason code if it is spelt there."""
    for node in ast.walk(tree):
        call: ast.expr | None = None
        if isinstance(node, ast.Raise):
            call = node.exc
        elif isinstance(node, ast.Expr) and isinstance(node.value, ast.Call):
            if isinstance(node.value.func, ast.Name) and node.value.func.id in ("need", "limit"):
                call = node.value
        if isinstance(node, ast.Raise) or call is not None:
            texts = [a.value for a in getattr(call, "args", []) if isinstance(a, ast.Constant)]
            code = next((t for t in texts if isinstance(t, str) and re.fullmatch("[a-z-]+", t)), "")
            yield node, code  # type: ignore[misc]


def _compiled(tree: ast.Module) -> CodeType:
    return compile(ast.fix_missing_locations(tree), "checker", "exec")


def _owners(tree: ast.AST, name: str = "") -> Iterator[tuple[ast.AST, str]]:
    """Every node with the qualified name of the function that it is in."""
    for node in ast.iter_child_nodes(tree):
        named = isinstance(node, ast.FunctionDef | ast.ClassDef)
        inner = ".".join(filter(None, (name, node.name))) if named else name  # type: ignore[attr-defined]
        yield node, inner
        yield from _owners(node, inner)


def _labels(tree: ast.AST, nodes: Sequence[ast.AST]) -> list[str]:
    """Function and source text of some nodes: what a mutant is known by, whatever line it is on."""
    owners = dict(_owners(tree))
    seen: Counter[str] = Counter()
    out = []
    for node in nodes:
        label = f"{owners[node]}: {ast.unparse(node)}"
        seen[label] += 1
        out.append(label if seen[label] == 1 else f"{label} ({seen[label]})")
    return out


def _left_out(text: str, i: int) -> CodeType:
    """The checker without its i-th refusal."""
    tree = ast.parse(text)
    node, _ = list(refusals(tree))[i]
    for parent in ast.walk(tree):
        for field in ("body", "orelse", "finalbody"):
            body = getattr(parent, field, None)
            if isinstance(body, list) and node in body:
                body[body.index(node)] = ast.Pass()
    return _compiled(tree)


def _negated(text: str, i: int, k: int) -> CodeType:
    """The checker with the k-th operator of its i-th comparison negated."""
    tree = ast.parse(text)
    compare = [node for node in ast.walk(tree) if isinstance(node, ast.Compare)][i]
    compare.ops[k] = NEGATED[type(compare.ops[k])]()
    return _compiled(tree)


def mutants() -> list[Mutant]:
    """All mutants: refusals left out, in the order of the walk, then comparisons negated."""
    text = SOURCE.read_text(encoding="utf-8")
    tree = ast.parse(text)
    statements = list(refusals(tree))
    out = []
    for i, label in enumerate(_labels(tree, [node for node, _ in statements])):
        node, code = statements[i]
        out.append(Mutant(f"{label}: left out", node.lineno, code, partial(_left_out, text, i)))
    codes = {inner: code for node, code in statements for inner in ast.walk(node)}
    comparisons = [node for node in ast.walk(tree) if isinstance(node, ast.Compare)]
    for i, label in enumerate(_labels(tree, comparisons)):
        compare = comparisons[i]
        for k, op in enumerate(compare.ops):
            compare.ops[k] = NEGATED[type(op)]()
            name = f"{label}: now {ast.unparse(compare)}"
            compare.ops[k] = op
            code = codes.get(compare, "")
            out.append(Mutant(name, compare.lineno, code, partial(_negated, text, i, k)))
    return out


def words(checker: Any, name: str) -> dict[str, Any]:
    """What a checker module prints of an accepted log: the statement, the premises, who is eliminated."""
    with (CORPUS / "accepted" / f"{name}.jsonl").open("rb") as stream:
        result = checker.report(checker.check(stream))
    return {
        "statement": result["statement"],
        "premises": [f"{p['id']}: {p['statement']}" for p in result["premises"]],
        "eliminated": [f"{e['id']} at {e['prime']}" for e in result["eliminated"]],
    }


def expected_words() -> dict[str, dict[str, Any]]:
    """What must be printed of some accepted logs, read and compared with the logs by hand."""
    found: dict[str, dict[str, Any]] = json.loads((CORPUS / "statements.json").read_text(encoding="utf-8"))
    return found


class _Timeout(BaseException):
    pass


def _alarm(signum: int, frame: object) -> None:
    raise _Timeout


def noticed(mutant: Mutant, corpus: list[tuple[bytes, tuple[int, int, str], str]]) -> str:
    """The first log with another verdict or other words than it must get, or ""; logs of its code first."""
    module = ModuleType("mutated_checker")
    old = signal.signal(signal.SIGALRM, _alarm)
    limit = resource.getrlimit(resource.RLIMIT_AS)
    try:
        resource.setrlimit(resource.RLIMIT_AS, (4 * 2**30, limit[1]))
        signal.setitimer(signal.ITIMER_REAL, SECONDS)
        try:
            exec(mutant.module(), module.__dict__)
        except (Exception, SystemExit):
            return "import"
        for data, verdict, name in sorted(corpus, key=lambda row: (row[1][2] != mutant.code, len(row[0]))):
            signal.setitimer(signal.ITIMER_REAL, SECONDS)
            try:
                if judge(module, data) != verdict:
                    return name
            except (_Timeout, Exception):
                return name
        for name, wanted in expected_words().items():
            signal.setitimer(signal.ITIMER_REAL, SECONDS)
            try:
                if words(module, name) != wanted:
                    return f"words of {name}"
            except (_Timeout, Exception):
                return f"words of {name}"
        return ""
    finally:
        signal.setitimer(signal.ITIMER_REAL, 0)
        signal.signal(signal.SIGALRM, old)
        resource.setrlimit(resource.RLIMIT_AS, limit)


def main(slices: list[str]) -> None:
    """Print the mutants that nothing notices; START and STOP choose some of them."""
    chosen = mutants()[slice(*map(int, slices))] if slices else mutants()
    corpus, survivors = expected(), 0
    for mutant in chosen:
        if not noticed(mutant, corpus):
            survivors += 1
            print(f"line {mutant.line}: {mutant.name}", flush=True)
    print(f"{len(chosen)} mutants, {survivors} not noticed")


if __name__ == "__main__":
    main(sys.argv[1:])
