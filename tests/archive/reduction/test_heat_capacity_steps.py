"""Steps of the heat capacity: pulses, addenda, the law with its range dependence, gravity."""

from __future__ import annotations

import numpy as np
import pytest

from archive.demo.bulk_cooldowns import pulse_begins
from archive.demo.bulk_truth import BULK, pulse_readings
from archive.physics.constants import T_LAMBDA
from archive.reduction.heat_capacity_steps import HEAT_CAPACITY_STEPS, molar, pulses
from archive.reduction.lambda_law import LambdaLawParameters, lambda_law
from archive.reduction.step import NoParameters
from archive.reduction.steps import STEPS


def run(seed, **parameters):
    """Return pulses and law of a run of the invented calorimeter, its empty cell known exactly."""
    begin, rise = pulse_begins()
    power, read = pulse_readings(begin, rise, filled=True, random=np.random.default_rng(seed))
    first = pulses(NoParameters(), before=begin, rise=read, power=power, duration=20.0, drift=None)
    T = first.array("temperature")
    C = (first.array("heat_capacity") - np.polynomial.Polynomial(BULK.addenda)(T)) / BULK.amount
    relative = np.hypot(BULK.rise_noise, BULK.rise_share * rise) / rise
    return lambda_law(
        LambdaLawParameters(**parameters), temperature=T, molar_heat_capacity=C, rise=read, limit=1.75e-7,
        u_molar_heat_capacity=relative * first.array("heat_capacity") / BULK.amount, u_temperature=None,
    )  # fmt: skip


def test_every_step_is_in_the_list():
    assert {step.name for step in HEAT_CAPACITY_STEPS} <= {step.name for step in STEPS}


@pytest.mark.slow
@pytest.mark.no_cover
def test_pulls():
    """200 runs: exponent, amplitudes, constant and asymmetry lie where their uncertainties say, through pulses and gravity."""
    law = BULK.law
    truth = {
        "exponent": law.exponent, "amplitude_below": law.amplitude, "amplitude_above": law.amplitude * law.amplitude_ratio, "amplitude_ratio": law.amplitude_ratio, "constant": law.constant,
        "background": law.background, "asymmetry": law.asymmetry,
        # a and b of J. A. Lipa et al., Physical Review B 68, 174518 (2003), as the simulated liquid has them (from memory).
        "first_correction": -0.0157, "second_correction": 0.3311,
    }  # fmt: skip
    pulls = []
    for seed in range(200):
        found = run(seed, lambda_temperature_kelvin=T_LAMBDA, highs=())
        spread = dict(zip(found.covariance.names, np.sqrt(np.diag(found.covariance.matrix)), strict=True))
        pulls.append([(float(found.outputs[name]) - value) / spread[name] for name, value in truth.items()])
    assert np.abs(np.mean(pulls, axis=0)).max() < 4 / np.sqrt(200)
    assert np.abs(np.std(pulls, axis=0) - 1).max() < 4 / np.sqrt(2 * 200)


def test_the_covariance_holds_the_great_terms():
    """B and A/alpha are nearly equal and opposite; their sum is known a hundred times better than either."""
    found = run(7)
    names = found.covariance.names
    spread = dict(zip(names, np.sqrt(np.diag(found.covariance.matrix)), strict=True))
    assert spread["background"] > 30 * spread["constant"]
    correlation = found.covariance.matrix[names.index("background"), names.index("exponent")] / (
        spread["background"] * spread["exponent"]
    )
    assert abs(correlation) > 0.98


def test_transition_is_fitted_and_the_range_shown():
    found = run(3)
    names = found.covariance.names
    index = names.index("lambda_temperature")
    u = float(np.sqrt(found.covariance.matrix[index, index]))
    assert abs(float(found.outputs["lambda_temperature"]) - T_LAMBDA) < 4 * u
    assert u < 1e-7
    np.testing.assert_array_equal(found.array("range_upper"), [1e-3, 3e-3, 1e-2])
    spread = np.asarray(found.point["range_exponent"])
    assert np.all(np.abs(found.array("range_exponent") - BULK.law.exponent) < 4 * spread)
    assert spread[0] > spread[2]
    assert float(found.outputs["logarithm_probability"]) < 1e-6
    assert found.findings == ()


