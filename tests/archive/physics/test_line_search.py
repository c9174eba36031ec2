"""Pulse responses and their lines: truth back with honest uncertainty, silence on noise, tones kept apart from resonances."""

from __future__ import annotations

import math
import time

import numpy as np
import pytest

from archive.physics.line_search import HOPELESS, resonance_lines
from archive.physics.pulse_response import pulse_response

RATE, POINTS = 4096.0, 8192
T = np.arange(POINTS) / RATE


def _pulse(seed: int = 1):
    """A flat pulse of random phases that fills the middle of the record."""
    rng = np.random.default_rng(seed)
    pulse = rng.normal(size=POINTS)
    return pulse * ((T > 0.1) & (T < 1.0))


def _resonator(pulse, frequency: float, quality: float):
    """Response of a driven harmonic oscillator to a pulse that has died away by the end of the record, height one."""
    f = np.fft.rfftfreq(POINTS, 1 / RATE)
    r = f / frequency
    return np.fft.irfft(np.fft.rfft(pulse) / quality / (1 - r * r + 1j * r / quality), POINTS)


def _noise(seed: int, sigma: float):
    return np.random.default_rng(seed).normal(0, sigma, POINTS)


def test_two_resonances_and_a_tone_come_back() -> None:
    pulse = _pulse()
    signal = (
        8 * _resonator(pulse, 700.3, 150.0)
        + 8 * _resonator(pulse, 1100.2, 400.0)
        + 2 * np.cos(2 * np.pi * 900.1 * T)
    )
    search = resonance_lines(pulse_response(signal + _noise(2, 1.0), rate=RATE, pulse=pulse))
    assert search.complete
    found = {line.kind: [] for line in search.lines} | {
        kind: sorted(
            (line.frequency, line.quality_factor, line) for line in search.lines if line.kind == kind
        )
        for kind in {line.kind for line in search.lines}
    }
    assert set(found) == {"resonance", "unresolved"}
    for (frequency, quality, line), truth in zip(
        found["resonance"], [(700.3, 150.0), (1100.2, 400.0)], strict=True
    ):
        u = np.sqrt(np.diag(line.covariance))
        assert abs(frequency - truth[0]) < 4 * u[0]
        assert abs(quality - truth[1]) < 4 * u[1]
        assert u[0] < 0.25
        assert line.chance < 1e-6
    ((tone, quality, _),) = found["unresolved"]
    assert tone == pytest.approx(900.1, abs=0.5)
    assert math.isnan(quality)


def test_a_record_that_ends_while_it_rings_gives_no_broader_line() -> None:
    """The pulse lasts as long as the record, so the free decay after it is cut off; the truth is the same system in a record four times as long."""
    count, long = 30, 4 * POINTS
    t = np.arange(long) / RATE
    pulse = np.random.default_rng(1).normal(size=long) * (t < 2.0)
    r = np.fft.rfftfreq(long, 1 / RATE) / 700.3
    rung = np.fft.irfft(np.fft.rfft(pulse) / 300.0 / (1 - r * r + 1j * r / 300.0), long)
    clean, sent = 8 * rung[:POINTS], pulse[:POINTS]
    # It still rings at the end.
    assert np.abs(clean[-100:]).max() > 0.3 * np.abs(clean).max()
    pulls, relative = [], []
    for seed in range(count):
        response = pulse_response(
            clean + _noise(100 + seed, 0.1), rate=RATE, pulse=sent, low=500.0, high=900.0
        )
        line = next(each for each in resonance_lines(response, most=2).lines if each.kind == "resonance")
        u = np.sqrt(np.diag(line.covariance))
        pulls.append([(line.frequency - 700.3) / u[0], (line.quality_factor - 300.0) / u[1]])
        relative.append(u[1] / 300.0)
    assert (np.abs(np.mean(pulls, axis=0)) < 4 / math.sqrt(count)).all()
    assert (np.abs(np.std(pulls, axis=0) - 1) < 4 / math.sqrt(2 * count)).all()
    # Without what was cut off the width comes out some per cent too large.
    assert max(relative) < 0.015


def test_a_broad_decay_without_a_pulse_is_found_and_the_search_given_up_in_time() -> None:
    """The edge at which a decay begins has no end of lines that are no resonance; some of their fits took minutes."""
    rate, frequency, quality = 1e5, 1000.0, 5.0
    t = np.arange(2000) / rate
    decay = np.exp(-np.pi * frequency / quality * t) * np.cos(2 * np.pi * frequency * t)
    began = time.process_time()
    search = resonance_lines(
        pulse_response(decay + np.random.default_rng(1).normal(0, 1e-3, t.size), rate=rate, pulse=None)
    )
    assert time.process_time() - began < 10
    assert [line.kind for line in search.lines].count("refused") == HOPELESS
    assert (search.given_up, search.complete) == (True, False)
    (line,) = [each for each in search.lines if each.kind == "resonance"]
    assert line.frequency == pytest.approx(frequency, rel=0.01)
    assert line.quality_factor == pytest.approx(quality, rel=0.05)


