"""Monte Carlo runs in an archive: sealed with the reduction, done again to the bit, told by command and report."""

from __future__ import annotations

import json
import pickle
import shutil
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner, Result

from archive import Archive
from archive.commands.main import stillroom
from archive.lab import monte_carlo as beside
from archive.reduction.monte_carlo import Request
from archive.store.durable import archive_lock
from tests.small_cooldown import write_folder

SWEEP, PLAN = "2026-03/s001", "empty-cell"


@pytest.fixture(scope="module", autouse=True)
def few() -> Iterator[None]:
    """Repeat with noise alone as seldom as may be: how well that is known is not asked here."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("archive.reduction.monte_carlo.REPETITIONS", (25, 25))
        yield


@pytest.fixture(scope="module")
def made(few: None, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give the folder of an archive with one reduction by Monte Carlo."""
    place = tmp_path_factory.mktemp("drawn")
    with Archive.create(place / "lab", name="Test laboratory") as lab:
        lab.ingest(write_folder(place / "2026-03"))
        (outcome,) = lab.reduce(SWEEP, plan=PLAN, monte_carlo=Request(60))
        assert outcome.problem is None
        assert outcome.address == f"{SWEEP}@{PLAN}.1"
    return place / "lab"


@pytest.fixture
def drawn(made: Path, tmp_path: Path) -> Iterator[Archive]:
    """Give a copy of that archive."""
    with Archive.open(shutil.copytree(made, tmp_path / "lab")) as lab:
        yield lab


@pytest.fixture
def command(drawn: Archive) -> Callable[..., Result]:
    """Run a command on that archive."""

    def run(*words: str) -> Result:
        return CliRunner().invoke(stillroom, ["--archive", str(drawn.root), *words], catch_exceptions=False)

    return run


def test_it_is_sealed_with_the_reduction_and_read_back(drawn: Archive) -> None:
    held = drawn.show(f"{SWEEP}@{PLAN}.1")["monte_carlo"]
    assert (held["trials"], held["seed"], held["digits"], held["failed"]) == (60, 1, 1, 0)
    assert "PCG64" in held["generator"]
    names = {each["name"] for each in held["results"]}
    assert {"empty_period", "period_low"} <= names
    result = drawn.show(f"{SWEEP}@{PLAN}.1#empty_period")
    assert [each["name"] for each in result["monte_carlo"]["results"]] == ["empty_period"]
    assert sum(row["share"] for row in result["budget"]) == pytest.approx(1, abs=1e-12)


@pytest.mark.parametrize(
    ("request_again", "number"),
    [
        pytest.param(None, 1, id="without trials: the newest one has all that is asked for"),
        pytest.param(Request(60), 1, id="the same trials"),
        pytest.param(Request(60, seed=2), 2, id="another seed"),
        pytest.param(Request(61), 2, id="more trials"),
        pytest.param(Request(60, digits=2), 2, id="held to more digits"),
    ],
)
def test_a_new_number_is_made_when_something_else_is_asked_for(
    drawn: Archive, request_again: Request | None, number: int
) -> None:
    (outcome,) = drawn.reduce(SWEEP, plan=PLAN, monte_carlo=request_again)
    assert outcome.address == f"{SWEEP}@{PLAN}.{number}"
    assert outcome.already is (number == 1)
    if number == 2:
        assert outcome.document.supersedes == f"{SWEEP}@{PLAN}.1"


def test_a_replay_draws_the_same_to_the_bit(drawn: Archive, monkeypatch: pytest.MonkeyPatch) -> None:
    report = drawn.replay(f"{SWEEP}@{PLAN}.1")
    assert report.identical
    assert report.monte_carlo_identical
    monkeypatch.setattr(
        "archive.lab.reducing.repeated", lambda made, held: held.model_copy(update={"failed": 1})
    )
    other = drawn.replay(f"{SWEEP}@{PLAN}.1")
    assert other.monte_carlo_identical is False
    assert not other.identical


def test_others_may_write_while_trials_run(drawn: Archive) -> None:
    told = []

    def look(sentence: str) -> None:
        told.append(sentence)
        if "trial" in sentence:
            with archive_lock(drawn.root, wait_s=0.0):
                pass

    (outcome,) = drawn.reduce(SWEEP, plan=PLAN, monte_carlo=Request(40), progress=look)
    assert outcome.problem is None
    assert any("trial 40 of 40" in each for each in told)


class OneByOne:
    """Stands for a pool of processes: its workers are called here, with what was sent to them as bytes."""

    def __init__(self, workers: int, *, mp_context: Any, initializer: Any, initargs: Any) -> None:
        assert (workers, mp_context.get_start_method()) == (2, "spawn")
        assert all(isinstance(each, bytes) for each in initargs)
        initializer(*initargs)

    def __enter__(self) -> OneByOne:
        """Enter a `with` block."""
        return self

    def __exit__(self, *_: object) -> None:
        """Leave it."""

    def map(self, function: Any, indices: Any, *, chunksize: int) -> Any:
        """Carry out, in order."""
        assert chunksize >= 1
        return map(pickle.loads(pickle.dumps(function)), indices)  # noqa: S301 - written here


