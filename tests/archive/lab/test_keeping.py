"""A mirror is an archive of its own, and brings back what is damaged; nothing is overwritten on the way."""

from __future__ import annotations

import sqlite3
from collections import namedtuple
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest

from archive import Archive
from archive.errors import BadRequest
from archive.lab.keeping import MirrorOutcome
from archive.store.mend import SET_ASIDE
from tests.small_cooldown import write_folder

ACCESSION, REDUCTION = "2026-03/2026-03.a1", "2026-03/s001@empty-cell.1"


@pytest.fixture
def lab(tmp_path: Path) -> Iterator[Archive]:
    """Give an archive with an accession and a reduction."""
    with Archive.create(tmp_path / "lab", name="Test laboratory") as lab:
        lab.ingest(write_folder(tmp_path / "2026-03"))
        lab.reduce("2026-03", plan="empty-cell")
        yield lab


def spoilt(lab: Archive, key: str) -> Path:
    """Flip a byte of a sealed file and return its path."""
    path = lab.root / "sealed" / f"{key}.h5"
    content = bytearray(path.read_bytes())
    content[len(content) // 2] ^= 1
    path.chmod(0o644)
    path.write_bytes(bytes(content))
    path.chmod(0o444)
    return path


def test_a_mirror_is_searched_replayed_and_proved(lab: Archive, tmp_path: Path) -> None:
    outcome = lab.mirror(tmp_path / "vault")
    assert isinstance(outcome, MirrorOutcome)
    assert (set(outcome.copied), outcome.present, outcome.damage) == ({ACCESSION, REDUCTION}, 0, ())
    with Archive.open(tmp_path / "vault") as copy:
        assert copy.notices == []
        assert copy.fixity() == []
        assert copy.replay(REDUCTION).identical
        assert copy.journal() == lab.journal()
        assert copy._index.rows() == lab._index.rows()
    for path in (lab.root / "sealed").rglob("*.h5"):
        assert (tmp_path / "vault" / path.relative_to(lab.root)).read_bytes() == path.read_bytes()


def test_a_mirror_is_entered_and_one_that_cannot_be_is_made_all_the_same(
    lab: Archive, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    lab.mirror(tmp_path / "vault")
    act = lab.journal()[-1].act
    assert (act.act, act.what, act.note) == (
        "mirror",
        str(tmp_path / "vault"),
        "2 sealed files copied, 0 there before, 0 faults",
    )

    def full(*_: object, **__: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("archive.store.journal.append_lines", full)
    assert lab.mirror(tmp_path / "vault").present == 2
    assert "the journal does not tell of this mirror" in lab.notices[-1]
    assert lab.journal()[-1].act == act
    with Archive.open(tmp_path / "vault") as copy:
        assert copy.journal() == lab.journal()


def test_only_what_is_new_is_copied(lab: Archive, tmp_path: Path) -> None:
    lab.mirror(tmp_path / "vault")
    before = (tmp_path / "vault" / "sealed" / f"{ACCESSION}.h5").stat()
    lab.ingest(write_folder(tmp_path / "2026-04", name="2026-04"))
    outcome = lab.mirror(tmp_path / "vault")
    assert (outcome.copied, outcome.present) == (("2026-04/2026-04.a1",), 2)
    after = (tmp_path / "vault" / "sealed" / f"{ACCESSION}.h5").stat()
    assert (before.st_ino, before.st_mtime_ns) == (after.st_ino, after.st_mtime_ns)
    with Archive.open(tmp_path / "vault") as copy:
        assert [row.name for row in copy.cooldowns()] == ["2026-03", "2026-04"]


def test_an_archive_is_restored_from_its_mirror(lab: Archive, tmp_path: Path) -> None:
    lab.mirror(tmp_path / "vault")
    lab.close()
    with Archive.open(tmp_path / "vault") as copy:
        copy.mirror(tmp_path / "again")
    with Archive.open(tmp_path / "again") as restored:
        assert restored.fixity() == []
        assert restored.ingest(tmp_path / "2026-03").state == "already"
        assert restored.ingest(write_folder(tmp_path / "2026-04", name="2026-04")).state == "ingested"


@pytest.mark.postgresql
def test_a_mirror_of_an_index_in_postgresql_has_one_of_its_own(
    request: pytest.FixtureRequest, tmp_path: Path
) -> None:
    from tests.archive.index.postgresql_server import own_schema

    with (
        own_schema(request.getfixturevalue("postgresql"), "mirrored") as address,
        Archive.create(tmp_path / "group", name="Group", index=address) as group,
    ):
        group.ingest(write_folder(tmp_path / "2026-03"))
        outcome = group.mirror(tmp_path / "vault")
        assert outcome.index == "made anew"
        rows = group._index.rows()
    assert "postgresql" not in (tmp_path / "vault" / "stillroom.toml").read_text(encoding="utf-8")
    with Archive.open(tmp_path / "vault") as copy:
        assert copy._index.rows() == rows
        assert copy.fixity() == []


def test_damage_is_not_mirrored_and_damage_of_a_mirror_is_told(lab: Archive, tmp_path: Path) -> None:
    spoilt(lab, REDUCTION)
    outcome = lab.mirror(tmp_path / "vault")
    assert outcome.copied == (ACCESSION,)
    assert [(each.key, each.kind) for each in outcome.damage] == [(REDUCTION, "damaged")]
    assert not (tmp_path / "vault" / "sealed" / f"{REDUCTION}.h5").exists()
    with Archive.open(tmp_path / "vault") as copy:
        spoilt(copy, ACCESSION)
    assert ACCESSION not in {each.key for each in lab.mirror(tmp_path / "vault").damage}
    told = lab.mirror(tmp_path / "vault", thorough=True).damage
    assert {each.key for each in told} == {ACCESSION, REDUCTION}


def test_on_a_full_disk_everything_is_read_and_mirrored_elsewhere(
    lab: Archive, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """SQLite lays an index of its log beside a file that it opens for writing; where no room is left it refuses even to read."""
    lab.close()
    full = namedtuple("full", "total used free")(1 << 30, 1 << 30, 0)
    monkeypatch.setattr("archive.index.engine.shutil.disk_usage", lambda folder: full)
    opened: list[str] = []
    connect = sqlite3.connect

    def noted(address: object, *arguments: Any, **options: Any) -> sqlite3.Connection:
        opened.append(str(address))
        return connect(address, *arguments, **options)  # type: ignore[arg-type]

    monkeypatch.setattr("archive.index.engine.sqlite3.connect", noted)
    with Archive.open(lab.root) as full_lab:
        assert full_lab.fixity() == []
        assert len(full_lab.results()) > 0
        full_lab.mirror(tmp_path / "vault")
    of_the_archive = [each for each in opened if f"{lab.root}/" in each]
    assert of_the_archive
    assert all(each.endswith("?mode=ro&immutable=1") for each in of_the_archive)
    monkeypatch.undo()
    with Archive.open(tmp_path / "vault") as copy:
        assert copy.fixity() == []


@pytest.mark.parametrize("name", ["sealed", "sealed/2026-03"])
def test_a_mirror_is_not_written_through_a_link(lab: Archive, tmp_path: Path, name: str) -> None:
    (tmp_path / "elsewhere").mkdir()
    link = tmp_path / "vault" / name
    link.parent.mkdir(parents=True)
    link.symlink_to(tmp_path / "elsewhere")
    with pytest.raises(BadRequest, match="not written through links"):
        lab.mirror(tmp_path / "vault")
    assert list((tmp_path / "elsewhere").iterdir()) == []


def test_a_folder_that_is_no_mirror_is_left_alone(lab: Archive, tmp_path: Path) -> None:
    (tmp_path / "full").mkdir()
    (tmp_path / "full" / "thesis.tex").write_text("x", encoding="utf-8")
    with pytest.raises(BadRequest, match="no mirror"):
        lab.mirror(tmp_path / "full")
    with (
        Archive.create(tmp_path / "other", name="Another laboratory"),
        pytest.raises(BadRequest, match="another archive"),
    ):
        lab.mirror(tmp_path / "other")
    with Archive.create(tmp_path / "twin", name="Test laboratory") as twin:
        twin.ingest(write_folder(tmp_path / "2026-09", name="2026-09"))
    with pytest.raises(BadRequest, match="this archive does not"):
        lab.mirror(tmp_path / "twin")
    for inside in (lab.root, lab.root / "deep"):
        with pytest.raises(BadRequest, match="in the archive itself"):
            lab.mirror(inside)
    assert (tmp_path / "full" / "thesis.tex").read_text(encoding="utf-8") == "x"
    assert not (lab.root / "deep").exists()


@pytest.mark.parametrize(
    "spoil",
    [spoilt, lambda lab, key: (lab.root / "sealed" / f"{key}.h5").unlink()],
    ids=["damaged", "missing"],
)
@pytest.mark.parametrize("key", [ACCESSION, REDUCTION])
def test_what_is_damaged_or_missing_comes_back(
    lab: Archive, tmp_path: Path, key: str, spoil: Callable[[Archive, str], Path | None]
) -> None:
    lab.mirror(tmp_path / "vault")
    path = lab.root / "sealed" / f"{key}.h5"
    whole = path.read_bytes()
    changed = spoil(lab, key)
    hurt = None if changed is None else path.read_bytes()
    (outcome,) = lab.mend(tmp_path / "vault")
    assert (outcome.key, outcome.mended) == (key, True)
    assert path.read_bytes() == whole
    assert lab.fixity() == []
    assert (lab.journal()[-1].act.act, lab.journal()[-1].act.what) == ("mend", key)
    if hurt is not None:
        assert (lab.root / str(outcome.set_aside)).read_bytes() == hurt
    assert lab.mend(tmp_path / "vault") == []


def test_a_copy_that_is_damaged_too_mends_nothing(lab: Archive, tmp_path: Path) -> None:
    lab.mirror(tmp_path / "vault")
    hurt = spoilt(lab, REDUCTION).read_bytes()
    with Archive.open(tmp_path / "vault") as copy:
        path = spoilt(copy, REDUCTION)
        (outcome,) = lab.mend(tmp_path / "vault")
        assert not outcome.mended
        assert "other bytes" in outcome.why
        path.unlink()
    (outcome,) = lab.mend(tmp_path / "vault" / "sealed")
    assert "none in the copy" in outcome.why
    assert (lab.root / "sealed" / f"{REDUCTION}.h5").read_bytes() == hurt
    assert not (lab.root / SET_ASIDE).exists()


def test_mending_from_nothing_or_from_itself_is_refused(lab: Archive, tmp_path: Path) -> None:
    for other in (lab.root, tmp_path / "nowhere"):
        with pytest.raises(BadRequest):
            lab.mend(other)
