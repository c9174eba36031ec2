"""Random stories told to both stores: the one on disk does what the reference does."""

from __future__ import annotations

import tempfile
from pathlib import Path

import numpy as np
from hypothesis import settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp
from hypothesis.stateful import RuleBasedStateMachine, invariant, rule

from archive.errors import ArchiveError
from archive.store import Column, MemoryStore, Store, Writer, open_store

KEYS = st.sampled_from(["2026-03/a", "2026-03/b@film.1", "2026-04/a", "2026-03/../x", "nul/a"])
NAMES = st.sampled_from(["T.csv", "log/T.csv", "log", "ü"])
FLOATS = hnp.arrays("f8", st.integers(0, 20), elements=st.floats(width=64))
LETTERS = st.characters(exclude_categories=["Cs"], exclude_characters="\0")
TEXTS = st.text(LETTERS, min_size=1, max_size=40)


class Stores(RuleBasedStateMachine):
    """Each rule is done to both stores; what each returns or refuses must be equal."""

    def __init__(self) -> None:
        super().__init__()
        self.folder = tempfile.TemporaryDirectory()
        self.local = open_store(Path(self.folder.name))
        self.memory = MemoryStore()

    def teardown(self) -> None:
        """Remove the folder."""
        self.folder.cleanup()

    @rule(
        key=KEYS,
        raws=st.lists(st.tuples(NAMES, st.lists(st.binary(max_size=50), max_size=3)), max_size=3),
        blocks=st.lists(FLOATS, max_size=3),
        text=TEXTS,
        seals=st.booleans(),
    )
    def write(
        self,
        key: str,
        raws: list[tuple[str, list[bytes]]],
        blocks: list[np.ndarray],
        text: str,
        seals: bool,  # noqa: FBT001 - drawn by name
    ) -> None:
        """Write a file, sealed or not."""

        def tell(writer: Writer) -> None:
            for name, parts in raws:
                writer.raw(name, parts)
            columns = [
                Column("T", "float64", "K", "K", "temperature", text),
                Column("s", "str", "", "", "", ""),
            ]
            table = writer.table("sweeps/s1", columns, index="T")
            for block in blocks:
                table.append({"T": block, "s": np.array([text] * len(block), dtype=str)})
            writer.document(text)
            if seals:
                writer.seal()

        assert self._told(self.local, key, tell) == self._told(self.memory, key, tell)

    @staticmethod
    def _told(store: Store, key: str, tell: object) -> str:
        try:
            with store.writer(key) as writer:
                tell(writer)  # type: ignore[operator]
        except ArchiveError as error:
            return error.code
        return "done"

    @invariant()
    def both_hold_the_same(self) -> None:
        """Compare all that can be read."""
        assert self.local.keys() == self.memory.keys()
        assert self.local.strays() == []
        for key in self.memory.keys(""):
            assert seen(self.local, key) == seen(self.memory, key)


def seen(store: Store, key: str) -> list[object]:
    """Return all that can be read of a sealed file."""
    found: list[object] = [store.document(key), store.tables(key), store.raw_names(key)]
    for name in store.raw_names(key):
        found += [b"".join(store.raw(key, name)), store.attributes(key, f"raw/{name}")]
    for group, columns in store.tables(key).items():
        found.append(store.attributes(key, group))
        for column in columns:
            values = store.column(key, f"{group}/{column}")
            found += [values.tobytes(), values.shape, store.attributes(key, f"{group}/{column}")]
    return found


Stores.TestCase.settings = settings(max_examples=25, stateful_step_count=8, deadline=None, database=None)
TestStores = Stores.TestCase
