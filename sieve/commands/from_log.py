"""Files made from a proof log: what `sieve appendix` and `sieve draw` share."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from pathlib import Path

from sieve.errors import InputError
from sieve.files.result import write_whole
from sieve.proof.reader import LogView, read_log


def write_from_log(proof: str, output: str, renderers: Mapping[str, Callable[[LogView], str]]) -> None:
    """Write `output` with the renderer for its ending.

    Raises `InputError` for a bad log or another ending.
    """
    ending = Path(output).suffix
    if ending not in renderers:
        *most, last = renderers
        expected = f"a file that ends in {', '.join(most)} or {last}"
        raise InputError(output, "", f"the ending {ending!r}", expected)
    view = read_log(proof)
    try:
        text = renderers[ending](view)
    except (KeyError, TypeError, IndexError, ValueError, StopIteration, AttributeError) as error:
        found = f"a record that does not make sense ({type(error).__name__})"
        raise InputError(proof, "", found, "a log that `sieve check` accepts") from None
    write_whole(Path(output), text)
