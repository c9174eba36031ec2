"""`stillroom helium`: reference values, ranges, sources."""

from __future__ import annotations

import csv
from collections.abc import Callable
from pathlib import Path

import pytest
from click.testing import Result

from tests.archive.commands.support import parsed

# R. J. Donnelly, C. F. Barenghi, J. Phys. Chem. Ref. Data 27, 1217 (1998); vapour pressure from ITS-90.
TABLE = Path(__file__).parents[2] / "published" / "helium" / "helium4_liquid_svp.csv"
COLUMNS = {
    "density, liquid": ("density_kg_per_m3", 1.0),
    "superfluid fraction": ("superfluid_fraction", 1.0),
    "specific heat, liquid": ("specific_heat_sat_J_per_kg_K", 1.0),
    "viscosity, liquid": ("viscosity_uPa_s", 1e-6),
    "surface tension": ("surface_tension_mN_per_m", 1e-3),
    "second sound": ("second_sound_m_per_s", 1.0),
    "first sound": ("first_sound_m_per_s", 1.0),
}
Run = Callable[..., Result]


def _row(temperature: str) -> dict[str, str]:
    rows = csv.DictReader(TABLE.read_text(encoding="utf-8").splitlines())
    return next(row for row in rows if row["T90_K"] == temperature)


@pytest.mark.parametrize("temperature", ["1.0", "1.5", "2.0", "3.0", "4.0"])
def test_values_are_those_of_the_reference_table(temperature: str, run: Run) -> None:
    found = {each["name"]: each for each in parsed(run("helium", f"{temperature} K", "--json"))["properties"]}
    published = _row(temperature)
    compared = 0
    for name, (column, factor) in COLUMNS.items():
        if not published[column]:
            assert found[name]["value"] is None
            continue
        last_digit = 10.0 ** -len(published[column].partition(".")[2])
        assert found[name]["value"] == pytest.approx(
            float(published[column]) * factor, abs=last_digit * factor
        )
        compared += 1
    assert compared >= 5
    assert all(each["unit"] and each["range"] and each["source"] for each in found.values())


def test_the_text_holds_ranges_and_sources(run: Run) -> None:
    result = run("helium", "1.5", "K")
    assert result.exit_code == 0
    assert "4He at saturated vapour pressure, 1.5 K on ITS-90" in result.stdout
    # 471.5371 Pa: ITS-90, tests/published/helium/helium4_saturated_vapour_density.csv
    assert "471.54   Pa" in result.stdout
    assert "1.25 to 5 K" in result.stdout
    assert "Donnelly" in result.stdout
    assert "not available" in result.stdout


def test_a_temperature_on_another_scale_is_converted_and_said(run: Run) -> None:
    result = run("helium", "2.1720 K on T58")
    assert "2.17663(20) K on ITS-90" in result.stdout
    assert "equal vapour pressure" in result.stdout


def test_a_blank_is_no_quantity(run: Run) -> None:
    result = run("convert", " ")
    assert result.exit_code == 2
    assert "expected a quantity such as" in result.stderr


@pytest.mark.parametrize(
    ("text", "sentence"),
    [
        pytest.param("0.05 K", "no property of 4He is tabulated", id="too-cold"),
        pytest.param("400 K", "no property of 4He is tabulated", id="too-warm"),
        pytest.param("-1 K", "above 0", id="negative"),
        pytest.param("1.5", "without a unit", id="no-unit"),
        pytest.param(" ", "expected a temperature", id="blank"),
        pytest.param("3 Torr", "expected a temperature", id="a-pressure"),
        pytest.param("1.0 K on T58", "outside the range", id="scale-ends"),
    ],
)
def test_what_is_no_temperature_of_the_tables_is_refused(text: str, sentence: str, run: Run) -> None:
    result = run("helium", text)
    assert result.exit_code == 2
    assert sentence in result.stderr
    assert result.stdout == ""
