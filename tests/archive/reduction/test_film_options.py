"""Ways through the steps that the shipped plans take only with other sheets: gauges, alignments, missing inputs."""

from __future__ import annotations

import json
import math
from typing import Any

import numpy as np
import pytest

from archive.errors import BadRequest
from archive.reduction.background_steps import AlignmentParameters, period_drop
from archive.reduction.channels import channel_estimate
from archive.reduction.estimate import Estimate
from archive.reduction.facts import GasBook, sweep_facts
from archive.reduction.film_steps import (
    CrossingParameters,
    DensityParameters,
    superfluid_density,
    universal_crossing,
)
from archive.reduction.gas_steps import (
    ThicknessParameters,
    VapourParameters,
    coverage_from_amount,
    thickness_from_coverage,
    vapour_in_dead_volume,
)
from archive.reduction.loading_steps import LoadingParameters, geometric_sensitivity, loading_fit
from archive.reduction.peak_steps import PeakParameters, dissipation_peak
from archive.reduction.planning import load_plan
from archive.reduction.preparation import preliminary_steps
from archive.reduction.runner import run
from archive.reduction.sheet_values import sheet_value
from archive.reduction.step import NoParameters
from archive.reduction.steps import step_named
from archive.reduction.transition_steps import BEYOND, RatioParameters, universal_ratio
from schemas.gas import DeadVolume
from schemas.lineage import Value
from schemas.substrate import Sample


def test_a_gauge_is_zeroed_and_its_gain_is_one_source(tools: Any) -> None:
    content, data = tools.sheet_content(), tools.sweep_data()
    rows = data["f1"]["period"].size
    content["sweep"][2]["channels"] = {
        "pressure": {
            "column": "p",
            "quantity": "pressure",
            "unit": "Pa",
            "convention": "absolute",
            "gauge": "G1",
            "uncertainty": "0.1 Pa",
        }
    }
    data["f1"]["pressure"] = np.full(rows, 3.0)
    source = tools.build(content, data)
    source.reduce("empty-cell", "2026-03/e1")
    source.reduce("dose-run", "2026-03/r1")
    outcome = source.reduce("film-transition", "2026-03/f1")
    vapour = source.output("2026-03/f1@film-transition.1", "vapour")
    temperature = source.output("2026-03/f1@film-transition.1", "temperature")
    # 3 Pa read, 2 Pa zero: 1 Pa in 0.5 cm^3 at the cell's temperature, never below 0.5 K.
    expected = 0.5e-6 / (8.314462618 * np.maximum(temperature.value, 0.5))
    assert vapour.value == pytest.approx(expected, rel=2e-3)
    zero = vapour.shared["zero of gauge G1 in 2026-03"]
    assert zero == pytest.approx(-0.1 * expected, rel=0.01)
    # One gain, one sign: a gauge that reads low by a part in a thousand makes doses and vapour larger together (by hand).
    gain = "gain of gauge G1 in 2026-03"
    amount = source.output("2026-03/f1@film-transition.1", "amount")
    assert vapour.shared[gain] == pytest.approx(1e-3 * expected, rel=0.01)
    assert float(amount.shared[gain]) == pytest.approx(1e-3 * float(amount.value), rel=0.01)
    coverage = source.output("2026-03/f1@film-transition.1", "coverage").shared[gain]
    assert coverage == pytest.approx((amount.shared[gain] - vapour.shared[gain]) / 1.5, rel=1e-6)
    assert [step.name for step in outcome.document.steps].count("apply-correction") == 2


def test_a_correction_that_cannot_be_read_is_named(tools: Any) -> None:
    content = tools.sheet_content()
    content["sweep"][0]["corrections"] = [
        {"channel": "period", "correct": "zero", "value": "a little", "known": "assumed", "source": "x"}
    ]
    with pytest.raises(BadRequest, match="zero correction of channel period"):
        tools.build(content).reduce("empty-cell", "2026-03/e1")


def test_a_range_that_cannot_be_read_is_named(tools: Any) -> None:
    content = tools.sheet_content()
    content["sweep"][0]["left_out"] = [{"channel": "period", "low": "3 K", "reason": "wrong kind"}]
    with pytest.raises(BadRequest, match="range left out of channel period"):
        tools.build(content).reduce("empty-cell", "2026-03/e1")


