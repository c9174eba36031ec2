"""`stillroom convert`: against published conversions, and refused with the reason where there is none."""

from __future__ import annotations

import csv
import math
from collections.abc import Callable
from pathlib import Path

import pytest
from click.testing import Result

from archive.commands.conversion import converted
from tests.archive.commands.support import FakeArchive, parsed

PUBLISHED = Path(__file__).parents[2] / "published"
Run = Callable[..., Result]

# The trade's names in the table, as a person types them here.
AS_TYPED = {
    "mmHg (conventional)": "mmHg_0C",
    "cm3 STP (0 C; 101325 Pa; ideal)": "cm3_STP_0C_101325Pa",
    "cm3 STP (0 C; 100 kPa; ideal)": "cm3_STP_0C_100kPa",
    "atoms/Angstrom2": "atoms/angstrom^2",
    "uP (micropoise)": "uP",
    "uPa.s": "uPa s",
    "cal_th/(mol.K)": "cal_th/(mol K)",
    "J/(mol.K)": "J/(mol K)",
    "V rms (sine)": "V rms",
}
NOT_HERE = {
    "mm[Hg] (UCUM 2.2)": "not offered: 2.9 ppm from the conventional value under almost the same name",
    "mol at 0 C; 101325 Pa; ideal": "the inverse of the standard cubic centimetre, which is in the table too",
    "mol at 0 C; 100 kPa; ideal": "the inverse of the standard cubic centimetre, which is in the table too",
    "atoms/Angstrom2 of 4He": "needs the isotope",
    "Q (quality factor)": "an inverse, not a unit",
}
# Printed with seven digits and a tolerance of 1e-8, which seven digits cannot hold: the printed digits decide.
HALF_A_DIGIT = {("10", "umol/m2"): 0.5e-8}


def _rows(*parts: str) -> list[dict[str, str]]:
    rows = list(csv.DictReader(PUBLISHED.joinpath(*parts).read_text(encoding="utf-8").splitlines()))
    assert rows, f"{parts[-1]} is empty"
    return rows


@pytest.mark.parametrize(
    "row",
    [
        row
        for row in _rows("units", "unit_conversions_check.csv")
        if row["from_unit"] not in NOT_HERE and row["to_unit"] not in NOT_HERE
    ],
    ids=lambda row: f"{row['from_value']} {row['from_unit']} in {row['to_unit']}",
)
def test_conversions_agree_with_the_published_table(row: dict[str, str], run: Run) -> None:
    unit = AS_TYPED.get(row["from_unit"], row["from_unit"])
    result = run(
        "convert", row["from_value"], unit, "--to", AS_TYPED.get(row["to_unit"], row["to_unit"]), "--json"
    )
    assert result.exit_code == 0, result.stderr
    assert math.isclose(
        parsed(result)["value"],
        float(row["to_value"]),
        rel_tol=float(row["relative_tolerance"]),
        abs_tol=HALF_A_DIGIT.get((row["from_value"], row["from_unit"]), 0.0),
    )


@pytest.mark.parametrize(
    "row",
    _rows("thermometry", "scale_difference_check.csv"),
    ids=lambda row: f"{row['scale']} {row['T_on_scale_K']}",
)
def test_scales_agree_with_the_published_differences(row: dict[str, str]) -> None:
    result = converted(f"{row['T_on_scale_K']} K", "ITS-90", scale=row["scale"])
    difference_mk = (result.value - float(row["T_on_scale_K"])) * 1e3
    assert difference_mk == pytest.approx(float(row["T90_minus_T_mK"]), abs=float(row["tolerance_mK"]))
    assert result.scale == "ITS-90"


def test_a_conversion_of_scale_adds_its_uncertainty_and_says_so(run: Run) -> None:
    result = run("convert", "2.1720(3) K", "--scale", "T58", "--to", "ITS-90")
    assert result.exit_code == 0
    # 0.3 mK of the reading and 0.2 mK of the conversion, in quadrature: 0.36 mK. The T58 lambda point is 2.17663 K on
    # ITS-90, 0.17 mK below 2.1768 K (Preston-Thomas, Metrologia 27, 3, 1990).
    assert result.stdout.splitlines()[0] == "2.1720(3) K on T58 = 2.17663(36) K on ITS-90"
    assert "adds a standard uncertainty of 0.2 mK" in result.stdout


