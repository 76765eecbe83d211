"""Strings of a file are data: nothing in them may steer a terminal or break a table."""

from __future__ import annotations

import re
import unicodedata

# ECMA-48 (5th edition): 5.4 control sequences; 8.3.27, .56, .89, .106, .143, .128 control strings,
# which end at ST (ESC \) or, as terminals accept for OSC, at BEL; then any other escape sequence.
_SEQUENCES = re.compile(
    r"(?:\x1b\[|\x9b)[0-?]*[ -/]*[@-~]"
    r"|(?:\x1b[PX^_\]]|[\x90\x98\x9d-\x9f])[^\x07\x1b\x9c]*(?:\x07|\x1b\\|\x9c)"
    r"|\x1b[ -/]*[0-~]"
)
_JOINERS = "\u200c\u200d"  # zero-width, but some scripts cannot be spelled without them
_REPLACEMENT = "\N{REPLACEMENT CHARACTER}"


def safe_text(value: object) -> str:
    """Return `value` as one printable line.

    Escape sequences, control characters, bidirectional marks and other invisible format
    characters are removed; line breaks and tabs become spaces; bytes that are not UTF-8 and
    lone surrogates become the replacement character. Markup such as ``[red]`` is left as it is:
    show it as plain text, not as markup.

    Parameters
    ----------
    value : object
        A string or bytes of a file, or anything else, which is shown as `str` shows it.
    """
    text = value.decode("utf-8", "replace") if isinstance(value, bytes) else str(value)
    if text.isascii() and text.isprintable():
        return text.strip()
    return "".join(map(_shown, _SEQUENCES.sub("", text).replace("\r\n", "\n"))).strip()


def _shown(character: str) -> str:
    if character in "\t\n\v\f\r\x85\u2028\u2029":
        return " "
    category = unicodedata.category(character)
    if category == "Cs":
        return _REPLACEMENT
    if category in ("Cc", "Cf") and character not in _JOINERS:
        return ""
    return character
