"""Fields of a sheet by address and path, and those that no amendment can change."""

from __future__ import annotations

import copy
from typing import Any

import pytest

from archive.reduction.field_paths import changed_content, check_path, value_at
from schemas.acts import Change

SHEET: dict[str, Any] = {
    "purpose": "a run",
    "gauge": [{"name": "PG1", "zero": None}],
    "layout": {"bridge": {"channels": {"period": {"unit": "ms", "use": True}}}},
    "dose": [{"name": "d01", "amount": "8 umol"}],
    "sweep": [
        {"name": "s1", "layout": "bridge", "channels": {}, "corrections": [{"value": "1"}, {"value": "2"}]},
        {"name": "s2", "layout": "bridge", "channels": {}},
    ],
}


def change(address: str, field: str, value: Any = "new") -> Change:
    """Return a change."""
    return Change(address=address, field=field, value=value)


@pytest.mark.parametrize(
    ("address", "field", "before"),
    [
        ("2026-03", "purpose", "a run"),
        ("2026-03", "gauge.PG1.zero", None),
        ("2026-03", "layout.bridge.channels.period.unit", "ms"),
        ("2026-03/d01", "amount", "8 umol"),
        ("2026-03/s1", "corrections.2.value", "2"),
        ("2026-03/s1#period", "unit", "ms"),
    ],
)
def test_a_field_is_found_and_changed_and_nothing_else(address: str, field: str, before: Any) -> None:
    sheet = copy.deepcopy(SHEET)
    said = change(address, field)
    assert value_at(sheet, said) == before
    made = changed_content(sheet, said)
    assert value_at(made, said) == "new"
    assert sheet == SHEET
    back = changed_content(made, change(address, field, before) if before is not None else
                           Change(address=address, field=field, remove=True))  # fmt: skip
    if "#" in address:
        # The sweep keeps its own copy of the channel; the layout, and with it every other sweep, is as it was.
        assert back["layout"] == SHEET["layout"]
        assert back["sweep"][1] == SHEET["sweep"][1]
    else:
        assert back == SHEET


@pytest.mark.parametrize(
    ("address", "field", "said"),
    [
        ("2026-03/s9", "notes", "it has s1, s2, d01"),
        ("2026-03/s1#mass", "unit", "the sweep has period"),
        ("2026-03", "gauge.PG2.zero", "it has PG1"),
        ("2026-03/s1", "corrections.3.value", "the list has no 3"),
        ("2026-03/d01", "amuont", "there is name, amount"),
        ("2026-03", "purpose.x", "nothing lies below"),
    ],
)
def test_what_is_not_there_is_told_with_what_is(address: str, field: str, said: str) -> None:
    with pytest.raises(ValueError, match=said):
        value_at(SHEET, change(address, field))


@pytest.mark.parametrize(
    ("address", "field", "said"),
    [
        ("2026-04/d01", "amount", "expected 2026-03"),
        ("RX-2.r1", "place", "expected 2026-03"),
        ("2026-03", "record.cell", "stillroom revise"),
        ("2026-03", "dose.d01.amount", "2026-03/d03"),
        ("2026-03/s1", "layout", "ingest it again"),
        ("2026-03/s1", "files", "ingest it again"),
        ("2026-03/s1#period", "column", "ingest it again"),
        ("2026-03", "layout.bridge.dialect.decimal", "ingest it again"),
        ("2026-03/s1", "left_out", "left_out"),
        ("2026-03/d01", "name", "stands in addresses"),
    ],
)
def test_what_no_amendment_can_change_says_what_to_do(address: str, field: str, said: str) -> None:
    with pytest.raises(ValueError, match=said):
        check_path(change(address, field), "2026-03")
