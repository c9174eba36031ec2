"""The commands by which data leave an archive and come into one."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from click.testing import Result

from archive.errors import DamagedFile
from archive.lab.exchanging import ExportOutcome, ImportOutcome, Provenance
from schemas.finding import Finding
from tests.archive.commands.support import FakeArchive, parsed

Run = Callable[..., Result]
Fake = Callable[..., FakeArchive]
OUTCOME = ExportOutcome(
    Path("p"), ("2026-04",), {"2026-03.a1": "2026-04/s002@drop.1 rests on it", "2026-04.a1": "asked for"}, 2_500_000, 31,
    ("authors: [[exchange.author]] with family and given, in stillroom.toml",),
)  # fmt: skip
FAULT = Finding(
    code="bag-file-damaged",
    severity="error",
    what="the bytes are others",
    file="data/a",
    found="1",
    expected="0",
)


def test_export_tells_what_is_in_the_package_why_and_what_is_not(fake: Fake, run: Run) -> None:
    archive = fake(export=OUTCOME)
    result = run("export", "2026-04", "-o", "p", "--appendix", "--without-reports")
    assert result.exit_code == 0
    assert "p: 2 sealed files, 31 files in all, 2.5 MB" in result.stdout
    assert "  2026-03.a1  2026-04/s002@drop.1 rests on it" in result.stdout
    assert "2026-04.a1  asked" not in result.stdout
    assert "left out: authors" in result.stderr
    ((_, arguments, options),) = [each for each in archive.asked if each[0] == "export"]
    assert arguments == (("2026-04",), Path("p"))
    assert (options["reports"], options["appendix"]) == (False, True)


def test_export_as_json_is_one_document(fake: Fake, run: Run) -> None:
    fake(export=OUTCOME)
    found = parsed(run("export", "--all", "-o", "p", "--json"))
    assert found["sealed_files"]["2026-03.a1"] == "2026-04/s002@drop.1 rests on it"
    assert found["bytes"] == 2_500_000
    assert len(found["missing"]) == 1


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (("export", "-o", "p"), "name what to export, or --all"),
        (("export", "2026-04", "--all", "-o", "p"), "one of both"),
        (("export", "no address", "-o", "p"), "is no address"),
        (("export", "2026-04"), "Missing option '-o'"),
        (("prov", "no address"), "is no address"),
        (("import",), "Missing argument"),
    ],
)
def test_what_is_asked_for_badly_is_refused_before_an_archive_is_opened(
    fake: Fake, run: Run, words: tuple[str, ...], says: str
) -> None:
    archive = fake()
    result = run(*words)
    assert result.exit_code == 2
    assert says in result.stderr
    assert archive.asked == []


def test_a_damaged_archive_does_not_export(fake: Fake, run: Run) -> None:
    fake(export=DamagedFile("the bytes are not those that were sealed", file="x.h5"))
    assert run("export", "--all", "-o", "p").exit_code == 3


@pytest.mark.parametrize(
    ("outcome", "says", "code"),
    [
        (
            ImportOutcome("imported", ("2026-04.a1",), ("2026-03.a1",)),
            "Taken in: 1 sealed files; 1 were here already",
            0,
        ),
        (ImportOutcome("would-import", ("2026-04.a1",)), "Nothing was written", 0),
        (ImportOutcome("already", held=("2026-04.a1",)), "holds all 1 sealed files", 0),
        (
            ImportOutcome("refused", findings=(FAULT,), damaged=True),
            "Refused: 1 fault. Nothing was stored.",
            3,
        ),
        (ImportOutcome("refused", findings=(FAULT,)), "the bytes are others", 2),
    ],
    ids=["imported", "dry run", "already", "damage", "refused"],
)
def test_import_says_what_it_did(fake: Fake, run: Run, outcome: ImportOutcome, says: str, code: int) -> None:
    fake(import_package=outcome)
    result = run("import", "p")
    assert says in result.stdout
    assert result.exit_code == code
    fake(import_package=outcome)
    found = parsed(run("import", "p", "--json"))
    assert found["state"] == outcome.state
    assert len(found["findings"]) == len(outcome.findings)


def test_provenance_goes_to_the_terminal_or_into_a_file(fake: Fake, run: Run, tmp_path: Path) -> None:
    written: dict[str, Any] = {}
    archive = fake(
        provenance=Provenance('{"entity": {}}\n', ("x ends before it begins (constraint 30)",)),
        write_reports=lambda files, target: written.update(
            {str(target / name): text for name, text in files.items()}
        ),
    )
    result = run("prov", "2026-04/s002@drop.1#shift", "--format", "provn")
    assert json.loads(result.stdout) == {"entity": {}}
    assert "warning: x ends before it begins" in result.stderr
    assert archive.asked[0] == ("provenance", ("2026-04/s002@drop.1#shift",), {"notation": "provn"})
    result = run("prov", "2026-04", "-o", str(tmp_path / "x.json"))
    assert result.stdout.strip() == str(tmp_path / "x.json")
    assert written == {str(tmp_path / "x.json"): b'{"entity": {}}\n'}


def test_notices_of_an_import_are_told(fake: Fake, run: Run) -> None:
    archive = fake(import_package=ImportOutcome("already", held=("a",)))
    archive.notices.append("staging was swept")
    assert "note: staging was swept" in run("import", "p").stderr