def test_a_range_on_another_scale_is_not_read_as_one_on_the_channels(tools: Any) -> None:
    content, data = tools.sheet_content(), tools.sweep_data()
    channel = {"column": "T", "quantity": "temperature", "unit": "K", "scale": "ITS-90"}
    content["sweep"][0] |= {
        "channels": {"stage": channel},
        "left_out": [{"channel": "stage", "high": "0.2 K on PLTS-2000", "reason": "not settled"}],
    }
    data["e1"]["stage"] = np.linspace(0.1, 1.1, data["e1"]["period"].size)
    with pytest.raises(BadRequest, match="it is on PLTS-2000, and the channel is on ITS-90"):
        tools.build(content, data).reduce("empty-cell", "2026-03/e1")


@pytest.mark.parametrize(
    ("take", "words"),
    [
        pytest.param('"channel:@pressure"', "no channel of kind pressure", id="a channel"),
        pytest.param('"channel:missing"', "no channel missing", id="a channel by name"),
        pytest.param('"sheet:cell.gap"', "no cell states gap (TO-1.r1)", id="a field of a record"),
        pytest.param('"sheet:sweep.rate"', "the sheet states no sweep.rate", id="a field of the sweep"),
    ],
)
def test_a_missing_input_says_what_and_where(laboratory: Any, tools: Any, take: str, words: str) -> None:
    text = f"""
        name = "mine"
        revision = 1
        title = "mine"
        [applies]
        sweep_kinds = ["temperature-sweep"]
        [[step]]
        use = "relative-pressure"
        take = {{ pressure = {take}, saturated_pressure = "channel:@period" }}
    """
    with pytest.raises(BadRequest) as caught:
        run(load_plan(text), "2026-03/e1", laboratory, number=1, clock=tools.Clock())
    assert words in str(caught.value)
    assert caught.value.remedy


@pytest.mark.parametrize(
    ("step", "take", "words"),
    [
        pytest.param(
            "relative-pressure",
            'pressure = "channel:@period", saturated_pressure = "channel:@period"',
            "is a period; expected a pressure",
            id="another kind",
        ),
        pytest.param(
            "coverage-from-amount",
            'amount = "sheet:substrate.area"',
            "is an area; expected an amount",
            id="a number of another kind",
        ),
        pytest.param(
            "relative-pressure",
            'pressure = "sheet:cell", saturated_pressure = "channel:@period"',
            "is no number",
            id="a record for a number",
        ),
        pytest.param(
            "relative-pressure",
            'nothing = "channel:@period"',
            "has no input 'nothing'",
            id="an input that is none",
        ),
        pytest.param(
            "relative-pressure", 'pressure = "file:@period"', "file:@period", id="a source that is none"
        ),
    ],
)
def test_an_input_of_a_wrong_kind_is_refused(
    laboratory: Any, tools: Any, step: str, take: str, words: str
) -> None:
    text = f'name = "mine"\nrevision = 1\ntitle = "mine"\n[applies]\nsweep_kinds = ["temperature-sweep"]\n[[step]]\nuse = "{step}"\ntake = {{ {take} }}'
    with pytest.raises(BadRequest) as caught:
        run(load_plan(text), "2026-03/e1", laboratory, number=1, clock=tools.Clock())
    assert words in str(caught.value)


def test_amount_and_coverage_of_the_accession_are_values_of_the_sheet(tools: Any) -> None:
    source = tools.build()
    document = source.documents["2026-03"][0]
    sweeps = list(document.sweeps)
    sweeps[2] = sweeps[2].model_copy(update={"coverage": Value(value=30.0, uncertainty=0.6, unit="umol/m^2")})
    source.documents["2026-03"] = [document.model_copy(update={"sweeps": tuple(sweeps)})]
    facts = sweep_facts(source, "2026-03/f1")
    coverage, sources, _ = sheet_value(facts, "coverage")
    assert float(coverage.value) == pytest.approx(30e-6)  # type: ignore[union-attr]
    assert float(coverage.uncertainty) == pytest.approx(0.6e-6)  # type: ignore[union-attr]
    assert [entry.name for entry in sources] == ["2026-03/f1 coverage"]
    assert sheet_value(facts, "amount")[0] is None


def _drop(parameters: AlignmentParameters, peak: float | None = None) -> Any:
    T = np.linspace(0.3, 0.9, 200)
    drop = 1e-9 * np.sqrt(np.clip((0.6 - T) * 10, 0, 1))
    return period_drop(
        parameters, temperature=T, period=1e-3 + 5e-9 - drop, background=np.array([1e-3]), low=0.2, high=1.0, peak=peak,
        u_period=np.full(200, 1e-12), u_temperature=None,
    )  # fmt: skip


