"""An index of very many sweeps, all like one invented cooldown: its rows are made by the index, then copied inside the database."""

from __future__ import annotations

import sqlite3
from contextlib import closing
from pathlib import Path
from typing import Any

from archive.index import Index
from tests.archive.index import documents as make

__all__ = ["EACH", "wide_index"]

EACH = 100
"""Sweeps of a cooldown, every other one with a transition."""

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


def wide_index(folder: Path, sweeps: int) -> Path:
    """Path of a new SQLite index of so many sweeps of five cells, a multiple of `EACH`; coverages and ranges spread evenly."""
    path = folder / "index.sqlite3"
    entries = tuple(_sweep(number) for number in range(EACH))
    documents: list[Any] = [make.accession(_NAME, sweeps=entries)]
    documents += [
        make.reduction(f"{_NAME}/s{number:03}", outputs=(make.output(value=0.35 + number / 250),))
        for number in range(0, EACH, 2)
    ]
    with Index.create(f"sqlite:///{path}") as index:
        index.rebuild([make.entry(document) for document in documents])
    with closing(sqlite3.connect(path)) as connection:
        for number in range(1, sweeps // EACH):
            _copy(connection, f"2{number:03}-{number:04}", number)
        connection.commit()
    return path


def _sweep(number: int) -> dict[str, Any]:
    return make.sweep(
        f"s{number:03}",
        cell=f"TO-{number % 5 + 1}.r1",
        coverage=make.number(25e-6 + number * 0.4e-6, "mol/m^2", uncertainty=0.06e-6),
        temperature_low=make.number(0.05 + number % 7 * 0.01, "K", scale="ITS-90"),
        temperature_high=make.number(0.5 + number / 100, "K", scale="ITS-90"),
    )


def _copy(connection: sqlite3.Connection, name: str, number: int) -> None:
    """Copy the rows of the one cooldown under another name, its films a little thicker."""
    for table, named in _COPIED:
        columns = [row[1] for row in connection.execute(f"PRAGMA table_info({table})")]
        taken = [f"replace({each}, '{_NAME}', '{name}')" if each in named else each for each in columns]
        if table == "sweep":
            place = columns.index("coverage_mol_per_m2")
            taken[place] = f"coverage_mol_per_m2 + {number % 1000} * 1e-9"
        where = {"sealed_file": "address", "cooldown": "name"}.get(table, named[0])
        connection.execute(
            f"INSERT INTO {table} SELECT {', '.join(taken)} FROM {table} WHERE {where} GLOB '{_NAME}*'"  # noqa: S608 - names of this module
        )
