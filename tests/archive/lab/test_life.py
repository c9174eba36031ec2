"""Life stories on both engines, before and after something was amended, revised and withdrawn."""

from __future__ import annotations

from pathlib import Path

from archive import Archive
from archive.lab.life import Life
from tests.revisable_cooldown import amendment, substrate, write_calibrated

_DOSE = '[[change]]\naddress = "2026-03/d02"\nfield = "amount"\nvalue = "16.0(1) umol"'
EMPTY = "2026-03/s001@empty-cell.1"


def _told(story: Life) -> dict[str, list[tuple[str, str]]]:
    return {each.name: [(point.reduction, point.record) for point in each.points] for each in story.courses}


def test_a_life_story_is_the_same_on_each_engine_and_follows_what_is_said_later(
    lab: Archive, tmp_path: Path
) -> None:
    lab.ingest(write_calibrated(tmp_path / "2026-03"))
    (outcome,) = lab.reduce("2026-03", plan="empty-cell", sweep="s001")
    assert outcome.problem is None
    cell = lab.records(kind="cell")[0].name
    before = lab.life(cell)
    assert _told(before) == {"empty_period": [(EMPTY, f"{cell}.r1")]}
    assert [(use.cooldown, use.sweeps) for use in before.uses] == [("2026-03", 2)]
    (calibration,) = lab.records(kind="calibration")
    assert [each.reduction for each in lab.resting(calibration.address).direct] == [EMPTY]
    assert [use.sweeps for use in lab.life(calibration.name).uses] == [2]
    # With an amendment the columns of sweeps are looked up another way.
    sheet = tmp_path / "sheet.toml"
    sheet.write_text(amendment(_DOSE), encoding="utf-8")
    assert lab.amend(sheet).state == "sealed"
    after = lab.life(cell)
    assert (after.courses, after.uses) == (before.courses, before.uses)
    head = 'format = "stillroom-revision/1"\nby = "data steward"\nbecause = "measured again"\n'
    sheet.write_text(head + substrate(2, "1.70(3) m^2"), encoding="utf-8")
    assert lab.revise(sheet).state == "sealed"
    story = lab.life(lab.records(kind="substrate")[0].name)
    assert [each.name for each in story.fields if any(each.changed)] == ["area"]
    assert [row.because for row in story.acts.values()] == ["measured again"]
    lab.withdraw(EMPTY, why="the wrong cell was cabled", by="data steward")
    assert lab.life(cell).courses == ()
    (resting,) = lab.resting(calibration.address).direct
    assert resting.withdrawn
