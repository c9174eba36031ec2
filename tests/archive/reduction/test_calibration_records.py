"""Calibrations with contributions: every form carries them into temperatures, and what is not whole is refused."""

from __future__ import annotations

import json
import tomllib
from datetime import date
from typing import Any

import numpy as np
import pytest
from pydantic import ValidationError

from archive.reduction.calibration_comparison import compared, drifts
from archive.reduction.calibration_record import calibration_text
from archive.reduction.step import NoParameters
from archive.reduction.thermometry_steps import temperature_from_calibration
from schemas.thermometer import Calibration

KNOTS = np.geomspace(100.0, 9000.0, 8)
SPLINE = [[float(r), float(900 / r**0.9)] for r in KNOTS]
FORMS: dict[str, dict[str, Any]] = {
    "chebyshev": {"relation": {"form": "chebyshev", "logarithm": "log10", "lower": 1.9, "upper": 4.0, "coefficients": [4.0, -3.5, 0.8]}},
    "log-polynomial": {"relation": {"form": "log-polynomial", "centre": 6.8, "half_width": 2.3, "coefficients": [0.2, -1.3, 0.1]}},
    "spline": {"relation": {"form": "spline"}, "points": SPLINE[::-1]},
    "curie-weiss": {"relation": {"form": "curie-weiss", "offset": 50.0, "constant": 800.0, "theta": 1e-3}},
}  # fmt: skip


def record(form: str, **more: Any) -> Calibration:
    """Return a calibration with readings from 110 to 8000 Ohm and two sources."""
    content = {
        "name": "cal", "revision": 2, "thermometer": "RX-1", "scale": "PLTS-2000", "date": "2026-01-05", "against": "invented", "reading_unit": "Ohm",
        "temperature_low": "0.05 K", "temperature_high": "20 K", "relative_uncertainty": 1e-3, "readings": [110.0, 8000.0],
        "interpolation_uncertainty": 2e-4, **FORMS[form], **more,
    }  # fmt: skip
    first = Calibration.model_validate_json(json.dumps({**content, "contribution": []}))
    count = len(first.coefficients or ())
    if "contribution" not in more:
        content["contribution"] = [
            {"source": "reference", "level": "laboratory", "description": "of the reference", "coefficients": [1e-3 * c for c in first.coefficients or ()]},
            {"source": "fit 0", "level": "run", "description": "fit", "coefficients": [1e-4] + [0.0] * (count - 1)},
        ]  # fmt: skip
    return Calibration.model_validate_json(json.dumps(content))


@pytest.mark.parametrize("form", FORMS)
def test_contributions_are_those_of_moved_coefficients(form: str) -> None:
    made = record(form)
    reading = np.array([150.0, 900.0, 7000.0, 9000.0, np.nan])
    found = temperature_from_calibration(
        NoParameters(), reading=reading, reading_kind="resistance", calibration=made
    )
    parts = found.shared["temperature"]
    assert set(parts) == {"reference", "fit 0", "cal.r2 interpolation"}
    T = found.array("temperature")
    assert np.isnan(T).tolist() == [False, False, False, True, True]
    moved = _moved(made, 1e-3)
    after = temperature_from_calibration(
        NoParameters(), reading=reading, reading_kind="resistance", calibration=moved
    ).array("temperature")
    np.testing.assert_allclose(np.array(parts["reference"])[:3], (after - T)[:3], rtol=3e-3)
    assert np.array(parts["reference"])[3:].tolist() == [0.0, 0.0]
    np.testing.assert_allclose(np.array(parts["cal.r2 interpolation"])[:3], 2e-4 * T[:3])


def _moved(made: Calibration, share: float) -> Calibration:
    content = json.loads(made.model_dump_json())
    relation = content["relation"]
    if "coefficients" in relation:
        relation["coefficients"] = [(1 + share) * c for c in relation["coefficients"]]
    elif relation["form"] == "curie-weiss":
        relation |= {key: (1 + share) * relation[key] for key in ("offset", "constant", "theta")}
    else:
        content["points"] = [[r, (1 + share) * t] for r, t in content["points"]]
    return Calibration.model_validate_json(json.dumps(content))


@pytest.mark.parametrize("form", FORMS)
def test_the_text_is_the_record(form: str) -> None:
    made = record(form, made_from="2024-11/c01@thermometer-calibration.1", residual_rms="1.25e-05 K")
    tables = tomllib.loads(calibration_text(made))["record"]["calibration"]
    text = json.dumps(tables[0], default=lambda each: each.isoformat() if isinstance(each, date) else None)
    assert Calibration.model_validate_json(text) == made


