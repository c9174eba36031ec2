"""Every form of a calibration record gives temperatures, and none outside its range."""

from __future__ import annotations

import json
from typing import Any

import numpy as np
import pytest

from archive.errors import StepFailed
from archive.reduction.planning import load_plan
from archive.reduction.runner import run
from archive.reduction.step import NoParameters
from archive.reduction.sweep_steps import ScaleParameters, on_scale
from archive.reduction.thermometry_steps import temperature_from_calibration
from schemas.thermometer import Calibration


def _calibration(relation: dict[str, Any], **more: Any) -> Calibration:
    content = {
        "name": "cal", "revision": 2, "thermometer": "RX-1.r1", "scale": "PLTS-2000", "date": "2026-01-05", "against": "invented",
        "reading_unit": "Ohm", "relation": relation, "temperature_low": "0.1 K", "temperature_high": "4 K", "uncertainty": "1 mK",
    }  # fmt: skip
    return Calibration.model_validate_json(json.dumps({**content, **more}))


POINTS = [[float(np.exp(8 - np.log(t) / 2)), float(t)] for t in np.geomspace(0.1, 4, 15)]


@pytest.mark.parametrize(
    ("relation", "more", "reading", "kind", "expected"),
    [
        pytest.param({"form": "log-polynomial", "coefficients": [16.0, -2.0]}, {}, np.exp(8.0), "resistance", 1.0, id="log-polynomial"),
        pytest.param({"form": "log-polynomial", "coefficients": [16.0, -2.0]}, {"reading_unit": "kOhm", "temperature_high": "4 K"}, 1e3 * np.exp(8.0), "resistance", 1.0, id="kilo-ohm"),
        pytest.param({"form": "spline"}, {"points": POINTS}, np.exp(8.0), "resistance", 1.0, id="spline"),
        pytest.param({"form": "fitted-points"}, {"points": POINTS}, np.exp(8.0), "resistance", 1.0, id="fitted points"),
        # T = 1 + k with k = (2 Z - ZL - ZU)/(ZU - ZL): at the middle T is 1 K.
        pytest.param({"form": "chebyshev", "logarithm": "log10", "lower": 2.0, "upper": 4.0, "coefficients": [1.0, -0.8]}, {}, 1000.0, "resistance", 1.0, id="chebyshev"),
        pytest.param({"form": "curie-weiss", "offset": 1.0, "constant": 0.5, "theta": 0.5}, {"reading_unit": "H"}, 2.0, "mutual_inductance", 1.0, id="Curie-Weiss"),
        # ITS-90: 101325 Pa over 4He is 4.2221 K; PLTS-2000: 3.1295 MPa on the low branch is 0.1 K.
        pytest.param({"form": "vapour-pressure", "isotope": "4He"}, {"reading_unit": "kPa", "scale": "ITS-90", "temperature_high": "5 K"}, 101325.0, "pressure", 4.2221, id="vapour pressure"),
        pytest.param({"form": "melting-curve", "branch": "low"}, {"reading_unit": "MPa", "temperature_low": "1 mK"}, 3129507.0, "pressure", 0.1, id="melting curve"),
    ],
)  # fmt: skip
def test_each_form_gives_its_temperature(
    relation: dict[str, Any], more: dict[str, Any], reading: float, kind: str, expected: float
) -> None:
    found = temperature_from_calibration(
        NoParameters(),
        reading=np.array([reading, np.nan]),
        reading_kind=kind,
        calibration=_calibration(relation, **more),
    )
    temperature = found.array("temperature")
    assert temperature[0] == pytest.approx(expected, rel=2e-5)
    assert np.isnan(temperature[1])
    assert found.findings == ()
    assert found.shared["temperature"]["cal.r2"][0] == pytest.approx(1e-3)
    assert found.sources[0].level == "laboratory"


