"""What every test stands on: a home of its own, so that no test sees results or decisions of another run."""

from __future__ import annotations

import os
from collections.abc import Iterator
from pathlib import Path

import pytest

from unitclass.__main__ import ONE_THREAD

# As the program does, before numpy is loaded: this process and its workers then add up in the same order.
for _name in ONE_THREAD:
    os.environ.setdefault(_name, "1")


@pytest.fixture(scope="session", autouse=True)
def own_home(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Path]:
    """Keep caches, data and settings of the tests in a folder of this run."""
    home = tmp_path_factory.mktemp("home")
    with pytest.MonkeyPatch.context() as patch:
        for name in ("XDG_CACHE_HOME", "XDG_DATA_HOME", "XDG_CONFIG_HOME", "XDG_STATE_HOME"):
            patch.setenv(name, str(home / name.lower()))
        yield home
