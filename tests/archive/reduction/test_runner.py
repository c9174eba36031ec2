"""Plans carried out on invented sweeps with known truth."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from archive.errors import BadRequest, StepFailed, UnknownAddress
from archive.physics.constants import MOLAR_MASS_HELIUM4
from archive.reduction.digest import array_digest
from archive.reduction.estimate import covariance_between
from archive.reduction.outputs import estimate_from
from archive.reduction.planning import load_plan, shipped_plans
from archive.reduction.runner import run
from schemas.quantity import Quantity


def _result(outcome: Any, name: str) -> Any:
    return next(entry for entry in outcome.document.outputs if entry.name == name)


def _pull(outcome: Any, name: str, truth: float) -> float:
    entry = _result(outcome, name)
    return (entry.value - truth) / entry.uncertainty


@pytest.mark.parametrize(("film", "truth"), [(2, 0.6), (3, 0.5)], ids=["T_KT 0.6 K", "T_KT 0.5 K"])
def test_a_film_gives_back_its_transition_temperature(reduced: Any, film: int, truth: float) -> None:
    outcome = reduced.done[film]
    assert abs(_pull(outcome, "T_KT", truth)) < 3
    assert abs(_pull(outcome, "T_KT_by_peak", truth)) < 3
    assert abs(_pull(outcome, "universal_ratio", 1.0)) < 3
    # The theory's parameters are held at the truth here: what is left is far smaller than what holding them costs.
    assert _result(outcome, "T_KT").value == pytest.approx(truth, abs=3e-4)
    assert _result(outcome, "T_KT").scale == "PLTS-2000"


def test_a_dose_run_gives_back_loading_and_onset(reduced: Any, tools: Any) -> None:
    outcome, truth = reduced.done[1], tools.truth
    assert abs(_pull(outcome, "mass_sensitivity", truth["slope"])) < 3
    assert abs(_pull(outcome, "chi", truth["chi"])) < 3
    assert abs(_pull(outcome, "onset_amount", truth["onset"])) < 3
    assert abs(_pull(outcome, "sensitivity_ratio", 1.0)) < 3
    # A metering volume known to 0.2 per cent is common to both slopes, so chi does not know of it.
    chi, slope = _result(outcome, "chi"), _result(outcome, "mass_sensitivity")
    volume = "volume of doser V1, 50.00(10) cm^3"
    assert abs(slope.shared[volume]) == pytest.approx(0.002 * slope.value, rel=1e-3)
    assert abs(chi.shared.get(volume, 0.0)) < 1e-9


def test_areal_density_is_right_within_its_own_uncertainty(reduced: Any) -> None:
    outcome = reduced.done[2]
    density = reduced.output("2026-03/f1@film-transition.1", "superfluid_density")
    temperature = reduced.output("2026-03/f1@film-transition.1", "temperature")
    cold = temperature.value < 0.35
    # Far below the transition the model's areal density; by (2.3) it is the period drop over sensitivity and 1 - chi.
    from archive.physics import film_dynamic

    stiffness = film_dynamic.complex_stiffness(
        film_dynamic.fixed_start(temperature.value[cold] / 0.6, b=5.5), L=12.155, F=1.0
    )
    truth = film_dynamic.dynamic_areal_density(temperature.value[cold], stiffness).real
    pulls = (density.value[cold] - truth) / density.points[cold]
    # Common sources move all rows alike; what is left after their mean must be of unit width.
    assert np.std(pulls) == pytest.approx(1.0, abs=0.25)
    assert abs(float(np.mean(density.value[cold] / truth)) - 1) < 3 * float(
        np.median(density.uncertainty[cold] / density.value[cold])
    )
    assert outcome.document.outputs


def test_two_films_share_area_and_loading(reduced: Any) -> None:
    first = reduced.output("2026-03/f1@film-transition.1", "crossing_temperature")
    second = reduced.output("2026-03/f2@film-transition.1", "crossing_temperature")
    common = set(first.shared) & set(second.shared)
    assert {"disc.r1 area", "RX-1-cal.r1"} <= common
    assert any(name.startswith("2026-03/r1@dose-run.1 fit") for name in common)
    assert not any("alignment" in name for name in common)
    correlation = covariance_between(first, second) / float(first.uncertainty * second.uncertainty)
    # Area and calibration dominate both: only the films' own noise is not shared.
    assert 0.9 < correlation < 1


def test_equal_input_gives_equal_bits(tools: Any) -> None:
    outcomes = []
    for _ in range(2):
        source = tools.build()
        for plan, sweep in (("empty-cell", "e1"), ("dose-run", "r1"), ("film-transition", "f1")):
            last = source.reduce(plan, f"2026-03/{sweep}")
        outcomes.append(last)
    assert outcomes[0].document.model_dump_json() == outcomes[1].document.model_dump_json()
    assert list(outcomes[0].arrays) == list(outcomes[1].arrays)
    for path, (values, _) in outcomes[0].arrays.items():
        assert values.tobytes() == outcomes[1].arrays[path][0].tobytes(), path


def test_arrays_have_units_and_come_back_as_they_were(reduced: Any) -> None:
    outcome = reduced.done[2]
    values, attributes = outcome.arrays["arrays/superfluid_density"]
    assert attributes["units"] == "kg/m^2"
    assert attributes["quantity"] == "areal_mass_density"
    assert outcome.arrays["arrays/temperature"][1]["scale"] == "PLTS-2000"
    back = estimate_from(outcome.document, lambda path: outcome.arrays[path][0], "superfluid_density")
    assert back.uncertainty == pytest.approx(
        outcome.arrays["arrays/superfluid_density.uncertainty"][0], nan_ok=True
    )
    assert _result(outcome, "superfluid_density").digest == array_digest(values)
    with pytest.raises(UnknownAddress, match="no output"):
        estimate_from(outcome.document, lambda path: outcome.arrays[path][0], "nothing")


def test_a_film_in_pores_gives_back_its_power_law(tools: Any) -> None:
    random = np.random.default_rng(5)
    T = np.linspace(0.3, 0.8, 1500)
    data = tools.sweep_data()
    density = 3e-8 * np.maximum(1 - T / 0.6, 0.0) ** 0.67
    empty = tools.empty(T)[0]
    period = (
        empty
        + tools.truth["slope"] * 16 * tools.truth["dose"]
        - 0.042 * 0.9 * density
        + random.normal(0, 3e-13, T.size)
    )
    data["f1"] = {"resistance": tools.reading(T), "period": period * 1e3, "dissipation": tools.empty(T)[1]}
    content = tools.sheet_content()
    content["layout"]["sweep"]["channels"]["period"]["uncertainty"] = "0.3 ps"
    content["sweep"][2]["channels"] = {
        "dissipation": {
            "column": "Q",
            "quantity": "dissipation",
            "unit": "1",
            "use": False,
            "why_not": "not recorded",
        }
    }
    source = tools.build(content, data)
    disc = source.records["disc.r1"]
    source.records["disc.r1"] = disc.model_copy(update={"pore_diameter": Quantity.parse("50 nm", "length")})
    source.reduce("empty-cell", "2026-03/e1")
    source.reduce("dose-run", "2026-03/r1")
    outcome = source.reduce("porous-film", "2026-03/f1")
    assert abs(_pull(outcome, "T_c", 0.6)) < 3
    assert abs(_pull(outcome, "exponent", 0.67)) < 3
    assert abs(_pull(outcome, "amplitude_of_power_law", 3e-8)) < 3
    with pytest.raises(BadRequest, match="is not for"):
        tools.build().reduce("porous-film", "2026-03/f1")


def test_every_step_is_recorded_with_numbers_digests_and_calibration(reduced: Any) -> None:
    document = reduced.done[2].document
    sentences = " ".join(step.sentence for step in document.steps)
    assert "not recorded]" not in sentences
    assert "RX-1-cal.r1" in {entry.address for entry in document.inputs}
    for step in document.steps:
        assert all(entry.digest or entry.value for entry in step.inputs.values()), step.name
        assert step.end >= step.begin
    density = next(step for step in document.steps if step.name == "superfluid-density")
    # 0.042 s m^2/kg, as far as the dose run knows it.
    assert density.facts["period_per_areal_density"] == pytest.approx(0.042, rel=5e-3)
    assert density.inputs["slope_below"].value is not None
    assert pytest.approx(4.0026e-3, rel=1e-4) == MOLAR_MASS_HELIUM4


def test_rows_left_out_and_corrections_become_steps(tools: Any) -> None:
    content = tools.sheet_content()
    content["sweep"][0]["left_out"] = [
        {"rows": [1, 10], "reason": "stage not settled"},
        {"channel": "period", "high": "1 us", "reason": "lock lost"},
    ]
    content["sweep"][0]["corrections"] = [
        {
            "channel": "period",
            "correct": "gain",
            "value": "1.0000010(2)",
            "known": "measured",
            "source": "clock against a reference",
        }
    ]
    plain = tools.build()
    plain.reduce("empty-cell", "2026-03/e1")
    source = tools.build(content)
    outcome = source.reduce("empty-cell", "2026-03/e1")
    names = [step.name for step in outcome.document.steps]
    assert names.count("leave-out") == 3
    assert "apply-correction" in names
    left_out = next(step for step in outcome.document.steps if step.name == "leave-out")
    assert left_out.facts["count"] == 10
    assert "stage not settled" in left_out.sentence
    assert np.isnan(outcome.arrays["arrays/temperature"][0][:10]).all()
    ratio = _result(plain.done[0], "empty_period").value / _result(outcome, "empty_period").value
    # The ten rows left out move the cold end by a few parts in 1e8.
    assert ratio == pytest.approx(1.000001, abs=5e-8)
    source_name = next(
        name for name in _result(outcome, "empty_period").shared if name.startswith("gain of period")
    )
    assert abs(_result(outcome, "empty_period").shared[source_name]) == pytest.approx(2e-7 * 1e-3, rel=1e-3)


def test_readings_outside_the_calibration_have_no_temperature_and_say_so(tools: Any) -> None:
    data = tools.sweep_data()
    data["e1"]["resistance"][:5] = 1e3
    outcome = tools.build(data=data).reduce("empty-cell", "2026-03/e1")
    finding = next(
        each for each in outcome.document.findings if each.code == "temperature-outside-calibration"
    )
    assert finding.what.startswith("5 of 400 readings")
    assert finding.place == "e1"
    assert np.isnan(outcome.arrays["arrays/temperature"][0][:5]).all()


def test_a_new_segment_is_told(tools: Any) -> None:
    content = tools.sheet_content()
    content["sweep"][0]["disturbances"] = [
        {"at": "2026-03-02T10:00:00Z", "what": "knock at the frame", "new_segment": True}
    ]
    outcome = tools.build(content).reduce("empty-cell", "2026-03/e1")
    assert "knock at the frame" in next(
        each.what for each in outcome.document.findings if each.code == "new-segment"
    )


def test_an_optional_step_that_fails_leaves_a_warning_and_the_rest_stands(tools: Any) -> None:
    data = tools.sweep_data()
    # No peak: the dissipation only rises.
    data["f1"]["dissipation"] = 3e-6 + 1e-9 * np.arange(data["f1"]["dissipation"].size)
    source = tools.build(data=data)
    source.reduce("empty-cell", "2026-03/e1")
    source.reduce("dose-run", "2026-03/r1")
    outcome = source.reduce("film-transition", "2026-03/f1")
    finding = next(each for each in outcome.document.findings if each.code == "step-without-result")
    assert "there is no peak" in finding.what
    names = {entry.name for entry in outcome.document.outputs}
    assert "T_KT" in names
    assert "universal_ratio" not in names
    assert abs(_pull(outcome, "T_KT", 0.6)) < 3


def _refusal(source: Any, plan: str, sweep: str) -> str:
    with pytest.raises((BadRequest, StepFailed, UnknownAddress)) as caught:
        source.reduce(plan, sweep)
    text = str(caught.value)
    assert "Traceback" not in text
    assert "\n" not in text
    return text


def test_a_missing_need_says_which_command_makes_it(laboratory: Any) -> None:
    text = _refusal(laboratory, "film-transition", "2026-03/f1")
    assert "rests on a reduction by plan empty-cell" in text
    assert "stillroom reduce 2026-03/e1 --plan empty-cell" in text


def test_a_missing_calibration_is_asked_for(tools: Any) -> None:
    content = tools.sheet_content()
    del content["layout"]["sweep"]["channels"]["resistance"]["calibration"]
    text = _refusal(tools.build(content), "empty-cell", "2026-03/e1")
    assert "no calibration that turns it into a temperature" in text
    assert "2026-03/e1#resistance" in text


def test_a_missing_unit_is_refused(tools: Any) -> None:
    source = tools.build()
    document = source.documents["2026-03"][0]
    sweep = document.sweeps[0]
    bare = tuple(
        each.model_copy(update={"unit": ""}) if each.name == "period" else each for each in sweep.channels
    )
    changed = (sweep.model_copy(update={"channels": bare}), *document.sweeps[1:])
    source.documents["2026-03"] = [document.model_copy(update={"sweeps": changed})]
    text = _refusal(source, "empty-cell", "2026-03/e1")
    assert "2026-03/e1#period has no unit" in text


def test_a_wrong_unit_is_refused(tools: Any) -> None:
    source = tools.build()
    document = source.documents["2026-03"][0]
    sweep = document.sweeps[0]
    wrong = tuple(
        each.model_copy(update={"unit": "Hz"}) if each.name == "period" else each for each in sweep.channels
    )
    source.documents["2026-03"] = [
        document.model_copy(
            update={"sweeps": (sweep.model_copy(update={"channels": wrong}), *document.sweeps[1:])}
        )
    ]
    assert "expected a period" in _refusal(source, "empty-cell", "2026-03/e1")


@pytest.mark.parametrize(
    ("plan", "sweep", "words"),
    [
        pytest.param("empty-cell", "2026-03/f1", "is not for 2026-03/f1", id="plan of another kind"),
        pytest.param(
            "empty-cell",
            "2026-03/s99",
            "no accession of cooldown 2026-03 holds a sweep s99",
            id="unknown sweep",
        ),
        pytest.param("empty-cell", "2026-03", "not the address of a sweep", id="no sweep at all"),
    ],
)
def test_wrong_requests_are_answered_in_a_sentence(
    laboratory: Any, plan: str, sweep: str, words: str
) -> None:
    assert words in _refusal(laboratory, plan, sweep)


def test_a_step_that_fails_names_sweep_plan_and_step(tools: Any) -> None:
    data = tools.sweep_data()
    data["r1"]["period"] = data["r1"]["at"] * 0 + 1.0
    text = _refusal(tools.build(data=data), "dose-run", "2026-03/r1")
    assert "2026-03/r1@dose-run.1, step 2 (loading-fit)" in text
    assert "no onset is seen" in text


def test_a_dose_that_the_sheet_does_not_have_is_named(tools: Any) -> None:
    content = tools.sheet_content()
    content["dose"][3]["doser"] = "V9"
    assert "dose d04 names doser 'V9'" in _refusal(tools.build(content), "dose-run", "2026-03/r1")


def test_an_unknown_parameter_of_a_plan_is_refused(laboratory: Any, tools: Any) -> None:
    text = """
        name = "mine"
        revision = 1
        title = "mine"
        [applies]
        sweep_kinds = ["temperature-sweep"]
        [[step]]
        use = "temperature-from-calibration"
        take = { reading = "channel:@thermometer", calibration = "calibration:@thermometer" }
        give = { temperature = "temperature" }
        [[step]]
        use = "background-fit"
        take = { temperature = "temperature", values = "channel:@period" }
        set = { ordre = 3 }
        give = { coefficients = "coefficients" }
    """
    with pytest.raises(BadRequest, match="background-fit") as caught:
        run(load_plan(text), "2026-03/e1", laboratory, number=1, clock=tools.Clock())
    assert "highest_order" in str(caught.value)


def test_shipped_plans_give_each_name_once() -> None:
    for plan in shipped_plans():
        given = [name for step in plan.step for name in step.give.values()]
        assert len(given) == len(set(given)), plan.name
