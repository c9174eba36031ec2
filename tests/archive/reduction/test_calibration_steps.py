"""Steps of a calibration: points out of rows, corrections of vapour pressures, the fit and what it has to say."""

from __future__ import annotations

import json
import math
from typing import Any

import numpy as np
import pytest

from archive.physics import vapour_pressure
from archive.reduction import calibration_steps as steps
from archive.reduction.calibration_pressure import gas_head, liquid_head, transpiration
from archive.reduction.coulomb_steps import DipParameters, dip
from archive.reduction.step import NoParameters
from schemas.thermometer import Calibration, Thermometer

NONE = NoParameters()


def bulb(isotope: str = "4He", **tube: str) -> Thermometer:
    """Return a vapour pressure thermometer with a tube."""
    content = {
        "name": "VP-1", "revision": 1, "kind": f"vapour-pressure-{isotope}", "place": "block",
        "tube": {"inner_diameter": "2.00(5) mm", "warm_temperature": "300 K on ITS-90", **tube},
    }  # fmt: skip
    return Thermometer.model_validate_json(json.dumps(content))


def vapour(isotope: str = "4He") -> Calibration:
    """Return the record of a vapour pressure thermometer."""
    content = {
        "name": "VP-1-its90", "revision": 1, "thermometer": "VP-1", "scale": "ITS-90", "date": "2024-11-04", "against": "definition", "reading_unit": "Pa",
        "relation": {"form": "vapour-pressure", "isotope": isotope}, "temperature_low": "0.65 K", "temperature_high": "5 K", "uncertainty": "0.02 mK",
    }  # fmt: skip
    return Calibration.model_validate_json(json.dumps(content))


def test_the_gas_column_weighs_what_it_should() -> None:
    """By hand: p M g h/(R T) with M = 4.0026 g/mol, h = 1 m, T = 100 K; 4.72e-5 of p."""
    p = np.array([200.0, 1e5, np.nan])
    found = gas_head(
        NONE, pressure=p, thermometer=bulb(height="1.00(1) m", gas_temperature="100(10) K on ITS-90")
    )
    share = 4.0026e-3 * 9.80665 / (8.314463 * 100)
    np.testing.assert_allclose(found.array("pressure")[:2] / p[:2] - 1, share, rtol=1e-4)
    assert np.isnan(found.array("pressure")[2])
    parts = found.shared["pressure"]
    assert set(parts) == {"VP-1.r1 height", "VP-1.r1 gas temperature"}
    np.testing.assert_allclose(
        np.abs(np.array(parts["VP-1.r1 gas temperature"])[:2]), p[:2] * share * 0.1, rtol=0.02
    )
    assert np.array(parts["VP-1.r1 height"])[2] == 0.0


def test_an_unknown_profile_makes_the_head_as_uncertain_as_it_is_large() -> None:
    p = np.array([1e5])
    found = gas_head(NONE, pressure=p, thermometer=bulb(height="-1.00 m"))
    change = float(found.array("pressure")[0]) - 1e5
    assert change < 0  # the gauge stands lower than the liquid
    name = "VP-1.r1 profile of the gas column"
    assert np.array(found.shared["pressure"][name])[0] == pytest.approx(abs(change) / math.sqrt(3))
    with pytest.raises(ValueError, match="states no height"):
        gas_head(NONE, pressure=p, thermometer=bulb())


def test_transpiration_is_known_to_a_tenth_and_warned_of() -> None:
    p = np.array([115.0, 1e4, 50.0])
    found = transpiration(NONE, pressure=p, thermometer=bulb())
    change = p - found.array("pressure")
    assert change[0] > 0.01 * 115
    assert change[1] < 1e-3 * 1e4
    assert change[2] == 0.0  # below the range of the scale there is no temperature either
    part = np.array(found.shared["pressure"]["equation of thermal transpiration"])
    np.testing.assert_allclose(np.abs(part), 0.1 * change)
    assert [f.code for f in found.findings] == ["transpiration-large"]
    assert transpiration(NONE, pressure=np.array([1e4]), thermometer=bulb()).findings == ()


