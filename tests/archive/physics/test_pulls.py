"""Pulls: over two hundred drawn records each fit finds the truth as often, and misses it by as much, as it says.

A pull is (found - true)/standard uncertainty. Its mean is 0 within 4/sqrt(N) and its width 1 within 4/sqrt(2 N). Each record is drawn
from the law that the fit assumes, with a scatter that is known here and, unless a line says otherwise, not told to the fit. The
other systems have theirs beside their own tests: film (`reduction/test_dynamic_steps`), bulk oscillator and heat capacity
(`reduction/test_bulk_steps`, `reduction/test_heat_capacity_steps`, `physics/test_heat_capacity_fit`), bulk superfluid
(`physics/test_bulk_superfluid`), currents and their decay (`physics/test_persistent_current`, `reduction/test_current_steps`),
third sound (`reduction/test_third_sound_steps`), nights of readings (`reduction/test_stability_steps`), and whole laboratories
(`demo/test_recovery`, `demo/test_reduction`).
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from archive.physics import coulomb_blockade, resistance_fit
from archive.physics.adsorption import bet_area
from archive.physics.allan_deviation import allan_deviation
from archive.physics.allan_uncertainty import relative_uncertainty
from archive.physics.calibration_fit import fit_calibration
from archive.physics.constants import AVOGADRO
from archive.physics.line_search import resonance_lines
from archive.physics.loading import fit_loading
from archive.physics.paramagnetic import curie_weiss_inductance
from archive.physics.power_law import fit_power_law
from archive.physics.pulse_response import pulse_response
from archive.physics.resistance_thermometer import evaluate
from archive.physics.resonance import fit_resonance, resonance_curve
from archive.physics.ringdown import ringdown
from archive.physics.ringdown_components import component_ringdown

SEEDS = 200

pytestmark = pytest.mark.slow


def dose_run(rng):
    """Two straight lines that meet at the onset: slope, chi, inert amount and the empty period."""
    truth = {"slope": 1.7e-4, "drag_factor": 0.3, "onset_coverage": 27.3e-6, "period_at_zero": 1e-3}
    n = np.linspace(2e-6, 60e-6, 30)
    past = np.maximum(n - truth["onset_coverage"], 0.0)
    period = truth["period_at_zero"] + truth["slope"] * (n - (1 - truth["drag_factor"]) * past)
    found = fit_loading(n, period + rng.normal(0, 2e-11, n.size))
    assert found.found, found.reason
    return {
        name: (found.value(name) - true) / found.standard_uncertainty(name) for name, true in truth.items()
    }


def isotherm(rng):
    """Amounts that scatter by a fraction of themselves, as dosed amounts do; the line is fitted without weights."""
    monolayer, C, section = 1e-4, 60.0, 0.162e-18
    x = np.linspace(0.05, 0.30, 26)
    amount = monolayer * C * x / ((1 - x) * (1 + (C - 1) * x)) * (1 + 2.5e-4 * rng.normal(size=x.size))
    found = bet_area(x, amount, cross_section=section, bounds=(0.0, 0.31))
    assert found.accepted, found.reasons
    return {
        "area": (found.area - monolayer * AVOGADRO * section) / found.u_area,
        "constant": (found.constant - C) / found.u_constant,
    }


def porous_film(rng):
    """Power law with a free transition, scatter not told."""
    truth = {"amplitude": 3e-7, "transition_temperature": 0.9, "exponent": 0.63}
    T = np.linspace(0.81, 0.899, 90)
    rho = truth["amplitude"] * (1 - T / 0.9) ** truth["exponent"] + rng.normal(0, 3e-11, T.size)
    found = fit_power_law(T, rho, start_temperature=0.9003, window=(1e-3, 0.2))
    assert found.converged, found.message
    return {
        name: (found.fit.value(name) - true) / found.fit.standard_uncertainty(name)
        for name, true in truth.items()
    }


def ringdowns(rng):
    """A signed channel with a baseline, and one without."""
    t, tau, pulls = np.linspace(0.0, 600.0, 300), 159.0, {}
    for background, level in (("constant", 0.05), ("none", 0.0)):
        y = np.exp(-t / tau) + level + rng.normal(0, 0.01, t.size)
        found = ringdown(t, y, frequency=1000.0, convention="amplitude", background=background)
        assert found.converged, found.message
        pulls[background] = (found.quality_factor - math.pi * 1000 * tau) / found.standard_uncertainty
    return pulls


def resonance(rng):
    """Complex sweep with a background: frequency, Q and height."""
    truth = {"frequency": 1000.0, "quality_factor": 400.0, "height": 1.0, "phase": 1.0}
    f = np.linspace(990.0, 1010.0, 101)
    z = resonance_curve(f, resonance_frequency=1000.0, quality_factor=400.0, height=1.0, phase=1.0) + (
        0.2 + 0.1j
    )
    z = z + 0.02 * (rng.normal(size=f.size) + 1j * rng.normal(size=f.size))
    found = fit_resonance(f, z.real, z.imag)
    assert found.found, found.reason
    return {
        name: (found.fit.value(name) - true) / found.fit.standard_uncertainty(name)
        for name, true in truth.items()
    }


def stability(rng):
    """Squared Allan deviations of white noise, the quantity whose estimate has no bias."""
    readings = 1 + 1e-6 * rng.normal(size=2000)
    found = allan_deviation(readings, interval=1.0, factors=[1, 8])
    # The difference of two averages of m readings has the variance 2 s^2/m, and the square takes half.
    return {
        f"factor {m}": (sigma**2 * m / 1e-12 - 1) / (2 * relative_uncertainty(2000, m))
        for m, sigma in zip((1, 8), found.sigma, strict=True)
    }


def resistance_calibration(rng):
    """A cubic in ln R, of known order; temperatures scatter by a stated part in a thousand."""
    R = np.geomspace(100.0, 10000.0, 25)
    y = (np.log(R) - np.log(1000.0)) / np.log(10.0)
    T = np.exp(0.5 - 1.5 * y + 0.2 * y**2 - 0.05 * y**3)
    u = 1e-3 * T
    noisy = T + u * rng.normal(size=T.size)
    pulls = {}
    for words, known in (("stated", u), ("by scatter", None)):
        fit = resistance_fit.fit_log_polynomial(R, noisy, temperature_uncertainty=known, order=3)
        for index in (2, 12, 22):
            at = R[index : index + 1]
            error = evaluate(fit.curve, at).temperature[0] - T[index]
            pulls[f"{R[index]:.0f} ohm, {words}"] = error / float(fit.standard_uncertainty(at)[0])
    return pulls


def component_ringdowns(rng):
    """A decay in both components, off the frequency of the detector."""
    t, tau, offset = np.linspace(0.0, 300.0, 400), 60.0, 0.05
    z = 1.3 * np.exp(0.4j) * np.exp((2j * np.pi * offset - 1 / tau) * t) + (0.05 - 0.02j)
    z = z + 0.01 * (rng.normal(size=t.size) + 1j * rng.normal(size=t.size))
    found = component_ringdown(t, z.real, z.imag, frequency=1000.0)
    assert found.found, found.reason
    u = np.sqrt(np.diag(found.covariance))
    return {
        "offset": (found.frequency_offset - offset) / u[0],
        "Q": (found.quality_factor - math.pi * 1000 * tau) / u[1],
    }


def pulse_lines(rng):
    """A resonator struck by a pulse of random phases, with feedthrough, weak and strong."""
    rate, points, truth = 4096.0, 8192, (700.3, 150.0)
    t, f = np.arange(points) / rate, np.fft.rfftfreq(points, 1 / rate)
    pulse = np.random.default_rng(1).normal(size=points) * ((t > 0.1) & (t < 1.0))
    r = f / truth[0]
    driven = np.fft.irfft(np.fft.rfft(pulse) / truth[1] / (1 - r * r + 1j * r / truth[1]), points)
    pulls = {}
    for strength, noise in (("weak", 1.5), ("strong", 0.05)):
        signal = 8 * driven + 0.5 * np.roll(pulse, 3) + rng.normal(0, noise, points)
        response = pulse_response(signal, rate=rate, pulse=pulse, low=500.0, high=900.0)
        line = next(each for each in resonance_lines(response, most=2).lines if each.kind == "resonance")
        u = np.sqrt(np.diag(line.covariance))
        pulls[f"frequency, {strength}"] = (line.frequency - truth[0]) / u[0]
        pulls[f"Q, {strength}"] = (line.quality_factor - truth[1]) / u[1]
    return pulls


def coulomb_dip(rng):
    """The dip of a chain of junctions, off zero bias."""
    V, width = np.linspace(-1e-3, 1e-3, 301), coulomb_blockade.half_width(0.02, junctions=32)
    # 5.43917 N k T/e is the full width at half depth, from g(x) = 1/12.
    clean = 2.1e-5 * (1 - 0.02 * coulomb_blockade.dip_shape((V - 5e-6) / width * 5.4391699))
    found = coulomb_blockade.fit_dip(V, clean + 2e-8 * rng.standard_normal(V.size), standard_uncertainty=2e-8)
    u = np.sqrt(np.diag(found.covariance))
    return {"depth": (found.depth - 0.02) / u[1], "width": (found.width - width) / u[2]}


def _law_of_form(form):
    """Return readings of forty points, their temperatures, and the law between them, which is of the form."""
    if form == "curie-weiss":
        T = np.geomspace(5e-3, 1.0, 40)
        return (lambda at: curie_weiss_inductance(at, offset=12.5, constant=0.34, theta=4e-4)), T
    y = np.linspace(1.0, -1.0, 40)
    T = 2 - 1.5 * y + 0.35 * y**2 - 0.1 * y**3 if form == "chebyshev" else np.exp(0.5 - 1.5 * y + 0.2 * y**2 - 0.05 * y**3)  # fmt: skip
    return (lambda at: 1000 * 10 ** np.interp(at, T, y)), T


def calibrations(rng):
    """Each form of calibration on a law of that form, at its points: reading and temperature scatter, and the order is chosen."""
    pulls = {}
    for form in ("chebyshev", "log-polynomial", "spline", "curie-weiss"):
        law, T = _law_of_form(form)
        R = np.asarray(law(T))
        u_T, u_R = 1e-3 * T, 3e-4 * np.abs(R - (12.5 if form == "curie-weiss" else 0.0))
        fit = fit_calibration(form, R + u_R * rng.normal(size=T.size), T + u_T * rng.normal(size=T.size), temperature_uncertainty=u_T, reading_uncertainty=u_R)  # fmt: skip
        for index in (2, 20, 37):
            at = R[index : index + 1]
            u = math.hypot(float(fit.standard_uncertainty(at)[0]), fit.interpolation * T[index])
            pulls[f"{form}, {index}"] = (float(fit.curve.temperature(at)[0]) - T[index]) / u
    return pulls


SYSTEMS = (
    dose_run, isotherm, porous_film, ringdowns, component_ringdowns, resonance, pulse_lines,
    stability, resistance_calibration, calibrations, coulomb_dip,
)  # fmt: skip


@pytest.mark.parametrize("system", SYSTEMS, ids=[each.__name__ for each in SYSTEMS])
@pytest.mark.no_cover
def test_pulls_have_mean_nought_and_width_one(system):
    each = [system(np.random.default_rng([2026, seed])) for seed in range(SEEDS)]
    wrong = []
    for name in each[0]:
        values = np.array([pulls[name] for pulls in each])
        mean, width = float(values.mean()), float(values.std())
        if not (abs(mean) < 4 / math.sqrt(SEEDS) and abs(width - 1) < 4 / math.sqrt(2 * SEEDS)):
            wrong.append(f"{name}: mean {mean:.3f}, width {width:.3f}")
    assert wrong == []
