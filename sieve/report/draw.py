"""The constraint graph of a proof log: which conditions bear on one another, and through which primes l."""

from __future__ import annotations

import math
from dataclasses import dataclass
from html import escape
from typing import Any

import networkx as nx

from sieve.engine.join import common_exponents
from sieve.engine.relation import Relation, relation_from_condition
from sieve.proof.reader import LogView
from sieve.report.mathematics import as_html, group

WIDTH, HEIGHT = 900, 700


@dataclass(frozen=True)
class Spot:
    """A node with its place in the drawing (pixels, y downwards)."""

    name: str
    x: float
    y: float


def constraint_graph(view: LogView) -> nx.Graph:
    """The graph.

    Nodes are the auxiliary primes that some fate or the classes use, named "v = 59", with attributes `kind`
    ("prime"), `group`, `points`, `allowed` (classes of points) and the candidate lists, named "p = 7", with
    `kind` ("list"), `candidates` and `eliminated`.  Edges carry `primes`, the primes l in common, as text,
    and
    `weight`: between two v the logarithm of the order of their common quotient, between a list and v the
    number of candidates that v helps to eliminate.
    """
    graph: nx.Graph = nx.Graph()
    ells = view.allowed_ells()
    dead = {(p, name) for p, name in view.end["eliminated"]}
    lists = sorted({r["prime"] for r in view.of("candidate")})
    for p in lists:
        own = [r["id"] for r in view.of("candidate") if r["prime"] == p]
        gone = sum((p, name) in dead for name in own)
        graph.add_node(f"p = {p}", kind="list", candidates=len(own), eliminated=gone)
    used = {name for r in [*view.of("fate"), *view.of("classes")] for name, _, _ in r.get("uses", [])}
    relations: dict[int, Relation] = {}
    for local in view.of("local"):
        v = local["prime"]
        if v in used:
            condition = view.condition(local)
            relations[v] = relation_from_condition(condition, ells)
            points = view.curve.modulo(v).count
            graph.add_node(
                f"v = {v}",
                kind="prime",
                group=group(condition.moduli),
                points=points,
                allowed=condition.count,
            )
    for v in sorted(relations):
        for w in sorted(relations):
            if v < w:
                common = common_exponents(relations[v], relations[w])
                if common:
                    weight = sum(e * math.log(ell) for ell, e in common.items())
                    _edge(graph, f"v = {v}", f"v = {w}", sorted(common), round(weight, 3))
    for fate in view.of("fate"):
        for name, exponents, _ in fate.get("uses", []):
            other = f"v = {name}" if isinstance(name, int) else str(name)
            one = f"p = {fate['prime']}"
            old: dict[str, Any] = {"primes": "", "weight": 0}
            if graph.has_edge(one, other):
                old = graph.edges[one, other]
            primes = {int(q) for q in exponents} | {int(q) for q in old["primes"].split()}
            _edge(graph, one, other, sorted(primes), old["weight"] + 1)
    return graph


def _edge(graph: nx.Graph, one: str, other: str, primes: list[int], weight: float) -> None:
    graph.add_edge(one, other, primes=" ".join(map(str, primes)), weight=float(weight))


def layout(graph: nx.Graph) -> dict[str, Spot]:
    """Lists in the middle, primes on an ellipse around them, in increasing order from the top."""
    lists = [n for n in graph if graph.nodes[n]["kind"] == "list"]
    primes = [n for n in graph if graph.nodes[n]["kind"] == "prime"]
    spots: dict[str, Spot] = {}
    for k, name in enumerate(lists):
        offset = (k - (len(lists) - 1) / 2) * 190
        spots[name] = Spot(name, WIDTH / 2 + offset, HEIGHT / 2)
    for k, name in enumerate(primes):
        angle = 2 * math.pi * k / max(1, len(primes)) - math.pi / 2
        # a single prime would stand on the lists' line of sight otherwise
        spots[name] = Spot(name, WIDTH / 2 + 340 * math.cos(angle), HEIGHT / 2 + 270 * math.sin(angle))
    return spots


def _words(graph: nx.Graph, name: str) -> tuple[str, str, str]:
    data = graph.nodes[name]
    if data["kind"] == "list":
        return name, f"{data['candidates']} candidates", f"{data['eliminated']} eliminated"
    return name, data["group"], f"{data['allowed']} classes"


def _stroke(graph: nx.Graph, one: str, other: str) -> float:
    top = max((d["weight"] for _, _, d in graph.edges(data=True)), default=1) or 1
    return 0.8 + 3 * math.sqrt(graph.edges[one, other]["weight"] / top)


def _label_at(graph: nx.Graph, a: Spot, b: Spot) -> tuple[float, float]:
    """Where the primes of an edge are written: nearer to the rim for edges to a list."""
    if graph.nodes[a.name]["kind"] == "list" and graph.nodes[b.name]["kind"] == "prime":
        share = 0.58
    else:
        share = 0.5
    return a.x + share * (b.x - a.x), a.y + share * (b.y - a.y)


