"""Reading files strictly: bytes to tables, and tables to typed values.

Unknown keys, wrong types, numbers out of range, wrong encodings and oversized files are refused, with the
place.
"""

from __future__ import annotations

import hashlib
import json
import tomllib
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from difflib import get_close_matches
from pathlib import Path
from typing import Any, NoReturn
from unicodedata import category

from sieve.curves.notation import Origin, alternatives, quote

MAX_BYTES = 32 * 2**20
"""Size of a file."""
MAX_ENTRIES = 100_000
"""Entries of one list."""
MAX_TEXT = 10_000
"""Characters of a free text."""


@dataclass(frozen=True)
class Document:
    """A parsed file: `table` is its content, `sha256` the digest of its bytes."""

    table: Table
    sha256: str


def describe(value: object) -> str:
    """A value of a file as error messages show it.

    >>> describe(True), describe("x"), describe([1, 2])
    ('true', "the text 'x'", 'a list of 2')
    """
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int):
        return f"the integer {value}" if abs(value) < 10**20 else "a very large integer"
    if isinstance(value, float):
        return f"the number {value}"
    if isinstance(value, _NotAnInteger):
        return f"the number {value.text}"
    if isinstance(value, str):
        return f"the text {quote(value)}"
    if isinstance(value, list):
        return f"a list of {len(value)}"
    if isinstance(value, dict):
        return "a table"
    return "null" if value is None else f"a {type(value).__name__}"


class Table:
    """A table of a file whose keys are read one by one, each with its type and range.

    Arguments: `data`; `origin` (its place; empty place for the whole file); `keys`, all keys that exist.
    Raises `InputError` for a key that does not exist, naming the nearest one.
    """

    def __init__(self, data: dict[str, Any], origin: Origin, keys: Sequence[str] = ()) -> None:
        self.data, self.origin = data, origin
        if keys:
            self.restrict(keys)

    def restrict(self, keys: Sequence[str]) -> None:
        """Refuse every key that is not in `keys`."""
        for key in self.data:
            if key not in keys:
                near = get_close_matches(key, keys, 1, 0.6)
                raise self.origin.error(f"the unknown key {quote(key)}", alternatives(near or sorted(keys)))

    def at(self, key: str) -> Origin:
        """The place of a key."""
        return self.origin.at(key, ".")

    def has(self, key: str) -> bool:
        """Is the key there?"""
        return key in self.data

    def value(self, key: str, expected: str) -> Any:
        """The raw value of a key that must be there."""
        if key not in self.data:
            raise self.at(key).error("nothing", expected)
        return self.data[key]

    def text(self, key: str, expected: str = "a text", *, blank: bool = False) -> str:
        """A text; not blank unless `blank`."""
        value = self.value(key, expected)
        if not isinstance(value, str):
            raise self.at(key).error(describe(value), expected)
        if len(value) > MAX_TEXT:
            raise self.at(key).error(f"a text of {len(value)} characters", f"at most {MAX_TEXT}")
        if not blank and not value.strip():
            raise self.at(key).error("a blank text", expected)
        for c in value:
            # such characters cannot be printed, or even written to a file
            if category(c) in ("Cc", "Cs") and c not in "\t\n\r":
                raise self.at(key).error(f"the character {quote(c)}", f"{expected}, of printable characters")
        return value

    def notation(self, key: str, expected: str) -> tuple[str, Origin]:
        """A text in the notation of the files, with its place; its length is checked by its parser."""
        value = self.value(key, expected)
        if not isinstance(value, str):
            raise self.at(key).error(describe(value), f"{expected}, as a text")
        return value, self.at(key)

    def integer(self, key: str, low: int, high: int, what: str = "an integer") -> int:
        """An integer in [low, high]."""
        return check_integer(self.value(key, f"{what} from {low} to {high}"), self.at(key), low, high, what)

    def boolean(self, key: str) -> bool:
        """true or false."""
        value = self.value(key, "true or false")
        if not isinstance(value, bool):
            raise self.at(key).error(describe(value), "true or false")
        return value

    def array(self, key: str, expected: str, default: list[Any] | None = None) -> list[Any]:
        """A list; the default when the key is absent and a default is given."""
        if default is not None and key not in self.data:
            return default
        value = self.value(key, expected)
        if not isinstance(value, list):
            raise self.at(key).error(describe(value), expected)
        if len(value) > MAX_ENTRIES:
            raise self.at(key).error(describe(value), f"at most {MAX_ENTRIES} entries")
        return value

    def table(self, key: str, expected: str, keys: Sequence[str]) -> Table:
        """A table with the given keys."""
        return as_table(self.value(key, expected), self.at(key), expected, keys)


