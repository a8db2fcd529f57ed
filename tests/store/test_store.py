"""The store: what goes in comes out, foreign and damaged files stay untouched, several processes, kills."""

from __future__ import annotations

import hashlib
import os
import random
import signal
import sqlite3
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest

from sieve.errors import InputError
from sieve.files.store import SCHEMA, Store
from sieve.local.quick_order import QuickOrder
from sieve.local.records import LocalRecord

ROOT = Path(__file__).resolve().parents[2]
DEMO = ROOT / "data" / "demo"
RESULTS = ("result.json", "proof.jsonl", "report.txt")


def record(v, rows=50):
    rng = random.Random(v)
    allowed = np.array([[rng.randrange(2**62), rng.randrange(10)] for _ in range(rows)], dtype=np.int64)
    return LocalRecord(v, rows, 2**70, (2**62, 10), ((1, 2), (3, 4)), allowed.reshape(rows, 2), "why", "")


def same(a, b):
    mine, other = dict(vars(a)), dict(vars(b))
    left, right = mine.pop("allowed"), other.pop("allowed")
    return mine == other and left.dtype == right.dtype == np.int64 and np.array_equal(left, right)


def fingerprint(path):
    return hashlib.sha256(path.read_bytes()).hexdigest()


def test_records_come_back_as_they_were(tmp_path):
    path = tmp_path / "s.sqlite"
    skipped = LocalRecord(7, -1, 0, (), (), np.zeros((0, 0), dtype=np.int64), "", "not smooth")
    with Store(path) as store:
        for item in (record(5), record(11, 0), skipped):
            store.save("key", item)
        store.save("other", record(5, 3))
    with Store(path) as store:
        found = store.load("key", [5, 7, 11, 13])
        assert sorted(found) == [5, 7, 11]
        assert same(found[5], record(5)) and same(found[7], skipped) and same(found[11], record(11, 0))
        assert sorted(store.load("key", [7])) == [7] and store.load("key", []) == {}
        assert same(store.load("other", [5])[5], record(5, 3)) and store.load("none", [5]) == {}


def test_orders_come_back_with_the_knowledge_that_there_are_none(tmp_path):
    with Store(tmp_path / "s.sqlite") as store:
        orders = {101: QuickOrder(101, 111, (11109, 11210)), 103: None}
        store.save_orders("curve", orders)
        assert store.load_orders("curve", [101, 103, 107]) == orders
        assert store.load_orders("another", [101]) == {}


