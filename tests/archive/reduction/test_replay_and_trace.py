"""A recorded reduction done again, and the way back from a result to the raw file."""

from __future__ import annotations

from typing import Any

import pytest

from archive.errors import BadRequest, UnknownAddress
from archive.reduction.replay import replay
from archive.reduction.trace import trace


def test_a_replay_is_equal_bit_for_bit(reduced: Any, tools: Any) -> None:
    found = replay(reduced.done[2].document, reduced, clock=tools.Clock())
    assert found.equal
    assert {each.relative for each in found.differences} == {0.0}
    assert found.changed_inputs == ()
    assert found.changed_software == {}


def test_a_replay_sees_a_contribution_that_changed_its_sign(tools: Any) -> None:
    source = tools.build()
    document = source.reduce("empty-cell", "2026-03/e1").document
    quality = next(each for each in document.outputs if each.name == "empty_quality_factor")
    turned = quality.model_copy(update={"shared": {name: -part for name, part in quality.shared.items()}})
    outputs = tuple(turned if each is quality else each for each in document.outputs)
    found = replay(document.model_copy(update={"outputs": outputs}), source, clock=tools.Clock())
    assert [each.name for each in found.differences if not each.equal] == ["empty_quality_factor"]


def test_a_replay_rests_on_the_recorded_reductions_not_the_newest(tools: Any) -> None:
    source = tools.build()
    source.reduce("empty-cell", "2026-03/e1")
    source.reduce("dose-run", "2026-03/r1")
    film = source.reduce("film-transition", "2026-03/f1")
    clock = tools.Clock()
    for _ in range(1000):
        clock()
    source.reduce("empty-cell", "2026-03/e1", number=2, clock=clock)
    found = replay(film.document, source, clock=tools.Clock())
    assert found.equal
    assert any(
        entry.address.startswith("2026-03/e1@empty-cell.1#") for entry in found.outcome.document.inputs
    )


def test_a_replay_says_how_far_off_it_is(tools: Any) -> None:
    source = tools.build()
    first = source.reduce("empty-cell", "2026-03/e1")
    key = ("2026-03.a1", "e1", "period")
    source.columns[key] = source.columns[key] * (1 + 1e-7)
    found = replay(first.document, source, clock=tools.Clock())
    period = next(each for each in found.differences if each.name == "empty_period")
    assert not found.equal
    assert period.relative == pytest.approx(1e-7, rel=1e-3)
    assert period.in_uncertainties is not None
    assert period.in_uncertainties > 50


def test_a_trace_ends_at_raw_files_calibration_and_doses(reduced: Any) -> None:
    text = "\n".join(trace("2026-03/f1@film-transition.1#T_KT", reduced).lines())
    assert text.startswith("2026-03/f1@film-transition.1#T_KT = 0.6")
    for words in (
        "2026-03.a1:f1.csv, data from line 2, sha256 " + f"{2:064x}",
        "2026-03.a1:e1.csv",
        "2026-03.a1:r1.csv",
        "RX-1-cal.r1, calibration, sha256",
        "2026-03/r1@dose-run.1#mass_sensitivity",
        "step 2 loading-fit.1",
        "disc.r1",
    ):
        assert words in text, words


def test_a_trace_is_json_and_states_each_thing_once(reduced: Any) -> None:
    tree = trace("2026-03/f1@film-transition.1", reduced)
    assert tree.to_dict()["kind"] == "reduction"
    text = list(tree.lines())
    assert sum("step 1 temperature-from-calibration" in line for line in text) == 2
    assert any(line.endswith("(see above)") for line in text)


@pytest.mark.parametrize(
    ("address", "error"),
    [
        pytest.param("not an address!", BadRequest, id="no address"),
        pytest.param("2026-03.a1", BadRequest, id="an accession"),
        pytest.param("2026-03/f1@film-transition.1#nothing", UnknownAddress, id="unknown output"),
        pytest.param("2026-03/f1#nothing", UnknownAddress, id="unknown channel"),
        pytest.param("TO-9.r1", UnknownAddress, id="unknown record"),
    ],
)
def test_what_has_no_lineage_is_refused_in_words(reduced: Any, address: str, error: type[Exception]) -> None:
    with pytest.raises(error):
        trace(address, reduced)
