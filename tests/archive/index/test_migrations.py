"""The migrations: one head, equal to the models, there and back, and harmless when they fail."""

from __future__ import annotations

import errno
import os
import sqlite3
import subprocess
import sys
from collections.abc import Iterator
from contextlib import closing, contextmanager
from pathlib import Path

import pytest
from alembic import command
from alembic.autogenerate import compare_metadata
from alembic.migration import MigrationContext
from alembic.script import ScriptDirectory
from sqlalchemy import Connection, create_engine, inspect, text
from sqlalchemy.exc import DBAPIError

from archive.errors import ArchiveError, BadRequest, MissingFile
from archive.index import Index, revision
from archive.index.engine import connected, engine_of, index_name, index_url
from archive.index.tables import Base
from tests.archive.index import documents as make

_ADDS_A_TABLE = '''
"""A later revision, for tests."""
import sqlalchemy as sa
from alembic import op

revision = "0003"
down_revision = "0002"


def upgrade():
    op.create_table("added", sa.Column("name", sa.Text(), primary_key=True))
    op.execute("DELETE FROM finding")
{more}


def downgrade():
    op.drop_table("added")
'''


@contextmanager
def _connection(url: str) -> Iterator[Connection]:
    place = index_url(url)
    engine = engine_of(place, read_only=False)
    try:
        with connected(engine, place, writes=True) as connection:
            yield connection
    finally:
        engine.dispose()


