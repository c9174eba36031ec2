"""Small files that claim, or unpack to, more than there can be: refused in little memory and time, each by a sentence."""

from __future__ import annotations

import io
import os
import shutil
import struct
import time
import tracemalloc
import unicodedata
import zipfile
import zlib
from collections.abc import Callable
from pathlib import Path

import h5py
import numpy as np
import pytest

from archive import Archive
from archive.errors import ArchiveError, BadRequest, DamagedFile, InvalidSheet
from archive.intake.dialect import Block, ColumnRequest
from archive.intake.draft import draft_text
from archive.intake.paths import path_inside
from archive.intake.settings import read_settings
from archive.intake.sheet import LineMap, read_sheet
from archive.intake.sources import read_array_source
from archive.intake.tables import TableReader
from archive.lab.cited import sources_of_mark
from archive.lab.reducing import _chosen
from archive.reduction.planning import load_plan
from archive.reports.prose import prose
from schemas.ranges import named_range, si_bounds
from schemas.sweep import Dialect
from schemas.toml_text import TomlFault, tables_of

_MEMORY = 64 << 20


def _asked(*columns: str | int) -> list[ColumnRequest]:
    return [
        ColumnRequest(name=f"c{number}", column=column, kind="number", sentinels=(), nan="error")
        for number, column in enumerate(columns)
    ]


def _whys(block: Block) -> str:
    return " ".join(cell.why for cell in block.bad_cells)


def _npy(header: str, data: bytes = b"") -> bytes:
    text = header.encode("latin-1") + b"\n"
    return b"\x93NUMPY\x01\x00" + struct.pack("<H", len(text)) + text + data


@pytest.mark.parametrize(
    ("descr", "shape", "data"),
    [("'<U0'", "(1000000000000,)", b""), ("'|V0'", "(1000000000000,)", b""), ("'|S0'", "(10**12,)", b""),
     ("'<f8'", "(-1, -2)", bytes(16)), ("'<f8'", "(1000000000000, 0)", b""), ("[('a', '<f8', (1000000,))]", "(1,)", bytes(8000000))],
)  # fmt: skip
@pytest.mark.parametrize("bundled", [False, True], ids=["npy", "npz"])
def test_an_array_that_claims_the_impossible_gives_no_row(
    tmp_path: Path, descr: str, shape: str, data: bytes, *, bundled: bool
) -> None:
    content = _npy(f"{{'descr': {descr}, 'fortran_order': False, 'shape': {shape}, }}", data)
    path = tmp_path / ("run.npz" if bundled else "run.npy")
    if bundled:
        with zipfile.ZipFile(path, "w") as bundle:
            bundle.writestr("x.npy", content)
    else:
        path.write_bytes(content)
    tracemalloc.start()
    block = read_array_source(path, path.name, _asked("x" if bundled else 1))
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert len(block.lines) == 0
    assert block.bad_cell_count
    assert peak < _MEMORY


def test_one_long_text_beside_many_rows_is_refused(tmp_path: Path) -> None:
    """One value fills all rows: a megabyte of text over a hundred thousand rows would be 400 GB."""
    path = tmp_path / "run.npz"
    np.savez_compressed(path, t=np.zeros(100_000), note=np.array("x" * 1_000_000))
    words = ColumnRequest(name="w", column="note", kind="text", sentinels=(), nan="keep")
    block = read_array_source(path, path.name, [*_asked("t"), words])
    assert "its columns come to" in _whys(block)
    assert len(block.lines) == 0


def test_a_column_asked_for_many_times_counts_each_time(tmp_path: Path) -> None:
    path = tmp_path / "run.npz"
    np.savez_compressed(path, t=np.zeros(1_000_000, dtype="i1"))
    assert "its columns come to" in _whys(read_array_source(path, path.name, _asked(*["t"] * 200)))


@pytest.mark.parametrize("kind", [zipfile.ZIP_LZMA, zipfile.ZIP_BZIP2], ids=["lzma", "bzip2"])
def test_a_damaged_packing_is_a_refusal(tmp_path: Path, kind: int) -> None:
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", kind) as bundle:
        bundle.writestr(
            "x.npy", _npy("{'descr': '<f8', 'fortran_order': False, 'shape': (64,), }", bytes(512))
        )
    content = bytearray(stream.getvalue())
    content[40:60] = b"\xff" * 20
    path = tmp_path / "run.npz"
    path.write_bytes(content)
    assert read_array_source(path, path.name, _asked("x")).bad_cell_count


