"""NumPy and HDF5 sources: what is read, what is refused, and that nothing outside the file is touched."""

from __future__ import annotations

import io
import pickle
import struct
import zipfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

import h5py
import numpy as np
import pytest

from archive.intake import hdf5_source, numpy_source
from archive.intake.dialect import Block, ColumnRequest
from archive.intake.sources import is_array_source, read_array_source


def number(column: str | int, *sentinels: str, nan: Any = "error", name: str = "x") -> ColumnRequest:
    """Return a request for a column of numbers."""
    return ColumnRequest(name, column, "number", sentinels, nan)


def whys(block: Block) -> str:
    """Return all reasons of a block as one text."""
    return "; ".join(cell.why for cell in block.bad_cells)


@pytest.fixture
def hdf5(tmp_path: Path) -> Path:
    """Return an HDF5 file with the usual kinds of data sets."""
    path = tmp_path / "run.h5"
    with h5py.File(path, "w") as file:
        file["run/T"] = np.array([1.5, np.nan, 9.9e37])
        file.create_dataset(
            "run/table", data=np.arange(6).reshape(3, 2), chunks=(2, 2), compression="gzip", shuffle=True
        )
        file["run/fields"] = np.array([(1.0, 7), (2.0, 8), (3.0, 9)], dtype=[("P", "<f8"), ("n", "<i4")])
        file["run/when"] = np.array(["2026-03-02T09:10:00+02:00", "", "yesterday"], dtype=h5py.string_dtype())
        file["run/note"] = np.array([b"a", b"b", b"\xc2\xb5"])
        file["run/stamp"] = np.array([1.7e9, 1.7e9 + 0.5, 1.7e12])
        file["run/short"] = np.array([1.0, 2.0])
        file["run/big_integers"] = np.array([2**53, 2**53 + 1, 3], dtype=np.int64)
        file["run/cube"] = np.zeros((2, 2, 2))
        file["run/complex"] = np.zeros(3, dtype=np.complex128)
        file["run/pointer"] = np.array([file["run"].ref] * 3, dtype=h5py.ref_dtype)
        file["soft"] = h5py.SoftLink("/run/T")
        file["hard"] = file["run/short"]
    return path


def test_columns_of_an_hdf5_file(hdf5: Path) -> None:
    block = read_array_source(
        hdf5,
        "raw/run.h5",
        [
            number("run/T", "9.9E37", nan="keep", name="T"),
            number("/run/table/2", name="second"),
            number("run/fields/n", name="field"),
            number("run/fields/1", name="numbered"),
            ColumnRequest("note", "run/note", "text"),
        ],
    )
    assert (block.bad_cells, block.bad_cell_count) == ([], 0)
    assert block.lines.tolist() == [1, 2, 3]
    assert block.columns["T"][0] == 1.5
    assert block.sentinel["T"].tolist() == [False, False, True]
    assert np.isnan(block.columns["T"][1:]).all()
    assert block.columns["second"].tolist() == [1.0, 3.0, 5.0]
    assert block.columns["field"].tolist() == [7.0, 8.0, 9.0]
    assert block.columns["numbered"].tolist() == [1.0, 2.0, 3.0]
    assert block.columns["note"].tolist() == ["a", "b", "µ"]


def test_bad_cells_of_an_hdf5_file_name_their_row(hdf5: Path) -> None:
    block = read_array_source(
        hdf5,
        "raw/run.h5",
        [
            number("run/T", name="T"),
            ColumnRequest("when", "run/when", "time"),
            ColumnRequest("stamp", "run/stamp", "time"),
            number("hard", name="short"),
            number("run/big_integers", name="n"),
        ],
    )
    found = [(cell.line, cell.column, cell.why.split()[:2]) for cell in block.bad_cells]
    assert found == [
        (2, "run/T", ["is", "NaN"]),
        (2, "run/when", ["is", "empty"]),
        (2, "run/big_integers", ["is", "an"]),
        (3, "run/when", ["is", "not"]),
        (3, "run/stamp", ["is", "no"]),
        (3, "hard", ["is", "missing:"]),
    ]
    # 2026-03-02 is day 20514 since 1970-01-01.
    assert block.columns["when"][0] == 20514 * 86400 + 7 * 3600 + 600
    assert block.columns["short"][:2].tolist() == [1.0, 2.0]
    assert all(len(column) == 3 for column in block.columns.values())


