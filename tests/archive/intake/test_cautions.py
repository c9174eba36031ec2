"""Cautions: numbers of the reference, missing inputs, and the words that must not occur."""

from __future__ import annotations

import re
from typing import Any

import pytest

from archive.intake import caution_texts
from archive.intake.caution_texts import unfavourable
from archive.intake.cautions import FIXED_TEXT, Caution, cautions
from archive.intake.reading import Reading
from schemas.lineage import DoseEntry
from tests.archive.intake.factories import ledger_entry, make_reading, sheet_tables

BANNED = re.compile(
    r"\b(safe|acceptable|negligible|compliant|certified|ok|allowed|below the rating)\b", re.IGNORECASE
)


def with_ledger(change: dict[str, Any] | None = None, *entries: DoseEntry, **end: Any) -> Reading:
    """Return a reading with 3.0 mmol of helium in 2.0 cm^3, a changed cell, and a changed end of the gas."""
    tables = sheet_tables()
    cell = tables["record"]["cell"][0]
    for key, value in (change or {}).items():
        cell[key] = value
    tables["record"]["cell"][0] = {key: value for key, value in cell.items() if value is not None}
    tables["gas_end"] = {
        key: value for key, value in {**tables["gas_end"], **end}.items() if value is not None
    }
    reading = make_reading(tables, {})
    reading.ledger = list(entries) or [ledger_entry("d01", 3.0e-3, 3.0e-3)]
    return reading


def trapped(reading: Reading) -> Caution:
    """Return the caution about trapped gas."""
    (found,) = [each for each in cautions(reading) if each.subject.startswith("trapped gas")]
    return found


def value(caution: Caution, name: str) -> float:
    """Return one of its numbers."""
    number = caution.numbers[name].value
    assert number is not None
    return number


def test_the_worked_example() -> None:
    # 3.0 mmol in 2.0 cm^3 at 293.15 K: c R T = 3.656 MPa, with B = 11.85 cm^3/mol and C = 113 cm^6/mol^2 3.722 MPa.
    found = trapped(with_ledger())
    assert found.state == "caution"
    assert value(found, "ideal pressure") == pytest.approx(3.656e6, rel=2e-4)
    assert value(found, "pressure") == pytest.approx(3.722e6, rel=2e-4)
    assert value(found, "gauge pressure") == pytest.approx(3.62e6, rel=2e-3)
    assert "3.8 MPa absolute (3.7 MPa gauge)" in found.text
    assert "3 mmol of helium" in found.text


@pytest.mark.parametrize(
    ("amount", "pressure", "state"),
    [
        pytest.param(20e-3, 27.54e6, "caution", id="10 mol/L"),
        pytest.param(
            62.2e-3, 114e6, "outside range of this formula", id="31.1 mol/L, full of liquid at 4.2 K"
        ),
    ],
)
def test_denser_gas(amount: float, pressure: float, state: str) -> None:
    found = trapped(with_ledger(None, ledger_entry("d01", amount, amount)))
    assert found.state == state
    assert value(found, "pressure") == pytest.approx(pressure, rel=2e-2)
    if state != "caution":
        assert "more than 100 MPa" in found.text
        assert "mmol" in found.text, "the caution stays"


def test_the_rating_is_printed_beside_and_never_compared() -> None:
    found = trapped(with_ledger())
    assert found.rating == "recorded rating 0.35 MPa gauge, document workshop sheet 4"
    assert "Recorded rating 0.35 MPa gauge" in found.text
    assert not re.search(r"\b(below|above|exceeds|within)\b", found.text)


@pytest.mark.parametrize(
    ("change", "rating"),
    [
        pytest.param({"rated_pressure": None}, "no rating recorded", id="no rating"),
        pytest.param(
            {"rating_document": None},
            "recorded rating 0.35 MPa gauge, not assessed: rating document",
            id="no document",
        ),
    ],
)
def test_a_missing_rating_is_said(change: dict[str, Any], rating: str) -> None:
    assert trapped(with_ledger(change)).rating == rating


@pytest.mark.parametrize(
    ("change", "end", "missing"),
    [
        pytest.param({"closable_volume": None}, {}, "closable volume of the cell", id="volume"),
        pytest.param({}, {"warmest_temperature": None}, "warmest temperature of this site", id="temperature"),
        pytest.param({}, {"valve_open": None}, "state of the valve", id="valve"),
        pytest.param(
            {"closable_volume": "2.0(1.2) cm^3"},
            {},
            "closable volume of the cell, better than its uncertainty",
            id="vague volume",
        ),
    ],
)
def test_a_missing_input_is_not_assessed(change: dict[str, Any], end: dict[str, Any], missing: str) -> None:
    found = trapped(with_ledger(change, **end))
    assert found.state == "not assessed"
    assert missing in found.missing
    assert found.text.startswith("Not assessed")


