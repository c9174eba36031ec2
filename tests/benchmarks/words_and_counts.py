"""Free text, and the counts that lists and the state of an archive show, against bare SQL on the same index.

Words are searched for anywhere in what was written about a sweep, so that part of a serial number finds it, too. One search is for words
that most sweeps have, one for a word that none has and that has to be looked for everywhere.
"""

from __future__ import annotations

import sqlite3
import tempfile
from collections.abc import Callable
from contextlib import ExitStack, closing
from pathlib import Path

import numpy as np

from archive.index import Index, SearchQuery
from tests.benchmarks.harness import Benchmark, Size, Work
from tests.benchmarks.wide_index import wide_index

__all__ = ["COUNTS", "WORDS"]

_SWEEPS = {"small": 3_000, "default": 100_000, "full": 1_000_000}
_SHOWN = 50
_WORDS = ("onset film", "s017 superfluidity", "polyimide")

_NEWEST = "NOT EXISTS (SELECT 1 FROM sweep AS later WHERE later.address = sweep.address AND later.number > sweep.number)"
_TEXT = f"""SELECT address, coverage_mol_per_m2 FROM sweep WHERE {{}} AND {_NEWEST} ORDER BY "begin", address LIMIT {_SHOWN}"""  # noqa: S608 - words of this module
_COUNTS = (
    "SELECT count(*) FROM cooldown",
    "SELECT count(*) FROM accession",
    f"SELECT count(*), sum(rows) FROM sweep WHERE {_NEWEST}",  # noqa: S608 - as above
    "SELECT count(*) FROM (SELECT DISTINCT address FROM record)",
    "SELECT count(*), sum(size) FROM raw_file",
    "SELECT count(DISTINCT address) FROM plan",
    "SELECT count(*) FROM reduction",
    "SELECT count(*) FROM output WHERE rows IS NULL",
    "SELECT count(*), sum(size) FROM sealed_file",
)
_BY_COOLDOWN = """SELECT name, (SELECT count(*) FROM accession WHERE cooldown = cooldown.name),
        (SELECT count(DISTINCT name) FROM sweep WHERE cooldown = cooldown.name),
        (SELECT count(*) FROM reduction WHERE sweep >= cooldown.name || '/' AND sweep < cooldown.name || '0')
    FROM cooldown ORDER BY "begin", name"""

_Side = Callable[[], np.ndarray]


def _prepare(size: Size, sides: Callable[[Index, sqlite3.Connection], tuple[_Side, _Side]]) -> Work:
    with ExitStack() as held:
        folder = Path(held.enter_context(tempfile.TemporaryDirectory(prefix="stillroom-words-")))
        path = wide_index(folder, _SWEEPS[size])
        index = held.enter_context(Index.open(f"sqlite:///{path}"))
        connection = held.enter_context(closing(sqlite3.connect(f"file:{path}?mode=ro", uri=True)))
        subject, baseline = sides(index, connection)
        return Work(subject, baseline, _SWEEPS[size], held.pop_all().close)


def _words(index: Index, connection: sqlite3.Connection) -> tuple[_Side, _Side]:
    def subject() -> np.ndarray:
        found = [index.search(SearchQuery(text=words, limit=_SHOWN)) for words in _WORDS]
        return np.array([row.coverage for rows in found for row in rows])

    def baseline() -> np.ndarray:
        found = []
        for words in _WORDS:
            patterns = [f"%{word}%" for word in words.split()]
            sql = _TEXT.format(" AND ".join(["text LIKE ?"] * len(patterns)))
            found += connection.execute(sql, patterns).fetchall()
        return np.array([row[1] for row in found])

    return subject, baseline


def _counts(index: Index, connection: sqlite3.Connection) -> tuple[_Side, _Side]:
    def subject() -> np.ndarray:
        cooldowns = [(row.accessions, row.sweeps, row.reductions) for row in index.cooldowns()]
        return np.array([*index.statistics().values(), *np.ravel(cooldowns)])

    def baseline() -> np.ndarray:
        counted = [number for sql in _COUNTS for number in connection.execute(sql).fetchone()]
        cooldowns = [row[1:] for row in connection.execute(_BY_COOLDOWN)]
        return np.array([*counted, *np.ravel(cooldowns)])

    return subject, baseline


WORDS = Benchmark(
    name="words",
    description="free text: words of most sweeps, of some, of none; by date, fifty rows",
    subject="Index.search",
    baseline="sqlite3 alone, LIKE by hand, without what else a list shows",
    unit="sweeps",
    prepare=lambda size: _prepare(size, _words),
)

COUNTS = Benchmark(
    name="counts",
    description="how much of everything there is, and how many accessions, sweeps and reductions each cooldown has",
    subject="Index.statistics and Index.cooldowns",
    baseline="sqlite3 alone, counted by hand",
    unit="sweeps",
    prepare=lambda size: _prepare(size, _counts),
)
