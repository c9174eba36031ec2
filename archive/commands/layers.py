"""Layers of helium: a coverage only by the definition that a substrate of the archive carries."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Final

from archive.commands import opening
from archive.errors import BadRequest, UnknownAddress

if TYPE_CHECKING:
    from archive.lab import Archive
    from schemas.quantity import Quantity

__all__ = ["LAYER_WORDS", "NO_SUBSTRATE", "Layer", "layer_of"]

LAYER_WORDS: Final = frozenset({"layer", "layers"})

NO_SUBSTRATE: Final = (
    "a layer has no fixed size: it is what a substrate's record defines; name the substrate with --substrate NAME, "
    "or write the coverage in umol/m^2 or atoms/nm^2"
)


@dataclass(frozen=True)
class Layer:
    """What one layer means on a substrate: its coverage, the definition in words, and the address of the record."""

    coverage: Quantity
    definition: str
    address: str


def layer_of(reference: str, archive: Archive | Path | None) -> Layer:
    """Layer of a substrate.

    Parameters
    ----------
    reference : str
        Name (the newest revision) or address of a substrate.
    archive : Archive, Path or None
        An open archive, or the folder of one, or None for the one that is found.

    Raises
    ------
    UnknownAddress
        If the archive holds no such substrate.
    BadRequest
        If its record defines no layer.
    """
    from schemas.quantity import Quantity

    if archive is None or isinstance(archive, Path):
        with opening.open_archive(archive) as lab:
            return layer_of(reference, lab)
    rows = archive.records(name=reference, kind="substrate")
    if not rows:
        known = ", ".join(sorted({row.name for row in archive.records(kind="substrate")})) or "none yet"
        raise UnknownAddress(
            f"there is no substrate {reference} in this archive", expected=f"one of: {known}"
        )
    newest = max(rows, key=lambda row: row.revision)
    stated = newest.content.get("layer")
    if stated is None:
        raise BadRequest(
            f"the record {newest.address} does not say what one layer is",
            remedy="add layer and layer_definition in a new revision of the substrate",
        )
    return Layer(
        Quantity.read(stated, "coverage"), str(newest.content.get("layer_definition")), newest.address
    )
