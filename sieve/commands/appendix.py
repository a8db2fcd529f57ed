"""`sieve appendix`: the appendix of a paper from a proof log."""

from __future__ import annotations

from pathlib import Path

from sieve.errors import InputError
from sieve.files.result import write_whole
from sieve.proof.reader import read_log
from sieve.report.appendix import appendix
from sieve.report.appendix_markup import render_html, render_markdown
from sieve.report.appendix_tex import render

RENDERERS = {".tex": render, ".md": render_markdown, ".html": render_html}


def execute(proof: str, output: str) -> None:
    """Write the appendix; the ending of `output` says in which language.

    Raises `InputError` for a bad log or another ending.
    """
    ending = Path(output).suffix
    if ending not in RENDERERS:
        raise InputError(output, "", f"the ending {ending!r}", "a file that ends in .tex, .md or .html")
    view = read_log(proof)
    try:
        text = RENDERERS[ending](appendix(view, Path(proof).name))
    except (KeyError, TypeError, IndexError, ValueError, StopIteration, AttributeError) as error:
        found = f"a record that does not make sense ({type(error).__name__})"
        raise InputError(proof, "", found, "a log that `sieve check` accepts") from None
    write_whole(Path(output), text)
