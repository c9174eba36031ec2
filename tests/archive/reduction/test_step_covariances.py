"""Covariances that steps state, against moving each reading by its standard uncertainty: nothing of a step's own formulas is used."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from archive.physics.coulomb_blockade import dip_shape
from archive.physics.persistent_current import decaying
from archive.physics.resonance import resonance_curve
from archive.reduction.adsorption_steps import BetParameters, bet
from archive.reduction.coulomb_steps import DipParameters, dip
from archive.reduction.current_decay_steps import (
    CoverageParameters,
    HeldParameters,
    current_against_coverage,
    current_decay,
)
from archive.reduction.current_steps import current_reversibility
from archive.reduction.loading_steps import LoadingParameters, loading_fit
from archive.reduction.oscillator_steps import (
    ResonanceParameters,
    RingdownParameters,
    resonance_fit,
    ringdown_quality_factor,
)
from archive.reduction.step import Outcome

Case = tuple[Callable[[np.ndarray], Outcome], np.ndarray, float]


def loading(below: int | None) -> Case:
    """Return a dose run of eight and eight amounts."""
    n = np.linspace(2e-6, 60e-6, 16)
    past = np.maximum(n - 31e-6, 0.0)
    u = 1e-12
    return (
        lambda y: loading_fit(
            LoadingParameters(points_below=below), amount=n, period=y, u_period=np.full(16, u)
        ),
        1e-3 + 1.7e-4 * (n - 0.7 * past),
        u,
    )


def ringing() -> Case:
    """Return a decay over a noise floor."""
    t, u = np.linspace(0, 600, 60), 1e-4
    return (
        lambda y: ringdown_quality_factor(
            RingdownParameters(), time=t, amplitude=y, period=1e-3, u_amplitude=np.full(60, u)
        ),
        np.hypot(np.exp(-t / 150), 2e-2),
        u,
    )


def current() -> Case:
    """Return the decay of a current by a power law."""
    t, u = np.linspace(0, 72000, 24), 1e-13
    return (
        lambda y: current_decay(
            HeldParameters(),
            time=t,
            angular_momentum=y,
            temperature=np.full(24, 0.7),
            coverage=None,
            u_angular_momentum=np.full(24, u),
        ),
        decaying(t, initial=6e-10, rate=1 / 2000, exponent=3.6),
        u,
    )


def coulomb() -> Case:
    """Return a dip read over 8 kOhm of wires, which widen the uncertainty of the device's own conductance."""
    V, u, wires = np.linspace(-1e-3, 1e-3, 61), 1e-9, 8e3
    own = 2.1e-5 * (1 - 0.05 * dip_shape((V - 5e-6) / 3e-4 * 5.4391699))
    parameters = DipParameters(junctions=32.0, wire_resistance_ohm=wires, noise_from_scatter=False)
    return (
        lambda y: dip(parameters, bias=V, conductance=y, u_conductance=np.full(61, u)),
        1 / (1 / own + wires),
        u,
    )


def isotherm() -> Case:
    """Return an isotherm by the equation itself, on a given range."""
    x, C, u = np.linspace(0.05, 0.30, 11), 60.0, 1e-8
    return (
        lambda y: bet(
            BetParameters(low=0.0, high=0.31, cross_section_nm2=0.162),
            relative_pressure=x,
            amount=y,
            amount_kind="amount",
            sample=None,
            u_amount=np.full(11, u),
        ),
        1e-4 * C * x / ((1 - x) * (1 + (C - 1) * x)),
        u,
    )


CASES = {
    "dose run": (lambda: loading(None), 1e-3), "dose run, break given": (lambda: loading(8), 1e-3),
    "ringdown": (ringing, 1e-2), "decay of a current": (current, 1e-2), "coulomb dip": (coulomb, 2e-2), "isotherm": (isotherm, 1e-3),
}  # fmt: skip


def moved(call: Callable[[np.ndarray], Outcome], y: np.ndarray, u: float, names: tuple[str, ...]) -> Any:
    """Return the covariance of outputs that independent readings make, to first order."""
    parts = []
    for k in range(y.size):
        shift = np.where(np.arange(y.size) == k, u, 0.0)
        up, down = call(y + shift).outputs, call(y - shift).outputs
        parts.append([(float(up[name]) - float(down[name])) / 2 for name in names])
    return np.array(parts).T @ np.array(parts)


