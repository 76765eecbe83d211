"""Where `templates/` and `sample_nwb/` are, whatever way the program was installed.

An editable install may leave a stale copy beside the other packages, so a checkout, if there
is one, always wins.
"""

from __future__ import annotations

import tomllib
from importlib import resources
from pathlib import Path

import unitclass
from unitclass.errors import FileError


def templates_folder() -> Path:
    """Return the folder of template families; raises FileError when the installation lacks it."""
    return _data_folder("templates")


def samples_folder() -> Path:
    """Return the folder of sample sessions; raises FileError when the installation lacks it."""
    return _data_folder("sample_nwb")


def checkout_folder() -> Path | None:
    """Return the root of the checkout this program runs from, or None for an installed copy."""
    root = Path(unitclass.__file__).resolve().parent.parent
    return root if _is_this_project(root / "pyproject.toml") else None


def _is_this_project(pyproject: Path) -> bool:
    try:
        found = tomllib.loads(pyproject.read_text("utf-8"))
    except (OSError, ValueError):
        return False
    return bool(found.get("project", {}).get("name") == "unitclass")


def _data_folder(name: str) -> Path:
    root = checkout_folder()
    folder = root / name if root else Path(str(resources.files("unitclass") / "_data" / name))
    if not folder.is_dir():
        raise FileError(f"this installation has no folder {name}", where=str(folder),
                        remedy="install the program again")
    return folder
