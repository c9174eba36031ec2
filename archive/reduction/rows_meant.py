"""The rows that a remark about rows was made on."""

from __future__ import annotations

import hashlib

from schemas.lineage import SweepEntry

__all__ = ["digest_of_rows"]


def digest_of_rows(entry: SweepEntry) -> str:
    """SHA-256 over the digests of a sweep's channels: equal for equal rows, whoever describes them."""
    lines = "\n".join(sorted(f"{channel.name} {channel.digest}" for channel in entry.channels))
    return hashlib.sha256(lines.encode()).hexdigest()
