"""From an equation to proved verdicts: proposal, linear Chabauty, sieve, by the code behind the commands."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from sieve.commands import candidates, propose, run
from sieve.files.result import json_text


@dataclass(frozen=True)
class Outcome:
    """What the two commands found for one curve."""

    search: candidates.CandidateSearch
    run: run.Run

    @property
    def open_candidates(self) -> list[str]:
        """The ids of the candidates that stay open."""
        return [d.id for d in self.run.decisions if d.verdict == "open"]

    @property
    def points(self) -> set[tuple[int, int, int]]:
        """The rational points that the run names."""
        return set(run.rational_points(self.run))

    @property
    def proved(self) -> bool:
        """Whether the final statement is that these are all."""
        return run.statement(self.run).startswith(("X(Q) has exactly", "X(Q) is empty"))


def equation(f: Sequence[int], h: Sequence[int] = ()) -> str:
    """The equation in the notation of case files."""

    def polynomial(c: Sequence[int]) -> str:
        return " + ".join(f"({a})*x^{i}" for i, a in reversed(list(enumerate(c))) if a) or "0"

    middle = f" + ({polynomial(h)})*y" if any(h) else ""
    return f"y^2{middle} = {polynomial(f)}"


def write_case(path: Path, f: Sequence[int], h: Sequence[int], rank: int, source: str) -> Path:
    """A case file whose points, base, generators and torsion come from `sieve inspect --propose`."""
    sketch = path / "sketch.toml"
    sketch.write_text(
        f'format = "sieve-case/1"\nname = "curve"\n[curve]\nequation = "{equation(f, h)}"\n'
        f'[jacobian]\nrank = {rank}\nrank_source = "{source}"\n', "utf-8",
    )
    case = path / "case.toml"
    case.write_text(propose.text(propose.execute(str(sketch))), "utf-8")
    return case


def pipeline(case: Path, prime: int | None = None, precision: int | None = None) -> Outcome:
    """`sieve candidates`, then `sieve run` with the file it wrote."""
    search = candidates.execute(str(case), prime=prime, precision=precision)
    file = case.with_suffix(".candidates.json")
    file.write_text(json_text(candidates.candidate_document(search)), "utf-8")
    return Outcome(search, run.execute(str(case), [str(file)]))
