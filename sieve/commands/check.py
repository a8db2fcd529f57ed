"""`sieve check`: run the independent checker on a proof log, in this process."""

from __future__ import annotations

from sieve.proof import checker


def execute(path: str, as_json: bool) -> int:
    """Check the log at `path` and print the verdict as `python checker.py` does.

    Returns the exit code: 0 accepted, 3 rejected or malformed, 2 declined or unreadable.
    """
    return checker.run(path, as_json)
