"""One suite for every store: what is written comes back, names are kept, nothing is overwritten."""

from __future__ import annotations

import hashlib
from pathlib import Path

import numpy as np
import pytest

from archive.errors import AlreadySealed, BadRequest, MissingFile, UnknownAddress
from archive.store import Column, MemoryStore, SealedFile, Store, fixity, open_store

KEY = "2026-03/2026-03.a1"
COLUMNS = (
    Column("time", "float64", "s", "s", "time", "Time since the sweep began"),
    Column("period", "float64", "us", "us", "period", "Period of the oscillator"),
    Column("u_period", "float64", "us", "us", "period", "Its standard uncertainty", uncertainty_of="period"),
    Column("count", "int64", "", "1", "count", "Number of periods averaged"),
    Column("note", "str", "", "", "text", "What the operator wrote"),
)


@pytest.fixture(params=["memory", "local"])
def store(request: pytest.FixtureRequest, tmp_path: Path) -> Store:
    """Return an empty store of each kind."""
    return MemoryStore() if request.param == "memory" else open_store(tmp_path)


def rows(start: int, stop: int) -> dict[str, np.ndarray]:
    """Return invented rows of `COLUMNS`."""
    count = np.arange(start, stop)
    return {
        "time": count * 0.5,
        "period": 1000 + np.sin(count),
        "u_period": np.full(len(count), 1e-3),
        "count": count,
        "note": np.array([f"Füllung {i}" for i in count], dtype=str),
    }