def test_alignment_above_the_transition_finds_the_constant() -> None:
    # The mass of the film raises the period by 5 ns; the drop is zero above 0.6 K.
    for found in (_drop(AlignmentParameters()), _drop(AlignmentParameters(), peak=0.6)):
        assert float(found.outputs["shift"]) == pytest.approx(5e-9, abs=1e-15)
        assert found.array("period_drop")[0] == pytest.approx(1e-9, rel=1e-6)


def test_the_scatter_of_an_alignment_is_that_of_its_mean() -> None:
    """Without a stated uncertainty: the standard deviation of the rows over the root of their number, by numpy."""
    T = np.linspace(0.3, 0.9, 200)
    noise = 1e-12 * np.random.default_rng(6).normal(size=200)
    rows = tuple(range(151, 201))
    found = period_drop(
        AlignmentParameters(rows=rows), temperature=T, period=1e-3 + noise, background=np.array([1e-3]), low=0.2, high=1.0, peak=None,
        u_period=None, u_temperature=None,
    )  # fmt: skip
    expected = np.std(noise[150:], ddof=1) / np.sqrt(50)
    assert float(found.shared["shift"]["own alignment"]) == pytest.approx(expected, rel=1e-6)


def test_alignment_at_the_coldest_rows_forces_zero_there() -> None:
    found = _drop(AlignmentParameters(align="coldest"))
    assert found.array("period_drop")[0] == pytest.approx(0.0, abs=1e-15)
    assert found.findings[0].code == "negative-period-drop"


@pytest.mark.parametrize(
    ("rows", "words"),
    [
        pytest.param((0, 1, 2, 3, 4), "expected 1 to 200", id="row 0 is not the last row"),
        pytest.param((197, 198, 199, 200, 201), "expected 1 to 200", id="beyond the end"),
        pytest.param((150, 151), "at least 5", id="too few to state an uncertainty"),
    ],
)
def test_alignment_rows_that_there_are_not_are_refused(rows: tuple[int, ...], words: str) -> None:
    with pytest.raises(ValueError, match=words):
        _drop(AlignmentParameters(rows=rows))


def test_the_alignment_says_which_rows_it_rests_on() -> None:
    # 200 rows from 0.3 K to 0.9 K: 1.1 to 1.6 times 0.6 K asks for 0.66 K to 0.96 K, and the record ends at 0.9 K.
    found = _drop(AlignmentParameters(high=1.6), peak=0.6)
    assert str(found.facts["aligned"]).startswith("the shift makes the mean drop zero above the transition")
    assert str(found.facts["aligned"]).endswith("K to 0.9 K)")
    named = _drop(AlignmentParameters(rows=(150, 151, 152, 153, 154)))
    assert "over the rows named in the plan (5 rows from" in str(named.facts["aligned"])


def test_a_temperature_counts_once_in_the_crossing() -> None:
    # By hand: a drop of 10 ns/K and 1 mK make 10 ps. It is in the drop, so the crossing must not add it again.
    T = np.linspace(0.3, 0.9, 200)
    drop = 1e-8 * np.clip(0.6 - T, 0, None)
    found = period_drop(
        AlignmentParameters(), temperature=T, period=1e-3 - drop, background=np.array([1e-3]), low=0.2, high=1.0, peak=0.6,
        u_period=np.full(200, 1e-12), u_temperature=np.full(200, 1e-3),
    )  # fmt: skip
    assert np.asarray(found.point["period_drop"])[50] == pytest.approx(np.hypot(1e-11, 1e-12), rel=1e-3)
    assert step_named("universal-crossing").weights == ("superfluid_density",)


def test_a_zero_is_read_on_the_channels_own_scale(tools: Any) -> None:
    content, data = tools.sheet_content(), tools.sweep_data()
    content["sweep"][0]["channels"] = {
        "signal": {"column": "V", "quantity": "voltage", "unit": "mV", "convention": "peak"}
    }
    content["sweep"][0]["corrections"] = [
        {
            "channel": "signal",
            "correct": "zero",
            "value": "0.2(1) mV",
            "known": "measured",
            "source": "drive off",
        }
    ]
    data["e1"]["signal"] = np.full(data["e1"]["period"].size, 1.0)
    source = tools.build(content, data)
    facts = sweep_facts(source, "2026-03/e1")
    values, _ = channel_estimate(source, facts, "signal")
    correction = preliminary_steps(source, facts, "signal")[-1].correction
    assert correction is not None
    # 1.0 mV peak less 0.2 mV peak is 0.8 mV peak, over the square root of two as rms.
    assert values.value[0] - float(correction.value) == pytest.approx(0.8e-3 / np.sqrt(2), rel=1e-9)
    assert float(correction.uncertainty) == pytest.approx(0.1e-3 / np.sqrt(2), rel=1e-9)


