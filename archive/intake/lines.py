"""Byte blocks of whole lines from a file, packed or not.

Rules: the source is read once, and every byte of it, as it stands in the file, goes to the listeners (digest, verbatim
storage) before anything else looks at it. A fault of the bytes ends the lines but not the reading: the listeners
still get the rest.
"""

from __future__ import annotations

import zlib
from collections.abc import Callable, Iterable, Iterator, Sequence
from typing import BinaryIO, Final

__all__ = ["LineBlocks"]

BLOCK_BYTES: Final = 1 << 20
READ_BYTES: Final = 1 << 20
LONGEST_LINE: Final = 1 << 20
"""A megabyte without a line end is no table; without this bound one line could fill the memory."""

_GZIP: Final = b"\x1f\x8b"
# First bytes of what people hand in for a text table by mistake. Signatures: RFC 8878, RFC 1952 (gzip), the HDF5
# file format specification (superblock), PKWARE's APPNOTE (zip), Unicode 16 section 23.8 (byte order marks).
_FOREIGN: Final = {
    b"\x89HDF\r\n\x1a\n": "an HDF5 file",
    b"\x93NUMPY": "a NumPy file",
    b"PK\x03\x04": "a zip archive (spreadsheets are such archives)",
    b"\xfd7zXZ\x00": "packed with xz",
    b"BZh": "packed with bzip2",
    b"\x28\xb5\x2f\xfd": "packed with Zstandard",
    b"\xff\xfe": "UTF-16 text",
    b"\xfe\xff": "UTF-16 text",
    b"%PDF-": "a PDF",
}


class LineBlocks:
    """Blocks of whole lines with the number of their first line.

    Parameters
    ----------
    source : binary file or iterable of bytes
        Read once, from where it stands.
    listeners : sequence of callables
        Each gets every chunk of the source as read.
    block_bytes : int
        About how long a block is; it ends on a line end.

    Notes
    -----
    Line ends are LF or CR LF, or CR alone if the first block holds no LF. In the blocks they are all LF, and the
    last line has one too. A byte order mark is taken off. Gzip is recognised by its first two bytes (RFC 1952
    section 2.3.1), whatever the name.
    """

    def __init__(
        self,
        source: BinaryIO | Iterable[bytes],
        *,
        listeners: Sequence[Callable[[bytes], object]] = (),
        block_bytes: int = BLOCK_BYTES,
    ) -> None:
        self._source = source
        self._listeners = tuple(listeners)
        self._block_bytes = block_bytes
        self._read_bytes = min(READ_BYTES, block_bytes)
        self._line = 1
        self._cr_only: bool | None = None
        self.fault: tuple[int, str, str] | None = None
        """Line, what stood there, and why the lines end here; None while all is well."""

    def __iter__(self) -> Iterator[tuple[int, bytes]]:
        """Yield (number of the first line, bytes) until the source or the first fault ends it."""
        raw = self._chunks()
        parts: list[bytes] = []
        size = 0
        begun = False
        for chunk in self._unpacked(raw):
            parts.append(chunk)
            size += len(chunk)
            if size < self._block_bytes:
                continue
            data = self._begin(b"".join(parts), begun=begun)
            begun = True
            if self.fault is not None:
                break
            cut = data.rfind(self._line_end(data)) + 1
            if cut:
                yield self._numbered(data[:cut])
            rest = data[cut:]
            if len(rest) > LONGEST_LINE + self._block_bytes:
                self._stop(
                    rest[:60], f"more than {LONGEST_LINE} bytes without a line end; this is no text table"
                )
                break
            parts, size = [rest], len(rest)
        else:
            data = self._begin(b"".join(parts), begun=begun)
            if self.fault is not None:
                # What the packing lost begins inside the last line, which therefore is not to be trusted.
                data = data[: data.rfind(self._line_end(data)) + 1]
            if data:
                yield self._numbered(data)
        for _ in raw:
            pass

    def _chunks(self) -> Iterator[bytes]:
        read = getattr(self._source, "read", None)
        chunks: Iterable[bytes] = self._source if read is None else iter(lambda: read(self._read_bytes), b"")
        for chunk in chunks:
            for listener in self._listeners:
                listener(chunk)
            yield chunk

    def _unpacked(self, raw: Iterator[bytes]) -> Iterator[bytes]:
        first = b""
        for chunk in raw:
            first += chunk
            if len(first) >= len(_GZIP):
                break
        if not first.startswith(_GZIP):
            if first:
                yield first
            yield from raw
            return
        unpack = zlib.decompressobj(wbits=31)
        for chunk in _chain(first, raw):
            data = chunk
            while data:
                if unpack.eof:
                    # RFC 1952 section 2.2: members follow each other; some writers fill up with zero bytes.
                    data = data.lstrip(b"\x00")
                    if not data:
                        break
                    unpack = zlib.decompressobj(wbits=31)
                try:
                    yield unpack.decompress(data, self._read_bytes)
                except zlib.error as error:
                    self._stop(b"", f"the packed data are damaged ({error})")
                    return
                data = unpack.unused_data if unpack.eof else unpack.unconsumed_tail
        if not unpack.eof:
            self._stop(b"", "the packed data end too early; the file is cut off")

    def _begin(self, data: bytes, *, begun: bool) -> bytes:
        if begun:
            return data
        for signature, what in _FOREIGN.items():
            if data.startswith(signature):
                self._stop(data[: len(signature)], f"this is {what}, not a text table in UTF-8 or Latin-1")
                return b""
        return data.removeprefix(b"\xef\xbb\xbf")

    def _line_end(self, data: bytes) -> bytes:
        if self._cr_only is None:
            if b"\n" in data:
                self._cr_only = False
            elif b"\r" in data[:-1]:  # a CR at the very end may be the first half of CR LF
                self._cr_only = True
        return b"\r" if self._cr_only else b"\n"

    def _numbered(self, data: bytes) -> tuple[int, bytes]:
        first = self._line
        if self._line_end(data) == b"\r":
            data = data.replace(b"\r", b"\n")
        elif b"\r" in data:
            data = data.replace(b"\r\n", b"\n")
        if not data.endswith(b"\n"):
            # The last line of the file; a CR there is half of a line end that was never finished.
            data = data.removesuffix(b"\r") + b"\n"
        self._line += data.count(b"\n")
        return first, data

    def _stop(self, found: bytes, why: str) -> None:
        self.fault = (self._line, found.decode("ascii", "backslashreplace"), why)


def _chain(first: bytes, rest: Iterator[bytes]) -> Iterator[bytes]:
    yield first
    yield from rest
