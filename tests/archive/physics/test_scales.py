"""Scale conversions against the published differences; refusals that say why."""

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pydantic import TypeAdapter

from archive.physics import scales, tables_t58
from archive.physics.scales import SCALES, convert, estimate_from_t58
from schemas.thermometer import ScaleName

PUBLISHED = Path(__file__).parents[2] / "published" / "thermometry"


def _rows(name: str) -> list[dict[str, str]]:
    rows = list(csv.DictReader((PUBLISHED / name).read_text(encoding="utf-8").splitlines()))
    assert rows, f"{name} is empty"
    return rows


@pytest.mark.parametrize(
    "row", _rows("scale_difference_check.csv"), ids=lambda r: f"{r['scale']}-{r['T_on_scale_K']}"
)
def test_difference_table(row: dict[str, str]) -> None:
    T = float(row["T_on_scale_K"])
    result = convert(T, source=row["scale"])
    assert 1e3 * (result.temperature - T) == pytest.approx(
        float(row["T90_minus_T_mK"]), abs=float(row["tolerance_mK"])
    )
    assert result.uncertainty > 0
    assert result.method.startswith(f"{row['scale']} to ITS-90: ")


@pytest.mark.parametrize(
    ("source", "T", "millikelvin", "tolerance"),
    [
        ("T62", 1.0, 3.395, 1e-3),
        ("T58", 4.0, 7.052, 2e-3),
        ("EPT-76", 4.0, -0.090, 1e-3),
        ("PTB-2006", 1.0, 0.651, 1e-3),
    ],
)
def test_against_the_open_reference_code(source: str, T: float, millikelvin: float, tolerance: float) -> None:
    """A. H. Harvey's code for historical scales (2026), as printed."""
    assert 1e3 * (convert(T, source=source).temperature - T) == pytest.approx(millikelvin, abs=tolerance)


@pytest.mark.parametrize("row", _rows("scale_equations.csv"), ids=lambda r: r["scale"])
def test_equations_are_the_published_ones(row: dict[str, str]) -> None:
    """Ln p of the published coefficients, written out, over the range of the conversion."""
    c = {name: float(text) for name, text in row.items() if name.startswith("c")}
    scale = next(each for each in SCALES if each.name == row["scale"])
    T = np.linspace(scale.low, scale.high, 50)
    powers = sum(c[f"c{k}"] * T**k for k in range(5))
    ours = {"T62": scales._t62, "PTB-2006": scales._ptb}[row["scale"]]
    np.testing.assert_allclose(ours(T)[0], c["c_invT"] / T + powers + c["c_lnT"] * np.log(T), rtol=1e-13)


@pytest.mark.parametrize("row", _rows("plts2000_to_its90_difference.csv"), ids=lambda r: r["T2000_K"])
def test_measured_differences_of_the_two_official_scales(row: dict[str, str]) -> None:
    """C. Pan et al. (2021), each of their points; between them a straight line."""
    T = float(row["T2000_K"])
    if scales.SCALES[1].low <= T <= scales.SCALES[1].high:
        assert 1e3 * (convert(T, source="PLTS-2000").temperature - T) == pytest.approx(
            float(row["T90_minus_T2000_mK"]), abs=1e-9
        )
    else:
        with pytest.raises(ValueError, match="conversion of PLTS-2000"):
            convert(T, source="PLTS-2000")


def test_t58_table_is_the_published_one() -> None:
    rows = _rows("t58_vapour_pressure.csv")
    assert [float(row["p_micrometre_Hg_0C"]) for row in rows] == list(tables_t58.PRESSURE_MICROMETRE_MERCURY)
    temperatures = tables_t58.T58_FIRST_K + tables_t58.STEP_K * np.arange(len(rows))
    np.testing.assert_allclose([float(row["T58_K"]) for row in rows], temperatures, atol=1e-9)


def test_t58_table_is_smooth() -> None:
    """Third differences of ln p; the two rows that one copy has wrong would show as 4e-4 and more."""
    log_p = np.log(tables_t58.PRESSURE_MICROMETRE_MERCURY)[100:]
    assert np.max(np.abs(np.diff(log_p, 3))) < 6e-5