def seal(store: Store, key: str = KEY, *, raw: bytes = b"T/K\n0.5\n", length: int = 10) -> SealedFile:
    """Return a small sealed file with something of every kind in it."""
    with store.writer(key) as writer:
        writer.raw("log/T.csv", [raw[:3], raw[3:]], media_type="text/csv")
        table = writer.table("sweeps/s017", COLUMNS, index="time")
        table.append(rows(0, length // 2))
        table.append(rows(length // 2, length))
        writer.array("fits/covariance", np.array([[4.0, 1.0], [1.0, 9.0]]), {"units": "us2", "order": 2})
        writer.document('{"name": "2026-03", "place": "Zürich"}')
        return writer.seal()


def test_everything_comes_back_as_it_was_written(store: Store) -> None:
    sealed = seal(store)
    assert store.describe(KEY) == sealed
    assert store.document(KEY) == '{"name": "2026-03", "place": "Zürich"}'
    assert store.tables(KEY) == {"sweeps/s017": [column.name for column in COLUMNS]}
    for name, values in rows(0, 10).items():
        column = store.column(KEY, f"sweeps/s017/{name}")
        assert column.tolist() == values.tolist()
        assert column.dtype.kind == values.dtype.kind
    np.testing.assert_array_equal(store.column(KEY, "fits/covariance"), [[4, 1], [1, 9]])
    assert store.raw_names(KEY) == ["log/T.csv"]
    assert b"".join(store.raw(KEY, "log/T.csv")) == b"T/K\n0.5\n"
    assert store.raw_digest(KEY, "log/T.csv") == hashlib.sha256(b"T/K\n0.5\n").hexdigest()
    assert store.verify(KEY, sealed.sha256) == []
    assert store.verify(KEY) == []


def test_attributes_say_what_the_numbers_mean(store: Store) -> None:
    seal(store)
    period = store.attributes(KEY, "sweeps/s017/period")
    assert {name: period[name] for name in ("units", "ucum", "quantity", "description", "uncertainty")} == {
        "units": "us",
        "ucum": "us",
        "quantity": "period",
        "description": "Period of the oscillator",
        "uncertainty": "u_period",
    }
    assert store.attributes(KEY, "sweeps/s017/u_period")["uncertainty_of"] == "period"
    table = store.attributes(KEY, "sweeps/s017")
    assert (table["index"], table["rows"], table["columns"]) == ("time", 10, [c.name for c in COLUMNS])
    array = store.attributes(KEY, "fits/covariance")
    assert (array["units"], array["order"]) == ("us2", 2)
    raw = store.attributes(KEY, "raw/log/T.csv")
    assert (raw["file_name"], raw["media_type"], raw["size"]) == ("log/T.csv", "text/csv", 8)


@pytest.mark.parametrize(
    ("start", "stop"), [(None, None), (2, 5), (None, 3), (8, None), (-2, None), (5, 5), (9, 99)]
)
def test_a_part_of_a_column(store: Store, start: int | None, stop: int | None) -> None:
    seal(store)
    for name, values in rows(0, 10).items():
        part = store.column(KEY, f"sweeps/s017/{name}", start, stop)
        assert part.tolist() == values[start:stop].tolist()


@pytest.mark.parametrize("size", [0, 1, 262_143, 262_144, 262_145, 600_001])
@pytest.mark.parametrize("block", [1000, 262_144, 1_000_000])
def test_raw_bytes_of_any_length_in_any_blocks(store: Store, size: int, block: int) -> None:
    data = np.random.default_rng(size).bytes(size)
    with store.writer(KEY) as writer:
        digest = writer.raw("lock-in.bin", (data[i : i + block] for i in range(0, size, block)))
        writer.document("{}")
        writer.seal()
    assert digest == hashlib.sha256(data).hexdigest() == store.raw_digest(KEY, "lock-in.bin")
    assert b"".join(store.raw(KEY, "lock-in.bin")) == data
    assert store.verify(KEY) == []


@pytest.mark.parametrize("length", [0, 1, 32_768, 32_769, 70_000])
def test_tables_of_any_length(store: Store, length: int) -> None:
    columns = COLUMNS[3:]
    values = {
        "count": np.arange(length) * 2**40,
        "note": np.array(["µ" * (i % 5) for i in range(length)], dtype=str),
    }
    with store.writer(KEY) as writer:
        table = writer.table("log", columns)
        for i in range(0, length, 9999):
            table.append({name: v[i : i + 9999] for name, v in values.items()})
        assert table.rows == length
        writer.document("{}")
        writer.seal()
    assert store.tables(KEY) == {"log": ["count", "note"]}
    for name, expected in values.items():
        np.testing.assert_array_equal(store.column(KEY, f"log/{name}"), expected)
    assert store.verify(KEY) == []


@pytest.mark.parametrize(
    "values",
    [
        np.array([0.0, -0.0, np.inf, -np.inf, np.nan, 5e-324, 1.7976931348623157e308]),
        np.frombuffer(bytes.fromhex("010000000000f87fffffffffffffff7f"), dtype="<f8"),
        np.array([-(2**63), 2**63 - 1]),
        np.arange(24, dtype=np.int16).reshape(2, 3, 4),
        np.arange(300_000, dtype=np.float32).reshape(3, 100_000),
        np.asfortranarray(np.arange(6.0).reshape(2, 3)),
        np.array(2.5),
        np.empty((0, 3)),
    ],
    ids=[
        "specials",
        "nan payloads",
        "int limits",
        "3-d",
        "larger than a chunk",
        "fortran",
        "scalar",
        "empty",
    ],
)
def test_arrays_come_back_bit_for_bit(store: Store, values: np.ndarray) -> None:
    with store.writer(KEY) as writer:
        writer.array("out/x", values, {})
        writer.document("{}")
        writer.seal()
    found = store.column(KEY, "out/x")
    assert (found.dtype, found.shape, found.tobytes()) == (values.dtype, values.shape, values.tobytes())
    assert store.verify(KEY) == []


@pytest.mark.parametrize(
    "text", [np.array("einzeln"), np.array([["a", ""], ["µ", "Ω "]])], ids=["one", "2-d"]
)
def test_arrays_of_text(store: Store, text: np.ndarray) -> None:
    with store.writer(KEY) as writer:
        writer.array("out/names", text, {})
        writer.document("{}")
        writer.seal()
    assert np.asarray(store.column(KEY, "out/names")).tolist() == text.tolist()


def test_a_caller_may_reuse_its_buffer(store: Store) -> None:
    with store.writer(KEY) as writer:
        table = writer.table("log", COLUMNS[3:4])
        buffer = np.array([1, 2])
        table.append({"count": buffer})
        buffer[:] = 7
        writer.document("{}")
        writer.seal()
    assert store.column(KEY, "log/count").tolist() == [1, 2]


def test_a_sealed_name_is_never_taken_again(store: Store) -> None:
    sealed = seal(store)
    with pytest.raises(AlreadySealed), store.writer(KEY):
        pytest.fail("a writer was given out")
    assert store.describe(KEY) == sealed


def test_of_two_writers_of_one_key_the_first_to_seal_wins(store: Store) -> None:
    with store.writer(KEY) as first, store.writer(KEY) as second:
        first.document('{"n": 1}')
        second.document('{"n": 2}')
        second.seal()
        with pytest.raises(AlreadySealed):
            first.seal()
    assert store.document(KEY) == '{"n": 2}'
    assert store.strays() == []


@pytest.mark.parametrize("end", ["exception", "abandon", "forgotten"])
def test_what_was_not_sealed_leaves_no_trace(store: Store, end: str) -> None:
    def write() -> None:
        with store.writer(KEY) as writer:
            writer.raw("a", [b"x" * 500_000])
            writer.document("{}")
            if end == "exception":
                raise ZeroDivisionError
            if end == "abandon":
                writer.abandon()

    if end == "exception":
        with pytest.raises(ZeroDivisionError):
            write()
    else:
        write()
    assert (store.keys(), store.contains(KEY), store.strays()) == ([], False, [])
    seal(store)
    assert store.keys() == [KEY]


def test_keys_are_sorted_and_selected_by_prefix(store: Store) -> None:
    for key in ("2026-03/b", "2026-10/a", "2026-03/a@film.1"):
        seal(store, key)
    assert store.keys() == ["2026-03/a@film.1", "2026-03/b", "2026-10/a"]
    assert store.keys("2026-03/") == ["2026-03/a@film.1", "2026-03/b"]


def test_absent_things_are_named(store: Store) -> None:
    with pytest.raises(MissingFile, match=r"2026-03\.a1"):
        store.document(KEY)
    seal(store)
    for read in (store.column, store.attributes):
        with pytest.raises(UnknownAddress, match="sweeps/s099/period"):
            read(KEY, "sweeps/s099/period")
    with pytest.raises(UnknownAddress, match=r"other\.csv"):
        list(store.raw(KEY, "other.csv"))
    with pytest.raises(UnknownAddress):
        store.column(KEY, "sweeps/s017")
    assert [d.kind for d in store.verify("2026-03/none")] == ["missing"]


@pytest.mark.parametrize(
    "block",
    [
        {"count": np.array([1])},
        {"count": np.array([1]), "note": np.array(["a"]), "more": np.array([1])},
        {"count": np.array([1, 2]), "note": np.array(["a"])},
        {"count": np.array([[1]]), "note": np.array([["a"]])},
        {"count": np.array([1.0]), "note": np.array(["a"])},
        {"count": np.array([2**63], dtype=np.uint64), "note": np.array(["a"])},
        {"count": np.array([True]), "note": np.array(["a"])},
        {"count": np.array([1]), "note": np.array([1])},
        {"count": np.array([1]), "note": np.array([None])},
        {"count": np.array([1]), "note": np.array(["a\0b"])},
        {"count": np.array([1]), "note": np.array(["\udcff"])},
    ],
    ids=["missing", "more", "ragged", "2-d", "float", "uint64", "bool", "number", "none", "nul", "surrogate"],
)
def test_a_block_that_does_not_fit_is_refused_whole(store: Store, block: dict[str, np.ndarray]) -> None:
    with store.writer(KEY) as writer:
        table = writer.table("log", COLUMNS[3:])
        with pytest.raises(BadRequest, match="log"):
            table.append(block)
        assert table.rows == 0
        table.append({"count": np.array([5]), "note": np.array(["a"])})
        writer.document("{}")
        writer.seal()
    assert store.column(KEY, "log/count").tolist() == [5]


def test_an_integer_that_float64_would_round_is_refused(store: Store) -> None:
    with store.writer(KEY) as writer:
        table = writer.table("log", COLUMNS[:1])
        with pytest.raises(BadRequest, match="too large"):
            table.append({"time": np.array([2**53 + 1])})


@pytest.mark.parametrize(
    ("columns", "index"),
    [
        ((), None),
        ((COLUMNS[0], COLUMNS[0]), None),
        (COLUMNS[:1], "period"),
        ((COLUMNS[2],), None),
        ((Column("a/b", "int64", "", "", "", ""),), None),
        ((Column("x", "complex128", "", "", "", ""),), None),  # type: ignore[arg-type]
        ((Column("x", "int64", "", "", "", "d" * 40_000),), None),
    ],
    ids=["none", "twice", "index", "uncertainty of nothing", "slash", "complex", "long description"],
)
def test_a_table_that_cannot_be_is_refused(
    store: Store, columns: tuple[Column, ...], index: str | None
) -> None:
    with store.writer(KEY) as writer, pytest.raises(BadRequest):
        writer.table("log", columns, index=index)


@pytest.mark.parametrize(
    "values",
    [np.array([1j]), np.array([True]), np.array([1], dtype=np.float16), np.array([b"x"]), np.array([{}])],
    ids=["complex", "bool", "half", "bytes", "object"],
)
def test_an_array_of_another_kind_is_refused(store: Store, values: np.ndarray) -> None:
    with store.writer(KEY) as writer, pytest.raises(BadRequest):
        writer.array("out/x", values, {})


@pytest.mark.parametrize("value", [True, None, "x" * 40_000, "a\0", 2**63, [1]], ids=repr)
def test_an_attribute_that_cannot_be_kept_is_refused(store: Store, value: object) -> None:
    with store.writer(KEY) as writer, pytest.raises(BadRequest, match="out/x:a"):
        writer.array("out/x", np.array([1]), {"a": value})  # type: ignore[dict-item]


def test_a_path_is_used_once(store: Store) -> None:
    with store.writer(KEY) as writer:
        writer.raw("a", [b"1"])
        writer.table("log", COLUMNS[:1])
        writer.array("fits/x", np.array([1.0]), {})
        writer.document("{}")
        for again in (
            lambda: writer.raw("a", [b"2"]),
            lambda: writer.raw("a/b", [b"2"]),
            lambda: writer.table("log", COLUMNS[:1]),
            lambda: writer.table("fits", COLUMNS[:1]),
            lambda: writer.array("log/x", np.array([1.0]), {}),
            lambda: writer.array("fits/x/y", np.array([1.0]), {}),
            lambda: writer.document("{}"),
        ):
            with pytest.raises(BadRequest, match="taken"):
                again()


def test_a_file_without_its_document_is_not_sealed(store: Store) -> None:
    with store.writer(KEY) as writer:
        with pytest.raises(BadRequest, match="empty"):
            writer.document("")
        with pytest.raises(BadRequest, match="document"):
            writer.seal()
    assert store.keys() == []


def test_a_sealed_or_abandoned_writer_takes_nothing_more(store: Store) -> None:
    with store.writer(KEY) as writer:
        table = writer.table("log", COLUMNS[:1])
        writer.document("{}")
        writer.seal()
        for late in (
            lambda: writer.raw("a", []),
            lambda: table.append({"time": np.array([1.0])}),
            writer.seal,
        ):
            with pytest.raises(BadRequest):
                late()
    assert store.verify(KEY) == []


def test_fixity_names_what_is_wrong_missing_and_unrecorded(store: Store) -> None:
    first, second = seal(store, "2026-03/a"), seal(store, "2026-03/b")
    seal(store, "2026-03/c")
    told: list[tuple[int, int, str]] = []
    recorded = {
        "2026-03/a": first,
        "2026-03/b": SealedFile("2026-03/b", "0" * 64, second.size),
        "2026-03/z": first,
    }
    damage = fixity(store, recorded, lambda *step: told.append(step))
    assert [(d.key, d.kind) for d in damage] == [
        ("2026-03/b", "damaged"),
        ("2026-03/z", "missing"),
        ("2026-03/c", "stray"),
    ]
    assert (damage[0].expected, damage[0].found) == ("0" * 64, second.sha256)
    assert told == [(0, 3, "2026-03/a"), (1, 3, "2026-03/b"), (2, 3, "2026-03/z"), (3, 3, "")]
