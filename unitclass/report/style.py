"""How all figures look: journal sizes, text kept as text, colours that survive grey and colour blindness."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

MM = 1 / 25.4  # inches
ONE_COLUMN, TWO_COLUMNS = 88 * MM, 180 * MM

# Okabe and Ito's palette (jfly.uni-koeln.de/color, 2008; from memory): told apart by people of all colour vision.
INK, GREY, PALE = "#000000", "#7f7f7f", "#d9d9d9"
INSPIRATION = "#eeeeee"
NERVE, FIRING, FAMILY, MARK = "#56b4e9", "#000000", "#d55e00", "#009e73"
SERIES = ("#0072b2", "#e69f00", "#009e73", "#cc79a7", "#d55e00", "#56b4e9")
HATCHES = ("", "////", "....", "xxxx", "\\\\\\\\", "++++")

RC: Any = {
    "font.family": "sans-serif", "font.sans-serif": ["Arial", "Helvetica", "Liberation Sans", "DejaVu Sans"],
    "font.size": 7.0, "axes.labelsize": 7.0, "axes.titlesize": 8.0, "xtick.labelsize": 6.5, "ytick.labelsize": 6.5,
    "legend.fontsize": 6.5, "axes.linewidth": 0.6, "xtick.major.width": 0.6, "ytick.major.width": 0.6,
    "xtick.major.size": 2.5, "ytick.major.size": 2.5, "lines.linewidth": 0.8, "axes.spines.top": False,
    "axes.spines.right": False, "svg.fonttype": "none", "pdf.fonttype": 42, "ps.fonttype": 42,
    "svg.hashsalt": "unitclass", "legend.frameon": False, "figure.dpi": 150, "savefig.dpi": 300,
    "path.simplify": True, "axes.unicode_minus": True, "text.parse_math": False,
}


@contextmanager
def drawing() -> Iterator[None]:
    """Apply the style while a figure is made or saved; without any window system."""
    import matplotlib as mpl

    mpl.use("Agg")
    with mpl.rc_context(RC):
        yield


def new_figure(width: float, height: float) -> Figure:
    """Return an empty figure, inches."""
    from matplotlib.figure import Figure

    return Figure(figsize=(width, height), layout="constrained")


def settle(figure: Figure) -> None:
    """Lay the figure out once, for all formats, at positions rounded to a hundredth of a millimetre or so.

    The layout's solver leaves the last bits of a position to chance, and SVG names its clips by them:
    rounded, the same numbers give the same file.
    """
    engine = figure.get_layout_engine()
    if type(engine).__name__ != "ConstrainedLayoutEngine":
        return  # laid out before
    engine.execute(figure)  # type: ignore[union-attr]  # what a first drawing would do, without drawing
    figure.set_layout_engine("none")
    for axes in figure.axes:
        x, y, width, height = (round(float(v), 5) for v in axes.get_position().bounds)
        axes.set_position((x, y, width, height))


def bare(axes: Axes) -> None:
    """Take all axes away: a scale bar stands for them."""
    axes.set_xticks([])
    axes.set_yticks([])
    for spine in axes.spines.values():
        spine.set_visible(False)


def above_axes(axes: Axes, n_columns: int) -> None:
    """Place the legend above the axes, where it covers nothing."""
    axes.legend(loc="lower right", bbox_to_anchor=(1.0, 1.0), ncols=n_columns, borderaxespad=0.1, handlelength=1.6,
                columnspacing=1.0)


def scale_bar(axes: Axes, length: float, words: str, *, at: tuple[float, float], is_vertical: bool = False) -> None:
    """Draw a bar of `length` in data units from `at`, its length in words beside it."""
    x, y = at
    ends = ([x, x], [y, y + length]) if is_vertical else ([x, x + length], [y, y])
    axes.plot(*ends, color=INK, linewidth=1.2, solid_capstyle="butt", clip_on=False)
    middle, away = ((x, y + length / 2), (3, 0)) if is_vertical else ((x + length / 2, y), (0, -2))
    axes.annotate(words, middle, xytext=away, textcoords="offset points", ha="left" if is_vertical else "center",
                  va="center" if is_vertical else "top", annotation_clip=False)


def nice_length(span: float) -> float:
    """Return a round length near a fifth of the span: 1, 2 or 5 times a power of ten."""
    import math

    if not span > 0 or not math.isfinite(span):
        return 1.0
    target = span / 5
    power = 10 ** math.floor(math.log10(target))
    return float(max(factor * power for factor in (1, 2, 5) if factor * power <= target * 1.001))


PREFIXES = {-12: "p", -9: "n", -6: "\u00b5", -3: "m", 0: "", 3: "k", 6: "M"}
SYMBOLS = {"volts": "V", "volt": "V", "amperes": "A", "pascals": "Pa", "seconds": "s"}


def quantity(value: float, unit: str) -> str:
    """Return a value with its unit, an SI prefix in place of powers of ten: "50 µV"."""
    import math

    symbol = SYMBOLS.get(unit.lower(), unit)
    if symbol not in SYMBOLS.values() or not value:
        return f"{value:g} {symbol}"
    power = max(-12, min(6, 3 * math.floor(math.log10(abs(value)) / 3 + 1e-9)))
    return f"{value / 10.0**power:g} {PREFIXES[power]}{symbol}"
