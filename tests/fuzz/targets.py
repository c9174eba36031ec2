"""What hostile input is thrown at: each target takes data, and fails only by an exception that nobody planned.

Rules: a target returns whatever came of the data. `ArchiveError`, findings and, where a function says so, ValueError
are answers; anything else that is raised is a defect. Nothing may appear outside the folder that a target is given.
"""

from __future__ import annotations

import contextlib
import tempfile
from collections.abc import Callable, Iterator
from pathlib import Path

import numpy as np

from archive.errors import ArchiveError
from archive.exchange.bag_reading import read_bag
from archive.exchange.unpacking import account
from archive.intake.act_sheets import read_amendment, read_revision
from archive.intake.dialect import ColumnRequest
from archive.intake.draft import draft_text
from archive.intake.settings import SETTINGS_NAME, read_settings
from archive.intake.sources import read_array_source
from archive.intake.tables import TableReader
from archive.lab.checking import check_folder
from archive.reduction.planning import load_plan
from archive.reports.prose import prose
from archive.reports.tex import tex
from schemas.address import parse_address
from schemas.kinds import KINDS
from schemas.quantity import Quantity
from schemas.ranges import named_range, point_in_time, si_bounds
from schemas.sweep import Dialect

__all__ = [
    "BYTES",
    "TEXTS",
    "act_sheet",
    "array_source",
    "bag",
    "drafted",
    "plan",
    "search_option",
    "settings",
    "sheet",
    "table",
    "words",
]

_COLUMNS = [
    ColumnRequest(name="time", column=1, kind="time", sentinels=(), nan="error"),
    ColumnRequest(name="value", column=2, kind="number", sentinels=("9.9E37", "nan"), nan="error"),
    ColumnRequest(name="named", column="T (K)", kind="number", sentinels=(), nan="keep"),
    ColumnRequest(name="words", column=3, kind="text", sentinels=("-",), nan="keep"),
]
_ARRAYS = [
    ColumnRequest(name="t", column="t", kind="number", sentinels=(), nan="error"),
    ColumnRequest(name="deep", column="run/table/1", kind="number", sentinels=("nan",), nan="error"),
    ColumnRequest(name="row", column="x/row/1", kind="time", sentinels=(), nan="keep"),
    ColumnRequest(name="first", column=1, kind="text", sentinels=(), nan="keep"),
]
_DIALECTS = [
    {"time_format": "iso8601"},
    {"time_format": "epoch", "delimiter": ";", "decimal": ",", "quote": None},
    {"time_format": "%d.%m.%Y %H:%M:%S", "time_zone": "Europe/Helsinki", "delimiter": "space", "fold": "earlier"},
    {"time_format": "iso8601", "delimiter": "\t", "encoding": "latin-1", "header_rows": 0, "skip_rows": 1},
    {"time_format": "iso8601", "delimiter": "|", "header_comment": True, "quote": "'"},
]  # fmt: skip


@contextlib.contextmanager
def _folder() -> Iterator[Path]:
    with tempfile.TemporaryDirectory(prefix="stillroom-fuzz-") as made:
        yield Path(made)


def sheet(data: bytes) -> None:
    """Check a cooldown folder of which the sheet is given; its findings must be printable and in order."""
    with _folder() as folder:
        (folder / "cooldown.toml").write_bytes(data)
        for name, day in (("empty.csv", 3), ("film.csv", 8)):
            rows = [
                f"2026-03-{day:02d}T10:{k:02d}:00+02:00,{0.2 + 0.01 * k},{1 + 1e-6 * k}" for k in range(9)
            ]
            (folder / name).write_text("\n".join(["time,T (K),P (ms)", *rows]) + "\n")
        report = check_folder(folder)
        for finding in report.findings:
            finding.sentence().encode("utf-8", "backslashreplace")
        assert {path.name for path in folder.iterdir()} == {"cooldown.toml", "empty.csv", "film.csv"}


def act_sheet(data: bytes) -> None:
    """Read an amendment and a revision."""
    with _folder() as folder:
        path = folder / "act.toml"
        path.write_bytes(data)
        for read in (read_amendment, read_revision):
            for finding in read(path).findings:
                finding.sentence()


def settings(data: bytes) -> None:
    """Read the settings of an archive."""
    with _folder() as folder, contextlib.suppress(ArchiveError):
        (folder / SETTINGS_NAME).write_bytes(data)
        read_settings(folder)


