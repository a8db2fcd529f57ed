"""Bad proof logs made from accepted ones, each with the exit code, line and reason code it must get.

Run as `python -m tests.support.make_corpus` to write data/proofs/{rejected,malformed,declined} and
expected.tsv anew; the result depends on the accepted logs alone.  The expectations are written by hand in
`corpus_statement`, `corpus_evidence`, `corpus_plane`, `corpus_fates` and `corpus_zeros`, never taken from
the checker.
"""

from __future__ import annotations

from tests.support import corpus_evidence, corpus_fates, corpus_plane, corpus_statement, corpus_zeros
from tests.support.corpus_edits import CORPUS, EXIT, FOLDERS, Log


def corpus() -> tuple[dict[str, bytes], list[tuple[str, int, int, str]]]:
    """All bad logs by path below data/proofs, and rows (path, exit code, line, reason code)."""
    files: dict[str, bytes] = {}
    rows: list[tuple[str, int, int, str]] = []
    parts = (corpus_statement, corpus_evidence, corpus_plane, corpus_zeros, corpus_fates)
    for trap in (trap for part in parts for trap in part.traps()):
        log = Log(trap.source)
        line = trap.edit(log) + 1
        path = f"{trap.folder}/{trap.name}.jsonl"
        files[path] = log.data()
        rows.append((path, EXIT[trap.folder], line, trap.code))
    return files, sorted(rows)


def main() -> None:
    """Write the corpus."""
    files, rows = corpus()
    for folder in FOLDERS:
        (CORPUS / folder).mkdir(parents=True, exist_ok=True)
        for old in (CORPUS / folder).glob("*.jsonl"):
            old.unlink()
    for path, data in files.items():
        (CORPUS / path).write_bytes(data)
    lines = ["file\texit\tline\tcode", *("\t".join(map(str, row)) for row in rows)]
    (CORPUS / "expected.tsv").write_text("\n".join(lines) + "\n", encoding="utf-8")
    print(len(rows), "bad logs", sum(map(len, files.values())), "bytes")


if __name__ == "__main__":
    main()
