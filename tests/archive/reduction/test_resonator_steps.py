"""Steps of pulses, followed lines, free decays and the linear regime: what they say, hold, refuse and leave without a number."""

from __future__ import annotations

import json
import math

import numpy as np
import pytest

from archive.reduction.estimate import Estimate
from archive.reduction.fourth_sound_steps import FractionParameters, fraction_from_line
from archive.reduction.linear_regime_steps import RegimeParameters, drive_within_regime, linear_regime
from archive.reduction.planning import shipped_plans
from archive.reduction.pulse_steps import PulseLineParameters, mean_temperature, pulse_as_sent, pulse_lines
from archive.reduction.ringdown_steps import (
    AmplitudeParameters,
    ComponentParameters,
    decay_against_amplitude,
    decay_of_components,
    magnitude,
)
from archive.reduction.step import NoParameters
from archive.reduction.steps import all_steps
from archive.reduction.tracking_steps import TrackParameters, followed_line
from schemas.sweep import Detection

T = np.arange(4096) / 2048.0


def _decay(frequency: float = 300.4, tau: float = 0.2, seed: int = 1):
    return np.exp(-T / tau) * np.sin(2 * np.pi * frequency * T) + np.random.default_rng(seed).normal(
        0, 0.02, T.size
    )


def test_lines_of_a_record_have_places_and_words() -> None:
    outcome = pulse_lines(PulseLineParameters(), signal=_decay(), rate=np.full(T.size, 2048.0), pulse=None)
    assert outcome.outputs["resonances"] == 1
    assert float(outcome.outputs["frequency_1"]) == pytest.approx(300.4, abs=0.05)
    assert outcome.verdicts["frequency_2"] == "no resonance"
    assert outcome.verdicts["tone_1"] == "no line"
    assert outcome.covariance is not None
    assert outcome.covariance.names == ("frequency_1", "quality_factor_1")
    assert outcome.held == {"order": (float(outcome.outputs["frequency_1"]),)}


def test_a_held_order_keeps_each_line_in_its_place() -> None:
    signal = _decay() + 0.5 * _decay(700.2, seed=2)
    free = pulse_lines(PulseLineParameters(), signal=signal, rate=2048.0, pulse=None)
    turned = pulse_lines(
        PulseLineParameters(order=(700.2, 500.0, 300.4)), signal=signal, rate=2048.0, pulse=None
    )
    assert turned.outputs["frequency_1"] == free.outputs["frequency_2"]
    assert turned.outputs["frequency_3"] == free.outputs["frequency_1"]
    assert math.isnan(float(turned.outputs["frequency_2"]))


def test_no_resonance_is_a_verdict_and_a_finding() -> None:
    noise = np.random.default_rng(5).normal(size=T.size)
    outcome = pulse_lines(PulseLineParameters(), signal=noise, rate=2048.0, pulse=None)
    assert outcome.verdicts["quality_factor_1"] == "no resonance"
    assert [finding.code for finding in outcome.findings] == ["no-resonance"]
    assert outcome.covariance is None


@pytest.mark.parametrize(
    ("change", "why"),
    [
        ({"rate": np.linspace(2048, 2050, T.size)}, "expected one rate"),
        ({"signal": np.append(_decay()[:-1], np.nan)}, r"signal\[4095\]"),
    ],
    ids=["rate", "gap"],
)
def test_a_record_must_be_whole(change, why: str) -> None:
    with pytest.raises(ValueError, match=why):
        pulse_lines(PulseLineParameters(), **({"signal": _decay(), "rate": 2048.0, "pulse": None} | change))


def test_a_pulse_is_kept_as_sent() -> None:
    outcome = pulse_as_sent(NoParameters(), drive=np.array([0.0, 1.0, 0.0, -1.0]))
    assert float(outcome.outputs["rms"]) == pytest.approx(math.sqrt(0.5))
    for bad, why in ((np.ones(4), "no change"), (np.array([1.0, np.nan]), r"drive\[1\]")):
        with pytest.raises(ValueError, match=why):
            pulse_as_sent(NoParameters(), drive=bad)


def test_the_temperature_is_the_mean_and_the_drift_its_uncertainty() -> None:
    outcome = mean_temperature(NoParameters(), first=np.full(5, 1.0), last=np.full(5, 1.006))
    assert float(outcome.outputs["temperature"]) == pytest.approx(1.003)
    # Half the range over the root of three: JCGM 100:2008, 4.3.7.
    assert float(outcome.point["temperature"]) == pytest.approx(0.003 / math.sqrt(3))
    with pytest.raises(ValueError, match="no temperature"):
        mean_temperature(NoParameters(), first=math.nan, last=None)


