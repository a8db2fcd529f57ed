"""Appendices and drawings: content, every ending, bad logs, and pdflatex where it is installed."""

from __future__ import annotations

import json
import re
import shutil
import subprocess
import xml.etree.ElementTree as ElementTree
from html.parser import HTMLParser
from pathlib import Path

import networkx as nx
import pytest

from sieve.commands import appendix as appendix_command
from sieve.commands import draw as draw_command
from sieve.errors import InputError
from sieve.proof.reader import read_log
from sieve.report import mathematics as m
from sieve.report.appendix import appendix
from sieve.report.appendix_tex import escape
from sieve.report.draw import constraint_graph
from tests.support.reference_cases import reference_case
from tests.support.run_files import RUNNABLE, chabauty_prime, run_to, write_candidates, write_case

ROOT = Path(__file__).resolve().parents[2]
LOGS = sorted((ROOT / "data" / "proofs" / "accepted").glob("*.jsonl"))
DEMO = next(log for log in LOGS if log.stem == "demo")
PDFLATEX = shutil.which("pdflatex")


def compile_tex(path: Path) -> None:
    """Run pdflatex; nothing may stick out of the page by more than 2 mm."""
    assert PDFLATEX is not None
    done = subprocess.run(
        [PDFLATEX, "-interaction=nonstopmode", "-halt-on-error", path.name],
        cwd=path.parent, capture_output=True, timeout=300, check=False,
    )  # fmt: skip
    log = path.with_suffix(".log").read_text(encoding="latin-1")
    assert done.returncode == 0, log[-2000:]
    wide = [float(w) for w in re.findall(r"Overfull \\hbox \(([0-9.]+)pt", log)]
    assert all(w < 6 for w in wide), wide


@pytest.mark.parametrize("log", LOGS, ids=lambda p: p.stem)
def test_every_ending(log: Path, tmp_path: Path) -> None:
    view = read_log(log)
    texts = {}
    for ending in (".tex", ".md", ".html"):
        appendix_command.execute(str(log), str(tmp_path / f"a{ending}"))
        texts[ending] = (tmp_path / f"a{ending}").read_text(encoding="utf-8")
    for local in view.of("local"):
        assert f"${local['prime']}$ & " in texts[".tex"] and f"| ${local['prime']}$ |" in texts[".md"]
    for candidate in view.of("candidate"):
        assert f"<td>{candidate['id']}</td>" in texts[".html"]
    for text in texts.values():
        assert view.sha256[:32] in text and "checker.py" in text
    dead = sum(text.count("eliminated") for text in [texts[".md"]])
    assert dead >= len(view.end["eliminated"])
    HTMLParser().feed(texts[".html"])
    assert "<script" not in texts[".html"] and "http" not in texts[".html"]


@pytest.mark.skipif(PDFLATEX is None, reason="no TeX here: install texlive-latex-recommended")
@pytest.mark.parametrize("log", LOGS, ids=lambda p: p.stem)
def test_logs_compile(log: Path, tmp_path: Path) -> None:
    appendix_command.execute(str(log), str(tmp_path / "a.tex"))
    compile_tex(tmp_path / "a.tex")
    draw_command.execute(str(log), str(tmp_path / "g.tex"))
    compile_tex(tmp_path / "g.tex")


@pytest.mark.skipif(PDFLATEX is None, reason="no TeX here: install texlive-latex-recommended")
@pytest.mark.slow
@pytest.mark.parametrize("name", RUNNABLE)
def test_every_reference_case_compiles(name: str, tmp_path: Path) -> None:
    case = reference_case(name)
    candidates = write_candidates(case, tmp_path, chabauty_prime(case), 4, 5)
    _, log = run_to(tmp_path, write_case(case, tmp_path), [candidates], bound=110)
    appendix_command.execute(str(log), str(tmp_path / "a.tex"))
    compile_tex(tmp_path / "a.tex")


def test_the_theorem_of_the_demo() -> None:
    text = "\n".join(str(block) for block in appendix(read_log(DEMO), "proof.jsonl"))
    assert "has exactly 16 rational points" in text
    assert "(\\\\tfrac{7}{5}, -\\\\tfrac{507}{125})" in text
    assert "rank at most $2$" in text


