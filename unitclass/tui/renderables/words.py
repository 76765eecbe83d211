"""Text laid out in cells: wrapping and shortening by columns, and phases in words."""

from __future__ import annotations

from unitclass.tui.renderables.glyphs import Look
from unitclass.tui.renderables.sheet import printable, width_of


def shortened(text: str, width: int, look: Look) -> str:
    """Return printable text in at most `width` columns, its end replaced by an ellipsis."""
    text = printable(text, ascii_only=look.glyphs.is_ascii)
    if width_of(text) <= width:
        return text
    while text and width_of(text) > width - 1:
        text = text[:-1]
    return text + look.glyphs.ellipsis if width > 0 else ""


def shortened_middle(text: str, width: int, look: Look) -> str:
    """Return printable text in at most `width` columns, its middle left out: for paths."""
    text = printable(text, ascii_only=look.glyphs.is_ascii)
    if width_of(text) <= width:
        return text
    keep = max(0, width - 1)
    tail = text[-(keep * 2 // 3):] if keep >= 2 else ""
    head = shortened_cells(text, keep - width_of(tail))
    return head + look.glyphs.ellipsis + tail if width > 0 else ""


def shortened_cells(text: str, width: int) -> str:
    """Return the longest beginning of `text` that fits `width` columns."""
    while text and width_of(text) > width:
        text = text[:-1]
    return text


def wrapped(text: str, width: int, look: Look, *, indent: str = "") -> list[str]:
    """Return printable text as lines of at most `width` columns; all but the first are indented."""
    words: list[str] = []
    for word in printable(text, ascii_only=look.glyphs.is_ascii).split():
        words += _pieces(word, max(1, width - len(indent)))
    lines: list[str] = []
    line = ""
    for word in words:
        joined = f"{line} {word}" if line.strip() else line + word
        if line.strip() and width_of(joined) > width:
            lines.append(line)
            joined = indent + word
        line = joined
    return [*lines, line] if line.strip() else lines


def _pieces(word: str, width: int) -> list[str]:
    pieces = []
    while width_of(word) > width:
        head = shortened_cells(word, width) or word[0]
        pieces.append(head)
        word = word[len(head):]
    return [*pieces, word] if word else pieces
