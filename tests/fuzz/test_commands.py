"""Command lines of anything: an answer or a sentence, never a fault of the program, and nothing on the disk."""

from __future__ import annotations

import io
from collections.abc import Iterator
from pathlib import Path

import h5py
import numpy as np
import pytest
from click.testing import CliRunner
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from archive import Archive
from archive.commands.main import stillroom
from archive.errors import ArchiveError
from tests.archive.exchange.forging import contents, resealed, swap
from tests.fuzz.strategies import hostile_text
from tests.fuzz.targets import array_source
from tests.small_cooldown import write_folder

_FEW = settings(
    max_examples=200, deadline=None, derandomize=True, database=None, suppress_health_check=list(HealthCheck)
)
# Commands and options that take a text and write nothing; {} is where the text goes.
_FORMS = (
    ("search", "{}"), ("search", "--coverage", "{}"), ("search", "--coverage", "1:2 layers", "--substrate", "{}"),
    ("search", "--temperature", "{}"), ("search", "--result", "{}"), ("search", "--result", "empty_period={}"),
    ("search", "--cell", "{}"), ("search", "--sample", "{}"), ("search", "--thermometer", "{}"), ("search", "--scale", "{}"),
    ("search", "--plan", "{}"), ("search", "--cooldown", "{}"), ("search", "--since", "{}"), ("search", "--until", "{}"),
    ("search", "--limit", "{}"), ("search", "--offset", "{}"), ("search", "--csv", "{}"), ("search", "--json", "{}"),
    ("show", "{}"), ("show", "--json", "{}"), ("show", "2026-03.a1:{}"), ("show", "2026-03/s001#{}"), ("trace", "{}"),
    ("trace", "--forward", "{}"), ("trace", "2026-03/s001@empty-cell.1 step {}"), ("replay", "{}"), ("compare", "{}", "{}"),
    ("compare", "2026-03/s001@empty-cell.1", "{}"), ("calibration", "{}"), ("drift", "{}"), ("plans", "{}"), ("prov", "{}"),
    ("reduce", "{}"), ("reduce", "2026-03", "--plan", "{}"), ("reduce", "2026-03", "--sweep", "{}"), ("amend", "{}"),
    ("revise", "{}"), ("check", "{}"), ("ingest", "{}"), ("import", "{}"), ("mirror", "--check", "{}"), ("convert", "{}"),
    ("convert", "1 K", "--to", "{}"), ("helium", "{}"), ("withdraw", "{}", "--why", "{}"), ("schema", "{}"), ("journal", "{}"),
)  # fmt: skip


@pytest.fixture(scope="module")
def lab(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give the folder of a small archive."""
    folder = tmp_path_factory.mktemp("commands")
    with Archive.create(folder / "lab") as made:
        assert made.ingest(write_folder(folder / "in")).state == "ingested"
        assert made.reduce("2026-03", plan="empty-cell")[0].problem is None
        made.export(["2026-03"], folder / "package", reports=False)
    return folder / "lab"


def test_no_command_line_is_a_fault_of_the_program(
    lab: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("STILLROOM_ARCHIVE", str(lab))
    before = contents(lab)

    @_FEW
    @given(st.sampled_from(_FORMS), hostile_text())
    def holds(form: tuple[str, ...], text: str) -> None:
        # No system passes NUL in an argument.
        words = [word.replace("{}", text.replace("\x00", "")) for word in form]
        ended = CliRunner().invoke(stillroom, words)
        said = ended.output + ended.stderr
        assert "fault of Stillroom" not in said, (words, said)
        assert ended.exception is None or isinstance(ended.exception, SystemExit), (words, ended.exception)
        assert ended.exit_code in {0, 1, 2, 3, 4}, words

    holds()
    assert contents(lab) == before
    assert list(tmp_path.iterdir()) == []


def _hdf5(kind: int) -> bytes:
    stream = io.BytesIO()
    with h5py.File(stream, "w", libver="latest" if kind else "earliest") as file:
        file.create_dataset("t", data=np.arange(64.0), chunks=(16,), compression="gzip", shuffle=True)
        file.create_dataset("run/table", data=np.zeros((8, 3)), fletcher32=True)
        file.create_dataset("x", data=np.zeros((2, 5), dtype="f4"))
        file.create_dataset("words", data=["a", "b"], dtype=h5py.string_dtype())
        file["soft"] = h5py.SoftLink("/t")
        file["other"] = h5py.ExternalLink("/etc/passwd", "/") if kind == 2 else np.int64(3)
    return stream.getvalue()


_HDF5 = [_hdf5(kind) for kind in range(3)]


@st.composite
def _spoilt(draw: st.DrawFn, content: bytes) -> bytes:
    data = bytearray(content)
    for _ in range(draw(st.integers(1, 8))):
        place = draw(st.integers(0, len(data) - 9))
        piece = draw(
            st.sampled_from([b"\xff", b"\x00", b"\xff" * 8, b"\x7f" + b"\xff" * 7])
            | st.binary(min_size=1, max_size=4)
        )
        data[place : place + len(piece)] = piece
    return bytes(
        data[: draw(st.integers(len(data) // 2, len(data)))] if draw(st.integers(0, 5)) == 0 else data
    )


@pytest.mark.slow
def test_a_spoilt_hdf5_source_ends_in_a_refusal_or_in_rows() -> None:
    """The library may die of it; that is why it does so in a child."""

    @settings(_FEW, max_examples=10)
    @given(st.sampled_from(_HDF5).flatmap(_spoilt))
    def holds(data: bytes) -> None:
        array_source(b"\x89HDF\r\n\x1a\n" + data[8:])

    holds()


@pytest.fixture
def other(tmp_path: Path) -> Iterator[Archive]:
    """Give an empty archive."""
    with Archive.create(tmp_path / "other") as made:
        yield made


@pytest.mark.slow
def test_a_forged_package_is_taken_in_whole_or_refused(lab: Path, other: Archive, tmp_path: Path) -> None:
    """Bytes of a file changed, and every digest made right again: what is left to say no is the content."""
    import shutil

    names = [path.relative_to(lab.parent / "package" / "data").as_posix() for path in (lab.parent / "package" / "data").rglob("*.*") if path.is_file()]  # fmt: skip
    before = contents(other.root)

    @settings(_FEW, max_examples=10)
    @given(st.data())
    def holds(data: st.DataObject) -> None:
        package = tmp_path / "package"
        shutil.rmtree(package, ignore_errors=True)
        shutil.copytree(lab.parent / "package", package)
        name = data.draw(st.sampled_from(sorted(names)))
        spoilt = data.draw(_spoilt((package / "data" / name).read_bytes()))
        if name.endswith(".h5"):
            swap(package, name.removeprefix("sealed/").removesuffix(".h5"), spoilt)
        else:
            (package / "data" / name).write_bytes(spoilt)
            resealed(package)
        try:
            outcome = other.import_package(package, dry_run=True)
        except ArchiveError:
            return
        assert outcome.state in {"refused", "would-import"}
        for finding in outcome.findings:
            finding.sentence()
        assert contents(other.root) == before

    holds()
