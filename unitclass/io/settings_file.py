"""The settings file: one given by hand, else the user's own, else the defaults."""

from __future__ import annotations

import tomllib
from pathlib import Path

from unitclass.errors import UsageError
from unitclass.records import ROLES
from unitclass.settings import Settings


def settings_path() -> Path:
    """Return where the user's own settings file is looked for, whether or not it exists."""
    import platformdirs

    return platformdirs.user_config_path("unitclass", appauthor=False) / "settings.toml"


def find_settings(explicit: str = "") -> Settings:
    """Return the settings in force.

    Parameters
    ----------
    explicit : str
        Path of a settings file; empty means the user's own file if there is one.

    Raises
    ------
    UsageError
        If the file cannot be read or holds something that is not a setting.
    """
    if explicit:
        return read_settings(explicit)
    path = settings_path()
    return read_settings(str(path)) if path.is_file() else Settings()


def read_settings(path: str) -> Settings:
    """Return the defaults with the TOML file at `path` laid over them.

    Raises
    ------
    UsageError
        If the file is missing, unreadable, not UTF-8, not TOML, or holds an unknown name or a
        value out of range.
    """
    try:
        text = Path(path).read_text("utf-8-sig")
    except FileNotFoundError:
        raise UsageError("no such settings file", where=path, remedy="check the path") from None
    except UnicodeDecodeError:
        raise UsageError("the settings file is not UTF-8 text", where=path,
                         remedy="save it as UTF-8") from None
    except (OSError, ValueError) as problem:
        reason = getattr(problem, "strerror", None) or str(problem)
        raise UsageError(f"cannot read the settings file: {reason}", where=path,
                         remedy="name a readable TOML file") from None
    try:
        given = tomllib.loads(text)
    except tomllib.TOMLDecodeError as problem:
        raise UsageError(f"the settings file is not valid TOML: {problem}", where=path,
                         remedy="correct that line") from None
    return _checked_rig(Settings.from_mapping(given, where=path), path)


def _checked_rig(settings: Settings, path: str) -> Settings:
    """Return the settings; a role or a form that the program does not know is refused by name."""
    for table, known in (("roles", ROLES), ("forms", ("raw", "integrated"))):
        for name, value in getattr(settings.rig, table).items():
            if value not in known:
                raise UsageError(f"rig.{table}: {name} = {value!r} is unknown", where=path,
                                 remedy="use one of " + ", ".join(known))
    return settings
