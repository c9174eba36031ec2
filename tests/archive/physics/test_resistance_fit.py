"""Fits recover the law behind invented points, choose a sober order, and state honest uncertainties."""

import csv
from pathlib import Path

import numpy as np
import pytest

from archive.physics import resistance_fit
from archive.physics.resistance_curves import ClementQuinnellCurve
from archive.physics.resistance_thermometer import evaluate, resistance

PUBLISHED = Path(__file__).parents[2] / "published" / "thermometry"


def _points(name: str) -> tuple[np.ndarray, np.ndarray]:
    rows = list(
        csv.DictReader(
            (PUBLISHED / f"resistance_synthetic_{name}.csv").read_text(encoding="utf-8").splitlines()
        )
    )
    assert len(rows) == 25
    return np.array([float(r["R_Ohm"]) for r in rows]), np.array([float(r["T_K"]) for r in rows])


FITS = {
    "log-polynomial": resistance_fit.fit_log_polynomial,
    "inverse": resistance_fit.fit_inverse_log_polynomial,
    "chebyshev": resistance_fit.fit_chebyshev,
}


def test_inverse_polynomial_finds_the_cubic_it_was_made_of() -> None:
    """Ln R = 6.9 - 1.9 x + 0.35 x^2 - 0.05 x^3, x = ln(T/K)."""
    R, T = _points("germanium_like")
    fit = resistance_fit.fit_inverse_log_polynomial(R, T)
    x = np.log(T)
    expected = 6.9 - 1.9 * x + 0.35 * x**2 - 0.05 * x**3
    assert fit.order >= 3
    np.testing.assert_allclose(np.log(resistance(fit.curve, T)), expected, atol=2e-6)


def test_hopping_finds_the_mott_law_it_was_made_of() -> None:
    """R0 = 700 ohm, T0 = 3 K, n = 1/4."""
    R, T = _points("ruo2_like")
    fit = resistance_fit.fit_hopping(R, T, exponent=0.25)
    assert pytest.approx((700.0, 3.0), rel=1e-5) == (fit.curve.R0, fit.curve.T0)
    assert fit.largest < 1e-5
    wrong = resistance_fit.fit_hopping(R, T, exponent=0.5)
    assert wrong.rms > 1e3 * fit.rms


def test_carbon_law_is_found_again() -> None:
    law = ClementQuinnellCurve(A=4.0, B=2.5, K=6.0, resistance_span=(20.0, 5000.0))
    R = np.geomspace(20.0, 5000.0, 20)
    T = evaluate(law, R).temperature
    fit = resistance_fit.fit_clement_quinnell(R, T)
    assert pytest.approx((4.0, 2.5, 6.0), rel=1e-8) == (fit.curve.A, fit.curve.B, fit.curve.K)


@pytest.mark.parametrize("fitter", FITS.values(), ids=FITS.keys())
@pytest.mark.parametrize("name", ["germanium_like", "ruo2_like"])
def test_noise_is_not_followed(fitter, name: str) -> None:
    """Ten sets of 1e-3 noise: order modest, chi-squared near 1, the truth near the stated uncertainty of the fit."""
    R, T = _points(name)
    u = 1e-3 * T
    chi2, pulls = [], []
    for seed in range(10):
        noisy = T + u * np.random.default_rng(seed).standard_normal(T.size)
        fit = fitter(R, noisy, temperature_uncertainty=u)
        assert fit.order <= 10
        assert fit.monotonic
        assert fit.rms <= fit.leave_one_out
        chi2.append(fit.reduced_chi2)
        offset = evaluate(fit.curve, R[1:-1]).temperature - T[1:-1]
        pulls.append(np.sqrt(np.nanmean((offset / fit.standard_uncertainty(R[1:-1])) ** 2)))
    assert 0.8 < np.mean(chi2) < 1.25
    # Above one: the chosen order is a compromise, and what is left of the true curve is not in the covariance.
    assert np.median(pulls) < 1.7


def test_order_stops_where_neither_test_asks_for_more() -> None:
    R = np.geomspace(50, 5000, 30)
    rng = np.random.default_rng(3)
    T = np.exp(3 - 0.6 * np.log(R)) * (1 + 1e-3 * rng.standard_normal(R.size))
    fit = resistance_fit.fit_log_polynomial(R, T)
    assert fit.order == 1
    assert [trial.order for trial in fit.trials] == [1, 2]
    assert fit.trials[1].f_probability > 0.05
    assert fit.trials[1].aicc > fit.trials[0].aicc


