"""The fitting layer against certified values, and what it says when it fails.

Certified values: NIST Statistical Reference Datasets, nonlinear regression (Information Technology Laboratory, NIST);
files and terms in tests/real/nist-strd.
"""

from __future__ import annotations

import math
import re
from pathlib import Path

import numpy as np
import pytest

from archive.physics.fitting import Parameter, fit, fit_residuals

FOLDER = Path(__file__).parents[2] / "real" / "nist-strd"


def lanczos(x, b):
    return b[0] * np.exp(-b[1] * x) + b[2] * np.exp(-b[3] * x) + b[4] * np.exp(-b[5] * x)


def gauss(x, b):
    peaks = b[2] * np.exp(-(((x - b[3]) / b[4]) ** 2)) + b[5] * np.exp(-(((x - b[6]) / b[7]) ** 2))
    return b[0] * np.exp(-b[1] * x) + peaks


def enso(x, b):
    def wave(period, cosine, sine):
        return cosine * np.cos(2 * np.pi * x / period) + sine * np.sin(2 * np.pi * x / period)

    return b[0] + wave(12, b[1], b[2]) + wave(b[3], b[4], b[5]) + wave(b[6], b[7], b[8])


MODELS = {
    "Bennett5": lambda x, b: b[0] * (b[1] + x) ** (-1 / b[2]),
    "Chwirut1": lambda x, b: np.exp(-b[0] * x) / (b[1] + b[2] * x),
    "Chwirut2": lambda x, b: np.exp(-b[0] * x) / (b[1] + b[2] * x),
    "DanWood": lambda x, b: b[0] * x ** b[1],
    "ENSO": enso,
    "Gauss1": gauss,
    "Gauss2": gauss,
    "Kirby2": lambda x, b: (b[0] + b[1] * x + b[2] * x**2) / (1 + b[3] * x + b[4] * x**2),
    "Lanczos2": lanczos,
    "Lanczos3": lanczos,
    "MGH10": lambda x, b: b[0] * np.exp(b[1] / (x + b[2])),
    "MGH17": lambda x, b: b[0] + b[1] * np.exp(-x * b[3]) + b[2] * np.exp(-x * b[4]),
    "Misra1a": lambda x, b: b[0] * (1 - np.exp(-b[1] * x)),
    "Misra1b": lambda x, b: b[0] * (1 - (1 + b[1] * x / 2) ** -2),
    "Misra1c": lambda x, b: b[0] * (1 - (1 + 2 * b[1] * x) ** -0.5),
    "Misra1d": lambda x, b: b[0] * b[1] * x / (1 + b[1] * x),
    "Nelson": lambda x, b: b[0] - b[1] * x[0] * np.exp(-b[2] * x[1]),
    "Rat42": lambda x, b: b[0] / (1 + np.exp(b[1] - b[2] * x)),
    "Roszman1": lambda x, b: b[0] - b[1] * x - np.arctan(b[2] / (x - b[3])) / np.pi,
}


def read(name):
    """Return starts, certified values, deviations, residual sum of squares, x and y of a problem."""
    text = (FOLDER / f"{name}.dat").read_text()
    rows = [
        [float(word) for word in found.split()]
        for found in re.findall(r"^\s*b\d+\s*=(.*)$", text, re.MULTILINE)
    ]
    rows = [row for row in rows if len(row) == 4]
    square_sum = float(re.search(r"Residual Sum of Squares:\s*(\S+)", text).group(1))
    data = np.array(
        [[float(word) for word in line.split()] for line in text.splitlines()[60:] if line.strip()]
    )
    first, second, certified, deviation = np.array(rows).T
    if name == "Nelson":
        return (first, second), certified, deviation, square_sum, data[:, 1:].T, np.log(data[:, 0])
    return (first, second), certified, deviation, square_sum, data[:, 1], data[:, 0]


def test_all_problems_are_here():
    assert {path.stem for path in FOLDER.glob("*.dat")} == set(MODELS)


