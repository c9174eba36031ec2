"""The forward models read what the truth says, with the noise that the sheets state."""

from __future__ import annotations

import numpy as np
import pytest

from archive.demo.first_cooldown import DOSE_COVERAGES, RUN_ROWS, dose_run
from archive.demo.forward import (
    background_period,
    drive_sweep,
    film_sweep,
    frequency_sweep,
    oscillator_record,
    resistance,
    ringdown,
    temperature_of,
    transition_temperature,
)
from archive.demo.gas import NITROGEN_AREA, THERMOMETER, dose_reading, isotherm, stated_amount
from archive.demo.porous_cooldown import POROUS_DOSES
from archive.demo.stated import Stated, generator
from archive.demo.truth import PG2, TO4, remounted
from archive.physics.constants import AVOGADRO

CELLS = pytest.mark.parametrize("cell", [TO4, PG2], ids=lambda cell: cell.name)


@CELLS
def test_resistance_inverts_the_sensor(cell):
    temperature = np.geomspace(cell.sensor.low, cell.sensor.high, 60)
    reading = resistance(cell.sensor, temperature)
    assert np.all(np.diff(reading) < 0)
    np.testing.assert_allclose(temperature_of(cell.sensor, reading), temperature, rtol=1e-13)


def test_a_year_moves_the_sensor_by_some_millikelvin():
    later = remounted(TO4).sensor
    read = float(temperature_of(TO4.sensor, resistance(later, 0.5)))
    assert 3e-3 < read - 0.5 < 5e-3


@CELLS
def test_noise_has_the_stated_width(cell):
    rows = 20_000
    record = oscillator_record(cell, np.full(rows, 0.3), 0.0, generator(5, "noise"), cadence=0.0)
    period = record.period - background_period(cell.oscillator, 0.3)
    tolerance = 5 / np.sqrt(2 * rows)
    assert period.std() == pytest.approx(cell.oscillator.noise, rel=tolerance)
    assert record.amplitude.std() / record.amplitude.mean() == pytest.approx(
        cell.oscillator.signal_noise, rel=tolerance
    )
    assert record.resistance.std() / record.resistance.mean() == pytest.approx(
        cell.sensor.reading, rel=tolerance
    )
    lag_one = np.corrcoef(period[1:], period[:-1])[0, 1]
    assert abs(lag_one) < 5 / np.sqrt(rows)


def test_sweeps_are_shifted_against_each_other_by_the_stated_amount():
    count = 2000
    shifts = [
        oscillator_record(TO4, np.full(50, 0.3), 0.0, generator(seed, "shift"), cadence=0.0).period.mean()
        - float(background_period(TO4.oscillator, 0.3))
        for seed in range(count)
    ]
    assert np.std(shifts) == pytest.approx(TO4.oscillator.offset, rel=5 / np.sqrt(2 * count) + 0.01)


@pytest.mark.parametrize(
    ("cell", "coverages", "base"),
    [(TO4, DOSE_COVERAGES, 0.020), (PG2, POROUS_DOSES, 0.058)],
    ids=["TO-4", "PG-2"],
)
def test_the_two_slopes_of_a_dose_run_give_chi_and_the_inert_coverage(cell, coverages, base):
    record = dose_run(cell, coverages, base, generator(3, "run"))
    level = record.period.reshape(-1, RUN_ROWS).mean(axis=1)
    coverage = np.array([0.0, *coverages])
    below = np.polyfit(coverage[coverage < cell.film.inert], level[coverage < cell.film.inert], 1)
    past = np.polyfit(coverage[coverage > cell.film.inert], level[coverage > cell.film.inert], 1)
    # Slopes of the loading line below onset, S_n, and past it at low temperature, chi S_n.
    assert below[0] == pytest.approx(cell.oscillator.loading * cell.film.area, rel=5e-4)
    assert past[0] / below[0] == pytest.approx(cell.film.chi, abs=1.5e-3)
    assert (below[1] - past[1]) / (past[0] - below[0]) == pytest.approx(cell.film.inert, rel=1e-3)


def test_a_film_sweep_shows_the_drop_of_the_universal_jump():
    coverage = 34.5e-6
    transition = transition_temperature(TO4, coverage)
    record = film_sweep(TO4, coverage, generator(3, "sweep"))
    loaded = (
        background_period(TO4.oscillator, record.temperature)
        + TO4.oscillator.loading * TO4.film.area * coverage
    )
    drop = loaded - record.period
    per_kelvin = 8.72272e-6 * TO4.oscillator.loading * TO4.film.area * (1 - TO4.film.chi)
    warm = record.temperature > 1.1 * transition
    cold = record.temperature < 0.99 * transition
    assert abs(drop[warm].mean()) < 5 * TO4.oscillator.offset
    assert drop[cold].min() > 1.05 * per_kelvin * transition
    assert record.amplitude.min() < 0.95 * record.amplitude[0]


