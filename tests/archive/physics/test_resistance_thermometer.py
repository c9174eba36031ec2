"""Calibration curves against closed formulas, a check table and each other."""

import csv
import math
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.interpolate import CubicSpline

from archive.physics.resistance_curves import (
    ChebyshevCurve,
    ClementQuinnellCurve,
    HoppingCurve,
    InverseLogPolynomialCurve,
    LogPolynomialCurve,
    SplineCurve,
    log_polynomial_span,
)
from archive.physics.resistance_thermometer import (
    evaluate,
    is_monotonic,
    log_sensitivity,
    resistance,
    temperature_per_resistance,
)

PUBLISHED = Path(__file__).parents[2] / "published" / "thermometry"


def _rows(name: str) -> list[dict[str, str]]:
    rows = list(csv.DictReader((PUBLISHED / name).read_text(encoding="utf-8").splitlines()))
    assert rows, f"{name} is empty"
    return rows


def _points(name: str) -> tuple[np.ndarray, np.ndarray]:
    rows = _rows(f"resistance_synthetic_{name}.csv")
    return np.array([float(r["R_Ohm"]) for r in rows]), np.array([float(r["T_K"]) for r in rows])


COEFFICIENTS = tuple(float(row["a_i_K"]) for row in _rows("chebyshev_example_coefficients.csv"))
CHEBYSHEV = ChebyshevCurve(COEFFICIENTS, lower=4.5302, upper=9.7922, logarithm="ln")
MOTT = HoppingCurve(R0=700.0, T0=3.0, exponent=0.25, temperature_span=(0.05, 5.0))
GERMANIUM = InverseLogPolynomialCurve((6.9, -1.9, 0.35, -0.05), temperature_span=(0.3, 5.0))
CARBON = ClementQuinnellCurve(A=4.0, B=2.5, K=6.0, resistance_span=(20.0, 5000.0))
POLYNOMIAL = LogPolynomialCurve((0.2, -1.1, 0.12, -0.02), (50.0, 9000.0), centre=6.5, scale=2.6)
SPLINE = SplineCurve(*(tuple(map(float, column)) for column in _points("germanium_like")))
CURVES = {
    "chebyshev": CHEBYSHEV,
    "mott": MOTT,
    "germanium": GERMANIUM,
    "carbon": CARBON,
    "polynomial": POLYNOMIAL,
    "spline": SPLINE,
}


@pytest.mark.parametrize("row", _rows("resistance_check.csv"), ids=lambda r: f"{r['function']}-{r['input']}")
def test_check_table(row: dict[str, str]) -> None:
    x = float(row["input"])
    found = {
        "ruo2_like_inverse_Mott": lambda: evaluate(MOTT, x).temperature,
        "ruo2_like_sensitivity_dlnR_dlnT": lambda: log_sensitivity(MOTT, resistance(MOTT, x)),
        "germanium_like_R": lambda: resistance(GERMANIUM, x),
        "germanium_like_sensitivity_dlnR_dlnT": lambda: log_sensitivity(GERMANIUM, resistance(GERMANIUM, x)),
        "chebyshev_example_T": lambda: evaluate(CHEBYSHEV, x).temperature,
    }[row["function"]]()
    assert found == pytest.approx(float(row["expected"]), abs=float(row["tolerance"]))


@pytest.mark.parametrize(
    ("curve", "name"), [(MOTT, "ruo2_like"), (GERMANIUM, "germanium_like")], ids=["ruo2", "germanium"]
)
def test_synthetic_sensors(curve, name) -> None:
    """Eleven figures of R, six decimals of T."""
    R, T = _points(name)
    result = evaluate(curve, R)
    np.testing.assert_allclose(result.temperature[1:-1], T[1:-1], rtol=0, atol=6e-7)
    np.testing.assert_allclose(resistance(curve, T), R, rtol=3e-6)


