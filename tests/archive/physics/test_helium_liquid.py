"""Liquid 4He (density to second sound and viscosity) against the recommended table and three libraries, where those are known to be right."""

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

from archive.physics import helium_liquid, helium_sound, helium_viscosity

TABLE = Path(__file__).parents[2] / "published" / "helium" / "helium4_liquid_svp.csv"
ROWS = list(csv.DictReader(TABLE.read_text(encoding="utf-8").splitlines()))

# Column, function, factor to SI, absolute tolerance in SI, relative tolerance (SOURCE.md beside the table).
COLUMNS = [
    ("density_kg_per_m3", helium_liquid.density, 1.0, 3e-3, 0.0),
    ("superfluid_fraction", helium_liquid.superfluid_fraction, 1.0, 1e-3, 0.0),
    ("specific_heat_sat_J_per_kg_K", helium_liquid.specific_heat, 1.0, 0.0, 5e-3),
    ("viscosity_uPa_s", helium_viscosity.viscosity, 1e-6, 0.0, 1e-2),
    ("surface_tension_mN_per_m", helium_liquid.surface_tension, 1e-3, 2e-6, 0.0),
    ("second_sound_m_per_s", helium_sound.second_sound, 1.0, 0.0, 5e-3),
    ("first_sound_m_per_s", helium_sound.first_sound, 1.0, 0.0, 5e-3),
]


def test_the_table_is_whole() -> None:
    assert len(ROWS) == 54


@pytest.mark.parametrize("row", ROWS, ids=lambda r: r["T90_K"])
def test_every_cell_of_the_table(row: dict[str, str]) -> None:
    """Donnelly and Barenghi (1998). An empty cell is refused, never zero."""
    T = float(row["T90_K"])
    for column, function, factor, absolute, relative in COLUMNS:
        if row[column]:
            assert function(T) == pytest.approx(factor * float(row[column]), abs=absolute, rel=relative), (
                column
            )
        else:
            with pytest.raises(ValueError, match="outside the range"):
                function(T)


@pytest.mark.parametrize(
    ("name", "function", "low", "relative"),
    [
        ("density", helium_liquid.density, 0.1, 4e-5),
        ("viscosity", helium_viscosity.viscosity, 0.8, 2.1e-2),
        ("surface_tension", helium_liquid.surface_tension, 0.1, 1e-3),
        ("specific_heat_SVP", helium_liquid.specific_heat, 0.1, 2.1e-2),
        ("sound_velocity_first", helium_sound.first_sound, 0.1, 5e-3),
        ("sound_velocity_second", helium_sound.second_sound, 0.6, 8e-3),
    ],
)
def test_between_the_rows_against_liquid_helium_svp(name, function, low, relative) -> None:
    """Its splines are the source of the table; its density is 0 at 1.334 K and its second sound wrong above 2.1766 K."""
    carried = getattr(liquid_helium_svp, name)
    warmest = 2.174 if name == "sound_velocity_second" else 4.22
    for T in np.arange(low + 0.013, warmest, 0.0171):
        if abs(T - 1.334) < 2e-3 or 2.175 < T < 2.18:
            continue
        assert function(T) == pytest.approx(float(carried(float(T))), rel=relative), f"at {T:.4f} K"


def test_superfluid_fraction_against_liquid_helium_svp() -> None:
    for T in np.arange(0.9, 2.176, 0.0093):
        if abs(T - 1.334) < 2e-3:
            continue
        carried = float(liquid_helium_svp.density_superfluid(float(T))) / float(
            liquid_helium_svp.density(float(T))
        )
        assert helium_liquid.superfluid_fraction(T) == pytest.approx(carried, abs=1e-3), f"at {T:.4f} K"


def test_density_and_fraction_against_heprops() -> None:
    """Every 0.05 K of its table, to 20 ppm and to its rounding, but for the fraction at 1.40 K (0.9235, smooth values have 0.9272).

    The rows beside the lambda point, through which it interpolates, and those from 4.95 K up (another source) are no part of our range.
    """
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        for T in np.round(np.arange(0.5, 4.21, 0.05), 2):
            ours, theirs = float(helium_liquid.density(T)), float(heprops_helium.density_SVP(T))
            assert ours == pytest.approx(theirs, abs=3e-3), f"density at {T} K"
            if T < 2.17 and T != 1.40:
                fraction = float(heprops_helium.superfluid_fraction_SVP(T))
                assert helium_liquid.superfluid_fraction(T) == pytest.approx(fraction, abs=1.001e-3), f"fraction at {T} K"  # fmt: skip