ABSENT = {
    "soft link": ("soft", "soft link"),
    "no such data set": ("run/Q", "no such data set"),
    "a group": ("run", "no such data set"),
    "a table whole": ("run/table", "2 columns"),
    "no such number": ("run/table/3", "no number 3"),
    "no such field": ("run/fields/Q", "no field Q"),
    "number without data set": (1, "write path and number"),
    "cube": ("run/cube", "3 dimensions"),
    "complex": ("run/complex", "do not hold|does not hold"),
    "references": ("run/pointer", "references"),
    "text for numbers": ("run/note", "text, not numbers"),
    "upwards": ("../run/T", "no such data set"),
}


@pytest.mark.parametrize(("column", "why"), ABSENT.values(), ids=ABSENT.keys())
def test_a_column_that_cannot_be_read_is_reported_beside_the_others(
    hdf5: Path, column: str | int, why: str
) -> None:
    block = read_array_source(hdf5, "run.h5", [number(column), number("run/short", name="good")])
    assert any(part in whys(block) for part in why.split("|"))
    assert block.columns["good"][:2].tolist() == [1.0, 2.0]
    assert np.isnan(block.columns["x"]).all()
    assert block.bad_cells[0].line == 0


SECRET = b"secret of another file, long enough to be read as doubles...."


def external_link(path: Path, other: Path) -> None:
    """Write a file whose column stands in another file."""
    with h5py.File(path, "w") as file:
        file["good"] = np.zeros(3)
        file["x"] = h5py.ExternalLink(str(other), "/x")


def external_storage(path: Path, other: Path) -> None:
    """Write a file whose data set keeps its bytes in another file."""
    with h5py.File(path, "w") as file:
        file.create_dataset("x", (4,), "f8", external=[(str(other), 0, 32)])


def virtual(path: Path, other: Path) -> None:
    """Write a file whose data set is made of another file's."""
    with h5py.File(path, "w") as file:
        layout = h5py.VirtualLayout((3,), "f8")
        layout[:] = h5py.VirtualSource(str(other), "x", (3,))
        file.create_virtual_dataset("x", layout)


def enormous(path: Path, _: Path) -> None:
    """Write a file that declares eight terabytes and stores none."""
    with h5py.File(path, "w") as file:
        file.create_dataset("x", (1 << 40,), "f8", chunks=(1024,))


def hollow(path: Path, _: Path) -> None:
    """Write a file that declares a quarter of a gigabyte and stores none."""
    with h5py.File(path, "w") as file:
        file.create_dataset("x", (1 << 25,), "f8", chunks=(1024,))


def circle(path: Path, _: Path) -> None:
    """Write a file whose groups hold each other, twice at every level."""
    with h5py.File(path, "w") as file:
        group = file.create_group("a")
        group["b"] = group
        group["c"] = group


def foreign_filter(path: Path, _: Path) -> None:
    """Write a file packed with a filter that needs a plugin (LZF is h5py's own, number 32000)."""
    with h5py.File(path, "w") as file:
        file.create_dataset("x", data=np.zeros(1000), chunks=(100,), compression="lzf")


def cut_off(path: Path, _: Path) -> None:
    """Write a file that ends too early."""
    with h5py.File(path, "w") as file:
        file["x"] = np.arange(1000.0)
    path.write_bytes(path.read_bytes()[:3000])


