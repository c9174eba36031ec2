"""ITS-90 helium vapour pressure against its published coefficients, check tables and two libraries."""

import csv
import warnings
from pathlib import Path

import heprops.helium as heprops_helium
import liquid_helium_svp
import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI
from hypothesis import given
from hypothesis import strategies as st

from archive.physics import vapour_pressure

PUBLISHED = Path(__file__).parents[2] / "published" / "thermometry"


def _rows(name: str) -> list[dict[str, str]]:
    rows = list(csv.DictReader((PUBLISHED / name).read_text(encoding="utf-8").splitlines()))
    assert rows, f"{name} is empty"
    return rows


@pytest.mark.parametrize(
    "row",
    _rows("its90_vapour_pressure_check.csv"),
    ids=lambda r: f"{r['range_id']}-{r['direction']}-{r['input']}",
)
def test_check_table(row: dict[str, str]) -> None:
    """Preston-Thomas (1990), both directions, to the stated tolerance."""
    function = (
        vapour_pressure.temperature_its90
        if row["direction"] == "T_from_p"
        else vapour_pressure.pressure_its90
    )
    found = float(function(float(row["input"]), row["isotope"]))
    assert found == pytest.approx(float(row["expected"]), rel=0, abs=float(row["tolerance"]))


@pytest.mark.parametrize("row", _rows("its90_sensitivity.csv"), ids=lambda r: f"{r['isotope']}-{r['T90_K']}")
def test_sensitivity_table(row: dict[str, str]) -> None:
    """Preston-Thomas (1990), differentiated apart from this code; six figures."""
    per_pascal = vapour_pressure.temperature_per_pressure(float(row["p_Pa"]), row["isotope"])
    assert 1 / per_pascal == pytest.approx(float(row["dp_dT_Pa_per_K"]), rel=2e-6)


@pytest.mark.parametrize("row", _rows("its90_helium_coefficients.csv"), ids=lambda r: r["range_id"])
def test_coefficients_are_the_published_ones(row: dict[str, str]) -> None:
    equation = {
        "3He": vapour_pressure._HELIUM3,
        "4He-II": vapour_pressure._HELIUM4_II,
        "4He-I": vapour_pressure._HELIUM4_I,
    }[row["range_id"]]
    expected = [float(row[f"A{i}_K"]) for i in range(10)]
    assert [*equation.A, *([0.0] * (10 - len(equation.A)))] == expected
    assert (float(row["B"]), float(row["C"])) == (equation.B, equation.C)


@pytest.mark.parametrize(
    ("isotope", "low", "high"), [("3He", 115.906, 101662.1), ("4He", 114.7343, 196016.53)], ids=["3He", "4He"]
)
def test_pressure_range(isotope: str, low: float, high: float) -> None:
    assert vapour_pressure.pressure_range_its90(isotope) == pytest.approx((low, high), rel=1e-5)


def test_lambda_join_is_smooth_to_its_known_step() -> None:
    below, above = vapour_pressure.temperature_its90([5041.8129, 5041.8131])
    assert abs(above - below) < 0.4e-6
    assert vapour_pressure.pressure_its90(2.1768) == pytest.approx(5041.815, abs=6e-4)


@given(st.floats(0.65, 3.2))
def test_helium3_round_trip(temperature: float) -> None:
    pressure = vapour_pressure.pressure_its90(temperature, "3He")
    assert float(vapour_pressure.temperature_its90(pressure, "3He")) == pytest.approx(temperature, rel=1e-12)


@given(st.floats(1.25, 5.0))
def test_helium4_round_trip(temperature: float) -> None:
    pressure = vapour_pressure.pressure_its90(temperature)
    assert float(vapour_pressure.temperature_its90(pressure)) == pytest.approx(temperature, abs=0.4e-6)


@pytest.mark.parametrize("isotope", ["3He", "4He"])
def test_sensitivity_is_the_slope(isotope: str) -> None:
    low, high = vapour_pressure.pressure_range_its90(isotope)
    p = np.geomspace(low * 1.01, high * 0.99, 60)
    p = p[np.abs(p / 5041.813 - 1) > 1e-3]
    h = 1e-5 * p
    slope = (
        vapour_pressure.temperature_its90(p + h, isotope) - vapour_pressure.temperature_its90(p - h, isotope)
    ) / (2 * h)
    np.testing.assert_allclose(vapour_pressure.temperature_per_pressure(p, isotope), slope, rtol=1e-6)


