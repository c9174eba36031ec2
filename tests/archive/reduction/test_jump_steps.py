"""All films of a cell on one line: the plan on invented films, what it shares, what it leaves out, and its replay."""

from __future__ import annotations

import dataclasses
import json
import math
from typing import Any

import numpy as np
import pytest

from archive.errors import BadRequest
from archive.physics.film_static import UNIVERSAL_JUMP
from archive.reduction.estimate import Estimate
from archive.reduction.gathering import GatherParameters, gathered, gathering_step
from archive.reduction.jump_steps import LineParameters, density_of_fit, universal_line
from archive.reduction.planning import shipped_plans
from archive.reduction.replay import replay
from archive.reduction.runner import run
from archive.reduction.step import NoParameters
from archive.reduction.trace import trace
from schemas.lineage import ReductionDocument
from schemas.plan import Plan


@pytest.fixture(scope="module")
def films(reduced: Any) -> Any:
    """Give the laboratory with two films reduced, and both on one line."""
    source = dataclasses.replace(reduced, done=list(reduced.done))
    source.reduce("universal-jump", "2026-03/f2")
    return source


def document(films: Any) -> ReductionDocument:
    """Document of the line."""
    return films.done[-1].document  # type: ignore[no-any-return]


def value(films: Any, name: str) -> tuple[float, float]:
    """Value and uncertainty of a result."""
    (found,) = [each for each in document(films).outputs if each.name == name]
    assert found.value is not None
    return found.value, found.uncertainty or 0.0


def test_two_films_lie_on_the_universal_line(films: Any) -> None:
    ratio, u = value(films, "slope_ratio")
    assert abs(ratio - 1) < 3 * u
    assert 0.01 < u < 0.15
    assert value(films, "films")[0] == 2
    chance, none = value(films, "probability")
    assert 0.001 < chance <= 1
    # A statistic of the readings has no uncertainty of its own.
    assert none == 0
    (temperatures,) = [each for each in document(films).outputs if each.name == "films_T_KT_by_peak"]
    assert temperatures.rows == 2
    assert temperatures.scale == "PLTS-2000"
    values = films.output(document(films).address, "films_T_KT_by_peak").value
    assert values == pytest.approx([0.6, 0.5], abs=0.01)


def test_what_the_films_share_stays_shared(films: Any) -> None:
    (found,) = [each for each in document(films).outputs if each.name == "slope_ratio"]
    ratio = found.value or 0.0
    # Dose run (mass sensitivity, chi) and held parameters of theory are those of both films; the disc's area is one source.
    area = films.output("2026-03/f1@film-transition.1", "density_at_transition").shared["disc.r1 area"]
    density = films.output("2026-03/f1@film-transition.1", "density_at_transition").value
    assert found.shared["disc.r1 area"] / ratio == pytest.approx(float(area / density), rel=2e-3)
    names = set(found.shared)
    assert any(name.startswith("2026-03/r1@dose-run.1 fit") for name in names)
    assert any(name.startswith("b = 5.5") for name in names)
    # The peak of each film is its own.
    for film in ("f1", "f2"):
        assert any(name.startswith(f"2026-03/{film}@film-transition.1 fit") for name in names)


def test_every_film_is_an_input_and_the_trace_leads_there(films: Any) -> None:
    inputs = {entry.address for entry in document(films).inputs}
    for film in ("f1", "f2"):
        for output in ("T_KT_by_peak", "density_at_transition"):
            assert f"2026-03/{film}@film-transition.1#{output}" in inputs
    lines = "\n".join(trace(f"{document(films).address}#slope_ratio", films).lines())
    assert "2026-03/f1@film-transition.1#T_KT_by_peak" in lines
    assert "2026-03/f2#resistance" in lines


def test_the_fit_of_the_dynamic_theory_is_left_out_where_there_is_none(films: Any) -> None:
    told = [finding.what for finding in document(films).findings if finding.code == "step-left-out"]
    assert len(told) == 2
    assert "no reduction serves as fits" in told[0]


def test_a_replay_takes_the_same_films(films: Any, tools: Any) -> None:
    source = dataclasses.replace(films, done=list(films.done))
    # A newer reduction of one film is not what was recorded.
    source.reduce("film-transition", "2026-03/f1", number=2)
    again = replay(document(films), source, clock=tools.Clock())
    assert again.equal
    assert not again.changed_inputs
    fresh = source.reduce("universal-jump", "2026-03/f2", number=2).document
    assert "2026-03/f1@film-transition.2#T_KT_by_peak" in {entry.address for entry in fresh.inputs}


