"""Which rows count, how well readings are known, and where a drop lies."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from archive.intake.checks.curves import curve_of, drop_width, lag
from archive.intake.checks.drive import diffusion_length_m
from archive.intake.checks.rows import bound, counting, noise, ring_time_s, sigma, stated_uncertainty
from schemas.sweep import Channel
from tests.archive.intake.factories import BEGIN, columns, make_reading, sheet_tables, temperatures


def kept(left_out: dict[str, Any]) -> np.ndarray:
    """Return the rows of the film sweep that count."""
    tables = sheet_tables()
    tables["sweep"][1]["left_out"] = [{**left_out, "reason": "knock"}]
    return counting(make_reading(tables).tables["film"])


def test_rows_count_from_one() -> None:
    rows = kept({"rows": [1, 3]})
    assert rows[:5].tolist() == [False, False, False, True, True]


def test_thinned_rows_keep_their_numbers() -> None:
    tables = sheet_tables()
    tables["sweep"][1]["left_out"] = [{"rows": [5, 8], "reason": "knock"}]
    table = make_reading(tables).tables["film"]
    table.stride = 4  # rows 1, 5, 9, ...
    assert counting(table)[:4].tolist() == [True, False, True, True]


def test_a_range_of_a_channel_is_left_out() -> None:
    # 1/T is the resistance here, so 2 to 2.5 Ohm is 0.4 to 0.5 K.
    rows = kept({"channel": "thermometer", "low": "2 Ohm", "high": "2.5 Ohm"})
    T = temperatures()[5:-5]
    assert np.array_equal(rows, ~((T >= 0.4) & (T <= 0.5)))


def test_a_stretch_of_time_is_left_out() -> None:
    rows = kept({"channel": "time", "high": "2026-03-04T09:02:00+00:00"})
    assert rows[:4].tolist() == [False, False, False, True]


def test_a_range_open_above_leaves_out_the_rest() -> None:
    assert not kept({"channel": "time", "low": "2026-03-04T00:00:00+00:00"}).any()


def test_a_bound_needs_an_offset() -> None:
    with pytest.raises(ValueError, match="offset"):
        bound("2026-03-04T09:02:00", Channel(column="t", quantity="instant"))


def test_an_instant_is_posix_seconds() -> None:
    assert bound("2026-03-02T11:00:00+02:00", Channel(column="t", quantity="instant")) == BEGIN.timestamp()


@pytest.mark.parametrize(
    ("text", "expected"),
    [("2 ns", 2e-9), ("0.01 %", 1e-7), ("1 ppm", 1e-9), (None, None)],
)
def test_stated_uncertainty(text: str | None, expected: float | None) -> None:
    channel = Channel(column="P", quantity="period", unit="ms", uncertainty=text)
    found = stated_uncertainty(channel, np.array([1e-3]))
    assert found is None if expected is None else found is not None and found[0] == pytest.approx(expected)


def test_noise_is_the_standard_deviation_of_white_noise_on_a_drift() -> None:
    rng = np.random.default_rng(0)
    values = 3.0 + 0.5 * np.arange(20_000) + 0.2 * rng.standard_normal(20_000)
    assert noise(values) == pytest.approx(0.2, rel=0.03)


def test_noise_of_three_rows_is_unknown() -> None:
    assert np.isnan(noise(np.array([1.0, 2.0, 4.0])))


def test_sigma_without_a_statement_is_the_scatter() -> None:
    tables = sheet_tables()
    del tables["layout"]["counter"]["channels"]["period"]["uncertainty"]
    assert sigma(make_reading(tables).tables["empty"], "period") == pytest.approx(1.5e-12, rel=0.3)


def test_ring_time() -> None:
    # tau = Q/(pi f) = 4.0e5 x 1.0 ms/pi
    reading = make_reading()
    assert ring_time_s(reading, reading.tables["film"]) == pytest.approx(127.3, rel=1e-3)


def test_diffusion_length_of_the_reference() -> None:
    # D = hbar/4m and 1 kHz: 2.97 um
    assert diffusion_length_m(1000.0) == pytest.approx(2.97e-6, rel=2e-3)


def test_the_width_of_a_drop() -> None:
    # tanh(x/w)/2 has the slope 1/(2 w), so height over slope is 2 w; bins of 5 mK smear it a little.
    reading = make_reading()
    curve = curve_of(reading, reading.tables["film"], "period")
    assert curve is not None
    assert drop_width(curve) == pytest.approx(0.04, rel=0.1)


def test_a_smooth_background_has_no_drop() -> None:
    reading = make_reading()
    curve = curve_of(reading, reading.tables["empty"], "period")
    assert curve is not None
    assert drop_width(curve) is None


@pytest.mark.parametrize("offset", [-0.004, 0.0, 0.001, 0.010])
@pytest.mark.parametrize("level", [0.0, 3e-9])
def test_lag_is_found_under_a_shift_of_the_period(offset: float, level: float) -> None:
    data = {
        "film": columns(temperatures(1200), drop=50e-9, at=0.6),
        "empty": columns(temperatures(1100), drop=50e-9, at=0.6 + offset, seed=5),
    }
    data["empty"]["period"] = data["empty"]["period"] + level
    reading = make_reading(None, data)
    first, second = (curve_of(reading, reading.tables[name], "period") for name in ("film", "empty"))
    assert first is not None
    assert second is not None
    found = lag(first, second)
    assert found is not None
    assert found[0] == pytest.approx(offset, abs=1.5e-4)
    assert found[1] == pytest.approx(0.6, abs=0.01)
