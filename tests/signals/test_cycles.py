"""Cycles found on nerves whose marks are known, and what must not change them."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import signal as sps

from tests.benchmarks.cycles import cycles_of, errors
from tests.simulators import nerves
from unitclass.errors import SignalError
from unitclass.records import CycleEdit, Exclusion, NerveCycles, Signal
from unitclass.settings import Settings
from unitclass.signals.cycles import find_cycles

SETTINGS = Settings()
RIG = nerves.Rig(rate_hz=5000.0, snr=6.0)


def drawn(seed: int = 1, **plan: object) -> tuple[nerves.Truth, np.random.Generator]:
    rng = np.random.default_rng(seed)
    return nerves.draw(nerves.Plan(**{"n_cycles": 25, **plan}), rng), rng  # type: ignore[arg-type]


def found_in(signal: Signal, **given_: object) -> NerveCycles:
    return find_cycles(signal, (), **{"start_s": 0.0, "stop_s": signal.stop_s, "settings": SETTINGS, **given_})  # type: ignore[arg-type]


# --------------------------------------------------------------------------------- accuracy

@pytest.mark.parametrize("shape", ["ramp", "square", "decrementing", "gentle", "bell"])
@pytest.mark.parametrize("form", [nerves.raw, nerves.integrated])
def test_at_a_signal_to_noise_of_six_onsets_and_offsets_are_within_15_ms(form, shape):
    truth, rng = drawn(shape=shape)
    e = errors(truth, found_in(form(truth, replace(RIG, rate_hz=10000.0), rng)), 3.0)
    assert e.f1 == 1.0
    assert np.median(np.abs(e.onset_ms)) < 15
    assert abs(np.median(e.onset_ms)) < 8
    assert np.median(np.abs(e.offset_ms)) < 15


@pytest.mark.parametrize("shape", ["ramp", "square"])
def test_heart_beats_smeared_by_an_integrator_are_cut_out_once_it_is_undone(shape):
    truth, rng = drawn(shape=shape, n_cycles=40)
    e = errors(truth, found_in(nerves.integrated(truth, replace(RIG, rate_hz=10000.0, trouble=("heart",)), rng)), 3.0)
    assert e.f1 == 1.0
    assert np.median(np.abs(e.onset_ms)) < 15
    assert np.median(np.abs(e.offset_ms)) < 15


@pytest.mark.parametrize("trouble", ["", "hum", "heart", "drift"])
def test_at_a_signal_to_noise_of_two_they_are_within_40_ms(trouble):
    truth, rng = drawn(n_cycles=40)
    rig = replace(RIG, rate_hz=10000.0, snr=2.0, trouble=(trouble,) if trouble else ())
    e = errors(truth, found_in(nerves.raw(truth, rig, rng)), 3.0)
    assert e.f1 >= 0.98
    assert np.median(np.abs(e.onset_ms)) < 40
    assert np.median(np.abs(e.offset_ms)) < 40


@pytest.mark.parametrize(("per_min", "rate_hz"), [(3, 2000.0), (12, 50_000.0), (60, 5000.0), (150, 5000.0), (300, 5000.0)])
def test_from_3_to_300_cycles_a_minute_no_setting_is_needed(per_min, rate_hz):
    ttot_s = 60 / per_min
    truth, rng = drawn(n_cycles=12 if per_min < 60 else 40, ttot_s=ttot_s, edge_s=min(0.02, 0.03 * ttot_s),
                       lead_in_s=ttot_s / 2)
    assert errors(truth, found_in(nerves.raw(truth, replace(RIG, rate_hz=rate_hz), rng)), ttot_s).f1 >= 0.98


def test_an_integrated_nerve_at_100_hz_is_enough():
    truth, rng = drawn()
    assert errors(truth, found_in(nerves.drawn(truth, RIG, rng, rate_hz=100.0)), 3.0).f1 == 1.0


@pytest.mark.parametrize("trouble", ["dead", "nan", "saturation", "movement", "hum", "heart", "drift"])
def test_trouble_costs_no_cycles_outside_itself(trouble):
    truth, rng = drawn(n_cycles=40)
    e = errors(truth, found_in(nerves.raw(truth, replace(RIG, trouble=(trouble,)), rng)), 3.0)
    assert e.f1 > (0.94 if trouble in ("dead", "movement", "nan") else 0.99)


def test_an_after_discharge_of_a_quarter_of_the_burst_is_expiration():
    truth, rng = drawn(after_discharge=0.25, after_tau_s=0.25, n_cycles=40)
    e = errors(truth, found_in(nerves.raw(truth, replace(RIG, rate_hz=10000.0), rng)), 3.0)
    assert np.median(np.abs(e.offset_ms)) < 15


def test_noise_alone_hum_alone_and_heart_beats_alone_yield_no_cycles():
    rng = np.random.default_rng(3)
    t = np.arange(300_000) / 5000.0
    floor = nerves.noise(t.size, RIG, rng)
    for values in (floor, floor + nerves.hum(t, RIG, rng), floor + nerves.heart(t, RIG, rng)):
        with pytest.raises(SignalError):
            found_in(nerves.as_signal(values, 5000.0))


def test_on_a_clean_envelope_there_is_one_cycle_for_every_peak_that_scipy_finds():
    truth, rng = drawn(shape="bell", n_cycles=30)
    signal = nerves.drawn(truth, replace(RIG, snr=60.0), rng, rate_hz=200.0)
    values = np.concatenate([c.values for c in signal.reader.chunks()])
    peaks, _ = sps.find_peaks(sps.savgol_filter(values, 41, 2), prominence=0.5 * np.ptp(values))
    found = found_in(signal).cycles
    at_s = peaks / 200.0
    held = [int(np.sum((at_s >= a) & (at_s < b))) for a, b in zip(found.onset_s, found.end_s, strict=True)]
    assert held == [1] * found.n_cycles
    assert found.n_cycles >= peaks.size - 1


# ------------------------------------------------------------------------------------ laws

TRUTH, RNG = drawn(7, n_cycles=15)
VALUES = nerves.raw_values(TRUTH, replace(RIG, rate_hz=2000.0), RNG)
PLAIN = found_in(nerves.as_signal(VALUES, 2000.0)).cycles


@settings(max_examples=12, derandomize=True, deadline=None)
@given(shift_s=st.floats(-1e4, 1e5), power=st.floats(-9, 6), sign=st.sampled_from([1.0, -1.0]),
       chunk_s=st.floats(0.2, 60.0))
def test_neither_the_clock_nor_unit_nor_polarity_nor_chunks_change_the_cycles(shift_s, power, sign, chunk_s):
    moved = nerves.as_signal(sign * 10.0**power * VALUES, 2000.0, start_s=shift_s, chunk_s=chunk_s)
    found = find_cycles(moved, (), start_s=shift_s, stop_s=moved.stop_s, settings=SETTINGS).cycles
    assert found.onset_s - shift_s == pytest.approx(PLAIN.onset_s, abs=0.004)
    assert found.offset_s - shift_s == pytest.approx(PLAIN.offset_s, abs=0.004, nan_ok=True)
    assert found.kind == PLAIN.kind
    assert found.peak == pytest.approx(10.0**power * PLAIN.peak, rel=0.02)


@settings(max_examples=8, derandomize=True, deadline=None)
@given(cut=st.integers(3, 11))
def test_a_condition_is_judged_by_what_lies_within_it_alone(cut):
    stop = float(TRUTH.onset_s[cut]) - 0.2
    loud = VALUES.copy()
    loud[int(stop * 2000.0):] *= 30.0
    kept, other = (find_cycles(nerves.as_signal(v, 2000.0), (), start_s=0.0, stop_s=stop, settings=SETTINGS).cycles
                   for v in (VALUES, loud))
    assert other.onset_s == pytest.approx(kept.onset_s, abs=1e-3)


# ------------------------------------------------------------------------------------ tags

def test_every_event_gets_its_tag_and_stays_in_the_table():
    events = {8: "sigh", 16: "apnoea", 24: "doublet", 32: "swallow"}
    truth, rng = drawn(2, n_cycles=42, events=events)
    c = found_in(nerves.raw(truth, RIG, rng)).cycles
    told = {i: [f"{c.kind[k]} {c.reason[k]}" for k in np.flatnonzero(
        (c.onset_s > truth.onset_s[i] - 0.3) & (c.onset_s < truth.onset_s[i + 1] - 0.3))] for i in events}
    for i, event in events.items():
        assert any(event in words for words in told[i]), (event, told[i])
    assert not c.accepted[np.argmin(np.abs(c.onset_s - truth.onset_s[8]))]
    assert "after a sigh" in c.reason[np.argmin(np.abs(c.onset_s - truth.onset_s[9]))]
    assert c.n_cycles >= 40


def test_a_window_left_out_takes_the_cycles_that_touch_it_and_no_other():
    truth, rng = drawn(n_cycles=20)
    signal = nerves.raw(truth, RIG, rng)
    window = Exclusion(20.0, 24.0, "stimulation")
    c, plain = found_in(signal, exclusions=(window,)).cycles, found_in(signal).cycles
    touched = (c.onset_s < 24.0) & (c.end_s > 20.0)
    assert all("stimulation" in c.reason[i] for i in np.flatnonzero(touched))
    assert c.accepted[~touched].tolist() == plain.accepted[~touched].tolist()
    assert not c.accepted[touched].any()


def test_a_person_can_drop_and_restore_any_cycle_and_move_the_threshold_and_the_last_word_counts():
    truth, rng = drawn(n_cycles=20)
    signal = nerves.raw(truth, RIG, rng)
    at = float(truth.onset_s[5]) + 0.2
    drop, restore = CycleEdit("", "drop", at_s=at, reviewer="anna"), CycleEdit("", "restore", at_s=at, reviewer="bert")
    k = int(np.argmin(np.abs(found_in(signal).cycles.onset_s - truth.onset_s[5])))
    dropped, back = found_in(signal, edits=(drop,)).cycles, found_in(signal, edits=(drop, restore)).cycles
    assert not dropped.accepted[k]
    assert "anna" in dropped.reason[k]
    assert back.accepted[k]
    high, usual = (found_in(signal, edits=edits).threshold for edits in ((CycleEdit("", "threshold", value=1.5),), ()))
    assert high > usual


# ---------------------------------------------------------------------------- other nerves

def test_hypoglossal_lead_and_its_scatter_are_what_was_drawn():
    truth, rng = drawn(4, shape="square", n_cycles=40)
    lead_s = 0.15
    early = np.r_[truth.envelope[int(lead_s * nerves.FINE_HZ):], np.zeros(int(lead_s * nerves.FINE_HZ))]
    found = find_cycles(nerves.raw(truth, RIG, rng), [nerves.raw(replace(truth, envelope=early), RIG, rng, name="HN",
                                                                   role="hypoglossal")],
                        start_s=0.0, stop_s=truth.duration_s, settings=SETTINGS)
    lead = found.cycles.lead_ms["HN"]
    assert np.nanmedian(lead) == pytest.approx(1000 * lead_s, abs=10)
    assert np.nanstd(lead) < 15


@pytest.mark.parametrize("n", [1, 2, 3])
def test_n_to_one_coupling_of_late_expiratory_bursts_is_counted(n):
    from unitclass.signals.nerves import coupling

    late = np.zeros(60, int)
    late[::n] = 1
    found = coupling(late)
    assert (found.n, found.share) == (n, pytest.approx(1 / n, abs=0.02))
    assert found.confidence > 0.9
    assert coupling(np.zeros(60, int)).n == 0
    ragged = coupling((np.random.default_rng(1).random(200) < 0.3).astype(int))
    assert ragged.confidence < 0.6  # bursts at random: no n is common


def test_a_vagus_gives_the_end_of_post_inspiration_and_one_without_it_gives_none():
    from tests.benchmarks.cycles import post_i

    hit, false, bias_ms, spread_ms = post_i(25, n_runs=2)
    assert hit > 0.9
    assert false < 0.05
    assert abs(bias_ms) < 50
    assert spread_ms < 80


def test_noise_as_a_second_nerve_is_a_note_and_not_a_failure():
    truth, rng = drawn()
    other = nerves.as_signal(nerves.noise(int(truth.duration_s * 5000), RIG, rng), 5000.0, name="VNA", role="vagus")
    found = find_cycles(nerves.raw(truth, RIG, rng), [other], start_s=0.0, stop_s=truth.duration_s, settings=SETTINGS)
    assert any("VNA" in note for note in found.notes)
    assert errors(truth, cycles_of(nerves.raw(truth, RIG, np.random.default_rng(9))), 3.0).f1 == 1.0