def test_numbers_do_not_depend_on_the_number_of_processes(
    drawn: Archive, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("archive.reduction.trials.ProcessPoolExecutor", OneByOne)
    (again,) = drawn.reduce(SWEEP, plan=PLAN, monte_carlo=Request(60, digits=2, workers=2))
    found = again.document.monte_carlo
    alone = drawn._source.reduction(f"{SWEEP}@{PLAN}.1").monte_carlo
    assert found.digits == 2
    assert [each.mean for each in found.results] == [each.mean for each in alone.results]
    assert [each.shortest for each in found.results] == [each.shortest for each in alone.results]


def test_a_reduction_without_trials_answers_only_who_asks_for_none(drawn: Archive) -> None:
    document = drawn._source.reduction(f"{SWEEP}@{PLAN}.1")
    bare = document.model_copy(update={"monte_carlo": None})
    assert beside.answers(bare, None)
    assert not beside.answers(bare, Request(60))
    assert not beside.answers(document, Request(None))


def test_the_command_tells_seals_and_repeats(command: Callable[..., Result]) -> None:
    told = command("reduce", SWEEP, "--plan", PLAN, "--monte-carlo", "50", "--seed", "3")
    assert told.exit_code == 0, told.output
    assert f"{SWEEP}@{PLAN}.2" in told.output
    assert "50 trials, seed 3; 95 % intervals; first order held to 1 digit" in told.output
    assert "undecided" in told.output
    content = json.loads(
        command("reduce", SWEEP, "--plan", PLAN, "--monte-carlo", "50", "--seed", "3", "--json").output
    )
    assert content[0]["address"] == f"{SWEEP}@{PLAN}.2"
    assert content[0]["monte_carlo"]["seed"] == 3
    assert {each["name"] for each in content[0]["monte_carlo"]["results"]} >= {"empty_period"}
    assert "so is its Monte Carlo run" in command("replay", f"{SWEEP}@{PLAN}.2").output


def test_a_result_is_shown_with_its_budget_and_the_trials(command: Callable[..., Result]) -> None:
    told = command("show", f"{SWEEP}@{PLAN}.1#empty_period").output
    assert "budget:" in told
    assert "fit of step 2 (background-fit)" in told
    assert "combined standard uncertainty" in told
    assert "60 trials, seed 1" in told
    whole = command("show", f"{SWEEP}@{PLAN}.1").output
    assert whole.count("Monte Carlo (JCGM 101:2008)") == 1
    content = json.loads(command("show", f"{SWEEP}@{PLAN}.1#empty_period", "--json").output)
    assert content["budget"][0]["share"] == pytest.approx(1, abs=1e-9)
    assert content["monte_carlo"]["trials"] == 60


@pytest.mark.parametrize(
    ("words", "expected"),
    [
        pytest.param(("--monte-carlo", "many"), "a number of trials, or adaptive", id="a word"),
        pytest.param(("--monte-carlo", "1"), "2 to 1000000", id="one trial"),
        pytest.param(("--monte-carlo", "10", "--seed", "-1"), "this is no seed", id="a negative seed"),
        pytest.param(
            ("--seed", "2"), "without --monte-carlo these mean nothing: --seed", id="a seed for nothing"
        ),
        pytest.param(
            ("--digits", "2", "--workers", "2"),
            "these mean nothing: --digits, --workers",
            id="options for nothing",
        ),
    ],
)
def test_what_cannot_be_meant_is_refused(
    command: Callable[..., Result], words: tuple[str, ...], expected: str
) -> None:
    told = command("reduce", SWEEP, "--plan", PLAN, *words)
    assert told.exit_code == 2
    assert expected in " ".join(told.output.split())
    assert "Traceback" not in told.output


def test_the_run_sheet_prints_budget_and_trials(drawn: Archive) -> None:
    files = drawn.run_sheet("2026-03")
    page = files["run-sheet-2026-03.html"].decode()
    assert "Uncertainty budget of empty period" in page
    assert "Monte Carlo (JCGM 101), 60 trials, seed 1" in page
    assert "Monte Carlo (JCGM 101), 60 trials" in files["run-sheet-2026-03.json"].decode()


def test_the_appendix_tells_and_cites(drawn: Archive) -> None:
    files = drawn.appendix([f"{SWEEP}@{PLAN}.1"])
    text = files["appendix.tex"].decode()
    assert "Monte Carlo (JCGM 101), 60 trials, seed 1" in text
    assert r"\cite{jcgm-101}" in text
    assert "@techreport{jcgm-101," in files["methods.bib"].decode()
