"""The characters pictures are drawn with: block elements and braille, or plain ASCII."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Glyphs:
    """One set of characters. Each name says what the character means in a picture.

    Attributes
    ----------
    levels : str
        From empty to full cell, in equal steps; bars end in one of them.
    sure, doubtful : str
        Part of a bar below the lower confidence limit, and from there to the estimate.
    whisker, beyond : str
        Confidence limit above the bar; the same where it leaves the picture.
    fit : str
        The family's curve in the lower, middle and upper third of a cell.
    shade : str
        Marks inspiration in an empty cell when colour cannot; sparse.
    heat : str
        From nothing to the row's own maximum.
    """

    name: str
    levels: str
    sure: str
    doubtful: str
    whisker: str
    beyond: str
    fit: str
    shade: str
    heat: str
    band: str
    rule: str
    upright: str
    tick: str
    junction: str
    turn: str
    threshold: str
    burst: str
    left_out: str
    here: str
    done: str
    dash: str
    ellipsis: str
    less: str
    has_braille: bool

    @property
    def is_ascii(self) -> bool:
        """Return whether only ASCII may be written."""
        return self.levels.isascii()


BLOCKS = Glyphs(
    name="blocks", levels=" ▁▂▃▄▅▆▇█", sure="█", doubtful="▓", whisker="│", beyond="↑", fit="_━▔",
    shade="·", heat=" ░▒▓█", band="░", rule="─", upright="│", tick="┬", junction="┤", turn="┊", threshold="┄",
    burst="▀", left_out="×", here="▶", done="✓", dash="–", ellipsis="…", less="≤", has_braille=True)

ASCII = Glyphs(
    name="ascii", levels="  ::##", sure="#", doubtful="%", whisker="|", beyond="^", fit="_=~",
    shade=".", heat=" .:*#", band=":", rule="-", upright="|", tick="+", junction="+", turn=":", threshold="-",
    burst="=", left_out="x", here=">", done="v", dash="-", ellipsis="~", less="<=", has_braille=False)


@dataclass(frozen=True)
class Look:
    """How pictures may be drawn: with which characters, and whether colour can shade."""

    glyphs: Glyphs = BLOCKS
    has_colour: bool = True

    @property
    def shade(self) -> str:
        """Return the character that marks inspiration, empty when colour does it."""
        return "" if self.has_colour else self.glyphs.shade


PLAIN = Look(ASCII, has_colour=False)
MONO = Look(BLOCKS, has_colour=False)
COLOUR = Look(BLOCKS, has_colour=True)
