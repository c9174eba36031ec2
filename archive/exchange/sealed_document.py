"""A sealed file as packages and provenance need it: key, digest, size, and what it says about itself."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from archive.exchange.closure import ASKED, address_of_key
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
    read : callable
        Reads the document of a key; whoever gives it decides how many are kept in memory.
    because : str
        Why it is here: asked for, or what rests on it.
    """

    key: str
    sha256: str
    size: int
    read: Callable[[str], Record]
    because: str = ASKED

    @property
    def document(self) -> Record:
        """What the file says about itself."""
        return self.read(self.key)

    @property
    def address(self) -> str:
        """Address of the document."""
        return address_of_key(self.key)

    @property
    def format(self) -> str:
        """Format of the document, such as `stillroom-accession/1`."""
        return str(getattr(self.document, "format", ""))
