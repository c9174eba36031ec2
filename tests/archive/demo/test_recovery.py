"""Reductions of the forward models, by the functions the plans use, find the truth within their uncertainty.

Each pull is (found - true)/standard uncertainty over independent laboratories: another seed draws new noise, and new
errors of area, volumes, gauge and calibration. Mean 0 and width 1 within the statistics of the draws.
"""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from archive.demo.first_cooldown import DOSE_COVERAGES, RUN_ROWS, dose_run
from archive.demo.forward import (
    film_sweep,
    oscillator_record,
    ringdown,
    temperature_of,
    transition_temperature,
)
from archive.demo.gas import NITROGEN_AREA, dose_run_readings, isotherm, stated_amount
from archive.demo.porous_cooldown import POROUS_COVERAGES
from archive.demo.stated import Stated, generator
from archive.demo.truth import PG2, TO4
from archive.physics.adsorption import bet_area
from archive.physics.constants import MOLAR_MASS_HELIUM4
from archive.physics.film_features import shift_of_crossing
from archive.physics.loading import fit_loading
from archive.physics.polynomial_background import fit_background
from archive.physics.power_law import fit_power_law
from archive.physics.ringdown import ringdown as fit_ringdown
from archive.physics.universal_line import crossing_of_universal_line

LABORATORIES = 200
COVERAGE = 34.5e-6

pytestmark = [pytest.mark.slow, pytest.mark.no_cover]


def assert_unit_pulls(pulls):
    """Mean 0 and width 1, each within four standard deviations of its own scatter."""
    pulls = np.asarray(pulls)
    assert np.all(np.isfinite(pulls))
    count = pulls.size
    assert abs(pulls.mean()) < 4 * pulls.std() / np.sqrt(count)
    assert abs(pulls.std() - 1) < 4 / np.sqrt(2 * count)


def read_temperature(cell, stated, record):
    """Temperature as the laboratory's calibration gives it."""
    return temperature_of(cell.sensor, record.resistance) * (1 + stated.calibration_shift)


def period_drop(cell, stated, loading, seed, coverage):
    """Temperature and period drop of a film, background subtracted and aligned where the film is normal."""
    empty = oscillator_record(cell, np.linspace(0.03, 0.98, 240), 0.0, generator(seed, "empty"))
    background = fit_background(
        read_temperature(cell, stated, empty),
        empty.period,
        standard_uncertainty=cell.oscillator.noise,
        order=2,
    )
    film = film_sweep(cell, coverage, generator(seed, "film"))
    temperature = read_temperature(cell, stated, film)
    level = np.asarray(background.evaluate(temperature)[0])
    drop = level + loading * cell.film.area * coverage - film.period
    transition = transition_temperature(cell, coverage)
    window = (temperature > 1.1 * transition) & (temperature < 1.3 * transition)
    return temperature, drop - drop[window].mean()


