"""Words for a half-typed command line: addresses, cooldowns, plans; in bash as bash breaks words."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import click
import pytest
from click.testing import Result

from archive.commands.main import stillroom
from archive.commands.offered import Offered, addresses, cooldowns, plans
from archive.reduction.planning import shipped_plans

FILES = ("2026-03/2026-03.a1.h5", "2026-03/s001@film-transition.1.h5", "2026-03/s001@film-transition.2.h5",
         "2026-03/s002@ringdown.1.h5", "2026-05/2026-05.a1.h5", "lab.records/RX-2-cal.r2.h5")  # fmt: skip


@pytest.fixture
def root(tmp_path: Path) -> Path:
    """Give a folder with the file names of an archive; nothing else of it is looked at."""
    for name in FILES:
        (tmp_path / "sealed" / name).parent.mkdir(parents=True, exist_ok=True)
        (tmp_path / "sealed" / name).touch()
    (tmp_path / "stillroom.toml").write_text('name = "x"\n', encoding="utf-8")
    return tmp_path


def test_addresses_are_offered_cooldown_by_cooldown(root: Path) -> None:
    assert list(addresses(root, "20")) == [
        "2026-03", "2026-03/", "2026-03.a1", "2026-05", "2026-05/", "2026-05.a1", "RX-2-cal.r2",
    ]  # fmt: skip
    assert list(addresses(root, "2026-03/s001@")) == [
        "2026-03/s001", "2026-03/s002", "2026-03/s001@film-transition.1", "2026-03/s001@film-transition.2",
        "2026-03/s002@ringdown.1",
    ]  # fmt: skip
    assert list(cooldowns(root)) == ["2026-03", "2026-05"]


def test_plans_are_the_shipped_ones() -> None:
    assert list(plans()) == sorted(plan.name for plan in shipped_plans())


def _offered(root: Path | None, command: str, name: str, begun: str) -> list[str]:
    asked = stillroom.get_command(click.Context(stillroom), command)
    param = next(param for param in asked.params if param.name == name)
    ctx = click.Context(asked)
    ctx.params["archive_dir"] = root
    return [str(item.value) for item in param.shell_complete(ctx, begun)]


@pytest.mark.parametrize(
    ("command", "name", "begun", "expected"),
    [
        ("show", "address", "2026-05", ["2026-05", "2026-05/", "2026-05.a1"]),
        ("compare", "second", "2026-03/s002@", ["2026-03/s002@ringdown.1"]),
        ("reduce", "cooldown", "2026-03", ["2026-03"]),
        ("search", "cooldown", "", ["2026-03", "2026-05"]),
        ("reduce", "plan", "ringd", ["ringdown"]),
        ("plans", "name", "ringd", ["ringdown"]),
        ("show", "address", "nothing", []),
        ("show", "address", "none/such", []),
    ],
)
def test_parameters_offer_what_may_stand_there(
    root: Path, command: str, name: str, begun: str, expected: list[str]
) -> None:
    assert _offered(root, command, name, begun) == expected


def test_without_an_archive_nothing_is_offered_and_nothing_is_said(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("STILLROOM_ARCHIVE", raising=False)
    assert _offered(None, "show", "address", "2026") == []
    assert _offered(tmp_path / "none", "show", "address", "2026") == []
    assert capsys.readouterr() == ("", "")


def test_the_archive_is_found_as_a_command_finds_it(root: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(root / "sealed" / "2026-03")
    monkeypatch.delenv("STILLROOM_ARCHIVE", raising=False)
    assert _offered(None, "reduce", "cooldown", "2026-05") == ["2026-05"]
    monkeypatch.chdir(root.parent)
    monkeypatch.setenv("STILLROOM_ARCHIVE", str(root))
    assert _offered(None, "reduce", "cooldown", "2026-05") == ["2026-05"]


def test_what_is_offered_is_read_as_before() -> None:
    assert Offered("address").convert("2026-03/s001", None, None) == "2026-03/s001"


@pytest.mark.parametrize("shell", ["bash", "zsh", "fish"])
def test_a_script_is_written_for_each_shell(run: Callable[..., Result], shell: str) -> None:
    done = run("completion", shell)
    assert done.exit_code == 0
    assert f"_STILLROOM_COMPLETE={shell}_complete" in done.output


def test_another_shell_is_refused(run: Callable[..., Result]) -> None:
    done = run("completion", "csh")
    assert done.exit_code == 2
    assert "'bash', 'zsh', 'fish'" in done.output


BASH = """
eval "$(stillroom completion bash)"
try() { COMP_LINE="$1"; COMP_POINT=${#1}; COMPREPLY=(); _stillroom_completion stillroom; echo "${COMPREPLY[*]}"; }
try "stillroom show 2026-03/s001@film"
try "stillroom drift --archive /none x"
try "stillroom show 'unclosed"
"""


@pytest.mark.skipif(shutil.which("bash") is None, reason="there is no bash here")
def test_bash_puts_in_what_stands_behind_its_last_break(root: Path, tmp_path: Path) -> None:
    place = tmp_path / "bin"
    place.mkdir()
    program = place / "stillroom"
    line = "from archive.commands.main import main; main()"
    program.write_text(f"#!/bin/sh\nexec '{sys.executable}' -c '{line}' \"$@\"\n", encoding="utf-8")
    program.chmod(0o755)
    environment = {
        **os.environ,
        "PATH": f"{place}{os.pathsep}{os.environ['PATH']}",
        "STILLROOM_ARCHIVE": str(root),
        "PYTHONPATH": str(Path(__file__).parents[3]),
    }
    done = subprocess.run(
        ["bash", "-c", BASH], env=environment, capture_output=True, text=True, check=False, timeout=60
    )
    assert done.stderr == ""
    assert done.stdout.splitlines() == ["film-transition.1 film-transition.2", "", ""]
