"""`sieve draw`: the constraint graph of a proof log."""

from __future__ import annotations

from pathlib import Path

from sieve.errors import InputError
from sieve.files.result import write_whole
from sieve.proof.reader import read_log
from sieve.report.draw import as_graphml, as_svg, as_tex

RENDERERS = {".svg": as_svg, ".tex": as_tex, ".graphml": as_graphml}


def execute(proof: str, output: str) -> None:
    """Write the drawing; the ending of `output` says in which language.

    Raises `InputError` for a bad log or another ending.
    """
    ending = Path(output).suffix
    if ending not in RENDERERS:
        raise InputError(output, "", f"the ending {ending!r}", "a file that ends in .svg, .tex or .graphml")
    view = read_log(proof)
    try:
        text = RENDERERS[ending](view)
    except (KeyError, TypeError, IndexError, ValueError, AttributeError) as error:
        found = f"a record that does not make sense ({type(error).__name__})"
        raise InputError(proof, "", found, "a log that `sieve check` accepts") from None
    write_whole(Path(output), text)
