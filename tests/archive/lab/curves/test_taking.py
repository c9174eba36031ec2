"""What is taken away reads back, by other programs, as what is stored."""

from __future__ import annotations

import io
import json
from pathlib import Path

import h5py
import numpy as np
import pandas as pd
import pytest

from archive import Archive
from archive.lab.curves import taking
from archive.lab.curves.chart import Asked


def _table(text: str) -> pd.DataFrame:
    # Older versions of pandas read numbers to the last digit but one.
    table = pd.read_csv(io.StringIO(text), comment="#", dtype=str)
    return table.apply(lambda column: column if column.name == "sweep" else column.astype(object).map(float))


def test_csv_holds_every_row_of_the_view_digit_for_digit(
    lab: Archive, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(taking, "_BLOCK", 7)
    text = "".join(
        lab.shown_csv(Asked("2026-03/s002", columns=("period", "signal"), low=300.0, high=400.0, most=14))
    )
    stored = lab.sweep("2026-03/s002")
    inside = (stored["temperature"] >= 0.3) & (stored["temperature"] <= 0.4)
    table = _table(text)
    assert list(table) == [
        "temperature/K", "temperature_uncertainty/K", "period/ms", "period_uncertainty/ms", "signal/mV",
    ]  # fmt: skip
    for heading, name in (("temperature/K", "temperature"), ("period/ms", "period"), ("signal/mV", "signal")):
        assert table[heading].tolist() == stored[name][inside].tolist()
    np.testing.assert_allclose(table["period_uncertainty/ms"], 2e-9, rtol=1e-12)
    comments = [line for line in text.splitlines() if line.startswith("#")]
    digests = {channel["name"]: channel["digest"] for channel in lab.show("2026-03/s002")["channels"]}
    assert f"# period: 2026-03/s002#period; sha256 {digests['period']}" in comments
    assert f"# temperature: 2026-03/s002#temperature; on ITS-90; sha256 {digests['temperature']}" in comments
    assert f"# signal: 2026-03/s002#signal; rms; sha256 {digests['signal']}" in comments


def test_csv_of_several_sweeps_names_the_sweep_of_each_row(lab: Archive) -> None:
    text = "".join(lab.shown_csv(Asked("2026-03/s002", columns=("period", "signal"), over=("2026-04/s002",))))
    table = _table(text)
    assert table["sweep"].value_counts().to_dict() == {"2026-03/s002": 60, "2026-04/s002": 60}
    second = table[table["sweep"] == "2026-04/s002"]
    np.testing.assert_allclose(second["period/ms"], lab.sweep("2026-04/s002")["period"] / 1000, rtol=1e-15)
    assert second["signal/mV"].isna().all()  # peak is not rms
    assert "stored in us" in text
    assert not [line for line in text.splitlines() if line.startswith(("=", "+", "-", "@"))]


def test_hdf5_describes_itself(lab: Archive, tmp_path: Path) -> None:
    path = tmp_path / "shown.h5"
    lab.shown_hdf5(
        Asked("2026-03/s002", columns=("period",), over=("2026-04/s002",), low=300.0, high=400.0), path
    )
    with h5py.File(path) as file:
        told = json.loads(file["document"][0])
        assert [each["of"] for each in told["tables"]] == ["2026-03/s002", "2026-04/s002"]
        for each in told["tables"]:
            table, stored = file[each["path"]], lab.sweep(each["of"])
            inside = (stored["temperature"] >= 0.3) & (stored["temperature"] <= 0.4)
            np.testing.assert_array_equal(table["temperature"][()], stored["temperature"][inside])
            assert table["period"].attrs["units"] == "ms"
            assert table["period"].attrs["uncertainty"] == "period_uncertainty"
            assert table["period"].dims[0][0].name.endswith("/temperature")
            assert [column["scale"] for column in each["columns"]] == [
                stored.columns["temperature"].scale,
                None,
            ]
        np.testing.assert_array_equal(
            file["shown/01/period"][()], lab.sweep("2026-03/s002")["period"][inside]
        )
