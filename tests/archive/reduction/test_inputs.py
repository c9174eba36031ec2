"""Which channel is meant, what its uncertainty is, and how a need is found."""

from __future__ import annotations

import dataclasses
import math
from typing import Any

import numpy as np
import pytest

from archive.errors import BadRequest, InvalidSheet
from archive.reduction.channels import channel_estimate, channel_meant
from archive.reduction.facts import sweep_facts
from archive.reduction.planning import load_plan, plans_for, shipped_plans
from archive.reduction.sentence import filled
from archive.reduction.sheet_values import sheet_value
from archive.reduction.steps import all_steps, step_named
from schemas.cooldown import EFFECTS


def _facts(tools: Any, change: Any = None) -> tuple[Any, Any]:
    content = tools.sheet_content()
    if change is not None:
        change(content)
    source = tools.build(content)
    return source, sweep_facts(source, "2026-03/e1")


def test_a_channel_is_found_by_name_role_or_kind(tools: Any) -> None:
    _, facts = _facts(tools)
    assert channel_meant(facts, "period") == "period"
    assert channel_meant(facts, "@thermometer") == "resistance"
    assert channel_meant(facts, "@dissipation") == "dissipation"
    assert channel_meant(facts, "@pressure") is None
    assert channel_meant(facts, "nothing") is None


def test_a_channel_not_to_be_used_is_refused_with_its_reason(tools: Any) -> None:
    def change(content: dict[str, Any]) -> None:
        content["layout"]["sweep"]["channels"]["period"] |= {
            "use": False,
            "why_not": "lock on the wrong mode",
        }

    _, facts = _facts(tools, change)
    with pytest.raises(BadRequest, match="lock on the wrong mode"):
        channel_meant(facts, "period")
    assert channel_meant(facts, "@period") is None


@pytest.mark.parametrize(
    ("uncertainty", "is_", "point", "run"),
    [
        pytest.param("3 ps", "point", 3e-12, 0.0, id="a quantity"),
        pytest.param("0.01 %", "point", 1e-7, 0.0, id="a share"),
        pytest.param("5 ppm", "run", 0.0, 5e-9, id="a share common to all rows"),
        pytest.param(None, "point", 0.0, 0.0, id="not stated"),
    ],
)
def test_a_stated_uncertainty_becomes_point_or_shared(
    tools: Any, uncertainty: str | None, is_: str, point: float, run: float
) -> None:
    def change(content: dict[str, Any]) -> None:
        period = content["layout"]["sweep"]["channels"]["period"]
        period["uncertainty_is"] = is_
        if uncertainty is None:
            del period["uncertainty"]
        else:
            period["uncertainty"] = uncertainty

    source, facts = _facts(tools, change)
    estimate, sources = channel_estimate(source, facts, "period")
    assert estimate.points[0] == pytest.approx(point, rel=1e-4)
    assert len(sources) == (run > 0)
    if run:
        assert estimate.shared["uncertainty of 2026-03/e1#period"][0] == pytest.approx(run, rel=1e-4)


def test_an_uncertainty_that_is_none_is_refused(tools: Any) -> None:
    def change(content: dict[str, Any]) -> None:
        content["layout"]["sweep"]["channels"]["period"]["uncertainty"] = "small"

    source, facts = _facts(tools, change)
    with pytest.raises(BadRequest, match="uncertainty of channel 2026-03/e1#period"):
        channel_estimate(source, facts, "period")


@pytest.mark.parametrize(
    ("convention", "factor"), [("rms", 1.0), ("peak", 1 / math.sqrt(2)), ("peak-to-peak", 1 / math.sqrt(8))]
)
def test_oscillating_channels_are_rms_inside(tools: Any, convention: str, factor: float) -> None:
    def change(content: dict[str, Any]) -> None:
        content["layout"]["sweep"]["channels"]["dissipation"] = {
            "column": "Q",
            "quantity": "amplitude",
            "unit": "mV",
            "convention": convention,
            "uncertainty": "1 uV",
        }

    source, facts = _facts(tools, change)
    estimate, _ = channel_estimate(source, facts, "dissipation")
    raw = source.columns[("2026-03.a1", "e1", "dissipation")]
    assert estimate.value == pytest.approx(raw * 1e-3 * factor)
    assert estimate.points[0] == pytest.approx(1e-6 * factor)


def test_a_gauge_pressure_is_not_taken_for_an_absolute_one(tools: Any) -> None:
    def change(content: dict[str, Any]) -> None:
        content["layout"]["sweep"]["channels"]["dissipation"] = {
            "column": "Q",
            "quantity": "pressure",
            "unit": "Pa",
            "convention": "gauge",
        }

    source, facts = _facts(tools, change)
    with pytest.raises(BadRequest, match="gauge pressure"):
        channel_estimate(source, facts, "dissipation")


def test_values_of_records_name_their_source_after_the_record(tools: Any) -> None:
    _, facts = _facts(tools)
    area, sources, address = sheet_value(facts, "substrate.area")
    assert address == "disc.r1"
    assert sources[0].name == "disc.r1 area"
    assert sources[0].level == "cell"
    assert float(area.shared["disc.r1 area"]) == pytest.approx(0.03)  # type: ignore[union-attr]
    assert sheet_value(facts, "cell.gap")[0] is None
    assert sheet_value(facts, "nothing.at_all")[0] is None


