"""`init`, `fixity`, `rebuild-index`, `plans`, `reduce`, `show`, `trace`, `replay`, reports: what they print and return."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from click.testing import Result

from archive.errors import StepFailed
from archive.lab import ReduceOutcome, ReplayReport
from archive.reduction.planning import load_plan, shipped_plans
from archive.reduction.trace import TraceNode
from archive.store.interface import Damage
from tests.archive.commands.support import FakeArchive, parsed

Run = Callable[..., Result]
Fake = Callable[..., FakeArchive]


def test_init_makes_an_archive_that_the_next_command_finds(
    tmp_path: Path, run: Run, monkeypatch: pytest.MonkeyPatch
) -> None:
    made = run("init", str(tmp_path / "lab"), "--name", "Cold room", "--json")
    assert parsed(made) == {"root": str((tmp_path / "lab").resolve()), "name": "Cold room"}
    (tmp_path / "lab" / "deep").mkdir()
    monkeypatch.chdir(tmp_path / "lab" / "deep")
    monkeypatch.delenv("STILLROOM_ARCHIVE", raising=False)
    found = run("search")
    assert (found.exit_code, found.stdout) == (0, "No sweeps.\n")
    again = run("init", str(tmp_path / "lab"))
    assert again.exit_code == 2
    assert "archive here already" in again.stderr


@pytest.mark.parametrize(
    ("kinds", "strict", "code", "sentence"),
    [
        pytest.param((), True, 0, "All 3 recorded files are byte for byte", id="whole"),
        pytest.param(("damaged",), False, 3, "1 faults in 3 recorded files", id="damaged"),
        pytest.param(("missing", "stray"), False, 3, "1 not recorded", id="missing"),
        pytest.param(("stray",), False, 0, "1 not recorded", id="stray"),
        pytest.param(("stray",), True, 1, "1 not recorded", id="stray-strict"),
    ],
)
def test_fixity_ends_with_3_when_something_is_damaged(
    *, kinds: tuple[Any, ...], strict: bool, code: int, sentence: str, run: Run, fake: Fake
) -> None:
    damage = [
        Damage("2026-03/2026-03.a1", kind, "it differs", "raw/a", expected="aa", found="bb") for kind in kinds
    ]
    fake(fixity=damage, statistics={"sealed_files": 3})
    more = ["--strict"] if strict else []
    result = run("fixity", *more)
    assert result.exit_code == code
    assert sentence in result.stdout
    for kind in kinds:
        assert f"{kind} 2026-03/2026-03.a1, raw/a: it differs; expected aa; found bb" in result.stdout
    content = parsed(run("fixity", "--json", *more))
    assert content["whole"] == (code != 3)
    assert [each["kind"] for each in content["damage"]] == list(kinds)


def test_plans_are_listed_shown_and_copied(run: Run, fake: Fake) -> None:
    fake(plans=list(shipped_plans()))
    listed = run("plans").stdout
    assert all(plan.address in listed for plan in shipped_plans())
    assert {each["address"] for each in parsed(run("plans", "--json"))} == {
        plan.address for plan in shipped_plans()
    }
    plan = next(plan for plan in shipped_plans() if plan.name == "film-transition")
    shown = run("plans", "film-transition").stdout
    assert all(step.use in shown for step in plan.step)
    assert load_plan(run("plans", "film-transition", "--toml").stdout) == plan
    assert parsed(run("plans", "film-transition", "--json"))["address"] == plan.address
    missing = run("plans", "film")
    assert missing.exit_code == 2
    assert "film-transition" in missing.stderr


def test_reduce_passes_on_what_is_asked_and_tells_every_problem(run: Run, fake: Fake) -> None:
    problem = StepFailed("no point is left", field="step 3", remedy="look at left_out")
    archive = fake(reduce=[ReduceOutcome("2026-03/s017", "film-transition.r1", problem=problem)])
    result = run("reduce", "2026-03/s017", "--plan", "ours.toml")
    assert result.exit_code == 2
    assert (
        "not reduced: 2026-03/s017 by film-transition.r1: step 3: no point is left; look at left_out"
        in result.stderr
    )
    _, arguments, options = archive.asked[-1]
    assert arguments == ("2026-03",)
    assert (options["plan"], options["sweep"]) == (Path("ours.toml"), "s017")
    content = parsed(run("reduce", "2026-03", "--json"))
    assert content[0]["problem"]["code"] == "step-failed"
    assert archive.asked[-1][2]["sweep"] is None


def test_nothing_to_reduce_is_said(run: Run, fake: Fake) -> None:
    fake(reduce=[])
    result = run("reduce", "2026-03")
    assert result.exit_code == 0
    assert "No plan applies" in result.stdout


def test_show_writes_quantities_lists_and_text_without_controls(run: Run, fake: Fake) -> None:
    content = {
        "address": "2026-03/s017",
        "what": "sweep",
        "notes": "knock\x1b[2J at 14:00",
        "coverage": {"value": 31.42e-6, "uncertainty": 0.06e-6, "unit": "mol/m^2"},
        "first_lines": {"raw/a_b.csv": 3},
        "channels": [{"name": "period", "quantity": "period", "unit": "us", "low": 1003.21, "missing": 0}],
        "results": [
            {"address": "2026-03/s017@p.1#T_KT", "value": 0.73124, "uncertainty": 0.00119, "unit": "K"}
        ],
        "plan": {"name": "film-transition", "revision": 2, "step": [{"use": "x"}]},
        "empty": None,
    }
    fake(show=content)
    shown = run("show", "2026-03/s017").stdout
    assert shown.startswith("2026-03/s017: sweep\n")
    assert "\x1b" not in shown
    for text in ("31.420(60) umol/m^2", "raw/a_b.csv  3", "0.7312(12) K", "film-transition.r2", "1003.21"):
        assert text in shown
    assert "empty" not in shown
    machine = parsed(run("show", "2026-03/s017", "--json"))
    assert machine["coverage"] == content["coverage"]
    assert machine["notes"] == content["notes"]


def test_a_text_of_several_lines_passes_for_no_field(run: Run, fake: Fake) -> None:
    fake(
        show={
            "address": "2026-03",
            "what": "cooldown",
            "purpose": "test\n  outcome  complete",
            "cell": "TO-4",
        }
    )
    assert run("show", "2026-03").stdout.splitlines() == [
        "2026-03: cooldown",
        "  purpose  test",
        "             outcome  complete",
        "  cell     TO-4",
    ]


def test_trace_is_a_tree_of_labels(run: Run, fake: Fake) -> None:
    leaf = TraceNode(
        "2026-03.a1:raw/a.csv", "raw-file", "2026-03.a1:raw/a.csv, lines 3 to 322", {"sha256": "ab"}
    )
    fake(trace=TraceNode("x#T_KT", "result", "x#T_KT = 0.7312 \x1b[2JK", {}, (leaf,)))
    assert run("trace", "a/x#T_KT").stdout.splitlines() == [
        "x#T_KT = 0.7312 [2JK",
        "└── 2026-03.a1:raw/a.csv, lines 3 to 322",
    ]
    assert parsed(run("trace", "a/x#T_KT", "--json"))["children"][0]["facts"] == {"sha256": "ab"}


@pytest.mark.parametrize(
    ("report", "strict", "code", "sentence"),
    [
        pytest.param(ReplayReport("a/x@p.1", identical=True, outputs=21), True, 0, "All 21 outputs of a/x@p.1 are bit for bit", id="identical"),
        pytest.param(ReplayReport("a/x@p.1", identical=False, outputs=21, largest_difference={"T": 1e-15}, shifts={"T_KT": 2e-9}), False, 0, "T: largest relative difference 1e-15", id="differs"),
        pytest.param(ReplayReport("a/x@p.1", identical=False, outputs=21, shifts={"T_KT": 2e-9}), True, 1, "2e-09 of its standard uncertainty", id="strict"),
    ],
)  # fmt: skip
def test_replay_says_how_far_it_is_off(
    *, report: ReplayReport, strict: bool, code: int, sentence: str, run: Run, fake: Fake
) -> None:
    fake(replay=report)
    result = run("replay", "a/x@p.1", *(["--strict"] if strict else []))
    assert result.exit_code == code
    assert sentence in result.stdout
    assert parsed(run("replay", "a/x@p.1", "--json"))["identical"] is report.identical


def test_reports_name_the_files_they_wrote(run: Run, fake: Fake) -> None:
    archive = fake(run_sheet={"a.html": b""}, appendix={"a.tex": b""}, write_reports=[Path("reports/a")])
    assert run(
        "run-sheet", "2026-03", "-o", "reports", "--paper", "us-letter"
    ).stdout == "reports/a\n".replace("/", str(Path("/"))[-1])
    assert archive.asked[0] == ("run_sheet", ("2026-03",), {"paper": "us-letter"})
    assert archive.asked[1] == ("write_reports", ({"a.html": b""}, Path("reports")), {"of": ["2026-03"]})
    assert parsed(run("appendix", "a", "b", "-o", "out", "--title", "T", "--level", "chapter", "--json")) == {
        "written": [str(Path("reports/a"))]
    }
    assert archive.asked[2] == ("appendix", (("a", "b"),), {"title": "T", "level": "chapter"})
    assert run("appendix", "a").exit_code == 2


@pytest.mark.parametrize(
    "words", [["replay"], ["trace"], ["appendix", "-o", "out"]], ids=lambda words: words[0]
)
@pytest.mark.parametrize("text", ["x y", "../etc", ""])
def test_a_text_that_is_no_address_is_refused_with_the_forms(
    words: list[str], text: str, run: Run, fake: Fake
) -> None:
    archive = fake()
    result = run(*words, text)
    assert result.exit_code == 2
    assert "is no address; write a cooldown (2026-03)" in result.stderr
    assert archive.asked == []
