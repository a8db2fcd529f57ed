"""An interrupted run exits with 130 and goes on where it stopped, to the same bytes."""

from __future__ import annotations

import signal
import sqlite3
import subprocess
import time
from pathlib import Path

import pytest

from tests.support.command_line import command, environment, sextic_case, sieve_process

FILES = ("result.json", "proof.jsonl", "report.txt")


def stored(path: Path) -> int:
    """The number of records in a store that another process may be writing."""
    if not path.exists():
        return 0
    try:
        with sqlite3.connect(f"file:{path}?mode=ro", uri=True) as connection:
            return int(connection.execute("SELECT count(*) FROM local").fetchone()[0])
    except sqlite3.Error:
        return 0


@pytest.mark.parametrize("jobs", ["1", "2"])
def test_interrupted_and_continued(jobs: str, tmp_path: Path) -> None:
    case = sextic_case(tmp_path)
    arguments = ("run", case, "--bound", "1400", "--jobs", jobs, "-o")
    process = subprocess.Popen(
        command(*arguments, "stopped"),
        cwd=tmp_path,
        env=environment(),
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
    )
    store = tmp_path / "stopped" / "local.sqlite"
    for _ in range(6000):
        if stored(store) >= 20 or process.poll() is not None:
            break
        time.sleep(0.01)
    process.send_signal(signal.SIGINT)
    out, err = process.communicate(timeout=60)
    assert process.returncode == 130, err
    assert out == "" and "Traceback" not in err and "interrupted" in err
    kept = stored(store)
    assert kept >= 20 and not (tmp_path / "stopped" / "result.json").exists()
    for name in ("stopped", "undisturbed"):
        done = sieve_process(*arguments, name, cwd=tmp_path)
        assert done.code == 1
    assert stored(store) > kept
    for name in FILES:
        assert (tmp_path / "stopped" / name).read_bytes() == (tmp_path / "undisturbed" / name).read_bytes()


def test_a_run_reads_its_store_and_writes_the_same_again(tmp_path: Path) -> None:
    case = sextic_case(tmp_path)
    arguments = ("run", case, "--bound", "200", "--jobs", "1", "-o", "out")
    assert sieve_process(*arguments, cwd=tmp_path).code == 1
    first = {name: (tmp_path / "out" / name).read_bytes() for name in FILES}
    count = stored(tmp_path / "out" / "local.sqlite")
    assert count > 0 and sieve_process(*arguments, cwd=tmp_path).code == 1
    assert stored(tmp_path / "out" / "local.sqlite") == count
    assert first == {name: (tmp_path / "out" / name).read_bytes() for name in FILES}
