"""`/at/...`: the page of whatever an address names."""

from __future__ import annotations

from collections.abc import Callable

from starlette.requests import Request
from starlette.responses import Response

from archive.errors import UnknownAddress
from archive.web.cooldown import cooldown
from archive.web.life import life
from archive.web.links import address_at
from archive.web.reduction import reduction
from archive.web.site import lab_of
from archive.web.sweep import sweep
from archive.web.thing import thing
from schemas.address import Address, AddressKind, parse_address

__all__ = ["AT", "at"]

AT: dict[AddressKind | str, Callable[[Request, Address], Response]] = {
    "cooldown": cooldown,
    "item": sweep,
    "channel": sweep,
    "reduction": reduction,
    "output": reduction,
    **dict.fromkeys(
        ("cell", "substrate", "sample", "thermometer", "calibration", "cryostat", "plan", "record"), life
    ),
}
"""The page of each kind of address, and of each kind of record by its word; what is not here is shown by `thing`."""


def at(request: Request) -> Response:
    """Answer with the page of an address.

    Raises
    ------
    UnknownAddress
        If the archive holds no such thing.
    """
    text = address_at(request.path_params["address"])
    try:
        address = parse_address(text)
    except ValueError as error:
        raise UnknownAddress(str(error)) from None
    return AT.get(_kind(request, address), thing)(request, address)


def _kind(request: Request, address: Address) -> str:
    """Return the kind of an address; that of a record is what the record is of, and `cooldown` stands for its name."""
    if address.kind not in ("name", "record"):
        return address.kind
    lab = lab_of(request)
    if address.kind == "name" and address.head in lab.cooldown_names():
        return "cooldown"
    rows = lab.records(name=address.head)
    return rows[0].kind if rows else "record"
