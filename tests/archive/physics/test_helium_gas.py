"""Gaseous helium against published correlations, tables and an equation of state."""

import csv
from pathlib import Path

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI
from hypothesis import given
from hypothesis import strategies as st

from archive.physics import helium_gas

PUBLISHED = Path(__file__).parents[2] / "published" / "helium"


def _rows(name: str) -> list[dict[str, str]]:
    rows = list(csv.DictReader((PUBLISHED / name).read_text(encoding="utf-8").splitlines()))
    assert rows, f"{name} is empty"
    return rows


@pytest.mark.parametrize("row", _rows("helium4_second_virial.csv"), ids=lambda r: r["T_K"])
def test_second_virial_table(row: dict[str, str]) -> None:
    """The table itself, the ITS-90 gas equation (0.13 cm3/mol), Gaiser and Fellmuth 2009 (0.06), NISTIR 8474 (0.35)."""
    T = float(row["T_K"])
    found = 1e6 * float(helium_gas.second_virial(T))
    assert found == pytest.approx(float(row["B_ab_initio_cm3_per_mol"]), abs=1e-6)
    for column, tolerance in (
        ("B_ITS90_equation_cm3_per_mol", 0.13),
        ("B_Gaiser_Fellmuth_2009_cm3_per_mol", 0.06),
        ("B_CoolProp_8.0.0_cm3_per_mol", 0.35 if T >= 2.5 else 2.1),
    ):
        if row[column]:
            assert found == pytest.approx(float(row[column]), abs=tolerance), column


def test_second_virial_between_the_rows() -> None:
    """ITS-90 equation 6b from 3 to 24.5561 K; Gaiser and Fellmuth, Metrologia 46, 525 (2009), from 4 to 30 K."""
    T = np.linspace(3.0, 24.5561, 500)
    B = 1e6 * helium_gas.second_virial(T)
    its90 = 16.708 - 374.05 / T - 383.53 / T**2 + 1799.2 / T**3 - 4033.2 / T**4 + 3252.8 / T**5
    assert np.max(np.abs(B - its90)) < 0.135
    T = np.linspace(4.0, 30.0, 500)
    gaiser = 18.5604 - 2.22170 / T**1.5 - 412.863 / T - 0.03094 * T
    assert np.max(np.abs(1e6 * helium_gas.second_virial(T) - gaiser)) < 0.07


def test_second_virial_above_30_kelvin_against_the_equation_of_state() -> None:
    for T in (35.0, 45.0, 70.0, 90.0, 125.0, 175.0, 225.0, 290.0):
        found = 1e6 * float(helium_gas.second_virial(T))
        assert found == pytest.approx(1e6 * PropsSI("Bvirial", "T", T, "Dmolar", 1e-6, "Helium"), abs=0.25)


@pytest.mark.parametrize(
    ("T", "B"),
    [
        (0.5, -1370),
        (0.7, -806),
        (1.0, -476.7),
        (1.25, -351.3),
        (1.5, -277.4),
        (1.75, -228.9),
        (2.0, -194.7),
        (2.2, -173.8),
        (2.5, -149.3),
        (3.0, -120.4),
        (3.5, -100.2),
        (4.2, -80.2),
        (5, -64.4),
        (6, -50.6),
        (8, -33.5),
        (10, -23.2),
    ],
    ids=str,
)
def test_cold_second_virial(T: float, B: float) -> None:
    """HFD-B(HE) potential of Aziz, McCourt and Wong (1987, parameters from memory), 1 per cent."""
    assert 1e6 * helium_gas.second_virial(T) == pytest.approx(B, rel=1e-2)


@pytest.mark.parametrize(("T", "B"), [(3.0, -86.04), (10.0, -16.11), (20.0, 0.07)], ids=str)
def test_helium3_second_virial(T: float, B: float) -> None:
    """ITS-90 equation 6a, worked by hand: 16.69 - 336.98/T + 91.04/T^2 - 13.82/T^3."""
    assert 1e6 * helium_gas.second_virial(T, "3He") == pytest.approx(B, abs=0.01)