def test_chebyshev_reproduces_the_germanium_like_sensor() -> None:
    """To 0.1 mK, and the rounding of its ten coefficients (0.5 uK each)."""
    R, T = _points("germanium_like")
    assert np.max(np.abs(evaluate(CHEBYSHEV, R).temperature - T)) < 1.05e-4


def test_chebyshev_is_the_sum_of_cosines_in_either_logarithm() -> None:
    ten = ChebyshevCurve(
        COEFFICIENTS, lower=4.5302 / math.log(10), upper=9.7922 / math.log(10), logarithm="log10"
    )
    R = np.geomspace(100, 17000, 50)
    k = (2 * np.log(R) - 4.5302 - 9.7922) / (9.7922 - 4.5302)
    expected = sum(a * np.cos(i * np.arccos(k)) for i, a in enumerate(COEFFICIENTS))
    np.testing.assert_allclose(evaluate(CHEBYSHEV, R).temperature, expected, rtol=1e-12)
    np.testing.assert_allclose(evaluate(ten, R).temperature, expected, rtol=1e-12)
    np.testing.assert_allclose(log_sensitivity(ten, R), log_sensitivity(CHEBYSHEV, R), rtol=1e-10)


def test_hopping_and_carbon_laws_by_hand() -> None:
    shklovskii = HoppingCurve(R0=100.0, T0=4.0, exponent=0.5, temperature_span=(0.1, 4.0))
    assert resistance(shklovskii, 1.0) == pytest.approx(100.0 * math.exp(2.0))
    T = float(evaluate(CARBON, 300.0).temperature)
    assert math.log(300.0) + 6.0 / math.log(300.0) == pytest.approx(4.0 + 2.5 / T)


def test_spline_is_the_one_of_scipy_and_takes_points_in_any_order() -> None:
    R, T = _points("germanium_like")
    shuffled = np.random.default_rng(1).permutation(R.size)
    curve = SplineCurve(tuple(R[shuffled]), tuple(T[shuffled]))
    x = np.geomspace(100, 17000, 40)
    expected = np.exp(CubicSpline(np.log(R[::-1]), np.log(T[::-1]))(np.log(x)))
    np.testing.assert_allclose(evaluate(curve, x).temperature, expected, rtol=1e-12)


@pytest.mark.parametrize("curve", CURVES.values(), ids=CURVES.keys())
def test_sensitivity_is_the_slope(curve) -> None:
    low, high = curve.resistance_span
    R = np.geomspace(low * 1.001, high * 0.999, 50)
    h = 1e-6 * R
    slope = (evaluate(curve, R + h).temperature - evaluate(curve, R - h).temperature) / (2 * h)
    np.testing.assert_allclose(temperature_per_resistance(curve, R), slope, rtol=2e-6)
    assert np.all(log_sensitivity(curve, R) < 0)


@pytest.mark.parametrize("curve", CURVES.values(), ids=CURVES.keys())
@settings(deadline=None)
@given(where=st.floats(0.0, 1.0))
def test_round_trip(curve, where: float) -> None:
    low, high = np.log(curve.resistance_span)
    R = float(np.exp(low + where * (high - low)))
    result = evaluate(curve, R)
    assert not result.outside
    assert float(resistance(curve, result.temperature)) == pytest.approx(R, rel=1e-9)


@pytest.mark.parametrize("curve", CURVES.values(), ids=CURVES.keys())
def test_outside_is_marked_and_never_extrapolated(curve) -> None:
    low, high = curve.resistance_span
    R = np.array([low * 0.99, low, high, high * 1.01, 0.0, -5.0, np.nan, np.inf])
    result = evaluate(curve, R)
    assert result.outside.tolist() == [True, False, False, True, True, True, False, True]
    assert np.isnan(result.temperature).tolist() == [True, False, False, True, True, True, True, True]
    assert np.isnan(log_sensitivity(curve, R)).tolist() == np.isnan(result.temperature).tolist()


