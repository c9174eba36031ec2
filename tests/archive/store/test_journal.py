"""The journal: every change of it is seen, and an interrupted line costs nothing that was whole."""

from __future__ import annotations

import json
import random
from datetime import UTC, datetime
from pathlib import Path

import pytest

from archive.store.journal import BEGINNING, JOURNAL_NAME, Act, Journal

AT = datetime(2026, 3, 2, 9, 0, tzinfo=UTC)
ACTS = [
    Act("init", "Test laboratory", "data steward"),
    Act("ingest", "2026-03.a1", "graduate student", "2026-03/2026-03.a1", "a" * 64),
    Act(
        "reduce", "2026-03/s001@empty-cell.1", "postdoc", "2026-03/s001@empty-cell.1", "b" * 64, "zusätzlich"
    ),
]
RECORDED = {act.key: act.sha256 for act in ACTS if act.key is not None and act.sha256 is not None}


@pytest.fixture
def journal(tmp_path: Path) -> Journal:
    """Give a journal of three acts."""
    found = Journal(tmp_path)
    for act in ACTS:
        found.append([act], at=AT, stillroom="0.1.0")
    return found


def test_acts_come_back_in_order_and_hang_together(journal: Journal) -> None:
    entries = list(journal.entries())
    assert [entry.act for entry in entries] == ACTS
    assert [entry.number for entry in entries] == [1, 2, 3]
    assert [entry.sealed for entry in entries] == [0, 1, 2]
    assert [entry.before for entry in entries] == [BEGINNING, entries[0].digest, entries[1].digest]
    assert journal.last() == entries[-1]
    assert journal.damage(RECORDED) == []


def test_one_append_of_several_acts_equals_several_appends(journal: Journal, tmp_path: Path) -> None:
    other = Journal(tmp_path / "other")
    other.path.parent.mkdir()
    other.append(ACTS, at=AT, stillroom="0.1.0")
    assert other.path.read_bytes() == journal.path.read_bytes()


def test_every_flipped_byte_and_every_cut_is_seen(journal: Journal) -> None:
    whole = journal.path.read_bytes()
    chance = random.Random(7)  # noqa: S311 - no secret
    for place in range(len(whole)):
        changed = bytearray(whole)
        changed[place] ^= 1 << chance.randrange(8)
        journal.path.write_bytes(bytes(changed))
        assert journal.damage(RECORDED), f"byte {place} of {len(whole)}"
    for length in range(len(whole) - 1):
        journal.path.write_bytes(whole[:length])
        assert journal.damage(RECORDED), f"cut to {length} bytes"


def test_a_line_taken_out_or_exchanged_is_seen(journal: Journal) -> None:
    lines = journal.path.read_bytes().splitlines(keepends=True)
    for changed in (lines[1:], [lines[0], lines[2]], [lines[0], lines[2], lines[1]], [*lines, lines[1]]):
        journal.path.write_bytes(b"".join(changed))
        assert any("line before it" in each.what for each in journal.damage(RECORDED))


def test_a_forged_line_does_not_fit_the_next(journal: Journal) -> None:
    lines = journal.path.read_bytes().splitlines(keepends=True)
    forged = json.loads(lines[1])
    forged["by"] = "nobody"
    journal.path.write_bytes(lines[0] + json.dumps(forged, sort_keys=True).encode() + b"\n" + lines[2])
    told = [each.what for each in journal.damage(RECORDED)]
    assert any("line 2 is not as written" in each for each in told)
    assert any("line 3 does not hold the digest" in each for each in told)


def test_what_the_index_records_otherwise_is_told(journal: Journal) -> None:
    other = {**RECORDED, "2026-03/2026-03.a1": "c" * 64, "2026-03/2026-03.a2": "d" * 64}
    told = {(each.key, each.kind) for each in journal.damage(other)}
    assert told == {("2026-03/2026-03.a1", "damaged"), (JOURNAL_NAME, "damaged")}
    gone = {"2026-03/2026-03.a1": "a" * 64}
    assert [(each.key, each.kind) for each in journal.damage(gone)] == [
        ("2026-03/s001@empty-cell.1", "missing")
    ]


def test_an_interrupted_line_is_taken_off_and_told(journal: Journal) -> None:
    with journal.path.open("ab") as stream:
        stream.write(b'{"act": "redu')
    assert journal.last() is not None
    journal.append([Act("mend", "2026-03/2026-03.a1", "data steward")], at=AT, stillroom="0.1.0")
    entries = list(journal.entries())
    assert [entry.act.act for entry in entries] == ["init", "ingest", "reduce", "mend"]
    assert '"torn"' in journal.path.read_text().splitlines()[-1]
    assert journal.damage(RECORDED) == []


def test_an_empty_journal_is_none(tmp_path: Path) -> None:
    journal = Journal(tmp_path)
    assert journal.last() is None
    assert list(journal.entries()) == []
    journal.append([], at=AT, stillroom="0.1.0")
    assert not journal.path.exists()