def test_without_films_the_plan_says_what_to_do_first(laboratory: Any) -> None:
    with pytest.raises(BadRequest, match="rests on a reduction by plan film-transition") as caught:
        laboratory.reduce("universal-jump", "2026-03/f2")
    assert "--plan film-transition" in (caught.value.remedy or "")


def _changed(**more: Any) -> Plan:
    plan = next(each for each in shipped_plans() if each.name == "universal-jump")
    content = plan.model_dump(mode="json") | {"name": "own"}
    content["step"] = [content["step"][0]]
    content["step"][0] |= more
    return Plan.model_validate_json(json.dumps(content))


def test_an_output_that_no_film_has_is_named(films: Any, tools: Any) -> None:
    take = {"transition": "need:films#T_KT_by_peak", "density": "need:films#no_such_output"}
    with pytest.raises(
        BadRequest, match="none of the 2 reductions that serve as films has an output no_such"
    ):
        run(_changed(take=take), "2026-03/f2", films, number=1, clock=tools.Clock())


def test_a_column_of_each_film_cannot_be_taken_together(films: Any, tools: Any) -> None:
    take = {"transition": "need:films#temperature", "density": "need:films#density_at_transition"}
    with pytest.raises(BadRequest, match="is a column"):
        run(_changed(take=take), "2026-03/f2", films, number=1, clock=tools.Clock())


def test_results_are_gathered_in_their_order() -> None:
    step = gathering_step(3, output="T_KT", quantity="temperature")
    assert list(step.takes) == ["from_1", "from_2", "from_3"]
    parameters = GatherParameters(output="T_KT", reductions=("a/b@p.1", "a/c@p.1", "a/d@q.1"))
    found = gathered(parameters, from_3=3.0, from_1=1.0, from_2=None)
    np.testing.assert_array_equal(found.array("values"), [1.0, np.nan, 3.0])
    assert found.facts["known"] == 2
    assert found.facts["plans"] == "p and q"
    assert found.facts["what"] == "T_KT"
    for output, words in (("T_KT_by_peak", "T_KT by peak"), ("quality_factor_1", "quality factor 1")):
        named = gathered(parameters.model_copy(update={"output": output}), from_1=1.0)
        assert named.facts["what"] == words


def _estimates(count: int, off: float = 1.0) -> dict[str, Any]:
    T = np.linspace(0.3, 0.8, count)
    density = UNIVERSAL_JUMP * T
    density[0] *= off
    lone = {f"film {k}": np.where(np.arange(count) == k, 0.02 * density, 0.0) for k in range(count)}
    return {
        "transition": T, "density": density, "transition_estimate": Estimate(T, "temperature", shared={"scale": np.full(count, 1e-4)}),
        "density_estimate": Estimate(density, "areal_mass_density", shared=lone),
    }  # fmt: skip


def test_one_film_has_a_slope_and_a_verdict() -> None:
    found = universal_line(LineParameters(), **_estimates(1))
    assert float(found.outputs["ratio"]) == pytest.approx(1, rel=1e-12)
    assert found.verdicts["chi2"] == "one film"
    assert [finding.code for finding in found.findings] == ["one-film"]


def test_films_off_the_line_are_a_warning() -> None:
    assert universal_line(LineParameters(), **_estimates(6)).findings == ()
    found = universal_line(LineParameters(), **_estimates(6, off=1.2))
    assert [finding.code for finding in found.findings] == ["films-off-one-line"]
    # With the choices held, another density moves the slope and leaves the test as it was.
    held = LineParameters().model_copy(update=dict(found.held))
    moved = _estimates(6, off=1.2)
    moved["density"] = moved["density"] * 1.01
    again = universal_line(held, **moved)
    assert float(again.outputs["ratio"]) == pytest.approx(1.01 * float(found.outputs["ratio"]), rel=1e-9)
    assert again.outputs["chi2"] == found.outputs["chi2"]


def test_a_film_that_lacks_a_number_does_not_count() -> None:
    given = _estimates(5)
    given["density"] = given["density"].copy()
    given["density"][2] = math.nan
    found = universal_line(LineParameters(), **given)
    assert found.outputs["films"] == 4
    assert np.isnan(found.array("residual")[2])
    with pytest.raises(ValueError, match="no film has both"):
        universal_line(LineParameters(), **(given | {"density": np.full(5, math.nan)}))


def test_the_density_of_a_fit_is_its_ratio_of_the_universal_one() -> None:
    found = density_of_fit(NoParameters(), scale_ratio=np.array([1.0, 0.9]), transition=np.array([0.5, 1.0]))
    # 3.491358e-8 kg m^-2 K^-1 (Nelson and Kosterlitz 1977).
    assert found.array("density") == pytest.approx([1.745679e-8, 3.142222e-8], rel=1e-6)
