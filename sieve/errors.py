"""The error tree: what can go wrong, one type per meaning.

Bad input, inconsistent data, a limit that was reached, something this version does not do, and a
failure inside the program are different things to a user; each has its own type and carries the data
that explains it.  None of them ever means "no such point exists".
"""

from __future__ import annotations


class SieveError(Exception):
    """Base of every error that the package raises on purpose."""

    @property
    def line(self) -> str:
        """The message folded to one line, as the command line prints it."""
        return " ".join(str(self).split())


class InputError(SieveError, ValueError):
    """A file or argument is not what it should be.

    Arguments: `file` (path or option name), `place` (table, key, line or column; may be empty), `found`
    (what stands there), `expected` (what should).
    """

    def __init__(self, file: str, place: str, found: str, expected: str) -> None:
        self.file, self.place, self.found, self.expected = file, place, found, expected
        where = f"{file}: {place}: " if place else f"{file}: "
        super().__init__(f"{where}{found}, expected {expected}")


class NotSupported(InputError):
    """Valid input that this version cannot treat (same fields as `InputError`)."""


class Inconsistent(SieveError):
    """The data contradict each other; `witness` names the point, prime or candidate that shows it.

    `expected`: what would be consistent; `file`: the file to blame where it is not the case file.
    """

    def __init__(
        self, message: str, witness: str, expected: str = "data that agree with one another", file: str = ""
    ) -> None:
        self.witness, self.expected, self.file = witness, expected, file
        super().__init__(message)


class BadReduction(SieveError):
    """The model is not smooth modulo `prime`, or a divisor does not reduce there; never fatal."""

    def __init__(self, prime: int, reason: str) -> None:
        self.prime, self.reason = prime, reason
        super().__init__(f"v = {prime}: {reason}")


class Uncertified(SieveError):
    """The group J(F_v) could not be proved complete, so `prime` is not used; `reason` says why."""

    def __init__(self, prime: int, reason: str) -> None:
        self.prime, self.reason = prime, reason
        super().__init__(f"v = {prime}: {reason}")


class PrecisionLost(SieveError):
    """More p-adic digits are needed: `have` digits survived where `need` are wanted."""

    def __init__(self, prime: int, have: int, need: int, what: str) -> None:
        self.prime, self.have, self.need, self.what = prime, have, need, what
        super().__init__(f"p = {prime}: {what}: {have} digits known, {need} needed")


class LimitReached(SieveError):
    """A limit (time, size, number of classes) stopped the work; `partial` holds what was found."""

    def __init__(self, what: str, limit: str, partial: object = None) -> None:
        self.what, self.limit, self.partial = what, limit, partial
        super().__init__(f"{what}: limit reached ({limit})")


class InternalError(SieveError):
    """A check inside the program failed: a defect, never a statement about the curve."""
