"""`sieve appendix`: the appendix of a paper from a proof log."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from sieve.commands.from_log import write_from_log
from sieve.proof.reader import LogView
from sieve.report.appendix import Block, appendix
from sieve.report.appendix_markup import render_html, render_markdown
from sieve.report.appendix_tex import render


def execute(proof: str, output: str) -> None:
    """Write the appendix; the ending of `output` says in which language (see `write_from_log`)."""
    name = Path(proof).name

    def from_view(renderer: Callable[[list[Block]], str]) -> Callable[[LogView], str]:
        return lambda view: renderer(appendix(view, name))

    renderers = {".tex": render, ".md": render_markdown, ".html": render_html}
    write_from_log(proof, output, {ending: from_view(renderer) for ending, renderer in renderers.items()})
