"""From a nerve to its activity and envelope, against the textbook integrator and SciPy's filters."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import signal as sps

from tests.simulators import nerves
from unitclass.errors import SignalError
from unitclass.records import ArrayChunks, Signal
from unitclass.settings import NerveSettings, Settings
from unitclass.signals.cycles import find_cycles
from unitclass.signals.neurogram import activity, envelope, leaky
from unitclass.signals.smoothing import boxcar

SETTINGS = NerveSettings()


def test_a_step_reaches_63_percent_after_one_time_constant_and_rises_in_2_2_of_them():
    # check_values.md: 63.2 % at tau, 10 to 90 % in 2.197 tau.
    rate_hz, tau_s = 10_000.0, 0.05
    out = leaky(np.r_[np.zeros(1), np.ones(5000)], rate_hz, tau_s)[1:]
    assert out[round(tau_s * rate_hz) - 1] == pytest.approx(1 - np.exp(-1), abs=1e-3)
    reached = [np.argmax(out >= level) / rate_hz for level in (0.1, 0.9)]
    assert reached[1] - reached[0] == pytest.approx(2.197 * tau_s, rel=2e-3)


def test_a_ramp_lags_by_the_time_constant():
    rate_hz, tau_s = 10_000.0, 0.05
    ramp = np.arange(10_000) / rate_hz
    assert (ramp - leaky(ramp, rate_hz, tau_s))[-1] == pytest.approx(tau_s, rel=2e-3)


def test_the_integrator_is_scipys_first_order_filter():
    values = np.abs(np.random.default_rng(1).normal(size=5000))
    keep = np.exp(-1 / (500.0 * 0.05))
    expected, _ = sps.lfilter([1 - keep], [1, -keep], values, zi=[keep * values[0]])
    assert leaky(values, 500.0, 0.05) == pytest.approx(expected)


def test_a_moving_average_is_a_convolution_that_shrinks_at_the_ends():
    values = np.random.default_rng(2).normal(size=200)
    inner = np.convolve(values, np.ones(9) / 9, mode="valid")
    assert boxcar(values, 9)[4:-4] == pytest.approx(inner)


@pytest.mark.parametrize("rate_hz", [2_000.0, 10_000.0, 50_000.0])
def test_the_activity_of_band_passed_noise_follows_its_amplitude_at_every_sampling_rate(rate_hz):
    rng = np.random.default_rng(3)
    truth = nerves.draw(nerves.Plan(n_cycles=12), rng)
    made = activity(nerves.raw(truth, nerves.Rig(rate_hz=rate_hz, snr=8.0), rng), SETTINGS, start_s=0.0, stop_s=1e9)
    drawn = np.interp(made.times_s, np.arange(truth.envelope.size) / nerves.FINE_HZ, truth.envelope)
    smooth = boxcar(made.values, 51)
    assert made.rate_hz == pytest.approx(500.0, rel=0.1)
    assert np.corrcoef(smooth, boxcar(drawn, 51))[0, 1] > 0.97


@pytest.mark.parametrize("chunk_s", [0.05, 0.7, 1e9])
def test_the_size_of_chunks_changes_nothing(chunk_s):
    rng = np.random.default_rng(4)
    truth = nerves.draw(nerves.Plan(n_cycles=6), rng)
    values = nerves.raw_values(truth, nerves.Rig(rate_hz=5000.0), rng)
    whole, cut = (activity(nerves.as_signal(values, 5000.0, chunk_s=size), SETTINGS, start_s=0.0, stop_s=1e9).values
                  for size in (10.0, chunk_s))
    assert cut == pytest.approx(whole, rel=1e-4)


@pytest.mark.parametrize("factor", [1e-6, -1.0, 1e4])
def test_unit_and_polarity_scale_the_activity_of_a_raw_nerve_and_nothing_else(factor):
    rng = np.random.default_rng(5)
    truth = nerves.draw(nerves.Plan(n_cycles=6), rng)
    values = nerves.raw_values(truth, nerves.Rig(rate_hz=5000.0), rng)
    plain, other = (activity(nerves.as_signal(v, 5000.0), SETTINGS, start_s=0.0, stop_s=1e9).values
                    for v in (values, factor * values))
    assert other == pytest.approx(abs(factor) * plain, rel=1e-3)


@pytest.mark.parametrize("shape", ["ramp", "square", "decrementing"])
@pytest.mark.parametrize("offset", [-3.0, 0.0, 3.0, 60.0])
def test_an_integrated_nerve_recorded_upside_down_gives_the_same_cycles(shape, offset):
    rng = np.random.default_rng(6)
    truth = nerves.draw(nerves.Plan(shape=shape, n_cycles=15), rng)
    up = nerves.drawn(truth, nerves.Rig(snr=8.0, scale=1.0), rng)
    values = np.concatenate([c.values for c in up.reader.chunks()])
    turned = nerves.as_signal(offset - values, up.rate_hz, integrated=True)
    one, two = (find_cycles(s, (), start_s=0.0, stop_s=s.stop_s, settings=Settings()) for s in (up, turned))
    assert two.cycles.onset_s == pytest.approx(one.cycles.onset_s, abs=0.01)
    assert any("turned over" in words for words in two.detection)
    assert not any("turned over" in words for words in one.detection)


@pytest.mark.parametrize("duty", [0.15, 0.45, 0.62])
def test_long_inspirations_are_not_turned_over(duty):
    rng = np.random.default_rng(7)
    truth = nerves.draw(nerves.Plan(shape="square", duty=duty, n_cycles=15), rng)
    found = find_cycles(nerves.integrated(truth, nerves.Rig(rate_hz=10000.0, snr=6.0), rng), (), start_s=0.0,
                        stop_s=truth.duration_s, settings=Settings())
    assert not any("turned over" in words for words in found.detection)
    assert np.nanmedian(found.cycles.ti_s) == pytest.approx(3.0 * duty, abs=0.1)


@pytest.mark.parametrize(("values", "words"), [(np.full(5000, np.nan), "NaN"), (np.ones(5000), "constant")])
def test_a_nerve_without_content_is_one_line(values, words):
    flat = Signal("PNA", "phrenic", "V", 1000.0, 0.0, 5.0, ArrayChunks(values, 1000.0), is_integrated=True)
    with pytest.raises(SignalError, match=words):
        envelope(flat, SETTINGS, start_s=0.0, stop_s=5.0)
