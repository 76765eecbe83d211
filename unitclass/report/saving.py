"""A figure and the numbers behind it, on disk."""

from __future__ import annotations

import io
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING
from urllib.parse import quote

from unitclass.io.atomic import written_whole
from unitclass.io.table_files import Cell, write_table
from unitclass.report.style import drawing, settle

if TYPE_CHECKING:
    from matplotlib.figure import Figure

FIGURES = "figures"  # the folder beside the pages
SCREEN = 1.9  # pixels of a page for each point of a journal: its 7-point text is read at 13 pixels


@dataclass(frozen=True)
class Drawn:
    """A figure, what it shows in a sentence, and its numbers as a table."""

    figure: Figure
    caption: str
    rows: Sequence[Mapping[str, Cell]]


@dataclass(frozen=True)
class Picture:
    """A figure in a page: its SVG, its caption, and the files that hold it at full size."""

    svg: str
    caption: str
    files: tuple[str, ...] = ()


def save(drawn: Drawn, stem: Path, formats: Sequence[str], *, force: bool) -> list[Path]:
    """Write the figure in every format, and its numbers as CSV; return the files.

    Raises
    ------
    TargetError
        When a file exists (without `force`) or cannot be written.
    """
    files = []
    with drawing():
        settle(drawn.figure)
    for form in formats:
        target = stem.with_name(f"{stem.name}.{form}")
        with written_whole(str(target), force=force) as path, drawing():
            drawn.figure.savefig(path, format=form, metadata=_undated(form))
        files.append(target)
    table = stem.with_name(f"{stem.name}.csv")
    write_table(str(table), drawn.rows, force=force)
    return [*files, table]


def picture(drawn: Drawn, files: Sequence[Path]) -> Picture:
    """Return the figure for a page, with links to the files that `save` wrote."""
    saved = next((file for file in files if file.suffix == ".svg"), None)
    svg = saved.read_text("utf-8") if saved is not None else _drawn_svg(drawn)
    return Picture(_for_page(svg), drawn.caption, links(files))


def links(files: Sequence[Path]) -> tuple[str, ...]:
    """Return how a page in the folder above names the files."""
    return tuple(f"{FIGURES}/{quote(file.name)}" for file in files)


def _drawn_svg(drawn: Drawn) -> str:
    out = io.StringIO()
    with drawing():
        settle(drawn.figure)
        drawn.figure.savefig(out, format="svg", metadata=_undated("svg"))
    return out.getvalue()


def _for_page(svg: str) -> str:
    """Return the SVG element alone: no prolog, no fixed height."""
    return re.sub(r'width="([0-9.]+)pt" height="[^"]*pt"', lambda size: f'width="{SCREEN * float(size[1]):.0f}"',
                  svg[svg.index("<svg"):], count=1)


def _undated(form: str) -> dict[str, None]:
    """Return metadata without a date: the same numbers give the same bytes."""
    return {"svg": {"Date": None}, "pdf": {"CreationDate": None}}.get(form, {})
