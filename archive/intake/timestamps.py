"""Time stamps as text to POSIX seconds.

Rules: an instant is only what names its offset from UTC, or a local time together with its zone. An hour that the
clock ran through twice, or not at all, is reported and never guessed (the sheet may state which one is meant). What a
format means does not depend on the machine's language: month names are English.

Written after RFC 3339 (2002), sections 4.3, 5.6 and 5.7, and PEP 495 (2015) for repeated and skipped local times.
"""

from __future__ import annotations

import re
from datetime import datetime, timedelta, tzinfo
from typing import Any, Final, Literal
from zoneinfo import ZoneInfo

import numpy as np
import numpy.typing as npt
import pyarrow as pa
import pyarrow.compute as pc

from archive.errors import BadRequest
from archive.intake.cells import as_mask, numbers
from archive.intake.even_stamps import even_parts
from archive.intake.time_formats import time_pattern

__all__ = ["EARLIEST", "LATEST", "TimeStamps"]

_MONTHS: Final = ("jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec")
_EPOCH: Final = datetime(1970, 1, 1)  # noqa: DTZ001 - local times are naive until their zone is looked up
EARLIEST: Final = -62135596800.0 + 86400
"""POSIX time of 0001-01-02T00:00:00Z; a day later than the first date of RFC 3339, so that every zone can show it."""
LATEST: Final = 253402300800.0 - 86400
"""POSIX time of 9999-12-31T00:00:00Z; a larger number of seconds is no date that RFC 3339 can write in every zone."""

Ints = npt.NDArray[np.int64]
Faults = dict[int, str]


