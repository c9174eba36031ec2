"""The lambda line under pressure against the points that were published, and what it is not good for."""

from __future__ import annotations

import csv
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest

from archive.physics.helium_liquid import density, lambda_temperature_estimate
from archive.physics.lambda_line import coarse_lambda_temperature, lambda_slope

ATMOSPHERE = 101325.0


@pytest.fixture(scope="module")
def points() -> list[tuple[float, float]]:
    """Pressure (Pa) and temperature on the scale of 1948 (K) of C. A. Swenson, Phys. Rev. 86, 870 (1952), citation from memory."""
    file = Path(__file__).parents[2] / "published" / "helium" / "helium4_lambda_line_coarse.csv"
    rows = csv.DictReader(file.read_text(encoding="utf-8").splitlines())
    return [(ATMOSPHERE * float(row["p_atm"]), float(row["T_Leiden1948_scale_K"])) for row in rows]


def test_it_falls_as_was_measured(points: list[tuple[float, float]]) -> None:
    """2.1768 K on ITS-90 where the scale of 1948 has 2.186 K; the fall from there is that of the points."""
    for p, T in points:
        assert float(coarse_lambda_temperature(p)) - 2.1768 == pytest.approx(T - 2.186, abs=1e-4)


def test_between_saturated_vapour_and_one_bar_it_agrees_with_the_estimate() -> None:
    """Both have the slope of -8.88 mK/bar at saturated vapour pressure; each is good to a millikelvin there."""
    p = np.linspace(5042, 1e5, 20)
    np.testing.assert_allclose(coarse_lambda_temperature(p), lambda_temperature_estimate(p), atol=2e-3)


def test_the_slope_is_that_of_neighbouring_points(points: list[tuple[float, float]]) -> None:
    for (p, T), (higher, colder) in pairwise(points):
        secant = (colder - T) / (higher - p)
        assert float(lambda_slope((p + higher) / 2)) == pytest.approx(secant, rel=0.03)
    # Gravity asks for 1 to 1.3 microkelvin per centimetre at saturated vapour pressure, and more under pressure.
    rise = -lambda_slope([5042.0, points[-1][0]]) * 9.80665 * 0.01
    assert float(rise[0] * density(2.1768)) == pytest.approx(1.273e-6, rel=0.02)
    assert rise[1] > 1.8 * rise[0]


@pytest.mark.parametrize("pressure", [4000.0, 3.1e6], ids=["below", "solid"])
def test_outside_there_is_no_line(pressure: float) -> None:
    """The line ends at about 30.1 bar (secondary source): beyond, helium freezes before it becomes normal."""
    with pytest.raises(ValueError, match="coarse lambda line"):
        coarse_lambda_temperature(pressure)