def test_a_sweep_down_is_the_sweep_up_in_reverse():
    up = film_sweep(TO4, 34.5e-6, generator(3, "a"))
    down = film_sweep(TO4, 34.5e-6, generator(3, "a"), down=True)
    np.testing.assert_array_equal(up.temperature, down.temperature[::-1])


def test_a_sweep_without_a_film_that_flows_is_refused():
    with pytest.raises(ValueError, match="coverage"):
        film_sweep(TO4, 24e-6, generator(3, "a"))


def test_a_ringdown_decays_with_its_quality_factor():
    elapsed, magnitude, quality = ringdown(TO4, 0.1, 0.0, generator(3, "ring"))
    early = magnitude > 50e-6
    slope = np.polyfit(elapsed[early], np.log(magnitude[early]), 1)[0]
    # Q = pi f tau with tau from the amplitude.
    assert -np.pi / slope / TO4.oscillator.period == pytest.approx(quality, rel=2e-3)
    assert quality == pytest.approx(4e5, rel=0.02)


def test_the_response_is_linear_in_the_drive():
    record = drive_sweep(TO4, 0.1, 0.0, generator(3, "drive"))
    ratio = record.amplitude / record.drive
    assert np.max(np.abs(ratio / ratio.mean() - 1)) < 6 * TO4.oscillator.signal_noise


def test_a_frequency_sweep_is_a_circle_around_its_resonance():
    f, x, y = frequency_sweep(PG2, 0.1, generator(3, "f"))
    width = 1 / (1 / (PG2.oscillator.loss + 0.1 * PG2.oscillator.loss_slope) * PG2.oscillator.period)
    top = f[np.argmax(np.hypot(x, y))]
    assert top == pytest.approx(1 / float(background_period(PG2.oscillator, 0.1)), abs=0.1 * width)


@CELLS
def test_what_the_sheet_states_is_off_by_its_uncertainty(cell):
    drawn = [Stated.drawn(cell, generator(seed, "sheet")) for seed in range(600)]
    pulls = np.array(
        [
            [
                (each.area / cell.film.area - 1) / cell.area_uncertainty,
                (each.doser_volume / cell.doser_volume - 1) / cell.volume_uncertainty,
                (each.gauge_zero - cell.gauge_zero) / cell.zero_uncertainty,
                (each.gauge_gain - 1) / cell.gauge_gain,
                (each.reference_quality * cell.oscillator.loss - 1) / cell.quality_uncertainty,
                (each.reference_signal / cell.oscillator.signal - 1) / cell.oscillator.signal_noise,
                each.calibration_shift / cell.sensor.calibration,
            ]
            for each in drawn
        ]
    )
    assert np.all(np.abs(pulls.mean(axis=0)) < 4 / np.sqrt(600))
    np.testing.assert_allclose(pulls.std(axis=0), 1, atol=4 / np.sqrt(1200))
    off_diagonal = np.corrcoef(pulls.T) - np.eye(pulls.shape[1])
    assert np.max(np.abs(off_diagonal)) < 0.2


@CELLS
def test_the_amount_of_a_dose_pulls_with_unit_width(cell):
    amount = 3e-6 * cell.film.area
    pulls = []
    for seed in range(600):
        rng = generator(seed, "dose")
        stated = Stated.drawn(cell, rng)
        reading = dose_reading(cell, stated, amount, rng)
        swing = reading.before - reading.after
        relative = np.sqrt(
            cell.volume_uncertainty**2
            + cell.gauge_gain**2
            + 2 * (cell.gauge_reading / swing) ** 2
            + (THERMOMETER / reading.temperature) ** 2
        )
        pulls.append((stated_amount(stated, reading) / amount - 1) / relative)
    assert abs(np.mean(pulls)) < 4 / np.sqrt(600)
    assert np.std(pulls) == pytest.approx(1, abs=4 / np.sqrt(1200))


@pytest.mark.parametrize("pores", [None, 5.4e-3], ids=["discs", "glass"])
def test_the_isotherm_holds_its_area(pores):
    area = 1.607 if pores is None else 108.6
    x, n = isotherm(area, generator(3, "n2"), points=60, pore_amount=pores)
    used = (x > 0.05) & (x < 0.30)
    # Brunauer, Emmett, Teller: x/[n (1 - x)] is a line with n_m = 1/(slope + intercept).
    slope, intercept = np.polyfit(x[used], x[used] / (n[used] * (1 - x[used])), 1)
    assert AVOGADRO * NITROGEN_AREA / (slope + intercept) == pytest.approx(area, rel=3e-3)
    if pores is not None:
        assert n[-1] == pytest.approx(pores, rel=0.01)
