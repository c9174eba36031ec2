"""Fits of calibrations: against other libraries, against the truth over many seeds, and refusals."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from scipy.optimize import curve_fit

from archive.physics import calibration_fit
from archive.physics.calibration_fit import fit_calibration
from archive.physics.paramagnetic import curie_weiss_inductance, fit_curie_weiss

LAW = {"offset": 12.5, "constant": 0.34, "theta": 0.4e-3}


def germanium(temperature: np.ndarray) -> np.ndarray:
    """Return an invented resistance in ohm, 0.3 to 5 K."""
    x = np.log(temperature)
    return np.asarray(np.exp(6.9 - 1.9 * x + 0.35 * x**2 - 0.05 * x**3))


T = np.geomspace(0.3, 5.0, 40)
R = germanium(T)


def noisy(rng: np.random.Generator, form: str) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Return reading, temperature and their stated uncertainties, with that noise."""
    clean, temperature = (
        (curie_weiss_inductance(np.geomspace(5e-3, 1.0, 30), **LAW), np.geomspace(5e-3, 1.0, 30))
        if form == "curie-weiss"
        else (R, T)
    )
    u_T = 1e-3 * temperature
    u_R = 3e-4 * np.abs(clean - (12.5 if form == "curie-weiss" else 0.0))
    return (
        clean + u_R * rng.standard_normal(clean.size),
        temperature + u_T * rng.standard_normal(clean.size),
        u_T,
        u_R,
    )


@pytest.mark.parametrize(("form", "low", "high"), [("chebyshev", 0.7, 1.15), ("log-polynomial", 0.7, 1.3)])
def test_a_form_that_only_comes_near_the_law_says_how_near(form: Any, low: float, high: float) -> None:
    """The law is of neither form: what the chosen order leaves of it stays within fit and interpolation uncertainty together.

    At 25 temperatures between the points, 30 seeds; laws of the form itself: `test_pulls`.
    """
    rng = np.random.default_rng(20241104)
    at = np.geomspace(0.31, 4.9, 25)
    squares, reduced = [], []
    for _ in range(30):
        r, t, u_T, u_R = noisy(rng, form)
        fit = fit_calibration(form, r, t, temperature_uncertainty=u_T, reading_uncertainty=u_R)
        u = np.hypot(fit.standard_uncertainty(germanium(at)), fit.interpolation * at)
        squares.append(np.nanmean(((fit.curve.temperature(germanium(at)) - at) / u) ** 2))
        reduced.append(fit.reduced_chi2)
    assert low < np.sqrt(np.mean(squares)) < high
    assert np.mean(reduced) == pytest.approx(1.0, abs=0.15)


def test_a_polynomial_is_that_of_numpy_with_its_covariance() -> None:
    """Against numpy.polyfit with absolute weights."""
    rng = np.random.default_rng(5)
    u = 1e-3 * T
    t = T + u * rng.standard_normal(T.size)
    fit = fit_calibration("log-polynomial", R, t, temperature_uncertainty=u, order=4)
    x = (np.log(R) - fit.curve.centre) / fit.curve.half_width
    values, covariance = np.polyfit(x, np.log(t), 4, w=t / u, cov="unscaled")
    np.testing.assert_allclose(fit.curve.coefficients, values[::-1], rtol=1e-8)
    np.testing.assert_allclose(fit.covariance, covariance[::-1, ::-1], rtol=1e-6)


def test_the_law_of_curie_and_weiss_is_that_of_scipy() -> None:
    """Against scipy.optimize.curve_fit of T(M) with absolute uncertainties."""
    M, t, u, _ = noisy(np.random.default_rng(8), "curie-weiss")
    fit = fit_calibration("curie-weiss", M, t, temperature_uncertainty=u)
    values, covariance = curve_fit(
        lambda m, a, c, th: th + c / (m - a), M, t, p0=tuple(LAW.values()), sigma=u, absolute_sigma=True
    )
    # Residuals in M turned into kelvin, against residuals in K: equal to first order.
    np.testing.assert_allclose(fit.curve.coefficients, values, rtol=2e-2)
    assert np.all(np.abs(np.array(fit.curve.coefficients) - values) < 0.1 * np.sqrt(np.diag(fit.covariance)))
    np.testing.assert_allclose(np.sqrt(np.diag(fit.covariance)), np.sqrt(np.diag(covariance)), rtol=0.02)


def test_the_uncertainty_of_the_reading_counts_through_the_slope() -> None:
    u_R = 1e-3 * R
    fit = fit_calibration("log-polynomial", R, T, reading_uncertainty=u_R, order=5)
    slope = np.abs(fit.curve.slope(R))
    same = fit_calibration("log-polynomial", R, T, temperature_uncertainty=slope * u_R, order=5)
    np.testing.assert_allclose(fit.covariance, same.covariance, rtol=0.02)
    both = fit_calibration(
        "log-polynomial", R, T, temperature_uncertainty=slope * u_R, reading_uncertainty=u_R, order=5
    )
    np.testing.assert_allclose(both.covariance, 2 * same.covariance, rtol=0.02)


