"""The invented persistent-current cooldown is taken in without an error, and its plans give back its truth."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from archive import Archive
from archive.demo.current_cooldown import current_cooldown, current_truth, make_current_folders
from archive.physics.helium_liquid import density, superfluid_fraction


@pytest.fixture(scope="module")
def lab(tmp_path_factory):
    """Make an archive with the cooldown taken in and reduced."""
    place = tmp_path_factory.mktemp("current")
    (folder,) = make_current_folders(place / "folders", 1)
    with Archive.create(place / "lab", name="Test laboratory") as made:
        outcome = made.ingest(folder)
        assert outcome.state == "ingested"
        assert [finding.code for finding in outcome.report.findings if finding.severity == "error"] == []
        made.reduced = {each.sweep: each for each in made.reduce("2026-06")}
        yield made


def results(lab, sweep):
    """Return the scalar results of a sweep by name."""
    outcome = lab.reduced[f"2026-06/{sweep}"]
    assert outcome.problem is None
    return {each.name: each for each in outcome.document.outputs if each.rows is None}


@pytest.mark.parametrize(
    ("sweep", "name"),
    [("s001", "exponent"), ("s001", "decay_time"), ("s001", "areal_density_from_decay"), ("s002", "onset_coverage"), ("s004", "remaining")],
)  # fmt: skip
def test_the_plan_gives_back_the_truth(lab, sweep, name):
    found = results(lab, sweep)[name]
    assert abs(found.value - current_truth()[name]) < 4 * found.uncertainty


def test_the_slow_cycle_is_reversible_and_follows_the_bulk(lab):
    kept = results(lab, "s003")["remaining"]
    assert abs(kept.value - 1) < 4 * kept.uncertainty
    assert kept.uncertainty < 2e-4
    outcome = lab.reduced["2026-06/s003"]
    T, rho = (lab.array(f"{outcome.address}#{name}") for name in ("temperature", "superfluid_density"))
    assert np.max(np.abs(rho / (density(T) * superfluid_fraction(T)) - 1)) < 2e-3
    assert [finding.severity for finding in outcome.document.findings if finding.severity != "note"] == []


def test_the_far_cycle_says_that_the_current_decayed(lab):
    codes = {finding.code for finding in lab.reduced["2026-06/s004"].document.findings}
    assert {"current-not-reversible", "current-not-bulk-density"} <= codes


def test_words_stand_where_there_is_no_number(lab):
    assert results(lab, "s001")["remaining"].verdict == "no way back"
    assert results(lab, "s002")["exponent"].verdict == "coverage not held"
    assert results(lab, "s003")["exponent"].verdict == "temperature not held"


def test_a_replay_gives_the_same_bits(lab):
    assert all(lab.replay(each.address).identical for each in lab.reduced.values())


def test_equal_seeds_give_equal_bytes_and_nothing_is_overwritten(tmp_path: Path):
    one, other, third = (current_cooldown(seed) for seed in (3, 3, 4))
    assert (one.sheet, one.files) == (other.sheet, other.files)
    assert one.files != third.files
    make_current_folders(tmp_path, 3)
    with pytest.raises(FileExistsError):
        make_current_folders(tmp_path, 3)