@pytest.mark.parametrize(
    ("pressure", "isotope"),
    [(114.0, "4He"), (196100.0, "4He"), (115.0, "3He"), (101700.0, "3He"), (0.0, "4He"), (-1.0, "4He")],
)
def test_outside_the_range_is_refused(pressure: float, isotope: str) -> None:
    with pytest.raises(ValueError, match=r"pressure\[1\] = .* outside the range"):
        vapour_pressure.temperature_its90([2000.0, pressure], isotope)


@pytest.mark.parametrize(
    ("temperature", "isotope"), [(1.2499, "4He"), (5.001, "4He"), (0.6499, "3He"), (3.2001, "3He")]
)
def test_temperature_outside_is_refused(temperature: float, isotope: str) -> None:
    with pytest.raises(ValueError, match=f"the ITS-90 {isotope} equation"):
        vapour_pressure.pressure_its90(temperature, isotope)


def test_refusal_below_names_the_estimate() -> None:
    with pytest.raises(ValueError, match="differently named estimate"):
        vapour_pressure.pressure_its90(1.0)


@pytest.mark.parametrize(
    "function",
    [
        vapour_pressure.temperature_its90,
        vapour_pressure.pressure_its90,
        vapour_pressure.temperature_range_its90,
        vapour_pressure.pressure_range_its90,
    ],
)
def test_unknown_isotope_is_refused(function) -> None:
    arguments = () if "range" in function.__name__ else (2.0,)
    with pytest.raises(ValueError, match="isotope: found '6He'"):
        function(*arguments, isotope="6He")


def test_missing_readings_stay_missing() -> None:
    assert np.isnan(vapour_pressure.temperature_its90([np.nan, 1e4])).tolist() == [True, False]
    assert np.isnan(vapour_pressure.pressure_its90([np.nan, 2.0])).tolist() == [True, False]
    assert np.isnan(vapour_pressure.pressure_estimate(np.nan))


@pytest.mark.parametrize(
    ("temperature", "pressure"), [(0.65, 0.1101), (0.8, 1.475), (1.0, 15.58), (1.2, 81.52)], ids=str
)
def test_estimate_against_the_table_below_the_scale(temperature: float, pressure: float) -> None:
    """Donnelly and Barenghi (1998), 0.1 per cent."""
    assert vapour_pressure.pressure_estimate(temperature) == pytest.approx(pressure, rel=1e-3)


def test_estimate_joins_the_scale() -> None:
    assert vapour_pressure.pressure_estimate(1.25) == pytest.approx(
        float(vapour_pressure.pressure_its90(1.25)), rel=3e-4
    )


@given(st.floats(0.5, 1.25))
def test_estimate_round_trip(temperature: float) -> None:
    found = vapour_pressure.temperature_estimate(vapour_pressure.pressure_estimate(temperature))
    assert float(found) == pytest.approx(temperature, rel=1e-12)


@pytest.mark.parametrize("temperature", [0.49, 1.26])
def test_estimate_has_a_range(temperature: float) -> None:
    with pytest.raises(ValueError, match="vapour pressure estimate"):
        vapour_pressure.pressure_estimate(temperature)
    with pytest.raises(ValueError, match="vapour pressure estimate"):
        vapour_pressure.temperature_estimate(1e3 if temperature > 1 else 1e-4)


def test_helium4_agrees_with_liquid_helium_svp() -> None:
    """Its spline is within 0.06 per cent of ITS-90, 0.12 per cent below 1.4 K; its inverse is ITS-90 itself, without limits."""
    for T in np.arange(1.45, 4.9, 0.15):
        assert float(liquid_helium_svp.pressure_SVP(float(T))) == pytest.approx(
            float(vapour_pressure.pressure_its90(T)), rel=8e-4
        )
    for p in (200.0, 3000.0, 2e4, 101325.0):
        found = float(vapour_pressure.temperature_its90(p))
        assert float(liquid_helium_svp.temperature_from_pressure_SVP(p)) == pytest.approx(found, abs=1e-6)


def test_helium4_agrees_with_coolprop() -> None:
    """Ortiz Vega et al.: -0.07 to +0.06 per cent below 3.5 K, -0.16 per cent at 4.2 K, further off above."""
    for T in (2.2, 2.5, 3.0, 3.5, 4.0, 4.2):
        assert PropsSI("P", "T", T, "Q", 0, "Helium") == pytest.approx(
            float(vapour_pressure.pressure_its90(T)), rel=2e-3
        )


def test_helium4_agrees_with_heprops() -> None:
    """Table of the Donnelly-Barenghi web edition, four figures: 0.03 per cent."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        for T in (1.3, 1.5, 1.8, 2.0, 2.5, 3.0, 3.5, 4.0, 4.5, 4.9):
            carried = float(heprops_helium.pressure_SVP(T))
            assert carried == pytest.approx(float(vapour_pressure.pressure_its90(T)), rel=5e-4)
