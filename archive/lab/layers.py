"""What a layer of helium is on a substrate of the archive."""

from __future__ import annotations

from typing import TYPE_CHECKING

from archive.errors import BadRequest, UnknownAddress
from schemas.layers import Layer
from schemas.quantity import Quantity

if TYPE_CHECKING:
    from archive.lab.door import Archive

__all__ = ["layer_of"]


def layer_of(reference: str, lab: Archive) -> Layer:
    """Layer of a substrate.

    Parameters
    ----------
    reference : str
        Name (the newest revision) or address of a substrate.
    lab : Archive

    Raises
    ------
    UnknownAddress
        If the archive holds no such substrate.
    BadRequest
        If its record defines no layer.
    """
    rows = lab.records(name=reference, kind="substrate")
    if not rows:
        known = ", ".join(sorted({row.name for row in lab.records(kind="substrate")})) or "none yet"
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
