"""Bits that flip and files that are cut short: whatever lies in an archive, `fixity` tells of it or it carried nothing.

More than two thousand changes of sealed files of every kind, three hundred of the index, every byte of the settings here; every
byte of a journal in `tests/archive/store/test_journal.py`.
"""

from __future__ import annotations

import random
import shutil
from collections.abc import Callable, Iterator
from contextlib import closing
from pathlib import Path

import h5py
import pytest

from archive import Archive
from archive.errors import ArchiveError
from archive.index import Index
from archive.lab.journaling import Acts
from archive.store import open_store
from archive.store.examine import examined_apart
from archive.store.interface import Damage, SealedFile
from tests.crash.operations import AMENDMENT, REVISION
from tests.small_cooldown import write_folder

ACCESSION, REDUCTION = "2026-03/2026-03.a1", "2026-03/s001@empty-cell.1"
KINDS = (ACCESSION, REDUCTION, "lab.records/well-helium.r2", "2026-03/2026-03.m1", "2026-03/2026-03.w1")


@pytest.fixture(scope="module")
def root(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give an archive with every kind of file."""
    folder = tmp_path_factory.mktemp("rot")
    with Archive.create(folder / "lab", name="Test laboratory") as lab:
        lab.ingest(write_folder(folder / "2026-03"))
        lab.reduce("2026-03", plan="empty-cell")
        for name, text in (("revision", REVISION), ("amendment", AMENDMENT)):
            (folder / f"{name}.toml").write_text(text, encoding="utf-8")
        lab.revise(folder / "revision.toml")
        lab.amend(folder / "amendment.toml")
        lab.withdraw("2026-03/s002", why="the magnet was ramped", by="data steward")
        assert lab.fixity() == []
        assert sorted(lab._store.keys()) == sorted(KINDS)
    return folder / "lab"


def changes(content: bytes, count: int, seed: int) -> Iterator[tuple[str, bytes]]:
    """Yield changed contents: nine flipped bits in ten, the tenth a cut."""
    chance = random.Random(seed)  # noqa: S311 - no secret
    for number in range(count):
        place = chance.randrange(len(content))
        if number % 10 == 9:
            yield f"cut to {place} bytes", content[:place]
        else:
            bit = 1 << chance.randrange(8)
            yield (
                f"byte {place} xor {bit}",
                content[:place] + bytes([content[place] ^ bit]) + content[place + 1 :],
            )


def recorded(root: Path) -> dict[str, SealedFile]:
    """Return what the index records."""
    with closing(Index.open(f"sqlite:///{root / 'index.sqlite3'}")) as index:
        return {key: SealedFile(key, *row) for key, row in index.sealed_files().items()}


@pytest.fixture
def no_child(monkeypatch: pytest.MonkeyPatch) -> None:
    """Leave out the look inside a damaged file, which takes a process each; the digest has spoken by then."""
    monkeypatch.setattr("archive.store.examine._inside_apart", lambda *_: [])


@pytest.mark.parametrize("key", KINDS)
def test_every_change_of_a_sealed_file_is_told_with_its_name(
    root: Path, tmp_path: Path, key: str, no_child: None
) -> None:
    shutil.copytree(root, tmp_path / "lab")
    store, sealed = open_store(tmp_path / "lab"), recorded(root)[key]
    path = store.path(key)
    content = path.read_bytes()
    path.chmod(0o644)
    for what, changed in changes(content, 420, seed=len(key)):
        path.write_bytes(changed)
        assert [each.key for each in store.verify(key, sealed.sha256) if each.kind == "damaged"] == [key], (
            what
        )
    path.write_bytes(content)
    assert store.verify(key, sealed.sha256) == []


def test_a_change_inside_a_dataset_is_told_with_the_dataset(root: Path, tmp_path: Path) -> None:
    path, sealed = open_store(root).path(ACCESSION), recorded(root)[ACCESSION]
    content, places = path.read_bytes(), {}
    with h5py.File(path) as file:

        def place(name: str, item: object) -> None:
            if isinstance(item, h5py.Dataset) and item.chunks is not None and item.id.get_num_chunks():
                chunk = item.id.get_chunk_info(0)
                places[f"/{name}"] = range(chunk.byte_offset, chunk.byte_offset + chunk.size)

        file.visititems(place)
    assert len(places) > 10
    chance, copies, meant = random.Random(5), [], []  # noqa: S311 - no secret
    names = sorted(places)
    for number in range(200):  # each dataset at least once
        name = names[number] if number < len(names) else chance.choice(names)
        spot = chance.choice(places[name])
        copy = tmp_path / f"{number}.h5"
        copy.write_bytes(
            content[:spot] + bytes([content[spot] ^ 1 << chance.randrange(8)]) + content[spot + 1 :]
        )
        copies.append((copy, SealedFile(f"2026-03/2026-03.a{number + 1}", sealed.sha256, sealed.size)))
        meant.append((f"2026-03/2026-03.a{number + 1}", name))
    told = {(each.key, f"/{(each.dataset or '').lstrip('/')}") for each in examined_apart(copies)}
    assert set(meant) <= told


def test_a_change_of_the_index_is_told_or_changes_no_row(root: Path, tmp_path: Path) -> None:
    shutil.copytree(root, tmp_path / "lab")
    path = tmp_path / "lab" / "index.sqlite3"
    content, outcomes = path.read_bytes(), {"told": 0, "carried nothing": 0}
    with closing(Index.open(f"sqlite:///{root / 'index.sqlite3'}")) as whole:
        rows = whole.rows()
        for what, changed in changes(content, 300, seed=3):
            for beside in path.parent.glob("index.sqlite3?*"):
                beside.unlink()
            path.write_bytes(changed)
            try:
                with closing(Index.open(f"sqlite:///{path}")) as index:
                    told = bool(index.faults() or index.disagreements(whole))
                    if not told and outcomes["carried nothing"] < 20:
                        assert index.rows() == rows, what
            except ArchiveError:
                told = True
            outcomes["told" if told else "carried nothing"] += 1
    assert outcomes["told"] > 30, outcomes


@pytest.mark.parametrize("seed", range(6))
def test_fixity_tells_what_the_index_has_otherwise(root: Path, tmp_path: Path, seed: int) -> None:
    shutil.copytree(root, tmp_path / "lab")
    path = tmp_path / "lab" / "index.sqlite3"
    content = path.read_bytes()
    # A word that stands in rows: the flipped bit leaves a database that opens and says another thing.
    spots = [place for place in range(len(content)) if content.startswith(b"temperature-sweep", place)]
    spot = random.Random(seed).choice(spots)  # noqa: S311 - no secret
    path.write_bytes(content[:spot] + b"T" + content[spot + 1 :])
    told = damage_of(tmp_path / "lab")
    assert any(each.key == "index" and each.kind == "damaged" for each in told), told
    Archive.rebuild_index(tmp_path / "lab")
    assert damage_of(tmp_path / "lab") == []


def damage_of(root: Path) -> list[Damage]:
    """Return what fixity says; what cannot be opened is damage of the index."""
    try:
        with Archive.open(root) as lab:
            return lab.fixity()
    except ArchiveError as problem:
        return [Damage("index", "damaged", str(problem))]


def test_every_change_of_the_settings_is_told(root: Path, tmp_path: Path) -> None:
    shutil.copytree(root, tmp_path / "lab")
    path = tmp_path / "lab" / "stillroom.toml"
    content = path.read_bytes()
    digests = {key: sealed.sha256 for key, sealed in recorded(root).items()}
    acts = Acts(tmp_path / "lab", clock=_never)
    assert acts.damage(digests) == []
    for place in range(len(content)):
        path.write_bytes(content[:place] + bytes([content[place] ^ 4]) + content[place + 1 :])
        assert [each.key for each in acts.damage(digests)] == ["stillroom.toml"], place


def _never() -> None:  # type: ignore[misc]
    raise AssertionError


@pytest.mark.parametrize(
    "spoil",
    [
        lambda path: path.unlink(),
        lambda path: (path.rename(path.with_name("elsewhere")), path.symlink_to(path.with_name("elsewhere"))),
        lambda path: (path.unlink(), path.mkdir()),
        lambda path: path.rename(path.with_name("s009@empty-cell.1.h5")),
        lambda path: (path.chmod(0o644), path.write_bytes(b"")),
    ],
    ids=["gone", "a link in its place", "a folder in its place", "under another name", "emptied"],
)
def test_a_file_that_is_not_where_it_was_is_told(
    root: Path, tmp_path: Path, spoil: Callable[[Path], object]
) -> None:
    shutil.copytree(root, tmp_path / "lab")
    spoil(tmp_path / "lab" / "sealed" / f"{REDUCTION}.h5")
    told = damage_of(tmp_path / "lab")
    assert any(each.key == REDUCTION and each.kind in ("damaged", "missing") for each in told), told
