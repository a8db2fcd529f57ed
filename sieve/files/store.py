"""The store: local data in one SQLite file, shared by runs and cases, safe against being killed.

Write-ahead logging makes a record either whole or absent, and several processes may use one store at a time.
A file that is not a store of this version, or a damaged one, is refused and left untouched: it is looked at
through a read-only connection first.
"""

from __future__ import annotations

import hashlib
import json
import sqlite3
import time
from collections.abc import Callable, Iterable, Mapping, Sequence
from pathlib import Path
from typing import TypeVar
from urllib.parse import quote

from sieve.curves.divisors import Divisor
from sieve.curves.protocol import Curve
from sieve.errors import InputError
from sieve.local.quick_order import QuickOrder
from sieve.local.records import LocalRecord, class_bytes, classes_from_bytes

SCHEMA = 3
_MAGIC = "residue-sieve local data"
_HEADER = b"SQLite format 3\x00"
_TABLES = (
    "CREATE TABLE IF NOT EXISTS about (key TEXT PRIMARY KEY, value TEXT)",
    "CREATE TABLE IF NOT EXISTS local (problem TEXT, prime INTEGER, record TEXT, allowed BLOB, digest BLOB, "
    "PRIMARY KEY (problem, prime)) WITHOUT ROWID",
    "CREATE TABLE IF NOT EXISTS orders (curve TEXT, prime INTEGER, record TEXT, "
    "PRIMARY KEY (curve, prime)) WITHOUT ROWID",
)
WAIT = 60.0
"""Seconds to wait for another process that holds the file."""

T = TypeVar("T")


def problem_key(
    curve: Curve, base: Divisor, divisors: Sequence[Divisor], integral: bool = False
) -> str:
    """A digest of everything a local record depends on but its prime."""
    text = "\n".join([curve.key, repr(base), *map(repr, divisors), *["integral"] * integral])
    return hashlib.sha256(text.encode()).hexdigest()


