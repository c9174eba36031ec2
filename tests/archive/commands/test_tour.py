"""The tour: five real commands on a demonstration that is there, or on one that is made for it."""

from __future__ import annotations

import io
import re
import sys
from collections.abc import Callable
from pathlib import Path

import click
import pytest
from click.testing import Result

from archive import Archive
from archive.commands import tour_command
from tests.small_cooldown import write_folder

Run = Callable[..., Result]


def _like_a_demonstration(folder: Path, *, reduced: bool = True) -> Path:
    with Archive.create(folder / "archive", name="Small") as lab:
        lab.ingest(write_folder(folder / "cooldowns" / "2026-03"))
        if reduced:
            lab.reduce("2026-03", plan="empty-cell")
    return folder


def test_the_tour_gives_five_commands_with_their_real_output(run: Run, tmp_path: Path) -> None:
    folder = _like_a_demonstration(tmp_path / "demo")
    before = {path: path.stat().st_mtime_ns for path in (folder / "archive" / "sealed").rglob("*")}
    done = run("tour", str(folder))
    assert done.exit_code == 0, done.output
    commands = re.findall(r"^\$ stillroom --archive \S+ (\S+)", done.output, re.MULTILINE)
    assert commands == ["check", "search", "show", "trace", "replay"]
    for words in ("1 of 5", "Nothing was stored", "2026-03/s001", "period/ms", "empty.csv", "bit for bit"):
        assert words in done.output
    assert "Press Enter" not in done.output
    assert {path: path.stat().st_mtime_ns for path in (folder / "archive" / "sealed").rglob("*")} == before


def test_a_demonstration_without_results_is_refused(run: Run, tmp_path: Path) -> None:
    done = run("tour", str(_like_a_demonstration(tmp_path / "demo", reduced=False)))
    assert done.exit_code == 2
    assert "holds no results" in done.output


def test_without_a_demonstration_one_is_made_and_taken_away(
    run: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    made: list[Path] = []

    @click.command()
    @click.option("--folder")
    def quick(folder: Path) -> None:
        folder.mkdir()
        made.append(folder)

    monkeypatch.setattr(tour_command, "demo", quick)
    monkeypatch.setattr(
        tour_command,
        "_stops",
        lambda folder: [tour_command._Stop("Which one", "It may matter.", ("--version",))],
    )
    done = run("tour")
    assert done.exit_code == 0, done.output
    assert "it is made first" in done.output
    assert "stillroom, version" in done.output
    assert [folder.exists() for folder in made] == [False]
    run("tour", str(tmp_path / "kept"))
    assert made[-1] == tmp_path / "kept"
    assert made[-1].exists()


def test_a_step_that_fails_is_told_at_the_end(
    run: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    folder = tmp_path / "demo"
    (folder / "archive").mkdir(parents=True)
    (folder / "cooldowns").mkdir()
    (folder / "archive" / "stillroom.toml").write_text('name = "x"\n', encoding="utf-8")
    bad = tour_command._Stop("Look", "To see.", ("show", "2026-03", "--archive", str(tmp_path / "none")))
    monkeypatch.setattr(tour_command, "_stops", lambda folder: [bad])
    done = run("tour", str(folder))
    assert done.exit_code == 2
    assert "not everything went as it should: Look" in done.output


def test_a_person_at_a_terminal_is_waited_for(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    pressed = io.StringIO("\nrest")
    monkeypatch.setattr(pressed, "isatty", lambda: True)
    monkeypatch.setattr(sys, "stdin", pressed)
    monkeypatch.setattr(sys.stdout, "isatty", lambda: True, raising=False)
    tour_command._wait()
    assert pressed.read() == "rest"
    assert "Press Enter" in capsys.readouterr().out
