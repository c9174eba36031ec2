"""Power law of the bulk superfluid density with its corrections."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from archive.physics.bulk_superfluid import fit_superfluid_law, transition_estimate
from archive.physics.power_law import bulk_superfluid_fraction, transverse_correlation_length

T_LAMBDA = 2.1768
TRUTH = {
    "amplitude": 2.403,
    "exponent": 0.6717,
    "confluent": 0.33,
    "regular": -1.46,
    "transition_temperature": T_LAMBDA,
}
"""Singsaas, Ahlers (1984) as reproduced by Donnelly and Barenghi (1998)."""

TABLE = Path(__file__).parents[2] / "published" / "helium" / "helium4_liquid_svp.csv"


def rows():
    """Return temperatures of a run and the fractions there."""
    T = T_LAMBDA * (1 - np.geomspace(1.1e-4, 0.031, 120))
    return T, bulk_superfluid_fraction(T, transition_temperature=T_LAMBDA)


@pytest.mark.parametrize("fixed", [True, False], ids=["T_lambda held", "T_lambda free"])
def test_published_coefficients_come_back(fixed):
    T, f = rows()
    found = fit_superfluid_law(
        T, f, start_temperature=T_LAMBDA if fixed else T_LAMBDA * (1 + 3e-5), fixed=fixed
    )
    assert found.converged, found.message
    assert ("transition_temperature" in found.fit.names) is not fixed
    for name, value in zip(found.fit.names, found.fit.values, strict=True):
        assert value == pytest.approx(TRUTH[name], rel=1e-6), name
    t = 1 - T / T_LAMBDA
    np.testing.assert_array_equal(found.used, (t > 1e-4) & (t < 0.03))


@pytest.mark.parametrize(
    ("transition", "amplitude"),
    [(2.1768, 2.403), (2.0, 2.22), (1.8, 1.96)],
    ids=["svp", "second pressure", "third pressure"],
)
def test_each_pressure_has_its_own_law_and_one_exponent(transition, amplitude):
    """Along the lambda line amplitude and transition change and the exponent does not (universality); amplitudes past svp invented."""
    law = TRUTH | {"transition_temperature": transition, "amplitude": amplitude}
    T = transition * (1 - np.geomspace(1.1e-4, 0.029, 120))
    # The law at saturated vapour pressure, at the same reduced temperatures and with another amplitude.
    held = bulk_superfluid_fraction(T, transition_temperature=transition) * amplitude / TRUTH["amplitude"]
    noisy = held + 5e-5 * np.random.default_rng(4).normal(size=T.size)
    found = fit_superfluid_law(
        T,
        noisy,
        start_temperature=transition_estimate(T, noisy),
        fixed=False,
        standard_uncertainty=5e-5,
        absolute=True,
    )
    assert found.converged, found.message
    for name in ("amplitude", "exponent", "transition_temperature"):
        index = found.fit.names.index(name)
        assert abs(found.fit.values[index] - law[name]) < 4 * np.sqrt(found.fit.covariance[index, index]), (
            name
        )


@pytest.mark.slow
@pytest.mark.parametrize("fixed", [True, False], ids=["T_lambda held", "T_lambda free"])
def test_uncertainty_is_honest(fixed):
    """200 runs: pulls of every parameter have mean 0 within 4/sqrt(200), width 1 within 4/sqrt(400)."""
    T, f = rows()
    pulls = []
    for seed in range(200):
        rng = np.random.default_rng(seed)
        read, noisy = T + 5e-6 * rng.normal(size=T.size), f + 5e-5 * rng.normal(size=T.size)
        start = T_LAMBDA if fixed else transition_estimate(read, noisy)
        found = fit_superfluid_law(
            read, noisy, start_temperature=start, fixed=fixed, standard_uncertainty=5e-5, temperature_uncertainty=5e-6, absolute=True
        )  # fmt: skip
        assert found.converged, found.message
        fit = found.fit
        pulls.append([(fit.value(name) - TRUTH[name]) / fit.standard_uncertainty(name) for name in fit.names])
    assert np.abs(np.mean(pulls, axis=0)).max() < 4 / np.sqrt(200)
    assert np.abs(np.std(pulls, axis=0) - 1).max() < 4 / np.sqrt(400)


def test_amplitude_and_exponent_are_correlated():
    T, f = rows()
    found = fit_superfluid_law(
        T, f, start_temperature=T_LAMBDA, fixed=True, standard_uncertainty=1e-4, absolute=True
    )
    sigma = np.sqrt(np.diag(found.fit.covariance))
    assert found.fit.covariance[0, 1] / (sigma[0] * sigma[1]) > 0.95


def test_leaving_terms_out_shifts_the_amplitude():
    """Without confluent and regular terms the same data have an amplitude that is wrong by far more than they leave open."""
    T, f = rows()
    found = fit_superfluid_law(
        T, f, start_temperature=T_LAMBDA, fixed=True, terms=2, standard_uncertainty=1e-4, absolute=True
    )
    assert found.fit.value("amplitude") - 2.403 > 10 * found.fit.standard_uncertainty("amplitude")
    assert found.fit.reduced_chi2 > 2


def test_start_from_tabulated_values():
    """Rows of Donnelly and Barenghi (1998) between 2.1 K and 2.175 K lead to their lambda point within 2 mK."""
    table = [
        (float(row["T90_K"]), float(row["superfluid_fraction"]))
        for row in csv.DictReader(TABLE.read_text(encoding="utf-8").splitlines())
        if 2.0 < float(row["T90_K"]) < 2.176
    ]
    assert transition_estimate(*zip(*table, strict=True)) == pytest.approx(T_LAMBDA, abs=2e-3)


def test_length_amplitude():
    """3.400 angstrom for k_0 = 2.403 and 146.1 kg/m^3 at 2.1768 K (computed by hand)."""
    xi = float(transverse_correlation_length(T_LAMBDA, superfluid_density=2.403 * 146.1))
    assert xi * 1e10 == pytest.approx(3.400, abs=5e-4)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"window": (0.01, 0.05)}, "window"),
        ({"terms": 5}, "terms"),
        ({"window": (0.0300, 0.0301)}, "rows in the window"),
    ],
    ids=["window", "terms", "no rows"],
)
def test_refused(change, message):
    T, f = rows()
    with pytest.raises(ValueError, match=message):
        fit_superfluid_law(T, f, **({"start_temperature": T_LAMBDA} | change))


def test_no_start_without_a_fall():
    with pytest.raises(ValueError, match="no fall"):
        transition_estimate(np.linspace(2.1, 2.17, 10), np.linspace(0.1, 0.2, 10))
    with pytest.raises(ValueError, match="found 0 rows"):
        transition_estimate(np.linspace(1.1, 1.2, 10), np.linspace(0.9, 0.8, 10))