def test_millikelvin_stay_millikelvin_on_another_scale() -> None:
    result = converted("800 mK on PLTS-2000", "ITS-90")
    assert result.unit == "mK"
    # T90 - T2000 = 1.026 mK at T2000 = 798.5 mK and 0.718 mK at 850.7 mK, measured: C. Pan et al., Metrologia 58,
    # 025005 (2021).
    assert 0.718 < result.value - 800 < 1.026


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        pytest.param(["1 cm3 STP", "--to", "umol"], "needs its reference state", id="cm3-STP"),
        pytest.param(["1 sccm", "--to", "umol"], "needs its reference state", id="sccm"),
        pytest.param(["3 mmHg", "--to", "Pa"], "write Torr", id="mmHg"),
        pytest.param(["3 Pa", "--to", "mmHg"], "write Torr", id="to-mmHg"),
        pytest.param(["2.4 layers", "--to", "umol/m^2"], "--substrate NAME", id="layers-without-substrate"),
        pytest.param(["31 umol/m^2", "--to", "layers"], "--substrate NAME", id="to-layers-without-substrate"),
        pytest.param(["1 MK", "--to", "K"], "MK is a million kelvin", id="MK"),
        pytest.param(["20 degC", "--to", "K"], "add 273.15", id="celsius"),
        pytest.param(["1.5 K on T58", "--scale", "T62", "--to", "ITS-90"], "found two scales", id="two-scales"),
        pytest.param(["1.5 K", "--to", "ITS-90"], "without its scale", id="no-scale"),
        pytest.param(["1.1 K", "--scale", "T58", "--to", "ITS-90"], "outside the range 1.247", id="below-the-range"),
        pytest.param(["1.5 K", "--scale", "T48", "--to", "ITS-90"], "no confirmed conversion", id="old-scale"),
        pytest.param(["1.5 K", "--scale", "ITS-90", "--to", "T48"], "no confirmed conversion", id="to-old-scale"),
        pytest.param(["1.5 K", "--scale", "local:A", "--to", "ITS-90"], "its own calibration", id="local-scale"),
        pytest.param(["3 Pa", "--to", "ITS-90"], "only a temperature is on a scale", id="pressure-on-a-scale"),
        pytest.param(["3 Pa", "--scale", "T58", "--to", "mbar"], "only a temperature is on a scale", id="scale-of-a-pressure"),
        pytest.param(["31 umol/m^2", "--to", "K"], "no fixed relation", id="coverage-in-K"),
        pytest.param(["1 mHz", "--to", "s"], "write its inverse", id="frequency-in-s"),
        pytest.param(["1 Hz", "--to", "rad/s"], "2 pi", id="cycles-in-radians"),
        pytest.param(["5 cm3", "--to", "umol"], "reference state", id="volume-in-mol"),
        pytest.param(["1 kg/m^2", "--to", "umol/m^2"], "molar mass", id="mass-in-amount"),
        pytest.param(["5 V", "--to", "V peak"], "without a convention", id="no-convention"),
        pytest.param(["1 bar gauge", "--to", "Pa absolute"], "pressure of the room", id="gauge-to-absolute"),
        pytest.param(["1 bar", "--to", "Pa absolute"], "absolute or gauge", id="neither"),
        pytest.param(["1,5 K", "--to", "mK"], "decimal comma", id="decimal-comma"),
        pytest.param(["film", "--to", "mK"], "with a number in front", id="no-number"),
        pytest.param(["1 J", "--to", "erg"], "not in units of energy", id="no-kind-takes-it"),
        pytest.param(["1 W/m", "--to", "K"], "no quantity of this trade has the unit W/m", id="no-kind-at-all"),
        pytest.param(["2 layers", "--scale", "T58", "--to", "ITS-90"], "only a temperature", id="layers-on-a-scale"),
        pytest.param(["2 layers"], "say what to convert to", id="layers-without-target"),
        pytest.param(["1 K", "--to", "furlong"], "furlong", id="unknown-unit"),
        pytest.param(["1 K", "--to", "mK", "--kind", "coverage"], "coverage", id="wrong-kind"),
        pytest.param(["1 K", "--scale", "T58"], "say what to convert to", id="scale-without-target"),
    ],
)  # fmt: skip
def test_what_cannot_be_converted_is_refused_with_the_reason(
    words: list[str], sentence: str, run: Run
) -> None:
    result = run("convert", *words)
    assert result.exit_code == 2
    assert sentence in result.stderr
    assert result.stdout == ""


