"""The store: local data in one SQLite file, shared by runs, safe against being killed.

Write-ahead logging makes a record either whole or absent; a file that is not a store of this version is
refused and left untouched.
"""

from __future__ import annotations

import hashlib
import json
import sqlite3
from collections.abc import Iterable, Sequence
from pathlib import Path

import numpy as np

from sieve.curves.divisors import Divisor
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.errors import InputError
from sieve.local.records import LocalRecord

SCHEMA = 2
_MAGIC = "residue-sieve local data"


def problem_key(curve: HyperellipticCurve, base: Divisor, divisors: Sequence[Divisor]) -> str:
    """A digest of everything a local record depends on but its prime."""
    text = "\n".join([curve.key, repr(base), *map(repr, divisors)])
    return hashlib.sha256(text.encode()).hexdigest()


class Store:
    """Local records on disk.  Use as a context manager.

    Raises `InputError` when the file is not a readable store (another format, another version, damaged).
    """

    def __init__(self, path: str | Path) -> None:
        self.path = Path(path)
        if self.path.is_dir():
            raise InputError(str(path), "", "a directory", "a store file")
        exists = self.path.exists() and self.path.stat().st_size > 0
        if exists:
            with open(self.path, "rb") as stream:
                if stream.read(16) != b"SQLite format 3\x00":
                    raise InputError(
                        str(path), "", "a file of another format", "a store written by this program"
                    )
        try:
            self.connection = sqlite3.connect(self.path, timeout=60)
            if exists:
                self._check()
            self.connection.execute("PRAGMA journal_mode=WAL")
            self.connection.execute("PRAGMA synchronous=NORMAL")
            with self.connection:
                self.connection.execute("CREATE TABLE IF NOT EXISTS about (key TEXT PRIMARY KEY, value TEXT)")
                columns = "problem TEXT, prime INTEGER, record TEXT, digest TEXT"
                self.connection.execute(
                    f"CREATE TABLE IF NOT EXISTS local ({columns}, PRIMARY KEY (problem, prime))"
                )
                self.connection.execute(
                    "INSERT OR IGNORE INTO about VALUES ('kind', ?), ('schema', ?)", (_MAGIC, str(SCHEMA))
                )
        except sqlite3.Error as error:
            raise InputError(
                str(path), "", f"an unreadable store ({error})", "a store written by this program"
            ) from None

    def _check(self) -> None:
        tables = {
            row[0] for row in self.connection.execute("SELECT name FROM sqlite_master WHERE type = 'table'")
        }
        if "about" not in tables:
            # an empty database left by a kill during creation is fine
            if tables:
                raise InputError(
                    str(self.path), "", "a database of another program", "a store written by this program"
                )
            return
        about = dict(self.connection.execute("SELECT key, value FROM about").fetchall())
        if about and about.get("kind") != _MAGIC:
            raise InputError(
                str(self.path), "", "a database of another program", "a store written by this program"
            )
        if about and about.get("schema") != str(SCHEMA):
            raise InputError(str(self.path), "schema", f"version {about.get('schema')}", f"version {SCHEMA}")
        if self.connection.execute("PRAGMA quick_check").fetchone()[0] != "ok":
            raise InputError(
                str(self.path), "", "a damaged store", "an intact one (delete it to start afresh)"
            )

    def __enter__(self) -> Store:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def close(self) -> None:
        """Close the file; the store cannot be used afterwards."""
        self.connection.close()

    def load(self, key: str, primes: Iterable[int]) -> dict[int, LocalRecord]:
        """The stored records of a problem at the given primes; raises `InputError` on a damaged row."""
        wanted = set(primes)
        out = {}
        for prime, text, digest in self.connection.execute(
            "SELECT prime, record, digest FROM local WHERE problem = ?", (key,)
        ):
            if prime in wanted:
                if hashlib.sha256(text.encode()).hexdigest() != digest:
                    raise InputError(
                        str(self.path), f"v = {prime}", "a damaged record", "the record that was written"
                    )
                out[prime] = _decode(text)
        return out

    def save(self, key: str, record: LocalRecord) -> None:
        """Write one record; it is on disk, whole, when this returns."""
        text = _encode(record)
        with self.connection:
            self.connection.execute(
                "INSERT OR REPLACE INTO local VALUES (?, ?, ?, ?)",
                (key, record.prime, text, hashlib.sha256(text.encode()).hexdigest()),
            )


def _encode(record: LocalRecord) -> str:
    return json.dumps(
        {
            "prime": record.prime,
            "points": record.points,
            "order": record.order,
            "invariants": record.invariants,
            "images": record.images,
            "allowed": record.allowed.tolist(),
            "reason": record.reason,
            "skipped": record.skipped,
            "expressible": record.expressible,
        },
        separators=(",", ":"),
    )


def _decode(text: str) -> LocalRecord:
    data = json.loads(text)
    allowed = np.array(data["allowed"], dtype=np.int64).reshape(len(data["allowed"]), len(data["invariants"]))
    return LocalRecord(
        data["prime"],
        data["points"],
        data["order"],
        tuple(data["invariants"]),
        tuple(tuple(row) for row in data["images"]),
        allowed,
        data["reason"],
        data["skipped"],
        data["expressible"],
    )