def empty_signature(path: Path, _: Path) -> None:
    """Write the first bytes of an HDF5 file and nonsense behind them."""
    path.write_bytes(b"\x89HDF\r\n\x1a\n" + b"\xff" * 500)


def text_file(path: Path, _: Path) -> None:
    """Write a text table under this name."""
    path.write_text("a,b\n1,2\n")


HOSTILE = {
    external_link: "link to another file",
    external_storage: "keeps its data in another file",
    virtual: "virtual data set",
    enormous: "8796093022208 bytes",
    hollow: "never written",
    circle: "nested|more than",
    foreign_filter: "filter 32000",
    cut_off: "HDF5 cannot read it|library failed",
    empty_signature: "HDF5 cannot read it|library failed",
    text_file: "neither HDF5 nor",
}


@pytest.mark.parametrize("build", HOSTILE, ids=lambda build: build.__name__)
def test_a_hostile_hdf5_file_gives_no_data(tmp_path: Path, build: Callable[[Path, Path], None]) -> None:
    other = tmp_path / "other.h5"
    with h5py.File(other, "w") as file:
        file["x"] = np.array([1.0, 2.0, 3.0])
    if build is external_storage:
        other.write_bytes(SECRET)
    path = tmp_path / "run.h5"
    build(path, other)
    block = read_array_source(path, "run.h5", [number("x"), number("good", nan="keep", name="good")])
    assert any(part in whys(block) for part in HOSTILE[build].split("|")), whys(block)
    assert not np.isfinite(block.columns["x"]).any()
    if build is external_link:
        assert len(block.lines) == 0  # the file is refused whole, its harmless columns too


