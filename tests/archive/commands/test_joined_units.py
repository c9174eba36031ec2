"""A unit as a word of its own."""

from __future__ import annotations

import pytest

from archive.commands.joined_units import joined_units

OPTIONS = frozenset({"--coverage", "--result"})


@pytest.mark.parametrize(
    ("words", "joined"),
    [
        pytest.param(["--coverage", "20:35", "umol/m^2"], ["--coverage", "20:35 umol/m^2"], id="two-words"),
        pytest.param(["--coverage=20:35", "umol/m^2", "x"], ["--coverage=20:35 umol/m^2", "x"], id="with-equals"),
        pytest.param(["--result", "T=1:2", "umol/m^2"], ["--result", "T=1:2 umol/m^2"], id="named"),
        pytest.param(["--result=T=1:2", "umol/m^2"], ["--result=T=1:2 umol/m^2"], id="named-with-equals"),
        pytest.param(["--coverage", "20:35 umol/m^2", "umol/m^2"], ["--coverage", "20:35 umol/m^2", "umol/m^2"], id="unit-there"),
        pytest.param(["--coverage", "20:35", "film"], ["--coverage", "20:35", "film"], id="a-word-is-no-unit"),
        pytest.param(["--cell", "20:35", "umol/m^2"], ["--cell", "20:35", "umol/m^2"], id="other-option"),
        pytest.param(["--", "--coverage", "1:2", "umol/m^2"], ["--", "--coverage", "1:2", "umol/m^2"], id="after-dashes"),
        pytest.param(["--coverage"], ["--coverage"], id="nothing-follows"),
    ],
)  # fmt: skip
def test_a_unit_may_be_a_word_of_its_own(words: list[str], joined: list[str]) -> None:
    assert joined_units(words, OPTIONS, "umol/m^2".__eq__) == joined
