"""Indexes that earlier programs wrote, kept as text: each is opened, raised, and holds what it held.

`revisions/NNNN.sql` is the whole database, as the program of that revision wrote it for `tests.small_cooldown`: a cooldown
ingested and its empty cell reduced, and from 0002 on a record revised, a dose amended and a sweep withdrawn.
"""

from __future__ import annotations

import sqlite3
from contextlib import closing
from pathlib import Path

import pytest
from alembic.script import ScriptDirectory

from archive.index import Index, SearchQuery, revision

FOLDER = Path(__file__).parent / "revisions"
REVISIONS = sorted(
    script.revision for script in ScriptDirectory.from_config(revision.migration_config()).walk_revisions()
)

Content = dict[str, tuple[list[str], list[tuple[object, ...]]]]


def content(path: Path) -> Content:
    """Return columns and sorted rows of every table, but for the one that names the revision."""
    with closing(sqlite3.connect(path)) as connection:
        names = [
            name
            for (name,) in connection.execute("SELECT name FROM sqlite_master WHERE type = 'table'")
            if name != "alembic_version"
        ]
        found: Content = {}
        for name in names:
            cursor = connection.execute(f'SELECT * FROM "{name}"')  # noqa: S608 - names out of the database itself
            columns = [column[0] for column in cursor.description]
            found[name] = columns, sorted(cursor.fetchall(), key=repr)
        return found


def as_before(now: Content, before: Content) -> Content:
    """Return of what there is now the tables and columns that there were before."""
    found: Content = {}
    for name, (columns, _) in before.items():
        places = [now[name][0].index(column) for column in columns]
        rows = sorted((tuple(row[place] for place in places) for row in now[name][1]), key=repr)
        found[name] = columns, rows
    return found


def test_every_revision_is_kept() -> None:
    assert [path.stem for path in sorted(FOLDER.glob("*.sql"))] == REVISIONS


@pytest.mark.parametrize("number", REVISIONS)
def test_an_index_that_an_earlier_program_wrote_holds_what_it_held(number: str, tmp_path: Path) -> None:
    path = tmp_path / "index.sqlite3"
    with closing(sqlite3.connect(path)) as connection:
        connection.executescript((FOLDER / f"{number}.sql").read_text(encoding="utf-8"))
        assert connection.execute("SELECT version_num FROM alembic_version").fetchall() == [(number,)]
    before = content(path)
    assert len(before["sweep"][1]) == 2
    with Index.open(f"sqlite:///{path}") as index:
        assert index.faults() == []
        assert index.statistics()["sealed_files"] == len(before["sealed_file"][1]) >= 2
        assert {row.address for row in index.search(SearchQuery())} >= {"2026-03/s002"}
    with closing(sqlite3.connect(path)) as connection:
        assert connection.execute("SELECT version_num FROM alembic_version").fetchall() == [(revision.HEAD,)]
    assert as_before(content(path), before) == before
    kept = tmp_path / f"index.sqlite3.before-{number}"
    assert kept.exists() == (number != revision.HEAD)
    assert number == revision.HEAD or content(kept) == before
