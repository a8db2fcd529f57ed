"""Bad logs: plane curves, closed places, integral points."""

from __future__ import annotations

from tests.support.corpus_edits import Traps


def traps() -> Traps:
    """All of this file."""
    return Traps()