def test_without_a_target_the_usual_units_are_listed(run: Run) -> None:
    result = run("convert", "31.4", "umol/m^2")
    assert result.exit_code == 0
    assert "31.4 umol/m^2 = 3.14e-5 mol/m^2" in result.stdout
    assert "= 18.9095219864 atoms/nm^2" in result.stdout  # 31.4e-6 x 6.02214076e23 / 1e18


def test_a_temperature_keeps_its_scale_in_another_unit(run: Run) -> None:
    assert run("convert", "1.5 K", "--scale", "T58", "--to", "mK").stdout == "1.5 K on T58 = 1500 mK on T58\n"
    assert parsed(run("convert", "1.5 K on T58", "--to", "mK", "--json"))["scale"] == "T58"


def test_the_end_of_a_range_still_has_an_uncertainty() -> None:
    # T90 - T76 = -0.0056 mK (T76/K)^2 (R. L. Rusby, J. Chem. Thermodyn. 23, 1153, 1991): slope 1 - 3.0e-4 at 27.1 K.
    result = converted("27.1(1) K on EPT-76", "ITS-90")
    assert result.uncertainty == pytest.approx(0.1 * (1 - 2 * 5.6e-6 * 27.1), rel=1e-5)


def test_a_kind_may_be_named(run: Run) -> None:
    assert (
        parsed(run("convert", "1 mHz", "--kind", "frequency", "--to", "Hz", "--json"))["kind"] == "frequency"
    )


def test_a_negative_number_is_no_option(run: Run) -> None:
    assert run("convert", "-3", "mK", "--to", "K").stdout == "-3 mK = -0.003 K\n"
    assert run("convert", "-3 mK", "--tu", "K").exit_code == 2


def test_layers_are_those_of_the_substrate(run: Run, fake: Callable[..., FakeArchive]) -> None:
    archive = fake()
    result = run("convert", "2.0(1) layers", "--substrate", "PI-2200", "--to", "umol/m^2")
    assert result.exit_code == 0
    # 2 x 12.97; relative uncertainties 0.05 and 0.01 in quadrature.
    assert result.stdout.splitlines()[0] == "2.0(1) layers = 25.9(1.3) umol/m^2"
    assert "PI-2200.r1" in result.stdout
    assert "density of the bulk liquid" in result.stdout
    assert archive.asked[0] == ("records", (), {"name": "PI-2200", "kind": "substrate"})
    back = parsed(run("convert", "25.94 umol/m^2", "--substrate", "PI-2200", "--to", "layers", "--json"))
    assert back["value"] == pytest.approx(2.0, rel=1e-12)
    assert back["uncertainty"] == pytest.approx(2.0 * 0.13 / 12.97, rel=1e-12)


def test_a_substrate_without_a_layer_or_without_a_record_is_refused(
    run: Run, fake: Callable[..., FakeArchive]
) -> None:
    archive = fake()
    archive.answers["records"][0].content = {"layer": None}
    result = run("convert", "2 layers", "--substrate", "PI-2200", "--to", "umol/m^2")
    assert result.exit_code == 2
    assert "does not say what one layer is" in result.stderr
    archive.answers["records"] = []
    result = run("convert", "2 layers", "--substrate", "PX", "--to", "umol/m^2")
    assert result.exit_code == 2
    assert "there is no substrate PX" in result.stderr
