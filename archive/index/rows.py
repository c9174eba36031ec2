"""Writing rows: what every kind of document needs."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

from sqlalchemy import Connection, insert

from archive.errors import DamagedFile
from archive.index import queries, tables
from schemas.kinds import kind_of
from schemas.lineage import Value
from schemas.quantity import Quantity

__all__ = ["add_rows", "seal_row", "si_value"]


def add_rows(connection: Connection, table: type[tables.Base], rows: Iterable[Mapping[str, Any]]) -> None:
    """Add rows to a table."""
    found = list(rows)
    if found:
        connection.execute(insert(table), found)


def seal_row(
    connection: Connection, address: str, document: str, *, key: str, sha256: str, size: int
) -> bool:
    """Add the row of a sealed file; False when the same file is there already.

    Raises
    ------
    DamagedFile
        If the index holds this file with another digest, size or address.
    """
    known = connection.execute(queries.sealed_file(key)).first()
    if known is None:
        row = {"key": key, "document": document, "address": address, "sha256": sha256, "size": size}
        add_rows(connection, tables.SealedFile, [row])
        return True
    if (known.sha256, known.size, known.address) == (sha256, size, address):
        return False
    raise DamagedFile(
        "the index holds this sealed file with other bytes",
        file=key,
        expected=f"{known.address}, {known.size} bytes, sha256 {known.sha256}",
        found=f"{address}, {size} bytes, sha256 {sha256}",
        remedy="a sealed file never changes: keep both, and find out which one was sealed before anything else is done",
    )


def si_value(value: Value | None, quantity: str) -> tuple[float | None, float | None]:
    """Value and standard uncertainty in the SI unit of a quantity kind; None where there is none."""
    if value is None or value.value is None:
        return None, None
    try:
        if value.unit in kind_of(quantity).si:
            # The usual case; asking for no factor keeps the units library unloaded.
            return value.value, value.uncertainty
        # A product of floats would miss the nearest one, and with it a search whose bound is that very number.
        stated = Quantity(value=value.value, unit=value.unit, kind=quantity, uncertainty=value.uncertainty)
    except ValueError:
        return None, None
    return stated.si, stated.si_uncertainty
