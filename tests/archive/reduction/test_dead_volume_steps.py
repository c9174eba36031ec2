"""Dead volume and amount adsorbed: what is counted, what is asked for, what is warned of."""

from __future__ import annotations

import json
from typing import Any

import numpy as np
import pytest

from archive.physics.constants import GAS_CONSTANT
from archive.physics.helium_gas import molar_density
from archive.reduction.cell_gas import GasParameters
from archive.reduction.dead_volume_steps import adsorbed_amount, dead_volume_fit, saturated_pressure
from archive.reduction.estimate import Estimate
from archive.reduction.facts import GasBook
from archive.reduction.gas_steps import amount_from_doses
from archive.reduction.propagation import propagate
from archive.reduction.step import NoParameters
from schemas.gas import DeadVolume, Dose, Doser, Gauge
from schemas.substrate import Sample

HELIUM = Sample(name="gas", revision=1, isotope="4He", gas_source="invented")
NITROGEN = Sample(name="n2", revision=1, isotope="N2", gas_source="invented")
P = np.array([1e4, 2e4, 3e4, 4e4])


def book(*volumes: tuple[str, str]) -> GasBook:
    """Return a gas book with dead volumes: volume and temperature."""
    content = [
        {"name": f"v{k}", "volume": volume, "temperature": temperature}
        for k, (volume, temperature) in enumerate(volumes)
    ]
    return GasBook("2026-03", (), dead_volumes=tuple(DeadVolume.model_validate_json(json.dumps(each)) for each in content))  # fmt: skip


def fit(**more: Any) -> Any:
    """Return the fit of ideal-like expansions into 10 cm^3 at 295 K."""
    given: dict[str, Any] = {
        "amount": 10e-6 * P / (GAS_CONSTANT * 295.0), "pressure": P, "temperature": 295.0, "gas": book(), "sample": HELIUM, "u_pressure": None,
    }  # fmt: skip
    parameters = more.pop("parameters", GasParameters())
    return dead_volume_fit(parameters, **(given | more))


def adsorbed(**more: Any) -> Any:
    """Return the amount adsorbed from 1 mmol at each pressure."""
    given: dict[str, Any] = {
        "amount": np.full(4, 1e-3), "pressure": P, "temperature": 295.0, "volume": 10e-6, "gas": book(), "sample": HELIUM,
    }  # fmt: skip
    parameters = more.pop("parameters", GasParameters())
    return adsorbed_amount(parameters, **(given | more))


def test_the_second_virial_coefficient_counts() -> None:
    # p/(R T) is too much gas by B p/(R T): 1.9e-4 at 40 kPa with B = 11.86 cm^3/mol, weighted by pressure 1.6e-4.
    found = float(fit().outputs["volume"])
    assert found / 10e-6 - 1 == pytest.approx(1.6e-4, abs=3e-5)


def test_a_volume_with_its_own_temperature_is_taken_off_with_its_uncertainty() -> None:
    found = fit(gas=book(("2.00(5) cm^3", "295 K")))
    assert float(found.outputs["volume"]) == pytest.approx(8e-6, rel=3e-4)
    (name,) = [each.name for each in found.sources if each.name.startswith("dead volume")]
    # At the same temperature a larger one leaves as much less for the cell.
    assert float(found.shared["volume"][name]) == pytest.approx(-0.05e-6, rel=1e-6)


@pytest.mark.parametrize(
    ("change", "codes"),
    [
        pytest.param({}, [], id="none"),
        pytest.param({"amount": 1e-6 + 10e-6 * P / (GAS_CONSTANT * 295.0)}, ["expansions-not-proportional"], id="offset"),
        pytest.param({"gas": book(("12.0(1) cm^3", "cell"))}, ["dead-volume-differs"], id="another is stated"),
        pytest.param({"gas": book(("10.0(1) cm^3", "cell"))}, [], id="the same is stated"),
    ],
)  # fmt: skip
def test_what_is_said_of_a_dead_volume(change: dict[str, Any], codes: list[str]) -> None:
    assert [finding.code for finding in fit(**change).findings] == codes


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"sample": None}, "the gas of the run is not recorded"),
        ({"sample": NITROGEN}, "second virial coefficient of N2 is not known here"),
        ({"pressure": np.zeros(4)}, "no row has an amount"),
        ({"gas": book(("20 cm^3", "295 K"))}, "hold more gas than was admitted"),
    ],
    ids=["no gas", "no virial", "vacuum", "too large"],
)
def test_refused_expansions(change: dict[str, Any], words: str) -> None:
    with pytest.raises(ValueError, match=words):
        fit(**change)


