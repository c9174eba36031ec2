"""What a person sees cannot steer the terminal, and progress stays away from pipes."""

from __future__ import annotations

import pytest

from archive.commands.terminal import Progress, clean, styled, table


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        pytest.param("a\x1b[31mb\x1b[0m", "a[31mb[0m", id="colour"),
        pytest.param("a\x1b]0;title\x07b", "a]0;titleb", id="window-title"),
        pytest.param("a\x9b2Jb", "a2Jb", id="c1-control"),
        pytest.param("abc\b\b\bxyz", "abcxyz", id="backspace"),
        pytest.param("one\r\ntwo\tthree", "one  two three", id="line-ends"),
        pytest.param("safe\u202etxt.exe", "safetxt.exe", id="direction"),
        pytest.param("zero\u200bwidth", "zerowidth", id="zero-width"),
        pytest.param("half\ud800pair", "halfpair", id="surrogate"),
        pytest.param("31.4 µmol·m⁻², Ω, Å", "31.4 µmol·m⁻², Ω, Å", id="typography-stays"),
    ],
)
def test_text_from_files_cannot_steer_the_terminal(text: str, shown: str) -> None:
    assert clean(text) == shown


def test_a_table_in_a_pipe_folds_no_cell(capsys: pytest.CaptureFixture[str]) -> None:
    table(("address", "what"), [("2026-03/s017", "word " * 60), ("x", "[bold]no markup[/bold]")])
    lines = capsys.readouterr().out.splitlines()
    assert lines[2] == "2026-03/s017   " + ("word " * 60).rstrip()
    assert lines[3].endswith("[bold]no markup[/bold]")


def test_colour_yields_to_no_color(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.delenv("NO_COLOR", raising=False)
    assert styled("error", "red") != "error"
    monkeypatch.setenv("NO_COLOR", "1")
    assert styled("error", "red") == "error"


def test_progress_is_silent_where_nobody_looks(capsys: pytest.CaptureFixture[str]) -> None:
    with Progress("reading") as progress:
        progress.sentence("reading s001")
        progress.count(1, 2, "s002")
    assert capsys.readouterr() == ("", "")


def test_progress_is_shown_on_a_terminal_and_taken_off_again(monkeypatch: pytest.MonkeyPatch) -> None:
    import io
    import sys
    import time

    class Screen(io.StringIO):
        def isatty(self) -> bool:
            return True

    screen = Screen()
    monkeypatch.setattr(sys, "stderr", screen)
    monkeypatch.setattr(Progress, "DELAY_S", 0.0)
    monkeypatch.setenv("TERM", "xterm")
    with Progress("reading") as progress:
        for _ in range(100):
            progress.count(1, 4, "s002 \x1b]0;no\x07")
            time.sleep(0.02)
            if "s002" in screen.getvalue():
                break
    assert "s002" in screen.getvalue()
    assert "\x1b]0;" not in screen.getvalue()


@pytest.mark.parametrize(("columns", "lines"), [("80", 2), ("160", 1)], ids=["narrow", "wide"])
def test_several_texts_of_a_cell_stack_on_a_narrow_terminal(
    columns: str, lines: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    import io
    import sys

    class Screen(io.StringIO):
        def isatty(self) -> bool:
            return True

    screen = Screen()
    monkeypatch.setattr(sys, "stdout", screen)
    monkeypatch.setenv("COLUMNS", columns)
    table(("address", "results"), [("2026-03/s017", ("T_KT = 0.7312(12) K", "ratio = 1.00(2)"))])
    body = [line for line in screen.getvalue().splitlines() if "T_KT" in line or "ratio" in line]
    assert len(body) == lines


def test_what_stands_first_is_never_folded(monkeypatch: pytest.MonkeyPatch) -> None:
    # An address is copied from the table into the next command.
    import io
    import sys

    class Screen(io.StringIO):
        def isatty(self) -> bool:
            return True

    screen = Screen()
    monkeypatch.setattr(sys, "stdout", screen)
    monkeypatch.setenv("COLUMNS", "30")
    table(("sweep", "results"), [("2025-03/s006@film", "a result of many words, " * 5)])
    assert "2025-03/s006@film " in screen.getvalue()