def test_images_in_the_table_are_those_of_the_engine() -> None:
    from sieve.curves.hyperelliptic import HyperellipticCurve
    from sieve.local.records import local_record

    view = read_log(DEMO)
    curve = HyperellipticCurve(view.curve.f, view.curve.h)
    for local in view.of("local"):
        record = local_record(curve, view.base, view.generators, local["prime"])
        condition = view.condition(local)
        assert condition.moduli == record.invariants
        assert condition.images == record.images
        assert (condition.allowed == record.allowed).all()


@pytest.mark.parametrize("log", LOGS, ids=lambda p: p.stem)
def test_drawings(log: Path, tmp_path: Path) -> None:
    graph = constraint_graph(read_log(log))
    for ending in (".svg", ".graphml", ".tex"):
        draw_command.execute(str(log), str(tmp_path / f"g{ending}"))
    ElementTree.parse(tmp_path / "g.svg")
    again = nx.read_graphml(tmp_path / "g.graphml")
    assert set(again.nodes) == set(graph.nodes) and again.number_of_edges() == graph.number_of_edges()
    used = {
        u[0] for r in map(json.loads, log.read_text(encoding="utf-8").splitlines()) for u in r.get("uses", [])
    }
    assert {n for n in graph if n.startswith("v")} == {f"v = {v}" for v in used if isinstance(v, int)}


BAD = {
    "empty": b"",
    "text": b"hello\n",
    "list": b"[1,2]\n",
    "other_format": b'{"kind":"header","format":"sieve-proof/9"}\n',
    "cut": DEMO.read_bytes()[:3000],
    "latin": "\xe9".encode("latin-1"),
    "deep": b"[" * 100000,
    "whole_but_wrong": re.sub(rb'"invariants":\[[0-9,]*\]', b'"invariants":[9]', DEMO.read_bytes()),
    "points_gone": DEMO.read_bytes().replace(b'"define":[[', b'"define":[[[1],[0,0,0,0,0,0]],[', 1),
    "unknown_verdict": DEMO.read_bytes().replace(b'"verdict":"eliminated"', b'"verdict":"gone"', 1),
}


@pytest.mark.parametrize("name", sorted(BAD))
@pytest.mark.parametrize("command", [appendix_command, draw_command], ids=["appendix", "draw"])
def test_bad_logs(name: str, command: object, tmp_path: Path) -> None:
    path = tmp_path / "bad.jsonl"
    path.write_bytes(BAD[name])
    output = tmp_path / "out.tex"
    with pytest.raises(InputError) as error:
        command.execute(str(path), str(output))  # type: ignore[attr-defined]
    assert "\n" not in error.value.line and "expected" in error.value.line
    assert not output.exists()


def test_other_endings_are_refused(tmp_path: Path) -> None:
    for command in (appendix_command, draw_command):
        with pytest.raises(InputError, match="ending"):
            command.execute(str(DEMO), str(tmp_path / "a.pdf"))


def test_foreign_text_cannot_break_tex() -> None:
    assert escape("50% of $x_1$ & {a} \\end{document}~^#") == (
        r"50\% of \$x\_1\$ \& \{a\} \textbackslash{}end\{document\}\textasciitilde{}\textasciicircum{}\#"
    )
    assert escape("π") == "[U+03C0]"


def test_formulas() -> None:
    assert m.expansion(0, 5, 3) == "O(5^{3})"
    assert m.expansion(5 + 25 * 4, 5, 3) == "5 + 4\\cdot 5^{2} + O(5^{3})"
    assert m.polynomial([]) == "0" and m.polynomial([0, -1]) == "-x"
    assert m.group([2, 2, 10]) == "(\\mathbb{Z}/2)^{2} \\times \\mathbb{Z}/10"
    assert m.as_html("a_{i} < b") == "<i>a</i><sub><i>i</i></sub> &lt; <i>b</i>"


def test_the_stored_sample_states_the_same_theorem(tmp_path: Path) -> None:
    appendix_command.execute(str(DEMO), str(tmp_path / "a.tex"))

    def theorem(path: Path) -> str:
        text = path.read_text(encoding="utf-8")
        return text[text.index("\\begin{theorem}") : text.index("\\end{theorem}")]

    assert theorem(ROOT / "data" / "demo" / "appendix.tex") == theorem(tmp_path / "a.tex")
