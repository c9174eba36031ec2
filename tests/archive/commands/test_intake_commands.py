"""`check`, `ingest`, `draft`, `schema`: findings grouped by file, states, exit codes."""

from __future__ import annotations

from collections.abc import Callable
from datetime import date
from pathlib import Path

import jsonschema
import pytest
from click.testing import Result

from archive.intake.cautions import FIXED_TEXT
from archive.intake.json_schema import THINGS
from archive.lab import CheckReport, IngestOutcome
from schemas.finding import Finding, Severity, Waiver
from tests.archive.commands.support import FakeArchive, parsed
from tests.outside import missing
from tests.revisable_cooldown import PLAN, amendment, calibration

Run = Callable[..., Result]
Fake = Callable[..., FakeArchive]


def _finding(
    severity: Severity, *, file: str | None = "cooldown.toml", line: int = 48, waived: bool = False
) -> Finding:
    waiver = Waiver(
        check="time-gap", place="s017", reason="the log was off", role="data steward", date=date(2026, 3, 9)
    )
    return Finding(
        code="time-gap",
        severity=severity,
        what="a gap of 51 min",
        file=file,
        line=line,
        field="dose[3].pressure",
        place="s017",
        expected="no gap",
        found="3060 s",
        remedy="say what happened",
        waived=waiver if waived else None,
    )


@pytest.mark.parametrize(
    ("findings", "strict", "code"),
    [
        pytest.param([], True, 0, id="clean"),
        pytest.param(["note"], True, 0, id="note-strict"),
        pytest.param(["warning"], False, 0, id="warning"),
        pytest.param(["warning"], True, 1, id="warning-strict"),
        pytest.param(["error", "warning"], False, 2, id="error"),
        pytest.param(["error"], True, 2, id="error-strict"),
    ],
)
def test_check_ends_with_the_code_of_the_worst_finding(
    *, findings: list[Severity], strict: bool, code: int, run: Run, fake: Fake
) -> None:
    fake(check=CheckReport(tuple(_finding(severity) for severity in findings)))
    assert run("check", "folder", *(["--strict"] if strict else [])).exit_code == code
    assert run("check", "folder", "--json", *(["--strict"] if strict else [])).exit_code == code


def test_a_waived_warning_does_not_count(run: Run, fake: Fake) -> None:
    fake(check=CheckReport((_finding("warning", waived=True),)))
    result = run("check", "folder", "--strict")
    assert result.exit_code == 0
    assert "waived: the log was off (data steward, 2026-03-09)" in result.stdout
    assert "no warnings (1 more waived)" in result.stdout


def test_findings_stand_under_their_file_in_order(run: Run, fake: Fake) -> None:
    fake(
        check=CheckReport(
            (
                _finding("warning", file="raw/b.csv", line=3),
                _finding("note", line=90),
                _finding("error", line=48),
                _finding("warning", file=None),
            ),
            cautions=({"subject": "trapped gas", "text": "0.31 umol is recorded in TO-4."},),
            summary={"sweeps": 5, "rows": 1600, "files": 7},
        )
    )
    lines = run("check", "folder").stdout.splitlines()
    headings = [line for line in lines if line and not line.startswith(" ")]
    assert headings == [
        "The cooldown as a whole",
        "cooldown.toml",
        "raw/b.csv",
        "caution: trapped gas: 0.31 umol is recorded in TO-4.",
        FIXED_TEXT,
        "Read: 5 sweeps, 1600 rows, 7 files.",
        "Found: 1 error, 2 warnings, 1 note. Nothing was stored.",
    ]
    start = lines.index("cooldown.toml")
    assert lines[start + 1] == "  error   line 48, dose[3].pressure, s017: a gap of 51 min"
    assert [line.strip() for line in lines[start + 2 : start + 6]] == [
        "found: 3060 s", "expected: no gap", "remedy: say what happened", "check: time-gap",
    ]  # fmt: skip
    assert lines[start + 6].startswith("  note    line 90")


def test_json_of_a_check_holds_every_finding(run: Run, fake: Fake) -> None:
    fake(check=CheckReport((_finding("error"), _finding("warning", waived=True))))
    content = parsed(run("check", "folder", "--json"))
    assert (content["errors"], content["warnings"], content["waived"]) == (1, 0, 1)
    assert content["findings"][0]["line"] == 48
    assert content["findings"][1]["waived"]["date"] == "2026-03-09"