def planar_pulls(seed):
    """Return the pulls of mass sensitivity, chi, inert coverage and T_KT of one laboratory."""
    cell = TO4
    rng = generator(seed, "sheet")
    stated = Stated.drawn(cell, rng)
    readings = dose_run_readings(cell, stated, DOSE_COVERAGES, generator(seed, "doses"))
    amounts = np.cumsum([0.0, *(stated_amount(stated, reading) for reading in readings)])
    run = dose_run(cell, DOSE_COVERAGES, 0.020, generator(seed, "run"))
    fit = fit_loading(np.repeat(amounts, RUN_ROWS), run.period, standard_uncertainty=cell.oscillator.noise)
    assert fit.found, fit.reason
    slope, chi, onset = fit.value("slope"), fit.value("drag_factor"), fit.value("onset_coverage")
    u_slope, u_chi = fit.standard_uncertainty("slope"), fit.standard_uncertainty("drag_factor")
    gas = np.hypot(cell.volume_uncertainty, cell.gauge_gain)

    temperature, drop = period_drop(cell, stated, cell.oscillator.loading, seed, COVERAGE)
    # sigma_s = (period drop)/[dP/dsigma (1 - chi)], dP/dsigma = S_n A/M.
    per_second = MOLAR_MASS_HELIUM4 / (slope * stated.area * (1 - chi))
    crossing = crossing_of_universal_line(
        temperature, drop * per_second, standard_uncertainty=cell.oscillator.noise * per_second
    )
    assert crossing.found, crossing.reason
    shift = shift_of_crossing(b=5.5, L=12.0)
    relative = np.sqrt(cell.area_uncertainty**2 + gas**2 + (u_slope / slope) ** 2 + (u_chi / (1 - chi)) ** 2)
    u_crossing = np.sqrt(
        crossing.standard_uncertainty**2
        + (relative * crossing.areal_density / crossing.slope) ** 2
        + (cell.sensor.calibration * crossing.temperature) ** 2
    )
    true = transition_temperature(cell, COVERAGE)
    onset_true = cell.film.inert
    return {
        "mass sensitivity": (slope / cell.oscillator.loading - 1) / np.hypot(u_slope / slope, gas),
        "chi": (chi - cell.film.chi) / u_chi,
        "inert coverage": (onset / stated.area / onset_true - 1)
        / np.sqrt(
            cell.area_uncertainty**2 + gas**2 + (fit.standard_uncertainty("onset_coverage") / onset) ** 2
        ),
        "transition temperature": (crossing.temperature / (1 + shift) - true) / (u_crossing / (1 + shift)),
    }


@cache
def planar():
    """Return the pulls of all laboratories, by quantity; no fixture, since only tests can do without coverage."""
    each = [planar_pulls(seed) for seed in range(LABORATORIES)]
    return {name: np.array([pulls[name] for pulls in each]) for name in each[0]}


@pytest.mark.parametrize("name", ["mass sensitivity", "chi", "inert coverage", "transition temperature"])
def test_the_discs_give_back_their_truth(name):
    assert_unit_pulls(planar()[name])


def porous_pulls(seed):
    """Return the pulls of T_c and exponent of one laboratory."""
    cell = PG2
    stated = Stated.drawn(cell, generator(seed, "sheet"))
    coverage = POROUS_COVERAGES["s007"]
    temperature, drop = period_drop(cell, stated, cell.oscillator.loading, seed, coverage)
    true = transition_temperature(cell, coverage)
    # A reading of T is uncertain by 2e-5 of R; on the steep law that is most of the scatter, so it is left to the fit.
    law = fit_power_law(
        temperature, drop, start_temperature=true * (1 + stated.calibration_shift), window=(3e-3, 0.1)
    )
    assert law.converged, law.message
    exponent, critical = law.fit.values[2], law.fit.values[1]
    u_exponent = np.sqrt(law.fit.covariance[2, 2])
    u_critical = np.hypot(np.sqrt(law.fit.covariance[1, 1]), cell.sensor.calibration * critical)
    return (critical - true) / u_critical, (exponent - cell.film.exponent) / u_exponent


def test_the_glass_gives_back_its_power_law():
    pulls = np.array([porous_pulls(seed) for seed in range(LABORATORIES)])
    assert_unit_pulls(pulls[:, 0])
    assert_unit_pulls(pulls[:, 1])


def test_ringdowns_give_back_the_quality_factor():
    pulls = []
    for seed in range(LABORATORIES):
        time, magnitude, quality = ringdown(TO4, 0.1, 0.0, generator(seed, "ring"))
        found = fit_ringdown(
            time,
            magnitude,
            frequency=1 / TO4.oscillator.period,
            convention="amplitude",
            background="noise floor",
        )
        pulls.append((found.quality_factor - quality) / found.standard_uncertainty)
    assert_unit_pulls(pulls)


def test_isotherms_give_back_the_area():
    pulls = []
    for seed in range(LABORATORIES):
        x, amount = isotherm(TO4.film.area, generator(seed, "n2"), points=28)
        found = bet_area(x, amount, cross_section=NITROGEN_AREA, bounds=(0.05, 0.30))
        assert found.accepted, found.reasons
        pulls.append((found.area - TO4.film.area) / found.u_area)
    assert_unit_pulls(pulls)
