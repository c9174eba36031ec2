"""Time stamps against Python's own calendar and zones."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from typing import Any
from zoneinfo import ZoneInfo

import numpy as np
import pyarrow as pa
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from archive.errors import BadRequest
from archive.intake.timestamps import TimeStamps

T0 = datetime(2026, 3, 2, 7, 10, tzinfo=UTC).timestamp()


def seconds(text: str, **format_: Any) -> tuple[float, str | None]:
    """Return seconds and fault of one stamp."""
    values, faults = TimeStamps(**format_).seconds(pa.array([text]))
    return float(values[0]), faults.get(0)


GOOD = {
    "offset": ("2026-03-02T09:10:00+02:00", {"time_format": "iso8601"}, T0),
    "offset without colon": ("2026-03-02T09:10:00+0200", {"time_format": "iso8601"}, T0),
    "offset of hours": ("2026-03-02T04:10:00-03", {"time_format": "iso8601"}, T0),
    "UTC": ("2026-03-02T07:10:00Z", {"time_format": "iso8601"}, T0),
    "blanks": (" 2026-03-02 07:10:00 Z ", {"time_format": "iso8601"}, T0),
    "no seconds": ("2026-03-02T07:10Z", {"time_format": "iso8601"}, T0),
    "fraction": ("2026-03-02T07:10:00.25Z", {"time_format": "iso8601"}, T0 + 0.25),
    "fraction by comma": ("2026-03-02T07:10:00,125Z", {"time_format": "iso8601"}, T0 + 0.125),
    "nanoseconds": ("2026-03-02T07:10:00.000000001Z", {"time_format": "iso8601"}, T0),
    "zone of the dialect": (
        "2026-03-02T09:10:00",
        {"time_format": "iso8601", "time_zone": "Europe/Helsinki"},
        T0,
    ),
    "offset over zone": (
        "2026-03-02T07:10:00Z",
        {"time_format": "iso8601", "time_zone": "Europe/Helsinki"},
        T0,
    ),
    "epoch": ("1772435400.5", {"time_format": "epoch"}, 1772435400.5),
    "epoch by comma": ("-1,5", {"time_format": "epoch", "decimal": ","}, -1.5),
    "day first": (
        "2.3.2026 9:10:00",
        {"time_format": "%d.%m.%Y %H:%M:%S", "time_zone": "Europe/Helsinki"},
        T0,
    ),
    "twelve hours": ("03/02/26 07:10 AM", {"time_format": "%m/%d/%y %I:%M %p", "time_zone": "UTC"}, T0),
    "noon": ("03/02/26 12:00 pm", {"time_format": "%m/%d/%y %I:%M %p", "time_zone": "UTC"}, T0 + 17400),
    "midnight": ("03/02/26 12:00 am", {"time_format": "%m/%d/%y %I:%M %p", "time_zone": "UTC"}, T0 - 25800),
    "month by name": ("02-Mar-2026 07:10:00", {"time_format": "%d-%b-%Y %T", "time_zone": "UTC"}, T0),
    "day of the year": ("2026 061 0710", {"time_format": "%Y %j %H%M", "time_zone": "UTC"}, T0),
    "offset in a pattern": ("2026-03-02 09:10:00 +0200", {"time_format": "%F %T %z"}, T0),
    "year of two digits, 1969": ("01.01.69", {"time_format": "%d.%m.%y", "time_zone": "UTC"}, -365.0 * 86400),
    "leap day": (
        "2024-02-29T00:00:00Z",
        {"time_format": "iso8601"},
        datetime(2024, 2, 29, tzinfo=UTC).timestamp(),
    ),
    # The leap second at the end of 2016 (IERS Bulletin C 52); POSIX gives it the number of the next second.
    "leap second": (
        "2016-12-31T23:59:60Z",
        {"time_format": "iso8601"},
        datetime(2017, 1, 1, tzinfo=UTC).timestamp(),
    ),
    "leap second elsewhere": (
        "2017-01-01T01:59:60+02:00",
        {"time_format": "iso8601"},
        datetime(2017, 1, 1, tzinfo=UTC).timestamp(),
    ),
}


@pytest.mark.parametrize(("text", "format_", "expected"), GOOD.values(), ids=GOOD.keys())
def test_instants(text: str, format_: dict[str, Any], expected: float) -> None:
    assert seconds(text, **format_) == (expected, None)


BERLIN = {"time_format": "%Y-%m-%d %H:%M:%S", "time_zone": "Europe/Berlin"}
BAD = {
    "no offset": ("2026-03-02T09:10:00", {"time_format": "iso8601"}, "name its zone"),
    "unknown offset": ("2026-03-02T09:10:00-00:00", {"time_format": "iso8601"}, "offset is unknown"),
    "impossible offset": (
        "2026-03-02T09:10:00+25:00",
        {"time_format": "iso8601"},
        "offset that does not exist",
    ),
    "no time": ("2026-03-02", {"time_format": "iso8601"}, "not a time stamp"),
    "13 months": ("2026-13-02T09:10:00Z", {"time_format": "iso8601"}, "does not exist"),
    "30 February": ("2026-02-30T09:10:00Z", {"time_format": "iso8601"}, "does not exist"),
    "29 February": ("2026-02-29T09:10:00Z", {"time_format": "iso8601"}, "does not exist"),
    "24 hours": ("2026-02-03T24:00:00Z", {"time_format": "iso8601"}, "does not exist"),
    "60th second": ("2026-02-03T12:30:60Z", {"time_format": "iso8601"}, "no leap second"),
    "61st second": ("2026-02-03T23:59:61Z", {"time_format": "iso8601"}, "does not exist"),
    "empty": ("  ", {"time_format": "iso8601"}, "is empty"),
    "milliseconds": ("1772435400500", {"time_format": "epoch"}, "milliseconds"),
    "before the year 1": ("-1e11", {"time_format": "epoch"}, "outside the years 1 to 9999"),
    "year 0 in UTC": ("0001-01-01T00:30:00+11:00", {"time_format": "iso8601"}, "outside the years 1 to 9999"),
    "year 10000 in UTC": ("9999-12-31T23:30:00-11:00", {"time_format": "iso8601"}, "outside the years"),
    "epoch by name": ("now", {"time_format": "epoch"}, "not a number"),
    "day 366": ("2026 366", {"time_format": "%Y %j", "time_zone": "UTC"}, "does not exist"),
    "month of no name": ("02-Mrz-2026", {"time_format": "%d-%b-%Y", "time_zone": "UTC"}, "does not exist"),
    "13 pm": (
        "03/02/26 13:00 pm",
        {"time_format": "%m/%d/%y %I:%M %p", "time_zone": "UTC"},
        "does not exist",
    ),
    "more than the pattern": ("2026-03-02 09:10:00 x", BERLIN, "not a time stamp of the form"),
    "repeated, first second": ("2026-10-25 02:00:00", BERLIN, "occurred twice"),
    "repeated, last second": ("2026-10-25 02:59:59", BERLIN, "occurred twice"),
    "skipped, first second": ("2026-03-29 02:00:00", BERLIN, "never occurred"),
    "skipped, last second": ("2026-03-29 02:59:59", BERLIN, "never occurred"),
    "skipped, although stated": ("2026-03-29 02:30:00", BERLIN | {"fold": "later"}, "never occurred"),
}


@pytest.mark.parametrize(("text", "format_", "why"), BAD.values(), ids=BAD.keys())
def test_what_is_no_instant_is_reported(text: str, format_: dict[str, Any], why: str) -> None:
    value, fault = seconds(text, **format_)
    assert np.isnan(value)
    assert fault is not None
    assert why in fault


def test_the_sheet_says_which_of_two_hours_is_meant() -> None:
    # Clocks in Germany went from 03:00 CEST (UTC+2) to 02:00 CET (UTC+1) on 2026-10-25 (Directive 2000/84/EC).
    earlier, _ = seconds("2026-10-25 02:30:00", **BERLIN, fold="earlier")
    later, _ = seconds("2026-10-25 02:30:00", **BERLIN, fold="later")
    assert earlier == datetime(2026, 10, 25, 0, 30, tzinfo=UTC).timestamp()
    assert later == datetime(2026, 10, 25, 1, 30, tzinfo=UTC).timestamp()


@pytest.mark.parametrize(
    "text", ["2026-10-25 01:59:59", "2026-10-25 03:00:00", "2026-03-29 01:59:59", "2026-03-29 03:00:00"]
)
def test_the_seconds_beside_a_clock_change_are_plain(text: str) -> None:
    expected = datetime.fromisoformat(text).replace(tzinfo=ZoneInfo("Europe/Berlin")).timestamp()
    assert seconds(text, **BERLIN) == (expected, None)
    assert seconds(text, **BERLIN, fold="later") == (expected, None)


REFUSED = {
    "none": ({"time_format": None}, "not stated"),
    "no zone": ({"time_format": "%Y-%m-%d"}, "zone"),
    "unknown zone": ({"time_format": "iso8601", "time_zone": "Mars/Olympus"}, "not known"),
    "path for a zone": ({"time_format": "iso8601", "time_zone": "../../etc/passwd"}, "not known"),
    "no day": ({"time_format": "%H:%M:%S", "time_zone": "UTC"}, "no year and day"),
    "unknown directive": ({"time_format": "%Q", "time_zone": "UTC"}, "%Q"),
    "lone percent": ({"time_format": "%Y%m%d%", "time_zone": "UTC"}, "not a directive"),
    "twice": ({"time_format": "%Y%m%d%m", "time_zone": "UTC"}, "%m stands twice"),
    "two years": ({"time_format": "%Y%y%m%d", "time_zone": "UTC"}, "say the same"),
    "half a day": ({"time_format": "%Y%m%d %I", "time_zone": "UTC"}, "belong together"),
}


@pytest.mark.parametrize(("format_", "why"), REFUSED.values(), ids=REFUSED.keys())
def test_formats_that_name_no_instant_are_refused(format_: dict[str, Any], why: str) -> None:
    with pytest.raises(BadRequest, match=why):
        TimeStamps(**format_)


MOMENTS = st.datetimes(min_value=datetime(1950, 1, 1), max_value=datetime(2060, 1, 1))  # noqa: DTZ001 - local times
ZONES = st.sampled_from(
    ["Europe/Berlin", "America/New_York", "Australia/Lord_Howe", "Asia/Kolkata", "Pacific/Apia", "UTC"]
)


@settings(max_examples=150, deadline=None)
@given(st.lists(MOMENTS, min_size=1, max_size=5), ZONES, st.sampled_from([None, "earlier", "later"]))
def test_local_times_are_those_of_the_standard_library(moments: list[datetime], zone: str, fold: Any) -> None:
    stamps = TimeStamps(time_format="%Y/%m/%d %H:%M:%S.%f", time_zone=zone, fold=fold)
    values, faults = stamps.seconds(pa.array([moment.strftime("%Y/%m/%d %H:%M:%S.%f") for moment in moments]))
    for index, moment in enumerate(moments):
        aware = moment.replace(tzinfo=ZoneInfo(zone), fold=1 if fold == "later" else 0)
        skipped = aware.astimezone(UTC).astimezone(ZoneInfo(zone)).replace(tzinfo=None) != moment
        twice = aware.utcoffset() != aware.replace(fold=1 - aware.fold).utcoffset() and not skipped
        if skipped or (twice and fold is None):
            assert index in faults
        else:
            exact = (aware - datetime(1970, 1, 1, tzinfo=UTC)) / timedelta(seconds=1)
            assert index not in faults
            assert values[index] == pytest.approx(exact, abs=5e-7)  # two units in the last place of a double


EVEN = {
    "offset": ("iso8601", None, ["2026-03-01T23:59:59.250+02:00", "2026-03-02T00:00:00.750+02:00"]),
    "offsets that change": ("iso8601", None, ["2026-03-29T02:59:59+02:00", "2026-03-29T04:00:00+03:00"]),
    "local": ("iso8601", "Europe/Helsinki", ["2026-03-29 02:59:59", "2026-03-29 04:00:00"]),
    "month in letters": ("%d %b %Y %H:%M:%S.%f", "UTC", ["01 Mar 2026 10:00:00.5", "02 Mar 2026 10:00:00.5"]),
    "afternoon": ("%j/%Y %I:%M %p", "UTC", ["061/2026 12:30 pm", "062/2026 01:30 pm"]),
    "no such day": ("iso8601", None, ["2026-02-28T10:00:00Z", "2026-02-29T10:00:00Z"]),
    "leap second": ("iso8601", None, ["2016-12-31T23:59:60Z", "2016-12-31T23:58:60Z"]),
    "a letter for a digit": ("iso8601", None, ["2026-03-01T10:00:00Z", "2026-03-01T1O:00:00Z"]),
    "a colon for a digit": ("iso8601", None, ["2026-03-01T10:00:00Z", "2026-03-01T10:0:000Z"]),
}


@pytest.mark.parametrize(("time_format", "zone", "texts"), EVEN.values(), ids=EVEN.keys())
def test_stamps_that_are_written_alike_are_read_as_single_ones_are(time_format, zone, texts):
    """One more stamp with a blank before it is not like the others, so that all are read singly."""
    stamps = TimeStamps(time_format=time_format, time_zone=zone)
    even, even_faults = stamps.seconds(pa.array(texts))
    single, single_faults = stamps.seconds(pa.array([*texts, " " + texts[0]]))
    assert even.tobytes() == single[:-1].tobytes()
    assert even_faults == {index: why for index, why in single_faults.items() if index < len(texts)}
