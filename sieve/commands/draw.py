"""`sieve draw`: the constraint graph of a proof log."""

from __future__ import annotations

from sieve.commands.from_log import write_from_log
from sieve.report.draw import as_graphml, as_svg, as_tex


def execute(proof: str, output: str) -> None:
    """Write the drawing; the ending of `output` says in which language (see `write_from_log`)."""
    write_from_log(proof, output, {".svg": as_svg, ".tex": as_tex, ".graphml": as_graphml})
