import csv
import io
import json
import math

import numpy as np
import pytest

from tests.results import condition_result, labels_for, session_result, suggestion, unit_result, vm_result
from unitclass.errors import TargetError, UsageError
from unitclass.io.table_files import table_text
from unitclass.io.tables import classify_rows, cycle_rows, write_table
from unitclass.records import Label

# Written out here, not imported: this is the contract with users' scripts.
CLASSIFY = ("file, session, animal, unit, condition, nerve, regime, regime_probability, n_cycles, n_spikes, "
            "suggested_type, probability, second_type, second_probability, type, reviewer, reviewed_at, "
            "shape_group, eta_squared, eta_squared_p, rayleigh_p, q_value, mean_phase, onset_phase, peak_phase, "
            "offset_phase, rate_i_hz, rate_e_hz, lead_ms, participation, flags, reasons")
OURS = "rule_of_thumb, condition_before, type_before, version, settings_digest, template_digest"
CYCLES = ("file, condition, nerve, kind, onset_s, offset_s, end_s, ti_s, te_s, ttot_s, duty, peak, area, "
          "post_i_end_s, late_e, accepted, reason")


def read_csv(text):
    return list(csv.DictReader(io.StringIO(text)))


def test_classify_columns_are_the_contract_then_the_carried_ones():
    rows = classify_rows(session_result(), {})
    assert ", ".join(rows[0]) == f"{CLASSIFY}, {OURS}, region"
    assert rows[0]["region"] == "rostral column"


def test_there_is_one_row_per_unit_and_condition_always():
    result = session_result()
    keys = [(row["unit"], row["condition"]) for row in classify_rows(result, {})]
    assert keys == [(unit, name) for name in ("baseline", "pons removed") for unit in ("3", "7", "12", "20", "31")]


def test_a_row_says_what_the_suggestion_says():
    row = classify_rows(session_result("rig/a.nwb"), {})[0]
    assert (row["file"], row["session"], row["animal"], row["nerve"]) == ("rig/a.nwb", "heron_04", "heron 04", "PNA")
    assert (row["suggested_type"], row["probability"]) == ("early-I", 0.93)
    assert row["second_type"] != "early-I"
    assert row["second_probability"] == pytest.approx(0.07 / 8)
    assert (row["regime"], row["regime_probability"]) == ("three-phase", 0.9)
    assert row["reasons"] == "begins at phase 0.00; peaks at phase 0.05"


def test_states_have_no_probability_and_nothing_is_nan():
    rows = classify_rows(session_result(), {})
    states = [row for row in rows if row["suggested_type"] in ("silent", "undetermined")]
    assert len(states) == 4
    for row in states:
        assert row["probability"] is None
        assert row["second_type"] == ""
        assert row["q_value"] is None
    assert "nan" not in {cell.lower() for row in read_csv(table_text(rows)) for cell in row.values()}


def test_type_is_what_a_person_decided_and_empty_in_disagreement():
    result = session_result(conditions=("baseline",))
    rows = {row["unit"]: row for row in classify_rows(result, labels_for(result))}
    assert (rows["3"]["type"], rows["3"]["reviewer"]) == ("early-I", "Ada Fischer")
    assert rows["3"]["reviewed_at"] == "2031-03-04T10:20:30+00:00"
    assert (rows["12"]["type"], rows["12"]["flags"]) == ("", "disagreement")
    assert (rows["20"]["type"], rows["20"]["reviewer"]) == ("", "")


def test_a_carried_column_with_a_name_of_the_table_does_not_hide_it():
    units = (unit_result(columns={"type": "putative", "depth": "1200"}), unit_result("7", columns={}))
    condition = condition_result()
    result = session_result(conditions=())
    result = result.__class__(**{**vars(result), "conditions": (
        condition.__class__(**{**vars(condition), "units": units}),)})
    first, second = classify_rows(result, {})
    assert (first["type"], first["type (file)"], first["depth"]) == ("", "putative", "1200")
    assert (second["type (file)"], second["depth"]) == ("", "")


def test_text_of_a_file_cannot_steer_a_terminal_or_break_a_row():
    unit = unit_result("\x1b[2J7\nx", columns={"reg\x07ion": "a\x1b]0;t\x07b"}, flags=("one\r\ntwo",))
    condition = condition_result("base\u202eline")
    result = session_result(conditions=())
    result = result.__class__(**{**vars(result), "animal": "ra\x00t", "conditions": (
        condition.__class__(**{**vars(condition), "units": (unit,)}),)})
    row = classify_rows(result, {})[0]
    assert (row["unit"], row["region"], row["flags"], row["animal"]) == ("7 x", "ab", "one two", "rat")


