"""PLTS-2000 against the published coefficients, fixed points and check tables."""

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from archive.physics import melting_pressure

PUBLISHED = Path(__file__).parents[2] / "published" / "thermometry"


def _rows(name: str) -> list[dict[str, str]]:
    rows = list(csv.DictReader((PUBLISHED / name).read_text(encoding="utf-8").splitlines()))
    assert rows, f"{name} is empty"
    return rows


def test_coefficients_are_the_published_ones() -> None:
    rows = _rows("plts2000_coefficients.csv")
    assert [int(row["i"]) for row in rows] == list(range(-3, 10))
    assert [float(row["a_i_MPa_per_K^i"]) for row in rows] == list(melting_pressure._A)


@pytest.mark.parametrize("row", _rows("plts2000_check.csv"), ids=lambda r: r["T2000_K"])
def test_pressure_table(row: dict[str, str]) -> None:
    T = float(row["T2000_K"])
    assert melting_pressure.pressure_plts2000(T) == pytest.approx(
        1e6 * float(row["p_MPa"]), abs=1e6 * float(row["tolerance_MPa"])
    )
    # Six figures; at the minimum the slope itself is rounding, hence 10 Pa/K.
    expected = 1e6 * float(row["dp_dT_MPa_per_K"])
    assert melting_pressure.pressure_per_temperature(T) == pytest.approx(expected, rel=5e-6, abs=10)


@pytest.mark.parametrize("row", _rows("plts2000_inverse_check.csv"), ids=lambda r: r["p_MPa"])
@pytest.mark.parametrize("branch", ["low", "high"])
def test_temperature_table(row: dict[str, str], branch: str) -> None:
    expected = row[f"T2000_{branch}_branch_K"]
    pressure = 1e6 * float(row["p_MPa"])
    if expected:
        found = melting_pressure.temperature_plts2000(pressure, branch=branch)
        assert found == pytest.approx(float(expected), abs=float(row["tolerance_K"]))
    else:
        with pytest.raises(ValueError, match="the low branch"):
            melting_pressure.temperature_plts2000(pressure, branch=branch)


@pytest.mark.parametrize("row", _rows("plts2000_fixed_points.csv"), ids=lambda r: r["point"])
def test_fixed_points(row: dict[str, str]) -> None:
    """Rusby et al. (2002): five decimals of MPa, so 5 Pa."""
    found = melting_pressure.pressure_plts2000(1e-3 * float(row["T2000_mK"]))
    assert found == pytest.approx(1e6 * float(row["p_MPa_published"]), abs=5)


def test_fixed_points_carried_are_the_published_ones() -> None:
    rows = _rows("plts2000_fixed_points.csv")
    published = [(1e-3 * float(r["T2000_mK"]), 1e6 * float(r["p_MPa_published"])) for r in rows]
    np.testing.assert_allclose([(T, p) for _, T, p in melting_pressure.FIXED_POINTS], published, rtol=1e-12)


def test_minimum() -> None:
    """Computed minimum at 315.2396 mK, 2.9311306 MPa; curvature 6.6085 MPa/K^2."""
    T = melting_pressure.temperature_of_minimum()
    assert pytest.approx(0.3152396, abs=5e-8) == T
    assert melting_pressure.pressure_range_plts2000("low")[0] == pytest.approx(2.9311306e6, abs=0.05)
    h = 1e-4
    p = melting_pressure.pressure_plts2000([T - h, T, T + h])
    assert (p[0] - 2 * p[1] + p[2]) / h**2 == pytest.approx(6.6085e6, rel=1e-3)


@given(st.floats(0.9e-3, 0.31))
def test_low_branch_round_trip(temperature: float) -> None:
    pressure = melting_pressure.pressure_plts2000(temperature)
    assert float(melting_pressure.temperature_plts2000(pressure, branch="low")) == pytest.approx(
        temperature, abs=1e-11
    )


@given(st.floats(0.32, 1.0))
def test_high_branch_round_trip(temperature: float) -> None:
    pressure = melting_pressure.pressure_plts2000(temperature)
    assert float(melting_pressure.temperature_plts2000(pressure, branch="high")) == pytest.approx(
        temperature, abs=1e-11
    )


def test_both_branches_meet_at_the_minimum() -> None:
    T = melting_pressure.temperature_of_minimum()
    p = melting_pressure.pressure_plts2000(T)
    assert melting_pressure.temperature_plts2000(p, branch="low") == pytest.approx(T, abs=1e-7)
    assert melting_pressure.temperature_plts2000(p, branch="high") == pytest.approx(T, abs=1e-7)


def test_branch_has_no_default() -> None:
    with pytest.raises(TypeError):
        melting_pressure.temperature_plts2000(3.0e6)  # type: ignore[call-arg]
    with pytest.raises(ValueError, match="branch: found 'middle'"):
        melting_pressure.temperature_plts2000(3.0e6, branch="middle")  # type: ignore[arg-type]


@pytest.mark.parametrize("temperature", [0.68e-3, 1.01, -1.0])
def test_temperature_outside_is_refused(temperature: float) -> None:
    with pytest.raises(ValueError, match="PLTS-2000"):
        melting_pressure.pressure_plts2000([0.1, temperature])


@pytest.mark.parametrize("pressure", [2.9311e6, 4.0e6])
def test_pressure_outside_is_refused(pressure: float) -> None:
    with pytest.raises(ValueError, match="the high branch of PLTS-2000"):
        melting_pressure.temperature_plts2000(pressure, branch="high")


@pytest.mark.parametrize(("pressure", "millikelvin"), [(1.0, 0.55), (10.0, 1.7), (100.0, 5.5)])
def test_uncertainty_at_the_minimum(pressure: float, millikelvin: float) -> None:
    u = melting_pressure.temperature_uncertainty(melting_pressure.temperature_of_minimum(), pressure)
    assert 1e3 * u == pytest.approx(millikelvin, rel=0.03)


def test_uncertainty_elsewhere_is_by_the_slope() -> None:
    T = np.array([0.01, 0.1, 0.28, 0.7])
    expected = 3.0 / np.abs(melting_pressure.pressure_per_temperature(T))
    np.testing.assert_allclose(melting_pressure.temperature_uncertainty(T, 3.0), expected)


def test_uncertainty_has_no_step_towards_the_minimum() -> None:
    T = np.linspace(0.29, 0.34, 20001)
    u = melting_pressure.temperature_uncertainty(T, 50.0)
    assert np.max(np.abs(np.diff(u))) < 0.02 * u.max()


def test_negative_uncertainty_is_refused() -> None:
    with pytest.raises(ValueError, match="pressure_uncertainty"):
        melting_pressure.temperature_uncertainty(0.1, -1.0)
