"""What programs read: JSON by the contract, CSV that no spreadsheet takes for formulas."""

from __future__ import annotations

import csv
import io
import json
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import PurePosixPath
from typing import Any, NamedTuple

import numpy as np
import pytest

from archive.commands.machine import csv_text, plain, quantity, write_json
from schemas.finding import Finding
from schemas.quantity import Quantity


@dataclass
class _Thing:
    when: datetime
    parts: tuple[int, ...]


class _Pair(NamedTuple):
    value: float
    unit: str


@pytest.mark.parametrize(
    ("content", "expected"),
    [
        pytest.param(_Thing(datetime(2026, 3, 2, 9, tzinfo=UTC), (1,)), {"when": "2026-03-02T09:00:00+00:00", "parts": [1]}, id="dataclass"),
        pytest.param(_Pair(0.5, "K"), {"value": 0.5, "unit": "K", "uncertainty": None}, id="named-tuple"),
        pytest.param(Quantity.parse("31.4(6) umol/m^2", "coverage"), {"value": 31.4, "uncertainty": 0.6, "unit": "umol/m^2"}, id="quantity"),
        pytest.param(Finding(code="time-gap", severity="note", what="a gap"), {"code": "time-gap", "severity": "note", "what": "a gap"}, id="record"),
        pytest.param([float("nan"), float("inf"), np.float64(2.0), np.int64(3)], [None, None, 2.0, 3], id="numbers"),
        pytest.param({"p": PurePosixPath("a/b")}, {"p": "a/b"}, id="path"),
    ],
)  # fmt: skip
def test_content_becomes_plain_json(content: Any, expected: Any) -> None:
    assert plain(content) == expected


def test_a_quantity_without_value_is_null() -> None:
    assert quantity(None, None, "K") is None
    assert quantity(0.5, None, "K", scale="ITS-90") == {
        "value": 0.5,
        "uncertainty": None,
        "unit": "K",
        "scale": "ITS-90",
    }


def test_json_is_one_ascii_document(capsys: pytest.CaptureFixture[str]) -> None:
    write_json({"notes": "µ \x9b \u202e", "T": float("nan")})
    out = capsys.readouterr().out
    assert out.isascii()
    assert json.loads(out) == {"notes": "µ \x9b \u202e", "T": None}


@pytest.mark.parametrize("text", ["=1+1", "+49", "-5 K", "@SUM(A1)", "\tx", "\rx"])
def test_text_that_looks_like_a_formula_is_made_harmless(text: str) -> None:
    cell = next(csv.reader(io.StringIO(csv_text([text], []), newline="")))[0]
    assert cell == f"'{text}"


def test_numbers_of_csv_stay_numbers() -> None:
    rows = list(
        csv.reader(io.StringIO(csv_text(["a"], [[-0.5, 1e-30, None, float("nan"), True]]), newline=""))
    )
    assert rows[1] == ["-0.5", "1e-30", "", "", "true"]