class TimeStamps:
    """Reader of one format of time stamps.

    Parameters
    ----------
    time_format : str or None
        `iso8601`, `epoch` (seconds since 1970-01-01T00:00:00Z), or a strptime pattern.
    time_zone : str or None
        IANA zone of stamps that carry no offset. A stamp that carries one is not moved by it.
    fold : {"earlier", "later"} or None
        Which instant is meant by a local time that occurred twice. None: it is reported.
    decimal : {".", ","}
        Decimal mark of epoch seconds.

    Raises
    ------
    BadRequest
        If the format is missing or cannot name an instant, or the zone is not known.

    Examples
    --------
    >>> stamps = TimeStamps(time_format="%d.%m.%Y %H:%M", time_zone="Europe/Helsinki")
    >>> seconds, faults = stamps.seconds(pa.array(["25.10.2026 02:59", "25.10.2026 03:30"]))
    >>> seconds.tolist()
    [1792886340.0, nan]
    >>> faults
    {1: 'occurred twice in Europe/Helsinki, when the clock was set back; state fold = "earlier" or "later"'}
    """

    def __init__(
        self,
        *,
        time_format: str | None,
        time_zone: str | None = None,
        fold: Literal["earlier", "later"] | None = None,
        decimal: Literal[".", ","] = ".",
    ) -> None:
        if time_format is None:
            raise BadRequest(
                "the table has a time column, but its format is not stated",
                field="dialect.time_format",
                expected="`iso8601`, `epoch`, or a pattern such as `%d.%m.%Y %H:%M:%S`",
            )
        self._format = time_format
        self._decimal = decimal
        self._fold = fold
        self._zone_name = time_zone
        self._zone = None if time_zone is None else _zone(time_zone)
        self._pattern = None if time_format == "epoch" else time_pattern(time_format)
        if (
            self._pattern is not None
            and time_format != "iso8601"
            and "(?P<z>" not in self._pattern
            and time_zone is None
        ):
            raise BadRequest(
                "local times name no instant without their zone",
                field="dialect.time_zone",
                expected="a zone such as `Europe/Helsinki` or `UTC`",
            )

    @property
    def epoch(self) -> bool:
        """Whether the stamps are numbers of seconds."""
        return self._pattern is None

    def seconds(
        self, texts: pa.StringArray, known: npt.NDArray[np.bool_] | None = None
    ) -> tuple[npt.NDArray[np.float64], Faults]:
        """Return POSIX seconds since 1970-01-01T00:00:00Z, and why a stamp has none.

        Parameters
        ----------
        texts : pyarrow.StringArray
            Time stamps without nulls; blanks around them are ignored.
        known : numpy.ndarray of bool, optional
            Cells that are explained already (sentinels); they are not among the faults.

        Returns
        -------
        seconds : numpy.ndarray of float64
            NaN where there is a fault. POSIX time counts 86400 seconds a day; a leap second (`:60`) gets the number
            of the second after it. A double resolves 0.24 microseconds in this century.
        faults : dict of int to str
            Reason per index, as the end of a sentence.
        """
        if self._pattern is None:
            return self._epoch(texts, known)
        part, fraction, matched = self._parts(texts)
        faults: Faults = {}
        whole, bad = _calendar_seconds(part, matched)
        self._note(faults, bad & matched, "names a day or time that does not exist")
        good = matched & ~bad
        offset, without = self._offsets(part, whole, good, faults)
        whole = whole - offset
        if "S" in part:
            # RFC 3339 section 5.7: second 60 only as the last of a UTC day.
            leap = good & (_integer(part["S"]) == 60)
            self._note(
                faults, leap & ~without & (whole % 86400 != 0), "has a 60th second that is no leap second"
            )
        for index in np.flatnonzero(~matched if known is None else ~matched & ~known):
            text = texts[int(index)].as_py().strip()
            faults[int(index)] = f"is not a time stamp of the form {self._format}" if text else "is empty"
        seconds = np.where(matched, whole + fraction, np.nan)
        self._note(
            faults, good & ((seconds < EARLIEST) | (seconds >= LATEST)), "lies outside the years 1 to 9999"
        )
        seconds[list(faults)] = np.nan
        return seconds, faults

    def _parts(
        self, texts: pa.StringArray
    ) -> tuple[dict[str, Any], npt.NDArray[np.float64], npt.NDArray[np.bool_]]:
        """Return the parts of stamps by name, fractions of seconds, and which stamps have the format at all."""
        pattern = self._pattern or ""
        even = even_parts(texts, re.compile(pattern, re.ASCII))
        if even is not None:
            part, width = even
            # Both powers and digits are exact in a double (below 1e9), so that the quotient is the nearest double.
            fraction = part["f"] / 10.0**width if "f" in part else np.zeros(len(texts))
            return part, fraction, np.ones(len(texts), dtype=np.bool_)
        groups = pc.extract_regex(pc.utf8_trim_whitespace(texts), pattern)
        matched = as_mask(groups.is_valid())
        part = {f.name: groups.field(i) for i, f in enumerate(groups.type)}
        return part, _fraction(part["f"]) if "f" in part else np.zeros(len(texts)), matched

    def _epoch(
        self, texts: pa.StringArray, known: npt.NDArray[np.bool_] | None
    ) -> tuple[npt.NDArray[np.float64], Faults]:
        values, absent, faults = numbers(texts, decimal=self._decimal, known=known)
        self._note(faults, absent, "is empty or NaN")
        with np.errstate(invalid="ignore"):
            far = (values < EARLIEST) | (values >= LATEST)
        self._note(
            faults,
            far,
            "is no number of seconds since 1970 (outside the years 1 to 9999; milliseconds, perhaps)",
        )
        values[far] = np.nan
        return values, faults

    def _offsets(
        self, part: dict[str, Any], local: Ints, good: npt.NDArray[np.bool_], faults: Faults
    ) -> tuple[Ints, npt.NDArray[np.bool_]]:
        """Return offsets from UTC in seconds, and which stamps have none."""
        offset = np.zeros(len(local), dtype=np.int64)
        stated = np.zeros(len(local), dtype=np.bool_)
        if "z" in part:
            zone = part["z"]
            stated = good & as_mask(pc.not_equal(zone, ""))
            unknown = stated & as_mask(pc.match_substring_regex(zone, "^-00:?(00)?$"))
            # RFC 3339 section 4.3: the local offset is unknown, so it cannot be told from local time.
            self._note(faults, unknown, "has the offset -00:00, which says that its offset is unknown")
            digits = pc.if_else(
                pc.match_substring_regex(zone, "^[+-]"), pc.replace_substring(zone, ":", ""), "+0000"
            )
            hours = _integer(pc.utf8_slice_codeunits(digits, 1, 3))
            minutes = _integer(pc.utf8_slice_codeunits(digits, 3, 5))
            self._note(faults, stated & ((hours > 23) | (minutes > 59)), "has an offset that does not exist")
            sign = np.where(as_mask(pc.starts_with(digits, "-")), -1, 1)
            offset = np.where(stated, sign * (3600 * hours + 60 * minutes), 0)
        bare = good & ~stated
        if self._zone is None:
            self._note(faults, bare, "has no offset from UTC; name its zone as time_zone in the dialect")
            return offset, bare
        places = np.flatnonzero(bare)
        found, why = _zone_offsets(local[places], self._zone, self._zone_name or "", self._fold)
        offset[places] = found
        faults.update({int(places[index]): reason for index, reason in why.items()})
        return offset, np.zeros(len(local), dtype=np.bool_)

    @staticmethod
    def _note(faults: Faults, where: npt.NDArray[np.bool_], why: str) -> None:
        for index in np.flatnonzero(where):
            faults.setdefault(int(index), why)


