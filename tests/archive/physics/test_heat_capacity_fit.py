"""Fit of both sides of the lambda point."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad

from archive.physics.heat_capacity import LambdaLaw
from archive.physics.heat_capacity_fit import fit_lambda_law, sides_of_transition

T_LAMBDA = 2.1768
LAW = LambdaLaw.from_amplitudes(
    amplitude=5.6537,
    exponent=-0.01264,
    background=460.19,
    amplitude_ratio=1.0525,
    first=-0.0157,
    second=0.3311,
)
"""Lipa, Nissen, Stricker, Swanson, Chui, Phys. Rev. B 68, 174518 (2003); table of coefficients from memory."""

LOGARITHM = LambdaLaw(5.4, 0.0, 15.0, 4.1, 1.0, -100.0)


def steps(law):
    """Return middle, step and mean heat capacity of 90 steps, in turn a tenth and two thirds of their distance wide; the mean by adaptive quadrature."""
    t = np.geomspace(1.2e-6, 8e-3, 45)
    T = np.concatenate([T_LAMBDA * (1 - t), T_LAMBDA * (1 + t)])
    rise = T_LAMBDA * np.concatenate([t, t]) * np.where(np.arange(90) % 2, 0.1, 0.65)

    def mean(middle, step):
        below = middle < T_LAMBDA
        return (
            quad(
                lambda x: float(law.value(abs(1 - x / T_LAMBDA), below=below)),
                middle - step / 2,
                middle + step / 2,
                epsrel=1e-12,
            )[0]
            / step
        )

    return T, rise, np.array([mean(*each) for each in zip(T, rise, strict=True)])


@pytest.mark.parametrize("free", [True, False], ids=["T_lambda free", "T_lambda held"])
def test_the_published_law_comes_back(free):
    T, rise, C = steps(LAW)
    sides = sides_of_transition(T, C, rise=rise, lambda_temperature=None if free else T_LAMBDA)
    found = fit_lambda_law(T, C, sides=sides, rise=rise, standard_uncertainty=1e-3, absolute=True)
    assert found.converged, found.message
    assert ("lambda_temperature" in found.names) is free
    assert found.law.exponent == pytest.approx(-0.01264, abs=1e-9)
    assert found.law.amplitude_ratio == pytest.approx(1.0525, abs=1e-8)
    assert found.law.amplitude == pytest.approx(5.6537, rel=1e-7)
    assert found.law.background == pytest.approx(460.19, rel=1e-7)
    assert found.lambda_temperature == pytest.approx(T_LAMBDA, abs=1e-13)
    # 1 mJ/(mol K) of noise tells this exponent from a logarithm.
    assert found.probability < 1e-6


def test_the_middle_of_a_step_is_not_its_mean():
    """Taken as points, the same steps give another amplitude: a logarithm's mean lies above its middle by (step/t)^2/24."""
    T, _, C = steps(LAW)
    sides = sides_of_transition(T, C, lambda_temperature=T_LAMBDA)
    found = fit_lambda_law(T, C, sides=sides, standard_uncertainty=1e-3, absolute=True)
    assert found.fit.chi2 > 10


def rounded_logarithm(T, spread):
    """Return -ln t averaged over a height that spreads T_lambda, in closed form: the integral of ln x is x ln x - x."""
    low, high = (np.abs(T - T_LAMBDA) + side * spread / 2 for side in (-1, 1))
    whole = (high * np.log(high) - high - low * np.log(low) + low) / spread
    return np.log(T_LAMBDA) - whole


def test_gravity_is_averaged_out():
    """Rows down to one spread from the transition give back the law of a cell 2 cm high; taken as if it were thin they do not."""
    spread = 1.273e-6 * 2  # K; Ahlers, Physical Review 171, 275 (1968), number from memory
    t = np.geomspace(1.05 * spread / T_LAMBDA, 1e-3, 40)
    T = T_LAMBDA * np.concatenate([1 - t, 1 + t])
    C = 5.4 * rounded_logarithm(T, spread) + 15 - 5.4 * 4.1 * (T > T_LAMBDA)
    sides = sides_of_transition(T, C, lambda_temperature=T_LAMBDA)
    given = {
        "sides": sides,
        "window": (spread / T_LAMBDA, 1e-2),
        "corrections": 0,
        "standard_uncertainty": 1e-3,
        "absolute": True,
    }
    found = fit_lambda_law(T, C, spread=spread, **given)
    assert found.logarithm.value("amplitude") == pytest.approx(5.4, rel=1e-5)
    assert found.logarithm.value("asymmetry") == pytest.approx(4.1, rel=1e-4)
    assert found.logarithm.chi2 < 0.1
    assert fit_lambda_law(T, C, **given).logarithm.chi2 > 100
    with pytest.raises(ValueError, match=r"spread: found -1e-06, expected >= 0 K"):
        fit_lambda_law(T, C, spread=-1e-6, **given)