def test_a_need_is_met_from_an_earlier_cooldown_when_this_one_has_none(tools: Any) -> None:
    source = tools.build()
    source.reduce("empty-cell", "2026-03/e1")
    source.reduce("dose-run", "2026-03/r1")
    content = tools.sheet_content()
    content["name"] = "2026-04"
    content["sweep"] = [content["sweep"][2]]
    later = tools.build(content, {"f1": tools.sweep_data(2)["f1"]})
    document = later.documents["2026-03"][0].model_copy(
        update={"address": "2026-04.a1", "cooldown": "2026-04"}
    )
    source.documents["2026-04"] = [document]
    source.columns |= {
        ("2026-04.a1", sweep, channel): values for (_, sweep, channel), values in later.columns.items()
    }
    outcome = source.reduce("film-transition", "2026-04/f1")
    assert any(entry.address.startswith("2026-03/e1@empty-cell.1#") for entry in outcome.document.inputs)
    result = next(entry for entry in outcome.document.outputs if entry.name == "T_KT")
    assert abs(result.value - 0.6) < 3 * result.uncertainty


def test_plans_come_in_the_order_in_which_they_need_each_other(tools: Any) -> None:
    source, facts = _facts(tools)
    sheet = facts.accession.sheet
    names = [[plan.name for plan in plans_for(sweep, facts.cell, facts.substrate)] for sweep in sheet.sweep]
    film = ["film-dynamic", "film-transition", "universal-jump"]
    assert names == [["empty-cell"], ["dose-run"], film, film]
    assert plans_for(sheet.sweep[0], None, None) == []
    assert source.cooldowns() == ["2026-03"]


class _Entry:
    """An entry point of a laboratory's package."""

    value = "ourlab.steps:OURS"

    def __init__(self, name: str, loaded: object) -> None:
        self.name, self._loaded = name, loaded

    def load(self) -> object:
        """Return what it stands for, or fail as an import does."""
        if isinstance(self._loaded, Exception):
            raise self._loaded
        return self._loaded


OURS = dataclasses.replace(step_named("leave-out"), name="our-own")


@pytest.mark.parametrize(
    ("loaded", "words"),
    [
        pytest.param(OURS, None, id="one step"),
        pytest.param([OURS], None, id="a list of steps"),
        pytest.param(step_named("leave-out"), "needs another name", id="a taken name"),
        pytest.param("text", "no step and no sequence of steps", id="something else"),
        pytest.param(ImportError("no module"), "cannot be loaded", id="a broken package"),
    ],
)
def test_a_laboratory_adds_its_own_steps(
    monkeypatch: pytest.MonkeyPatch, loaded: object, words: str | None
) -> None:
    monkeypatch.setattr("archive.reduction.steps.entry_points", lambda group: [_Entry("ours", loaded)])
    all_steps.cache_clear()
    try:
        if words is None:
            assert step_named("our-own") is OURS
        else:
            with pytest.raises(BadRequest, match=words):
                all_steps()
    finally:
        monkeypatch.undo()
        all_steps.cache_clear()


def test_effects_are_those_of_the_closed_list() -> None:
    assert {effect for step in all_steps() for effect in step.effects} <= set(EFFECTS)


def test_shipped_plans_use_only_steps_and_ports_that_exist() -> None:
    for plan in shipped_plans():
        for planned in plan.step:
            step = step_named(planned.use, planned.version)
            assert set(planned.take) <= set(step.takes), plan.name
            assert set(planned.give) <= set(step.yields), plan.name


@pytest.mark.parametrize(
    ("text", "words"),
    [
        pytest.param("name = ", "no valid TOML", id="no TOML"),
        pytest.param('name = "x"\nrevision = 1\ntitle = "x"', "not as plans are", id="no plan"),
    ],
)
def test_a_text_that_is_no_plan_is_refused(text: str, words: str) -> None:
    with pytest.raises(InvalidSheet, match=words):
        load_plan(text, file="mine.toml")


def test_unknown_steps_and_versions_are_refused() -> None:
    with pytest.raises(BadRequest, match="there is no step 'nothing'"):
        step_named("nothing")
    with pytest.raises(BadRequest, match="no version 99"):
        step_named("leave-out", 99)
    assert len({(step.name, step.version) for step in all_steps()}) == len(all_steps())


def test_a_sentence_says_what_is_not_recorded() -> None:
    assert filled("{a} and {b}", {"a": "one"}) == "one and [b is not recorded]"
    assert filled("{a.__class__}", {"a": "one"}) == "[a.__class__ is not recorded]"


def test_rows_are_left_out_by_time(tools: Any) -> None:
    content = tools.sheet_content()
    content["sweep"][1]["left_out"] = [
        {
            "channel": "at",
            "high": "2026-03-02T09:00:00Z",
            "low": "2026-03-02T08:00:00Z",
            "reason": "before the first dose",
        }
    ]
    content["sweep"][1]["left_out"].append(
        {"channel": "at", "low": "2026-03-03T01:00:00+00:00", "reason": "warming"}
    )
    outcome = tools.build(content).reduce("dose-run", "2026-03/r1")
    kept = outcome.arrays["arrays/period_kept"][0]
    assert np.isnan(kept[-1])
    assert np.isfinite(kept[:-1]).all()