TEMPERATURE = np.array([0.6, 0.8, 1.0, 1.1, 1.2, 1.3])
MOVING = np.array([2037.5, 2036.0, 2027.0, 2016.0, 1998.0, 1974.0])


def _places(**more):
    """Places of six spectra: the line, which changes places with another that stays."""
    stays = np.full(6, 1500.0)
    swap = np.array([False, True, False, False, True, False])
    first, second = np.where(swap, stays, MOVING), np.where(swap, MOVING, stays)
    columns = {
        "frequency_1": first,
        "frequency_2": second,
        "quality_factor_1": np.where(swap, 50.0, 3000.0),
        "quality_factor_2": np.where(swap, 3000.0, 50.0),
    }
    estimates = {
        f"{name}_estimate": Estimate(columns[name], "frequency", point=np.full(6, 0.02))
        for name in ("frequency_1", "frequency_2")
    }
    return columns | estimates | more


def test_a_line_is_followed_from_place_to_place() -> None:
    outcome = followed_line(TrackParameters(), temperature=TEMPERATURE, **_places())
    assert outcome.array("frequency") == pytest.approx(MOVING)
    assert outcome.array("quality_factor") == pytest.approx(np.full(6, 3000.0))
    assert outcome.held == {"assigned": (1, 2, 1, 1, 2, 1)}
    assert "1500.00 Hz in 6" in str(outcome.facts["fixed"])
    held = followed_line(TrackParameters(assigned=(1, 2, 1, 1, 2, 0)), temperature=TEMPERATURE, **_places())
    assert held.array("frequency")[:5] == pytest.approx(MOVING[:5])
    assert math.isnan(held.array("frequency")[5])


@pytest.mark.parametrize(
    ("parameters", "temperature", "why"),
    [
        (TrackParameters(near_hz=1000.0), TEMPERATURE, "no line that begins within 1 per cent of 1000 Hz"),
        (TrackParameters(assigned=(1, 2)), TEMPERATURE, "found 2 places, expected 6"),
        (TrackParameters(), np.append(TEMPERATURE[:-1], np.nan), r"temperature\[5\]"),
    ],
    ids=["near", "assigned", "temperature"],
)
def test_what_cannot_be_followed_is_refused(parameters, temperature, why: str) -> None:
    with pytest.raises(ValueError, match=why):
        followed_line(parameters, temperature=temperature, **_places())


def test_lines_that_all_stay_give_no_track() -> None:
    columns = _places()
    columns["frequency_1"] = np.full(6, 700.0)
    columns["frequency_2"] = np.full(6, 1500.0)
    with pytest.raises(ValueError, match=r"lines that stay \(Hz\): 700.00, 1500.00"):
        followed_line(TrackParameters(), temperature=TEMPERATURE, **columns)


def test_an_ambiguous_spectrum_has_no_number_and_a_warning() -> None:
    columns = _places()
    line = MOVING.copy()
    columns["frequency_1"], columns["frequency_2"] = line.copy(), np.full(6, 1500.0)
    # Two lines equally far from 2013 Hz, where a straight line through the spectra before leads.
    columns["frequency_1"][3], columns["frequency_2"][3] = 2017.0, 2028.0
    outcome = followed_line(TrackParameters(), temperature=TEMPERATURE, **columns)
    assert math.isnan(outcome.array("frequency")[3])
    assert "line-ambiguous" in [finding.code for finding in outcome.findings]


