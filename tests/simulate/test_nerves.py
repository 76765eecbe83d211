import numpy as np
import pytest

from unitclass.simulate.breathing import Pattern, breathe
from unitclass.simulate.nerves import Wire, envelope, record

STOP_S = 60.0
PLAIN = Wire("PNA", "phrenic", ("augmenting burst",), 2500.0, hum=0.0, heart=0.0)


@pytest.fixture(scope="module")
def breaths():
    return breathe(Pattern(0.8, 1.7), 0.5, STOP_S, np.random.default_rng(1))


def _band(counts, rate_hz, low, high):
    power = np.abs(np.fft.rfft(counts.astype(float))) ** 2
    f = np.fft.rfftfreq(counts.size, 1 / rate_hz)
    return power[(f >= low) & (f < high)].sum()


def test_the_envelope_rises_through_inspiration_and_is_silent_late_in_expiration(breaths):
    early = envelope(PLAIN, breaths, breaths.onset_s + 0.2 * (breaths.offset_s - breaths.onset_s))
    late = envelope(PLAIN, breaths, breaths.onset_s + 0.9 * (breaths.offset_s - breaths.onset_s))
    rest = envelope(PLAIN, breaths, breaths.offset_s + 0.6 * (breaths.end_s - breaths.offset_s))
    assert np.all(late > 1.5 * early)
    assert np.all(rest == 0)


def test_raw_activity_is_larger_in_inspiration_by_the_ratio_asked_for(breaths):
    trace = record(PLAIN, breaths, STOP_S, np.random.default_rng(2))
    times = np.arange(trace.counts.size) / PLAIN.rate_hz
    top = envelope(PLAIN, breaths, times) > 0.85
    rest = envelope(PLAIN, breaths, times) == 0
    ratio = trace.counts[top].std() / trace.counts[rest].std()
    assert 4.0 < ratio < 9.0


def test_the_raw_nerve_oscillates_about_zero_and_is_not_an_envelope(breaths):
    trace = record(PLAIN, breaths, STOP_S, np.random.default_rng(3))
    assert abs(trace.counts.mean()) < 0.1 * trace.counts.std()
    assert trace.counts.dtype == np.int16


def test_hum_and_heart_are_where_they_were_put(breaths):
    hum = record(Wire("a", "phrenic", ("quiet",), 2500.0, hum=2.0, heart=0.0), breaths, STOP_S,
                 np.random.default_rng(4))
    none = record(Wire("a", "phrenic", ("quiet",), 2500.0, hum=0.0, heart=0.0), breaths, STOP_S,
                  np.random.default_rng(4))
    heart = record(Wire("a", "phrenic", ("quiet",), 2500.0, hum=0.0, heart=8.0), breaths, STOP_S,
                   np.random.default_rng(4))
    assert _band(hum.counts, 2500, 49.5, 50.5) > 50 * _band(none.counts, 2500, 49.5, 50.5)
    beats = np.sum(np.diff((heart.counts > 4 * none.counts.std()).astype(int)) == 1)
    assert beats / STOP_S == pytest.approx(5.2, rel=0.2)


def test_an_integrated_nerve_is_one_signed_and_smooth(breaths):
    wire = Wire("VNA", "cervical vagus", ("vagal",), 200.0, is_integrated=True)
    trace = record(wire, breaths, STOP_S, np.random.default_rng(5))
    assert trace.counts.size == STOP_S * 200
    assert trace.counts.min() >= 0
    assert np.corrcoef(trace.counts[:-1], trace.counts[1:])[0, 1] > 0.97
    assert "integrated" in trace.description


def test_a_nerve_that_skips_breaths_is_quiet_in_them(breaths):
    wire = Wire("AbN", "abdominal", ("late-expiratory burst",), 2500.0, every=(2,))
    level = envelope(wire, breaths, breaths.end_s - 0.05 * (breaths.end_s - breaths.offset_s))
    assert np.all(level[1::2] == 0)
    assert np.all(level[::2] > 0.5)


def test_blocks_join_without_a_seam(breaths):
    # 60 s are made in blocks of 20 s; a seam would show as a jump beyond what neighbours do elsewhere.
    trace = record(PLAIN, breaths, STOP_S, np.random.default_rng(6))
    steps = np.abs(np.diff(trace.counts.astype(float)))
    seams = [(20 * 2500) - 1, (40 * 2500) - 1]
    assert np.all(steps[seams] <= np.quantile(steps, 0.9999))
