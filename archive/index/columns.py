"""Column types that hold the same value, and sort alike, on SQLite and on PostgreSQL.

Rules
-----
* Text is compared byte by byte on both engines (SQLite's BINARY, PostgreSQL's "C"), so that one order holds everywhere.
* A time is stored as UTC text of fixed width with microseconds: it sorts as text, and both engines return it equal.
* Structured content is stored as JSON text in one spelling, so that equal content is an equal row.
* SQLite tables are STRICT, which knows INTEGER, REAL and TEXT only.
"""

from __future__ import annotations

import json
from datetime import UTC, datetime
from typing import Any

from sqlalchemy import BigInteger, Double, Integer, Text
from sqlalchemy.dialects import postgresql, sqlite
from sqlalchemy.engine import Dialect
from sqlalchemy.types import TypeDecorator, TypeEngine
from typing_extensions import override

__all__ = ["COUNT", "FLAG", "JSON", "REAL", "TEXT", "TIME", "UnreadableError", "utc_text"]

_TEXT = Text().with_variant(postgresql.TEXT(collation="C"), "postgresql")
REAL: TypeEngine[float] = Double().with_variant(sqlite.REAL(), "sqlite")
COUNT = BigInteger().with_variant(Integer(), "sqlite")


class UnreadableError(ValueError):
    """A stored value cannot be what was written: the index is damaged."""


class _PlainText(TypeDecorator[str]):
    """Text without the character that PostgreSQL cannot store (U+0000); its visible symbol U+2400 stands for it."""

    impl = _TEXT
    cache_ok = True

    @override
    def process_bind_param(self, value: str | None, dialect: Dialect) -> str | None:
        return None if value is None else value.replace("\x00", "\N{SYMBOL FOR NULL}")


class _UtcTime(TypeDecorator[datetime]):
    impl = _TEXT
    cache_ok = True

    @override
    def process_bind_param(self, value: datetime | None, dialect: Dialect) -> str | None:
        return None if value is None else utc_text(value)

    @override
    def process_result_value(self, value: str | None, dialect: Dialect) -> datetime | None:
        if value is None:
            return None
        try:
            return datetime.fromisoformat(value).astimezone(UTC)
        except ValueError as fault:
            raise UnreadableError(f"found {value!r} where a time is stored") from fault


class _Json(TypeDecorator[Any]):
    impl = _TEXT
    cache_ok = True

    @override
    def process_bind_param(self, value: Any, dialect: Dialect) -> str | None:
        if value is None:
            return None
        return json.dumps(value, sort_keys=True, separators=(",", ":"), allow_nan=False)

    @override
    def process_result_value(self, value: str | None, dialect: Dialect) -> Any:
        if value is None:
            return None
        try:
            return json.loads(value)
        except ValueError as fault:
            raise UnreadableError(f"found {value[:40]!r} where JSON is stored") from fault


class _Flag(TypeDecorator[bool]):
    impl = Integer
    cache_ok = True

    @override
    def process_bind_param(self, value: bool | None, dialect: Dialect) -> int | None:
        return None if value is None else int(value)

    @override
    def process_result_value(self, value: int | None, dialect: Dialect) -> bool | None:
        return None if value is None else bool(value)


TEXT = _PlainText()
TIME = _UtcTime()
JSON = _Json()
FLAG = _Flag()


def utc_text(moment: datetime) -> str:
    """UTC text of an instant, of fixed width.

    Raises
    ------
    ValueError
        If the time has no offset: it would be an instant only by guessing.
    OverflowError
        If it is out of the calendar in UTC.
    """
    if moment.tzinfo is None:
        raise ValueError(f"{moment.isoformat()} has no offset from UTC")
    return moment.astimezone(UTC).isoformat(timespec="microseconds").replace("+00:00", "Z")