def test_the_fraction_is_told_beside_the_table() -> None:
    outcome = fraction_from_line(
        FractionParameters(), frequency=np.append(MOVING, [np.nan, 900.0]), temperature=np.append(TEMPERATURE, [1.7, 2.3]), temperature_scale="ITS-90",
    )  # fmt: skip
    fraction = outcome.array("fraction")
    assert fraction[0] == 1.0
    assert np.isnan(fraction[6:]).all()
    assert outcome.array("difference")[:6] == pytest.approx(fraction[:6] - outcome.array("tabulated")[:6])
    # 0.5 per cent of the speed of first sound as limits, twice; nothing at the reference.
    shared = np.asarray(outcome.shared["fraction"]["tabulated speed of first sound"])
    assert shared[:2] == pytest.approx([0.0, fraction[1] * 0.01 / math.sqrt(3)])
    assert not outcome.findings
    difference = outcome.array("difference")[:6]
    assert float(outcome.outputs["rms_difference"]) == pytest.approx(math.sqrt(np.mean(difference**2)))
    # Moving the source by a small part of its size moves the rms as it says.
    part = 1e-4 * shared[:6]
    moved = math.sqrt(np.mean((difference + part) ** 2)) - math.sqrt(np.mean(difference**2))
    assert moved == pytest.approx(
        1e-4 * float(outcome.shared["rms_difference"]["tabulated speed of first sound"]), rel=0.01
    )
    other = fraction_from_line(
        FractionParameters(reference_row=4),
        frequency=MOVING,
        temperature=TEMPERATURE,
        temperature_scale="T58",
    )
    assert [finding.code for finding in other.findings] == ["scale-not-of-table"]
    assert float(np.asarray(other.shared["fraction"]["tabulated superfluid fraction"])[3]) == pytest.approx(
        1e-3
    )
    for row, why in ((9, "reference_row"), (None, "no spectrum")):
        with pytest.raises(ValueError, match=why):
            fraction_from_line(
                FractionParameters(reference_row=row), frequency=MOVING * (1 if row else np.nan), temperature=TEMPERATURE, temperature_scale=None
            )  # fmt: skip


def test_a_decay_that_depends_on_amplitude_is_told_with_its_size() -> None:
    t = np.linspace(0, 600, 300)
    fall = np.exp(-t / 150)
    signal = fall / (1 + 0.3 * (1 - fall)) + np.random.default_rng(1).normal(0, 1e-3, t.size)
    outcome = decay_against_amplitude(
        AmplitudeParameters(background="none"),
        time=t + 1.7e9,
        amplitude=signal,
        period=1e-3,
        u_amplitude=None,
    )
    assert [finding.code for finding in outcome.findings] == ["amplitude-dependent-dissipation"]
    assert float(outcome.outputs["relative_change"]) == pytest.approx(0.3, abs=0.03)
    assert float(outcome.outputs["quality_factor"]) == pytest.approx(math.pi * 1e3 * 150, rel=0.02)


def test_both_components_give_the_frequency() -> None:
    t = np.linspace(0, 300, 400)
    z = np.exp((2j * np.pi * 0.02 - 1 / 60) * t)
    noise = np.random.default_rng(2).normal(0, 1e-3, (2, t.size))
    outcome = decay_of_components(
        ComponentParameters(),
        time=t,
        x=z.real + noise[0],
        y=z.imag + noise[1],
        reference_period=np.full(400, 1e-3),
    )
    assert float(outcome.outputs["resonance_frequency"]) == pytest.approx(1000.02, abs=1e-5)
    assert float(outcome.outputs["quality_factor"]) == pytest.approx(math.pi * 1e3 * 60, rel=2e-3)
    assert outcome.covariance is not None
    assert (
        outcome.covariance.matrix[0, 0] == outcome.covariance.matrix[1, 1] == outcome.covariance.matrix[0, 1]
    )
    assert magnitude(NoParameters(), x=z.real, y=z.imag).array("magnitude") == pytest.approx(np.abs(z))
    still = decay_of_components(ComponentParameters(), time=t, x=noise[0], y=noise[1], reference_period=1e-3)
    assert set(still.verdicts.values()) == {"no decay"}
    with pytest.raises(ValueError, match="the reference moved"):
        decay_of_components(
            ComponentParameters(),
            time=t,
            x=z.real,
            y=z.imag,
            reference_period=np.linspace(1e-3, 1.00001e-3, 400),
        )


DRIVE = np.repeat(np.linspace(0.1, 2.0, 20), 5)


def _regime(bend: float, sigma: float = 1e-13, **more):
    amplitude = 1e-3 * DRIVE
    period = 1e-3 * (1 + bend * (amplitude / amplitude.max()) ** 2)
    random = np.random.default_rng(3)
    arguments = {
        "drive": DRIVE, "amplitude": amplitude * (1 + random.normal(0, 1e-5, DRIVE.size)), "period": period + random.normal(0, sigma, DRIVE.size),
        "detection": None, "reference_signal": 1e-3, "reference_velocity": 2e-4, "u_amplitude": None, "u_period": None,
    }  # fmt: skip
    return linear_regime(RegimeParameters(), **(arguments | more))