def test_transpiration_of_helium_3_is_not_corrected_and_said() -> None:
    p = np.array([150.0, 1e4])
    found = transpiration(NONE, pressure=p, thermometer=bulb("3He"))
    assert found.array("pressure").tolist() == p.tolist()
    (finding,) = found.findings
    assert (finding.code, finding.severity) == ("transpiration-not-corrected", "warning")


def test_the_head_of_the_liquid_is_that_of_the_table() -> None:
    """0.131, 0.385 and 0.708 mK per centimetre at 4.2, 3.0 and 2.5 K (computed from ITS-90 and the density table of Donnelly and Barenghi); nothing in He II."""
    T = np.array([4.2, 3.0, 2.5, 2.0, 4.5, np.nan])
    found = liquid_head(NONE, temperature=T, depth=0.01, calibration=vapour())
    change = 1e3 * (found.array("temperature") - T)
    np.testing.assert_allclose(change[:4], [0.131, 0.385, 0.708, 0.0], atol=6e-4)
    assert np.isnan(change[4:]).all()
    other = liquid_head(NONE, temperature=T, depth=0.01, calibration=vapour("3He"))
    np.testing.assert_array_equal(other.array("temperature"), T)
    assert other.findings[0].code == "liquid-head-not-corrected"


def test_rows_become_points() -> None:
    T = np.array([1.0, 1.001, 0.999, np.nan, 1.5, 2.0, 2.002])
    R = np.array([10.0, 11.0, 9.0, 5.0, 6.0, 3.0, np.nan])
    u_T, u_R = np.full(7, 3e-3), np.zeros(7)
    each = steps.calibration_points(
        steps.PointParameters(), temperature=T, reading=R, u_temperature=u_T, u_reading=u_R
    )
    assert each.array("reading").tolist() == [10.0, 11.0, 9.0, 6.0, 3.0]
    assert each.facts["left_out"] == 2
    held = steps.PointParameters(plateau=0.01, fewest=2)
    found = steps.calibration_points(held, temperature=T, reading=R, u_temperature=u_T, u_reading=u_R)
    np.testing.assert_allclose(found.array("temperature"), [1.0])
    # Three rows with 3 mK each; readings scatter by 1, stated nothing.
    assert np.array(found.point["temperature"])[0] == pytest.approx(3e-3 / math.sqrt(3))
    assert np.array(found.point["reading"])[0] == pytest.approx(1 / math.sqrt(3))
    again = steps.calibration_points(
        held.model_copy(update=dict(found.held)),
        temperature=2 * T,
        reading=R,
        u_temperature=u_T,
        u_reading=u_R,
    )
    np.testing.assert_allclose(again.array("temperature"), [2.0])
    with pytest.raises(ValueError, match="no point"):
        steps.calibration_points(
            held, temperature=T[3:4], reading=R[3:4], u_temperature=u_T[:1], u_reading=u_R[:1]
        )


def fitted(parameters: steps.FitParameters, kind: str = "resistance", noise: float = 1e-4, **more: Any) -> Any:  # fmt: skip
    """Return a fit of an invented sensor."""
    T = np.geomspace(0.3, 5.0, 40)
    x = np.log(T)
    R = np.exp(6.9 - 1.9 * x + 0.35 * x**2 - 0.05 * x**3)
    t = T * (1 + noise * np.random.default_rng(4).standard_normal(T.size))
    u = {"u_temperature": noise * T, "u_reading": np.zeros(T.size), **more}
    return steps.calibration_fit(parameters, temperature=t, reading=R, reading_kind=kind, **u)


def test_the_fit_says_what_it_chose_and_holds_it() -> None:
    found = fitted(steps.FitParameters())
    assert found.facts["form"] == "log-polynomial"
    assert found.held["order"] == found.facts["order"] == found.facts["orders_tried"][-1] - 1 or len(found.facts["orders_tried"]) > 2  # fmt: skip
    assert found.covariance is not None
    assert len(found.covariance.names) == found.facts["order"] + 1
    assert found.findings == ()
    assert found.array("residual").size == 40
    np.testing.assert_allclose(found.array("fitted") + found.array("residual"), np.geomspace(0.3, 5, 40), rtol=1e-3)  # fmt: skip
    again = fitted(steps.FitParameters(**found.held))
    assert again.facts["chosen"] == "held"
    np.testing.assert_allclose(again.array("coefficients"), found.array("coefficients"), rtol=1e-12)
    # Chi squared is of the one fit: what is shifted or drawn has no chi squared of its own.
    wider = fitted(steps.FitParameters(**found.held), u_temperature=2e-4 * np.geomspace(0.3, 5.0, 40))
    assert wider.outputs["reduced_chi2"] == found.outputs["reduced_chi2"]


