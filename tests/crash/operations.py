"""Everything that writes to an archive, as one table: where it begins, what it does, and when it counts as done.

What tests of faults share: each operation begins from a small archive made once, is stopped somewhere, and afterwards
must be in the archive whole or have left no trace, and must succeed when it is tried again.
"""

from __future__ import annotations

import functools
import shutil
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from alembic import command

from archive import Archive
from archive.errors import MissingFile, NotAnArchive
from archive.index import revision
from archive.index.engine import connected, engine_of, index_url
from archive.store.interface import Damage
from archive.store.local import open_store
from tests.small_cooldown import write_folder

__all__ = ["OPERATIONS", "Operation", "begun", "prepared", "require_whole_or_nothing"]

ACCESSION, REDUCTION = "2026-03/2026-03.a1", "2026-03/s001@empty-cell.1"
REVISION = """\
format = "stillroom-revision/1"
by = "data steward"
because = "measured again"
[[record.sample]]
name = "well-helium"
revision = 2
isotope = "4He"
gas_source = "well gas, cleaned over charcoal"
"""
AMENDMENT = """\
format = "stillroom-amendment/1"
cooldown = "2026-03"
by = "data steward"
because = "the notebook was misread"
[[change]]
address = "2026-03/d02"
field = "amount"
value = "9.0(1) umol"
"""


@dataclass(frozen=True)
class Operation:
    """One way to write to an archive.

    Attributes
    ----------
    start : str
        Name of the archive that it begins from; empty for none.
    do : callable
        Carries it out on the archive in a folder; the second folder holds what it needs.
    key : str
        Sealed file that there is afterwards and was not before; empty if there is none.
    """

    start: str
    do: Callable[[Path, Path], object]
    key: str = ""


def _within(act: Callable[[Archive, Path], object]) -> Callable[[Path, Path], object]:
    def do(root: Path, beside: Path) -> object:
        with Archive.open(root) as lab:
            return act(lab, beside)

    return do


def _create(root: Path, _: Path) -> None:
    # A name is taken in by whoever finished; an earlier attempt may have.
    if not (root / "stillroom.toml").exists():
        Archive.create(root, name="Test laboratory").close()


def vault(root: Path) -> Path:
    """Return where the mirror of an archive is made."""
    return root.with_name(f"{root.name}-vault")


OPERATIONS: dict[str, Operation] = {
    "init": Operation("", _create),
    "ingest": Operation("empty", _within(lambda lab, beside: lab.ingest(beside / "2026-03")), ACCESSION),
    "supplement": Operation(
        "filled", _within(lambda lab, beside: lab.ingest(beside / "again")), "2026-03/2026-03.a2"
    ),
    "reduce": Operation(
        "filled", _within(lambda lab, _: lab.reduce("2026-03", plan="empty-cell")), REDUCTION
    ),
    "revise": Operation(
        "filled", _within(lambda lab, beside: lab.revise(beside / "revision.toml")), "lab.records/well-helium.r2"
    ),
    "amend": Operation(
        "filled", _within(lambda lab, beside: lab.amend(beside / "amendment.toml")), "2026-03/2026-03.m1"
    ),
    "withdraw": Operation(
        "filled", _within(lambda lab, _: lab.withdraw("2026-03/s001", why="the magnet was ramped", by="data steward")),
        "2026-03/2026-03.w1",
    ),
    "import": Operation(
        "empty", _within(lambda lab, beside: lab.import_package(beside / "package")), REDUCTION
    ),
    "rebuild": Operation("reduced", lambda root, _: Archive.rebuild_index(root)),
    "rebuild from nothing": Operation("without an index", lambda root, _: Archive.rebuild_index(root)),
    "migrate": Operation("older", _within(lambda lab, _: lab.statistics())),
    "mirror": Operation("reduced", _within(lambda lab, _: lab.mirror(vault(lab.root)))),
    "mend": Operation("damaged", _within(lambda lab, beside: lab.mend(beside / "reduced"))),
}  # fmt: skip


