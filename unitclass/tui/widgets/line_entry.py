"""One line of text that is being typed: state and keys, no drawing."""

from __future__ import annotations

from dataclasses import dataclass, replace


@dataclass(frozen=True)
class LineEntry:
    """Text with a cursor before character `at`."""

    text: str = ""
    at: int = 0

    @staticmethod
    def holding(text: str) -> LineEntry:
        """Return an entry with text in it and the cursor at its end."""
        return LineEntry(text, len(text))

    def typed(self, more: str) -> LineEntry:
        """Return the entry after typing or pasting; control characters are left out."""
        clean = "".join(c for c in more.replace("\n", " ") if c.isprintable())
        return LineEntry(self.text[: self.at] + clean + self.text[self.at :], self.at + len(clean))

    def pressed(self, key: str) -> LineEntry:
        """Return the entry after an editing key; other keys change nothing."""
        text, at = self.text, self.at
        if key in ("backspace", "ctrl+h"):
            return LineEntry(text[: max(0, at - 1)] + text[at:], max(0, at - 1))
        if key == "delete":
            return LineEntry(text[:at] + text[at + 1 :], at)
        if key == "ctrl+u":
            return LineEntry(text[at:], 0)
        moves = {"left": max(0, at - 1), "right": min(len(text), at + 1), "home": 0, "end": len(text)}
        return replace(self, at=moves.get(key, at))