def test_the_ends_carry_the_noise_of_the_outermost_readings() -> None:
    """dT/T = (dR/R)/S; S = d ln R/d ln T = -1.9 + 0.7 x - 0.15 x^2, x = ln T, at 0.3 K and 5 K."""
    T = np.geomspace(0.3, 5.0, 40)
    x = np.log(T)
    R = np.exp(6.9 - 1.9 * x + 0.35 * x**2 - 0.05 * x**3)
    found = fitted(steps.FitParameters(order=5), u_reading=1e-4 * R)
    S = -1.9 + 0.7 * x - 0.15 * x**2
    for name, end in (("temperature_low", 0), ("temperature_high", -1)):
        expected = 1e-4 * T[end] / abs(S[end])
        assert float(np.asarray(found.point[name])) == pytest.approx(expected, rel=0.02)
    assert float(np.asarray(found.point["reading_low"])) == pytest.approx(1e-4 * R.min())


def test_a_poor_fit_is_warned_of() -> None:
    found = fitted(steps.FitParameters(largest_order=2))
    assert {f.code for f in found.findings} == {"calibration-fit-poor", "calibration-residuals-structured"}
    assert float(found.outputs["interpolation"]) > 1e-3


def test_an_inductance_is_taken_by_curie_and_weiss_and_unstated_noise_by_its_scatter() -> None:
    T = np.geomspace(0.01, 0.2, 20)
    found = steps.calibration_fit(
        steps.FitParameters(), temperature=T, reading=8e-4 + 6e-6 / (T - 5e-4), reading_kind="mutual_inductance",
        u_temperature=np.zeros(20), u_reading=np.zeros(20),
    )  # fmt: skip
    assert found.facts["form"] == "curie-weiss"
    np.testing.assert_allclose(found.array("coefficients"), [8e-4, 6e-6, 5e-4], rtol=1e-6)
    assert found.verdicts == {"reduced_chi2": "no uncertainty stated"}


def test_a_dip_behind_wires_is_that_of_the_device() -> None:
    """A device of 50 kOhm behind 10 kOhm: five sixths of the bias fall over it."""
    from archive.physics.coulomb_blockade import dip_shape, half_width

    V = np.linspace(-1e-3, 1e-3, 401)
    width = float(half_width(0.02, junctions=30))
    own = 2e-5 * (1 - 0.02 * dip_shape(V / width * 5.4391699))
    read = 1 / (1 / own + 1e4)
    noise = 1e-9 * np.random.default_rng(9).standard_normal(V.size)
    found = dip(
        DipParameters(junctions=30, wire_resistance_ohm=1e4), bias=V * 6 / 5, conductance=read + noise, u_conductance=np.zeros(V.size)
    )  # fmt: skip
    assert found.outputs["temperature"] == pytest.approx(0.02, rel=0.01)
    assert found.outputs["depth"] == pytest.approx(0.02, rel=0.01)
    assert found.scales == {"temperature": "local:thermodynamic"}
    without = dip(DipParameters(), bias=V, conductance=own + noise, u_conductance=np.zeros(V.size))
    assert without.verdicts == {"temperature": "number of junctions not given"}
    with pytest.raises(ValueError, match="resist more than"):
        dip(
            DipParameters(wire_resistance_ohm=6e4),
            bias=V,
            conductance=own,
            u_conductance=np.zeros(V.size),
        )


def test_the_saturated_pressure_of_the_correction_is_that_of_its_isotope() -> None:
    cold = float(vapour_pressure.temperature_its90(1e3, "3He"))
    p = np.array([1e3])
    found = gas_head(NONE, pressure=p, thermometer=bulb("3He", height="1 m"))
    mean = (300 - cold) / math.log(300 / cold)
    assert float(found.array("pressure")[0]) - 1e3 == pytest.approx(1e3 * 3.016029e-3 * 9.80665 / (8.314463 * mean), rel=1e-4)  # fmt: skip