def test_temperatures_on_two_scales_are_not_mixed(tools: Any) -> None:
    # The empty cell is on PLTS-2000, the film's temperatures were written down on ITS-90.
    content, data = tools.sheet_content(), tools.sweep_data()
    content["sweep"][2] |= {
        "thermometer": "stage",
        "channels": {"stage": {"column": "T", "quantity": "temperature", "unit": "K", "scale": "ITS-90"}},
    }
    data["f1"]["stage"] = np.linspace(0.3, 0.9, data["f1"]["period"].size)
    source = tools.build(content, data)
    source.reduce("empty-cell", "2026-03/e1")
    source.reduce("dose-run", "2026-03/r1")
    with pytest.raises(BadRequest, match="temperatures are on different scales") as caught:
        source.reduce("film-transition", "2026-03/f1")
    assert "PLTS-2000" in str(caught.value)
    assert "ITS-90" in str(caught.value)


def test_a_run_of_doses_counts_those_that_its_rows_have_seen(tools: Any) -> None:
    data = tools.sweep_data()
    data["r1"] = {name: column[:-3] for name, column in data["r1"].items()}
    outcome = tools.build(data=data).reduce("dose-run", "2026-03/r1")
    step = outcome.document.steps[0]
    # Rows for 0 to 16 doses, the last three cut off.
    assert step.facts["doses"] == 13
    assert step.sentence.startswith("13 doses gave a total of 0")
    assert step.citations == ("cencek-2012",)


def test_no_alignment_adds_nothing() -> None:
    found = _drop(AlignmentParameters(align="none"))
    assert float(found.outputs["shift"]) == 0.0
    assert found.sources == ()


def test_an_alignment_window_without_rows_is_refused_with_its_ends() -> None:
    with pytest.raises(ValueError, match=r"found 0 rows between 0\.95 K and 1\.05 K"):
        _drop(AlignmentParameters(window_low_kelvin=0.95, window_high_kelvin=1.05))


def test_a_density_needs_area_and_drag_factor() -> None:
    common: dict[str, Any] = {"period_drop": np.array([8e-10]), "slope_below": 1.12e-4, "sample": None}
    with pytest.raises(ValueError, match="drag_factor"):
        superfluid_density(DensityParameters(), slope_past=None, area=1.5, **common)
    with pytest.raises(ValueError, match="area"):
        superfluid_density(DensityParameters(drag_factor=0.0), slope_past=None, area=0.0, **common)
    with pytest.raises(ValueError, match=r"drag_factor: found 0\.1, and a dose run gives 0\.2"):
        superfluid_density(DensityParameters(drag_factor=0.1), slope_past=0.224e-4, area=1.5, **common)
    # Doubling the area with a fixed drop halves the density.
    one, two = (
        superfluid_density(DensityParameters(drag_factor=0.0), slope_past=None, area=area, **common).array(
            "superfluid_density"
        )[0]
        for area in (1.5, 3.0)
    )
    assert one / two == pytest.approx(2.0, rel=1e-12)


def test_a_record_that_never_meets_the_universal_line_gives_no_crossing() -> None:
    T = np.linspace(0.1, 0.5, 50)
    with pytest.raises(ValueError, match="stays above the universal line"):
        universal_crossing(
            CrossingParameters(),
            temperature=T,
            superfluid_density=np.full(50, 1.0),
            u_superfluid_density=None,
        )


def test_area_may_be_given_per_mass() -> None:
    found = coverage_from_amount(
        NoParameters(), amount=2e-6, vapour=None, area=None, specific_area=100.0, mass=0.02
    )
    assert float(found.outputs["coverage"]) == pytest.approx(1e-6)
    with pytest.raises(ValueError, match="specific area and mass"):
        coverage_from_amount(
            NoParameters(), amount=2e-6, vapour=None, area=None, specific_area=None, mass=0.02
        )


