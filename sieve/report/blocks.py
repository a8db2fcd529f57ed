"""A small document: headings, paragraphs, a theorem, tables; text is plain with formulas between dollar
signs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass


@dataclass(frozen=True)
class Heading:
    """A section title."""

    text: str


@dataclass(frozen=True)
class Paragraph:
    """Running text."""

    text: str


@dataclass(frozen=True)
class Display:
    """A formula on its own line, without dollar signs."""

    formula: str


@dataclass(frozen=True)
class Theorem:
    """The statement, with the premises it assumes as a list."""

    premises: tuple[str, ...]
    text: str


@dataclass(frozen=True)
class Items:
    """A list."""

    items: tuple[str, ...]


@dataclass(frozen=True)
class Code:
    """Lines to be typed."""

    lines: tuple[str, ...]


@dataclass(frozen=True)
class Table:
    """A table: `align` has a letter for each column, l, c, r, or p for running text, whose `widths` are
    fractions of the line."""

    caption: str
    header: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    align: str
    widths: tuple[float, ...] = ()


Block = Heading | Paragraph | Display | Theorem | Items | Code | Table


def pieces(text: str) -> Sequence[tuple[bool, str]]:
    """(is a formula, text) for text with formulas between dollar signs; \\$ stands for the sign itself.

    >>> pieces("a $x^{2}$ b")
    [(False, 'a '), (True, 'x^{2}'), (False, ' b')]
    """
    out: list[tuple[bool, str]] = []
    formula = False
    for part in text.replace("\\$", "\x00").split("$"):
        if part:
            out.append((formula, part.replace("\x00", "$")))
        formula = not formula
    return out


def plain(text: str) -> str:
    """Foreign text (sources, names) made safe to stand between formulas."""
    return text.replace("\\", "∖").replace("$", "\\$")