@pytest.mark.parametrize("start", [0, 1], ids=["far", "near"])
@pytest.mark.parametrize("name", sorted(MODELS))
def test_certified_values(name, start):
    starts, certified, deviation, square_sum, x, y = read(name)
    parameters = [Parameter(f"b{i + 1}", value) for i, value in enumerate(starts[start])]
    found = fit(MODELS[name], parameters, x, y, absolute=False)
    assert found.converged, found.message
    np.testing.assert_allclose(found.values, certified, rtol=1e-6)
    np.testing.assert_allclose(np.sqrt(np.diag(found.covariance)), deviation, rtol=1e-4)
    assert found.chi2 == pytest.approx(square_sum, rel=1e-6)
    assert found.dof == y.size - len(parameters)


def test_bound_is_respected_and_named():
    x = np.linspace(0.0, 1.0, 11)
    found = fit(
        lambda x, p: p[0] + p[1] * x,
        [Parameter("a", 0.5), Parameter("b", 0.5, 0.0, 1.0)],
        x,
        2 * x,
        absolute=False,
    )
    assert found.at_bound == ("b",)
    assert found.value("b") == pytest.approx(1.0, abs=1e-6)
    assert found.standard_uncertainty("b") == 0.0
    # With the slope held at one, the best level is the mean of what is left: 0.5.
    assert found.value("a") == pytest.approx(0.5, abs=1e-6)
    assert found.dof == 10


def test_badly_scaled_problem_converges():
    t = np.linspace(0.0, 1e-6, 50)
    found = fit(
        lambda t, p: p[0] * np.exp(-t / p[1]),
        [Parameter("height", 1e-12), Parameter("time", 1e-7)],
        t,
        3e-12 * np.exp(-t / 2e-7),
        absolute=False,
    )
    assert found.converged
    np.testing.assert_allclose(found.values, [3e-12, 2e-7], rtol=1e-8)


def test_undetermined_parameters_are_not_called_converged():
    x = np.linspace(0.0, 1.0, 9)
    found = fit(
        lambda x, p: (p[0] + p[1]) * x,
        [Parameter("a", 1.0), Parameter("b", 2.0)],
        x,
        x + x**2,
        absolute=False,
    )
    assert not found.converged
    assert "do not determine" in found.message
    assert np.isinf(found.covariance).all()


def test_too_few_evaluations_are_said():
    starts, _, _, _, x, y = read("MGH10")
    parameters = [Parameter(f"b{i}", value) for i, value in enumerate(starts[0])]
    found = fit(MODELS["MGH10"], parameters, x, y, absolute=False, max_evaluations=30)
    assert not found.converged
    assert found.message.startswith("not converged after")


def test_absolute_and_relative_uncertainty():
    x = np.arange(6.0)
    y = np.array([0.1, 0.9, 2.2, 2.8, 4.1, 5.0])
    line = [Parameter("a", 1.0), Parameter("b", 1.0)]
    absolute = fit(lambda x, p: p[0] + p[1] * x, line, x, y, standard_uncertainty=0.5, absolute=True)
    relative = fit(lambda x, p: p[0] + p[1] * x, line, x, y, standard_uncertainty=0.5, absolute=False)
    # For equal uncertainties u(slope) = u / sqrt(sum of squared distances from the mean) = 0.5 / sqrt(17.5).
    assert absolute.standard_uncertainty("b") == pytest.approx(0.5 / math.sqrt(17.5), rel=1e-6)
    ratio = relative.standard_uncertainty("b") / absolute.standard_uncertainty("b")
    assert ratio == pytest.approx(math.sqrt(absolute.reduced_chi2), rel=1e-9)
    assert absolute.residuals.sum() == pytest.approx(0.0, abs=1e-8)