def as_svg(view: LogView) -> str:
    """The drawing as SVG."""
    graph = constraint_graph(view)
    spots = layout(graph)
    out = [
        f'<svg xmlns="http://www.w3.org/2000/svg" width="{WIDTH}" height="{HEIGHT}" '
        f'viewBox="0 0 {WIDTH} {HEIGHT}" font-family="Georgia, serif" font-size="13">',
        f'<rect width="{WIDTH}" height="{HEIGHT}" fill="white"/>',
        f'<text x="20" y="28" font-size="16">Conditions for {escape(view.header["case"]["name"])}: '
        "an edge means common primes \u2113</text>",
    ]
    labels = []
    for one, other, data in graph.edges(data=True):
        a, b = spots[one], spots[other]
        colour = "#b03a2e" if "list" in (graph.nodes[one]["kind"], graph.nodes[other]["kind"]) else "#8899aa"
        out.append(
            f'<line x1="{a.x:.1f}" y1="{a.y:.1f}" x2="{b.x:.1f}" y2="{b.y:.1f}" stroke="{colour}" '
            f'stroke-width="{_stroke(graph, one, other):.2f}" stroke-opacity="0.6"/>'
        )
        x, y = _label_at(graph, a, b)
        primes = data["primes"].replace(" ", ", ")
        half = 3.5 * len(primes) + 3
        labels.append(
            f'<rect x="{x - half:.1f}" y="{y - 8:.1f}" width="{2 * half:.1f}" height="16" fill="white" '
            f'fill-opacity="0.85"/><text x="{x:.1f}" y="{y + 4:.1f}" text-anchor="middle" fill="{colour}" '
            f'font-size="12">{primes}</text>'
        )
    out += labels if len(labels) <= 60 else []
    for name, spot in spots.items():
        title, middle, last = _words(graph, name)
        is_list = graph.nodes[name]["kind"] == "list"
        shown = middle if is_list else _svg_group(middle)
        half = max(52.0, 4.0 * max(len(_plain_group(middle)), len(last)) + 10)
        fill, edge = ("#fdebd0", "#b03a2e") if is_list else ("#eaf2f8", "#34495e")
        out.append(
            f'<rect x="{spot.x - half:.1f}" y="{spot.y - 29:.1f}" width="{2 * half:.1f}" height="58" rx="8" '
            f'fill="{fill}" stroke="{edge}"/>'
        )
        for line, shift, weight in ((title, -12, "bold"), (shown, 5, "normal"), (last, 21, "normal")):
            out.append(
                f'<text x="{spot.x:.1f}" y="{spot.y + shift:.1f}" text-anchor="middle" '
                f'font-weight="{weight}">{line}</text>'
            )
    return "\n".join([*out, "</svg>"]) + "\n"


def _svg_group(formula: str) -> str:
    html = as_html(formula)
    return html.replace("<sup>", '<tspan dy="-5" font-size="10">').replace(
        "</sup>", '</tspan><tspan dy="5"> </tspan>'
    )


def _plain_group(formula: str) -> str:
    return formula.replace("\\mathbb{Z}", "Z").replace("\\times", "x").replace("^{", "").replace("}", "")


def _cut(start: Spot, end: Spot, half_width: float, half_height: float) -> tuple[float, float]:
    """Where the way from one spot to another leaves the box around the first."""
    dx, dy = end.x - start.x, end.y - start.y
    share = min(half_width / abs(dx) if dx else 1.0, half_height / abs(dy) if dy else 1.0, 1.0)
    return start.x + share * dx, start.y + share * dy


def as_tex(view: LogView) -> str:
    """The drawing as a LaTeX document with a picture environment; no packages beyond amssymb."""
    graph = constraint_graph(view)
    spots = layout(graph)
    scale = 0.17

    def at(x: float, y: float) -> str:
        return f"({scale * x:.2f},{scale * (HEIGHT - y):.2f})"

    out = [
        "\\documentclass{article}", "\\usepackage{amssymb}", "\\pagestyle{empty}", "\\begin{document}",
        "\\noindent\\setlength{\\unitlength}{1mm}\\makebox[\\linewidth]{%",
        f"\\begin{{picture}}({scale * WIDTH:.0f},{scale * HEIGHT:.0f})\\scriptsize",
    ]  # fmt: skip
    labels = []
    few = graph.number_of_edges() <= 60
    for one, other, data in graph.edges(data=True):
        a, b = spots[one], spots[other]
        primes = data["primes"].replace(" ", ",")
        x, y = _label_at(graph, a, b)
        ends = [_cut(a, b, 78, 36), *([(x, y)] * 2 if few else []), _cut(b, a, 78, 36)]
        if few:
            half = 4.0 * len(primes) + 7
            ends[1], ends[2] = _cut(Spot("", x, y), a, half, 11), _cut(Spot("", x, y), b, half, 11)
            labels.append(f"\\put{at(x, y)}{{\\makebox(0,0){{${primes}$}}}}")
        out.append(f"\\linethickness{{{0.1 * _stroke(graph, one, other):.2f}mm}}")
        for (x0, y0), (x1, y1) in zip(ends[::2], ends[1::2], strict=True):
            out.append(f"\\qbezier{at(x0, y0)}{at((x0 + x1) / 2, (y0 + y1) / 2)}{at(x1, y1)}")
    out += labels
    for name, spot in spots.items():
        title, middle, last = _words(graph, name)
        line = f"${middle}$" if graph.nodes[name]["kind"] == "prime" else middle
        box = f"\\shortstack{{${title}$\\\\{line}\\\\{last}}}"
        out.append(f"\\put{at(spot.x, spot.y)}{{\\makebox(0,0){{\\fbox{{{box}}}}}}}")
    return "\n".join([*out, "\\end{picture}}", "\\end{document}"]) + "\n"


def as_graphml(view: LogView) -> str:
    """The graph as GraphML."""
    return "\n".join(nx.generate_graphml(constraint_graph(view))) + "\n"


__all__ = ["as_graphml", "as_svg", "as_tex", "constraint_graph"]
