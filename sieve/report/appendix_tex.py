"""The appendix as LaTeX: compiles alone with pdflatex, amsmath, longtable, booktabs."""

from __future__ import annotations

import re
from collections.abc import Sequence

from sieve.report.blocks import Block, Code, Display, Heading, Items, Paragraph, Table, Theorem, pieces

_HEAD = r"""\documentclass[11pt,a4paper]{article}
\usepackage[utf8]{inputenc}
\usepackage{amsmath,amssymb,amsthm}
\usepackage{array,longtable,booktabs}
\usepackage[margin=25mm]{geometry}
\theoremstyle{definition}
\newtheorem*{theorem}{Theorem}
\allowdisplaybreaks
\emergencystretch=3em
\setlength{\LTcapwidth}{\linewidth}
\begin{document}
"""

_SPECIAL = {
    "\\": r"\textbackslash{}", "&": r"\&", "%": r"\%", "#": r"\#", "_": r"\_", "{": r"\{", "}": r"\}",
    "~": r"\textasciitilde{}", "^": r"\textasciicircum{}", "$": r"\$", "<": r"\textless{}",
    ">": r"\textgreater{}", "|": r"\textbar{}", '"': "''", "∖": r"\textbackslash{}",
    "–": "--", "—": "---", "’": "'", "‘": "`", "“": "``", "”": "''", "…": r"\dots{}",
}  # fmt: skip


def escape(text: str) -> str:
    """Text with TeX's special characters made harmless; characters outside Latin-1 become code points."""
    out = []
    for character in text:
        if character in _SPECIAL:
            out.append(_SPECIAL[character])
        elif 0x20 <= ord(character) < 0x7F or (0xC0 <= ord(character) <= 0xFF and character not in "×÷"):
            out.append(character)
        elif character.isspace():
            out.append(" ")
        else:
            out.append(f"[U+{ord(character):04X}]")
    return "".join(out)


def inline(text: str) -> str:
    """Text with formulas."""
    return "".join(f"${part}$" if formula else escape(part) for formula, part in pieces(text))


def render(blocks: Sequence[Block]) -> str:
    """The whole document."""
    return _HEAD + "\n".join(_block(block, k == 0) for k, block in enumerate(blocks)) + "\n\\end{document}\n"


def _block(block: Block, first: bool) -> str:
    if isinstance(block, Heading):
        level = "section" if first else "subsection"
        return f"\\{level}*{{{inline(block.text)}}}"
    if isinstance(block, Paragraph):
        return f"\\noindent {_wrap(inline(block.text))}\n"
    if isinstance(block, Display):
        if len(block.formula) < 110:
            return f"\\[\n{block.formula}\n\\]"
        # a long equation may break at every sign
        broken = re.sub(r" ([+-]) ", r" \\allowbreak \1 ", block.formula)
        return f"\\begin{{center}}\n${broken}$\n\\end{{center}}"
    if isinstance(block, Theorem):
        return _theorem(block)
    if isinstance(block, Items):
        return _items(block.items)
    if isinstance(block, Code):
        return (
            "\\begin{quote}\\ttfamily " + r"\\ ".join(escape(line) for line in block.lines) + "\\end{quote}"
        )
    return _table(block)


def _items(items: Sequence[str]) -> str:
    return "\\begin{itemize}\n" + "".join(f"\\item {_wrap(inline(i))}\n" for i in items) + "\\end{itemize}"


def _theorem(block: Theorem) -> str:
    premises = "Assume that\n" + _items(block.premises) + "\nThen " if block.premises else ""
    text = inline(block.text)
    return f"\\begin{{theorem}}\n{premises}{_wrap(text)}\n\\end{{theorem}}"


def _table(block: Table) -> str:
    widths = block.widths or (0.0,) * len(block.align)
    columns = "".join(
        f">{{\\raggedright\\arraybackslash}}p{{{width}\\linewidth}}" if letter == "p" else letter
        for letter, width in zip(block.align, widths, strict=True)
    )
    header = " & ".join(map(inline, block.header)) + r" \\"
    lines = [
        "{\\small",
        f"\\begin{{longtable}}{{{columns}}}",
        "\\toprule", header, "\\midrule", "\\endfirsthead",
        "\\toprule", header, "\\midrule", "\\endhead",
        f"\\midrule \\multicolumn{{{len(block.align)}}}{{r}}{{\\emph{{continued}}}} \\\\", "\\endfoot",
        "\\bottomrule", "\\endlastfoot",
    ]  # fmt: skip
    gap = r" \\[2pt]" if any(letter == "p" for letter in block.align) else r" \\"
    lines += [" & ".join(_breakable(inline(cell)) for cell in row) + gap for row in block.rows]
    return "\n".join([*lines, "\\end{longtable}", "}"])


def _breakable(text: str) -> str:
    """Long formulas in cells may break after commas."""
    return text.replace("), (", "),\\allowbreak{} (")


def _wrap(text: str, width: int = 100) -> str:
    """Source lines of a bounded length, broken at spaces."""
    lines, current = [], ""
    for word in text.split(" "):
        if current and len(current) + 1 + len(word) > width:
            lines.append(current)
            current = word
        else:
            current = f"{current} {word}" if current else word
    return "\n".join([*lines, current])
