"""Limits of the checks as a laboratory writes them."""

from __future__ import annotations

from pathlib import Path

import pytest

from archive.errors import InvalidSheet
from archive.intake.settings import read_settings
from archive.intake.thresholds import Thresholds


def written(folder: Path, lines: str) -> Path:
    """Write settings with a table of thresholds."""
    (folder / "stillroom.toml").write_text(f'name = "lab"\n[thresholds]\n{lines}\n')
    return folder


def test_a_laboratory_sets_its_own_limit(tmp_path: Path) -> None:
    settings = read_settings(written(tmp_path, "thermal_lag_k = 0.002\nplateau_rows = 8"))
    assert settings.thresholds.thermal_lag_k == 0.002
    assert settings.thresholds.plateau_rows == 8
    assert settings.thresholds.drop_sigma == Thresholds().drop_sigma


@pytest.mark.parametrize(
    ("lines", "word"),
    [
        pytest.param(
            "thermal_lag_mk = 2", "thermal_lag_k", id="a name that is none is answered with a near one"
        ),
        pytest.param("thermal_lag_k = -1", "greater than 0", id="negative"),
        pytest.param('thermal_lag_k = "2 mK"', "number", id="text"),
        pytest.param("thermal_lag_k = inf", "finite", id="infinite"),
        pytest.param("bet_points = 4.5", "integer", id="half a point"),
        pytest.param("calibration_end_fraction = 0.7", "less than 0.5", id="too large"),
        pytest.param("thermal_lag_error_factor = 1", "greater than 1", id="an error below its warning"),
    ],
)
def test_a_wrong_limit_is_refused(tmp_path: Path, lines: str, word: str) -> None:
    with pytest.raises(InvalidSheet) as caught:
        read_settings(written(tmp_path, lines))
    if word == "thermal_lag_k":
        assert "thermal_lag_mk" in str(caught.value)
    else:
        assert word in str(caught.value)


def test_every_limit_says_where_it_comes_from() -> None:
    for name, field in Thresholds.model_fields.items():
        assert field.description, name
        assert any(
            word in field.description
            for word in ("no source", "practice", "Metrologia", "Pure Appl. Chem.", "the same")
        ), name
