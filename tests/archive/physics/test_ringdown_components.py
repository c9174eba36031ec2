"""Free decay in both components: offset and Q back, honest uncertainty, and no number without a decay."""

from __future__ import annotations

import math

import numpy as np
import pytest

from archive.physics.ringdown_components import component_ringdown

T = np.linspace(0.0, 300.0, 400)
Q = math.pi * 1000 * 60.0


def _record(offset: float, seed: int | None = None, sigma: float = 0.01, convention: str = "+"):
    z = 1.3 * np.exp(0.4j) * np.exp((2j * np.pi * offset - 1 / 60.0) * T) + (0.05 - 0.02j)
    z = z if convention == "+" else np.conj(z)
    if seed is not None:
        rng = np.random.default_rng(seed)
        z = z + sigma * (rng.normal(size=T.size) + 1j * rng.normal(size=T.size))
    return z.real, z.imag


@pytest.mark.parametrize("convention", ["+", "-"])
@pytest.mark.parametrize("offset", [0.0, 0.013, -0.21, 0.6])
def test_an_exact_decay_comes_back(offset: float, convention) -> None:
    x, y = _record(offset, convention=convention)
    found = component_ringdown(T + 7.0, x, y, frequency=1000.0, convention=convention)
    assert found.found
    assert not found.curved
    assert found.frequency_offset == pytest.approx(offset, abs=1e-9)
    assert found.quality_factor == pytest.approx(Q, rel=1e-7)


def test_no_decay_gives_no_number() -> None:
    rng = np.random.default_rng(1)
    noise = component_ringdown(T, rng.normal(size=T.size), rng.normal(size=T.size), frequency=1000.0)
    steady = component_ringdown(
        T, np.cos(0.3 * T) + 0.01 * rng.normal(size=T.size), np.sin(0.3 * T), frequency=1000.0
    )
    for found in (noise, steady):
        assert not found.found
        assert found.reason.startswith("no decay")
        assert math.isnan(found.quality_factor)


def test_a_decay_that_is_not_exponential_is_told() -> None:
    A = 1 / (1 + T / 40)
    found = component_ringdown(
        T, A * np.cos(0.3 * T), A * np.sin(0.3 * T) + 1e-4 * np.cos(7 * T), frequency=1000.0
    )
    assert found.curved


@pytest.mark.parametrize(
    ("change", "why"),
    [
        ({"frequency": 0.0}, "frequency: found 0"),
        ({"convention": "x"}, "expected '\\+' or '-'"),
        ({"time": T[::-1]}, "do not increase"),
    ],
    ids=["frequency", "convention", "time"],
)
def test_refusals_name_the_argument(change, why: str) -> None:
    x, y = _record(0.0)
    arguments = {"time": T, "x": x, "y": y, "frequency": 1000.0} | change
    with pytest.raises(ValueError, match=why):
        component_ringdown(**arguments)