@pytest.mark.slow
@pytest.mark.parametrize(
    ("law", "free"),
    [(LAW, False), (LAW, True), (LOGARITHM, False)],
    ids=["law", "law, T_lambda free", "logarithm"],
)
def test_uncertainty_is_honest(law, free):
    """200 runs of 0.1 per cent: pulls have mean 0 within 4/sqrt(200) and width 1 within 4/sqrt(400)."""
    T, rise, C = steps(law)
    truth = {
        "amplitude": law.amplitude, "constant": law.constant, "asymmetry": law.asymmetry, "first": law.first, "second": law.second,
        "exponent": law.exponent, "lambda_temperature": T_LAMBDA,
    }  # fmt: skip
    pulls, chances = [], []
    for seed in range(200):
        u = 1e-3 * C
        noisy = C + u * np.random.default_rng(seed).normal(size=C.size)
        sides = sides_of_transition(T, noisy, rise=rise, lambda_temperature=None if free else T_LAMBDA)
        found = fit_lambda_law(T, noisy, sides=sides, rise=rise, standard_uncertainty=u, absolute=True)
        assert found.converged, found.message
        assert sides.low <= found.lambda_temperature <= sides.high
        spread = np.sqrt(np.diag(found.covariance))
        values = [found.fit.value(name) - truth[name] for name in found.names]
        pulls.append(values / spread)
        chances.append(found.probability)
    assert np.abs(np.mean(pulls, axis=0)).max() < 4 / np.sqrt(200)
    assert np.abs(np.std(pulls, axis=0) - 1).max() < 4 / np.sqrt(400)
    if law is LOGARITHM:
        # Where the logarithm is true the F-test's chance is even: 5 per cent below 0.05, within 3.5 sigma of a binomial.
        assert np.mean(np.array(chances) < 0.05) < 0.05 + 3.5 * np.sqrt(0.05 * 0.95 / 200)
        assert np.mean(chances) == pytest.approx(0.5, abs=4 * np.sqrt(1 / 12 / 200))
    else:
        assert max(chances) < 1e-3


def test_temperature_noise_counts_near_the_transition():
    T, rise, C = steps(LAW)
    sides = sides_of_transition(T, C, rise=rise, lambda_temperature=T_LAMBDA)
    common = {"sides": sides, "rise": rise, "standard_uncertainty": 1e-2, "absolute": True}
    quiet = fit_lambda_law(T, C, **common)
    noisy = fit_lambda_law(T, C, temperature_uncertainty=1e-7, **common)
    index = quiet.names.index("exponent")
    assert noisy.covariance[index, index] > 1.2 * quiet.covariance[index, index]


def test_sides_with_a_step_over_the_transition():
    """One step holds the transition; it and a neighbour are in neither side, and the transition lies between the ends."""
    edges = T_LAMBDA + np.arange(-9.7, 10.3) * 1e-5
    T, rise = (edges[1:] + edges[:-1]) / 2, np.diff(edges)
    C = np.where(T < T_LAMBDA, 80 - 1e5 * np.abs(T - T_LAMBDA), 55 - 1e5 * np.abs(T - T_LAMBDA))
    sides = sides_of_transition(T, C, rise=rise)
    assert sides.low <= T_LAMBDA <= sides.high
    holds = np.abs(T - T_LAMBDA) < rise / 2
    assert np.count_nonzero(holds) == 1
    assert not (holds & (sides.below | sides.above)).any()
    assert np.count_nonzero(sides.below | sides.above) == T.size - 2


def test_refused():
    T, rise, C = steps(LAW)
    sides = sides_of_transition(T, C, rise=rise, lambda_temperature=T_LAMBDA)
    with pytest.raises(ValueError, match="window"):
        fit_lambda_law(T, C, sides=sides, window=(0.1, 0.01))
    with pytest.raises(ValueError, match="corrections"):
        fit_lambda_law(T, C, sides=sides, corrections=3)
    with pytest.raises(ValueError, match="rows in the window, expected at least 8"):
        fit_lambda_law(T, C, sides=sides, window=(5e-3, 1e-2), rise=rise)
    with pytest.raises(ValueError, match="found 0 rows above"):
        sides_of_transition(T, C, lambda_temperature=2.3)
