"""The command line as a whole: quick help that teaches, one sentence and a code for every failure."""

from __future__ import annotations

import json
import re
import subprocess
import sys
import tempfile
from collections.abc import Callable
from pathlib import Path

import click
import pytest
from click.testing import Result

from archive.commands import opening
from archive.commands.main import stillroom
from archive.errors import ArchiveBusy, BadRequest, DamagedFile, NotAnArchive, UnknownAddress, told
from schemas.cooldown import Event
from tests.archive.commands.support import FakeArchive, child

Run = Callable[..., Result]
Fake = Callable[..., FakeArchive]

COMMANDS = (
    "demo", "tour", "init", "schema", "draft", "check", "ingest", "plans", "reduce", "stale", "revise", "amend", "withdraw",
    "search", "plane", "serve", "show", "trace", "replay", "compare", "calibration", "drift", "run-sheet", "appendix", "journal",
    "prov", "export", "import", "fixity", "rebuild-index", "roles", "mirror", "mend", "convert", "helium", "completion",
)  # fmt: skip
HEAVY = (
    "starlette",
    "uvicorn",
    "numpy",
    "scipy",
    "h5py",
    "sqlalchemy",
    "pint",
    "pydantic",
    "matplotlib",
    "rich",
    "pyarrow",
    "jinja2",
    "typst",
)


EVERY = {name: stillroom.get_command(click.Context(stillroom), name) for name in COMMANDS}


@pytest.mark.parametrize("words", [["--help"], ["search", "--help"], ["--version"]], ids=" ".join)
def test_help_imports_nothing_heavy(words: list[str]) -> None:
    program = (
        "import atexit, json, sys\n"
        f"atexit.register(lambda: sys.stderr.write(json.dumps([name for name in {HEAVY!r} if name in sys.modules])))\n"
        "from archive.commands.main import main\nmain()"
    )
    ended = subprocess.run(
        [sys.executable, "-c", program, *words],
        capture_output=True,
        text=True,
        check=False,
        cwd=Path(__file__).parents[3],
    )
    assert ended.returncode == 0
    assert json.loads(ended.stderr) == []


def test_the_door_imports_nothing_that_draws() -> None:
    program = "import sys, archive.lab; print([name for name in ('matplotlib', 'typst', 'jinja2') if name in sys.modules])"
    ended = subprocess.run(
        [sys.executable, "-c", program],
        capture_output=True,
        text=True,
        check=True,
        cwd=Path(__file__).parents[3],
    )
    assert ended.stdout == "[]\n"


def test_the_commands_are_those_of_the_contract(run: Run) -> None:
    assert tuple(stillroom.list_commands(click.Context(stillroom))) == COMMANDS
    listed = re.findall(r"^  ([a-z-]+)  +\S", run("--help").stdout.partition("Commands:")[2], re.MULTILINE)
    assert tuple(listed) == COMMANDS


def test_the_list_says_of_each_command_what_the_command_says(run: Run) -> None:
    listed = run("--help").stdout.partition("Commands:")[2].split("\n")
    told = {
        line.split()[0]: " ".join(line.split()[1:]) for line in listed if line.strip() and ":" not in line
    }
    assert {name: command.get_short_help_str(1000) for name, command in EVERY.items()}.items() <= told.items()


@pytest.mark.parametrize("name", COMMANDS)
def test_each_help_teaches_by_example(name: str, run: Run) -> None:
    result = run(name, "--help")
    assert result.exit_code == 0
    assert f"stillroom {name}" in result.stdout.partition("Example")[2]


@pytest.mark.parametrize("name", COMMANDS)
def test_each_command_that_prints_data_offers_json(name: str) -> None:
    options = {option for parameter in EVERY[name].params for option in parameter.opts}
    # Pages are for people. Schema, lineage and roles are a format of their own already; a draft is TOML; demonstration and tour are stories; a script is for a shell.
    assert ("--json" in options) == (
        name not in ("schema", "draft", "demo", "tour", "completion", "prov", "roles", "serve")
    )


