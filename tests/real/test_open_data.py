"""The whole route on data that nobody here made: checked, ingested, reduced, and compared with what SOURCE.md expects."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest

from archive import Archive
from archive.lab import ReduceOutcome

REAL = Path(__file__).parent


@pytest.fixture(scope="module")
def lab(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Archive]:
    """Give an archive that holds both sets."""
    with Archive.create(tmp_path_factory.mktemp("open") / "lab", name="Open data") as lab:
        for name in ("superfluid-resonator-sweeps", "he4-ar-mcm41-isotherms"):
            outcome = lab.ingest(REAL / name)
            assert outcome.state == "ingested", [finding.sentence() for finding in outcome.report.findings]
        yield lab


@pytest.fixture(scope="module")
def resonances(lab: Archive) -> dict[str, ReduceOutcome]:
    """Reduce all sweeps of the resonator; the line followed through them is under its plan's name."""
    outcomes = lab.reduce("open-resonator")
    assert [str(each.problem) for each in outcomes if each.problem] == []
    return {
        each.plan.partition(".")[0]
        if each.plan.startswith("resonance-tracking")
        else each.sweep.partition("/")[2]: each
        for each in outcomes
    }


def result(outcome: ReduceOutcome, name: str) -> tuple[float | None, str | None]:
    """Value and verdict of a result."""
    assert outcome.document is not None
    (output,) = [each for each in outcome.document.outputs if each.name == name]
    return output.value, output.verdict


@pytest.mark.parametrize("number", range(4))
def test_no_number_where_there_is_no_resonance_in_range(
    resonances: dict[str, ReduceOutcome], number: int
) -> None:
    for name in ("resonance_frequency", "quality_factor", "width", "frequency_at_maximum"):
        assert result(resonances[f"s{number:03d}"], name) == (None, "no resonance in range")


# SOURCE.md: frequency of the largest response after a constant background, one grid step is 2.4 Hz.
LARGEST = {4: 1035.8, 5: 1050.3, 6: 1108.0, 7: 1134.4} | {
    number: 1141.6 if number % 2 == 0 else 1139.2 for number in range(8, 22)
}


@pytest.mark.parametrize("number", sorted(LARGEST))
def test_the_resonance_is_where_the_source_says(resonances: dict[str, ReduceOutcome], number: int) -> None:
    largest, verdict = result(resonances[f"s{number:03d}"], "frequency_at_maximum")
    assert verdict is None
    assert largest == pytest.approx(LARGEST[number], abs=2.4)
    frequency, _ = result(resonances[f"s{number:03d}"], "resonance_frequency")
    quality, _ = result(resonances[f"s{number:03d}"], "quality_factor")
    assert frequency is not None
    assert quality is not None
    # The sloped background moves the largest response by up to a sixth of the line's width, or it is off by a grid step.
    assert frequency == pytest.approx(LARGEST[number], abs=max(0.16 * frequency / quality, 2.4))


def test_up_and_down_differ_by_the_delay_of_the_detector(resonances: dict[str, ReduceOutcome]) -> None:
    up = [result(resonances[f"s{number:03d}"], "resonance_frequency")[0] or 0 for number in range(8, 22, 2)]
    down = [result(resonances[f"s{number:03d}"], "resonance_frequency")[0] or 0 for number in range(9, 22, 2)]
    assert min(up) > max(down)
    assert sum(up) / len(up) - sum(down) / len(down) == pytest.approx(1.2, abs=0.5)


def test_the_resonance_is_followed_in_the_order_of_the_sweeps(
    lab: Archive, resonances: dict[str, ReduceOutcome]
) -> None:
    """SOURCE.md: none in data_0 to data_3, then one line; temperatures are not in the files. Row 0 is the narrow sweep elsewhere."""
    outcome = resonances["resonance-tracking"]
    followed = lab.array(f"{outcome.address}#line_frequency")
    weight = lab.array(f"{outcome.address}#confidence")
    assert np.isnan(followed[:5]).all()
    assert followed[5:] == pytest.approx([LARGEST[number] for number in range(4, 22)], rel=0.015)
    assert (weight[5:] >= 0.9).all()
    assert outcome.document is not None
    assert "in their order" in " ".join(step.sentence for step in outcome.document.steps)


def test_the_isotherm_gives_monolayer_and_plateau_and_asks_for_the_cross_section(lab: Archive) -> None:
    (outcome,) = lab.reduce("open-mcm41", plan="isotherm-bet")
    assert outcome.problem is None
    # SOURCE.md: 10.2 mmol/g on 0.02 to 0.15, plateau 12.93 mmol/g between 0.3 and 0.7; mol/kg equals mmol/g.
    monolayer, _ = result(outcome, "monolayer")
    plateau, _ = result(outcome, "plateau_amount")
    assert monolayer == pytest.approx(10.2, abs=0.25)
    assert plateau == pytest.approx(12.93, abs=0.005)
    assert outcome.document is not None
    assert "area" not in {each.name for each in outcome.document.outputs if each.value is not None}
    assert "cross-section" in outcome.document.model_dump_json()


def test_both_sets_replay_to_the_bit(lab: Archive, resonances: dict[str, ReduceOutcome]) -> None:
    assert lab.replay(resonances["s010"].address or "").identical
    (isotherm,) = lab.reduce("open-mcm41", plan="isotherm-bet")
    assert lab.replay(isotherm.address or "").identical


def test_both_sets_are_told_in_run_sheets_and_an_appendix(
    lab: Archive, resonances: dict[str, ReduceOutcome]
) -> None:
    (isotherm,) = lab.reduce("open-mcm41", plan="isotherm-bet")
    sheets = {name: lab.run_sheet(name) for name in ("open-resonator", "open-mcm41")}
    for name, files in sheets.items():
        assert set(files) == {f"run-sheet-{name}.{form}" for form in ("html", "pdf", "json")}
        assert files[f"run-sheet-{name}.pdf"].startswith(b"%PDF-")
    assert sheets["open-resonator"]["run-sheet-open-resonator.html"].count(b"no resonance in range") >= 4
    told = lab.appendix(
        [resonances["s000"].address or "", resonances["s010"].address or "", isotherm.address or ""]
    )
    text = told["appendix.tex"].decode()
    assert "no resonance in range" in text
    assert "complex Lorentzian" in text
    assert "area per molecule" in text
    assert "thommes-2015" in told["methods.bib"].decode()