@pytest.fixture
def later(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Return a program that is one revision ahead: a copy of the migrations with one more, returned to be written."""
    folder = tmp_path / "later"
    source = Path(str(revision.files("migrations")))
    (folder / "versions").mkdir(parents=True)
    names = ("env.py", "script.py.mako", "versions/0001_first_tables.py", "versions/0002_acts.py")
    for name in names:
        (folder / name).write_bytes((source / name).read_bytes())
    monkeypatch.setattr(revision, "files", lambda _package: folder)
    monkeypatch.setattr(revision, "HEAD", "0003")
    script = folder / "versions" / "0003_more.py"
    script.write_text(_ADDS_A_TABLE.format(more=""))
    return script


def test_there_is_one_head_and_the_program_names_it() -> None:
    assert ScriptDirectory.from_config(revision.migration_config()).get_heads() == [revision.HEAD]


def test_upgrading_from_zero_gives_the_models(index: Index, url: str) -> None:
    with _connection(url) as connection:
        context = MigrationContext.configure(
            connection, opts={"compare_type": True, "compare_server_default": True}
        )
        assert compare_metadata(context, Base.metadata) == []
        inspector = inspect(connection)
        for table in Base.metadata.tables.values():
            # What the comparison does not look at: keys and checks.
            assert tuple(inspector.get_pk_constraint(table.name)["constrained_columns"]) == tuple(
                column.name for column in table.primary_key.columns
            )
        assert [check["name"] for check in inspector.get_check_constraints("sealed_file")] == [
            "ck_sealed_file_document"
        ]


def test_tables_made_by_the_migration_are_written_as_the_models_are(tmp_path: Path) -> None:
    migrated, modelled = tmp_path / "migrated", tmp_path / "modelled"
    Index.create(f"sqlite:///{migrated}").close()
    engine = create_engine(f"sqlite:///{modelled}")
    Base.metadata.create_all(engine)
    engine.dispose()
    found = []
    for path in (migrated, modelled):
        with closing(sqlite3.connect(path)) as connection:
            rows = connection.execute(
                "SELECT name, sql FROM sqlite_master WHERE name NOT LIKE 'alembic%' AND sql IS NOT NULL"
            )
            # The order of the constraints in a definition says nothing.
            found.append(
                {
                    name: sorted(line.strip(" ,") for line in sql.split("\n"))
                    for name, sql in rows
                    if "alembic" not in sql
                }
            )
    assert found[0] == found[1]
    assert "STRICT" in " ".join(found[0]["sweep"])


def test_down_and_up_again(index: Index, url: str) -> None:
    index.close()
    with _connection(url) as connection:
        command.downgrade(revision.migration_config(connection), "base")
        assert inspect(connection).get_table_names() == ["alembic_version"]
    with pytest.raises(MissingFile, match="rebuild-index"):
        Index.open(url)
    with _connection(url) as connection:
        revision.upgrade(connection)
    with Index.open(url) as again:
        again.rebuild([make.entry(make.accession())])
        assert again.statistics()["sweeps"] == 1


def test_an_index_of_the_first_revision_is_raised_with_every_row_and_lowered_again(url: str) -> None:
    acts = {"amended_sweep", "amendment", "amendment_sweep", "replaced_record", "revision", "withdrawal"}
    documents = [make.accession(), make.accession("Z-1"), make.reduction()]
    with Index.create(url) as index:
        index.rebuild([make.entry(document) for document in documents])
        before = index.rows()
    with _connection(url) as connection:
        command.downgrade(revision.migration_config(connection), "0001")
        assert not acts & set(inspect(connection).get_table_names())
        with pytest.raises(DBAPIError), connection.begin_nested():
            connection.execute(text("INSERT INTO sealed_file VALUES ('k', 'amendment', 'a', 's', 1)"))
    with Index.open(url) as raised:
        assert raised.rows() == before
        assert all(before[table] == [] for table in acts)
    with _connection(url) as connection:
        connection.execute(text("INSERT INTO sealed_file VALUES ('k', 'amendment', 'a', 's', 1)"))
        with pytest.raises(DBAPIError), connection.begin_nested():
            connection.execute(text("INSERT INTO sealed_file VALUES ('l', 'letter', 'b', 's', 1)"))
        with pytest.raises(DBAPIError), connection.begin_nested():
            connection.execute(text("DELETE FROM cooldown"))


def test_an_older_index_is_copied_beside_and_raised(index: Index, url: str, later: Path) -> None:
    index.rebuild([make.entry(make.accession(findings=[{"code": "gap", "severity": "note", "what": "gap"}]))])
    before = index.rows()
    assert before["finding"]
    index.close()
    with pytest.raises(BadRequest, match="open it once for writing"):
        Index.open(url, read_only=True)
    with Index.open(url) as raised:
        assert raised.rows() == {**before, "finding": []}
    with _connection(url) as connection:
        assert connection.execute(text("SELECT version_num FROM alembic_version")).scalar() == "0003"
        assert inspect(connection).has_table("added")
    if url.startswith("sqlite"):
        copy = Path(url.removeprefix("sqlite:///") + ".before-0002")
        with closing(sqlite3.connect(copy)) as connection_to_copy:
            assert connection_to_copy.execute("SELECT count(*) FROM finding").fetchone() == (1,)
            assert connection_to_copy.execute("SELECT version_num FROM alembic_version").fetchone() == (
                "0002",
            )


def test_programs_that_raise_one_index_at_once_all_open_it(index: Index, url: str, later: Path) -> None:
    index.rebuild([make.entry(make.accession())])
    before = index.rows()
    index.close()

    # Alembic's environment belongs to a process, so the other program waits in a process of its own.
    code = """
import sys
from pathlib import Path
from archive.index import Index, revision
revision.files, revision.HEAD = (lambda _package: Path(sys.argv[2])), "0003"
with Index.open(sys.argv[1]) as index:
    print(index.statistics()["sweeps"])
"""
    environment = {**os.environ, "PYTHONPATH": str(Path(__file__).parents[3])}
    command_line = [sys.executable, "-c", code, url, str(later.parents[1])]
    started = [
        subprocess.Popen(
            command_line, env=environment, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
        )
        for _ in range(2)
    ]
    for process in started:
        said, complaint = process.communicate(timeout=60)
        assert (process.returncode, said.strip()) == (0, "1"), complaint
    with Index.open(url) as raised:
        assert raised.rows() == before


@pytest.mark.parametrize(
    "fault",
    [
        '    op.execute("INSERT INTO nowhere VALUES (1)")',
        '    raise RuntimeError("no such scale")',
        "    import nowhere",
    ],
    ids=["refused by the database", "raised by the migration", "not to be loaded"],
)
def test_a_migration_that_fails_leaves_the_old_index(
    index: Index, url: str, later: Path, monkeypatch: pytest.MonkeyPatch, fault: str
) -> None:
    index.rebuild([make.entry(make.accession(findings=[{"code": "gap", "severity": "note", "what": "gap"}]))])
    before = index.rows()
    index.close()
    later.write_text(_ADDS_A_TABLE.format(more=fault))
    for _ in range(2):
        with pytest.raises(
            ArchiveError, match=r"from revision 0002 to 0003, and are as they were \(.+\); go on with"
        ) as told:
            Index.open(url)
        assert told.value.file == index_name(index_url(url))
    if url.startswith("sqlite"):  # no copies pile up of what was not changed
        assert not list(Path(url.removeprefix("sqlite:///")).parent.glob("*before*"))
    monkeypatch.undo()
    with Index.open(url) as old:
        assert old.rows() == before
    with _connection(url) as connection:
        assert not inspect(connection).has_table("added")


def test_a_disk_too_full_for_the_copy_is_told_with_what_to_do(
    tmp_path: Path, later: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def full(*_: object, **__: object) -> None:
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    url = f"sqlite:///{tmp_path / 'index.sqlite3'}"
    (tmp_path / "index.sqlite3").touch()
    with _connection(url) as connection:
        revision.upgrade(connection, "0002")
    monkeypatch.setattr(revision, "_copied_beside", full)
    with pytest.raises(ArchiveError, match=r"No space left on device\); make room"):
        Index.open(url)
    monkeypatch.undo()
    Index.open(url).close()


def test_an_index_of_a_newer_program_is_left_alone(index: Index, url: str) -> None:
    index.close()
    with _connection(url) as connection:
        connection.execute(text("UPDATE alembic_version SET version_num = '9999'"))
    with pytest.raises(BadRequest, match="newer Stillroom") as caught:
        Index.open(url)
    assert caught.value.found == "revision 9999"
    with _connection(url) as connection:
        assert connection.execute(text("SELECT version_num FROM alembic_version")).scalar() == "9999"


@pytest.mark.parametrize("content", [b"", None], ids=["empty file", "somebody else's database"])
def test_a_file_without_the_tables_is_told_as_missing(tmp_path: Path, content: bytes | None) -> None:
    path = tmp_path / "index.sqlite3"
    if content is None:
        with closing(sqlite3.connect(path)) as connection:
            connection.execute("CREATE TABLE mine (x)")
    else:
        path.write_bytes(content)
    with pytest.raises(MissingFile, match="rebuild-index"):
        Index.open(f"sqlite:///{path}")


def test_a_developer_can_check_the_migrations_from_the_command_line(tmp_path: Path) -> None:
    url = f"sqlite:///{tmp_path}/index.sqlite3"
    root = Path(__file__).parents[3]
    base = [sys.executable, "-m", "alembic", "-c", str(root / "pyproject.toml"), "-x", f"url={url}"]
    environment = {**os.environ, "PYTHONPATH": str(root)}
    for verb in (["upgrade", "head"], ["check"]):
        done = subprocess.run(
            [*base, *verb], capture_output=True, text=True, check=False, env=environment, cwd=tmp_path
        )
        assert done.returncode == 0, done.stderr
    assert "No new upgrade operations" in done.stdout