def test_points_that_are_fitted_carry_the_uncertainty_of_their_fit() -> None:
    rng = np.random.default_rng(3)
    points = [[float(r), float(900 / r**0.9 * (1 + 1e-3 * rng.standard_normal()))] for r in np.geomspace(110, 8000, 25)]  # fmt: skip
    made = record("spline", relation={"form": "fitted-points"}, points=points, readings=None, interpolation_uncertainty=None, contribution=[])  # fmt: skip
    found = temperature_from_calibration(
        NoParameters(), reading=np.array([900.0]), reading_kind="resistance", calibration=made
    )
    parts = found.shared["temperature"]
    T = float(found.array("temperature")[0])
    assert set(parts) == {"cal.r2", "cal.r2 fit"}
    # Noise of 1e-3 at 25 points and a line with two coefficients: near the middle 1e-3/sqrt(25).
    assert float(np.array(parts["cal.r2 fit"])[0]) / T == pytest.approx(2e-4, rel=0.5)


@pytest.mark.parametrize(
    ("more", "text"),
    [
        pytest.param({"readings": None}, "also states `readings`", id="no readings"),
        pytest.param({"readings": [3.0, 2.0]}, "the smaller comes first", id="readings"),
        pytest.param({"contribution": [{"source": "a", "level": "run", "description": "", "coefficients": [1.0]}]}, "expected 3 as in the relation", id="count"),
        pytest.param({"contribution": [{"source": "a", "level": "run", "description": "", "coefficients": [1.0, 1.0, 1.0]}] * 2}, "each source stands once", id="twice"),
        pytest.param({"relation": {"form": "melting-curve", "branch": "low"}, "contribution": [{"source": "a", "level": "run", "description": "", "coefficients": [1.0]}]}, "carries none", id="no coefficients"),
        pytest.param({"made_from": "2024-11/c01"}, "made_from", id="no reduction"),
    ],
)  # fmt: skip
def test_a_record_that_is_not_whole_is_refused(more: dict[str, Any], text: str) -> None:
    with pytest.raises(ValidationError, match=text):
        record("log-polynomial", **more)


def test_scales_are_compared_where_their_conversion_is_published_and_nowhere_else() -> None:
    def old(scale: str) -> Calibration:
        return record("log-polynomial", scale=scale, revision=1, date="2020-01-05", contribution=[], interpolation_uncertainty=None)  # fmt: skip

    now = record("log-polynomial", scale="ITS-90", contribution=[], interpolation_uncertainty=None)
    drift = compared(old("T58"), now)
    assert drift.found is not None
    assert "T58" in drift.conversion
    # T90 - T58 is 7.052 mK at 4 K (reference code of A. H. Harvey for historical scales).
    at = int(np.argmin(np.abs(drift.found.temperature - 4.0)))
    assert -1e3 * drift.found.difference[at] == pytest.approx(7.05, abs=0.3)
    none = compared(old("local:old"), now)
    assert none.found is None
    assert "local:old and ITS-90 are not compared" in none.why_not
    (only,) = drifts([now, old("ITS-90")])
    assert (only.earlier, only.later) == ("cal.r1", "cal.r2")
    assert only.found is not None
    assert only.found.significance == 0.0


@pytest.mark.parametrize(
    ("more", "text"),
    [
        pytest.param({"temperature_low": "10 K"}, "no temperatures in common", id="ranges"),
        pytest.param({"reading_unit": "Pa"}, "in Ohm and in Pa", id="units"),
    ],
)
def test_what_has_nothing_in_common_is_not_compared(more: dict[str, Any], text: str) -> None:
    first = record("log-polynomial", revision=1, date="2020-01-05", temperature_high="5 K")
    assert text in compared(first, record("log-polynomial", **more)).why_not


@pytest.mark.parametrize(
    ("relation", "unit", "scale"),
    [({"form": "vapour-pressure", "isotope": "4He"}, "kPa", "ITS-90"), ({"form": "melting-curve", "branch": "low"}, "MPa", "PLTS-2000")],
    ids=["vapour pressure", "melting curve"],
)  # fmt: skip
def test_definitions_do_not_drift(relation: dict[str, Any], unit: str, scale: str) -> None:
    span = {"temperature_low": "1.3 K", "temperature_high": "4.2 K"} if unit == "kPa" else {"temperature_low": "5 mK", "temperature_high": "0.3 K"}  # fmt: skip
    # The law of Curie and Weiss, without the readings of its points, is no definition but repeats itself as well.
    salt = record(
        "curie-weiss", contribution=[], readings=None, interpolation_uncertainty=None, temperature_low="5 mK"
    )
    again = compared(salt.model_copy(update={"revision": 1}), salt)
    assert again.found is not None
    assert np.max(np.abs(again.found.difference)) == 0.0
    common = {"relation": relation, "scale": scale, "contribution": [], "readings": None, "interpolation_uncertainty": None, **span}  # fmt: skip
    first = record("log-polynomial", revision=1, date="2020-01-05", reading_unit="Pa", **common)
    drift = compared(first, record("log-polynomial", reading_unit=unit, **common))
    assert drift.found is not None
    assert np.max(np.abs(drift.found.difference)) < 1e-9
