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
    )?\Z""",
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
    return _of_thing(text, group) if group["item"] is None else _of_item(text, group)


def _of_thing(text: str, group: dict[str, str | None]) -> Address:
    """Address of a cooldown, a record, or something with a number of its own."""
    head = group["head"] or ""
    kinds: tuple[tuple[str, AddressKind], ...] = (
        ("accession", "accession"),
        ("amendment", "amendment"),
        ("withdrawal", "withdrawal"),
        ("taken_back", "withdrawal"),
        ("revision", "record"),
    )
    for name, kind in kinds:
        number = group[name]
        if number is not None:
            revision = int(group["revision"] or 0) if name == "taken_back" else None
            raw = group["raw"]
            return Address(
                text, kind if raw is None else "raw", head, number=int(number), raw=raw, revision=revision
            )
    return Address(text, "name", head)


def _of_item(text: str, group: dict[str, str | None]) -> Address:
    """Address of a sweep or dose, or of something inside it."""
    head, part = group["head"] or "", group["part"]
    if group["plan"] is not None:
        kind: AddressKind = "reduction" if part is None else "output"
        return Address(text, kind, head, group["item"], group["plan"], int(group["number"] or 0), part)
    return Address(text, "item" if part is None else "channel", head, group["item"], part=part)
