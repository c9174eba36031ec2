"""The rows of the property table: always the same ones, each available in its range and only there."""

import pytest

from archive.physics.helium_properties import properties

NAMES = [row.name for row in properties(1.5)]


@pytest.mark.parametrize(
    ("temperature", "missing"),
    [
        (0.3, {"vapour pressure", "vapour pressure (estimate)", "density, vapour", "density, normal component",
               "viscosity, liquid", "second sound", "second virial coefficient"}),
        (1.1, {"vapour pressure"}),
        (1.5, {"vapour pressure (estimate)"}),
        (2.1768, {"vapour pressure (estimate)", "specific heat, liquid"}),
        (4.2, {"vapour pressure (estimate)", "second sound"}),
        (4.8, set(NAMES) - {"vapour pressure", "second virial coefficient"}),
        (77.0, set(NAMES) - {"second virial coefficient"}),
    ],
    ids=lambda value: f"{value} K" if isinstance(value, float) else f"{len(value)} missing",
)  # fmt: skip
def test_what_is_available(temperature: float, missing: set[str]) -> None:
    rows = properties(temperature)
    assert [row.name for row in rows] == NAMES
    assert {row.name for row in rows if row.value is None} == missing
    for row in rows:
        assert row.unit
        assert row.source
        assert row.note.startswith("not available") == (row.value is None)


def test_values_are_in_si() -> None:
    """ITS-90; Donnelly and Barenghi (1998)."""
    rows = {row.name: (row.value, row.unit) for row in properties(2.0)}
    assert rows["vapour pressure"] == (pytest.approx(3129.6659, abs=1e-3), "Pa")
    assert rows["viscosity, liquid"] == (pytest.approx(1.468e-6, rel=1e-3), "Pa s")
    assert rows["surface tension"] == (pytest.approx(0.29926e-3, rel=1e-4), "N/m")
    assert rows["second virial coefficient"] == (pytest.approx(-194.48e-6, rel=1e-6), "m^3/mol")


@pytest.mark.parametrize("temperature", [0.0, -1.0, float("nan")])
def test_senseless_temperature_is_refused(temperature: float) -> None:
    with pytest.raises(ValueError, match="temperature: found"):
        properties(temperature)
