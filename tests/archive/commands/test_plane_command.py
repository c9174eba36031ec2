"""`stillroom plane`: the figure, what it says of itself, and what cannot be asked of it."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from xml.etree import ElementTree as ET

import pytest
from click.testing import Result

from tests.plane_archive import planed

Run = Callable[..., Result]


@pytest.fixture(scope="module")
def root(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give an archive whose plane is known."""
    return planed(tmp_path_factory.mktemp("plane") / "lab")


def test_a_figure_is_written_and_told(run: Run, root: Path, tmp_path: Path) -> None:
    sides = ("--temperature", "0:1 K", "--coverage", "20:40 umol/m^2")
    result = run("--archive", str(root), "plane", "-o", str(tmp_path / "plane.svg"), "--cell", "TO-4", *sides)
    assert result.exit_code == 0, result.stderr
    lines = result.output.splitlines()
    assert lines[0] == "3 sweeps in this part of the plane."
    assert lines[-1] == str(tmp_path / "plane.svg")
    assert ET.parse(tmp_path / "plane.svg").getroot().tag.endswith("svg")  # noqa: S314 - our own figure
    for axis in ("pressure", "cell"):
        written = tmp_path / f"{axis}.pdf"
        assert run("--archive", str(root), "plane", "-o", str(written), "--axis", axis).exit_code == 0
        assert written.read_bytes().startswith(b"%PDF-")


def test_the_numbers_are_there_for_programs(run: Run, root: Path) -> None:
    content = json.loads(run("--archive", str(root), "plane", "--json", "--cell", "TO-4").stdout)
    assert [bar["address"] for bar in content["bars"]] == [
        f"2025-01/{name}" for name in ("e1", "s1", "s2", "d1")
    ]
    assert content["bars"][1]["temperature_high"] == {"value": 0.6, "uncertainty": None, "unit": "K"}
    (transition,) = content["transitions"]
    assert transition["temperature"] == {"value": 0.41, "uncertainty": 0.002, "unit": "K"}
    (line,) = content["lines"]
    assert line["inert"]["value"] == pytest.approx(24e-6)


@pytest.mark.parametrize(
    ("words", "said"),
    [
        pytest.param([], "name a file with -o", id="no-file"),
        pytest.param(["-o", "plane.png"], "a name that ends in .pdf or .svg", id="suffix"),
        pytest.param(["-o", "p.pdf", "--temperature", "0:1 K"], "--coverage: a part of the plane has two sides", id="one-side"),
        pytest.param(["-o", "p.pdf", "--pressure", "0:1 Pa"], "the other side is --coverage", id="another-axis"),
        pytest.param(["-o", "p.pdf", "--temperature", "0:1", "--coverage", "0:1 umol/m^2"], "--temperature: found '0' without a unit", id="no-unit"),
        pytest.param(["-o", "p.pdf", "--since", "spring"], "--since", id="date"),
    ],
)  # fmt: skip
def test_what_cannot_be_drawn_is_told(run: Run, root: Path, words: list[str], said: str) -> None:
    result = run("--archive", str(root), "plane", *words)
    assert result.exit_code == 2
    assert said in " ".join(result.stderr.split())