def test_a_child_that_dies_is_a_refused_file(hdf5: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(hdf5_source.sys, "executable", "/bin/false")
    block = read_array_source(hdf5, "run.h5", [number("run/T")])
    assert "library failed on it (exit 1" in whys(block)


def test_a_child_that_hangs_is_a_refused_file(hdf5: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(hdf5_source, "CHILD_SECONDS", 0.001)
    assert "took more than" in whys(read_array_source(hdf5, "run.h5", [number("run/T")]))


def npy(array: Any, **options: Any) -> bytes:
    """Return an array as the bytes of a `.npy` file."""
    buffer = io.BytesIO()
    np.save(buffer, array, **options)
    return buffer.getvalue()


TABLE = np.array([[1.0, 2.0], [3.0, 4.0]])
FIELDS = np.array([(1.0, 2), (3.0, 4)], dtype=[("T", "<f8"), ("n", "<i8")])
NPY = {
    "one column": (np.array([2.0, 4.0]), 1),
    "table": (TABLE, 2),
    "table, column order": (np.asfortranarray(TABLE), 2),
    "field": (FIELDS, "n"),
    "field by number": (FIELDS, 2),
    "big-endian": (np.array([2.0, 4.0], dtype=">f4"), 1),
    "booleans": (np.array([[False, True]]).T + np.array([[2], [3]]), 1),
}


@pytest.mark.parametrize(("array", "column"), NPY.values(), ids=NPY.keys())
def test_columns_of_a_npy_file(tmp_path: Path, array: Any, column: str | int) -> None:
    path = tmp_path / "run.npy"
    path.write_bytes(npy(array))
    block = read_array_source(path, "run.npy", [number(column)])
    assert (whys(block), block.columns["x"].tolist()) == ("", [2.0, 4.0])


def test_columns_of_a_npz_file(tmp_path: Path) -> None:
    path = tmp_path / "run.npz"
    np.savez_compressed(path, T=np.array([1.0, 2.0]), table=TABLE, fields=FIELDS, name=np.array(["a", "b"]))
    columns = [
        number("T", name="T"),
        number("table/1", name="t"),
        number("fields/n", name="n"),
        ColumnRequest("w", "name", "text", ("b",)),
    ]
    block = read_array_source(path, "run.npz", columns)
    assert whys(block) == ""
    assert [block.columns[name].tolist() for name in "Ttn"] == [[1.0, 2.0], [1.0, 3.0], [2.0, 4.0]]
    assert (block.columns["w"].tolist(), block.sentinel["w"].tolist()) == (["a", ""], [False, True])


class Tripwire:
    """An object whose unpickling would be seen."""

    touched = False

    def __reduce__(self) -> tuple[Any, ...]:
        """Return a call that leaves a mark."""
        return (setattr, (Tripwire, "touched", True))


def declared(shape: str) -> bytes:
    """Return a `.npy` file of 16 bytes whose header declares another shape."""
    header = f"{{'descr': '<f8', 'fortran_order': False, 'shape': {shape}, }}".encode().ljust(117) + b"\n"
    return b"\x93NUMPY\x01\x00" + struct.pack("<H", len(header)) + header + bytes(16)


HOSTILE_NPY = {
    "object array": (npy(np.array([Tripwire()], dtype=object), allow_pickle=True), "pickle"),
    "bare pickle": (pickle.dumps(Tripwire()), "neither HDF5 nor"),
    "objects in a field": (
        npy(np.array([(1, None)], dtype=[("a", "i4"), ("b", "O")]), allow_pickle=True),
        "pickle",
    ),
    "huge shape": (declared("(1099511627776,)"), "8796093022208 bytes"),
    "overflowing shape": (declared("(4294967296, 4294967296, 1)"), "bytes"),
    "negative shape": (declared("(-2,)"), "declares|cannot read"),
    "more declared than stored": (declared("(3,)"), "declares 24 bytes of data and has 16"),
    "less declared than stored": (declared("(1,)"), "declares 8 bytes of data and has 16"),
    "code for a header": (declared("__import__('os').getpid()"), "cannot read"),
    "nested header": (declared("(" * 100 + ")" * 100), "declares|cannot read"),
    "cut off in the header": (declared("(2,)")[:40], "cannot read"),
    "unknown version": (b"\x93NUMPY\x07\x00" + bytes(200), "version"),
    "dates": (npy(np.array(["2026-03-02"], dtype="datetime64[s]")), "no zone"),
    "long doubles": (npy(np.zeros(2, dtype=np.longdouble)), "fit a double"),
    "no rows": (npy(np.zeros(0)), "no row"),
    "no dimension": (npy(np.float64(1.0)), "0 dimensions"),
    "infinity": (npy(np.array([np.inf])), "is infinite"),
}


@pytest.mark.parametrize(("content", "why"), HOSTILE_NPY.values(), ids=HOSTILE_NPY.keys())
@pytest.mark.parametrize("bundled", ["npy", "npz"])
def test_a_hostile_numpy_file_gives_no_data(tmp_path: Path, content: bytes, why: str, bundled: str) -> None:
    path = tmp_path / f"run.{bundled}"
    if bundled == "npz":
        with zipfile.ZipFile(path, "w") as bundle:
            bundle.writestr("x.npy", content)
        why = why.replace("neither HDF5 nor", "cannot read")
    else:
        path.write_bytes(content)
    block = read_array_source(path, path.name, [number(1)])
    assert any(part in whys(block) for part in why.split("|")), whys(block)
    assert not np.isfinite(block.columns["x"]).any()
    assert not Tripwire.touched


def test_a_bundle_that_unpacks_enormously_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "run.npz"
    np.savez_compressed(path, x=np.zeros(1 << 19))
    assert (
        whys(read_array_source(path, "run.npz", [number("x")])) == ""
    )  # zeros pack 1000 to 1 and are honest
    monkeypatch.setattr(numpy_source, "LARGEST", 1 << 20)
    assert "are not read" in whys(read_array_source(path, "run.npz", [number("x")]))


def test_a_bundle_with_two_members_of_one_name_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "run.npz"
    with zipfile.ZipFile(path, "w") as bundle:
        bundle.writestr("x.npy", npy(np.zeros(1)))
        bundle.writestr("x", npy(np.ones(1)))
    assert "two of one name" in whys(read_array_source(path, "run.npz", [number("x")]))


def test_a_name_that_contradicts_the_bytes_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "run.h5"
    path.write_bytes(npy(np.zeros(2)))
    assert "but not by its name" in whys(read_array_source(path, "run.h5", [number(1)]))


@pytest.mark.parametrize(
    ("file", "expected"),
    [
        ("a.h5", True),
        ("a.HDF5", True),
        ("a.npz", True),
        ("a.csv", False),
        ("a.npy.csv", False),
        ("h5", False),
    ],
)
def test_the_name_says_which_reader(file: str, expected: bool) -> None:  # noqa: FBT001 - a table of cases
    assert is_array_source(file) is expected


def test_times_and_text_with_sentinels_of_a_numpy_file(tmp_path: Path) -> None:
    path = tmp_path / "run.npz"
    np.savez(
        path,
        t=np.array(["1970-01-01T00:00:01Z", "never", ""]),
        n=np.array([1.0, np.nan, 2.0]),
        b=np.array([b"\xff", b"a", b"b"]),
    )
    columns = [
        ColumnRequest("t", "t", "time", ("never",), "keep"),
        number("n", "NaN", name="n"),
        ColumnRequest("b", "b", "text"),
        ColumnRequest("w", "n", "text"),
    ]
    block = read_array_source(path, "run.npz", columns)
    assert block.columns["t"][0] == 1.0
    assert block.sentinel["t"].tolist() == [False, True, False]
    assert block.sentinel["n"].tolist() == [False, True, False]
    assert block.columns["b"].tolist() == ["", "", ""]
    assert [(cell.line, cell.column) for cell in block.bad_cells] == [(0, "b"), (0, "n")]


@pytest.mark.parametrize("suffix", ["npz", "h5"])
def test_a_table_on_its_side_and_one_number_for_all_rows(tmp_path: Path, suffix: str) -> None:
    """Two channels as the rows of one array, with rate and temperature written once, as acquisition programs do."""
    path = tmp_path / f"run.{suffix}"
    content = {
        "series": np.array([[1.0, 2.0, 3.0], [4.0, 5.0, 6.0]]),
        "T": np.array(0.6),
        "rate": np.array(8192),
    }
    if suffix == "npz":
        np.savez(path, **content)
    else:
        with h5py.File(path, "w") as file:
            for name, array in content.items():
                file[name] = array
    columns = [number("series/row/1", name="x"), number("series/row/2", name="y"), number("T", name="T")]
    block = read_array_source(path, path.name, [*columns, number("rate", name="rate")])
    assert whys(block) == ""
    assert block.columns["x"].tolist() == [1.0, 2.0, 3.0]
    assert block.columns["y"].tolist() == [4.0, 5.0, 6.0]
    assert block.columns["T"].tolist() == [0.6] * 3
    assert block.columns["rate"].tolist() == [8192.0] * 3
    wrong = read_array_source(
        path,
        path.name,
        [number("series/row/3", name="a"), number("T/row/1", name="b"), number("series/row/x", name="c")],
    )
    assert {cell.column: cell.why for cell in wrong.bad_cells if cell.column} == {
        "series/row/3": "it has 2 rows and no row 3",
        "T/row/1": "it is no table of numbers, so it has no rows that could be columns",
        "series/row/x": "it has 2 rows and no row x",
    }


def test_one_number_alone_is_one_row(tmp_path: Path) -> None:
    np.savez(tmp_path / "run.npz", T=np.array(0.6), name=np.array("10u"))
    block = read_array_source(
        tmp_path / "run.npz", "run.npz", [number("T", name="T"), ColumnRequest("w", "name", "text")]
    )
    assert whys(block) == ""
    assert block.columns["T"].tolist() == [0.6]
    assert block.columns["w"].tolist() == ["10u"]
