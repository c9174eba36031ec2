"""Curie-Weiss law both ways, and its fit to invented points."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from archive.physics.paramagnetic import curie_weiss_inductance, curie_weiss_temperature, fit_curie_weiss

LAW = {"offset": 12.5, "constant": 0.34, "theta": 0.4e-3}


def test_by_hand() -> None:
    assert curie_weiss_inductance(0.0204, **LAW) == pytest.approx(12.5 + 17.0)
    assert curie_weiss_temperature(29.5, **LAW) == pytest.approx(0.0204)


@settings(deadline=None)
@given(st.floats(1e-3, 5.0), st.sampled_from([1.0, -1.0]))
def test_round_trip(temperature: float, sign: float) -> None:
    law = {**LAW, "constant": sign * LAW["constant"]}
    assert float(curie_weiss_temperature(curie_weiss_inductance(temperature, **law), **law)) == pytest.approx(
        temperature, rel=1e-9
    )


def test_refusals_name_the_index() -> None:
    with pytest.raises(ValueError, match=r"temperature\[1\] = 0.0003 K is not above theta"):
        curie_weiss_inductance([0.1, 3e-4], **LAW)
    with pytest.raises(ValueError, match=r"inductance\[1\] = 12 is not beyond the offset"):
        curie_weiss_temperature([13.0, 12.0], **LAW)


def test_missing_stays_missing() -> None:
    assert np.isnan(curie_weiss_temperature([np.nan, 13.0], **LAW)).tolist() == [True, False]


def test_fit_returns_the_law_of_exact_points() -> None:
    T = np.geomspace(5e-3, 1.0, 15)
    fit = fit_curie_weiss(curie_weiss_inductance(T, **LAW), T)
    assert fit.converged
    assert (fit.offset, fit.constant, fit.theta) == pytest.approx((12.5, 0.34, 0.4e-3), rel=1e-6)
    assert np.max(np.abs(fit.residuals)) < 1e-8


def test_fit_uncertainties_are_those_of_repeated_noise() -> None:
    """Scatter of 200 fits to noise of 0.2 per cent of T against the covariance of one."""
    rng = np.random.default_rng(20260301)
    T = np.geomspace(5e-3, 1.0, 20)
    fits = []
    for _ in range(200):
        noise = 1 + 2e-3 * rng.standard_normal(T.size)
        fits.append(
            fit_curie_weiss(curie_weiss_inductance(T, **LAW), T * noise, temperature_uncertainty=2e-3 * T)
        )
    scatter = np.std([(f.offset, f.constant, f.theta) for f in fits], axis=0)
    stated = np.sqrt(np.diag(fits[0].covariance))
    np.testing.assert_allclose(stated, scatter, rtol=0.2)


@pytest.mark.parametrize(
    ("M", "T", "text"),
    [([1.0] * 4, [1.0] * 4, "at least 5"), ([1.0] * 5, [1.0] * 6, "shape"), ([1.0, 2, 3, 4, np.nan], [1.0] * 5, "finite"), ([1.0] * 5, [1.0, 1, 1, 1, 0], "above 0 K")],
    ids=["few", "shapes", "missing", "zero"],
)  # fmt: skip
def test_bad_points_are_refused(M: list[float], T: list[float], text: str) -> None:
    with pytest.raises(ValueError, match=text):
        fit_curie_weiss(M, T)
