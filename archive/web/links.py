"""Addresses in the archive as addresses in the browser, both ways.

| thing | address | path |
|---|---|---|
| sweep | `2026-03/s017` | `/at/2026-03/s017` |
| reduction | `2026-03/s017@film-transition.2` | `/at/2026-03/s017@film-transition.2` |
| result | `2026-03/s017@film-transition.2#T_KT` | `/at/2026-03/s017@film-transition.2/T_KT` |
| channel | `2026-03/s017#period` | `/at/2026-03/s017/period` |
| raw file | `2026-03.a1:raw/ts05.csv` | `/at/2026-03.a1:raw/ts05.csv` |
"""

from __future__ import annotations

from urllib.parse import quote

__all__ = ["address_at", "path_of"]


def path_of(address: str) -> str:
    """Return the path of the page on a thing.

    Examples
    --------
    >>> path_of("2026-03/s017@film-transition.2#T_KT")
    '/at/2026-03/s017@film-transition.2/T_KT'
    >>> path_of("2026-03.a1:raw/50 % #1.csv")
    '/at/2026-03.a1:raw/50%20%25%20%231.csv'
    """
    if ":" in address:
        return "/at/" + quote(address, safe="/:@")
    head, mark, part = address.partition("#")
    return "/at/" + quote(head, safe="/:@") + (f"/{quote(part, safe='')}" if mark else "")


def address_at(path: str) -> str:
    """Return the address that a path behind `/at/` stands for; whether there is such a thing is another question.

    Examples
    --------
    >>> address_at("2026-03/s017@film-transition.2/T_KT"), address_at("2026-03.a1:raw/deep/ts05.csv")
    ('2026-03/s017@film-transition.2#T_KT', '2026-03.a1:raw/deep/ts05.csv')
    """
    if ":" in path:
        return path
    head, _, rest = path.partition("/")
    item, mark, part = rest.partition("/")
    return "/".join(each for each in (head, item) if each) + (f"#{part}" if mark else "")
