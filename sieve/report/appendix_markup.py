"""The appendix as Markdown (formulas between dollar signs) and as one self-contained HTML page."""

from __future__ import annotations

from collections.abc import Sequence
from html import escape

from sieve.report.blocks import Block, Code, Display, Heading, Items, Paragraph, Table, Theorem, pieces
from sieve.report.mathematics import as_html

# ---- Markdown ------------------------------------------------------------------------------------------


def render_markdown(blocks: Sequence[Block]) -> str:
    """The document in Markdown."""
    return "\n\n".join(_markdown(block, k == 0) for k, block in enumerate(blocks)) + "\n"


def _md(text: str) -> str:
    out = []
    for formula, part in pieces(text):
        if formula:
            out.append("$" + part.replace("|", "\\vert ") + "$")
        else:
            for character in "\\`*_[]<>|#$":
                part = part.replace(character, "\\" + character)
            out.append(part)
    return "".join(out)


def _markdown(block: Block, first: bool) -> str:
    if isinstance(block, Heading):
        return ("# " if first else "## ") + _md(block.text)
    if isinstance(block, Paragraph):
        return _md(block.text)
    if isinstance(block, Display):
        return f"$$\n{block.formula}\n$$"
    if isinstance(block, Theorem):
        head = "**Theorem.** Assume that\n\n" if block.premises else "**Theorem.** "
        items = "".join(f"- {_md(item)}\n" for item in block.premises)
        return head + items + ("\nThen " if block.premises else "") + _md(block.text)
    if isinstance(block, Items):
        return "\n".join(f"- {_md(item)}" for item in block.items)
    if isinstance(block, Code):
        return "```\n" + "\n".join(block.lines) + "\n```"
    marks = {"r": "---:", "l": ":---", "p": ":---", "c": ":---:"}
    rows = [
        "| " + " | ".join(map(_md, block.header)) + " |",
        "| " + " | ".join(marks[letter] for letter in block.align) + " |",
    ]
    return "\n".join(rows + ["| " + " | ".join(map(_md, row)) + " |" for row in block.rows])


# ---- HTML ----------------------------------------------------------------------------------------------

_STYLE = """body { font: 16px/1.5 Georgia, serif; max-width: 46rem; margin: 2rem auto; padding: 0 1rem;
color: #111; } h1 { font-size: 1.5rem; } h2 { font-size: 1.2rem; margin-top: 2rem; }
.display { text-align: center; margin: 1rem 0; }
.theorem { border-left: 3px solid #888; padding: 0.2rem 1rem; background: #f7f7f7; }
table { border-collapse: collapse; font-size: 0.9rem; width: 100%; border-top: 2px solid #111;
  border-bottom: 2px solid #111; }
th { border-bottom: 1px solid #111; text-align: left; } td, th { padding: 0.2rem 0.6rem; vertical-align:
top; } td.r, th.r { text-align: right; } sup, sub { line-height: 0; font-size: 75%; }
pre { background: #f7f7f7; padding: 0.5rem; overflow-x: auto; }"""


def render_html(blocks: Sequence[Block]) -> str:
    """The document as one HTML page without scripts or other files."""
    title = next((b.text for b in blocks if isinstance(b, Heading)), "Appendix")
    body = "\n".join(_html(block, k == 0) for k, block in enumerate(blocks))
    head = f'<meta charset="utf-8">\n<title>{escape(title)}</title>\n<style>\n{_STYLE}\n</style>'
    return f'<!DOCTYPE html>\n<html lang="en">\n<head>\n{head}\n</head>\n<body>\n{body}\n</body>\n</html>\n'


def _hx(text: str) -> str:
    return "".join(as_html(part) if formula else escape(part) for formula, part in pieces(text))


def _html(block: Block, first: bool) -> str:
    if isinstance(block, Heading):
        tag = "h1" if first else "h2"
        return f"<{tag}>{_hx(block.text)}</{tag}>"
    if isinstance(block, Paragraph):
        return f"<p>{_hx(block.text)}</p>"
    if isinstance(block, Display):
        return f'<p class="display">{as_html(block.formula)}</p>'
    if isinstance(block, Theorem):
        items = "".join(f"<li>{_hx(item)}</li>" for item in block.premises)
        head = f"Assume that</p><ul>{items}</ul><p>Then " if block.premises else ""
        return f'<div class="theorem"><p><b>Theorem.</b> {head}{_hx(block.text)}</p></div>'
    if isinstance(block, Items):
        return "<ul>" + "".join(f"<li>{_hx(item)}</li>" for item in block.items) + "</ul>"
    if isinstance(block, Code):
        return "<pre>" + escape("\n".join(block.lines)) + "</pre>"
    return _html_table(block)


def _html_table(block: Table) -> str:
    def row(cells: Sequence[str], tag: str) -> str:
        marked = [
            f"<{tag}{' class=r' if letter == 'r' else ''}>{_hx(cell)}</{tag}>"
            for letter, cell in zip(block.align, cells, strict=True)
        ]
        return "<tr>" + "".join(marked) + "</tr>"

    head = f"<thead>{row(block.header, 'th')}</thead>"
    return f"<table>{head}\n<tbody>\n" + "\n".join(row(r, "td") for r in block.rows) + "\n</tbody></table>"