def test_thickness_is_bulk_liquid_beyond_the_inner_layers() -> None:
    # One liquid layer by the two-thirds power, 12.9732 umol/m^2, is 0.357768 nm thick.
    found = thickness_from_coverage(ThicknessParameters(), coverage=12.9732e-6)
    assert float(found.outputs["thickness"]) == pytest.approx(0.357768e-9, rel=1e-5)
    inner = thickness_from_coverage(
        ThicknessParameters(inner_coverage_umol_m2=20.0, inner_thickness_nm=0.5),
        coverage=np.array([10e-6, 32.9732e-6]),
    )
    assert np.isnan(inner.array("thickness")[0])
    assert inner.array("thickness")[1] == pytest.approx(0.857768e-9, rel=1e-5)


def test_without_a_dead_volume_nothing_is_vapour_and_a_finding_says_so() -> None:
    found = vapour_in_dead_volume(
        VapourParameters(),
        gas=GasBook("c", ()),
        temperature=np.array([1.0, np.nan]),
        pressure=None,
        sample=None,
    )
    assert found.array("vapour")[0] == 0.0
    assert found.findings[0].code == "dead-volume-not-recorded"


def test_vapour_that_nobody_measured_is_half_of_saturation_give_or_take_a_rectangle() -> None:
    """1.87506 umol in a saturated cm^3 at 1 K; a rectangle of full width w has the standard deviation w/sqrt(12) (JCGM 100:2008, 4.3.7)."""
    volume = DeadVolume.model_validate_json(
        '{"name": "v", "volume": "1.000(10) cm^3", "temperature": "cell"}'
    )
    found = vapour_in_dead_volume(
        VapourParameters(),
        gas=GasBook("c", (), dead_volumes=(volume,)),
        temperature=np.array([1.0]),
        pressure=None,
        sample=Sample(name="gas", revision=1, isotope="4He", gas_source="invented"),
    )
    assert found.array("vapour")[0] == pytest.approx(1.87506e-6 / 2, rel=5e-4)
    parts = {
        name.partition(" ")[0]: float(np.asarray(part)[0]) for name, part in found.shared["vapour"].items()
    }
    assert parts == pytest.approx({"dead": 0.01 * 1.87506e-6 / 2, "vapour": 1.87506e-6 / 12**0.5}, rel=5e-4)


def test_a_given_break_gives_the_same_lines_as_the_search() -> None:
    n = np.arange(1.0, 17.0) * 1e-6
    P = (
        1e-3
        + 1e-4 * np.minimum(n, 8.5e-6)
        + 1e-5 * np.maximum(n - 8.5e-6, 0)
        + 1e-13 * np.cos(np.arange(16) * 2.0)
    )
    searched, given = (
        loading_fit(LoadingParameters(points_below=k), amount=n, period=P, u_period=np.full(16, 1e-13))
        for k in (None, 8)
    )
    assert searched.covariance is not None
    assert given.covariance is not None
    for name in ("slope_below", "slope_past", "chi", "onset_amount", "empty_period"):
        assert float(searched.outputs[name]) == pytest.approx(float(given.outputs[name]), rel=1e-9), name
    assert given.covariance.matrix == pytest.approx(searched.covariance.matrix, rel=1e-6, abs=1e-32)


def test_geometry_by_torsion_constant_and_its_warning() -> None:
    # f = 1 kHz, I = 5e-7 kg m^2, R_g^2 = 2.8e-5 m^2: dP/dm = 0.028 s/kg, kappa = 19.73921 N m/rad.
    found = geometric_sensitivity(
        NoParameters(),
        slope=0.028 * 4.002602e-3,
        period=1e-3,
        mean_square_radius=2.8e-5,
        inertia=None,
        torsion_constant=19.73921,
        sample=None,
    )
    assert float(found.outputs["ratio"]) == pytest.approx(1.0, rel=1e-5)
    assert found.findings == ()
    far = geometric_sensitivity(
        NoParameters(),
        slope=0.020 * 4.002602e-3,
        period=1e-3,
        mean_square_radius=2.8e-5,
        inertia=5e-7,
        torsion_constant=None,
        sample=None,
    )
    assert far.findings[0].code == "mass-loading-geometry"
    with pytest.raises(ValueError, match="moment of inertia or torsion constant"):
        geometric_sensitivity(
            NoParameters(),
            slope=1e-4,
            period=1e-3,
            mean_square_radius=2.8e-5,
            inertia=None,
            torsion_constant=None,
            sample=None,
        )