@pytest.mark.parametrize(
    ("state", "code", "sentence"),
    [
        pytest.param("ingested", 0, "Taken in as 2026-03.a1", id="ingested"),
        pytest.param("supplement", 0, "Taken in as supplement 2026-03.a1", id="supplement"),
        pytest.param("already", 0, "nothing was stored", id="already"),
        pytest.param("refused", 2, "Refused", id="refused"),
    ],
)
def test_ingest_says_what_it_did(state: str, code: int, sentence: str, run: Run, fake: Fake) -> None:
    findings = (_finding("error"),) if state == "refused" else ()
    address = None if state == "refused" else "2026-03.a1"
    fake(ingest=IngestOutcome(state, address, CheckReport(findings), ("file raw/a.csv added",)))  # type: ignore[arg-type]
    result = run("ingest", "folder")
    assert result.exit_code == code
    assert sentence in result.stdout
    assert "file raw/a.csv added" in result.stdout
    content = parsed(run("ingest", "folder", "--json"))
    assert (content["state"], content["address"]) == (state, address)


def test_the_schema_is_json_schema_2020_12(run: Run) -> None:
    for thing in THINGS:
        schema = parsed(run("schema", thing))
        assert schema["$schema"] == "https://json-schema.org/draft/2020-12/schema"
        assert schema["$id"].startswith("tag:")
        jsonschema.Draft202012Validator.check_schema(schema)
    validator = jsonschema.Draft202012Validator(parsed(run("schema")))
    assert {error.validator for error in validator.iter_errors({"format": "x"})} >= {"const", "required"}


@pytest.mark.parametrize(
    ("thing", "text"),
    [
        ("amendment", amendment(
            '[[change]]\naddress = "2026-03/d02"\nfield = "amount"\nvalue = "16.0(1) umol"\n'
            '[[calibration]]\nthermometer = "RX"\nuse = "RX-cal.r2"\nsweeps = ["s002"]\n'
            '[[left_out]]\nsweep = "s001"\nrows = [5, 9]\nreason = "a door was slammed"'
        )),
        ("revision", 'format = "stillroom-revision/1"\n' + calibration(2, more="valid_from = 2026-03-01")),
        ("calibration", calibration(2)),
        ("plan", PLAN.replace("REVISION", "1").replace("CHANGED", "")),
    ],
)  # fmt: skip
def test_another_program_checks_sheets_of_acts_by_their_schema(
    thing: str, text: str, run: Run, tmp_path: Path
) -> None:
    try:
        from check_jsonschema import main
    except ImportError:
        missing("the package check-jsonschema is not installed")
    schema, good, bad = tmp_path / "schema.json", tmp_path / "good.toml", tmp_path / "bad.toml"
    schema.write_text(run("schema", thing).stdout, encoding="utf-8")
    good.write_text(text, encoding="utf-8")
    bad.write_text(f"an_unknown_word = 1\n{text}", encoding="utf-8")
    for path, code in ((good, 0), (bad, 1)):
        with pytest.raises(SystemExit) as ended:
            main(["--schemafile", str(schema), str(path)])
        assert ended.value.code == code


def test_the_next_command_can_be_pasted_into_a_shell(run: Run, fake: Fake) -> None:
    fake(check=CheckReport(()))
    assert "Next: stillroom ingest 'run $(id) 7'" in run("check", "run $(id) 7").stdout


def test_draft_writes_once_and_check_leads_on(
    tmp_path: Path, run: Run, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("STILLROOM_ARCHIVE", raising=False)
    (tmp_path / "a.csv").write_text("T (K),P (us)\n0.5,1003.1\n0.6,1003.2\n", encoding="utf-8")
    first = run("draft", str(tmp_path))
    assert first.exit_code == 0, first.stderr
    assert "cooldown.toml is written, with 1 tables described" in first.stdout
    text = (tmp_path / "cooldown.toml").read_text(encoding="utf-8")
    again = run("draft", str(tmp_path))
    assert again.exit_code == 2
    assert "not overwritten" in again.stderr
    assert (tmp_path / "cooldown.toml").read_text(encoding="utf-8") == text
    checked = run("check", str(tmp_path))
    assert checked.exit_code == 2
    blank = text.splitlines().index('outcome = ""  # to fill in: complete or aborted or open') + 1
    assert f"line {blank}, outcome" in checked.stdout
