"""Prove the rank in data/demo-linear/case.toml with PARI and print the line it carries.

X: y^2 = F(x^2), F = (u - 3)(u + 1)(u + 6) = u^3 + a u^2 + b u + c, covers E1: v^2 = F(u) by (x^2, y) and
E2: v^2 = u^3 + b u^2 + a c u + c^2 by (c/x^2, c y/x^3); J is isogenous to E1 x E2 over Q.  The ranks 0 and 1
are proved twice: by PARI's 2-descent (`ellrank`, lower and upper bound equal; both curves have full
2-torsion, so no class group is involved), and by L(E1, 1) != 0 and L(E2, 1) = 0 (root number -1), L'(E2, 1)
!= 0 (Gross and Zagier 1986, Kolyvagin 1988; both curves are modular).

Needs cypari (`pip install -e '.[test]'`).
"""

from __future__ import annotations

import sys
import tomllib
from pathlib import Path

from cypari import pari

CASE = Path(__file__).resolve().parent.parent / "data" / "demo-linear" / "case.toml"
A, B, C = 4, -15, -18


def quotient(name: str, a: int, b: int, c: int, rank: int) -> str:
    """Prove the rank of y^2 = u^3 + a u^2 + b u + c; print the facts; return the equation."""
    curve = pari(f"ellinit([0, {a}, 0, {b}, {c}])")
    lower, upper = (int(n) for n in pari.ellrank(curve)[:2])
    sign = int(pari.ellrootno(curve))
    leading = abs(float(pari.lfun(curve, 1, rank)))
    equation = "y^2 = " + str(pari(f"u^3 + ({a})*u^2 + ({b})*u + ({c})")).replace(" ", "")
    print(f"{name}: {equation}: {lower} <= rank <= {upper}, root number {sign}, "
          f"derivative no. {rank} of L(E, s) at 1: {leading:.6f}")
    if not (lower == upper == rank and sign == (-1) ** rank and leading > 1e-3):
        raise SystemExit(f"{name}: rank {rank} is not proved")
    return equation


def rank_source() -> str:
    """The line for the case file."""
    first, second = quotient("E1", A, B, C, 0), quotient("E2", B, A * C, C * C, 1)
    return (
        f"J is isogenous over Q to E1 x E2, E1: {first}, E2: {second}; the ranks are 0 and 1 by PARI's "
        "ellrank (2-descent), and again by Gross-Zagier and Kolyvagin (scripts/demo_linear_rank.py)"
    )


def main() -> int:
    line = rank_source()
    print(f'rank_source = "{line}"')
    if "--check" in sys.argv[1:]:
        return int(tomllib.loads(CASE.read_text("utf-8"))["jacobian"]["rank_source"] != line)
    return 0


if __name__ == "__main__":
    sys.exit(main())