def test_a_held_order_and_variable_stay() -> None:
    free = fit_calibration("chebyshev", R, T, temperature_uncertainty=1e-3 * T)
    scaled = (free.curve.centre, free.curve.half_width)
    moved = fit_calibration("chebyshev", R * 1.001, T * 1.002, temperature_uncertainty=1e-3 * T, order=free.order, centre_and_half_width=scaled)  # fmt: skip
    assert moved.order == free.order
    assert (moved.curve.centre, moved.curve.half_width) == scaled
    assert moved.trials == ()
    assert [trial.order for trial in free.trials][:2] == [1, 2]


def test_a_form_that_does_not_fit_says_so_in_its_interpolation_uncertainty() -> None:
    """An invented germanium sensor is no line in the logarithms: the misfit is not in the covariance."""
    rng = np.random.default_rng(3)
    u = 1e-4 * T
    fit = fit_calibration(
        "log-polynomial", R, T + u * rng.standard_normal(T.size), temperature_uncertainty=u, largest_order=2
    )
    assert fit.chance is not None
    assert fit.chance < 1e-6
    away = (fit.curve.temperature(R) / T - 1)[2:-2]
    assert 0.5 < float(np.sqrt(np.mean(away**2))) / fit.interpolation < 1.5


def test_without_uncertainties_the_scatter_speaks() -> None:
    rng = np.random.default_rng(11)
    t = T * (1 + 2e-3 * rng.standard_normal(T.size))
    for form in ("chebyshev", "log-polynomial", "spline"):
        fit = fit_calibration(form, R, t)  # type: ignore[arg-type]
        assert fit.reduced_chi2 is None
        u = fit.standard_uncertainty(R[5:-5]) / T[5:-5]
        assert 3e-4 < float(np.median(u)) < 4e-3, form


def test_a_spline_goes_through_its_points_in_any_order() -> None:
    order = np.random.default_rng(2).permutation(T.size)
    fit = fit_calibration("spline", R[order], T[order], temperature_uncertainty=1e-3 * T[order])
    np.testing.assert_allclose(fit.curve.temperature(R), T, rtol=1e-12)
    np.testing.assert_allclose(fit.standard_uncertainty(R), 1e-3 * T, rtol=1e-9)
    assert fit.interpolation < 1e-3


def test_a_search_that_does_not_end_is_no_calibration(monkeypatch: pytest.MonkeyPatch) -> None:
    M, t, _, _ = noisy(np.random.default_rng(8), "curie-weiss")
    ended = fit_curie_weiss(M, t)
    monkeypatch.setattr(
        calibration_fit, "fit_curie_weiss", lambda *_, **__: replace(ended, converged=False, message="no end")
    )
    with pytest.raises(ValueError, match="did not end properly: no end"):
        fit_calibration("curie-weiss", M, t)


@pytest.mark.parametrize(
    ("form", "reading", "temperature", "more", "text"),
    [
        pytest.param("chebyshev", R[:5], T[:5], {}, "at least 6 for a chebyshev", id="few"),
        pytest.param("spline", np.repeat(R[:20], 2), T, {}, "two points at", id="one reading twice"),
        pytest.param("spline", np.geomspace(1, 9, 61), np.geomspace(1, 9, 61), {}, "at most 60", id="spline of too many"),
        pytest.param("log-polynomial", -R, T, {}, r"reading\[0\]", id="negative"),
        pytest.param("curie-weiss", R, T[:-1], {}, "shape", id="shapes"),
        pytest.param("log-polynomial", R, T, {"temperature_uncertainty": np.r_[0.0, T[1:]]}, r"temperature_uncertainty\[0\]", id="one zero"),
        pytest.param("log-polynomial", np.geomspace(1, 100, 12), 1 + np.linspace(-1, 1, 12) ** 2, {"order": 4}, "turns within", id="turning"),
        pytest.param("curie-weiss", 1000 + (np.arange(40.0) - 18) ** 2, np.geomspace(8e-3, 0.2, 40), {}, "misses its points", id="no law"),
        pytest.param("chebyshev", np.geomspace(10, 1000, 12), np.r_[np.full(10, 1.0), 0.02, 0.01], {"order": 1}, "misses its points", id="below zero"),
    ],
)  # fmt: skip
def test_what_cannot_be_fitted_is_refused(
    form: Any, reading: np.ndarray, temperature: np.ndarray, more: dict[str, Any], text: str
) -> None:
    with pytest.raises(ValueError, match=text):
        fit_calibration(form, reading, temperature, **more)