def test_one_expansion_gives_a_volume_and_a_verdict() -> None:
    found = fit(amount=np.array([10e-6 * 1e4 / (GAS_CONSTANT * 295.0)]), pressure=np.array([1e4]))
    assert float(found.outputs["volume"]) == pytest.approx(10e-6, rel=1e-4)
    assert found.verdicts == {"offset": "fewer than three pressures"}


def test_the_gas_in_every_volume_is_taken_off() -> None:
    found = adsorbed(gas=book(("2.00(5) cm^3", "77.36 K"), ("9 cm^3", "cell")))
    # 10 cm^3 at 295 K as measured, in place of the 9 stated, and 2 cm^3 at 77.36 K; B changes this by 4e-4 at most.
    held = P / GAS_CONSTANT * (10e-6 / 295.0 + 2e-6 / 77.36)
    assert found.array("gas_amount") == pytest.approx(held, rel=5e-4)
    assert found.array("adsorbed") == pytest.approx(1e-3 - found.array("gas_amount"), rel=1e-12)
    part = found.shared["adsorbed"]["dead volume v0, 2.000(50) cm^3"]
    assert np.asarray(part) == pytest.approx(-0.05e-6 * P / (GAS_CONSTANT * 77.36), rel=8e-4)


def test_a_stated_cell_serves_where_none_was_measured() -> None:
    found = adsorbed(volume=None, gas=book(("9.0(3) cm^3", "cell")))
    assert found.facts["known_by"] == "the sheet"
    assert found.array("gas_amount") == pytest.approx(9e-6 * P / (GAS_CONSTANT * 295.0), rel=4e-4)
    assert "dead volume v0, 9.00(30) cm^3" in found.shared["gas_amount"]
    with pytest.raises(ValueError, match="no dead volume was measured or stated"):
        adsorbed(volume=None)


def test_another_gas_is_counted_with_the_coefficient_that_is_given() -> None:
    # B = -280(10) cm^3/mol at 77 K, a round figure for the test.
    parameters = GasParameters(second_virial_cm3_mol=-280.0, second_virial_uncertainty_cm3_mol=10.0)
    found = adsorbed(parameters=parameters, sample=NITROGEN, temperature=77.0)
    rho = found.array("gas_amount") / 10e-6
    assert GAS_CONSTANT * 77.0 * rho * (1 - 280e-6 * rho) == pytest.approx(P, rel=1e-12)
    part = np.asarray(found.shared["gas_amount"]["second virial coefficient of N2 near 77 K"])
    assert part == pytest.approx(-10e-6 * rho**2 / (1 - 560e-6 * rho) * 10e-6, rel=1e-2)


def test_gas_too_dense_for_the_equation_has_no_amount() -> None:
    found = adsorbed(temperature=4.2, pressure=np.array([1e4, 4e4, 6e4, np.nan]))
    assert np.isnan(found.array("adsorbed")).tolist() == [False, False, True, True]
    assert [finding.code for finding in found.findings] == ["gas-too-dense"]
    assert found.findings[0].what.startswith("1 of 4 rows")


def test_the_saturated_pressure_is_that_of_helium_alone() -> None:
    # ITS-90: 101325 Pa at 4.2221 K.
    found = saturated_pressure(NoParameters(), temperature=4.2221, sample=HELIUM)
    assert float(found.outputs["saturated_pressure"]) == pytest.approx(101325, rel=1e-4)
    for sample, words in ((None, "not recorded"), (NITROGEN, "found N2")):
        with pytest.raises(ValueError, match=words):
            saturated_pressure(NoParameters(), temperature=4.2, sample=sample)


