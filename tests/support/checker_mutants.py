"""Mutants of the checker itself: every refusal deleted, every comparison negated.  The corpus must notice.

Run as `python -m tests.support.checker_mutants` for the list of mutants that no corpus file notices.
"""

from __future__ import annotations

import ast
import csv
import io
import re
import resource
import signal
from collections.abc import Iterator
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
    """Every `raise` and every call of `need`, with the reason code if it is spelt there."""
    for node in ast.walk(tree):
        call: ast.expr | None = None
        if isinstance(node, ast.Raise):
            call = node.exc
        elif isinstance(node, ast.Expr) and isinstance(node.value, ast.Call):
            if isinstance(node.value.func, ast.Name) and node.value.func.id == "need":
                call = node.value
        if isinstance(node, ast.Raise) or call is not None:
            texts = [a.value for a in getattr(call, "args", []) if isinstance(a, ast.Constant)]
            code = next((t for t in texts if isinstance(t, str) and re.fullmatch("[a-z-]+", t)), "")
            yield node, code  # type: ignore[misc]


def _compiled(tree: ast.Module) -> CodeType:
    return compile(ast.fix_missing_locations(tree), "checker", "exec")


def mutants() -> Iterator[tuple[str, str, CodeType]]:
    """(description, reason code of the refusal that is touched or "", compiled module)."""
    text = SOURCE.read_text(encoding="utf-8")
    lines = text.splitlines()
    count = len(list(refusals(ast.parse(text))))
    for i in range(count):
        tree = ast.parse(text)
        node, code = list(refusals(tree))[i]
        name = f"line {node.lineno}: without: {lines[node.lineno - 1].strip()}"
        for parent in ast.walk(tree):
            for field in ("body", "orelse", "finalbody"):
                body = getattr(parent, field, None)
                if isinstance(body, list) and node in body:
                    body[body.index(node)] = ast.Pass()
        yield name, code, _compiled(tree)
    comparisons = sum(isinstance(node, ast.Compare) for node in ast.walk(ast.parse(text)))
    for i in range(comparisons):
        tree = ast.parse(text)
        compare = [node for node in ast.walk(tree) if isinstance(node, ast.Compare)][i]
        inside = [c for n, c in refusals(tree) if any(inner is compare for inner in ast.walk(n))]
        for k, op in enumerate(compare.ops):
            old = ast.unparse(compare)
            compare.ops[k] = NEGATED[type(op)]()
            name = f"line {compare.lineno}: {old} -> {ast.unparse(compare)}"
            yield name, inside[0] if inside else "", _compiled(tree)
            compare.ops[k] = op


class _Timeout(BaseException):
    pass


def _alarm(signum: int, frame: object) -> None:
    raise _Timeout


def noticed(code: CodeType, hint: str, corpus: list[tuple[bytes, tuple[int, int, str], str]]) -> str:
    """The first log with another verdict than it must get (reason code `hint` first), or ""."""
    module = ModuleType("mutated_checker")
    old = signal.signal(signal.SIGALRM, _alarm)
    limit = resource.getrlimit(resource.RLIMIT_AS)
    try:
        resource.setrlimit(resource.RLIMIT_AS, (4 * 2**30, limit[1]))
        signal.setitimer(signal.ITIMER_REAL, SECONDS)
        try:
            exec(code, module.__dict__)
        except (Exception, SystemExit):
            return "import"
        for data, verdict, name in sorted(corpus, key=lambda row: (row[1][2] != hint, len(row[0]))):
            signal.setitimer(signal.ITIMER_REAL, SECONDS)
            try:
                if judge(module, data) != verdict:
                    return name
            except (_Timeout, Exception):
                return name
        return ""
    finally:
        signal.setitimer(signal.ITIMER_REAL, 0)
        signal.signal(signal.SIGALRM, old)
        resource.setrlimit(resource.RLIMIT_AS, limit)


def main() -> None:
    """Print the mutants that nothing notices."""
    corpus, count, survivors = expected(), 0, 0
    for name, hint, code in mutants():
        count += 1
        if not noticed(code, hint, corpus):
            survivors += 1
            print(name, flush=True)
    print(f"{count} mutants, {survivors} not noticed")


if __name__ == "__main__":
    main()
