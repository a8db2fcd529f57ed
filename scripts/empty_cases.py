"""Write the case files of data/empty: curves without rational points, with base and generators from a search.

The rank premise is taken from data/reference/hyperelliptic.json: the elliptic curves E1, E2 to whose product
the Jacobian is isogenous, with their ranks from PARI.
"""

from __future__ import annotations

import json
import sys
import tempfile
from pathlib import Path

from sieve.commands import propose

ROOT = Path(__file__).resolve().parent.parent
REFERENCE = ROOT / "data" / "reference" / "hyperelliptic.json"
CASES = ROOT / "data" / "empty"


def rank_source(record: dict[str, object]) -> str:
    """The premise in words."""
    relations = record["relations"]
    assert isinstance(relations, dict)
    return (
        f"J is isogenous over Q to E1 x E2, E1 = {relations['E1']}, E2 = {relations['E2']} "
        "(coefficients a1, a2, a3, a4, a6); by PARI's ellrank, lower and upper bounds equal, the ranks are "
        "1 and 0 (data/reference/hyperelliptic.json)"
    )


def sketch(record: dict[str, object]) -> str:
    """The case file as far as the reference gives it."""
    f = record["f"]
    assert isinstance(f, list)
    terms = [f"({c})*x^{i}" for i, c in reversed(list(enumerate(f))) if c]
    return "\n".join([
        'format = "sieve-case/1"', f'name = "{record["id"]}"',
        "[curve]", f'equation = "y^2 = {" + ".join(terms)}"',
        "[jacobian]", f"rank = {record['rank']}", f'rank_source = "{rank_source(record)}"', "",
    ])


def rendered(record: dict[str, object]) -> str:
    """The whole case file."""
    with tempfile.TemporaryDirectory() as directory:
        path = Path(directory) / "sketch.toml"
        path.write_text(sketch(record), "utf-8")
        return propose.text(propose.execute(str(path)))


def records() -> list[dict[str, object]]:
    """The reference curves without rational points."""
    return [r for r in json.loads(REFERENCE.read_text("utf-8")) if r["id"].startswith("empty_")]


def main() -> int:
    CASES.mkdir(exist_ok=True)
    for record in records():
        (CASES / f"{record['id']}.toml").write_text(rendered(record), "utf-8")
    return 0


if __name__ == "__main__":
    sys.exit(main())