def _expansions(rng: np.random.Generator) -> tuple[GasBook, np.ndarray, np.ndarray]:
    """Return the gas book of four expansions of an invented panel as its instruments read them, with times and pressures.

    Truth: 3 cm^3 at 77.36 K, and a doser, a capillary and a gauge that are off by draws of what the sheet states.
    """
    doser, capillary, gain = (
        50e-6 + 0.15e-6 * rng.normal(),
        12e-6 + 0.06e-6 * rng.normal(),
        1 + 2e-3 * rng.normal(),
    )
    full, cell, doses, pressures = 1.2e5, 0.0, [], []
    for k in range(4):
        # Ideal gas but for 1e-3: one linear balance, corrected once.
        warm, cold = doser + capillary, 3e-6 * 295.0 / 77.36
        p = (doser * full + (capillary + cold) * cell) / (warm + cold)
        for _ in range(2):
            gained = 3e-6 * (molar_density(p, 77.36) - molar_density(cell, 77.36)) + capillary * (
                molar_density(p, 295.0) - molar_density(cell, 295.0)
            )
            left = doser * (molar_density(full, 295.0) - molar_density(p, 295.0)) - gained
            p += float(left) * GAS_CONSTANT * 295.0 / (warm + cold)
        before, after = (gain * each + 3 * rng.normal() for each in (full, p))
        doses.append(
            {
                "name": f"d{k}", "at": f"2026-03-02T{10 + k}:00:00Z", "doser": "V1", "gauge": "G1", "pressure_before": f"{before:.3f} Pa",
                "pressure_after": f"{after:.3f} Pa", "temperature_before": "295.0 K",
            }
        )  # fmt: skip
        # The cell's own gauge is a good one.
        pressures.append(p + 3 * rng.normal())
        cell = p
    panel = GasBook(
        "2026-03", tuple(Dose.model_validate_json(json.dumps(each)) for each in doses),
        dosers=(Doser.model_validate_json('{"name": "V1", "volume": "50.00(15) cm^3", "how": "invented"}'),),
        gauges=(Gauge.model_validate_json('{"name": "G1", "range": "2 bar", "uncertainty": "3 Pa", "relative_uncertainty": 0.002}'),),
        dead_volumes=book(("12.00(6) cm^3", "295 K")).dead_volumes, during=tuple(each["name"] for each in doses),
    )  # fmt: skip
    times = np.array([each.at.timestamp() + 1800 for each in panel.doses])
    return panel, times, np.array(pressures)


@pytest.mark.no_cover
def test_pulls_of_a_dead_volume_with_all_that_is_shared() -> None:
    rng = np.random.default_rng(23)
    pulls = []
    for _ in range(200):
        panel, times, pressures = _expansions(rng)
        metered = amount_from_doses(NoParameters(), gas=panel, sample=HELIUM, time=times)
        inputs = {
            "amount": Estimate(metered.array("amount"), "amount", shared={n: np.asarray(p) for n, p in metered.shared["amount"].items()}),
            "pressure": Estimate(pressures, "pressure", point=np.full(4, 3.0)),
        }  # fmt: skip

        def call(values: Any, _: Any, panel: GasBook = panel) -> Any:
            return dead_volume_fit(GasParameters(), **values, temperature=77.36, gas=panel, sample=HELIUM, u_pressure=np.full(4, 3.0))  # fmt: skip

        found = propagate(call, inputs, elementwise=False)
        assert found.outcome.covariance is not None
        variance = sum(float(part) ** 2 for part in found.shared["volume"].values())
        u = np.sqrt(variance + found.outcome.covariance.matrix[0, 0])
        pulls.append((float(found.outcome.outputs["volume"]) - 3e-6) / u)
    assert np.mean(pulls) == pytest.approx(0, abs=4 / np.sqrt(200))
    assert np.std(pulls) == pytest.approx(1, abs=4 / np.sqrt(400))