@pytest.mark.parametrize("case", ["small-values", "long-texts", "deep", "row-number"])
def test_an_hdf5_file_that_would_fill_the_memory_is_refused(tmp_path: Path, case: str) -> None:
    path = tmp_path / "run.h5"
    column = "x"
    with h5py.File(path, "w") as file:
        if case == "small-values":
            # A byte each on disk, a double each here.
            file.create_dataset("x", shape=(200_000_000,), dtype="i1", chunks=(1 << 20,), compression="gzip")
        elif case == "long-texts":
            texts = file.create_dataset("x", shape=(2000,), dtype=h5py.string_dtype())
            texts[0] = "x" * 500_000
        elif case == "deep":
            group = file
            for _ in range(200):
                group = group.create_group("g")
            file["x"] = np.zeros(3)
        else:
            file["x"] = np.zeros((2, 2))
            column = "x/row/" + "9" * 5000
    block = read_array_source(path, path.name, _asked(column))
    expected = {
        "small-values": "declares",
        "long-texts": "longest text",
        "deep": "nested",
        "row-number": "no row",
    }
    assert expected[case] in _whys(block)
    assert len(block.lines) == 0


def test_a_packed_table_is_read_in_little_memory() -> None:
    """A hundred megabytes without a line end, packed a thousand to one."""
    packer = zlib.compressobj(9, wbits=31)
    packed = b"".join([*(packer.compress(bytes(1 << 20)) for _ in range(100)), packer.flush()])
    assert len(packed) < 200_000
    tracemalloc.start()
    reader = TableReader([packed], file="run.csv.gz", dialect=Dialect(), columns=_asked(1))
    assert sum(len(block.lines) for block in reader.blocks()) == 0
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert peak < _MEMORY
    assert reader.bad_cell_count


SLOW = {
    "a table's name of blanks": lambda: LineMap("[" + " " * 200_000),
    "a string of quotes": lambda: LineMap('a = "' + '\\"' * 200_000),
    "a list of apostrophes": lambda: LineMap("a = [" + "'" * 200_001),
    "a key of many parts": lambda: _refused("a." * 20_000 + "b = 1"),
    "a key of quoted parts": lambda: _refused('"a" . ' * 20_000 + "b = 1"),
    "one long word": lambda: _refused("a" * 1_000_000),
    "a range of blanks": lambda: _no_range("1:" + " " * 50_000 + "a\nb"),
    "a result of blanks": lambda: _no_range("T=" + " " * 50_000 + "\n"),
    "a number in words": lambda: prose("1(" + "9" * 5000 + ") K"),
    "words and powers": lambda: prose("a_b^c " * 3000 + "1e"),
}


def _refused(text: str) -> None:
    with pytest.raises(TomlFault):
        tables_of(text)


def _no_range(text: str) -> None:
    for read in (named_range, lambda said: si_bounds(said, lambda number, _: float(number))):
        try:
            read(text)
        except ValueError:
            continue


@pytest.mark.parametrize("name", SLOW)
def test_time_grows_no_faster_than_the_text(name: str) -> None:
    """Each took minutes, or hours, before; the bound is far above what it takes, and far below that."""
    begin = time.process_time()
    SLOW[name]()
    assert time.process_time() - begin < 20


@pytest.mark.parametrize(
    ("text", "what"),
    [
        ("a = " + "[" * 5000, "nested"),
        ("a = " + "{a=" * 5000, "nested"),
        ("b = 1\na = " + "9" * 5000, "digits"),
        ("a = 2026-02-30", "Invalid date"),
        ("a = '\x00'", "invalid character"),
        ("\ud800 = 1", "Invalid|invalid"),
    ],
)
def test_toml_that_cannot_be_read_is_one_kind_of_fault(tmp_path: Path, text: str, what: str) -> None:
    with pytest.raises(TomlFault, match=what):
        tables_of(text)
    with pytest.raises(ArchiveError):
        load_plan(text)
    (tmp_path / "cooldown.toml").write_text(text, encoding="utf-8", errors="surrogatepass")
    assert {finding.code for finding in read_sheet(tmp_path / "cooldown.toml").findings} <= {
        "sheet-syntax",
        "sheet-unreadable",
    }


def test_a_dotted_word_in_a_string_is_no_key() -> None:
    """Found by the long run: a heading of sixty-six parts, which a draft quotes."""
    word = "a." * 80 + "a"
    assert tables_of(f'column = "{word}"  # {word}') == {"column": word}


def test_the_line_of_a_long_number_is_told() -> None:
    with pytest.raises(TomlFault) as caught:
        tables_of("b = 1\na = " + "9" * 5000)
    assert caught.value.line == 2