@pytest.mark.parametrize(
    ("T", "relative"), [(2.3, 4e-4), (2.5, 4e-4), (3.0, 4e-4), (3.5, 1.5e-3), (4.2, 2.5e-3)], ids=str
)
def test_density_against_coolprop(T: float, relative: float) -> None:
    """Ortiz Vega et al. (NISTIR 8474): within 0.04 per cent at 2.3-3.0 K, -0.22 per cent at 4.2 K."""
    assert helium_liquid.density(T) == pytest.approx(PropsSI("D", "T", T, "Q", 0, "Helium"), rel=relative)
    assert helium_liquid.surface_tension(T) == pytest.approx(
        PropsSI("I", "T", T, "Q", 0, "Helium"), rel=1.7e-2
    )


@pytest.mark.parametrize(
    ("T", "eta_uP", "rho", "rho_n", "delta_um"),
    [
        (1.2, 17.36, 145.12, 3.750, 12.140), (1.5, 13.46, 145.16, 16.166, 5.148), (1.8, 12.98, 145.35, 45.538, 3.012),
        (2.0, 14.68, 145.62, 80.549, 2.408), (2.1, 18.03, 145.83, 108.04, 2.305), (2.17, 23.85, 146.07, 138.78, 2.339),
        (2.2, 26.35, 146.10, 146.10, 2.396), (2.5, 32.59, 144.84, 144.84, 2.676), (3.0, 35.17, 141.23, 141.23, 2.815),
        (3.5, 35.09, 136.07, 136.07, 2.865), (4.2, 32.44, 125.41, 125.41, 2.870),
    ],
    ids=str,
)  # fmt: skip
def test_penetration_depth_at_one_kilohertz(
    T: float, eta_uP: float, rho: float, rho_n: float, delta_um: float
) -> None:
    """Donnelly-Barenghi fits and sqrt(2 eta/(rho_n w)), computed apart; half a unit of the fraction is 0.007 kg/m3."""
    assert helium_viscosity.viscosity(T) == pytest.approx(1e-7 * eta_uP, rel=5e-4)
    assert helium_liquid.density(T) == pytest.approx(rho, abs=6e-3)
    assert helium_liquid.normal_density(T) == pytest.approx(rho_n, abs=1.3e-2)
    assert helium_viscosity.viscous_penetration_depth(T, 1000.0) == pytest.approx(1e-6 * delta_um, rel=1e-3)


def test_second_sound_follows_from_the_other_properties() -> None:
    """u2^2 = (rho_s/rho_n) T s^2/c, entropy integrated from the specific heat: 1 per cent from 1.8 to 2.172 K."""
    grid = np.concatenate([np.geomspace(0.1, 2.1, 4000), np.linspace(2.1, 2.1725, 1000)[1:]])
    c = helium_liquid.specific_heat(grid)
    steps = np.diff(grid) * 0.5 * (c[1:] / grid[1:] + c[:-1] / grid[:-1])
    # The phonon law c proportional to T^3 gives the entropy at the cold end.
    entropy = c[0] / 3 + np.concatenate([[0.0], np.cumsum(steps)])
    for T in (1.8, 1.9, 2.0, 2.1, 2.15):
        i = int(np.argmin(np.abs(grid - T)))
        fraction = helium_liquid.superfluid_fraction(grid[i])
        u2 = np.sqrt(fraction / (1 - fraction) * grid[i] * entropy[i] ** 2 / c[i])
        assert helium_sound.second_sound(grid[i]) == pytest.approx(u2, rel=1e-2), f"at {T} K"


def test_specific_heat_near_absolute_zero_is_that_of_phonons() -> None:
    """0.02076 J/(kg K) at 0.1 K from the speed of sound; the table is 0.8 per cent lower."""
    assert helium_liquid.specific_heat(0.1) == pytest.approx(0.02076, rel=1e-2)


