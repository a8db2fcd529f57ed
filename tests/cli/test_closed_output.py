"""A reader that goes away early: one line, exit code 2, no traceback."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

LOG = Path(__file__).resolve().parents[2] / "data" / "proofs" / "accepted" / "torsion.jsonl"


def test_nobody_reads_the_verdict() -> None:
    reader, writer = os.pipe()
    os.close(reader)
    try:
        done = subprocess.run(
            [sys.executable, "-m", "sieve", "check", str(LOG)],
            stdout=writer,
            stderr=subprocess.PIPE,
            timeout=120,
        )
    finally:
        os.close(writer)
    lines = done.stderr.decode().splitlines()
    assert done.returncode == 2
    assert len(lines) == 1
    assert lines[0].startswith("sieve: error: standard output: closed")
