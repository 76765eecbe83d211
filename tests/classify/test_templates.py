from __future__ import annotations

import pytest

from tests.classify.families import exact, in_and_ex
from unitclass.classify.templates import TypeLibrary, family_from_mapping
from unitclass.errors import UsageError
from unitclass.io.template_files import read_family, read_library

DOMAIN_TYPES = {"pre-I", "early-I", "ramp-I", "late-I", "con-I", "I-E", "post-I", "aug-E", "con-E", "late-E",
                "dec-E", "bi-E", "tonic", "NRM"}  # the trade's table of firing types, in the reference pages


def test_the_standard_set_holds_every_type_of_the_trade():
    assert {family.id for family in read_library().families} == DOMAIN_TYPES


def test_every_standard_family_has_plain_words_and_a_source_for_each_regime():
    for family in read_library().families:
        assert family.words
        assert family.sources
        assert set(family.prior) == {"three-phase", "two-phase", "one-phase"}


def test_a_family_file_replaces_its_namesake_and_keeps_the_order(tmp_path):
    path = tmp_path / "mine.toml"
    path.write_text('id = "ramp-I"\nform = "augmenting"\n[ranges]\n'
                    'onset = [0.3, 0.5]\npeak = [0.9, 1.0]\noffset = [0.98, 1.0]\n')
    library = read_library(str(path))
    assert [f.id for f in library.families] == [f.id for f in read_library().families]
    assert library.family("ramp-I").range("onset") == (0.3, 0.5)
    assert library.digest() != read_library().digest()


def test_an_unknown_set_is_refused_with_the_names_of_those_there_are():
    with pytest.raises(UsageError, match="standard"):
        read_library("no such set")


@pytest.mark.parametrize(("text", "words"), [
    ('form = "flat"', "no id"),
    ('id = "x"\nform = "wave"', "form 'wave' is unknown"),
    ('id = "x"\nform = "augmenting"', "needs a range 'onset'"),
    ('id = "x"\nform = "flat"\n[ranges]\ndepht = [0, 1]', "range 'depht'"),
    ('id = "x"\nform = "flat"\n[ranges]\ndepth = [1, 0]', r"not \[low, high\]"),
    ('id = "x"\nform = "flat"\n[prior]\nfour-phase = 1', "regime 'four-phase'"),
    ('id = "x"\nform = "drawn"\npoints = [[0, 1]]', "three or more points"),
    ('id = "x"\nform = "flat"\nwords = [', "not valid TOML"),
])
def test_a_wrong_family_file_is_refused_in_one_line_that_names_file_and_key(tmp_path, text, words):
    path = tmp_path / "wrong.toml"
    path.write_text(text)
    with pytest.raises(UsageError, match=words) as error:
        read_family(path)
    assert "wrong.toml" in str(error.value)
    assert "\n" not in str(error.value)


def test_two_families_of_one_id_are_refused():
    with pytest.raises(UsageError, match="twice"):
        TypeLibrary("both", (exact("a", [(0, 1), (1, 1), (1.9, 1)]), exact("a", [(0, 1), (1, 1), (1.9, 1)])))


def test_the_digest_follows_ranges_but_not_words():
    library = in_and_ex()
    given = {"id": "in", "form": "flat", "words": "one"}
    one = library.with_family(family_from_mapping(given, where=""))
    other = library.with_family(family_from_mapping({**given, "words": "two"}, where=""))
    moved = library.with_family(family_from_mapping({**given, "ranges": {"depth": [0, 0.5]}}, where=""))
    assert one.digest() == other.digest() != moved.digest()
