"""Pulse responses of a superfluid resonator that nobody here measured: from the files to the superfluid fraction.

Expected values: SOURCE.md beside the data, and tables of others: heprops and liquid-helium-svp, both after R. J. Donnelly,
C. F. Barenghi, J. Phys. Chem. Ref. Data 27, 1217 (1998).
"""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import heprops.helium as heprops_helium
import liquid_helium_svp
import numpy as np
import pytest

from archive import Archive
from archive.lab import ReduceOutcome

FOLDER = Path(__file__).parent / "superfluid-resonator-pulses"


@pytest.fixture(scope="module")
def lab(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Archive]:
    """Give an archive that holds the set."""
    with Archive.create(tmp_path_factory.mktemp("pulses") / "lab", name="Open data") as lab:
        outcome = lab.ingest(FOLDER)
        assert outcome.state == "ingested", [finding.sentence() for finding in outcome.report.findings]
        yield lab


@pytest.fixture(scope="module")
def outcomes(lab: Archive) -> dict[str, ReduceOutcome]:
    """Reduce it all; by sweep and plan."""
    done = lab.reduce("open-pulses")
    assert [str(each.problem) for each in done if each.problem] == []
    return {f"{each.sweep.partition('/')[2]} {each.plan.partition('.')[0]}": each for each in done}


def results(outcome: ReduceOutcome) -> dict[str, tuple[float | None, str | None]]:
    """Values and verdicts of the scalars of a reduction."""
    assert outcome.document is not None
    return {each.name: (each.value, each.verdict) for each in outcome.document.outputs if each.rows is None}


# SOURCE.md, [computed]: the bin of the largest magnitude, 0.125 Hz apart; the last from "near 1939 Hz".
LINE = {0: 2037.5, 1: 2036.8, 2: 2033.3, 3: 2027.4, 4: 2016.1, 5: 1998.4, 6: 1974.0, 7: 1939.0}


@pytest.mark.parametrize("number", LINE)
def test_the_line_is_where_the_source_says(outcomes: dict[str, ReduceOutcome], number: int) -> None:
    found = results(outcomes[f"r{number:02d} pulse-lines"])
    values = [value for k in range(1, 5) if (value := found[f"frequency_{k}"][0]) is not None]
    # The peak of a noisy magnitude lies within a fifth of the width, 0.6 to 2.3 Hz.
    assert min(abs(value - LINE[number]) for value in values) < (1.2 if number == 7 else 0.25)
    document = outcomes[f"r{number:02d} pulse-lines"].document
    assert document is not None
    spread = [each.uncertainty for each in document.outputs if each.name in {"frequency_1", "frequency_2"}]
    # Finer than the step of 0.125 Hz: the line is fitted, not read off.
    assert all(0.01 < (u or 0) < 0.125 for u in spread)


@pytest.mark.parametrize("number", [8, 9])
def test_no_number_where_the_line_is_lost(outcomes: dict[str, ReduceOutcome], number: int) -> None:
    found = results(outcomes[f"r{number:02d} pulse-lines"])
    for k in range(1, 5):
        assert found[f"frequency_{k}"] == found[f"quality_factor_{k}"] == (None, "no resonance")


def test_the_interference_is_no_resonance_and_does_not_move(outcomes: dict[str, ReduceOutcome]) -> None:
    """SOURCE.md: a sharp line at 2352.75 Hz in every file; at 0.895 K and 0.998 K the helium's own line hides it or lies near."""
    for number in range(10):
        found = results(outcomes[f"r{number:02d} pulse-lines"])
        tones = [value for k in range(1, 5) if (value := found[f"tone_{k}"][0]) is not None]
        if number not in {2, 3}:
            assert min(abs(value - 2352.75) for value in tones) < 0.03
    document = outcomes["r09 line-tracking"].document
    assert document is not None
    sentence = next(step.sentence for step in document.steps if step.name == "followed-line")
    assert "2352.75 Hz" in sentence.partition("these stay:")[2].partition("The line")[0]


def test_the_tracked_line_is_the_helium(lab: Archive, outcomes: dict[str, ReduceOutcome]) -> None:
    address = outcomes["r09 line-tracking"].address or ""
    followed = lab.array(f"{address}#line_frequency")
    assert followed[:8] == pytest.approx(list(LINE.values()), abs=1.2)
    assert np.isnan(followed[8:]).all()
    assert (lab.array(f"{address}#confidence")[:8] > 0.98).all()


