"""A calibration curve gives temperatures within its readings only, and its derivatives are those of the curve itself."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.polynomial import Chebyshev, Polynomial
from scipy.interpolate import CubicSpline

from archive.physics.calibration_curve import CalibrationCurve

KNOTS = tuple(np.geomspace(100.0, 9000.0, 9))
CURVES = {
    "chebyshev": CalibrationCurve("chebyshev", (1.6, -1.4, 0.5, -0.1), (100.0, 9000.0), np.log(950.0), 2.4),
    "log-polynomial": CalibrationCurve(
        "log-polynomial", (0.2, -1.3, 0.2, -0.05), (100.0, 9000.0), np.log(950.0), 2.3
    ),
    "spline": CalibrationCurve("spline", tuple(900.0 / np.array(KNOTS) ** 0.9), (100.0, 9000.0), knots=KNOTS),
    "curie-weiss": CalibrationCurve("curie-weiss", (12.5, 0.34, 0.4e-3), (13.0, 80.0)),
}


def readings(curve: CalibrationCurve) -> np.ndarray:
    """Return readings inside the span of a curve."""
    return np.geomspace(*curve.reading_span, 23)[1:-1]


@pytest.mark.parametrize("form", CURVES)
def test_derivatives_are_those_of_the_curve_by_differences(form: str) -> None:
    curve = CURVES[form]
    x = readings(curve)
    for k, value in enumerate(curve.coefficients):
        step = 1e-6 * max(abs(value), 1e-3)
        sides = [
            CalibrationCurve(
                curve.form, tuple(c + s * step * (j == k) for j, c in enumerate(curve.coefficients)), curve.reading_span,
                curve.centre, curve.half_width, curve.knots,
            ).temperature(x)
            for s in (1, -1)
        ]  # fmt: skip
        np.testing.assert_allclose(
            curve.derivatives(x)[:, k], (sides[0] - sides[1]) / (2 * step), rtol=2e-5, atol=1e-9
        )
    step = 1e-6 * x
    by_difference = (curve.temperature(x + step) - curve.temperature(x - step)) / (2 * step)
    np.testing.assert_allclose(curve.slope(x), by_difference, rtol=1e-6)


@pytest.mark.parametrize("form", CURVES)
def test_there_is_no_temperature_outside_the_readings(form: str) -> None:
    curve = CURVES[form]
    low, high = curve.reading_span
    found = curve.temperature([low * 0.999, low, high, high * 1.001, np.nan])
    assert np.isnan(found).tolist() == [True, False, False, True, True]
    moved = curve.contributions([low * 0.999, low], np.ones(len(curve.coefficients)))
    assert moved[0] == 0.0
    assert moved[1] != 0.0
    assert curve.is_monotonic()


def test_forms_are_those_of_the_libraries() -> None:
    """Against numpy's Chebyshev and polynomial series and scipy's spline."""
    x = readings(CURVES["chebyshev"])
    k = (np.log(x) - np.log(950.0)) / 2.4
    np.testing.assert_allclose(
        CURVES["chebyshev"].temperature(x), Chebyshev((1.6, -1.4, 0.5, -0.1))(k), rtol=1e-14
    )
    k = (np.log(x) - np.log(950.0)) / 2.3
    np.testing.assert_allclose(
        CURVES["log-polynomial"].temperature(x), np.exp(Polynomial((0.2, -1.3, 0.2, -0.05))(k)), rtol=1e-14
    )
    spline = CURVES["spline"]
    expected = np.exp(CubicSpline(np.log(KNOTS), np.log(spline.coefficients))(np.log(x)))
    np.testing.assert_allclose(spline.temperature(x), expected, rtol=1e-14)


def test_a_curve_that_turns_is_not_monotonic() -> None:
    turning = CalibrationCurve("log-polynomial", (0.0, 0.0, 1.0), (0.5, 2.0))
    assert not turning.is_monotonic()


def test_a_law_with_its_pole_among_the_readings_is_not_monotonic() -> None:
    assert not CalibrationCurve("curie-weiss", (20.0, 0.34, 0.0), (13.0, 80.0)).is_monotonic()


def test_contributions_of_several_sources_come_at_once() -> None:
    curve = CURVES["curie-weiss"]
    shifts = np.array([[1e-3, 0.0, 0.0], [0.0, 0.0, 1e-5]])
    found = curve.contributions([20.0, 30.0], shifts)
    assert found.shape == (2, 2)
    assert found[1].tolist() == [1e-5, 1e-5]
