"""Saturated vapour of 4He and capillary condensation, against tables and an equation of state."""

import csv
from pathlib import Path

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI

from archive.physics import helium_vapour

PUBLISHED = Path(__file__).parents[2] / "published" / "helium"


def _rows(name: str) -> list[dict[str, str]]:
    rows = list(csv.DictReader((PUBLISHED / name).read_text(encoding="utf-8").splitlines()))
    assert rows, f"{name} is empty"
    return rows


@pytest.mark.parametrize("row", _rows("helium4_saturated_vapour_density.csv"), ids=lambda r: r["T90_K"])
def test_saturated_vapour_table(row: dict[str, str]) -> None:
    """Both columns: virial and equation of state, to the tolerance of the table."""
    found = helium_vapour.saturated_vapour_density(float(row["T90_K"]))
    tolerance = 0.01 * float(row["relative_tolerance"].rstrip("%"))
    assert found == pytest.approx(float(row["rho_v_virial_kg_per_m3"]), rel=tolerance)
    if row["rho_v_CoolProp_8.0.0_kg_per_m3"]:
        assert found == pytest.approx(
            float(row["rho_v_CoolProp_8.0.0_kg_per_m3"]), rel=max(tolerance, 1.5e-3)
        )


def test_saturated_vapour_between_the_rows() -> None:
    """NISTIR 8474 through CoolProp at the ITS-90 temperature; its own pressure is 0.07 to 0.16 per cent off."""
    for T in (2.2, 2.4, 2.6, 2.9, 3.1, 3.4, 3.6, 3.9, 4.1):
        found = float(helium_vapour.saturated_vapour_density(T))
        assert found == pytest.approx(PropsSI("D", "T", T, "Q", 1, "Helium"), rel=5e-3)


@pytest.mark.parametrize(
    ("T", "p0", "umol_per_cm3"),
    [
        (0.5, 2.0642e-3, 4.965e-4), (0.7, 0.29232, 0.050228), (1.0, 15.576, 1.87506), (1.25, 114.73, 11.0826),
        (1.5, 471.54, 38.2137), (1.75, 1365.6, 95.962), (2.0, 3129.7, 195.660),
    ],
    ids=str,
)  # fmt: skip
def test_saturated_vapour_in_the_trade_unit(T: float, p0: float, umol_per_cm3: float) -> None:
    """Computed apart from ITS-90, the estimate, and B of the older potential: five figures, B to 1 per cent."""
    assert helium_vapour.saturated_vapour_pressure(T) == pytest.approx(p0, rel=5e-5)
    assert helium_vapour.saturated_molar_density(T) == pytest.approx(umol_per_cm3, rel=5e-4)


@pytest.mark.parametrize("T", [0.4, 4.3])
def test_saturated_vapour_outside_is_refused(T: float) -> None:
    with pytest.raises(ValueError, match="saturated vapour density"):
        helium_vapour.saturated_molar_density(T)


def test_missing_stays_missing() -> None:
    assert np.isnan(helium_vapour.saturated_molar_density([np.nan, 1.0, 2.0])).tolist() == [
        True,
        False,
        False,
    ]


@pytest.mark.parametrize(
    ("radius_nm", "emptying", "filling"),
    [(3.5, 0.664, 0.815), (25, 0.944, 0.972), (100, 0.986, 0.993)],
    ids=str,
)
def test_capillary_condensation_in_three_pores(radius_nm: float, emptying: float, filling: float) -> None:
    """Worked apart with gamma = 0.324 mN/m; three figures."""
    found = [
        float(helium_vapour.capillary_condensation_ratio(1.5, 1e-9 * radius_nm, meniscus=m))
        for m in ("hemispherical", "cylindrical")
    ]
    assert found == pytest.approx([emptying, filling], abs=6e-4)


def test_capillary_condensation_refuses_other_words() -> None:
    with pytest.raises(ValueError, match="meniscus: found 'flat'"):
        helium_vapour.capillary_condensation_ratio(1.5, 1e-9, meniscus="flat")
    with pytest.raises(ValueError, match="radius"):
        helium_vapour.capillary_condensation_ratio(1.5, 0.0, meniscus="cylindrical")
