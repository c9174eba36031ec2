"""Plots of characters: points where they belong, ends and units on both axes, plain signs, narrow terminals."""

from __future__ import annotations

import math
import sys
from collections.abc import Callable
from itertools import pairwise

import numpy as np
import pytest
from click.testing import Result

from archive.commands import terminal_plot
from archive.commands.terminal_plot import drawn, plain_signs, say_plot, view_of
from archive.errors import BadRequest
from archive.lab.views import Column, SweepView
from tests.archive.commands.support import FakeArchive

VIEW = SweepView(
    "2026-03/s017",
    "temperature-sweep",
    [
        Column("temperature", "K", "temperature", np.linspace(0.1, 0.5, 50)),
        Column("period", "us", "period", np.linspace(1000.0, 1000.001, 50)),
    ],
)


def _dots(lines: list[str]) -> set[tuple[int, int]]:
    """Places of the braille dots of a plot, by the numbering of the Unicode Standard, block Braille Patterns."""
    order = [(0, 0), (0, 1), (0, 2), (1, 0), (1, 1), (1, 2), (0, 3), (1, 3)]
    found = set()
    for j, line in enumerate(lines):
        for i, sign in enumerate(line.partition("\N{BOX DRAWINGS LIGHT VERTICAL}")[2]):
            bits = ord(sign) - 0x2800 if sign != " " else 0
            found |= {(2 * i + a, 4 * j + b) for k, (a, b) in enumerate(order) if bits >> k & 1}
    return found


def test_points_stand_on_a_rising_line() -> None:
    lines = drawn(range(200), range(200), across="x", up="y", width=60, height=10)[1:11]
    dots = sorted(_dots(lines), key=lambda dot: (dot[0], -dot[1]))
    assert dots[0][0] == 0
    assert dots[0][1] == 39
    assert dots[-1][1] == 0
    assert all(second[1] <= first[1] for first, second in pairwise(dots))


def test_ends_and_names_of_the_axes_are_told() -> None:
    lines = drawn([0.1, 0.5], [1000.0, 1000.001], across="T/K", up="P/us", height=4)
    assert lines[0] == "P/us"
    assert lines[1].split()[0] == "1000.001"
    assert lines[4].split()[0] == "1000"
    assert lines[5].split() == ["0.1", "0.5"]
    assert lines[6].split() == ["T/K"]


@pytest.mark.parametrize(
    ("x", "y"),
    [
        pytest.param([1.0], [2.0], id="one point"),
        pytest.param([1.0, 1.0], [2.0, 2.0], id="equal points"),
        pytest.param([0.0, 1.0, math.nan], [0.0, math.inf, 1.0], id="not finite"),
        pytest.param([-1.7e308, 1.7e308], [-1.7e308, 1.7e308], id="largest doubles"),
        pytest.param([0.0, 5e-324], [0.0, 5e-324], id="smallest doubles"),
    ],
)
@pytest.mark.parametrize("plain", [False, True])
def test_odd_points_are_drawn_all_the_same(x: list[float], y: list[float], *, plain: bool) -> None:
    lines = drawn(x, y, across="x", up="y", width=60, height=5, plain=plain)
    assert len(lines) == 8
    assert max(map(len, lines)) <= 60
    assert any(sign not in " |\N{BOX DRAWINGS LIGHT VERTICAL}" for line in lines[1:6] for sign in line[12:])


def test_without_a_point_there_is_no_plot() -> None:
    assert drawn([math.nan], [1.0], across="x", up="y") == []
    assert drawn([], [], across="x", up="y") == []


def test_plain_signs_are_ascii() -> None:
    lines = drawn(range(50), range(50), across="x", up="y", plain=True)
    assert "\n".join(lines).isascii()


@pytest.mark.parametrize(
    ("encoding", "plain"),
    [
        ("utf-8", False),
        ("UTF-16", False),
        ("ascii", True),
        ("cp437", True),
        ("latin-1", True),
        ("none such", True),
    ],
)
def test_braille_is_for_streams_that_can_write_it(encoding: str, plain: bool) -> None:  # noqa: FBT001 - a table
    assert plain_signs(encoding) is plain


def test_a_narrow_terminal_gets_a_sentence(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(sys.stdout, "isatty", lambda: True, raising=False)
    monkeypatch.setenv("COLUMNS", "20")
    say_plot(VIEW)
    assert "too narrow for a plot" in capsys.readouterr().out
    monkeypatch.setenv("COLUMNS", "40")
    say_plot(VIEW)
    assert max(map(len, capsys.readouterr().out.splitlines())) <= 40


def test_nothing_to_plot_is_said(capsys: pytest.CaptureFixture[str]) -> None:
    say_plot(SweepView("2026-03/s018", "log", []))
    assert "2026-03/s018: there is nothing to plot" in capsys.readouterr().out


class _Lab(FakeArchive):
    def sweep(self, address: str) -> SweepView:
        """Give the sweep."""
        assert address == VIEW.address
        return VIEW

    def show(self, address: str) -> dict[str, str]:
        """Give next to nothing."""
        return {"address": address, "what": "sweep"}


@pytest.fixture
def lab(monkeypatch: pytest.MonkeyPatch) -> _Lab:
    """Put an archive with one sweep in the place of the one that commands open."""
    found = _Lab()
    monkeypatch.setattr("archive.commands.opening.open_archive", lambda folder: found)
    return found


@pytest.mark.parametrize(
    "words",
    [("show", "--plot", "2026-03/s017"), ("show", "--plot", "2026-03/s017#period"), ("search", "--plot")],
)
def test_show_and_search_draw_when_asked(
    lab: _Lab, run: Callable[..., Result], words: tuple[str, ...]
) -> None:
    done = run(*words)
    assert done.exit_code == 0, done.output
    assert "2026-03/s017  period/us" in done.output
    assert "temperature/K" in done.output
    assert "\x1b" not in done.output


@pytest.mark.parametrize(
    "words",
    [
        ("show", "--plot", "--json", "2026-03/s017"),
        ("search", "--plot", "--json"),
        ("search", "--plot", "--csv"),
    ],
)
def test_a_plot_is_no_answer_for_programs(
    lab: _Lab, run: Callable[..., Result], words: tuple[str, ...]
) -> None:
    done = run(*words)
    assert done.exit_code == 2
    assert "--plot" in done.output


@pytest.mark.parametrize("address", ["2026-03", "TO-4.r2", "2026-03.a1:raw/x.csv"])
def test_what_has_no_columns_is_refused(lab: _Lab, address: str) -> None:
    with pytest.raises(BadRequest, match="has no columns"):
        view_of(lab, address)  # type: ignore[arg-type]


def test_what_is_drawn_is_cleaned(capsys: pytest.CaptureFixture[str]) -> None:
    evil = Column("p\x1b[31m", "us", "period", np.arange(3.0))
    T = Column("T\x1b[2J", "K", "temperature", np.arange(3.0))
    terminal_plot.say_plot(SweepView("2026-03/s017", "temperature-sweep", [T, evil]))
    assert "\x1b" not in capsys.readouterr().out
