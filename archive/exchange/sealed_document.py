"""A sealed file as packages and provenance need it: key, digest, size, and what it says about itself."""

from __future__ import annotations

from dataclasses import dataclass

from archive.exchange.closure import address_of_key
from schemas.base import Record

__all__ = ["SealedDocument"]


@dataclass(frozen=True)
class SealedDocument:
    """A sealed file and its document.

    Attributes
    ----------
    key : str
        Its name in the store.
    sha256 : str
        Digest of all its bytes.
    size : int
        Number of bytes.
    document : Record
        What it says about itself.
    because : str
        Why it is here: asked for, or what rests on it.
    """

    key: str
    sha256: str
    size: int
    document: Record
    because: str = "asked for"

    @property
    def address(self) -> str:
        """Address of the document."""
        return address_of_key(self.key)

    @property
    def format(self) -> str:
        """Format of the document, such as `stillroom-accession/1`."""
        return str(getattr(self.document, "format", ""))
