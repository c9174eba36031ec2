"""Putting a package together: sealed files verbatim, readable files beside them, crate and citation, all in a bag."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path

from archive.exchange.about import About, about
from archive.exchange.bag_writing import new_bag
from archive.exchange.citation import citation_cff, datacite_json
from archive.exchange.contents import sealed_path, sidecars
from archive.exchange.crate import CRATE_NAME, crate
from archive.exchange.readme import readme
from archive.exchange.sealed_document import SealedDocument
from schemas.deposit import Deposit

__all__ = ["Origin", "packed"]


@dataclass(frozen=True)
class Origin:
    """Where a package comes from, for `bag-info.txt`.

    Attributes
    ----------
    archive : str
        Name of the archive.
    software : str
        Program with its version.
    packed : datetime
        When; the only moment in a package that is not one of its documents'.
    """

    archive: str
    software: str
    packed: datetime


def packed(
    target: Path,
    asked: Sequence[str],
    sealed: Sequence[SealedDocument],
    *,
    deposit: Deposit,
    origin: Origin,
    blocks: Callable[[str], Iterator[bytes]],
    text: Callable[[str], str],
    raw: Callable[[str, str], Iterator[bytes]],
    reports: Mapping[str, bytes],
    progress: Callable[[int, int, str], None],
) -> tuple[About, int, int, tuple[str, ...]]:
    """Return what was packed into a new bag at `target`: what it is about, its bytes and number of files, and what was swept.

    Parameters
    ----------
    target : Path
        A free name or an empty folder.
    asked : sequence of str
        Addresses asked for; none for a whole archive.
    sealed : sequence of SealedDocument
        In the order of recording, with all that they rest on.
    deposit, origin
        What the archive states about authors and itself.
    blocks, text, raw : callable
        Bytes of a key's file, text of its document, bytes of a raw file in it.
    reports : mapping of str to bytes
        Reports by name.
    progress : callable
        Told ``(done, of, key)``.

    Raises
    ------
    BadRequest
        If `target` is taken or cannot be written to; nothing of the package stays.
    DamagedFile
        If a sealed file has not the digest that is recorded of it; nothing of the package stays.
    """
    told = about(asked, sealed, deposit)
    with new_bag(target) as bag:
        for done, each in enumerate(sealed):
            progress(done, len(sealed), each.key)
            bag.add(sealed_path(each.key), blocks(each.key), sha256=each.sha256)
        progress(len(sealed), len(sealed), "")
        for path, content in sidecars(asked, sealed, text=text, raw=raw):
            bag.add(path, [content])
        for name, content in sorted(reports.items()):
            bag.add(f"reports/{name}", [content])
        bag.add("README.txt", [readme(told, sealed, sealed_path(sealed[0].key)).encode()])
        if told.citable:
            bag.add("datacite.json", [datacite_json(told, [each.address for each in sealed]).encode()])
            bag.add("CITATION.cff", [citation_cff(told).encode()])
        bag.add(CRATE_NAME, [crate(told, sealed, bag.files).encode()])
        size, number = bag.octets
        bag.finish(
            [
                ("Source-Organization", deposit.publisher or origin.archive),
                ("Internal-Sender-Description", f"archive {origin.archive}"),
                ("External-Description", told.title),
                *(("External-Identifier", address) for address in asked or ["everything"]),
                ("Bagging-Date", origin.packed.date().isoformat()),
                ("Bag-Software-Agent", origin.software),
            ]
        )
    return told, size, number, bag.swept