def test_the_linear_regime_ends_where_the_period_moves() -> None:
    outcome = _regime(1e-6)
    # The period has moved by 1e-7 of itself against the mean of the six lowest levels, whose own part is the mean of their squares.
    low = np.mean((np.linspace(0.1, 2.0, 20)[:6] / 2.0) ** 2)
    assert float(outcome.outputs["linear_amplitude"]) == pytest.approx(2e-3 * math.sqrt(0.1 + low), rel=0.01)
    assert float(outcome.point["linear_amplitude"]) > 0
    assert outcome.outputs["tested_amplitude"] == outcome.outputs["linear_amplitude"]
    assert float(outcome.outputs["linear_velocity"]) == pytest.approx(
        0.2 * float(outcome.outputs["linear_amplitude"])
    )
    assert not outcome.findings


def test_a_regime_that_is_not_left_is_tested_up_to_the_largest_amplitude() -> None:
    outcome = _regime(0.0, reference_velocity=None)
    assert outcome.verdicts["linear_amplitude"] == "not reached"
    assert float(outcome.outputs["tested_amplitude"]) == pytest.approx(2e-3, rel=1e-4)
    assert outcome.verdicts["tested_velocity"] == "no reference speed is recorded"


def test_a_regime_that_is_not_resolved_is_said_to_be_so() -> None:
    outcome = _regime(0.0, sigma=1e-9)
    assert outcome.verdicts["tested_amplitude"] == "period not resolved"
    assert [finding.code for finding in outcome.findings] == ["linear-regime-not-resolved"]


def test_the_dissipation_counts_with_the_power_of_the_torque() -> None:
    square = Detection.model_validate_json(
        json.dumps({"torque_exponent": 2, "signal_exponent": 0, "amplitude_convention": "rms"})
    )
    outcome = _regime(
        0.0,
        amplitude=1e-3 * DRIVE**2 * (1 + np.random.default_rng(1).normal(0, 1e-4, DRIVE.size)),
        period=None,
        detection=square,
    )
    assert outcome.verdicts["linear_amplitude"] == "not reached"
    bent = _regime(
        0.0,
        amplitude=1e-3 * DRIVE / (1 + 0.05 * (DRIVE / 2) ** 2),
        period=None,
        u_amplitude=np.full(DRIVE.size, 1e-8),
    )
    assert 0 < float(bent.outputs["linear_amplitude"]) < 2e-3


@pytest.mark.parametrize(
    ("linear", "tested", "codes"),
    [
        (1e-3, 1e-3, ["driven-beyond-linear"]),
        (math.nan, 1e-3, ["driven-beyond-test"]),
        (math.nan, 5e-3, []),
        (None, 5e-3, []),
    ],
    ids=["beyond", "untried", "within", "one limit"],
)
def test_a_sweep_is_held_against_the_regime(linear, tested, codes: list[str]) -> None:
    amplitude = np.array([1e-4, 2e-3, np.nan])
    outcome = drive_within_regime(NoParameters(), amplitude=amplitude, linear=linear, tested=tested)
    assert [finding.code for finding in outcome.findings] == codes
    assert float(outcome.outputs["ratio"]) == pytest.approx(2e-3 / tested)


def test_without_a_regime_nothing_is_held_against_it() -> None:
    with pytest.raises(ValueError, match="resolved no linear regime"):
        drive_within_regime(NoParameters(), amplitude=np.ones(3), linear=math.nan, tested=None)
    with pytest.raises(ValueError, match="amplitude: found no value"):
        drive_within_regime(NoParameters(), amplitude=np.full(3, np.nan), linear=1.0, tested=None)


def test_what_only_looks_does_not_say_that_it_treats() -> None:
    """The drive sweep and the decay test amplitude dependence and correct nothing."""
    looking = [step for step in all_steps() if "amplitude dependence" in step.considered]
    assert {step.name for step in looking} == {"drive-linearity", "decay-against-amplitude"}
    assert not [step.name for step in all_steps() if "amplitude dependence" in step.effects]


def test_the_plans_name_steps_and_places_that_there_are() -> None:
    steps = {step.name: step for step in all_steps()}
    for plan in shipped_plans():
        if plan.name in {
            "drive-pulse",
            "pulse-lines",
            "line-tracking",
            "resonance-tracking",
            "ringdown",
            "drive-linearity",
        }:
            for each in plan.step:
                assert set(each.take) <= set(steps[each.use].takes)
                assert set(each.give) <= set(steps[each.use].yields)