def test_the_frequency_is_that_of_fourth_sound(lab: Archive, outcomes: dict[str, ReduceOutcome]) -> None:
    """f(T)/f(0.6 K) = sqrt(rho_s/rho) c1(T)/c1(0.6 K) within 0.5 % up to 1.4 K, tabulated values from liquid-helium-svp and heprops.

    So is the tabulated speed of fourth sound itself. The superfluid fraction goes with the square of the frequency, and is within 0.75 %
    of the tabulated one, not within 0.5 %: the departure is below 0.08 % up to 1.0 K, then -0.22, -0.51, -0.60 and -0.69 % at 1.10, 1.20, 1.30
    and 1.40 K. Another normalisation (the mean of the two coldest) takes 0.02 % off; the second term of fourth sound, the normal fraction times
    the square of second sound, adds up to 0.05 % in the wrong direction; the density changes by 0.014 %. As an error of temperature it would be
    20 to 32 mK, and the files do not tell how good their thermometer is.
    """
    address = outcomes["r09 line-tracking"].address or ""
    T, f, fraction = (
        lab.array(f"{address}#{name}")[:8]
        for name in ("spectra_temperature", "line_frequency", "superfluid_fraction")
    )
    speed = np.array([float(liquid_helium_svp.sound_velocity_first(each)) for each in T])
    carried = np.array(
        [
            float(liquid_helium_svp.density_superfluid(each)) / float(liquid_helium_svp.density(each))
            for each in T
        ]
    )
    expected = np.sqrt(carried / carried[0]) * speed / speed[0]
    assert f / f[0] == pytest.approx(expected, rel=5e-3)
    fourth = np.array([float(liquid_helium_svp.sound_velocity_fourth(each)) for each in T])
    assert f / f[0] == pytest.approx(fourth / fourth[0], rel=5e-3)
    # The square of the frequency: twice that.
    assert fraction == pytest.approx(carried / carried[0], rel=7.5e-3)
    other = np.array([float(heprops_helium.superfluid_fraction_SVP(each)) for each in T[:7]])
    assert fraction[:7] == pytest.approx(other, rel=7.5e-3)
    # SOURCE.md: the root of the fraction alone is visibly off, 2009 Hz against 1998 at 1.197 K.
    assert f[0] * np.sqrt(carried[5]) == pytest.approx(2009, abs=3)
    assert abs(f[5] - f[0] * np.sqrt(carried[5])) > 8


def test_the_superfluid_density_is_that_of_second_sound_and_heat_capacity(
    lab: Archive, outcomes: dict[str, ReduceOutcome]
) -> None:
    """Within 0.5 % up to 1.4 K of the superfluid density that the tabulated second sound and specific heat ask for.

    Two-fluid hydrodynamics, u_2^2 = (rho_s/rho_n) T s^2/c, with s from the specific heat: tables after Donnelly and Barenghi (1998) from
    liquid-helium-svp. The tabulated fraction itself departs from this by up to 0.4 %, in the direction in which the pulses do.
    """
    address = outcomes["r09 line-tracking"].address or ""
    T, fraction = (
        lab.array(f"{address}#{name}")[:8] for name in ("spectra_temperature", "superfluid_fraction")
    )
    grid = np.geomspace(0.1, 1.45, 4000)
    heat = np.asarray(liquid_helium_svp.specific_heat_SVP(grid))
    # Below the table the heat capacity is that of phonons, T^3: the entropy is a third of it.
    steps = np.diff(np.log(grid)) * (heat[1:] + heat[:-1]) / 2
    entropy = np.interp(T, grid, heat[0] / 3 + np.concatenate([[0.0], np.cumsum(steps)]))
    speed = np.asarray(liquid_helium_svp.sound_velocity_second(T))
    normal_over_superfluid = T * entropy**2 / np.interp(T, grid, heat) / speed**2
    asked = 1 / (1 + normal_over_superfluid)
    assert fraction == pytest.approx(asked / asked[0], rel=5e-3)
    carried = np.array(
        [
            float(liquid_helium_svp.density_superfluid(each)) / float(liquid_helium_svp.density(each))
            for each in T
        ]
    )
    warm = T > 1.05
    assert (carried[warm] > asked[warm]).all()
    assert (carried[warm] > fraction[warm]).all()
    assert carried == pytest.approx(asked, rel=5e-3)


def test_it_replays_to_the_bit_and_leads_back_to_the_files(
    lab: Archive, outcomes: dict[str, ReduceOutcome]
) -> None:
    tracking = outcomes["r09 line-tracking"]
    assert lab.replay(tracking.address or "").identical
    assert lab.replay(outcomes["r09 pulse-lines"].address or "").identical
    assert tracking.document is not None
    inputs = {entry.address.partition("#")[0] for entry in tracking.document.inputs}
    assert inputs >= {f"open-pulses/r{number:02d}@pulse-lines.1" for number in range(10)}