def _zone(name: str) -> tzinfo:
    # A zone is looked up as a file by the standard library, which refuses paths with ValueError.
    try:
        return ZoneInfo(name)
    except (ValueError, OSError, KeyError):
        raise BadRequest(
            "this time zone is not known",
            field="dialect.time_zone",
            found=name,
            expected="a zone of the IANA time zone database, such as `Europe/Helsinki`",
        ) from None


def _integer(texts: Any) -> Ints:
    """Return digits as numbers; an empty text, of a part that does not stand there, is 0."""
    if isinstance(texts, np.ndarray):
        return texts
    filled = pc.if_else(pc.equal(texts, ""), "0", pc.fill_null(texts, "0"))
    return np.asarray(pc.cast(filled, pa.int64()).to_numpy(zero_copy_only=False), dtype=np.int64)


def _fraction(texts: Any) -> npt.NDArray[np.float64]:
    width = np.asarray(
        pc.fill_null(pc.utf8_length(texts), 0).to_numpy(zero_copy_only=False), dtype=np.float64
    )
    return _integer(texts) / 10.0**width


def _month(texts: Any) -> Ints:
    short = pc.utf8_lower(pc.utf8_slice_codeunits(texts, 0, 3))
    return 1 + np.asarray(
        pc.fill_null(pc.index_in(short, pa.array(_MONTHS)), -1).to_numpy(zero_copy_only=False), dtype=np.int64
    )


def _calendar_seconds(
    part: dict[str, Any], matched: npt.NDArray[np.bool_]
) -> tuple[Ints, npt.NDArray[np.bool_]]:
    """Return seconds of the written calendar time since 1970-01-01T00:00:00 of the same clock, and what is none."""
    one = np.ones(len(matched), dtype=np.int64)
    if "Y" in part:
        year = _integer(part["Y"])
    else:
        year = _integer(part["y"])
        year = year + np.where(year < 69, 2000, 1900)  # the pivot of POSIX strptime, %y
    month = _month(part["b"]) if "b" in part else _integer(part["m"]) if "m" in part else one
    day = _integer(part["j"]) if "j" in part else _integer(part["d"])
    hour = _integer(part["H"]) if "H" in part else 0 * one
    minute = _integer(part["M"]) if "M" in part else 0 * one
    second = _integer(part["S"]) if "S" in part else 0 * one
    bad = (year < 1) | (month < 1) | (month > 12) | (day < 1) | (hour > 23) | (minute > 59) | (second > 60)
    if "I" in part:
        half = _integer(part["I"])
        bad |= (half < 1) | (half > 12)
        hour = half % 12 + np.where(
            as_mask(pc.equal(pc.utf8_lower(pc.fill_null(part["p"], "am")), "pm")), 12, 0
        )
    begin = ((np.where(bad, 1970, year) - 1970) * 12 + np.where(bad, 1, month) - 1).astype("datetime64[M]")
    end = (
        (begin.astype("datetime64[Y]") + np.timedelta64(1, "Y")).astype("datetime64[D]")
        if "j" in part
        else (begin + np.timedelta64(1, "M")).astype("datetime64[D]")
    )
    date = begin.astype("datetime64[D]") + (day - 1).astype("timedelta64[D]")
    bad |= date >= end
    seconds = date.astype(np.int64) * 86400 + hour * 3600 + minute * 60 + second
    return np.where(bad, 0, seconds), bad


def _zone_offsets(
    local: Ints, zone: tzinfo, name: str, fold: Literal["earlier", "later"] | None
) -> tuple[Ints, Faults]:
    """Return offsets of local times in a zone; a quarter of an hour without a change is looked up once."""
    faults: Faults = {}
    quarter, where = np.unique(local // 900, return_inverse=True)
    offsets = np.zeros(len(quarter), dtype=np.int64)
    steady = np.zeros(len(quarter), dtype=np.bool_)
    for index, number in enumerate(quarter.tolist()):
        seen = {
            _offset(zone, second, side) for second in (number * 900, number * 900 + 899) for side in (0, 1)
        }
        offsets[index], steady[index] = min(seen), len(seen) == 1
    result = offsets[where]
    for index in np.flatnonzero(~steady[where]).tolist():
        second = int(local[index])
        # PEP 495: of a repeated time fold 0 is the earlier instant and has the larger offset; in a gap the smaller.
        early, late = _offset(zone, second, 0), _offset(zone, second, 1)
        result[index] = late if fold == "later" and early > late else early
        if early < late:
            faults[index] = f"never occurred in {name}: the clock was set forward over it"
        elif early > late and fold is None:
            faults[index] = (
                f'occurred twice in {name}, when the clock was set back; state fold = "earlier" or "later"'
            )
    return result, faults


def _offset(zone: tzinfo, second: int, fold: int) -> int:
    offset = (_EPOCH + timedelta(seconds=second)).replace(tzinfo=zone, fold=fold).utcoffset()
    return 0 if offset is None else round(offset.total_seconds())