def test_held_rows_give_the_same_numbers():
    """What is held while inputs are shifted leads to the same result where nothing is shifted."""
    first = run(3)
    again = run(3, **first.held)
    for name, value in first.outputs.items():
        np.testing.assert_allclose(again.array(name), value, rtol=1e-6, err_msg=name)


def test_the_chance_of_the_readings_is_not_drawn():
    """With what is held, other readings give another law and the same chance: it has no uncertainty of its own."""
    first = run(3)
    other = run(4, **first.held)
    assert other.outputs["logarithm_probability"] == first.outputs["logarithm_probability"]
    assert other.outputs["exponent"] != first.outputs["exponent"]


def test_gravity_keeps_rows_out_and_is_averaged():
    begin, rise = pulse_begins()
    T = begin + rise / 2
    t = np.abs(1 - T / T_LAMBDA)
    C = BULK.law.value(t, below=T_LAMBDA > T)
    found = lambda_law(
        LambdaLawParameters(lambda_temperature_kelvin=T_LAMBDA), temperature=T, molar_heat_capacity=C, rise=None, limit=2e-6,
        u_molar_heat_capacity=np.full(T.size, 1e-2), u_temperature=None,
    )  # fmt: skip
    assert [finding.code for finding in found.findings] == ["gravity-limit"]
    kept = np.array([*found.held["rows_below"], *found.held["rows_above"]]) - 1
    assert t[kept].min() > 2e-6
    assert kept.size == np.count_nonzero((t > 2e-6) & (t < 1e-2))
    assert found.facts["gravity"] == "over each step and the height of the cell"


def test_a_logarithm_is_said_to_serve():
    """Sparse rows of 1 per cent noise do not tell an exponent from a logarithm, and the height is not known."""
    t = np.geomspace(1e-4, 5e-3, 14)
    T = T_LAMBDA * np.concatenate([1 - t, 1 + t])
    C = -5.4 * np.log(np.abs(1 - T / T_LAMBDA)) + 15 - 22 * (T_LAMBDA < T)
    u = 0.01 * C
    found = lambda_law(
        LambdaLawParameters(corrections=0, lambda_temperature_kelvin=T_LAMBDA), temperature=T,
        molar_heat_capacity=C + u * np.random.default_rng(1).standard_normal(T.size), rise=None, limit=None, u_molar_heat_capacity=u,
        u_temperature=None,
    )  # fmt: skip
    assert [finding.code for finding in found.findings] == ["gravity-not-known", "logarithm-not-excluded"]


def test_pulses_by_hand():
    """10 nW for 20 s in 0.5 mK is 0.4 mJ/K, in the middle of the step."""
    found = pulses(
        NoParameters(), before=np.array([2.0, 2.1]), rise=np.array([5e-4, -1e-6]), power=1e-8, duration=np.array([20.0, 20.0]), drift=None
    )  # fmt: skip
    assert found.array("heat_capacity")[0] == pytest.approx(4e-4, rel=1e-12)
    assert found.array("temperature")[0] == pytest.approx(2.00025, rel=1e-15)
    assert np.isnan(found.array("heat_capacity")[1])
    assert [finding.code for finding in found.findings] == ["pulse-without-rise"]


def test_addenda():
    """(5 - 1) J/K over 0.25 mol; beyond the addenda's range there is no value; without addenda a warning."""
    T, C = np.array([2.0, 3.0]), np.array([5.0, 5.0])
    found = molar(
        NoParameters(),
        temperature=T,
        heat_capacity=C,
        amount=0.25,
        addenda=np.array([1.0]),
        low=1.5,
        high=2.5,
    )
    assert found.array("molar_heat_capacity")[0] == 16.0
    assert np.isnan(found.array("molar_heat_capacity")[1])
    assert [finding.code for finding in found.findings] == ["outside-addenda"]
    bare = molar(
        NoParameters(), temperature=T, heat_capacity=C, amount=0.25, addenda=None, low=None, high=None
    )
    assert bare.array("molar_heat_capacity")[0] == 20.0
    assert [finding.code for finding in bare.findings] == ["addenda-not-subtracted"]


def test_no_helium_is_refused():
    with pytest.raises(ValueError, match="amount: found 0"):
        molar(
            NoParameters(), temperature=np.ones(1), heat_capacity=np.ones(1), amount=0.0, addenda=None, low=None, high=None
        )  # fmt: skip
