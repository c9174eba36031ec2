"""A film in porous glass, invented: coherence length, the singularity that goes with it, and the bound of a heat capacity."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from archive.physics.film_static import STIFFNESS_UNIT
from archive.physics.porous_singularity import expected_amplitude, mean_shape
from archive.reduction.estimate import Estimate
from archive.reduction.film_steps import DensityParameters
from archive.reduction.planning import plans_for
from archive.reduction.porous_heat_steps import (
    BoundParameters,
    SingularityParameters,
    heat_capacity_singularity,
    singularity_bound,
)
from archive.reduction.porous_steps import ExpectedParameters, coherence_length, expected_singularity
from schemas.quantity import Quantity

TC, AMPLITUDE, ZETA = 0.30, 2.0e-8, 0.6717
AREA, VOLUME, PORE = 1.5, 0.1e-6, 7e-9
DENSITY = AMPLITUDE * AREA / VOLUME * 0.9
LENGTH = STIFFNESS_UNIT * TC / DENSITY
EXPECTED = float(expected_amplitude(LENGTH)) * VOLUME
NOISE = 2e-8


def _laboratory(tools: Any, *, singular: float, with_volume: bool = True) -> Any:
    """Return the laboratory with porous glass in place of the disc, and a heat capacity at the same filling."""
    rng = np.random.default_rng(4)
    content, data = tools.sheet_content(), tools.sweep_data()
    heat = {
        "resistance": {"column": "R", "quantity": "resistance", "unit": "kOhm", "uncertainty": "0.003 %", "thermometer": "RX-1", "calibration": "RX-1-cal"},
        "heat": {"column": "C", "quantity": "heat_capacity", "unit": "uJ/K", "uncertainty": "0.02 uJ/K"},
    }  # fmt: skip
    content["sweep"].append(
        {
            "name": "h1", "kind": "heat-capacity", "files": ["h1.csv"], "cell": "TO-1", "thermometer": "resistance", "after_dose": content["sweep"][2]["after_dose"],
            "channels": heat,
        }
    )  # fmt: skip
    T = np.linspace(0.12, 0.5, 1200)
    sigma = AMPLITUDE * np.maximum(1 - T / TC, 0.0) ** ZETA
    period, loss = tools.empty(T)
    period = period + tools.truth["slope"] * 16 * tools.truth["dose"] - 0.042 * 0.9 * sigma
    data["f1"] = {
        "resistance": tools.reading(T), "period": (period + 3e-12 * rng.normal(size=T.size)) * 1e3, "dissipation": loss + 2e-9 * rng.normal(size=T.size),
    }  # fmt: skip
    T = TC * (1 + np.linspace(-0.11, 0.11, 200))
    t = T / TC - 1
    C = 5e-6 * (1 + 1.5 * t - 0.8 * t**2) + singular * mean_shape(t, width=0.22 / 200)
    data["h1"] = {"resistance": tools.reading(T), "heat": (C + NOISE * rng.normal(size=T.size)) * 1e6}
    source = tools.build(content, data)
    more = {"pore_diameter": Quantity.parse("7.0(5) nm", "length")}
    if with_volume:
        more["volume"] = Quantity.parse("0.1000(5) cm^3", "volume")
    source.records["disc.r1"] = source.records["disc.r1"].model_copy(update=more)
    source.reduce("empty-cell", "2026-03/e1")
    source.reduce("dose-run", "2026-03/r1")
    return source


def result(outcome: Any, name: str) -> tuple[float | None, float, str | None]:
    """Value, uncertainty and verdict of a result."""
    (found,) = [each for each in outcome.document.outputs if each.name == name]
    return found.value, found.uncertainty or 0.0, found.verdict


@pytest.fixture(scope="module")
def porous(tools: Any) -> Any:
    """Give the laboratory with the film reduced and a singularity of the expected size times two hundred."""
    source = _laboratory(tools, singular=200 * EXPECTED)
    source.reduce("porous-film", "2026-03/f1")
    source.reduce("porous-heat-capacity", "2026-03/h1")
    return source


def test_the_truth_of_the_film_is_recovered(porous: Any) -> None:
    film = next(each for each in porous.done if each.document.plan.name == "porous-film")
    for name, truth in (
        ("T_c", TC), ("exponent", ZETA), ("coherence_length", LENGTH), ("density_amplitude", DENSITY), ("expected_singularity", EXPECTED),
    ):  # fmt: skip
        value, u, _ = result(film, name)
        assert value is not None
        assert abs(value - truth) < 3.5 * u, name
        assert u < 0.2 * truth, name
    # The area is in the areal density and out of the length again; what the volume brings stays.
    shared = {each.name: each.shared for each in film.document.outputs}
    assert "disc.r1 area" in shared["amplitude_of_power_law"]
    length = result(film, "coherence_length")[0] or 0.0
    assert abs(shared["coherence_length"].get("disc.r1 area", 0.0)) < 1e-3 * length
    assert shared["coherence_length"]["disc.r1 volume"] / length == pytest.approx(0.005, rel=0.01)


def test_a_singularity_that_is_there_is_found(porous: Any) -> None:
    heat = porous.done[-1]
    value, u, _ = result(heat, "singularity")
    assert value is not None
    assert abs(value - 200 * EXPECTED) < 3.5 * u
    assert value > 5 * u
    bound = result(heat, "bound")[0] or 0.0
    assert value < bound < value + 3 * u
    over, _, _ = result(heat, "bound_over_expected")
    assert over == pytest.approx(
        bound / (result(porous.done[-2], "expected_singularity")[0] or 0.0), rel=1e-9
    )


def test_without_one_the_scatter_sets_a_bound(tools: Any) -> None:
    source = _laboratory(tools, singular=0.0)
    film = source.reduce("porous-film", "2026-03/f1")
    heat = source.reduce("porous-heat-capacity", "2026-03/h1")
    value, u, _ = result(heat, "singularity")
    assert value is not None
    assert abs(value) < 3.5 * u
    bound, own, _ = result(heat, "bound")
    assert bound is not None
    assert 0 < bound < 5 * u
    # The uncertainty of the amplitude is in the bound already.
    assert own == 0
    assert result(heat, "scatter")[0] == pytest.approx(NOISE, rel=0.15)
    # Bulk liquid: 5.6537 J/(mol K) in 27.38 cm^3/mol.
    assert result(heat, "bound_over_bulk")[0] == pytest.approx(bound / VOLUME / (5.6537 / 27.38e-6), rel=1e-3)
    assert "2026-03/f1@porous-film.1#T_c" in {entry.address for entry in heat.document.inputs}
    assert "times smaller than that of bulk liquid" in film.document.steps[-1].sentence


def test_another_filling_is_not_taken(tools: Any) -> None:
    source = _laboratory(tools, singular=0.0)
    source.reduce("porous-film", "2026-03/f1")
    accession = source.documents["2026-03"][0]
    sweeps = tuple(
        each.model_copy(update={"after_dose": "d15"}) if each.name == "h1" else each
        for each in accession.sweeps
    )
    source.documents["2026-03"][0] = accession.model_copy(update={"sweeps": sweeps})
    with pytest.raises(Exception, match="no film at the same filling is reduced"):
        source.reduce("porous-heat-capacity", "2026-03/h1")


def test_without_the_volume_there_is_no_length(tools: Any) -> None:
    source = _laboratory(tools, singular=0.0, with_volume=False)
    film = source.reduce("porous-film", "2026-03/f1")
    assert "coherence_length" not in {each.name for each in film.document.outputs}
    told = " ".join(each.what for each in film.document.findings)
    assert "no substrate states volume" in told
    heat = source.reduce("porous-heat-capacity", "2026-03/h1")
    assert result(heat, "bound_over_expected")[2] == "no coherence length at this filling"
    assert result(heat, "bound_over_bulk")[2] == "no volume of the sample is recorded"


def test_which_heat_capacities_are_whose(porous: Any) -> None:
    accession = porous.documents["2026-03"][0]
    sweep = next(each for each in accession.sheet.sweep if each.name == "h1")
    cell, glass = porous.records["TO-1.r1"], porous.records["disc.r1"]
    assert [plan.name for plan in plans_for(sweep, cell, glass)] == ["porous-heat-capacity"]
    calorimeter = cell.model_copy(update={"kind": "calorimeter"})
    assert [plan.name for plan in plans_for(sweep, calorimeter, glass)] == ["porous-heat-capacity"]
    bulk = calorimeter.model_copy(update={"substrate": None})
    assert [plan.name for plan in plans_for(sweep, bulk, None)] == ["heat-capacity"]


def _length(**more: Any) -> Any:
    given: dict[str, Any] = {
        "transition": 0.1, "amplitude": 1e-8, "exponent": 2 / 3, "area": 100.0, "volume": 1e-6, "slope_below": 10.0, "slope_past": 5.0, "pore_diameter": 7e-9,
    }  # fmt: skip
    return coherence_length(DensityParameters(), **(given | more))


def test_the_length_by_hand() -> None:
    # 1e-8 kg/m^2 on 100 m^2 in 1 cm^3, half of it dragged: 0.5 kg/m^3; xi = 548.421 T/rho_s angstrom = 109.684 angstrom.
    found = _length()
    assert float(found.outputs["density"]) == pytest.approx(0.5, rel=1e-12)
    assert float(found.outputs["length"]) == pytest.approx(109.684e-10, rel=1e-5)
    assert float(found.outputs["crossover"]) == 1.0
    assert found.findings == ()
    # A length of 0.11 nm in pores of 7 nm equals them at (0.0157)^(3/2) = 1.96e-3.
    short = _length(amplitude=1e-6)
    assert float(short.outputs["crossover"]) == pytest.approx(1.96e-3, rel=5e-3)
    assert [finding.code for finding in short.findings] == ["coherence-length-below-pores"]
    assert _length(pore_diameter=None).verdicts == {"crossover": "no pore diameter is recorded"}


@pytest.mark.parametrize(
    ("more", "words"), [({"volume": 0.0}, "volume"), ({"slope_past": None}, "no dose run gives chi")]
)
def test_what_no_length_can_be_made_of(more: dict[str, Any], words: str) -> None:
    with pytest.raises(ValueError, match=words):
        _length(**more)


def test_the_expected_amplitude_carries_that_of_the_combination() -> None:
    found = expected_singularity(ExpectedParameters(), length=1e-8, volume=1e-6)
    # k_B (0.815/1e-8 m)^3 = 7.474 J/(K m^3); bulk 5.6537/27.38e-6 = 2.0649e5.
    assert float(found.outputs["amplitude"]) == pytest.approx(7.474e-6, rel=1e-3)
    assert float(found.outputs["ratio"]) == pytest.approx(7.474 / 2.0649e5, rel=2e-3)
    (part,) = found.shared["amplitude"].values()
    assert float(np.asarray(part)) / float(found.outputs["amplitude"]) == pytest.approx(
        3 * 0.010 / 0.815, rel=1e-12
    )


def test_a_transition_of_ones_own_or_none() -> None:
    T = np.linspace(0.27, 0.33, 60)
    common: dict[str, Any] = {
        "temperature": T, "heat_capacity": 1e-6 * T, "rise": None, "transition": None, "transition_estimate": None, "u_heat_capacity": None,
    }  # fmt: skip
    with pytest.raises(ValueError, match="transition_temperature_kelvin"):
        heat_capacity_singularity(SingularityParameters(), **common)
    found = heat_capacity_singularity(SingularityParameters(transition_temperature_kelvin=0.3), **common)
    assert abs(float(found.outputs["amplitude"])) < 1e-15


def test_a_bound_below_what_is_expected_is_told() -> None:
    common: dict[str, Any] = {"amplitude": 0.0, "amplitude_estimate": Estimate(np.asarray(0.0), "heat_capacity", shared={"noise": np.asarray(1e-9)})}  # fmt: skip
    small = singularity_bound(BoundParameters(), expected=1e-8, volume=None, **common)
    assert float(small.outputs["bound"]) == pytest.approx(1.96e-9, rel=1e-3)
    assert [finding.code for finding in small.findings] == ["singularity-smaller-than-expected"]
    assert singularity_bound(BoundParameters(), expected=1e-9, volume=None, **common).findings == ()
