"""Files made elsewhere come into a store as they are, or leave no trace."""

from __future__ import annotations

from pathlib import Path

import pytest

from archive.errors import AlreadySealed, BadRequest, DamagedFile
from archive.store import LocalStore, SealedFile, examine, open_store
from archive.store.adopting import adoption

KEY = "2026-03/2026-03.a1"


def made(folder: Path, key: str = KEY) -> tuple[SealedFile, bytes]:
    """Give a sealed file and its bytes, made in another store."""
    folder.mkdir()
    store = open_store(folder)
    with store.writer(key) as writer:
        writer.raw("a.csv", [b"1,2\n"])
        writer.document('{"name": "2026-03"}')
        sealed = writer.seal()
    return sealed, store.path(key).read_bytes()


@pytest.fixture
def store(tmp_path: Path) -> LocalStore:
    """Give an empty store."""
    (tmp_path / "lab").mkdir()
    return open_store(tmp_path / "lab")


def test_what_is_adopted_is_what_came(store: LocalStore, tmp_path: Path) -> None:
    sealed, content = made(tmp_path / "one")
    with adoption(store) as adopted:
        adopted.take(sealed, [content[:100], content[100:]])
        assert adopted.keys == [KEY]
        assert adopted.damage() == []
        assert adopted.document(KEY) == '{"name": "2026-03"}'
        assert set(adopted.digests(KEY)) == {"raw/a.csv", "document"}
        assert not store.contains(KEY)
        assert adopted.seal() == [sealed]
    assert store.path(KEY).read_bytes() == content
    assert store.path(KEY).stat().st_mode & 0o222 == 0
    assert store.verify(KEY, sealed.sha256) == []
    assert store.strays() == []


def test_without_the_decision_nothing_stays(store: LocalStore, tmp_path: Path) -> None:
    sealed, content = made(tmp_path / "one")
    with adoption(store) as adopted:
        adopted.take(sealed, [content])
    assert store.keys() == []
    assert store.strays() == []


@pytest.mark.parametrize("change", ["other", "longer", "shorter"])
def test_other_bytes_than_promised_are_refused(store: LocalStore, tmp_path: Path, change: str) -> None:
    sealed, content = made(tmp_path / "one")
    changed = {"other": bytes(len(content)), "longer": content * 2, "shorter": content[:-1]}[change]
    with adoption(store) as adopted, pytest.raises(DamagedFile, match="promised"):
        adopted.take(sealed, [changed])
    assert store.strays() == []


def test_a_taken_name_is_refused(store: LocalStore, tmp_path: Path) -> None:
    sealed, content = made(tmp_path / "one")
    with adoption(store) as adopted:
        adopted.take(sealed, [content])
        with pytest.raises(AlreadySealed):
            adopted.take(sealed, [content])
        adopted.seal()
    with adoption(store) as adopted, pytest.raises(AlreadySealed):
        adopted.take(sealed, [content])


def test_what_was_not_taken_cannot_be_asked_for(store: LocalStore) -> None:
    with adoption(store) as adopted:
        assert adopted.seal() == []
        with pytest.raises(BadRequest):
            adopted.document(KEY)


def test_a_file_without_a_document_is_told_as_damage(store: LocalStore) -> None:
    import hashlib

    content = b"\x89HDF\r\n\x1a\n" + bytes(100)
    sealed = SealedFile(KEY, hashlib.sha256(content).hexdigest(), len(content))
    with adoption(store) as adopted:
        adopted.take(sealed, [content])
        with pytest.raises(DamagedFile):
            adopted.document(KEY)


def test_a_child_that_dies_over_many_files_names_the_one(
    store: LocalStore, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    one, two = made(tmp_path / "one"), made(tmp_path / "two", "2026-03/2026-03.a2")
    paths = [
        tmp_path / "one" / "sealed" / f"{KEY}.h5",
        tmp_path / "two" / "sealed" / "2026-03" / "2026-03.a2.h5",
    ]
    asked: list[int] = []

    def told(files: list[tuple[Path, str, int]]) -> object:
        asked.append(len(files))
        return "HDF5 cannot cope with the file" if len(files) > 1 or files[0][1] == KEY else []

    monkeypatch.setattr(examine, "_told_by_child", told)
    (damage,) = examine.examined_apart([(paths[0], one[0]), (paths[1], two[0])])
    assert (damage.key, damage.what) == (KEY, "HDF5 cannot cope with the file")
    assert asked == [2, 1, 1]
