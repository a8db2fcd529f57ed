"""The rank in the demo: both elliptic quotients have rank 1, so the Jacobian has rank 2.

    python scripts/demo_rank.py            prints the facts and the `rank_source` line of the case file
    python scripts/demo_rank.py --check    exits with 1 unless data/demo/case.toml carries that line

For y^2 = x^6 + a x^4 + b x^2 + c the maps (x, y) |-> (x^2, y) and (x, y) |-> (c/x^2, c*y/x^3) go to
    E1: y^2 = u^3 + a u^2 + b u + c        E2: y^2 = u^3 + b u^2 + a*c u + c^2
and J is isogenous to E1 x E2 over Q.  Each rank is proved twice: by PARI's 2-descent (`ellrank`, lower and
upper bound equal, the class group of the cubic field certified), and by L(E, 1) = 0 (root number -1) with
L'(E, 1) != 0 (Gross and Zagier 1986, Kolyvagin 1988; E is modular).

Needs cypari (`pip install -e '.[test]'`).
"""

from __future__ import annotations

import sys
import tomllib
from pathlib import Path

from cypari import pari

CASE = Path(__file__).resolve().parent.parent / "data" / "demo" / "case.toml"
A, B, C = 1, -2, 9


def quotient(name: str, a: int, b: int, c: int) -> str:
    """Prove rank 1 for y^2 = u^3 + a u^2 + b u + c; print the facts; return the equation."""
    cubic = f"x^3 + ({a})*x^2 + ({b})*x + ({c})"
    equation = f"y^2 = {pari(cubic.replace('x', 'u'))}".replace(" ", "").replace("=", " = ")
    curve = pari(f"ellinit([0, {a}, 0, {b}, {c}])")
    lower, upper = (int(n) for n in pari.ellrank(curve)[:2])
    certified = int(pari(f"bnfcertify(bnfinit(polredbest({cubic}), 1))"))
    sign = int(pari.ellrootno(curve))
    derivative = abs(float(pari.lfun(curve, 1, 1)))
    print(f"{name}: {equation}: {lower} <= rank <= {upper}, class group certified: {certified}, "
          f"root number {sign}, |L'(E, 1)| = {derivative:.6f}")
    if not (lower == upper == 1 and certified == 1 and sign == -1 and derivative > 1e-3):
        raise SystemExit(f"{name}: rank 1 is not proved")
    return equation


def rank_source() -> str:
    """The line for the case file."""
    first, second = quotient("E1", A, B, C), quotient("E2", B, A * C, C * C)
    return (
        f"J is isogenous over Q to E1 x E2, E1: {first}, E2: {second}; each has rank 1 by PARI's ellrank"
        " (2-descent), and again by Gross-Zagier and Kolyvagin (scripts/demo_rank.py)"
    )


def main() -> int:
    line = rank_source()
    print(f'rank_source = "{line}"')
    if "--check" in sys.argv[1:]:
        return int(tomllib.loads(CASE.read_text("utf-8"))["jacobian"]["rank_source"] != line)
    return 0


if __name__ == "__main__":
    sys.exit(main())