def test_a_next_order_that_turns_says_nothing_of_the_form() -> None:
    """The curve ln R = 8 - 0.1 x + 0.5 x^2 turns within the points: the line stands, and nothing is compared with it."""
    T = np.geomspace(0.3, 3.0, 12)
    x = np.log(T)
    fit = resistance_fit.fit_inverse_log_polynomial(np.exp(8 - 0.1 * x + 0.5 * x**2), T, largest_order=1)
    assert fit.interpolation == 0.0


def test_interpolation_is_the_distance_to_the_next_order() -> None:
    """The curve ln T = 3 - 0.6 z + 0.02 z^2 held at the line: the next order is exact, so the distance is the misfit itself."""
    R = np.geomspace(50, 5000, 60)
    T = np.exp(3 - 0.6 * np.log(R) + 0.02 * np.log(R) ** 2)
    fit = resistance_fit.fit_log_polynomial(R, T, order=1)
    away = np.log(evaluate(fit.curve, R).temperature / T)
    assert fit.interpolation == pytest.approx(float(np.sqrt(np.mean(away**2))), rel=0.05)


def test_order_leaves_two_points_for_each_parameter() -> None:
    R, T = _points("germanium_like")
    fit = resistance_fit.fit_log_polynomial(R[::3], T[::3], largest_order=9)
    assert fit.order <= 2


def test_uncertainty_of_the_fit_is_that_of_repeated_noise() -> None:
    R, T = _points("germanium_like")
    rng = np.random.default_rng(11)
    at = np.array([150.0, 1000.0, 9000.0])
    values, stated = [], []
    for _ in range(150):
        noisy = T * (1 + 1e-3 * rng.standard_normal(T.size))
        fit = resistance_fit.fit_log_polynomial(R, noisy, temperature_uncertainty=1e-3 * T, largest_order=3)
        if fit.order == 3:
            values.append(evaluate(fit.curve, at).temperature)
            stated.append(fit.standard_uncertainty(at))
    assert len(values) > 100
    np.testing.assert_allclose(np.mean(stated, axis=0), np.std(values, axis=0), rtol=0.2)


def test_leave_one_out_is_what_leaving_out_gives() -> None:
    """The shortcut by leverage against fits that really leave one point out, in ln T."""
    R, T = _points("ruo2_like")
    T = T * (1 + 1e-3 * np.random.default_rng(5).standard_normal(T.size))
    fit = resistance_fit.fit_log_polynomial(R, T, largest_order=4)
    x, y = np.log(R), np.log(T)
    left = []
    for i in range(T.size):
        keep = np.arange(T.size) != i
        left.append(T[i] * (y[i] - np.polyval(np.polyfit(x[keep], y[keep], fit.order), x[i])))
    assert fit.leave_one_out == pytest.approx(np.sqrt(np.mean(np.square(left))), rel=1e-4)


def test_curve_covers_the_points_and_no_more() -> None:
    R, T = _points("germanium_like")
    fit = resistance_fit.fit_chebyshev(R, T)
    assert evaluate(fit.curve, [R.min(), R.max(), R.max() * 1.01]).outside.tolist() == [False, False, True]
    assert np.isnan(fit.standard_uncertainty([R.max() * 1.01, 1000.0])).tolist() == [True, False]
    assert np.isnan(fit.standard_uncertainty(1.0))
    assert fit.largest_in_uncertainties is None
    assert fit.reduced_chi2 is None


@pytest.mark.parametrize(
    ("R", "T", "u", "text"),
    [
        ([1.0] * 5, [1.0] * 5, None, "at least 6"),
        ([1.0] * 6, [1.0] * 7, None, "shape"),
        ([1.0, 2, 3, 4, 5, -6], [1.0] * 6, None, r"resistance\[5\]"),
        ([1.0, 2, 3, 4, 5, 6], [1.0, 1, np.nan, 1, 1, 1], None, r"temperature\[2\]"),
        ([1.0, 2, 3, 4, 5, 6], [1.0] * 6, [1.0, 1, 1, 0, 1, 1], r"temperature_uncertainty\[3\]"),
    ],
    ids=["few", "shapes", "resistance", "temperature", "uncertainty"],
)
def test_bad_points_are_refused(R: list[float], T: list[float], u: list[float] | None, text: str) -> None:
    with pytest.raises(ValueError, match=text):
        resistance_fit.fit_log_polynomial(R, T, temperature_uncertainty=u)


def test_laws_refuse_points_they_cannot_describe() -> None:
    T = np.linspace(1, 2, 8)
    with pytest.raises(ValueError, match="no fall with temperature"):
        resistance_fit.fit_hopping(100 * T, T, exponent=0.25)
    with pytest.raises(ValueError, match="more than 1 ohm"):
        resistance_fit.fit_clement_quinnell(1 / T, T)
