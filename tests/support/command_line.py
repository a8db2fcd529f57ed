"""The command line inside this process, and in processes of its own."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from click.testing import CliRunner

from sieve.cli import main

ROOT = Path(__file__).resolve().parents[2]


@dataclass(frozen=True)
class Outcome:
    """Exit code and both streams."""

    code: int
    out: str
    err: str


def sieve(*args: str | Path) -> Outcome:
    """Run a command in this process; an exception that reaches the top fails the test."""
    result = CliRunner().invoke(main, [str(a) for a in args])
    if result.exception is not None and not isinstance(result.exception, SystemExit):
        raise result.exception
    return Outcome(result.exit_code, result.stdout, result.stderr)


def environment() -> dict[str, str]:
    return {**os.environ, "PYTHONPATH": str(ROOT), "OPENBLAS_NUM_THREADS": "1"}


def command(*args: str | Path) -> list[str]:
    return [sys.executable, "-m", "sieve", *map(str, args)]


def sieve_process(*args: str | Path, cwd: Path) -> Outcome:
    """Run a command in a process of its own."""
    done = subprocess.run(
        command(*args), cwd=cwd, env=environment(), capture_output=True, text=True, timeout=300, check=False
    )
    return Outcome(done.returncode, done.stdout, done.stderr)


def case_text(equation: str, rank: int, base: str, *, known: Sequence[str] = (), more: str = "") -> str:
    """A case file; `base` and `more` (generators, torsion, ..) in TOML notation."""
    listed = ", ".join(f'"{p}"' for p in known)
    return f"""format = "sieve-case/1"
name = "test"
known_points = [{listed}]

[curve]
equation = "{equation}"

[jacobian]
rank = {rank}
rank_source = "a test"
base = {base}
{more}
"""


SEXTIC = "y^2 = x^6 + 4*x^5 + 2*x^4 + 2*x^3 + x^2 - 2*x + 1"
"""Its ten small rational points follow."""

SEXTIC_POINTS = (
    "(1 : 1 : 0)", "(1 : -1 : 0)", "(0 : 1 : 1)", "(0 : -1 : 1)", "(1 : 3 : 1)", "(1 : -3 : 1)",
    "(-1 : 1 : 1)", "(-1 : -1 : 1)", "(1 : 7 : 2)", "(1 : -7 : 2)",
)  # fmt: skip


def sextic_case(directory: Path, more: str = 'generators_from = "known_points"') -> Path:
    path = directory / "sextic.toml"
    path.write_text(case_text(SEXTIC, 2, '"(1 : 1 : 0)"', known=SEXTIC_POINTS, more=more), "utf-8")
    return path