@pytest.mark.parametrize(
    ("relation", "more", "reading", "kind"),
    [
        pytest.param(
            {"form": "log-polynomial", "coefficients": [16.0, -2.0]}, {}, 1e6, "resistance", id="too cold"
        ),
        pytest.param(
            {"form": "curie-weiss", "offset": 1.0, "constant": 0.5, "theta": 0.0},
            {"reading_unit": "H"},
            0.5,
            "mutual_inductance",
            id="wrong side",
        ),
        pytest.param(
            {"form": "vapour-pressure", "isotope": "4He"},
            {"reading_unit": "Pa", "scale": "ITS-90"},
            1.0,
            "pressure",
            id="below the scale",
        ),
    ],
)
def test_outside_there_is_no_temperature_but_a_finding(
    relation: dict[str, Any], more: dict[str, Any], reading: float, kind: str
) -> None:
    found = temperature_from_calibration(
        NoParameters(),
        reading=np.array([reading]),
        reading_kind=kind,
        calibration=_calibration(relation, **more),
    )
    assert np.isnan(found.array("temperature")).all()
    assert found.findings[0].code == "temperature-outside-calibration"


def test_a_reading_of_another_kind_is_refused() -> None:
    with pytest.raises(ValueError, match=r"cal\.r2 is for readings in Ohm"):
        temperature_from_calibration(
            NoParameters(),
            reading=np.array([1.0]),
            reading_kind="pressure",
            calibration=_calibration({"form": "log-polynomial", "coefficients": [1.0, 1.0]}),
        )


def test_a_definition_belongs_to_its_scale() -> None:
    with pytest.raises(ValueError, match="defines temperatures on ITS-90"):
        temperature_from_calibration(
            NoParameters(), reading=np.array([1e5]), reading_kind="pressure",
            calibration=_calibration({"form": "vapour-pressure", "isotope": "4He"}, reading_unit="Pa"),
        )  # fmt: skip


def test_a_temperature_passes_and_anything_else_needs_a_calibration() -> None:
    found = temperature_from_calibration(
        NoParameters(), reading=np.array([1.0]), reading_kind="temperature", calibration=None
    )
    assert found.array("temperature")[0] == 1.0
    with pytest.raises(ValueError, match="no calibration"):
        temperature_from_calibration(
            NoParameters(), reading=np.array([1.0]), reading_kind="resistance", calibration=None
        )


def test_an_old_scale_is_converted_with_its_uncertainty() -> None:
    # T58 4.215 K is the boiling point, 4.2221 K on ITS-90.
    found = on_scale(
        ScaleParameters(source="T58", target="ITS-90"),
        temperature=np.array([4.215, np.nan]),
        temperature_scale="T58",
    )
    assert found.array("temperature")[0] == pytest.approx(4.2221, abs=1e-4)
    assert found.scales["temperature"] == "ITS-90"
    assert found.shared["temperature"]["conversion T58 to ITS-90"][0] > 0


def test_a_conversion_from_a_scale_that_the_temperatures_are_not_on_is_refused() -> None:
    with pytest.raises(ValueError, match="it is on PLTS-2000, and the plan converts from T58"):
        on_scale(
            ScaleParameters(source="T58", target="ITS-90"),
            temperature=np.array([1.0]),
            temperature_scale="PLTS-2000",
        )


def test_a_plan_hands_the_scale_of_its_temperatures_to_the_conversion(laboratory: Any, tools: Any) -> None:
    text = """
        name = "mine"
        revision = 1
        title = "mine"
        [applies]
        sweep_kinds = ["temperature-sweep"]
        [[step]]
        use = "temperature-from-calibration"
        take = { reading = "channel:@thermometer", calibration = "calibration:@thermometer" }
        give = { temperature = "recorded" }
        [[step]]
        use = "temperature-on-scale"
        take = { temperature = "recorded" }
        set = { source = "T76", target = "ITS-90" }
        give = { temperature = "temperature" }
    """
    with pytest.raises(StepFailed, match="it is on PLTS-2000, and the plan converts from T76"):
        run(load_plan(text), "2026-03/e1", laboratory, number=1, clock=tools.Clock())
