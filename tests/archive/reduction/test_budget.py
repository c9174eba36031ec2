"""Budgets: lines sum to the combined uncertainty, and say what they are from."""

from __future__ import annotations

import math
from typing import Any

import pytest

from archive.reduction.budget import budget
from archive.reports.budget import budget_block, budget_rows
from schemas.interval_text import interval_text, preferred_unit


@pytest.fixture(scope="module")
def film(reduced: Any) -> Any:
    """Return the document of a film."""
    return reduced.reduction("2026-03/f1@film-transition.1")


def test_squares_add_up_to_the_combined_uncertainty_and_shares_to_one(reduced: Any) -> None:
    count = 0
    for outcome in reduced.done:
        for output in outcome.document.outputs:
            rows = budget(outcome.document, output)
            if output.rows is not None or not output.uncertainty:
                assert rows == ()
                continue
            count += 1
            assert math.hypot(*(row.contribution for row in rows)) == pytest.approx(
                output.uncertainty, rel=1e-12
            )
            assert sum(row.share for row in rows) == pytest.approx(1, abs=1e-12)
            shares = [row.share for row in rows]
            assert shares == sorted(shares, reverse=True)
            told = budget_rows(outcome.document, output)
            assert math.hypot(*(part for _, part, _, _ in told)) == pytest.approx(
                output.uncertainty, rel=1e-12
            )
    assert count > 20


def test_a_stated_source_has_its_sensitivity(film: Any) -> None:
    """T_KT against the area: the areal density goes as 1/A, so the crossing moves by dT = -(dT/d sigma)(sigma/A) dA, downward."""
    output = next(each for each in film.outputs if each.name == "T_KT")
    rows = {row.source: row for row in budget(film, output)}
    area = rows["disc.r1 area"]
    assert (area.stated.value, area.stated.uncertainty, area.stated.unit) == (1.5, 0.03, "m^2")
    assert area.level == "cell"
    assert area.sensitivity * area.stated.uncertainty == pytest.approx(area.contribution, rel=1e-15)
    assert area.sensitivity < 0
    held = rows["b = 5.5 of the dynamic theory, held"]
    assert (held.stated.value, held.stated.uncertainty, held.level) == (5.5, 1.0, "laboratory")
    fits = [row for row in rows.values() if "fit of step" in row.source]
    assert {row.source for row in fits} >= {"2026-03/r1@dose-run.1, fit of step 2 (loading-fit)"}
    assert all(row.sensitivity is None and row.contribution > 0 for row in fits)


def test_the_vapour_that_nobody_measured_is_rectangular(film: Any) -> None:
    source = next(each for each in film.sources if each.name.startswith("vapour between none"))
    assert source.distribution == "rectangular"


def test_the_table_ends_with_the_combined_uncertainty_in_the_unit_of_the_result(film: Any) -> None:
    output = next(each for each in film.outputs if each.name == "T_KT")
    lines = budget_block(film, output, least=0.01)
    assert str(lines[-1]["source"]) == "combined standard uncertainty"
    assert lines[-1]["share"] == "100 %"
    unit, factor = preferred_unit(output.uncertainty, output.unit, output.quantity)
    assert lines[-1]["contribution"] == f"{output.uncertainty * factor:.3g} {unit}"
    assert str(lines[-2]["source"]).endswith("below 1 per cent each")
    area = next(line for line in lines if str(line["source"]) == "disc.r1 area")
    assert (str(area["stated"]), area["level"]) == ("1.500(30) m^2", "this cell")
    assert "1.500(30)\u00a0m²" in area["stated"].__html__()
    assert str(area["sensitivity"]).endswith(" K/m^2")


@pytest.mark.parametrize(
    ("interval", "u", "unit", "expected"),
    [
        pytest.param((0.45632, 0.46081), 0.0012, "K", "[0.4563, 0.4608] K", id="two digits of u"),
        pytest.param((-1.5e-9, 2.5e-9), 1e-9, "1", "[-1.5e-09, 2.5e-09]", id="small"),
        pytest.param((221000.4, 221067.9), 17.0, "1", "[221000, 221068]", id="whole"),
        pytest.param((1.0, 3.0), None, "mK", "[1.00, 3.00] mK", id="no uncertainty stated"),
        pytest.param((1.0, 1.0), None, "1", "[1, 1]", id="no width at all"),
        pytest.param(None, 1.0, "K", "-", id="none"),
    ],
)
def test_interval_text(
    interval: tuple[float, float] | None, u: float | None, unit: str, expected: str
) -> None:
    assert interval_text(interval, uncertainty=u, unit=unit) == expected
