"""Whether the index says what the sealed files say: row for row, against an index made anew beside it."""

from __future__ import annotations

import tempfile
from collections.abc import Collection, Iterator
from pathlib import Path

from archive.errors import ArchiveError
from archive.index import Index
from archive.index.index import Entry
from archive.lab.source import document_of
from archive.store.interface import Damage, SealedFile, Store

__all__ = ["INDEX", "index_damage"]

INDEX = "index"
"""What the index is called among damaged things."""


def index_damage(
    index: Index, store: Store, recorded: dict[str, SealedFile], hurt: Collection[str]
) -> list[Damage]:
    """Return where the index differs from what the whole sealed files say.

    Parameters
    ----------
    index : Index
    store : Store
    recorded : dict of str to SealedFile
        What the index records.
    hurt : collection of str
        Keys that are damaged or missing; while there are any, the index cannot be judged.

    Notes
    -----
    The index is derivable, so this is exact: a bit that was flipped in it and changes no row carried nothing.
    """
    if hurt:
        return []

    def entries() -> Iterator[Entry]:
        for key in sorted(recorded, key=lambda key: ("@" in key, key)):
            sealed = recorded[key]
            yield key, sealed.sha256, sealed.size, document_of(key, store.document(key))

    try:
        with (
            tempfile.TemporaryDirectory(prefix="stillroom-") as folder,
            Index.passing(Path(folder)) as fresh,
        ):
            fresh.rebuild(entries())
            unequal = [*index.faults(), *index.disagreements(fresh)]
    except ArchiveError as problem:
        return [Damage(INDEX, "damaged", f"the index cannot be held against the sealed files: {problem}")]
    return [
        Damage(
            INDEX,
            "damaged",
            f"{each}: it does not say what the sealed files say; run: stillroom rebuild-index",
        )
        for each in unequal
    ]