def test_uncertainty_of_the_second_virial() -> None:
    u = 1e6 * helium_gas.second_virial_uncertainty([1.0, 4.2, 15.0, 300.0])
    assert u.tolist() == pytest.approx([4.767, 0.3, 0.1, 0.03])
    assert 1e6 * helium_gas.second_virial_uncertainty(5.0, "3He") == pytest.approx(0.3)
    assert np.isnan(helium_gas.second_virial_uncertainty(np.nan))


@pytest.mark.parametrize(("T", "isotope"), [(0.4, "4He"), (301.0, "4He"), (2.9, "3He"), (21.0, "3He")])
def test_second_virial_outside_is_refused(T: float, isotope: str) -> None:
    with pytest.raises(ValueError, match=f"second virial coefficient of {isotope}"):
        helium_gas.second_virial(T, isotope)


def test_unknown_isotope_is_refused() -> None:
    with pytest.raises(ValueError, match="isotope: found '6He'"):
        helium_gas.second_virial(4.0, "6He")


@pytest.mark.parametrize("T", [2.2, 2.5, 3.0, 4.2, 5.0])
@pytest.mark.parametrize("correction", [0.01, 0.03, 0.048])
def test_molar_density_against_the_equation_of_state(T: float, correction: float) -> None:
    """NISTIR 8474 through CoolProp: 0.08 per cent while B p/(R T) is below 0.05."""
    p = correction / abs(float(helium_gas.second_virial(T))) * 8.314462618 * T
    assert helium_gas.molar_density(p, T) == pytest.approx(
        PropsSI("Dmolar", "T", T, "P", p, "Helium"), rel=8e-4
    )


def test_first_order_is_the_expansion() -> None:
    p = np.array([10.0, 100.0, 1000.0])
    first = helium_gas.molar_density(p, 4.2, order="first")
    second = helium_gas.molar_density(p, 4.2)
    assert np.all(first < second)
    x = -helium_gas.second_virial(4.2) * p / (8.314462618 * 4.2)
    np.testing.assert_allclose(second / first - 1, x**2, rtol=0.2)


def test_dose_of_the_trade() -> None:
    """10.000 cm3 at 295.00 K and 100 times 133.322 Pa: ideal 54.35577 umol, with B = 11.86 cm3/mol 54.35226 umol."""
    pressure = 13332.2
    ideal = pressure * 10e-6 / (8.31446261815324 * 295.0)
    assert ideal == pytest.approx(54.35577e-6, rel=1e-6)
    assert helium_gas.amount_of_gas(pressure, 10e-6, 295.0) == pytest.approx(54.35226e-6, rel=1e-6)


def test_dense_gas_is_refused() -> None:
    with pytest.raises(ValueError, match="cut after B"):
        helium_gas.molar_density(1e5, 4.2)
    with pytest.raises(ValueError, match="pressure"):
        helium_gas.molar_density(-1.0, 4.2)
    with pytest.raises(ValueError, match="volume"):
        helium_gas.amount_of_gas(1.0, -1.0, 4.2)


@given(st.floats(0.0, 3e3), st.floats(2.0, 300.0))
def test_molar_density_solves_the_virial_equation(p: float, T: float) -> None:
    rho = float(helium_gas.molar_density(p, T))
    assert 8.31446261815324 * T * rho * (1 + float(helium_gas.second_virial(T)) * rho) == pytest.approx(
        p, rel=1e-12, abs=1e-300
    )


def test_dead_volumes_add_up() -> None:
    p = np.array([0.0, 100.0, 500.0])
    total = helium_gas.dead_volume_amount(p, volumes=[1e-6, 50e-6], temperatures=[1.5, 295.0])
    expected = helium_gas.amount_of_gas(p, 1e-6, 1.5) + helium_gas.amount_of_gas(p, 50e-6, 295.0)
    np.testing.assert_allclose(total, expected, rtol=1e-15)
    assert helium_gas.dead_volume_amount(100.0, volumes=[1e-6], temperatures=[1.5]).shape == ()


def test_dead_volume_with_a_temperature_sweep() -> None:
    T = np.array([1.2, 1.4])
    temperatures = np.stack([T, np.full(2, 295.0)], axis=-1)
    found = helium_gas.dead_volume_amount([10.0, 20.0], volumes=[1e-6, 2e-6], temperatures=temperatures)
    one = helium_gas.dead_volume_amount(20.0, volumes=[1e-6, 2e-6], temperatures=[1.4, 295.0])
    assert found[1] == one
