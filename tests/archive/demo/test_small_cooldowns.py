"""The smaller invented cooldowns are taken in without an error or an open warning, and their plans give back what is true in them."""

from __future__ import annotations

import numpy as np
import pytest

from archive import Archive
from archive.demo.adsorption_cooldowns import adsorption_truth, make_adsorption_folders
from archive.demo.current_cooldown import make_current_folders
from archive.demo.resonator_cooldown import TEMPERATURES, make_resonator_folders, resonator_truth
from archive.demo.third_sound_cooldown import make_third_sound_folders, third_sound_truth

SEED = 20260301


@pytest.fixture(scope="module")
def lab(tmp_path_factory):
    """Make an archive with the cooldowns taken in and reduced; that of the ring describes the gas of the resonator."""
    place = tmp_path_factory.mktemp("small")
    with Archive.create(place / "lab", name="Test laboratory") as made:
        made.reduced = {}
        for make in (
            make_adsorption_folders,
            make_third_sound_folders,
            make_current_folders,
            make_resonator_folders,
        ):
            for folder in make(place / "in", SEED):
                outcome = made.ingest(folder)
                assert outcome.state == "ingested", [each.sentence() for each in outcome.report.findings]
                assert [each.code for each in outcome.report.findings if each.severity != "note"] == []
                if make is not make_current_folders:
                    made.reduced |= {
                        (each.sweep, each.plan.partition(".r")[0]): each for each in made.reduce(folder.name)
                    }
        yield made


def results(lab, sweep, plan):
    """Return the scalar results of a reduction by name."""
    outcome = lab.reduced[(sweep, plan)]
    assert outcome.problem is None, outcome.problem
    return {each.name: each for each in outcome.document.outputs if each.rows is None}


def test_every_plan_that_applies_gives_results(lab):
    assert {key: each.problem for key, each in lab.reduced.items() if each.problem is not None} == {}
    plans = {plan for _, plan in lab.reduced}
    assert plans == {
        "dead-volume", "isotherm-from-doses", "third-sound", "drive-pulse", "pulse-lines", "line-tracking", "resonance", "resonance-tracking",
    }  # fmt: skip


@pytest.mark.parametrize(
    ("sweep", "plan", "name", "true"),
    [
        *(("2025-06/s001", "third-sound", name, value) for name, value in third_sound_truth().items()),
        ("2025-05/s001", "dead-volume", "dead_volume", adsorption_truth()["dead_volume"]),
        *(("2025-07/s001", "isotherm-from-doses", name, adsorption_truth()[name]) for name in ("monolayer", "constant", "area")),
    ],
    ids=lambda value: value if isinstance(value, str) else "",
)  # fmt: skip
def test_results_are_true(lab, sweep, plan, name, true):
    found = results(lab, sweep, plan)[name]
    assert abs(found.value - true) < 4 * found.uncertainty
    assert 0 < found.uncertainty < 0.1 * abs(true)


def test_the_line_that_moves_is_followed_through_all_records(lab):
    truth, outcome = resonator_truth(), lab.reduced[("2026-07/r07", "line-tracking")]
    f, u = (lab.array(f"{outcome.address}#line_frequency{end}") for end in ("", ".uncertainty"))
    assert np.max(np.abs(f - truth["frequency"]) / u) < 4
    Q, u = (lab.array(f"{outcome.address}#line_quality_factor{end}") for end in ("", ".uncertainty"))
    assert np.max(np.abs(Q - truth["quality_factor"]) / u) < 4
    fraction, tabulated = (
        lab.array(f"{outcome.address}#{name}") for name in ("superfluid_fraction", "tabulated_fraction")
    )
    # The thermometer is off by 0.3 mK, where the fraction has a slope of up to 1.1 per kelvin.
    assert np.max(np.abs(fraction - tabulated)) < 2e-3


def test_slow_sweeps_find_the_same_line(lab):
    truth = resonator_truth()
    for number in range(4):
        found = results(lab, f"2026-07/q{number + 1:02d}", "resonance")["resonance_frequency"]
        assert abs(found.value - truth["frequency"][number]) < 4 * found.uncertainty
    assert results(lab, "2026-07/q04", "resonance-tracking")["spectra_with_line"].value == 4
    assert len(TEMPERATURES) == len(truth["temperature"])


@pytest.mark.parametrize("make", [make_adsorption_folders, make_third_sound_folders, make_resonator_folders])
def test_equal_seeds_give_equal_bytes_and_nothing_is_overwritten(tmp_path, make):
    one, two, other = (make(tmp_path / name, seed) for name, seed in (("a", 3), ("b", 3), ("c", 4)))
    for first, second, third in zip(one, two, other, strict=True):
        files = [path.relative_to(first) for path in first.rglob("*") if path.is_file()]
        assert all((first / file).read_bytes() == (second / file).read_bytes() for file in files)
        assert any((first / file).read_bytes() != (third / file).read_bytes() for file in files)
    with pytest.raises(FileExistsError):
        make(tmp_path / "a", 3)
