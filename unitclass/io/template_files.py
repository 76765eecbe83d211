"""Read and write template family files (TOML)."""

from __future__ import annotations

import json
import tomllib
from pathlib import Path

from unitclass.classify.templates import Family, TypeLibrary, family_from_mapping
from unitclass.errors import UsageError
from unitclass.io.atomic import written_whole
from unitclass.io.resolver import templates_folder

STANDARD = "standard"


def read_library(named: str = "") -> TypeLibrary:
    """Return the template families to use.

    Parameters
    ----------
    named : str
        Empty for the standard set; the name of a set in `templates/`; a folder of family files,
        which replaces the standard set; or one family file, which is added to it (or takes the
        place of the type of the same id).

    Raises
    ------
    UsageError
        When nothing is found, or a file is not a valid family.
    """
    if not named:
        return _read_folder(templates_folder() / STANDARD)
    path = Path(named)
    if path.is_dir():
        return _read_folder(path)
    if path.is_file():
        return _read_folder(templates_folder() / STANDARD).with_family(read_family(path))
    if (templates_folder() / named).is_dir():
        return _read_folder(templates_folder() / named)
    sets = ", ".join(sorted(p.name for p in templates_folder().iterdir() if p.is_dir()))
    raise UsageError(f"no template file, folder or set called {named!r}", remedy=f"the sets are: {sets}")


def read_family(path: Path) -> Family:
    """Return the family in one file.

    Raises
    ------
    UsageError
        When the file is not TOML or not a family; the message names the file and the line or key.
    """
    try:
        given = tomllib.loads(path.read_text(encoding="utf-8"))
    except (OSError, UnicodeDecodeError) as error:
        raise UsageError("cannot be read", where=str(path), remedy=str(error)) from error
    except tomllib.TOMLDecodeError as error:
        raise UsageError(f"is not valid TOML: {error}", where=str(path), remedy="mend that line") from error
    return family_from_mapping(given, where=str(path))


def _read_folder(folder: Path) -> TypeLibrary:
    files = sorted(folder.glob("*.toml"))
    if not files:
        raise UsageError("holds no family files (*.toml)", where=str(folder),
                         remedy="see `unitclass types show` for what one looks like")
    return TypeLibrary(folder.name, tuple(read_family(path) for path in files))


def write_family(family: Family, target: str, *, force: bool = False) -> None:
    """Write one family as a file that a person can read and edit.

    Raises
    ------
    TargetError
        When it exists (without `force`) or cannot be written.
    """
    with written_whole(target, force=force) as path:
        path.write_text(family_text(family), encoding="utf-8")


def family_text(family: Family) -> str:
    """Return a family as TOML."""
    lines = [f"id = {_quoted(family.id)}", f"also = [{', '.join(map(_quoted, family.also))}]",
             f"words = {_quoted(family.words)}", f"form = {_quoted(family.form)}",
             f"sources = [{', '.join(map(_quoted, family.sources))}]"]
    if family.points:
        lines += ["points = [  # canonical phase (0-1 inspiration, 1-2 expiration), level as a share of the peak",
                  *(f"  [{phase:g}, {level:g}]," for phase, level in family.points), "]"]
    for title, table in (("prior", family.prior), ("membrane", family.membrane), ("ranges", family.ranges)):
        if table:
            lines += ["", f"[{title}]", *(f"{_key(name)} = {_value(value)}" for name, value in table.items())]
    return "\n".join(lines) + "\n"


def _quoted(text: str) -> str:
    return json.dumps(text, ensure_ascii=False)


def _key(name: str) -> str:
    return name if name.replace("-", "").replace("_", "").isalnum() and name.isascii() else _quoted(name)


def _value(value: float | tuple[float, float]) -> str:
    return f"[{value[0]:g}, {value[1]:g}]" if isinstance(value, tuple) else f"{value:g}"
