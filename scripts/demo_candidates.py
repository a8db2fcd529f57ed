"""The invented candidate list of the demo: the known points and spurious p-adic points.

    python scripts/demo_candidates.py [PRIME]      writes data/demo/candidates.json

Nothing here comes from a Chabauty computation: every spurious point is a random x (or 1/x) in Z_p with y
lifted by Newton's iteration, some of them chosen to agree with a known point to exactly one or two digits.
The seed is fixed, so the file is the same on every machine.  Standard library alone.
"""

from __future__ import annotations

import json
import random
import sys
from pathlib import Path

HERE = Path(__file__).resolve().parent.parent / "data" / "demo"
F = (9, 0, -2, 0, 1, 0, 1)  # y^2 = x^6 + x^4 - 2*x^2 + 9, low degree first
KNOWN = [(1, 1, 0), (1, -1, 0)] + [
    (sx * x, sy * y, z)
    for x, y, z in ((0, 3, 1), (1, 3, 1), (2, 9, 1), (7, 507, 5))
    for sx in ((1, -1) if x else (1,))
    for sy in (1, -1)
]
PRECISION = 6
ANYWHERE, ONE_DIGIT, TWO_DIGITS, AT_INFINITY = 18, 8, 3, 3
SEED = 20


def evaluate(x: int, z: int, modulus: int) -> int:
    """The sextic form at (x, z)."""
    return sum(c * pow(x, i, modulus) * pow(z, 6 - i, modulus) for i, c in enumerate(F)) % modulus


def lift(x: int, z: int, y: int, p: int) -> int:
    """The square root of F(x, z) modulo p^PRECISION that is y modulo p (p odd, y a unit)."""
    modulus = p**PRECISION
    value = evaluate(x, z, modulus)
    for _ in range(PRECISION):
        y = (y - (y * y - value) * pow(2 * y, -1, modulus)) % modulus
    assert (y * y - value) % modulus == 0
    return y


def expansion(n: int, p: int) -> str:
    """n modulo p^PRECISION as mathematicians write it."""
    terms = []
    for i in range(PRECISION):
        n, digit = divmod(n, p)
        if digit:
            power = "" if i == 0 else f"{p}" if i == 1 else f"{p}^{i}"
            terms.append(power if digit == 1 and power else f"{digit}*{power}" if power else f"{digit}")
    return " + ".join([*terms, f"O({p}^{PRECISION})"])


def normalised(x: int, y: int, z: int, p: int) -> tuple[int, int, int]:
    """Weighted coordinates modulo p^PRECISION with z = 1, or x = 1 and p | z."""
    modulus = p**PRECISION
    unit = pow(x if z % p == 0 else z, -1, modulus)
    return x * unit % modulus, y * unit**3 % modulus, z * unit % modulus


def written(x: int, y: int, z: int, p: int) -> str:
    if z == 1:
        return f"({expansion(x, p)}, {expansion(y, p)})"
    return f"(1 : {expansion(y, p)} : {expansion(z, p)})"


def unit(p: int, rng: random.Random) -> int:
    """A random unit of Z/p^(PRECISION - 2)."""
    return rng.randrange(p ** (PRECISION - 3)) * p + rng.randrange(1, p)


def spurious(p: int, rng: random.Random) -> list[tuple[int, int, int]]:
    """Random points of X over Z/p^PRECISION, each different from every known point modulo p^3."""
    modulus = p**PRECISION
    known = [normalised(*point, p) for point in KNOWN]
    found: list[tuple[int, int, int]] = []

    def accept(x: int, z: int, y: int) -> bool:
        point = (x, lift(x, z, y, p), z)
        taken = [tuple(c % p**3 for c in other) for other in known]
        if tuple(c % p**3 for c in point) in taken or point in found:
            return False
        found.append(point)
        return True

    def roots(x: int, z: int) -> list[int]:
        return [y for y in range(1, p) if (y * y - evaluate(x, z, p)) % p == 0]

    for digits, wanted in ((1, ONE_DIGIT), (2, TWO_DIGITS)):
        target = len(found) + wanted
        while len(found) < target:
            x, y, z = rng.choice([point for point in known if point[2] == 1 and point[1] % p])
            accept((x + p**digits * unit(p, rng)) % modulus, 1, y % p)
    for infinite, wanted in ((False, ANYWHERE), (True, AT_INFINITY)):
        target = len(found) + wanted
        while len(found) < target:
            x, z = (1, p * unit(p, rng)) if infinite else (rng.randrange(modulus), 1)
            signs = roots(x, z)
            if signs:
                accept(x, z, rng.choice(signs))
    return found


def document(p: int) -> dict[str, object]:
    """The candidate file, known and spurious points shuffled together."""
    rng = random.Random(SEED)
    points = [normalised(*point, p) for point in KNOWN] + spurious(p, rng)
    rng.shuffle(points)
    return {
        "format": "sieve-candidates/1",
        "prime": p,
        "precision": PRECISION,
        "complete": True,
        "source": (
            "INVENTED for the demonstration by scripts/demo_candidates.py, not the output of a Chabauty "
            f"computation: the {len(KNOWN)} known points and {len(points) - len(KNOWN)} random {p}-adic "
            f"points (seed {SEED})"
        ),
        "candidates": [{"id": f"z{i}", "point": written(*point, p)} for i, point in enumerate(points, 1)],
    }


def rendered(p: int) -> str:
    """The text of the file."""
    return json.dumps(document(p), indent=1) + "\n"


def main() -> None:
    p = int(sys.argv[1]) if len(sys.argv) > 1 else 5
    (HERE / "candidates.json").write_text(rendered(p), "utf-8")


if __name__ == "__main__":
    main()