@pytest.mark.parametrize(
    ("error", "code"),
    [
        pytest.param(UnknownAddress("there is nothing at x", expected="y"), 2, id="bad-input"),
        pytest.param(DamagedFile("bytes changed", file="a.h5"), 3, id="damage"),
        pytest.param(ArchiveBusy("another process is writing"), 4, id="busy"),
        pytest.param(NotAnArchive("there is no archive"), 4, id="not-an-archive"),
        pytest.param(FileNotFoundError(2, "No such file or directory", "a/b"), 2, id="no-file"),
        pytest.param(OSError(28, "No space left on device"), 2, id="disk-full"),
        pytest.param(KeyboardInterrupt(), 130, id="interrupted"),
        pytest.param(BrokenPipeError(32, "Broken pipe"), 0, id="reader-gone"),
    ],
)
def test_every_failure_is_one_sentence_and_a_code(
    error: BaseException, code: int, run: Run, fake: Fake
) -> None:
    fake(show=error)
    result = run("show", "2026-03")
    assert result.exit_code == code
    assert "Traceback" not in result.output
    assert result.stdout == ""
    assert len(result.stderr.splitlines()) == (0 if code == 0 else 1)


def test_an_unexpected_fault_leaves_its_traceback_in_a_file(
    run: Run, fake: Fake, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(tempfile, "tempdir", str(tmp_path))
    fake(show=RuntimeError("a cog came off\x1b[2J"))
    result = run("show", "2026-03")
    assert result.exit_code == 2
    assert len(result.stderr.splitlines()) == 1
    (file,) = tmp_path.glob("stillroom-traceback-*.txt")
    assert str(file) in result.stderr
    assert "a cog came off" in file.read_text(encoding="utf-8")


def test_text_of_an_error_cannot_steer_the_terminal(run: Run, fake: Fake) -> None:
    fake(show=UnknownAddress("there is nothing at \x1b]0;x\x07 here"))
    assert "\x1b]" not in run("show", "x").stderr


def test_the_archive_may_be_named_before_or_after_the_command(
    run: Run, monkeypatch: pytest.MonkeyPatch
) -> None:
    asked: list[Path | None] = []

    def opened(folder: Path | None) -> FakeArchive:
        asked.append(folder)
        return FakeArchive(show={"address": "a", "what": "b"})

    monkeypatch.setattr(opening, "open_archive", opened)
    run("--archive", "lab", "show", "a")
    run("show", "a", "--archive", "lab")
    run("--archive", "other", "show", "a", "--archive", "lab")
    run("show", "a")
    assert asked == [Path("lab"), Path("lab"), Path("lab"), None]


def test_no_archive_here_is_code_4(tmp_path: Path) -> None:
    ended = child("search", folder=tmp_path)
    assert (ended.returncode, ended.stdout) == (4, "")
    assert "stillroom init" in ended.stderr


def test_archive_named_by_the_environment_must_be_one(tmp_path: Path) -> None:
    ended = child("check", str(tmp_path), folder=tmp_path, STILLROOM_ARCHIVE=str(tmp_path))
    assert ended.returncode == 4


def test_a_reader_that_leaves_early_is_no_fault() -> None:
    writer = subprocess.Popen(
        [sys.executable, "-c", "from archive.commands.main import main; main()", "schema"],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        cwd=Path(__file__).parents[3],
    )
    assert writer.stdout is not None
    assert writer.stderr is not None
    writer.stdout.read(10)
    writer.stdout.close()
    complaint = writer.stderr.read()
    writer.stderr.close()
    assert (writer.wait(timeout=60), complaint) == (0, b"")


def test_a_code_page_without_the_sign_is_no_traceback(tmp_path: Path) -> None:
    (tmp_path / "Ω.csv").write_text("t,T (K)\n1,0.5\n2,0.6\n", encoding="utf-8")
    ended = child("draft", str(tmp_path), "--print", PYTHONIOENCODING="cp1252")
    assert ended.returncode == 0
    assert "\\u03a9.csv" in ended.stdout


def test_a_closed_stdout_is_no_fault() -> None:
    ended = subprocess.run(
        [
            "/bin/sh",
            "-c",
            f"exec {sys.executable} -c 'from archive.commands.main import main; main()' plans >&-",
        ],
        stderr=subprocess.PIPE,
        cwd=Path(__file__).parents[3],
        check=False,
    )
    assert (ended.returncode, ended.stderr) == (0, b"")


def test_click_shows_a_real_backspace_mark() -> None:
    # A raw docstring would hold a backslash and a b, and every example would be wrapped into one line.
    for command in EVERY.values():
        assert isinstance(command, click.Command)
        assert "\\b" not in (command.help or "")
        assert "\b" in (command.help or "")


def test_the_first_fault_of_a_record_becomes_the_sentence() -> None:
    with pytest.raises(BadRequest, match=r"^--name: what: ") as refused, told("--name"):
        Event.model_validate_json('{"at": "2026-03-02T09:10:00Z", "text": "a leak"}')
    assert "\n" not in str(refused.value)