# Paths ----------------------------------------------------------------------------------------------------------------


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Give a cooldown folder with links out of it, beside a file that is none of its business."""
    (tmp_path / "secret.csv").write_text("1,2\n3,4\n")
    inside = tmp_path / "in"
    (inside / "raw").mkdir(parents=True)
    (inside / "raw" / "a.csv").write_text("1,2\n3,4\n")
    (inside / "raw" / unicodedata.normalize("NFD", "é.csv")).write_text("1\n")
    (inside / "link.csv").symlink_to(tmp_path / "secret.csv")
    (inside / "out").symlink_to(tmp_path)
    (inside / "loop").symlink_to("loop")
    (inside / "own.csv").symlink_to("raw/a.csv")
    return inside


@pytest.mark.parametrize(
    "name",
    ["../secret.csv", "raw/../../secret.csv", "link.csv", "out/secret.csv", "loop", "/etc/passwd", "//etc/passwd", "C:/x",
     "raw", ".", "./raw/a.csv", "raw//a.csv", "raw/a.csv/", "RAW/a.csv", "raw/A.csv", "raw/é.csv", "raw/a.csv\x00", "nul", "CON",
     "raw/a.csv:stream", "~/x", "raw/" + "a" * 300, "raw/" * 2000 + "a", "\ud800", "raw\\a.csv", "", "\u202ea.csv"],
    ids=ascii,
)  # fmt: skip
def test_a_path_that_is_no_file_of_the_folder_is_told_so(folder: Path, name: str) -> None:
    assert isinstance(path_inside(folder, name), str)


def test_a_link_inside_the_folder_is_a_file_of_it(folder: Path) -> None:
    assert path_inside(folder, "own.csv") == folder / "own.csv"


def test_a_draft_looks_at_no_link_that_leads_out(folder: Path) -> None:
    text = draft_text(folder).text
    assert "leads out of the cooldown folder" in text
    assert 'files = ["link.csv"]' not in text
    assert 'files = ["raw/a.csv"]' in text


def _pipe(path: Path) -> None:
    os.mkfifo(path)


def _endless(path: Path) -> None:
    path.symlink_to("/dev/zero")


def _enormous(path: Path) -> None:
    with path.open("wb") as stream:
        stream.truncate(3_000_000_000)


def _deep(path: Path) -> None:
    path.write_text("[" * 200_000)


@pytest.fixture(scope="module")
def bare(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give an empty archive."""
    root = tmp_path_factory.mktemp("bare") / "lab"
    Archive.create(root).close()
    return root


def _plan(root: Path) -> str:
    with Archive.open(root) as lab, pytest.raises(BadRequest) as refused:
        _chosen(lab._source, root / "plan.toml")
    return str(refused.value)


def _settings(root: Path) -> str:
    with pytest.raises(InvalidSheet) as refused:
        read_settings(root)
    return str(refused.value)


def _mark(root: Path) -> str:
    with pytest.raises(BadRequest) as refused:
        sources_of_mark(f"{root}#s1")
    return str(refused.value)


def _journal(root: Path) -> str:
    with pytest.raises(DamagedFile) as refused:
        Archive.open(root)
    return str(refused.value)


def _batch(root: Path) -> str:
    with Archive.open(root) as lab:
        return " ".join(lab.notices)


@pytest.mark.parametrize(
    ("name", "made", "read", "said"),
    [
        ("plan.toml", _pipe, _plan, "not a plain file"),
        ("plan.toml", _endless, _plan, "not a plain file"),
        ("plan.toml", _enormous, _plan, "at most 5000000 bytes"),
        ("stillroom.toml", _enormous, _settings, "at most 5000000 bytes"),
        ("appendix.json", _enormous, _mark, "at most 100000000 bytes"),
        ("appendix.json", _deep, _mark, "no appendix of Stillroom"),
        ("journal.jsonl", _pipe, _journal, "not a plain file"),
        ("staging/0123456789abcdef.batch", _deep, _batch, "the plan of an import cannot be read"),
    ],
)
def test_a_pipe_a_device_or_an_enormous_file_is_refused_in_little_memory(
    bare: Path,
    tmp_path: Path,
    name: str,
    made: Callable[[Path], None],
    read: Callable[[Path], str],
    said: str,
) -> None:
    """Each was waited for without end, read into gigabytes, or ended in a traceback."""
    root = Path(shutil.copytree(bare, tmp_path / "lab"))
    (root / name).parent.mkdir(exist_ok=True)
    (root / name).unlink(missing_ok=True)
    made(root / name)
    tracemalloc.start()
    try:
        assert said in read(root)
        assert tracemalloc.get_traced_memory()[1] < 50_000_000
    finally:
        tracemalloc.stop()


@pytest.mark.parametrize(
    "figure", ['{"mark": "f1", "file": "x"}', '{"mark": "f1", "file": "x", "reductions": 5}']
)
def test_a_figure_of_which_nothing_is_told_is_no_figure(tmp_path: Path, figure: str) -> None:
    (tmp_path / "appendix.json").write_text(f'{{"sections": [{{"figures": [{figure}]}}]}}', encoding="utf-8")
    with pytest.raises(BadRequest, match="no appendix of Stillroom"):
        sources_of_mark(f"{tmp_path}#f1")
