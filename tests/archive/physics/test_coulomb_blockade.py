"""Coulomb blockade thermometer: width and depth of the dip, both ways, and its fit."""

from __future__ import annotations

import numpy as np
import pytest

from archive.physics import coulomb_blockade as cbt

K_OVER_E = 1.380649e-23 / 1.602176634e-19


def test_the_full_width_is_the_published_constant() -> None:
    """V_1/2 = 5.439 N k T/e, Pekola et al., Phys. Rev. Lett. 73, 2903 (1994) (from memory)."""
    assert cbt.half_width(1.0, junctions=1) / K_OVER_E == pytest.approx(5.439, abs=5e-4)
    assert cbt.dip_shape(5.439 / 2) == pytest.approx(0.5, abs=5e-5)


def test_the_shape_is_smooth_where_the_series_takes_over() -> None:
    x = np.linspace(0.0, 0.1, 201)
    shape = cbt.dip_shape(x)
    assert shape[0] == 1.0
    np.testing.assert_allclose(np.diff(shape, 2), -2 / 10 * (x[1] - x[0]) ** 2, rtol=0.05)
    assert cbt.dip_shape(-3.0) == pytest.approx(cbt.dip_shape(3.0))
    assert cbt.dip_shape(1e4) == 0.0


def test_the_shape_is_the_second_derivative_that_the_rates_give() -> None:
    """Derived: g = d^2/dx^2 of (x/2) coth(x/2), so its integral over all bias is 1."""
    x, h = np.linspace(0.3, 15, 50), 1e-3
    second = sum(w * (x + s) / 2 / np.tanh((x + s) / 2) for w, s in ((1, -h), (-2, 0.0), (1, h))) / h**2
    np.testing.assert_allclose(cbt.dip_shape(x) / 6, second, atol=1e-8)
    x = np.linspace(-60, 60, 40001)
    area = np.trapezoid(cbt.dip_shape(x) / 6, x)
    assert area == pytest.approx(1.0, abs=1e-6)


@pytest.mark.parametrize("temperature", [0.008, 0.02, 0.3])
def test_both_ways(temperature: float) -> None:
    width = cbt.half_width(temperature, junctions=32)
    assert cbt.temperature_from_half_width(width, junctions=32) == pytest.approx(temperature, rel=1e-14)
    depth = cbt.zero_bias_depth(temperature, charging_energy=7e-4)
    assert cbt.temperature_from_depth(depth, charging_energy=7e-4) == pytest.approx(temperature, rel=1e-9)


def test_the_depth_is_the_published_series() -> None:
    """1/6, 1/60 and 1/630 of u, u^2 and u^3: Sh. Farhangfar et al., J. Low Temp. Phys. 108, 191 (1997), from memory. At u = 1 by hand."""
    assert cbt.zero_bias_depth(2e-3, charging_energy=1e-3) == pytest.approx(0.1515873, abs=5e-8)
    assert cbt.zero_bias_depth(4e-3, charging_energy=1e-3) == pytest.approx(0.0793651, abs=5e-8)


def test_outside_the_series_there_is_nothing() -> None:
    with pytest.raises(ValueError, match=r"temperature\[1\]"):
        cbt.zero_bias_depth([0.1, 1e-3], charging_energy=7e-4)
    with pytest.raises(ValueError, match="depth"):
        cbt.temperature_from_depth(0.2, charging_energy=7e-4)


def test_a_search_that_does_not_end_is_no_number(monkeypatch: pytest.MonkeyPatch) -> None:
    def endless(*_: object, **__: object) -> None:
        raise RuntimeError("no end")

    monkeypatch.setattr(cbt, "curve_fit", endless)
    with pytest.raises(ValueError, match="did not end: no end"):
        cbt.fit_dip(np.linspace(-1e-3, 1e-3, 20), np.full(20, 2e-5))


def test_no_dip_is_no_number() -> None:
    rng = np.random.default_rng(1)
    V = np.linspace(-1e-3, 1e-3, 101)
    with pytest.raises(ValueError, match="no dip to read"):
        cbt.fit_dip(V, 2e-5 * (1 + 1e-3 * rng.standard_normal(V.size)))
    with pytest.raises(ValueError, match="bias"):
        cbt.fit_dip(V[:5], np.full(5, 2e-5))