class Store:
    """Local records on disk.  Use as a context manager.

    Raises `InputError` when the file is not a readable store (another format, another version, damaged).
    """

    def __init__(self, path: str | Path) -> None:
        self.path = Path(path)
        if self.path.is_dir():
            raise self._refused("", "a directory", "a store file")
        exists = self.path.exists() and self.path.stat().st_size > 0
        if exists:
            with open(self.path, "rb") as stream:
                if stream.read(16) != _HEADER:
                    raise self._refused("", "a file of another format")
        try:
            if exists:
                _patiently(self._inspect)
            self.connection = sqlite3.connect(self.path, timeout=WAIT)
            _patiently(self._prepare)
        except sqlite3.Error as error:
            raise self._refused("", f"an unreadable store ({error})") from None

    def _refused(
        self, place: str, found: str, expected: str = "a store written by this program"
    ) -> InputError:
        return InputError(str(self.path), place, found, expected)

    def _prepare(self) -> None:
        self.connection.execute("PRAGMA journal_mode=WAL")
        self.connection.execute("PRAGMA synchronous=NORMAL")
        with self.connection:
            # several processes may do this at the same time: take the lock before looking
            self.connection.execute("BEGIN IMMEDIATE")
            for table in _TABLES:
                self.connection.execute(table)
            self.connection.execute(
                "INSERT OR IGNORE INTO about VALUES ('kind', ?), ('schema', ?)", (_MAGIC, str(SCHEMA))
            )

    def _inspect(self) -> None:
        """Refuse what is not an intact store, through a connection that cannot write."""
        name = quote(str(self.path.absolute()))
        reader = sqlite3.connect(f"file:{name}?mode=ro", uri=True, timeout=WAIT)
        try:
            tables = {
                row[0] for row in reader.execute("SELECT name FROM sqlite_master WHERE type = 'table'")
            }
            if "about" not in tables:
                # an empty database left by a kill during creation is fine
                if tables:
                    raise self._refused("", "a database of another program")
                return
            columns = [row[1] for row in reader.execute("PRAGMA table_info(about)")]
            about = dict(reader.execute("SELECT key, value FROM about").fetchall()) if columns == [
                "key", "value"] else {"kind": ""}
            if about and about.get("kind") != _MAGIC:
                raise self._refused("", "a database of another program")
            if about and about.get("schema") != str(SCHEMA):
                raise self._refused("schema", f"version {about.get('schema')}", f"version {SCHEMA}")
            if reader.execute("PRAGMA quick_check").fetchone()[0] != "ok":
                raise self._refused("", "a damaged store", "an intact one (delete it to start afresh)")
        finally:
            reader.close()

    def __enter__(self) -> Store:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def close(self) -> None:
        """Close the file; the store cannot be used afterwards."""
        self.connection.close()

    def _damaged(self, prime: int) -> InputError:
        return self._refused(f"v = {prime}", "a damaged record", "the record that was written")

    def load(self, key: str, primes: Iterable[int]) -> dict[int, LocalRecord]:
        """The stored records of a problem at the given primes; raises `InputError` on a damaged row."""
        wanted = set(primes)
        out: dict[int, LocalRecord] = {}
        if not wanted:
            return out
        found = self._read(
            "SELECT prime, record, allowed, digest FROM local WHERE problem = ? AND prime BETWEEN ? AND ?",
            (key, min(wanted), max(wanted)),
        )
        for prime, text, allowed, digest in found:
            if prime in wanted:
                if not isinstance(text, str) or not isinstance(allowed, bytes) or _digest(
                        key, prime, text, allowed) != digest:
                    raise self._damaged(prime)
                out[prime] = _decode(text, allowed)
        return out

    def _read(self, question: str, values: tuple[object, ...]) -> list[tuple[object, ...]]:
        try:
            return _patiently(lambda: self.connection.execute(question, values).fetchall())
        except sqlite3.Error as error:
            raise self._refused("", f"an unreadable store ({error})") from None

    def _write(self, question: str, rows: Sequence[tuple[object, ...]]) -> None:
        def once() -> None:
            with self.connection:
                self.connection.executemany(question, rows)

        try:
            _patiently(once)
        except sqlite3.Error as error:
            raise self._refused("", f"a store that cannot be written ({error})", "a writable one") from None

    def save(self, key: str, record: LocalRecord) -> None:
        """Write one record; it is on disk, whole, when this returns."""
        text, allowed = _encode(record)
        row = (key, record.prime, text, allowed, _digest(key, record.prime, text, allowed))
        self._write("INSERT OR REPLACE INTO local VALUES (?, ?, ?, ?, ?)", [row])

    def load_orders(self, curve: str, primes: Iterable[int]) -> dict[int, QuickOrder | None]:
        """The stored possible orders for a curve (by its key); None where it is known that there are none."""
        wanted = set(primes)
        out: dict[int, QuickOrder | None] = {}
        if wanted:
            found = self._read(
                "SELECT prime, record FROM orders WHERE curve = ? AND prime BETWEEN ? AND ?",
                (curve, min(wanted), max(wanted)),
            )
            for prime, text in found:
                if prime in wanted:
                    try:
                        points, orders = json.loads(str(text))
                    except (ValueError, TypeError):
                        raise self._damaged(int(str(prime))) from None
                    v = int(str(prime))
                    out[v] = QuickOrder(v, points, tuple(orders)) if orders else None
        return out

    def save_orders(self, curve: str, orders: Mapping[int, QuickOrder | None]) -> None:
        """Write the possible orders at some primes, all at once."""
        rows: list[tuple[object, ...]] = []
        for prime in sorted(orders):
            found = orders[prime]
            rows.append((curve, prime, json.dumps([found.points, found.orders] if found else [0, []])))
        if rows:
            self._write("INSERT OR REPLACE INTO orders VALUES (?, ?, ?)", rows)


def _patiently(work: Callable[[], T]) -> T:
    """Do it again while another process holds the file: SQLite does not wait in every situation."""
    deadline = time.monotonic() + WAIT
    while True:
        try:
            return work()
        except sqlite3.OperationalError as error:
            busy = "locked" in str(error) or "busy" in str(error)
            if not busy or time.monotonic() > deadline:
                raise
        time.sleep(0.02)


def _digest(key: str, prime: int, text: str, allowed: bytes) -> bytes:
    return hashlib.sha256(f"{key} {prime} {text} ".encode() + allowed).digest()


def _encode(record: LocalRecord) -> tuple[str, bytes]:
    """The record as text and its classes as bytes."""
    text = json.dumps(
        {
            "prime": record.prime,
            "points": record.points,
            "order": record.order,
            "invariants": record.invariants,
            "images": record.images,
            "count": int(record.allowed.shape[0]),
            "reason": record.reason,
            "skipped": record.skipped,
            "expressible": record.expressible,
        },
        separators=(",", ":"),
    )
    return text, class_bytes(record)


def _decode(text: str, allowed: bytes) -> LocalRecord:
    data = json.loads(text)
    return LocalRecord(
        data["prime"],
        data["points"],
        data["order"],
        tuple(data["invariants"]),
        tuple(tuple(row) for row in data["images"]),
        classes_from_bytes(allowed, data["count"], data["invariants"]),
        data["reason"],
        data["skipped"],
        data["expressible"],
    )
