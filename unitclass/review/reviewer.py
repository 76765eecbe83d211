"""Who reviews."""

from __future__ import annotations

import getpass

from unitclass.errors import UsageError


def reviewer_name(given: str = "", in_settings: str = "") -> str:
    """Return the name given, else that in the settings, else the login name.

    Raises
    ------
    UsageError
        If there is none, or it holds control characters.
    """
    name = given.strip() or in_settings.strip() or _login_name()
    if not name or not name.isprintable():
        raise UsageError(f"{name!r} cannot be a reviewer's name", remedy="give one with --reviewer")
    return name


def _login_name() -> str:
    try:
        return getpass.getuser().strip()
    except (OSError, KeyError, ImportError):
        return ""