def test_values_to_remember() -> None:
    """Donnelly and Barenghi (1998)."""
    assert helium_liquid.density(2.1768) == pytest.approx(146.109, abs=1e-3)
    assert helium_liquid.superfluid_fraction(2.0) == pytest.approx(0.4469, abs=1e-4)
    assert helium_viscosity.viscosity(4.2) == pytest.approx(3.244e-6, rel=1e-3)
    assert helium_liquid.surface_tension(4.2) == pytest.approx(0.0895e-3, abs=1e-7)


def test_lambda_point_is_approached_from_both_sides() -> None:
    below, above = helium_liquid.density([2.1768 - 1e-9, 2.1768 + 1e-9])
    assert below == pytest.approx(above, rel=1e-8)
    assert helium_liquid.superfluid_fraction([2.1768, 2.2]).tolist() == [0.0, 0.0]
    assert helium_sound.second_sound(2.1768) == 0.0


@given(st.floats(0.1, 2.1767))
def test_superfluid_fraction_is_a_fraction(T: float) -> None:
    assert 0 < float(helium_liquid.superfluid_fraction(T)) <= 1


@given(st.floats(1.0, 4.2221))
def test_normal_density_never_exceeds_the_density(T: float) -> None:
    assert 0 < float(helium_liquid.normal_density(T)) <= float(helium_liquid.density(T)) * (1 + 1e-15)


@pytest.mark.parametrize(
    ("function", "T"),
    [
        (helium_liquid.density, 0.05), (helium_liquid.density, 4.3), (helium_liquid.normal_density, 0.9),
        (helium_viscosity.viscosity, 0.79), (helium_sound.second_sound, 2.2), (helium_sound.second_sound, 0.5),
        (helium_liquid.specific_heat, 5.0), (helium_liquid.surface_tension, 4.3), (helium_sound.first_sound, 0.0),
    ],
)  # fmt: skip
def test_outside_is_refused(function, T) -> None:
    with pytest.raises(ValueError, match=r"temperature\[0\] = .* outside the range"):
        function([T, 2.0])


def test_specific_heat_is_refused_at_the_singularity() -> None:
    with pytest.raises(ValueError, match=r"temperature\[1\] = 2.1768 K lies between"):
        helium_liquid.specific_heat([2.0, 2.1768])


def test_missing_stays_missing() -> None:
    for function in (
        helium_liquid.density,
        helium_viscosity.viscosity,
        helium_liquid.specific_heat,
        helium_sound.second_sound,
    ):
        assert np.isnan(function([np.nan, 2.0])).tolist() == [True, False]


def test_lambda_line_estimate_has_the_published_slope() -> None:
    """-8.88 mK/bar at saturated vapour pressure, good to 1 mK below 1 bar."""
    T = helium_liquid.lambda_temperature_estimate([5042.0, 55042.0])
    assert T[0] == 2.1768
    assert T[1] - T[0] == pytest.approx(-4.44e-3, abs=1e-6)
    with pytest.raises(ValueError, match="lambda line estimate"):
        helium_liquid.lambda_temperature_estimate(2e5)


def test_lambda_line_estimate_is_plausible_beside_the_1948_scale() -> None:
    """Swenson's first point, 3.18 atm and 2.15 K, on a scale 9 mK above T90: straight line back to its 2.186 K, 15 mK."""
    rows = list(
        csv.DictReader(
            (TABLE.parent / "helium4_lambda_line_coarse.csv").read_text(encoding="utf-8").splitlines()
        )
    )
    slope = (float(rows[0]["T_Leiden1948_scale_K"]) - 2.186) / (101325 * float(rows[0]["p_atm"]))
    expected = 2.1768 + slope * (1e5 - 5042)
    assert helium_liquid.lambda_temperature_estimate(1e5) == pytest.approx(expected, abs=15e-3)


@pytest.mark.parametrize("frequency", [0.0, -10.0])
def test_penetration_depth_needs_a_frequency(frequency: float) -> None:
    with pytest.raises(ValueError, match="frequency"):
        helium_viscosity.viscous_penetration_depth(2.0, frequency)