def as_table(value: object, origin: Origin, expected: str, keys: Sequence[str]) -> Table:
    """A value that must be a table with the given keys."""
    if not isinstance(value, dict):
        raise origin.error(describe(value), expected)
    return Table(value, origin, keys)


def check_integer(value: object, origin: Origin, low: int, high: int, what: str = "an integer") -> int:
    """A value that must be an integer in [low, high]; true and false are not integers."""
    if isinstance(value, bool) or not isinstance(value, int) or not low <= value <= high:
        raise origin.error(describe(value), f"{what} from {low} to {high}")
    return value


def read_bytes(path: str | Path) -> bytes:
    """The bytes of a regular file of at most `MAX_BYTES` bytes; raises `InputError` otherwise."""
    file = Path(path)
    origin = Origin(str(path))
    try:
        present, regular, data = file.exists(), file.is_file(), b""
        if regular:
            with file.open("rb") as stream:
                data = stream.read(MAX_BYTES + 1)
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise origin.error(f"cannot be read ({reason})", "a readable file") from None
    if not regular:
        raise origin.error("not a regular file" if present else "no such file", "a file")
    if len(data) > MAX_BYTES:
        raise origin.error("a very large file", f"at most {MAX_BYTES} bytes")
    return data


def _decode(data: bytes, origin: Origin) -> str:
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise origin.at(f"line {line}").error(f"the byte 0x{data[error.start]:02x}", "UTF-8 text") from None


def _read(path: str | Path, language: str, parse: Callable[[str, Origin], Any]) -> Document:
    origin = Origin(str(path))
    data = read_bytes(path)
    text = _decode(data, origin)
    try:
        content = parse(text, origin)
    except RecursionError:
        raise origin.error("too deeply nested", f"a flat {language} file") from None
    if not isinstance(content, dict):
        raise origin.error(describe(content), "a table")
    return Document(Table(content, origin), hashlib.sha256(data).hexdigest())


def read_toml(path: str | Path) -> Document:
    """A TOML file in UTF-8 (a byte order mark is skipped); raises `InputError` with line and column."""
    return _read(path, "TOML", _parse_toml)


def read_json(path: str | Path) -> Document:
    """A JSON file in UTF-8 without repeated keys, NaN and Infinity; raises `InputError` with line and column.

    Numbers that are not written as integers are kept as such and refused wherever an integer is read.
    """
    return _read(path, "JSON", _parse_json)


def _parse_toml(text: str, origin: Origin) -> Any:
    try:
        return tomllib.loads(text)
    except ValueError as error:
        message = " ".join(str(error).split())
        if not isinstance(error, tomllib.TOMLDecodeError):
            raise origin.error("an integer with too many digits", "smaller numbers") from None
        message, _, place = message.rpartition(" (at ")
        if not message:
            message, place = place, ""
        raise origin.at(place.rstrip(")")).error(quote(message, 120)[1:-1], "valid TOML") from None


@dataclass(frozen=True)
class _NotAnInteger:
    text: str


def _parse_json(text: str, origin: Origin) -> Any:
    def constant(name: str) -> NoReturn:
        raise origin.error(name, "a number")

    def unique(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
        out: dict[str, Any] = {}
        for key, value in pairs:
            if key in out:
                raise origin.error(f"the key {quote(key)} twice in one table", "it once")
            out[key] = value
        return out

    def number(digits: str) -> int:
        if len(digits) > 4000:
            raise origin.error("an integer with too many digits", "smaller numbers")
        return int(digits)

    try:
        return json.loads(
            text,
            parse_constant=constant,
            parse_float=_NotAnInteger,
            parse_int=number,
            object_pairs_hook=unique,
        )
    except json.JSONDecodeError as error:
        place = f"line {error.lineno}, column {error.colno}"
        raise origin.at(place).error(quote(error.msg, 120)[1:-1], "valid JSON") from None