def prepared(folder: Path) -> Path:
    """Make in `folder` the archives that operations begin from, and what else they need; return it."""
    write_folder(folder / "2026-03")
    write_folder(folder / "again")
    with (folder / "again" / "film.csv").open("a", encoding="utf-8") as table:
        table.write("2026-03-08T12:00:00+02:00,0.8000,1.000008800\n")
    (folder / "revision.toml").write_text(REVISION, encoding="utf-8")
    (folder / "amendment.toml").write_text(AMENDMENT, encoding="utf-8")
    Archive.create(folder / "empty", name="Test laboratory").close()
    shutil.copytree(folder / "empty", folder / "filled")
    with Archive.open(folder / "filled") as lab:
        lab.ingest(folder / "2026-03")
    shutil.copytree(folder / "filled", folder / "reduced")
    with Archive.open(folder / "reduced") as lab:
        lab.reduce("2026-03", plan="empty-cell")
        lab.export(["2026-03"], folder / "package", reports=False)
    shutil.copytree(folder / "reduced", folder / "without an index")
    for path in (folder / "without an index").glob("index.sqlite3*"):
        path.unlink()
    shutil.copytree(folder / "reduced", folder / "older")
    _lower(folder / "older", to="0001")
    shutil.copytree(folder / "reduced", folder / "damaged")
    path = folder / "damaged" / "sealed" / f"{REDUCTION}.h5"
    content = bytearray(path.read_bytes())
    content[len(content) // 2] ^= 1
    path.chmod(0o644)
    path.write_bytes(bytes(content))
    return folder


def _lower(root: Path, *, to: str) -> None:
    """Bring an index back to an earlier revision of its tables."""
    place = index_url(f"sqlite:///{root / 'index.sqlite3'}")
    engine = engine_of(place, read_only=False)
    with connected(engine, place, writes=True) as connection:
        command.downgrade(revision.migration_config(connection), to)
    engine.dispose()


def begun(operation: Operation, beside: Path, root: Path) -> Path:
    """Lay a copy of the archive that an operation begins from, and return `root`."""
    if operation.start:
        shutil.copytree(beside / operation.start, root)
    return root


def require_whole_or_nothing(name: str, root: Path, beside: Path) -> bool:
    """Open, look, try again, look again; return whether the operation had been done, as far as that can be told."""
    operation = OPERATIONS[name]
    left = [path.name for path in (root / "staging").iterdir()] if (root / "staging").is_dir() else []
    done = False
    try:
        with Archive.open(root) as lab:
            # What lay in staging is told by its name; what belongs to nobody does not lie there.
            for each in left:
                key = each.removesuffix(".partial").rpartition(".")[0].replace("~", "/")
                assert any(each in sentence or key in sentence for sentence in lab.notices), (
                    each,
                    lab.notices,
                )
            held = lab._store.keys()
            assert held == sorted(lab._index.sealed_files())
            if operation.key:
                done = operation.key in held
                before = _keys_of(beside / operation.start)
                brought = {operation.key} | ({ACCESSION} if name == "import" else set())
                assert set(held) in (before, before | brought), held
            _require_sound(lab, damaged=name == "mend")
    except NotAnArchive:
        if name != "init":
            raise
    except MissingFile:  # told with its remedy, which is the operation itself
        if name != "rebuild from nothing":
            raise
    if not done:
        operation.do(root, beside)
    with Archive.open(root) as lab:
        assert {operation.key} - {""} <= set(lab._store.keys())
        _require_sound(lab, damaged=False)
        assert not list((root / "staging").iterdir())
        if name == "mirror":
            with Archive.open(vault(root)) as copy:
                _require_sound(copy, damaged=False)
                assert copy._index.rows() == lab._index.rows()
        if operation.start in ("reduced", "without an index", "older", "damaged"):
            assert lab._index.rows() == _rows_of(beside / "reduced")
    return done


def _require_sound(lab: Archive, *, damaged: bool) -> None:
    found: list[Damage] = lab.fixity()
    assert {each.key for each in found} <= ({REDUCTION} if damaged else set()), found


@functools.cache
def _keys_of(root: Path) -> frozenset[str]:
    return frozenset(open_store(root).keys())


@functools.cache
def _rows_of(root: Path) -> dict[str, list[tuple[object, ...]]]:
    with Archive.open(root) as lab:
        return lab._index.rows()
