"""Families written as files come back the same."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

from unitclass.errors import TargetError
from unitclass.io.template_files import read_family, read_library, write_family

STANDARD = read_library().families


@pytest.mark.parametrize("family", STANDARD, ids=[family.id for family in STANDARD])
def test_every_standard_family_survives_being_written_and_read(family, tmp_path):
    write_family(family, str(tmp_path / "family.toml"))
    assert read_family(tmp_path / "family.toml") == family


def test_words_with_quotes_backslashes_and_other_alphabets_survive(tmp_path):
    family = replace(STANDARD[0], words='rises "fast" \\ then µ falls', also=("naïve", "Ü-1"))
    write_family(family, str(tmp_path / "family.toml"))
    assert read_family(tmp_path / "family.toml") == family


def test_a_drawn_curve_survives_and_a_file_that_exists_is_kept(tmp_path):
    drawn = replace(STANDARD[0], form="drawn", ranges={"shift": (-0.1, 0.1)}, points=((0.1, 0.2), (0.5, 1.0), (1.5, 0.0)))
    target = Path(tmp_path / "family.toml")
    write_family(drawn, str(target))
    assert read_family(target) == drawn
    with pytest.raises(TargetError):
        write_family(drawn, str(target))