@pytest.mark.parametrize(
    ("parameters", "message"),
    [
        ([], "found none"),
        ([Parameter("a", 1.0), Parameter("a", 2.0)], "found a name twice"),
        ([Parameter("a", 2.0, 0.0, 1.0)], "found start 2.0"),
        ([Parameter("a", 1.0, 1.0, 1.0)], "no room"),
        ([Parameter("a", 1.0, scale=0.0)], "found scale 0.0"),
        ([Parameter("a", math.nan)], "found start nan"),
        ([Parameter(name, 1.0) for name in "abcd"], "expected at least 4"),
    ],
    ids=["none", "twice", "outside", "no room", "scale", "nan", "too many"],
)
def test_refused_parameters(parameters, message):
    with pytest.raises(ValueError, match=message):
        fit_residuals(lambda p: np.zeros(3) + p.sum(), parameters, absolute=False)


def test_model_not_finite_at_the_start():
    with pytest.raises(ValueError, match="found nan at point 0"):
        fit(
            lambda x, p: np.log(p[0] * x),
            [Parameter("a", -1.0)],
            np.array([1.0, 2.0]),
            [0.0, 1.0],
            absolute=False,
        )


def test_absolute_needs_uncertainties():
    with pytest.raises(ValueError, match="absolute=True"):
        fit(lambda x, p: p[0] * x, [Parameter("a", 1.0)], np.array([1.0, 2.0]), [0.0, 1.0], absolute=True)


def test_exact_data_on_a_large_offset_converge():
    """What is left is the rounding of the data; it has no gradient worth following."""
    x = np.linspace(0.0, 1.0, 200)
    y = 1e6 + 1e-3 * np.exp(-3 * x)
    start = [Parameter("level", 0.9e6), Parameter("height", 1e-3), Parameter("rate", 2.0)]
    found = fit(lambda x, p: p[0] + p[1] * np.exp(-p[2] * x), start, x, y, absolute=False)
    assert found.converged, found.message
    # One unit of 1e6 in double precision is 1e-10, so the rate is known to about a part in 1e6.
    assert found.value("rate") == pytest.approx(3.0, rel=1e-5)


def test_all_parameters_held_by_bounds():
    found = fit(
        lambda x, p: p[0] * x,
        [Parameter("a", 0.0, 0.0, 1.0)],
        np.array([1.0, 2.0]),
        [-1.0, -2.0],
        absolute=False,
    )
    assert found.at_bound == ("a",)
    assert found.converged
    assert found.covariance[0, 0] == 0


def test_start_at_zero_has_a_scale():
    assert Parameter("a", 0.0).typical_size() == 1.0
    assert Parameter("a", 0.0, -2.0, 2.0).typical_size() == 4.0
    assert Parameter("a", 0.0, scale=7.0).typical_size() == 7.0
    assert Parameter("a", -3.0).typical_size() == 3.0


def test_parameter_that_does_nothing():
    x = np.linspace(0.0, 1.0, 5)
    found = fit(
        lambda x, p: p[0] * x, [Parameter("a", 0.5), Parameter("idle", 1.0)], x, 2 * x, absolute=False
    )
    assert not found.converged
    assert np.isinf(found.covariance).all()


def test_no_degrees_of_freedom_give_no_uncertainty():
    x = np.array([0.0, 1.0])
    found = fit(
        lambda x, p: p[0] + p[1] * x,
        [Parameter("a", 1.0), Parameter("b", 1.0)],
        x,
        [1.0, 3.0],
        absolute=False,
    )
    assert found.value("b") == pytest.approx(2.0)
    assert math.isnan(found.reduced_chi2)
    assert np.isinf(found.covariance).all()


def test_model_of_wrong_shape():
    with pytest.raises(ValueError, match="2 dimensions"):
        fit_residuals(lambda p: np.ones((3, 1)) * p[0], [Parameter("a", 1.0)], absolute=False)


def rational(x, b):
    numerator = b[0] + b[1] * x + b[2] * x**2 + b[3] * x**3
    return numerator / (1 + b[4] * x + b[5] * x**2 + b[6] * x**3)