def test_noise_alone_has_no_line() -> None:
    """Of sixty records of noise about 0.06 are expected to show a line at a false alarm of one in a thousand."""
    pulse = _pulse()
    lines = [
        resonance_lines(pulse_response(_noise(seed, 1.0), rate=RATE, pulse=pulse)).lines for seed in range(60)
    ]
    assert sum(map(bool, lines)) <= 1


def test_the_chance_is_as_often_as_it_says() -> None:
    """At a false alarm of 0.2 (a bound, for the filters overlap) fewer than one in five records of noise shows a line."""
    pulse = _pulse()
    hits = sum(
        bool(
            resonance_lines(
                pulse_response(_noise(seed, 1.0), rate=RATE, pulse=pulse), most=1, false_alarm=0.2
            ).lines
        )
        for seed in range(100)
    )
    assert 2 <= hits <= 20 + 4 * math.sqrt(100 * 0.2 * 0.8)


def test_a_free_decay_needs_no_pulse() -> None:
    tau = 0.15
    decay = np.exp(-T / tau) * np.sin(2 * np.pi * 640.7 * T)
    (line, *rest) = resonance_lines(pulse_response(decay + _noise(3, 0.02), rate=RATE)).lines
    assert line.kind == "resonance"
    assert not rest
    assert abs(line.frequency - 640.7) < 4 * line.frequency_uncertainty
    # Q = pi f tau of the amplitude.
    assert abs(line.quality_factor - math.pi * 640.7 * tau) < 4 * math.sqrt(line.covariance[1, 1])


def test_the_noise_is_that_of_the_record() -> None:
    """White noise of one unit a point: sqrt(N/2) in each component of the spectrum, over the pulse's own."""
    pulse = _pulse()
    response = pulse_response(_noise(4, 1.0), rate=RATE, pulse=pulse)
    spectrum = np.abs(np.fft.rfft(pulse))[np.isin(np.fft.rfftfreq(POINTS, 1 / RATE), response.frequency)]
    assert np.median(response.standard_uncertainty * spectrum) == pytest.approx(
        math.sqrt(POINTS / 2), rel=0.05
    )
    assert response.step == RATE / POINTS


@pytest.mark.parametrize(
    ("change", "why"),
    [
        ({"rate": 0.0}, "rate: found 0"),
        ({"record": np.zeros(100)}, "found 100 points"),
        ({"pulse": np.ones(100)}, "found 100 points, expected 8192"),
        ({"pulse": np.ones(POINTS)}, "found no change"),
        ({"low": 10.0, "high": 20.0}, "at least 128"),
        ({"record": np.ones(POINTS)}, "no noise"),
    ],
    ids=["rate", "short", "pulse length", "no pulse", "narrow", "constant"],
)
def test_refusals_name_the_argument(change, why: str) -> None:
    arguments = {"record": _noise(1, 1.0), "rate": RATE, "pulse": _pulse()} | change
    with pytest.raises(ValueError, match=why):
        pulse_response(**arguments)


@pytest.mark.parametrize(
    "change", [{"most": 0}, {"false_alarm": 0.0}, {"false_alarm": 1.0}], ids=["most", "0", "1"]
)
def test_a_search_without_sense_is_refused(change) -> None:
    with pytest.raises(ValueError, match=next(iter(change))):
        resonance_lines(pulse_response(_noise(1, 1.0), rate=RATE), **change)


def test_a_tone_on_a_line_is_left_out_of_its_fit() -> None:
    """The tone stands within the width of the line, too close to be a line of its own."""
    pulse = _pulse()
    signal = 8 * _resonator(pulse, 700.3, 150.0) + 0.2 * np.cos(2 * np.pi * 702.5 * T)
    lines = resonance_lines(
        pulse_response(signal + _noise(6, 0.2), rate=RATE, pulse=pulse, low=500.0, high=900.0)
    ).lines
    line = lines[0]
    assert line.kind == "resonance"
    assert "left out" in line.reason
    u = np.sqrt(np.diag(line.covariance))
    assert abs(line.frequency - 700.3) < 4 * u[0]
    assert abs(line.quality_factor - 150.0) < 4 * u[1]
