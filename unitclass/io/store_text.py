"""Text and moments, made fit for the store."""

from __future__ import annotations

from datetime import UTC, datetime


def storable(text: str) -> str:
    """Return the text with lone surrogates written as escapes; SQLite takes UTF-8 only."""
    return text.encode("utf-8", "backslashreplace").decode("utf-8")


def now_utc() -> str:
    """Return the present moment in UTC, ISO 8601 to the millisecond."""
    return datetime.now(UTC).isoformat(timespec="milliseconds")