def plan(data: bytes) -> None:
    """Read a plan."""
    with contextlib.suppress(ArchiveError):
        load_plan(data.decode("utf-8", "replace"), file="plan.toml")


def table(data: bytes) -> None:
    """Read a text table in every dialect; rows, lines and columns must fit each other."""
    for dialect in _DIALECTS:
        with contextlib.suppress(ArchiveError):
            reader = TableReader(
                [data], file="table.csv", dialect=Dialect.model_validate(dialect), columns=_COLUMNS, block_bytes=512
            )  # fmt: skip
            lines = 0
            for block in reader.blocks():
                assert {len(column) for column in block.columns.values()} == {len(block.lines)}
                assert len(block.lines) == 0 or block.lines[0] > lines
                lines = int(block.lines[-1]) if len(block.lines) else lines
            for cell in reader.bad_cells:
                str(cell)


def drafted(data: bytes) -> None:
    """Draft a sheet for a folder with one file, and read the draft again."""
    with _folder() as folder, contextlib.suppress(ArchiveError):
        (folder / "data.csv").write_bytes(data)
        text = draft_text(folder).text
        (folder / "cooldown.toml").write_text(text, encoding="utf-8")
        codes = {finding.code for finding in check_folder(folder).findings}
        assert not codes & {"sheet-syntax", "sheet-unreadable"}, codes


def array_source(data: bytes) -> None:
    """Read an array source under each of the names that its first bytes allow."""
    suffix = {b"PK": ".npz", b"\x93N": ".npy", b"\x89H": ".h5"}.get(data[:2], ".npz")
    with _folder() as folder, contextlib.suppress(ArchiveError):
        path = folder / f"data{suffix}"
        path.write_bytes(data)
        block = read_array_source(path, path.name, _ARRAYS)
        assert {len(column) for column in block.columns.values()} == {len(block.lines)}
        for request in _ARRAYS:
            if request.kind != "text":
                assert block.columns[request.name].dtype == np.float64


def bag(data: bytes) -> None:
    """Read a bag of which one file is given: its first line names the file, the rest is its content."""
    name, _, content = data.partition(b"\n")
    names = (
        "bagit.txt", "bag-info.txt", "manifest-sha512.txt", "tagmanifest-sha512.txt", "fetch.txt", "data/stillroom-package.json",
    )  # fmt: skip
    chosen = names[len(name) % len(names)]
    with _folder() as folder, contextlib.suppress(ArchiveError):
        (folder / "data").mkdir()
        (folder / "bagit.txt").write_text("BagIt-Version: 1.0\nTag-File-Character-Encoding: UTF-8\n")
        (folder / "bag-info.txt").write_text("Payload-Oxum: 1.1\n")
        (folder / "data" / "a").write_text("a")
        (folder / chosen).write_bytes(content)
        read = read_bag(folder)
        for finding in read.findings:
            finding.sentence()
        if chosen.startswith("data/"):
            read.payload = {f"data/{PACKAGE}": (len(content), {"sha256": "0" * 64})}
            account(read)


PACKAGE = "stillroom-package.json"


def search_option(text: str) -> None:
    """Read everything that a search takes as text."""
    readers: tuple[Callable[[str], object], ...] = (
        lambda said: si_bounds(said, lambda number, unit: Quantity.parse(f"{number} {unit}", "temperature").si),
        lambda said: si_bounds(said, lambda number, unit: Quantity.parse(f"{number} {unit}", "coverage").si),
        named_range,
        point_in_time,
        parse_address,
    )  # fmt: skip
    for read in readers:
        with contextlib.suppress(ValueError):
            read(text)


def words(text: str) -> None:
    """Set a text for paper, and read it as a quantity of every kind."""
    for made in (tex(text), prose(text).latex):
        assert made.isascii(), made
        assert made.isprintable(), made
    prose(text).__html__()
    for kind in KINDS:
        with contextlib.suppress(ValueError):
            Quantity.parse(text, kind)


BYTES: dict[str, Callable[[bytes], None]] = {
    "sheet": sheet,
    "act-sheet": act_sheet,
    "settings": settings,
    "plan": plan,
    "table": table,
    "drafted": drafted,
    "array-source": array_source,
    "bag": bag,
}
TEXTS: dict[str, Callable[[str], None]] = {"search-option": search_option, "words": words}