def test_t58_boiling_and_lambda_points() -> None:
    """4.2150 K is 760 mmHg; T58 2.1720 K is 2.17663 K, and the 0.17 mK to 2.1768 K stay."""
    assert 1e3 * np.exp(scales._t58(np.array(4.215))[0]) == pytest.approx(760e3, rel=2e-6)
    assert convert(2.1720, source="T58").temperature == pytest.approx(2.17663, abs=1e-5)
    assert convert(4.2150, source="T58").temperature == pytest.approx(4.2221, abs=5e-5)


@pytest.mark.parametrize("scale", SCALES, ids=lambda s: s.name)
def test_whole_range_converts_there_and_back(scale: scales.Scale) -> None:
    T = np.linspace(scale.low, scale.high, 201)
    there = convert(T, source=scale.name)
    back = convert(there.temperature, source="ITS-90", target=scale.name) if scale.name != "ITS-90" else there
    # The 4He equations do not meet exactly at the lambda point.
    np.testing.assert_allclose(back.temperature, T, atol=0.4e-6)


@given(
    st.floats(1.26, 3.19),
    st.sampled_from(["T58", "T62", "EPT-76", "PTB-2006"]),
    st.sampled_from(["T58", "T62", "EPT-76"]),
)
def test_pairs_are_inverses(T: float, source: str, target: str) -> None:
    there = convert(T, source=source, target=target)
    back = convert(there.temperature, source=target, target=source)
    assert float(back.temperature) == pytest.approx(T, abs=1e-6)


def test_uncertainties_of_two_conversions_add_in_quadrature() -> None:
    result = convert(2.5, source="T58", target="T62")
    assert result.uncertainty == pytest.approx(np.hypot(0.2e-3, 0.2e-3))
    assert "T58 table" in result.method
    assert "T62 equation" in result.method


def test_same_scale_is_no_conversion() -> None:
    result = convert([1.0, 2.0], source="T62", target="T62")
    assert result.temperature.tolist() == [1.0, 2.0]
    assert result.uncertainty.tolist() == [0.0, 0.0]
    assert result.method == "T62: no conversion"


@pytest.mark.parametrize("name", ["T48", "L55", "55E", "local:old-carbon", "ITS90", ""])
def test_other_scales_are_refused_with_the_reason(name: str) -> None:
    with pytest.raises(
        ValueError, match=r"source: .*cannot be converted: .*Keep the number on its own scale"
    ):
        convert(2.0, source=name)
    with pytest.raises(ValueError, match=r"target: "):
        convert(2.0, source="T58", target=name)


@pytest.mark.parametrize(
    ("source", "T"), [("T58", 1.2), ("T58", 5.0), ("T62", 0.6), ("T62", 3.2), ("EPT-76", 0.5), ("EPT-76", 28.0), ("PLTS-2000", 0.1), ("PLTS-2000", 1.0)]
)  # fmt: skip
def test_outside_the_confirmed_range_is_refused(source: str, T: float) -> None:
    with pytest.raises(ValueError, match=rf"temperature\[1\] .*conversion of {source}; keep"):
        convert([SCALES[[s.name for s in SCALES].index(source)].low, T], source=source)


def test_outside_the_range_of_the_target_is_refused() -> None:
    with pytest.raises(ValueError, match="conversion to PLTS-2000"):
        convert(2.0, source="T58", target="PLTS-2000")


def test_missing_stays_missing() -> None:
    result = convert([np.nan, 2.0], source="T58")
    assert np.isnan(result.temperature).tolist() == [True, False]


def test_t58_estimate_is_labelled_and_wider() -> None:
    """Below 1.247 K as T62 (3.395 mK at 1 K), above 4.9926 K the last offset."""
    result = estimate_from_t58([1.0, 5.1])
    assert 1e3 * (result.temperature[0] - 1.0) == pytest.approx(3.395, abs=1e-3)
    assert 1e3 * (result.temperature[1] - 5.1) == pytest.approx(7.3, abs=0.05)
    assert result.uncertainty.tolist() == pytest.approx([0.7e-3, 0.7e-3])
    assert "estimate" in result.method


def test_t58_estimate_is_refused_where_a_conversion_exists() -> None:
    with pytest.raises(ValueError, match=r"temperature\[1\] = 2 K has a confirmed conversion"):
        estimate_from_t58([1.0, 2.0])


@pytest.mark.parametrize("scale", SCALES, ids=lambda s: s.name)
def test_records_know_every_scale_that_is_converted(scale: scales.Scale) -> None:
    assert TypeAdapter(ScaleName).validate_python(scale.name) == scale.name
