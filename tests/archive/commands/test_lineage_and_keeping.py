"""`trace --forward`, `compare`, `replay --all`, `journal`, `mirror`, `mend` on a small archive of real files."""

from __future__ import annotations

import dataclasses
import shutil
from collections.abc import Callable
from pathlib import Path

import pytest
from click.testing import Result

from archive import Archive
from archive.errors import UnknownAddress
from archive.lab import ReplayReport
from tests.archive.commands.support import FakeArchive, parsed
from tests.small_cooldown import write_folder

Run = Callable[..., Result]
Fake = Callable[..., FakeArchive]
EMPTY = "2026-03/s001@empty-cell.1"


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give an archive with one reduction."""
    root = tmp_path_factory.mktemp("keeping")
    with Archive.create(root / "lab", name="Test laboratory") as lab:
        lab.ingest(write_folder(root / "2026-03"))
        lab.reduce("2026-03", plan="empty-cell")
    return root / "lab"


@pytest.fixture
def root(made: Path, tmp_path: Path) -> Path:
    """Give a copy of it to write to."""
    shutil.copytree(made, tmp_path / "lab")
    return tmp_path / "lab"


def test_what_rests_on_a_raw_file(run: Run, root: Path, tmp_path: Path) -> None:
    told = run("--archive", str(root), "trace", "--forward", "2026-03.a1:empty.csv")
    assert told.exit_code == 0
    assert f"{EMPTY} by plan empty-cell.r1" in told.stdout
    nothing = run("--archive", str(root), "trace", "--forward", "2026-03/s002#period")
    assert nothing.stdout == "Nothing in this archive rests on 2026-03/s002#period.\n"
    picture = tmp_path / "lineage.svg"
    drawn = run("--archive", str(root), "trace", f"{EMPTY}#empty_period", "--svg", str(picture))
    assert (drawn.exit_code, drawn.stdout) == (0, f"{picture}\n")
    assert picture.read_text(encoding="utf-8").startswith("<svg")
    content = parsed(run("--archive", str(root), "trace", "--forward", "2026-03/s001", "--json"))
    assert content["kind"] == "sweep"


def test_two_reductions_side_by_side(run: Run, root: Path, tmp_path: Path) -> None:
    told = run("--archive", str(root), "compare", EMPTY, EMPTY, "-o", str(tmp_path / "both.pdf"))
    assert told.exit_code == 0
    assert "from the same raw bytes" in told.stdout
    assert "Steps, parameters and inputs are the same." in told.stdout
    assert "equal bit for bit" in told.stdout
    assert (tmp_path / "both.pdf").read_bytes().startswith(b"%PDF")
    assert parsed(run("--archive", str(root), "compare", EMPTY, EMPTY, "--json"))["same_data"] is True
    wrong = run("--archive", str(root), "compare", EMPTY, EMPTY, "-o", str(tmp_path / "both.png"))
    assert wrong.exit_code == 2
    assert "ends in .pdf or .svg" in wrong.stderr
    sweep = run("--archive", str(root), "compare", EMPTY, "2026-03/s001")
    assert sweep.exit_code == 2
    assert "is no reduction" in sweep.stderr


def test_everything_is_computed_again(run: Run, root: Path) -> None:
    told = run("--archive", str(root), "replay", "--all")
    assert (told.exit_code, told.stdout) == (0, "Of 1 reductions, 1 are bit for bit what was sealed.\n")
    (report,) = parsed(run("--archive", str(root), "replay", "--all", "--json"))
    assert report["identical"] is True
    for words in ([], [EMPTY, "--all"]):
        assert run("--archive", str(root), "replay", *words).exit_code == 2


@pytest.mark.parametrize(
    ("changed", "words", "code"),
    [
        ({}, [], 0),
        ({"identical": False, "largest_difference": {"b": 1e-12}, "shifts": {"b": 0.05}}, [], 0),
        ({"identical": False, "largest_difference": {"b": 1e-12}, "shifts": {"b": 0.05}}, ["--strict"], 1),
        ({"identical": False, "largest_difference": {"b": 1e-12}, "shifts": {"b": 0.05}}, ["--within", "0.01"], 3),
        ({"identical": False, "largest_difference": {"b": 1e-3}, "shifts": {"b": -0.5}}, [], 3),
        ({"identical": False, "largest_difference": {"b": float("nan")}}, [], 3),
    ],
    ids=["same", "small", "small-strict", "small-within-less", "large", "lost"],
)  # fmt: skip
def test_how_far_a_result_may_move(
    changed: dict[str, object], words: list[str], code: int, run: Run, fake: Fake
) -> None:
    report = dataclasses.replace(ReplayReport(EMPTY, identical=True, outputs=4), **changed)  # type: ignore[arg-type]
    fake(replay=report, replay_all=[(EMPTY, report)])
    assert run("replay", EMPTY, *words).exit_code == code
    assert run("replay", "--all", *words).exit_code == code


def test_what_cannot_be_computed_again_is_told(run: Run, fake: Fake) -> None:
    fake(replay_all=[(EMPTY, UnknownAddress("there is no record RX-2.r1 in this archive"))])
    told = run("replay", "--all")
    assert told.exit_code == 2
    assert f"{EMPTY} cannot be computed again: there is no record RX-2.r1" in told.stdout


def test_the_journal_is_told(run: Run, root: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("STILLROOM_ROLE", "data steward")
    assert run("--archive", str(root), "fixity").exit_code == 0
    entries = parsed(run("--archive", str(root), "journal", "--json"))
    assert [each["act"]["act"] for each in entries] == ["init", "ingest", "reduce", "fixity"]
    assert (entries[-1]["act"]["by"], entries[-1]["act"]["note"]) == (
        "data steward",
        "2 sealed files read, 0 faults",
    )
    assert [
        each["number"]
        for each in parsed(run("--archive", str(root), "journal", "2026-03", "--last", "1", "--json"))
    ] == [3]
    assert "2026-03.a1" in run("--archive", str(root), "journal").stdout


def test_a_mirror_mends(run: Run, root: Path, tmp_path: Path) -> None:
    vault = tmp_path / "vault"
    told = run("--archive", str(root), "mirror", str(vault))
    assert told.exit_code == 0, told.stderr
    assert "holds 2 sealed files, 2 of them new" in told.stdout
    assert (
        run("--archive", str(root), "mend", "--from", str(vault)).stdout
        == "No sealed file is damaged or missing.\n"
    )
    path = root / "sealed" / f"{EMPTY}.h5"
    path.unlink()
    hurt = run("--archive", str(root), "fixity")
    assert hurt.exit_code == 3
    assert "stillroom mend --from COPY" in hurt.stdout
    mended = run("--archive", str(root), "mend", "--from", str(vault))
    assert mended.exit_code == 0
    assert f"{EMPTY} is whole again" in mended.stdout
    (vault / "sealed" / f"{EMPTY}.h5").unlink()
    path.unlink()
    lost = run("--archive", str(root), "mend", "--from", str(vault))
    assert lost.exit_code == 3
    assert f"{EMPTY} is not mended" in lost.stdout
    damaged = run("--archive", str(root), "mirror", str(vault), "--json")
    assert damaged.exit_code == 3
    assert parsed(damaged)["damage"][0]["key"] == EMPTY