def test_cycle_columns_are_the_contract_then_a_pair_per_other_nerve():
    rows = cycle_rows(session_result())
    assert ", ".join(rows[0]) == f"{CYCLES}, peak_cVN, area_cVN"
    assert len(rows) == 2 * 39


def test_cycles_left_out_are_there_with_their_reason_and_unknown_marks_are_empty():
    rows = cycle_rows(session_result())
    sigh, edge = rows[5], rows[38]
    assert (sigh["kind"], sigh["accepted"], sigh["reason"]) == ("sigh", False, "burst 2.1 x the local median")
    assert (edge["kind"], edge["offset_s"], edge["ti_s"], edge["duty"]) == ("edge", None, None, None)
    assert (rows[0]["onset_s"], rows[0]["ti_s"], rows[0]["te_s"], rows[0]["ttot_s"]) == (0.5, 1.0, 2.0, 3.0)
    assert rows[0]["duty"] == pytest.approx(1 / 3, abs=1e-6)
    assert rows[0]["late_e"] is None


def test_times_keep_the_microsecond_late_in_a_long_session():
    result = session_result(conditions=())
    condition = condition_result(start_s=14_400.123456)
    result = result.__class__(**{**vars(result), "conditions": (condition,)})
    assert cycle_rows(result)[0]["onset_s"] == 14_400.623456


def test_csv_and_json_hold_the_same_rows(tmp_path):
    rows = classify_rows(session_result(), {})
    write_table(str(tmp_path / "t.csv"), rows)
    write_table(str(tmp_path / "t.json"), rows)
    from_csv = read_csv((tmp_path / "t.csv").read_text("utf-8"))
    from_json = json.loads((tmp_path / "t.json").read_text("utf-8"))
    assert from_json == rows
    assert [list(row) for row in from_csv] == [list(row) for row in rows]
    for found, row in zip(from_csv, rows, strict=True):
        for name, value in row.items():
            if value is None or isinstance(value, str):
                assert found[name] == (value or "")
            else:
                assert float(found[name]) == value


@pytest.mark.parametrize("cell", ['a "quoted" word', "comma, here", "préBötzinger 呼吸", "", " lead"])
def test_any_text_comes_back_from_csv(cell, tmp_path):
    write_table(str(tmp_path / "t.csv"), [{"a": cell, "b": 1}])
    with open(tmp_path / "t.csv", encoding="utf-8", newline="") as file:
        assert next(csv.DictReader(file))["a"] == cell


def test_truth_is_written_as_a_word_that_other_programs_read():
    assert table_text([{"accepted": True}, {"accepted": False}]) == "accepted\ntrue\nfalse\n"


def test_a_table_without_rows_keeps_its_columns():
    assert table_text([], columns=("a", "b")) == "a,b\n"
    assert json.loads(table_text([], columns=("a",), form="json")) == []


def test_sessions_with_different_columns_share_one_table():
    text = table_text([{"unit": "1", "region": "x"}, {"unit": "2", "depth": "y"}])
    assert text == "unit,region,depth\n1,x,\n2,,y\n"


def test_a_dash_is_stdout(capsys):
    write_table("-", [{"a": 1}])
    assert capsys.readouterr().out == "a\n1\n"
    write_table("-", [{"a": 1}], form="json")
    assert json.loads(capsys.readouterr().out) == [{"a": 1}]


def test_nothing_is_overwritten_without_force(tmp_path):
    path = str(tmp_path / "t.csv")
    write_table(path, [{"a": 1}])
    with pytest.raises(TargetError, match="exists already; give --force"):
        write_table(path, [{"a": 2}])
    write_table(path, [{"a": 2}], force=True)
    assert (tmp_path / "t.csv").read_text() == "a\n2\n"


def test_another_suffix_is_wrong_use(tmp_path):
    with pytest.raises(UsageError, match=r"end its name in \.csv or \.json"):
        write_table(str(tmp_path / "t.xlsx"), [])


def test_small_p_values_keep_their_size():
    unit = unit_result()
    modulation = unit.modulation.__class__(**{**vars(unit.modulation), "rayleigh_p": 1.23456789e-30,
                                              "eta_squared": math.inf, "mean_phase": np.float64(1.0000001)})
    condition = condition_result()
    result = session_result(conditions=())
    result = result.__class__(**{**vars(result), "conditions": (
        condition.__class__(**{**vars(condition), "units": (unit.__class__(**{**vars(unit), "modulation": modulation}),
                                                            vm_result())}),)})
    row = classify_rows(result, {("3", "baseline"): Label("", "", "", "")})[0]
    assert (row["rayleigh_p"], row["eta_squared"], row["mean_phase"]) == (1.23457e-30, None, 1.0)
    assert suggestion("early-I", unit.histogram).probability == row["probability"]
