"""What was revised, amended and withdrawn after the fact goes with a package, and is told in it."""

from __future__ import annotations

import csv
import shutil
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

from archive import Archive

DROP = "2026-04/s002@drop.1"
AMENDMENT = """\
format = "stillroom-amendment/1"
cooldown = "2026-04"
by = "data steward"
because = "the dose was read wrongly"

[[change]]
address = "2026-04/d02"
field = "amount"
value = "8.1(1) umol"
"""
REVISION = """\
format = "stillroom-revision/1"
by = "data steward"
because = "measured again on the same film"

[[record.substrate]]
name = "plastic"
revision = 2
material = "polyimide film"
area = { quantity = "1.70(3) m^2", known = "measured", source = "N2 isotherm" }
"""


@pytest.fixture(scope="module")
def acted(origin: Path, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Archive]:
    """Give the archive of two cooldowns after an amendment, a revision and two withdrawals."""
    folder = tmp_path_factory.mktemp("acts")
    (folder / "amendment.toml").write_text(AMENDMENT, encoding="utf-8")
    (folder / "revision.toml").write_text(REVISION, encoding="utf-8")
    with Archive.open(shutil.copytree(origin, folder / "lab")) as lab:
        lab.amend(folder / "amendment.toml")
        lab.revise(folder / "revision.toml")
        lab.withdraw("plastic.r2", why="measured on another film", by="data steward")
        lab.withdraw(DROP, why="made with the wrong plan", by="data steward")
        yield lab


def test_every_kind_of_sealed_file_moves(
    acted: Archive, other: Callable[[], Archive], tmp_path: Path
) -> None:
    outcome = acted.export([], tmp_path / "all", reports=False)
    assert {"2026-04.m1", "2026-04.w1", "plastic.r2", "plastic.r2.w1"} < set(outcome.files)
    assert len(outcome.files) == len(acted._store.keys())
    there = other()
    assert there.import_package(tmp_path / "all").state == "imported"
    assert there._index.rows() == acted._index.rows()
    assert there._store.strays() == []
    assert (tmp_path / "all" / "data" / "sheets" / "2026-04.m1.toml").read_text(encoding="utf-8") == AMENDMENT
    assert (tmp_path / "all" / "data" / "sheets" / "plastic.r2.toml").read_text(encoding="utf-8") == REVISION


def test_a_cooldown_does_not_leave_without_what_was_amended_and_withdrawn_in_it(
    acted: Archive, tmp_path: Path
) -> None:
    outcome = acted.export(["2026-04/s002@drop.1#shift"], tmp_path / "one", reports=False)
    assert {"2026-04.m1", "2026-04.w1"} < set(outcome.files)
    assert "plastic.r2" not in outcome.files, "nothing in it rests on the later revision"
    text = (tmp_path / "one" / "data" / "README.txt").read_text(encoding="utf-8")
    assert f"{DROP}: made with the wrong plan" in text
    with (tmp_path / "one" / "data" / "results.csv").open(encoding="utf-8", newline="") as stream:
        reasons = {row["address"]: row["withdrawn_because"] for row in csv.DictReader(stream)}
    assert reasons[f"{DROP}#shift"] == "made with the wrong plan"
    assert reasons["2026-03/s001@empty-cell.1#period_low"] == ""


def test_a_record_that_was_sealed_alone_goes_with_what_was_said_of_it(acted: Archive, tmp_path: Path) -> None:
    assert set(acted.export(["plastic.r2"], tmp_path / "p", reports=False).files) == {
        "plastic.r2",
        "plastic.r2.w1",
    }


def test_provenance_tells_of_it(acted: Archive) -> None:
    found = acted.provenance("2026-04", notation="provn")
    assert found.contradictions == ()
    assert "wasInvalidatedBy(cooldown-2026-04:reduction.s002.drop.1," in found.text
    assert "Amending 2026-04: the dose was read wrongly" in found.text
