"""Everything that writes to an archive, as one table: where it begins, what it does, and when it counts as done.

What tests of faults share: each operation begins from a small archive made once, is stopped somewhere, and afterwards
must be in the archive whole or have left no trace, and must succeed when it is tried again.
"""

from __future__ import annotations

import contextlib
import functools
import shutil
from collections.abc import Callable
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path

from alembic import command

from archive import Archive
from archive.errors import BadRequest, MissingFile, NotAnArchive
from archive.exchange.bag_reading import read_bag
from archive.index import revision
from archive.index.engine import connected, engine_of, index_url
from archive.store.durable import file_digest
from archive.store.interface import Damage
from archive.store.local import open_store
from tests.crash import faults
from tests.crash.databases import own_database
from tests.small_cooldown import write_folder

__all__ = ["OPERATIONS", "Operation", "begun", "package", "prepared", "require_whole_or_nothing"]

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


MOMENT = datetime(2026, 4, 1, 12, tzinfo=UTC)
"""When operations say that they are done, so that the same ones leave the same bytes."""


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
        with Archive.open(root, clock=lambda: MOMENT) as lab:
            return act(lab, beside)

    return do


def _create(root: Path, _: Path) -> None:
    # A name is taken in by whoever finished; an earlier attempt may have.
    if not (root / "stillroom.toml").exists():
        Archive.create(root, name="Test laboratory").close()


def vault(root: Path) -> Path:
    """Return where the mirror of an archive is made."""
    return root.with_name(f"{root.name}-vault")


def package(root: Path) -> Path:
    """Return where a package of an archive is made."""
    return root.with_name(f"{root.name}-package")


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
    "put in order": Operation("half imported", _within(lambda lab, _: lab.statistics()), REDUCTION),
    "export": Operation(
        "reduced", _within(lambda lab, _: lab.export(["2026-03"], package(lab.root), reports=False))
    ),
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
    _half_imported(folder)
    shutil.copytree(folder / "reduced", folder / "damaged")
    path = folder / "damaged" / "sealed" / f"{REDUCTION}.h5"
    content = bytearray(path.read_bytes())
    content[len(content) // 2] ^= 1
    path.chmod(0o644)
    path.write_bytes(bytes(content))
    return folder


def _half_imported(folder: Path) -> None:
    """Make an archive whose import was stopped when it had been decided and one of its two files had its name."""
    root = folder / "half imported"
    shutil.copytree(folder / "empty", folder / "counted")
    with Archive.open(folder / "counted") as lab, faults.faulty(None) as calls:
        lab.import_package(folder / "package")
    shutil.copytree(folder / "empty", root)
    _, _, second = (
        number for number, call in enumerate(calls, 1) if call == "link"
    )  # the plan is linked first
    with (
        Archive.open(root) as lab,
        contextlib.suppress(faults.StoppedError),
        faults.faulty(second),
    ):
        lab.import_package(folder / "package")
    assert open_store(root).keys() == [ACCESSION]
    assert len(list((root / "staging").iterdir())) == 2  # the plan, and the file that waits for its name


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
        own_database(root)
    return root


def require_whole_or_nothing(name: str, root: Path, beside: Path) -> bool:
    """Open, look, try again, look again; return whether the operation had been done, as far as that can be told."""
    operation = OPERATIONS[name]
    staging = root / "staging"
    left = [path.name for path in staging.iterdir()] if staging.is_dir() else []
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
                brought = {ACCESSION, REDUCTION} if name in ("import", "put in order") else {operation.key}
                assert set(held) in (before, before | brought), held
            # An import that had been decided is finished by whoever opens the archive.
            assert done or name != "put in order"
            _require_sound(lab, damaged=name == "mend")
    except NotAnArchive:
        if name != "init":
            raise
    except MissingFile:  # told with its remedy, which is the operation itself
        if name != "rebuild from nothing":
            raise
    if name == "export":
        done = package(root).exists()
    elif name == "mirror":
        _require_swept(root)
    else:
        _tried_again(operation, root, beside, done=done)
    with Archive.open(root) as lab:
        assert {operation.key} - {""} <= set(lab._store.keys())
        _require_sound(lab, damaged=False)
        assert not list(staging.iterdir())
        if (
            operation.start in ("reduced", "without an index", "older", "damaged", "half imported")
            or name == "import"
        ):
            assert lab._index.rows() == _rows_of(beside / "reduced")
        _require_fruits(name, lab, beside, done=done)
    return done


def _require_fruits(name: str, lab: Archive, beside: Path, *, done: bool) -> None:
    """See that what came of an operation is what it should be."""
    if name == "ingest":
        kept = {entry["name"]: entry["sha256"] for entry in lab.show("2026-03.a1")["raw_files"]}
        assert kept["film.csv"] == file_digest(beside / "2026-03" / "film.csv")[0]
    elif name == "reduce":
        assert lab.replay("2026-03/s001@empty-cell.1").identical
    elif name == "mirror":
        with Archive.open(vault(lab.root)) as copy:
            _require_sound(copy, damaged=False)
            assert copy._index.rows() == lab._index.rows()
    elif name == "export":
        _require_package(lab, done=done)


def _tried_again(operation: Operation, root: Path, beside: Path, *, done: bool) -> None:
    """Carry an operation out once more: where it was done it is told that it was, or nothing comes of it."""
    held = open_store(root).keys() if done else []
    try:
        operation.do(root, beside)
    except BadRequest:  # the name of a revision is taken, a thing is withdrawn already
        if not done:
            raise
    if done and operation.start != "half imported":
        assert open_store(root).keys() == held


def _require_swept(root: Path) -> None:
    """Mirror again, and see that all that was left half written in the mirror is gone and told."""
    target = vault(root)
    left = {path.name for folder in (target, target / "staging") for path in folder.glob("*.partial")}
    with Archive.open(root) as lab:
        told = lab.mirror(target).swept
    assert all(any(name in sentence for sentence in told) for name in left), (left, told)
    assert not [path for folder in (target, target / "staging") for path in folder.glob("*.partial")]


def _require_package(lab: Archive, *, done: bool) -> None:
    """See that a package is whole, or make it; what an export that was stopped left is swept by that, and told."""
    target = package(lab.root)
    left = list(target.parent.glob(f".{target.name}.*.partial"))
    if done:
        assert not left
    else:
        told = lab.export(["2026-03"], target, reports=False).swept
        assert [sentence.partition(":")[0] for sentence in told] == sorted(map(str, left))
        assert not list(target.parent.glob(f".{target.name}.*.partial"))
    assert read_bag(target).findings == []


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
