"""revise, amend, withdraw, stale and reduce --stale: what they ask of the archive, and what they say."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from click.testing import Result

from archive.errors import BadRequest
from archive.lab import ActOutcome, ReduceOutcome, Stale, StaleReason, WithdrawOutcome
from schemas.acts import Difference
from schemas.finding import Finding
from tests.archive.commands.support import FakeArchive, parsed

Run = Callable[..., Result]
Fake = Callable[..., FakeArchive]

STALE = Stale(
    "2026-03/s017@film.1",
    "2026-03/s017",
    "film",
    (StaleReason("record", "RX-2-cal.r1", "RX-2-cal.r2", "RX-2-cal.r2 supersedes RX-2-cal.r1: wrong point"),),
)
OUTCOME = ActOutcome(
    "sealed",
    "RX-2-cal.r2",
    previous="RX-2-cal.r1",
    differences=(Difference(field="relation.coefficients[2]", before="1.0", after="1.1"),),
    stale=(STALE,),
)
REFUSED = ActOutcome(
    "refused",
    findings=(
        Finding(code="act-refused", severity="error", what="it is not said by whom", file="r.toml", line=3),
    ),
)


@pytest.mark.parametrize("verb", ["revise", "amend"])
def test_an_act_tells_what_differs_and_what_is_stale(run: Run, fake: Fake, verb: str) -> None:
    archive = fake(**{verb: OUTCOME})
    result = run(verb, "r.toml", "--by", "data steward")
    assert result.exit_code == 0
    assert archive.asked == [(verb, (Path("r.toml"),), {"by": "data steward", "dry_run": False})]
    for said in ("relation.coefficients[2]", "RX-2-cal.r1", "1.1", "2026-03/s017@film.1", "wrong point"):
        assert said in result.stdout
    assert "RX-2-cal.r2 is in the archive." in result.stdout
    assert "stillroom reduce --stale" in result.stderr


def test_a_dry_run_says_that_nothing_was_written(run: Run, fake: Fake) -> None:
    archive = fake(revise=ActOutcome("shown", "RX-2-cal.r2", previous="RX-2-cal.r1"))
    result = run("revise", "r.toml", "--dry-run")
    assert archive.asked[0][2]["dry_run"] is True
    assert "No field differs from RX-2-cal.r1." in result.stdout
    assert "nothing was written" in result.stdout
    assert "is in the archive" not in result.stdout


@pytest.mark.parametrize("verb", ["revise", "amend"])
def test_a_refused_sheet_ends_with_code_2_and_every_fault(run: Run, fake: Fake, verb: str) -> None:
    fake(**{verb: REFUSED})
    result = run(verb, "r.toml")
    assert result.exit_code == 2
    assert "r.toml, line 3: it is not said by whom" in result.stderr
    assert "Nothing was stored." in result.stderr
    told = run(verb, "r.toml", "--json")
    assert told.exit_code == 2
    assert parsed(told)["findings"][0]["line"] == 3


def test_an_act_as_json_has_its_differences_and_reasons(run: Run, fake: Fake) -> None:
    fake(revise=OUTCOME)
    content = parsed(run("revise", "r.toml", "--json"))
    assert content["differences"] == [{"field": "relation.coefficients[2]", "before": "1.0", "after": "1.1"}]
    assert content["stale"][0]["reasons"][0]["now"] == "RX-2-cal.r2"


def test_a_withdrawal_tells_what_rests_on_it(run: Run, fake: Fake) -> None:
    archive = fake(withdraw=WithdrawOutcome("2026-03.w1", "2026-03/s017", ("2026-03/s017@film.1",)))
    result = run("withdraw", "2026-03/s017", "--why", "the drive was off", "--by", "student")
    assert archive.asked == [("withdraw", ("2026-03/s017",), {"why": "the drive was off", "by": "student"})]
    assert "It stays in the archive" in result.stdout
    assert "2026-03/s017@film.1" in result.stdout
    fake(withdraw=WithdrawOutcome("2026-03.w2", "2026-03.w1", (), "2026-03/s017"))
    assert "2026-03/s017 counts again" in run("withdraw", "2026-03.w1", "--why", "it was on").stdout


@pytest.mark.parametrize(
    "words", [("withdraw", "2026-03/s017"), ("withdraw", "no address", "--why", "x"), ("reduce",)]
)
def test_what_is_not_said_whole_is_refused_before_anything_is_done(
    run: Run, fake: Fake, words: tuple[str, ...]
) -> None:
    archive = fake()
    assert run(*words).exit_code == 2
    assert archive.asked == []


def test_stale_lists_reasons_and_says_when_there_is_nothing(run: Run, fake: Fake) -> None:
    fake(stale=[STALE], show={})
    assert "RX-2-cal.r2 supersedes RX-2-cal.r1" in run("stale").stdout
    assert parsed(run("stale", "2026-03", "--json"))[0]["reduction"] == "2026-03/s017@film.1"
    fake(stale=[])
    assert run("stale").stdout == "No reduction is stale.\n"


def test_reduce_stale_asks_for_all_or_for_one_and_refuses_a_plan(run: Run, fake: Fake) -> None:
    problem = BadRequest("it rests on something stale")
    archive = fake(reduce_stale=[ReduceOutcome("2026-03/s017", "film.r1", problem=problem)])
    result = run("reduce", "--stale")
    assert result.exit_code == 2
    assert "it rests on something stale" in result.stderr
    run("reduce", "2026-03/s017", "--stale")
    assert [asked[1] for asked in archive.asked] == [(None,), ("2026-03/s017",)]
    assert run("reduce", "--stale", "--plan", "film").exit_code == 2
    fake(reduce_stale=[])
    assert run("reduce", "--stale").stdout == "No reduction is stale.\n"


def test_what_is_withdrawn_is_said_before_all_else(run: Run, fake: Fake) -> None:
    content: dict[str, Any] = {
        "address": "2026-03/s017",
        "what": "sweep",
        "withdrawn": "the drive was off (student)",
        "rests_on_withdrawn": ["RX-2-cal.r1: wrong point"],
        "kind": "temperature-sweep",
    }
    fake(show=content)
    lines = run("show", "2026-03/s017").stdout.splitlines()
    assert lines[:3] == [
        "2026-03/s017: sweep",
        "WITHDRAWN: the drive was off (student)",
        "RESTS ON SOMETHING WITHDRAWN: RX-2-cal.r1: wrong point",
    ]
