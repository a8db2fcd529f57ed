"""`sieve advise` on the demo: JSON of the interface, text, refusals."""

from __future__ import annotations

import json
from pathlib import Path

from click.testing import CliRunner

from sieve.cli import main

DEMO = Path(__file__).resolve().parents[2] / "data" / "demo"


def invoke(*arguments):
    result = CliRunner().invoke(main, list(arguments))
    return result.exit_code, result.output


def test_advice_for_the_whole_sieve_and_chabauty_primes():
    code, output = invoke("advise", str(DEMO / "case.toml"), "--bound", "300", "--top", "3",
                          "--chabauty-bound", "7", "--jobs", "1", "--json")
    assert code == 0
    document = json.loads(output)
    assert 0 < len(document["advice"]) <= 3
    for entry in document["advice"]:
        assert 150 <= entry["prime"] < 300 and entry["predicted_survivors"] >= 1 and entry["reason"]
        assert entry["predicted_seconds"] > 0 and all(isinstance(d, str) for d in entry["structure"])
    assert {c["prime"] for c in document["chabauty"]} <= {3, 5, 7} and document["chabauty"]
    assert all(1 <= c["precision"] <= 6 for c in document["chabauty"])


def test_advice_in_words_and_refusals():
    case = str(DEMO / "case.toml")
    code, output = invoke("advise", case, "-c", str(DEMO / "candidates.json"), "--bound", "200")
    assert code == 0 and output.startswith("demo: ")
    assert invoke("advise", case, "--top", "0")[0] == 2
    assert invoke("advise", case, "--bound", "1")[0] == 2
    assert invoke("advise", "nowhere.toml")[0] == 2