@pytest.mark.parametrize("R", [1.0, [1.0, 2.0], float("nan")], ids=["one", "all", "missing"])
def test_nothing_inside_is_no_error(R) -> None:
    assert np.all(np.isnan(evaluate(MOTT, R).temperature))
    assert np.all(np.isnan(log_sensitivity(MOTT, R)))


def test_chebyshev_keeps_to_the_span_of_its_points() -> None:
    curve = ChebyshevCurve(
        COEFFICIENTS, lower=4.5302, upper=9.7922, logarithm="ln", span=(93.71179, 17714.73358)
    )
    assert evaluate(curve, [93.5, 100.0, 17800.0]).outside.tolist() == [True, False, True]
    assert evaluate(CHEBYSHEV, [93.5, 17800.0]).outside.tolist() == [False, False]


def test_a_narrower_certificate_is_kept_to() -> None:
    result = evaluate(MOTT, resistance(MOTT, [0.06, 0.5, 4.5]), temperature_span=(0.1, 4.0))
    assert result.outside.tolist() == [True, False, True]


def test_span_of_a_polynomial_given_by_temperatures() -> None:
    """The cubic turns outside the span; the span is that of the one stretch between."""
    low, high = log_polynomial_span((0.2, -1.1, 0.12, -0.02), (0.8, 2.0), centre=6.5, scale=2.6)
    curve = LogPolynomialCurve((0.2, -1.1, 0.12, -0.02), (low, high), centre=6.5, scale=2.6)
    assert evaluate(curve, [low, high]).temperature.tolist() == pytest.approx([2.0, 0.8])


@pytest.mark.parametrize("coefficients", [(0.0, 0.0, 1.0), (1.0,)], ids=["two", "none"])
def test_ambiguous_polynomial_is_refused(coefficients: tuple[float, ...]) -> None:
    with pytest.raises(ValueError, match="stretches of this polynomial"):
        log_polynomial_span(coefficients, (1.5, 4.0))


def test_resistance_outside_and_of_a_folded_curve_is_refused() -> None:
    with pytest.raises(ValueError, match="this calibration"):
        resistance(MOTT, [1.0, 6.0])
    folded = LogPolynomialCurve((0.0, 0.0, 1.0), (math.exp(-1), math.exp(1)))
    assert not is_monotonic(folded)
    with pytest.raises(ValueError, match="changes sign"):
        resistance(folded, 1.5)


@pytest.mark.parametrize(
    ("make", "text"),
    [
        (lambda: ChebyshevCurve((1.0, 1.0), 2.0, 1.0, "ln"), "upper"),
        (lambda: ChebyshevCurve((1.0, 1.0), 1.0, 2.0, "log2"), "logarithm"),
        (lambda: ChebyshevCurve((1.0, 1.0), 1.0, 2.0, "log10", span=(5.0, 50.0)), "within ZL and ZU"),
        (lambda: LogPolynomialCurve((1.0, 1.0), (2.0, 1.0)), "resistance_span"),
        (lambda: InverseLogPolynomialCurve((1.0, 0.0, 1.0), (0.5, 2.0)), "dR/dT changes sign"),
        (lambda: InverseLogPolynomialCurve((1.0, 1.0), (0.0, 2.0)), "temperature_span"),
        (lambda: SplineCurve((1.0, 2.0, 3.0), (1.0, 2.0, 3.0)), "at least 4"),
        (lambda: SplineCurve((1.0, 2.0, 3.0, 3.0), (1.0, 2.0, 3.0, 4.0)), "same resistance"),
        (lambda: SplineCurve((1.0, 2.0, 3.0, -3.0), (1.0, 2.0, 3.0, 4.0)), "above 0"),
        (lambda: HoppingCurve(-1.0, 3.0, 0.25, (0.1, 1.0)), "R0"),
        (lambda: ClementQuinnellCurve(1.0, 1.0, 1.0, (0.5, 10.0)), "above 1 ohm"),
    ],
    ids=lambda x: x if isinstance(x, str) else "",
)
def test_senseless_curves_are_refused(make, text: str) -> None:
    with pytest.raises(ValueError, match=text):
        make()