def test_without_a_ledger_the_amount_is_missing() -> None:
    reading = with_ledger()
    reading.ledger = []
    found = trapped(reading)
    assert found.state == "not assessed"
    assert found.missing == ("amount of helium",)


def test_an_unknown_end_counts_all_that_was_added() -> None:
    reading = with_ledger(
        None, ledger_entry("d01", 3.0e-3, 3.0e-3), state="unknown", valve_open=None, valve=None
    )
    found = trapped(reading)
    assert found.state == "caution"
    assert value(found, "amount") == 3.0e-3
    assert "unknown" in found.text


@pytest.mark.parametrize("state", ["recovered", "vented"])
def test_gas_that_left_unmeasured_is_counted(state: str) -> None:
    found = trapped(with_ledger(None, state=state))
    assert value(found, "amount") == 3.0e-3
    assert "is counted" in found.text


def test_what_was_recovered_is_taken_off_and_uncertainties_are_added() -> None:
    entries = (
        ledger_entry("d01", 3.0e-3, 3.0e-3, uncertainty=0.03e-3),
        ledger_entry("e01", -2.9e-3, 0.1e-3, act="recover", uncertainty=0.04e-3),
    )
    found = trapped(with_ledger(None, *entries, state="recovered"))
    # 0.1 mmol plus twice the root of 0.03^2 + 0.04^2
    assert value(found, "amount") == pytest.approx(0.2e-3)


def test_a_vague_volume_is_taken_at_its_small_end() -> None:
    found = trapped(with_ledger({"closable_volume": "2.0(2) cm^3"}))
    assert value(found, "volume") == pytest.approx(1.6e-6)


def test_a_run_without_gas_has_no_such_caution() -> None:
    tables = sheet_tables()
    tables["dose"] = []
    tables["gas_end"] = {"state": "never-admitted"}
    assert not [each for each in cautions(make_reading(tables, {})) if each.subject.startswith("trapped gas")]


def test_a_closable_volume_asks_for_its_relief_device() -> None:
    (without,) = [each for each in cautions(with_ledger()) if each.subject.startswith("relief")]
    assert "no relief device recorded" in without.text
    (with_one,) = [
        each
        for each in cautions(with_ledger({"relief_device": "RV3, 0.5 MPa, 2025-10"}))
        if each.subject.startswith("relief")
    ]
    assert "RV3, 0.5 MPa, 2025-10" in with_one.text


@pytest.mark.parametrize(
    ("what", "subject"),
    [
        ("transfer", "cold burns"),
        ("transfer", "oxygen in the room"),
        ("plug", "plug"),
        ("leak", "gas in the vacuum space"),
        ("magnet", "magnetic field"),
        ("power-loss", "power loss"),
    ],
)
def test_events_bring_their_cautions(what: str, subject: str) -> None:
    tables = sheet_tables()
    tables["event"] = [{"at": "2026-03-04T10:00:00+00:00", "what": what, "text": "x"}] * 2
    found = [each for each in cautions(make_reading(tables, {})) if each.subject == subject]
    assert len(found) == 1
    assert "{" not in found[0].text
    assert found[0].state == ("not assessed" if found[0].missing else "caution")


@pytest.mark.parametrize(
    ("bias", "subjects"),
    [("120 V", {"bias voltage"}), ("300 V", {"bias voltage", "discharge in gas"}), (None, set())],
)
def test_a_bias_brings_its_cautions(bias: str | None, subjects: set[str]) -> None:
    tables = sheet_tables()
    if bias is not None:
        tables["detection"]["bias"] = bias
    assert {each.subject for each in cautions(make_reading(tables, {}))} & {
        "bias voltage",
        "discharge in gas",
    } == subjects


def test_no_sentence_approves() -> None:
    texts = [
        FIXED_TEXT,
        *caution_texts.BIAS,
        *(text for each in caution_texts.EVENTS.values() for _, text, _ in each),
    ]
    for state in ("recovered", "left-in-cell", "vented", "unknown", "never-admitted"):
        for change in ({}, {"closable_volume": None}, {"rated_pressure": None}):
            tables_end = with_ledger(change, state=state)
            texts += [f"{each.text} {each.rating} {each.formula}" for each in cautions(tables_end)]
    for text in texts:
        assert BANNED.search(text) is None, text


def test_cautions_are_plain_data() -> None:
    for each in cautions(with_ledger()):
        assert Caution.model_validate_json(each.model_dump_json()) == each


@pytest.mark.parametrize(
    ("number", "text"),
    [
        (3.722, "3.8"),
        (3.7, "3.7"),
        (0.00731, "0.0074"),
        (99.5, "100"),
        (114.2, "120"),
        (0.0, "0"),
        (1e-12, "0.000000000001"),
    ],
)
def test_numbers_are_rounded_up(number: float, text: str) -> None:
    assert float(unfavourable(number)) == float(text)
    assert float(unfavourable(number)) >= number
