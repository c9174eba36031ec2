"""Fields of a sheet by address and path: what an amendment speaks of.

A path joins names by dots. In a list a name is that of the thing (`gauge.PG1.zero`) or its number from 1
(`corrections.1.value`). What decides how a file was read cannot be amended: its rows were parsed and sealed by it.
"""

from __future__ import annotations

import copy
from typing import Any

from schemas.acts import Change
from schemas.address import parse_address

__all__ = ["changed_content", "check_path", "value_at"]

Content = dict[str, Any]

_PARSED_BY = frozenset({"column", "sentinels", "nan", "dialect", "files"})
_SUPPLEMENT = "correct the sheet in the cooldown's folder and ingest it again; that makes a supplement"
_ELSEWHERE = {
    "record": "a record is revised: stillroom revise",
    "sweep": "name the sweep by its address, such as 2026-03/s017",
    "dose": "name the dose by its address, such as 2026-03/d03",
    "left_out": "write [[left_out]] with the sweep, its rows and the reason",
    "waiver": "a waiver is given in the sheet: ingest a supplement",
    "format": "the format is not a matter of the data",
    "name": "what has a name keeps it: it stands in addresses",
}


def check_path(change: Change, cooldown: str) -> None:
    """Refuse a change that is not about the cooldown, or about something that no amendment can change.

    Raises
    ------
    ValueError
        With what is wrong and what to do instead.
    """
    address = parse_address(change.address)
    if address.kind not in ("name", "item", "channel") or address.head != cooldown:
        raise ValueError(
            f"address: found {change.address!r}, expected {cooldown}, or a dose, sweep or channel of it "
            f"such as {cooldown}/d03"
        )
    parts = change.field.split(".")
    if parts[0] in _ELSEWHERE or parts[-1] == "name":
        raise ValueError(f"{change.field} cannot be amended; {_ELSEWHERE.get(parts[0], _ELSEWHERE['name'])}")
    parsed = _PARSED_BY.intersection(parts) or (address.kind == "item" and parts[0] == "layout")
    if parsed:
        raise ValueError(f"{change.field} decided how the file was read and cannot be amended; {_SUPPLEMENT}")


def value_at(content: Content, change: Change) -> Any:
    """What a sheet says where a change would be made; None where it says nothing.

    Parameters
    ----------
    content : dict
        The sheet as JSON values, every field of it.
    change : Change

    Raises
    ------
    ValueError
        If the sheet has no such dose, sweep, channel or field.
    """
    # Looking up a channel of a layout gives the sweep a copy of it.
    here: Any = _holder(copy.deepcopy(content) if "#" in change.address else content, change.address)
    for part in change.field.split("."):
        here = _step(here, part, change.field)
    return here


def changed_content(content: Content, change: Change) -> Content:
    """A copy of a sheet, as JSON values, with one change made.

    Raises
    ------
    ValueError
        As `value_at`.
    """
    made = copy.deepcopy(content)
    here: Any = _holder(made, change.address)
    *parts, last = change.field.split(".")
    for part in parts:
        here = _step(here, part, change.field)
    _step(here, last, change.field)
    new = None if change.remove else change.value
    if isinstance(here, list):
        here[_place(here, last, change.field)] = new
    else:
        here[last] = new
    return made


def _holder(content: Content, text: str) -> Content:
    """The table that an address stands for; a channel that only the layout describes becomes the sweep's own."""
    address = parse_address(text)
    if address.item is None:
        return content
    for kind in ("dose", "sweep"):
        for each in content[kind]:
            if each["name"] == address.item:
                table: Content = each
                return table if address.part is None else _channel(content, table, address.part, text)
    names = ", ".join(each["name"] for kind in ("sweep", "dose") for each in content[kind])
    raise ValueError(f"address: the sheet has no sweep or dose {address.item}; it has {names}")


def _channel(content: Content, sweep: Content, name: str, text: str) -> Content:
    own: dict[str, Content] = sweep.get("channels") or {}
    shared = content["layout"].get(sweep.get("layout"), {}).get("channels", {})
    if name not in own and name not in shared:
        raise ValueError(f"address: {text} is no channel; the sweep has {', '.join({**shared, **own})}")
    sweep["channels"] = {**own, name: own.get(name) or copy.deepcopy(shared[name])}
    found: Content = sweep["channels"][name]
    return found


def _step(here: Any, part: str, path: str) -> Any:
    if isinstance(here, dict):
        if part not in here:
            raise ValueError(f"field: {path}: there is no {part}; there is {', '.join(map(str, here))}")
        return here[part]
    if isinstance(here, list):
        return here[_place(here, part, path)]
    raise ValueError(f"field: {path}: nothing lies below {part!r}")


def _place(here: list[Any], part: str, path: str) -> int:
    names = [each.get("name") if isinstance(each, dict) else None for each in here]
    if part in names:
        return names.index(part)
    if part.isdigit() and 1 <= int(part) <= len(here):
        return int(part) - 1
    known = ", ".join(str(name or number) for number, name in enumerate(names, 1)) or "nothing"
    raise ValueError(f"field: {path}: the list has no {part}; it has {known}")
