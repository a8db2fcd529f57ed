"""How long the slow sweeps may run."""

from __future__ import annotations

import os


def full_sweep() -> bool:
    """Whether slow sweeps run over their whole range (`SIEVE_SWEEP=small` asks for the bounded form)."""
    size = os.environ.get("SIEVE_SWEEP", "full")
    if size not in ("small", "full"):
        raise ValueError(f"SIEVE_SWEEP={size}: expected small or full")
    return size == "full"
