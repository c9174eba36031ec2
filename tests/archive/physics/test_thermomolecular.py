"""Thermal transpiration: the implementation table and both limits."""

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from archive.physics.thermomolecular import cold_pressure

TABLE = Path(__file__).parents[2] / "published" / "thermometry" / "weber_schmidt_implementation_check.csv"
ROWS = list(csv.DictReader(TABLE.read_text(encoding="utf-8").splitlines()))


@pytest.mark.parametrize("row", ROWS, ids=lambda r: f"{r['p_warm_Pa']}Pa-{r['tube_radius_mm']}mm")
def test_implementation_table(row: dict[str, str]) -> None:
    result = cold_pressure(
        float(row["p_warm_Pa"]),
        warm_temperature=float(row["T_warm_K"]),
        cold_temperature=float(row["T_cold_K"]),
        radius=1e-3 * float(row["tube_radius_mm"]),
    )
    assert result.pressure == pytest.approx(float(row["p_cold_Pa"]), abs=6e-7)
    assert result.uncertainty == pytest.approx(
        0.1 * (float(row["p_warm_Pa"]) - float(row["p_cold_Pa"])), abs=1e-6
    )


def test_table_is_not_empty() -> None:
    assert len(ROWS) == 6


def test_limits() -> None:
    """Long mean free path: sqrt(T_cold/T_warm); short: equal pressures (the weights sum to 0.5/1.147)."""
    free = cold_pressure(1e-7, warm_temperature=300.0, cold_temperature=3.0, radius=1e-3)
    assert free.pressure / 1e-7 == pytest.approx(0.1, rel=1e-4)
    dense = cold_pressure(1e7, warm_temperature=300.0, cold_temperature=3.0, radius=1e-2)
    assert dense.pressure / 1e7 == pytest.approx(1.0, abs=1e-4)


@given(st.floats(1e-3, 1e5), st.floats(0.5, 299.0), st.floats(1e-5, 1e-2))
def test_result_lies_between_its_limits(p: float, cold: float, radius: float) -> None:
    found = float(cold_pressure(p, warm_temperature=300.0, cold_temperature=cold, radius=radius).pressure)
    assert p * np.sqrt(cold / 300.0) * (1 - 1e-9) <= found <= p * (1 + 1e-9)


def test_arrays_and_missing_values() -> None:
    result = cold_pressure([10.0, np.nan], warm_temperature=300.0, cold_temperature=[1.5, 1.5], radius=1e-3)
    assert np.isnan(result.pressure).tolist() == [False, True]
    assert np.isnan(result.uncertainty).tolist() == [False, True]


def test_bad_arguments_are_refused() -> None:
    with pytest.raises(ValueError, match=r"cold_temperature\[1\] = 301 K is above"):
        cold_pressure(1.0, warm_temperature=300.0, cold_temperature=[4.0, 301.0], radius=1e-3)
    with pytest.raises(ValueError, match="pressure"):
        cold_pressure(0.0, warm_temperature=300.0, cold_temperature=4.0, radius=1e-3)
    with pytest.raises(ValueError, match="radius"):
        cold_pressure(1.0, warm_temperature=300.0, cold_temperature=4.0, radius=0.0)