def test_geometry_weighs_the_atoms_of_the_gas() -> None:
    # The same mass per period; 3He atoms have 3.016029322 u, 4He atoms 4.002603254 u (AME2020).
    light = Sample.model_validate({"name": "gas", "revision": 1, "isotope": "3He", "gas_source": "invented"})
    four, three = (
        float(
            geometric_sensitivity(
                NoParameters(), slope=1e-4, period=1e-3, mean_square_radius=2.8e-5, inertia=5e-7, torsion_constant=None, sample=sample
            ).outputs["geometric_slope"]
        )
        for sample in (None, light)
    )  # fmt: skip
    assert three / four == pytest.approx(3.016029322 / 4.002603254, rel=1e-8)


def test_four_points_without_uncertainty_determine_no_uncertainty() -> None:
    n, P = np.array([0.0, 1e-6, 2e-6, 3e-6]), 1e-3 + np.array([0.0, 1e-10, 1.5e-10, 1.6e-10])
    with pytest.raises(ValueError, match="leave no scatter"):
        loading_fit(LoadingParameters(points_below=2), amount=n, period=P, u_period=None)


def test_documents_survive_json(reduced: Any) -> None:
    for outcome in reduced.done:
        text = outcome.document.model_dump_json()
        assert type(outcome.document).model_validate_json(text) == outcome.document
        assert json.loads(text)["format"] == "stillroom-reduction/1"


@pytest.mark.parametrize(
    "rows", [pytest.param((0, 1, 2), id="row 0"), pytest.param((1, 2, 51), id="row 51 of 50")]
)
def test_a_row_that_there_is_not_is_refused_wherever_rows_are_named(rows: tuple[int, ...]) -> None:
    T = np.linspace(0.1, 0.5, 50)
    with pytest.raises(ValueError, match="expected 1 to 50"):
        dissipation_peak(
            PeakParameters(rows=rows),
            temperature=T,
            dissipation=np.exp(-(((T - 0.3) / 0.05) ** 2)),
            u_dissipation=None,
        )


def density_of_shape(z: np.ndarray, *, slope: float, curve: float) -> np.ndarray:
    """Areal density that is a parabola in the standard uncertainties by which the temperature differs from the transition."""
    return 1e-8 * (1 + slope * z + curve * z**2)  # type: ignore[no-any-return]


@pytest.mark.parametrize(("slope", "curve"), [(-0.05, 0.0), (-0.05, -0.02), (-0.02, -0.04), (-0.05, 0.03)])
def test_a_curved_density_at_the_transition_adds_its_second_order(slope: float, curve: float) -> None:
    """A parabola of a normal number has the variance slope^2 + 2 curve^2 (JCGM 100:2008, 5.1.2 note)."""
    T, u = 0.5, 0.002
    temperature = np.linspace(0.47, 0.53, 601)
    density = density_of_shape((temperature - T) / u, slope=slope, curve=curve)
    found = universal_ratio(
        RatioParameters(),
        temperature=temperature,
        superfluid_density=density,
        transition=T,
        period=1e-3,
        transition_estimate=Estimate(np.asarray(T), "temperature", np.asarray(u)),
    )
    added = float(np.asarray(found.shared["density_at_transition"][BEYOND]))
    excess = found.facts["dynamic_excess"]
    assert added * excess == pytest.approx(1e-8 * math.sqrt(2) * abs(curve), rel=1e-4, abs=1e-14)
    assert [each.code for each in found.findings if each.code == "skewed"] == (
        ["skewed"] if abs(curve) > abs(slope) / 3 else []
    )
    # Where the transition is moved or drawn, the call says nothing of it a second time.
    assert found.held == {"beyond_first_order": False}
    again = universal_ratio(
        RatioParameters(beyond_first_order=False), temperature=temperature, superfluid_density=density, transition=T, period=1e-3,
        transition_estimate=Estimate(np.asarray(T), "temperature", np.asarray(u)),
    )  # fmt: skip
    assert BEYOND not in again.shared["density_at_transition"]


def test_a_record_that_ends_near_the_transition_says_that_only_first_order_is_known() -> None:
    temperature = np.linspace(0.47, 0.503, 331)
    found = universal_ratio(
        RatioParameters(),
        temperature=temperature,
        superfluid_density=density_of_shape((temperature - 0.5) / 0.004, slope=-0.05, curve=-0.02),
        transition=0.5,
        period=1e-3,
        transition_estimate=Estimate(np.asarray(0.5), "temperature", np.asarray(0.004)),
    )
    (said,) = [each for each in found.findings if each.code == "first-order-only"]
    assert said.severity == "warning"
    assert "found 0 rows within one per cent of 0.51143 K" in said.what
    assert "more rows on both sides" in (said.remedy or "")
    assert BEYOND not in found.shared["ratio"]