HARD = {
    # Curve, abscissae, parameters and scatter that the data are drawn with, and a start from which a single search is lost.
    "level": (
        lambda x, b: b[0] * (1 - np.exp(-b[1] * x)), np.array([1, 2, 3, 5, 7, 10.0]), (214, 0.55), 12.0, (1, 1),
    ),
    "ratio": (
        lambda x, b: b[0] * (x**2 + x * b[1]) / (x**2 + x * b[2] + b[3]), np.array([4, 2, 1, 0.5, 0.25, 1 / 6, 0.125, 0.1, 1 / 12, 1 / 14, 1 / 16]),
        (0.193, 0.191, 0.123, 0.136), 2e-3, (25, 39, 41.5, 39),
    ),
    "line": (
        lambda x, b: b[0] / b[1] * np.exp(-0.5 * ((x - b[2]) / b[1]) ** 2), np.linspace(400, 500, 41), (1.55, 4.1, 451.5), 5e-3, (1, 10, 500),
    ),
    "growth": (
        lambda x, b: b[0] / (1 + np.exp(b[1] - b[2] * x)) ** (1 / b[3]), np.arange(1, 16.0), (700, 5.3, 0.76, 1.28), 15.0, (100, 10, 1, 1),
    ),
    "cubics": (
        rational, np.linspace(-3, 2.2, 37), (1288, 1491, 583, 75.4, 0.966, 0.398, 0.0497), 8.0, (1000, 1000, 400, 40, 0.7, 0.3, 0.03),
    ),
    "cubics of small numbers": (
        rational, np.linspace(14, 850, 236), (1.08, -0.123, 4.09e-3, -1.43e-6, -5.76e-3, 2.41e-4, -1.23e-7), 0.08, (10, -1, 0.05, -1e-5, -0.05, 1e-3, -1e-6),
    ),
    "three decays": (
        lanczos, np.arange(24) * 0.05, (0.0951, 1, 0.8607, 3, 1.5576, 5), 1e-13, (1.2, 0.3, 5.6, 5.5, 6.5, 7.6),
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", sorted(HARD))
def test_hard_curves_from_far_starts(name):
    """The same end from afar as from the parameters that the data were drawn with; never another one in silence."""
    model, x, truth, scatter, far = HARD[name]
    y = model(x, np.array(truth, dtype=float)) + np.random.default_rng(3).normal(0, scatter, x.size)
    near, found = (
        fit(model, [Parameter(f"b{i}", value) for i, value in enumerate(start)], x, y, absolute=False)
        for start in (truth, far)
    )
    assert near.converged
    assert found.converged, found.message
    np.testing.assert_allclose(found.values, near.values, rtol=1e-5)
    # Residuals of 1e-13 are rounded to 3e-16 where the curve is two and a half.
    assert found.chi2 == pytest.approx(near.chi2, rel=1e-6 + 3e-16 / scatter)


def test_a_new_start_is_told():
    model, x, truth, scatter, far = HARD["level"]
    y = model(x, truth) + np.random.default_rng(3).normal(0, scatter, x.size)
    found = fit(model, [Parameter("level", far[0]), Parameter("rate", far[1])], x, y, absolute=False)
    assert "from new start" in found.message


def test_a_side_valley_is_left():
    """A peak fitted beside the only line converges, and explains nothing; a start nearby explains all."""
    x = np.linspace(400.0, 500.0, 101)
    rng = np.random.default_rng(9)
    y = np.exp(-0.5 * ((x - 451.5) / 4) ** 2) + rng.normal(0, 0.02, x.size)
    start = [Parameter("height", 0.1), Parameter("centre", 493.0), Parameter("width", 8.0)]
    found = fit(lambda x, p: p[0] * np.exp(-0.5 * ((x - p[1]) / p[2]) ** 2), start, x, y, absolute=False)
    assert found.value("centre") == pytest.approx(451.5, abs=1.0)


def test_signs_of_the_start_are_kept_where_they_cancel():
    x = np.linspace(0.0, 2.0, 21)
    y = 3 * np.cos(2 * x) + np.random.default_rng(1).normal(0, 0.01, x.size)
    found = [
        fit(
            lambda x, p: p[0] * p[2] * np.cos(p[1] * x) + 0 * p[2] + (p[2] ** 2 - 1),
            [Parameter("height", 1.0), Parameter("rate", rate), Parameter("side", 1.0)],
            x,
            y,
            absolute=False,
        ).value("rate")
        for rate in (0.2, -0.2)
    ]
    assert found == pytest.approx([2.0, -2.0], abs=0.02)


def test_given_derivatives_are_used():
    """The same end in fewer calls; the derivatives are those of the residuals."""
    x = np.linspace(0.0, 4.0, 30)
    y = 3 * np.exp(-0.5 * x) + np.random.default_rng(1).normal(0, 0.01, x.size)
    start = [Parameter("height", 1.0), Parameter("rate", 1.0)]

    def residuals(p):
        return y - p[0] * np.exp(-p[1] * x)

    def slopes(p):
        return np.column_stack([-np.exp(-p[1] * x), p[0] * x * np.exp(-p[1] * x)])

    with_slopes, without = (
        fit_residuals(residuals, start, absolute=False, jacobian=each) for each in (slopes, None)
    )
    np.testing.assert_allclose(with_slopes.values, without.values, rtol=1e-8)
    np.testing.assert_allclose(with_slopes.covariance, without.covariance, rtol=1e-6)
    assert with_slopes.evaluations < without.evaluations


def test_a_quick_search_only_finds_a_start():
    x = np.linspace(0.0, 4.0, 30)
    y = 3 * np.exp(-0.5 * x) + np.random.default_rng(1).normal(0, 0.01, x.size)
    start = [Parameter("height", 1.0), Parameter("rate", 1.0)]
    quick, full = (
        fit_residuals(lambda p: y - p[0] * np.exp(-p[1] * x), start, absolute=False, tolerance=each)
        for each in (1e-2, 4e-16)
    )
    assert quick.evaluations < full.evaluations
    np.testing.assert_allclose(quick.values, full.values, rtol=1e-2)


def test_a_start_on_the_other_side_of_nought_is_left():
    """The mirrored end lies outside the bounds, and the end itself is right."""
    x = np.linspace(0.0, 1.0, 11)
    found = fit(lambda x, p: p[0] * x, [Parameter("slope", -0.5, -1.0, 5.0)], x, 3 * x, absolute=False)
    assert found.value("slope") == pytest.approx(3.0)


def test_a_search_that_ends_at_the_edge_of_the_domain_is_not_called_converged():
    """The root's branch point keeps the search from the least sum of squares at b = 0.5; slopes there have one side only."""
    x = np.linspace(0.0, 1.0, 12)
    found = fit(lambda x, p: 0 * np.sqrt(p[0] - x) + p[0], [Parameter("b", 1.05)], x, x, absolute=False)
    assert found.value("b") == pytest.approx(1.0, abs=1e-3)
    assert not found.converged
    assert found.message.startswith("not converged: relative offset")


def test_a_model_that_is_finite_at_one_point_only():
    x = np.linspace(0.0, 1.0, 12)
    found = fit_residuals(lambda p: np.where(p[0] == 1.0, x, np.nan), [Parameter("a", 1.0)], absolute=False)
    assert not found.converged
    assert np.isinf(found.covariance).all()


def test_as_many_points_as_parameters_and_no_exact_fit():
    found = fit_residuals(
        lambda p: p**2 + 1, [Parameter("a", 1.0), Parameter("b", 2.0)], absolute=False, max_evaluations=200
    )
    assert not found.converged


def test_a_quick_search_may_say_no():
    x = np.linspace(0.0, 1.0, 12)
    found = fit_residuals(
        lambda p: x - (p[0] + p[1]),
        [Parameter("a", 1.0), Parameter("b", 1.0)],
        absolute=False,
        tolerance=1e-3,
    )
    assert not found.converged


def test_a_start_that_is_best_and_on_its_bound_is_kept():
    """The solver must begin inside the bounds, so it ends a little higher than the start itself."""
    x = np.linspace(0.0, 1.0, 11)
    found = fit(lambda x, p: p[0] * x, [Parameter("slope", 0.0, 0.0, 1.0)], x, 0 * x, absolute=False)
    assert found.value("slope") == 0.0
    assert found.converged
