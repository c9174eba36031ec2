"""Constants against CODATA 2022 as another library carries it, and against the published table."""

import csv
from pathlib import Path

import pytest
from scipy import constants as codata

from archive.physics import constants

TABLE = Path(__file__).parents[2] / "published" / "helium" / "constants.csv"
PUBLISHED = {
    row["symbol"]: float(row["value"])
    for row in csv.DictReader(TABLE.read_text(encoding="utf-8").splitlines())
}


@pytest.mark.parametrize(
    ("name", "symbol"),
    [
        ("BOLTZMANN", "k"),
        ("AVOGADRO", "N_A"),
        ("PLANCK", "h"),
        ("ELEMENTARY_CHARGE", "e"),
        ("GAS_CONSTANT", "R"),
        ("ATOMIC_MASS_CONSTANT", "m_u"),
        ("STANDARD_GRAVITY", "g_n"),
        ("STANDARD_ATMOSPHERE", "atm"),
    ],
)
def test_constant_has_its_published_value(name: str, symbol: str) -> None:
    assert getattr(constants, name) == PUBLISHED[symbol]


def test_constants_agree_with_scipy() -> None:
    assert codata.k == constants.BOLTZMANN
    assert pytest.approx(codata.hbar, rel=1e-15) == constants.HBAR
    assert pytest.approx(codata.R, rel=1e-15) == constants.GAS_CONSTANT
    assert pytest.approx(codata.atomic_mass, rel=1e-9) == constants.ATOMIC_MASS_CONSTANT


def test_helium_masses_are_those_of_the_atoms() -> None:
    # The neutral 4He atom is heavier than the alpha particle by two electrons, less 79 eV of binding.
    electrons = 2 * codata.m_e - 79.0 * codata.e / codata.c**2
    alpha = codata.physical_constants["alpha particle mass"][0]
    assert pytest.approx(alpha + electrons, rel=1e-9) == constants.MASS_HELIUM4
    assert pytest.approx(PUBLISHED["A_r(3He)"] * PUBLISHED["m_u"], rel=1e-12) == constants.MASS_HELIUM3
    assert pytest.approx(4.00260325413e-3, rel=2e-9) == constants.MOLAR_MASS_HELIUM4
    assert pytest.approx(3.016029322e-3, rel=2e-9) == constants.MOLAR_MASS_HELIUM3


def test_millimetre_of_mercury_is_neither_torr_nor_the_rounded_value() -> None:
    assert pytest.approx(133.322387415, abs=5e-10) == constants.MERCURY_MILLIMETRE
    assert abs(constants.MERCURY_MILLIMETRE - 101325 / 760) > 1e-5
