"""Another laboratory's words in every place where a type stands."""

from __future__ import annotations

import pytest

from tests.results import session_result
from unitclass.classify.crosswalk import in_other_words, labels_in_other_words
from unitclass.errors import UsageError
from unitclass.io.crosswalk_file import read_crosswalk
from unitclass.records import Label

WORDS = {"pre-I": "I-pre", "post-I": "E-dec-early", "I-E": "IE-span"}
KNOWN = ("pre-I", "post-I", "I-E", "ramp-I")


def test_types_probabilities_and_reasons_are_all_in_the_other_words():
    before, after = session_result(), in_other_words(session_result(), WORDS)
    for (_, old), (_, new) in zip(before.units(), after.units(), strict=True):
        assert new.suggestion.type == WORDS.get(old.suggestion.type, old.suggestion.type)
        assert not set(new.suggestion.probabilities) & set(WORDS)
        assert sum(new.suggestion.probabilities.values()) == pytest.approx(sum(old.suggestion.probabilities.values()))


def test_only_whole_ids_are_replaced_in_sentences():
    from dataclasses import replace

    result = session_result()
    condition = result.conditions[0]
    unit = condition.units[0]
    said = replace(unit, suggestion=replace(unit.suggestion, reasons=("I-E over post-I by odds of 3 to 1, not post-I-E",)))
    changed = in_other_words(replace(result, conditions=(replace(condition, units=(said,)),)), WORDS)
    assert next(u for _, u in changed.units()).suggestion.reasons == (
        "IE-span over E-dec-early by odds of 3 to 1, not post-I-E",)


def test_two_types_under_one_word_add_up():
    result = in_other_words(session_result(), {"pre-I": "I", "ramp-I": "I"})
    for _, unit in result.units():
        if unit.suggestion.probabilities:
            assert sum(unit.suggestion.probabilities.values()) == pytest.approx(1.0, abs=0.02)


def test_labels_change_their_word_and_nothing_else():
    label = Label(type="pre-I", reviewer="anna", decided_at="2026", how="viewed")
    changed = labels_in_other_words({("1", "x"): label}, WORDS)["1", "x"]
    assert (changed.type, changed.reviewer, changed.how) == ("I-pre", "anna", "viewed")


def test_a_crosswalk_file_is_read_and_a_wrong_one_refused_by_line(tmp_path):
    good, unknown, columns = (tmp_path / name for name in ("good.csv", "unknown.csv", "columns.csv"))
    good.write_text("type,word\npre-I,I-pre\npost-I,\"E, early\"\n", encoding="utf-8-sig")
    unknown.write_text("type,word\npree-I,x\n")
    columns.write_text("a,b\n1,2\n")
    assert read_crosswalk(str(good), KNOWN) == {"pre-I": "I-pre", "post-I": "E, early"}
    with pytest.raises(UsageError, match="pree-I"):
        read_crosswalk(str(unknown), KNOWN)
    with pytest.raises(UsageError, match="type,word"):
        read_crosswalk(str(columns), KNOWN)
    with pytest.raises(UsageError, match="cannot be read"):
        read_crosswalk(str(tmp_path / "none.csv"), KNOWN)
