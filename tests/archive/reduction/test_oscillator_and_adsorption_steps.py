"""Steps of oscillators and isotherms, on invented and on open data."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from archive.reduction.adsorption_steps import (
    BetParameters,
    PlateauParameters,
    bet,
    plateau,
    relative_pressure,
)
from archive.reduction.oscillator_steps import (
    LinearityParameters,
    ResonanceParameters,
    RingdownParameters,
    dissipation_from_amplitude,
    drive_linearity,
    resonance_fit,
    ringdown_quality_factor,
)
from archive.reduction.step import NoParameters
from archive.reduction.sweep_steps import CorrectionParameters, corrected, inverted
from schemas.substrate import Sample
from schemas.sweep import Detection

REAL = Path(__file__).parents[2] / "real"


def _detection(**more: object) -> Detection:
    return Detection.model_validate_json(
        json.dumps({"torque_exponent": 1, "signal_exponent": 1, "amplitude_convention": "rms", **more})
    )


def test_dissipation_follows_the_amplitude_inversely() -> None:
    # (V/V_ref)^p (S_ref/S) (w/w_ref)^s / Q_ref by hand, with half the signal and a frequency 1 % higher.
    found = dissipation_from_amplitude(
        NoParameters(), amplitude=np.array([0.5, -1.0]), period=np.array([1e-3, 1e-3]), drive=2.0, detection=_detection(),
        reference_signal=1.0, reference_drive=1.0, reference_quality_factor=1e6, reference_period=1.01e-3,
    ).array("dissipation")  # fmt: skip
    assert found[0] == pytest.approx(1e-6 * 2 * 2 * 1.01, rel=1e-12)
    assert np.isnan(found[1])


def test_constant_amplitude_needs_the_drive() -> None:
    with pytest.raises(ValueError, match="the drive carries the dissipation"):
        dissipation_from_amplitude(
            NoParameters(), amplitude=np.array([1.0]), period=np.array([1e-3]), drive=None, detection=_detection(drive_mode="constant-amplitude"),
            reference_signal=1.0, reference_drive=None, reference_quality_factor=1e6, reference_period=1e-3,
        )  # fmt: skip


def test_the_ends_of_a_narrow_sweep_are_told_apart() -> None:
    # 20 mHz about 1 kHz, as Q = 4e5 needs; five digits would call both ends 1000.0 Hz.
    f = np.linspace(999.99, 1000.01, 81)
    line = -1j / (1 + 2j * 4e5 * (f - 1000.0) / 1000.0)
    noise = 1e-4 * np.random.default_rng(3).normal(size=(2, f.size))
    found = resonance_fit(
        ResonanceParameters(), frequency=f, x=line.real + noise[0], y=line.imag + noise[1], u_x=None
    )
    assert found.facts["range"] == "999.9900 Hz to 1000.0100 Hz"
    assert float(found.outputs["quality_factor"]) == pytest.approx(4e5, rel=2e-3)


def test_a_drive_that_changed_is_no_dissipation() -> None:
    common: dict[str, Any] = {
        "amplitude": np.array([1.0, 2.0]), "period": np.full(2, 1e-3), "detection": _detection(),
        "reference_signal": 1.0, "reference_drive": None, "reference_quality_factor": 1e6, "reference_period": 1e-3,
    }  # fmt: skip
    with pytest.raises(ValueError, match="reference_drive: none is recorded"):
        dissipation_from_amplitude(NoParameters(), drive=np.array([0.1, 0.2]), **common)
    found = dissipation_from_amplitude(NoParameters(), drive=np.array([0.1, 0.1001]), **common)
    assert found.array("dissipation") == pytest.approx([1e-6, 0.5e-6], rel=1e-12)


def test_a_ringdown_gives_back_its_quality_factor() -> None:
    random = np.random.default_rng(3)
    t = np.linspace(0, 600, 300)
    # tau = 159.155 s at 1 kHz is Q = 5e5.
    y = np.hypot(np.exp(-t / 159.155) + random.normal(0, 1e-3, t.size), 2e-3)
    found = ringdown_quality_factor(
        RingdownParameters(), time=t + 1.7e9, amplitude=y, period=1e-3, u_amplitude=np.full(t.size, 1e-3)
    )
    assert found.covariance is not None
    u = float(np.sqrt(found.covariance.matrix[0, 0]))
    assert abs(float(found.outputs["quality_factor"]) - 5e5) < 4 * u
    assert u < 5e3
    assert float(found.outputs["decay_time"]) == pytest.approx(
        float(found.outputs["quality_factor"]) / (np.pi * 1e3), rel=1e-12
    )


def test_linearity_is_measured_against_the_torque() -> None:
    drive = np.array([1.0, 2.0, 3.0, 4.0])
    square = drive_linearity(
        LinearityParameters(),
        drive=drive,
        amplitude=5 * drive**2,
        period=1e-3 + 1e-9 * drive,
        detection=_detection(torque_exponent=2),
        u_amplitude=None,
        u_period=np.full(4, 1e-11),
    )
    assert float(square.outputs["departure"]) == pytest.approx(0.0, abs=1e-12)
    assert [finding.code for finding in square.findings] == ["amplitude-dependent-period"]
    bent = drive_linearity(
        LinearityParameters(),
        drive=drive,
        amplitude=5 * drive**2,
        period=None,
        detection=_detection(),
        u_amplitude=None,
        u_period=None,
    )
    assert [finding.code for finding in bent.findings] == ["drive-not-linear"]
    with pytest.raises(ValueError, match="at least 3"):
        drive_linearity(
            LinearityParameters(),
            drive=np.ones(4),
            amplitude=np.ones(4),
            period=None,
            detection=None,
            u_amplitude=None,
            u_period=None,
        )


@pytest.mark.parametrize(
    ("number", "found"), [(0, False), (3, False), (10, True)], ids=["data_0", "data_3", "data_10"]
)
def test_open_resonator_sweeps_give_a_number_or_a_verdict(number: int, found: bool) -> None:  # noqa: FBT001
    f, x, y = np.loadtxt(REAL / "superfluid-resonator-sweeps" / f"data_{number}.txt", unpack=True)
    outcome = resonance_fit(ResonanceParameters(), frequency=f, x=x, y=y, u_x=None)
    assert (outcome.verdicts.get("resonance_frequency") is None) is found
    assert np.isfinite(float(outcome.outputs["resonance_frequency"])) == found


def test_open_isotherm_gives_its_monolayer_and_plateau() -> None:
    # SOURCE.md of the data: monolayer 10.2 mmol/g, C about 210, plateau mean 12.93 mmol/g over 0.3 < P/P0 < 0.7.
    x, n = np.loadtxt(REAL / "he4-ar-mcm41-isotherms" / "Sokol_He_Ar_MCM41_Isotherm.dat", unpack=True)
    helium = Sample(name="helium", revision=1, isotope="4He", gas_source="not recorded")
    asked = bet(BetParameters(), relative_pressure=x, amount=n, amount_kind="specific_amount", sample=helium)
    assert np.isnan(float(asked.outputs["area"]))
    assert asked.verdicts == {"area": "area per molecule not given"}
    assert "cross-section-asked" in {finding.code for finding in asked.findings}
    assert float(asked.outputs["monolayer"]) == pytest.approx(10.2, abs=0.25)
    found = bet(
        BetParameters(cross_section_nm2=0.0847, low=0.02, high=0.15),
        relative_pressure=x,
        amount=n,
        amount_kind="specific_amount",
        sample=helium,
    )
    assert float(found.outputs["monolayer"]) == pytest.approx(10.2, abs=0.1)
    assert float(found.outputs["constant"]) == pytest.approx(210, abs=10)
    assert found.facts["label"] == "He-BET"
    assert found.findings[0].code == "helium-bet"
    assert float(
        plateau(PlateauParameters(), relative_pressure=x, amount=n).outputs["plateau_amount"]
    ) == pytest.approx(12.93, abs=0.01)


def test_the_published_bet_example_and_its_counterexample() -> None:
    # Unweighted line of the worked example: n_m = 0.999989 mmol/g, A = 97.5576 m^2/g.
    x = np.array([0.05, 0.10, 0.15, 0.20, 0.25, 0.30])
    n = np.array([0.8846, 1.0194, 1.1134, 1.2019, 1.2945, 1.3960])
    nitrogen = Sample(name="nitrogen", revision=1, isotope="N2", gas_source="cylinder")
    common: dict[str, Any] = {"relative_pressure": x, "amount_kind": "specific_amount", "sample": nitrogen}
    found = bet(BetParameters(nitrogen_nm2=0.162, argon_nm2=0.142), amount=n, **common)
    assert float(found.outputs["area"]) == pytest.approx(97.5576e3, rel=1e-5)
    # Nothing is assumed, not even for nitrogen; what the record of the gas states goes before the convention.
    asked = bet(BetParameters(argon_nm2=0.142), amount=n, **common)
    assert np.isnan(float(asked.outputs["area"]))
    assert [finding.code for finding in asked.findings] == ["cross-section-asked"]
    flat = bet(BetParameters(nitrogen_nm2=0.162), amount=n, cross_section=0.135e-18, **common)
    assert float(flat.outputs["area"]) == pytest.approx(97.5576e3 * 0.135 / 0.162, rel=1e-5)
    falling = np.array([0.8580, 0.9582, 1.0132, 1.0577, 1.1003, 1.1447])
    with pytest.raises(ValueError, match="no BET line"):
        bet(
            BetParameters(),
            relative_pressure=x,
            amount=falling,
            amount_kind="specific_amount",
            sample=nitrogen,
        )


@pytest.mark.parametrize(
    ("reached", "said"), [(0.9, "rises by 76%"), (0.25, "has 0 points there")], ids=["rises", "ends before"]
)
def test_what_rises_or_ends_before_is_no_plateau(reached: float, said: str) -> None:
    x = np.linspace(0.1, reached, 20)
    # From 0.311 to 0.689 about a mean of 0.5, where the amount is the pressure.
    found = plateau(PlateauParameters(), relative_pressure=x, amount=x)
    assert found.verdicts == {"plateau_amount": "no plateau"}
    assert np.isnan(found.outputs["plateau_amount"])
    (note,) = found.findings
    assert note.severity == "note"
    assert said in note.what


def test_a_saturated_pressure_is_above_nought() -> None:
    x = np.linspace(0.1, 0.9, 20)
    with pytest.raises(ValueError, match="not above 0"):
        relative_pressure(NoParameters(), pressure=x, saturated_pressure=0.0)


@pytest.mark.parametrize(
    ("correct", "kind", "correction", "expected"),
    [
        pytest.param("zero", "pressure", 0.5, 1.5, id="zero"),
        pytest.param("gain", "pressure", 2.0, 1.0, id="gain"),
        pytest.param("clock", "time", 3600.0, 3602.0, id="clock"),
        pytest.param("phase", "phase", 0.1, 1.9, id="phase of a phase"),
        pytest.param("phase", "amplitude", np.pi / 3, 4.0, id="phase of an amplitude"),
    ],
)
def test_corrections_are_what_the_sheet_says(
    correct: str, kind: str, correction: float, expected: float
) -> None:
    parameters = CorrectionParameters.model_validate(
        {"correct": correct, "stated": "x", "known": "measured: test"}
    )
    assert corrected(parameters, values=np.array([2.0]), correction=correction, values_kind=kind).array(
        "values"
    )[0] == pytest.approx(expected)


@pytest.mark.parametrize(
    ("correct", "kind", "correction", "words"),
    [
        pytest.param("gain", "pressure", 0.0, "gain of 0", id="no gain"),
        pytest.param("phase", "period", 0.1, "acts on a phase or an amplitude", id="phase of a period"),
        pytest.param("phase", "amplitude", 2.0, "less than a quarter turn", id="more than a quarter turn"),
    ],
)
def test_corrections_that_make_no_sense_are_refused(
    correct: str, kind: str, correction: float, words: str
) -> None:
    parameters = CorrectionParameters.model_validate(
        {"correct": correct, "stated": "x", "known": "measured: test"}
    )
    with pytest.raises(ValueError, match=words):
        corrected(parameters, values=np.array([2.0]), correction=correction, values_kind=kind)


def test_the_inverse_of_nothing_is_no_number() -> None:
    inverse = inverted(NoParameters(), values=np.array([0.0, 1000.0, np.nan])).array("inverse")
    assert inverse[1] == 1e-3
    assert np.isnan(inverse[[0, 2]]).all()
