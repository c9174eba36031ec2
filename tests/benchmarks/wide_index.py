"""An index of very many sweeps, all like one invented cooldown: its rows are made by the index, then copied inside the database."""

from __future__ import annotations

import shutil
import sqlite3
import tempfile
from contextlib import closing
from functools import cache
from pathlib import Path
from typing import Any

from archive.index import Index
from tests.archive.index import documents as make

__all__ = ["CELLS", "EACH", "wide_index"]

EACH = 100
"""Sweeps of a cooldown, every other one with a transition."""

CELLS = tuple(f"TO-{number}.r1" for number in range(1, 6))

_NAME = "2000-0000"
_COPIED = (
    ("sealed_file", ("key", "address")),
    ("cooldown", ("name",)),
    ("accession", ("address", "cooldown", "key")),
    ("raw_file", ("accession",)),
    ("record", ("accession",)),
    ("sweep", ("accession", "address", "cooldown")),
    ("sweep_thermometer", ("accession",)),
    ("channel", ("accession",)),
    ("reduction", ("address", "key", "cooldown", "sweep")),
    ("reduction_input", ("reduction", "address")),
    ("step", ("reduction",)),
    ("output", ("reduction",)),
)
"""Tables, and the columns in which the cooldown's name stands."""

_ITS_OWN = {
    "coverage_mol_per_m2": "{column} + place.number % 1000 * 1e-9",
    "begin": "strftime('%Y-%m-%dT%H:%M:%f000Z', {column}, (-9 * place.number) || ' hours')",
    "end": "strftime('%Y-%m-%dT%H:%M:%f000Z', {column}, (-9 * place.number) || ' hours')",
}
"""What else differs in the copies of a sweep: a little thicker, and each cooldown earlier than the one before, overlapping."""

_KEPT = tempfile.TemporaryDirectory(prefix="stillroom-wide-index-")


def wide_index(folder: Path, sweeps: int) -> Path:
    """Path of a new SQLite index of so many sweeps of five cells, a multiple of `EACH`; coverages and ranges spread evenly."""
    return Path(shutil.copyfile(_made(sweeps), folder / "index.sqlite3"))


@cache
def _made(sweeps: int) -> Path:
    path = Path(_KEPT.name, f"{sweeps}.sqlite3")
    entries = tuple(_sweep(number) for number in range(EACH))
    documents: list[Any] = [make.accession(_NAME, sweeps=entries)]
    documents += [
        make.reduction(f"{_NAME}/s{number:03}", outputs=(make.output(value=0.35 + number / 250),))
        for number in range(0, EACH, 2)
    ]
    with Index.create(f"sqlite:///{path}") as index:
        index.rebuild([make.entry(document) for document in documents])
    with closing(sqlite3.connect(path, isolation_level=None)) as connection:
        _copy(connection, sweeps // EACH)
    return path


def _sweep(number: int) -> dict[str, Any]:
    return make.sweep(
        f"s{number:03}",
        cell=CELLS[number % len(CELLS)],
        begin=make.moment(number / 2),
        end=make.moment(number / 2 + 2),
        coverage=make.number(25e-6 + number * 0.4e-6, "mol/m^2", uncertainty=0.06e-6),
        temperature_low=make.number(0.05 + number % 7 * 0.01, "K", scale="ITS-90"),
        temperature_high=make.number(0.5 + number / 100, "K", scale="ITS-90"),
    )


def _copy(connection: sqlite3.Connection, cooldowns: int) -> None:
    """Copy the rows of the one cooldown under many other names."""
    connection.execute("PRAGMA synchronous = OFF")
    connection.execute("BEGIN")
    # Made again at the end: sorting once is cheaper than finding a place for every row.
    indices = connection.execute(
        "SELECT name, sql FROM sqlite_master WHERE type = 'index' AND sql IS NOT NULL"
    )
    made = indices.fetchall()
    for name, _ in made:
        connection.execute(f'DROP INDEX "{name}"')
    connection.execute("CREATE TEMPORARY TABLE place (number INTEGER PRIMARY KEY, name TEXT)")
    names = [(number, f"2{number:03}-{number:04}") for number in range(1, cooldowns)]
    connection.executemany("INSERT INTO place VALUES (?, ?)", names)
    for table, named in _COPIED:
        columns = [row[1] for row in connection.execute(f"PRAGMA table_info({table})")]
        taken = [
            f"replace(first.{each}, '{_NAME}', place.name)" if each in named else f'first."{each}"'
            for each in columns
        ]
        if table == "sweep":
            own = {each: how.format(column=f'first."{each}"') for each, how in _ITS_OWN.items()}
            taken = [own.get(each, plain) for each, plain in zip(columns, taken, strict=True)]
        where = {"sealed_file": "address", "cooldown": "name"}.get(table, named[0])
        connection.execute(
            f"INSERT INTO {table} SELECT {', '.join(taken)} FROM place CROSS JOIN {table} AS first WHERE first.{where} GLOB '{_NAME}*'"  # noqa: S608 - names of this module
        )
    for _, sql in made:
        connection.execute(sql)
    connection.execute("COMMIT")