def foreign_files():
    def text(path):
        path.write_text("nothing like a database at all, just text")

    def database(path):
        with sqlite3.connect(path) as other:
            other.execute("CREATE TABLE bookmarks (url TEXT)")
            other.execute("INSERT INTO bookmarks VALUES ('x')")
        other.close()

    def similar(path):
        with sqlite3.connect(path) as other:
            other.execute("CREATE TABLE about (name TEXT)")
        other.close()

    def older(path):
        Store(path).close()
        with sqlite3.connect(path) as other:
            other.execute("UPDATE about SET value = ? WHERE key = 'schema'", (str(SCHEMA - 1),))
        other.close()

    def filled(path):
        with Store(path) as store:
            for v in range(3, 60):
                store.save("key", record(v))

    def cut(path):
        filled(path)
        data = path.read_bytes()
        path.write_bytes(data[: len(data) // 2 // 4096 * 4096 + 100])

    def overwritten(path):
        filled(path)
        data = bytearray(path.read_bytes())
        data[4096:12288] = b"\xa5" * 8192
        path.write_bytes(bytes(data))

    return [text, database, similar, older, cut, overwritten]


@pytest.mark.parametrize("make", foreign_files(), ids=lambda f: f.__name__)
def test_foreign_and_damaged_files_are_refused_and_left_untouched(tmp_path, make):
    path = tmp_path / "s.sqlite"
    make(path)
    before = fingerprint(path)
    with pytest.raises(InputError) as caught:
        Store(path)
    assert str(path) in caught.value.line and "expected" in caught.value.line
    assert fingerprint(path) == before


def test_a_flipped_bit_in_a_record_is_noticed_at_every_place(tmp_path):
    path = tmp_path / "s.sqlite"
    with Store(path) as store:
        store.save("key", record(5, 8))
    column_of = {"record": 40, "allowed": 30, "digest": 5, "prime": None}
    for column, place in column_of.items():
        with sqlite3.connect(path) as other:
            old = other.execute(f"SELECT {column} FROM local").fetchone()[0]
            if place is None:
                new = 7
            elif isinstance(old, str):
                new = old[:place] + chr(ord(old[place]) ^ 1) + old[place + 1 :]
            else:
                new = old[:place] + bytes([old[place] ^ 1]) + old[place + 1 :]
            other.execute(f"UPDATE local SET {column} = ?", (new,))
        other.close()
        with Store(path) as store, pytest.raises(InputError, match="damaged record"):
            store.load("key", [5, 7])
        with sqlite3.connect(path) as other:
            other.execute(f"UPDATE local SET {column} = ?", (old,))
        other.close()
    with Store(path) as store:
        assert same(store.load("key", [5])[5], record(5, 8))


def test_an_empty_file_and_an_unfinished_store_are_taken(tmp_path):
    empty = tmp_path / "empty"
    empty.touch()
    Store(empty).close()
    bare = tmp_path / "bare"
    other = sqlite3.connect(bare)
    other.execute("PRAGMA journal_mode=WAL")
    other.close()
    with Store(bare) as store:
        store.save("key", record(3))


WRITER = """
import sys
sys.path.insert(0, {root!r})
from sieve.files.store import Store
from tests.store.test_store import record, same
me = int(sys.argv[2])
for round in range(4):
    with Store(sys.argv[1]) as store:
        for v in range(100 * (me % 2) + 20 * round, 100 * (me % 2) + 20 * round + 60):
            store.save("key", record(v))
        for v, found in store.load("key", range(300)).items():
            assert same(found, record(v)), v
"""


def test_four_processes_create_and_fill_one_store(tmp_path):
    path = tmp_path / "s.sqlite"
    code = WRITER.format(root=str(ROOT))
    running = [subprocess.Popen([sys.executable, "-c", code, str(path), str(k)], stderr=subprocess.PIPE)
               for k in range(4)]
    for process in running:
        _, errors = process.communicate(timeout=120)
        assert process.returncode == 0, errors.decode()
    with Store(path) as store:
        found = store.load("key", range(300))
    assert sorted(found) == list(range(220)) and all(same(r, record(v)) for v, r in found.items())


def start(directory, store, *options):
    environment = {**os.environ, "PYTHONPATH": str(ROOT), "OPENBLAS_NUM_THREADS": "1"}
    files = [str(DEMO / "case.toml"), "-c", str(DEMO / "candidates.json")]
    places = ["-o", str(directory), "--store", str(store)]
    command = [sys.executable, "-m", "sieve", "run", *files, *places, *options]
    return subprocess.Popen(command, env=environment, stdout=subprocess.DEVNULL, stderr=subprocess.PIPE,
                            start_new_session=True)


def results(directory):
    return {name: (directory / name).read_bytes() for name in RESULTS}


def finish(process):
    _, errors = process.communicate(timeout=120)
    assert process.returncode in (0, 1), errors.decode()


def kills_until_done(tmp_path, moments, jobs="1"):
    """Kill a run at each moment (seconds after its start), go on with the same store; the last bytes."""
    store, directory = tmp_path / "s.sqlite", tmp_path / "out"
    for moment in moments:
        process = start(directory, store, "--jobs", jobs)
        time.sleep(moment)
        try:
            os.killpg(process.pid, signal.SIGKILL)
        except ProcessLookupError:
            pass
        process.communicate()
    if store.exists():
        Store(store).close()
    last = start(directory, store, "--jobs", jobs)
    finish(last)
    return results(directory)


def test_a_run_killed_at_random_moments_ends_with_the_same_bytes(tmp_path):
    clean = tmp_path / "clean"
    began = time.monotonic()
    finish(start(clean, tmp_path / "clean.sqlite", "--jobs", "1"))
    length = time.monotonic() - began
    expected = results(clean)
    rng = random.Random(11)
    moments = [rng.uniform(0.05, 1.0) * length for _ in range(4)]
    (tmp_path / "killed").mkdir()
    assert kills_until_done(tmp_path / "killed", moments) == expected


def test_two_runs_on_one_store_and_other_numbers_of_jobs_give_the_same_bytes(tmp_path):
    shared = tmp_path / "shared.sqlite"
    running = [start(tmp_path / f"out{k}", shared, "--jobs", str(k + 1)) for k in range(2)]
    for process in running:
        finish(process)
    third = start(tmp_path / "out2", shared, "--jobs", "1")
    finish(third)
    first = results(tmp_path / "out0")
    assert results(tmp_path / "out1") == first and results(tmp_path / "out2") == first