@pytest.mark.parametrize("name", CASES)
def test_a_covariance_is_what_the_readings_make(name: str) -> None:
    make, share = CASES[name]
    call, y, u = make()
    stated = call(y).covariance
    assert stated is not None
    found = moved(call, y, u, stated.names)
    spread = np.sqrt(np.diag(found))
    size = np.outer(spread, spread)
    np.testing.assert_allclose(np.asarray(stated.matrix) / size, found / size, atol=share)


def test_the_onset_of_a_current_is_as_uncertain_as_its_readings_make_it() -> None:
    n, u = np.linspace(35e-6, 47e-6, 13), 1e-12

    def call(y: np.ndarray) -> Outcome:
        return current_against_coverage(
            CoverageParameters(), coverage=n, angular_momentum=y, u_angular_momentum=np.full(13, u)
        )

    rng = np.random.default_rng(2)
    y = 1e-4 * (n - 25e-6) + 0.5 * u * rng.normal(size=13)
    variance = moved(call, y, u, ("onset_coverage",))[0, 0]
    assert float(np.asarray(call(y).point["onset_coverage"])) == pytest.approx(variance**0.5, rel=1e-3)


def test_what_remains_of_a_current_is_as_uncertain_as_its_readings_make_it() -> None:
    up = np.linspace(1.3, 2.1, 40)
    T = np.concatenate([up, up[::-1] - 1e-3])
    u = 1e-4

    def call(y: np.ndarray) -> Outcome:
        return current_reversibility(
            HeldParameters(),
            abscissa=T,
            angular_momentum=y,
            time=np.arange(80.0),
            u_angular_momentum=np.full(80, u),
        )

    y = (1 - (T / 2.3) ** 5) * np.where(np.arange(80) < 40, 1.0, 0.95)
    variance = moved(call, y, u, ("remaining",))[0, 0]
    assert float(np.asarray(call(y).point["remaining"])) == pytest.approx(variance**0.5, rel=0.05)


def test_the_width_of_a_resonance_goes_with_frequency_and_quality_factor() -> None:
    """The width is f/Q: twenty thousand draws of both from their covariance give that of all three, to 5 per cent."""
    f = np.linspace(990.0, 1010.0, 101)
    z = resonance_curve(f, resonance_frequency=1000.0, quality_factor=300.0, height=1.0, phase=0.4) + 0.1
    rng = np.random.default_rng(3)
    x, y = z.real + 1e-3 * rng.normal(size=101), z.imag + 1e-3 * rng.normal(size=101)
    found = resonance_fit(ResonanceParameters(), frequency=f, x=x, y=y, u_x=None)
    assert found.covariance is not None
    names = found.covariance.names
    rows = [names.index(name) for name in ("resonance_frequency", "quality_factor", "width")]
    stated = np.asarray(found.covariance.matrix)[np.ix_(rows, rows)]
    centre = [float(found.outputs[name]) for name in ("resonance_frequency", "quality_factor")]
    drawn = rng.multivariate_normal(centre, stated[:2, :2], size=20000)
    made = np.cov(np.vstack([drawn.T, drawn[:, 0] / drawn[:, 1]]))
    size = np.sqrt(np.outer(np.diag(made), np.diag(made)))
    np.testing.assert_allclose(stated / size, made / size, atol=0.05)


def test_the_choice_of_range_is_a_rectangle() -> None:
    """The larger change by a range one point shorter at either end is the half width (JCGM 100:2008, 4.3.7)."""
    x = np.linspace(0.05, 0.30, 11)
    n = 1e-4 * 60 * x / ((1 - x) * (1 + 59 * x)) * (1 + 1e-3 * np.random.default_rng(4).normal(size=11))

    def monolayer(low: float, high: float) -> Outcome:
        return bet(
            BetParameters(low=low, high=high, cross_section_nm2=0.162),
            relative_pressure=x, amount=n, amount_kind="amount", sample=None,
        )  # fmt: skip

    whole = monolayer(0.0, 0.31)
    (part,) = whole.shared["monolayer"].values()
    moves = [
        float(monolayer(low, high).outputs["monolayer"]) - float(whole.outputs["monolayer"])
        for low, high in ((0.06, 0.31), (0.0, 0.29))
    ]
    assert abs(float(np.asarray(part))) == pytest.approx(max(map(abs, moves)) / 3**0.5, rel=1e-9)
