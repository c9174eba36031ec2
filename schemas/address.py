"""Addresses: how a thing in the archive is cited.

| thing | address |
|---|---|
| cooldown | `2026-03` |
| accession | `2026-03.a1` |
| amendment, withdrawal in a cooldown | `2026-03.m1`, `2026-03.w1` |
| raw file | `2026-03.a1:raw/ts05.csv` |
| sweep, dose | `2026-03/s017`, `2026-03/d03` |
| channel of a sweep | `2026-03/s017#period` |
| reduction | `2026-03/s017@film-transition.2` |
| array or result of a reduction | `2026-03/s017@film-transition.2#T_KT` |
| record or plan | `TO-4.r2` |
| withdrawal of a record's or plan's revision | `TO-4.r2.w1` |
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Literal

__all__ = ["Address", "AddressKind", "parse_address"]

AddressKind = Literal[
    "name", "accession", "raw", "item", "channel", "reduction", "output", "record", "amendment", "withdrawal",
]  # fmt: skip

_NAME = r"[A-Za-z0-9][A-Za-z0-9_-]{0,63}"
_PATTERN = re.compile(
    rf"""^(?P<head>{_NAME})
    (?:
        \.a(?P<accession>[1-9][0-9]{{0,5}})(?::(?P<raw>[^\x00-\x1f\x7f\\]{{1,500}}))?
      | \.m(?P<amendment>[1-9][0-9]{{0,5}})
      | \.w(?P<withdrawal>[1-9][0-9]{{0,5}})
      | \.r(?P<revision>[1-9][0-9]{{0,5}})(?:\.w(?P<taken_back>[1-9][0-9]{{0,5}}))?
      | /(?P<item>{_NAME})(?:@(?P<plan>{_NAME})\.(?P<number>[1-9][0-9]{{0,5}}))?(?:\#(?P<part>[A-Za-z0-9_][A-Za-z0-9_.-]{{0,99}}))?
    )?$""",
    re.VERBOSE,
)


@dataclass(frozen=True)
class Address:
    """One parsed address.

    Attributes
    ----------
    text : str
        The address as written.
    kind : str
        What it names; `name` is a cooldown or, without revision, a record.
    head, item, plan, part, raw : str or None
        Cooldown or record name; sweep or dose; plan; channel, array or result; raw file.
    number : int or None
        Accession, amendment, withdrawal, revision or reduction number.
    revision : int or None
        Revision that a withdrawal outside a cooldown is about.
    """

    text: str
    kind: AddressKind
    head: str
    item: str | None = None
    plan: str | None = None
    number: int | None = None
    part: str | None = None
    raw: str | None = None
    revision: int | None = None

    @property
    def sweep(self) -> str | None:
        """Address of the sweep or dose inside this address, `2026-03/s017`."""
        return None if self.item is None else f"{self.head}/{self.item}"

    @property
    def reduction(self) -> str | None:
        """Address of the reduction inside this address, without the part."""
        return None if self.plan is None else f"{self.head}/{self.item}@{self.plan}.{self.number}"


def parse_address(text: str) -> Address:
    """Address that a text spells.

    Raises
    ------
    ValueError
        If the text is no address; the message shows the forms.

    Examples
    --------
    >>> parse_address("2026-03/s017@film-transition.2#T_KT").kind
    'output'
    >>> parse_address("TO-4.r2").number
    2
    """
    match = _PATTERN.match(text)
    if match is None:
        shown = text if len(text) <= 80 else text[:77] + "..."
        raise ValueError(
            f"{shown!r} is no address; write a cooldown (2026-03), an accession (2026-03.a1), a sweep (2026-03/s017), "
            "a reduction (2026-03/s017@film-transition.2), one of its outputs (...#T_KT) or a record (TO-4.r2)"
        )
    group = match.groupdict()
    head = group["head"]
    if group["raw"] is not None:
        return Address(text, "raw", head, number=int(group["accession"]), raw=group["raw"])
    if group["accession"] is not None:
        return Address(text, "accession", head, number=int(group["accession"]))
    if group["amendment"] is not None:
        return Address(text, "amendment", head, number=int(group["amendment"]))
    if group["withdrawal"] is not None:
        return Address(text, "withdrawal", head, number=int(group["withdrawal"]))
    if group["taken_back"] is not None:
        number, revision = int(group["taken_back"]), int(group["revision"])
        return Address(text, "withdrawal", head, number=number, revision=revision)
    if group["revision"] is not None:
        return Address(text, "record", head, number=int(group["revision"]))
    if group["item"] is None:
        return Address(text, "name", head)
    if group["plan"] is not None:
        kind: AddressKind = "reduction" if group["part"] is None else "output"
        return Address(text, kind, head, group["item"], group["plan"], int(group["number"]), group["part"])
    kind = "item" if group["part"] is None else "channel"
    return Address(text, kind, head, group["item"], part=group["part"])
