"""The demonstration from end to end in a process of its own, and commands on the archive it made."""

from __future__ import annotations

import csv
import io
import json
import subprocess
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from click.testing import Result

from archive import Archive
from archive.lab.reporting import view
from archive.reduction.planning import shipped_plans
from archive.reports.figure_values import fact, step_of, taken
from archive.reports.figures_film import fitted_theory
from archive.reports.scope import Scope
from tests.archive.commands.support import parsed

Demonstration = tuple[Path, "subprocess.CompletedProcess[str]"]
Run = Callable[..., Result]


def test_a_folder_that_is_not_empty_is_refused(tmp_path: Path, run: Run) -> None:
    (tmp_path / "thesis.tex").write_text("x", encoding="utf-8")
    result = run("demo", str(tmp_path))
    assert result.exit_code == 2
    assert "not empty" in result.stderr
    assert [path.name for path in tmp_path.iterdir()] == ["thesis.tex"]


def test_an_earlier_demonstration_is_left_and_what_to_do_is_said(tmp_path: Path, run: Run) -> None:
    (tmp_path / "cooldowns").mkdir()
    result = run("demo", str(tmp_path))
    assert result.exit_code == 2
    assert "earlier demonstration" in result.stderr
    assert f"stillroom --archive {tmp_path / 'archive'} search" in result.stderr


@pytest.mark.slow
def test_the_demonstration_runs_and_says_what_it_made(demonstration: Demonstration, run: Run) -> None:
    folder, ended = demonstration
    assert ended.returncode == 0, ended.stderr
    assert "Traceback" not in ended.stderr
    for name in ("cooldowns", "archive", "reports"):
        assert str(folder / name) in ended.stdout
        assert any((folder / name).iterdir())
    assert "Search by coverage" in ended.stdout
    assert "Search by cell" in ended.stdout
    assert "T_KT = " in ended.stdout
    assert (folder / "reports" / "run-sheet-2025-03.pdf").read_bytes().startswith(b"%PDF")
    assert (folder / "reports" / "appendix" / "appendix.tex").stat().st_size > 0
    again = run("demo", str(folder))
    assert again.exit_code == 2
    assert "earlier demonstration" in again.stderr


@pytest.mark.slow
def test_every_shipped_plan_is_carried_out_and_drawn(demonstration: Demonstration) -> None:
    folder, _ = demonstration
    with Archive.open(folder / "archive") as lab:
        plans = {row.address.partition("@")[2].partition(".")[0] for row in lab._index.reductions()}
    assert plans == {plan.name for plan in shipped_plans()}
    appendix = json.loads((folder / "reports" / "appendix" / "appendix.json").read_text(encoding="utf-8"))
    figures = [each for section in appendix["sections"] for each in section["figures"]]
    sentences = [each["text"] for section in appendix["sections"] for each in section["sentences"]]
    assert [text for text in sentences if text.startswith("There is no figure")] == []
    drawn = {
        name.partition("@")[2].partition(".")[0]
        for each in figures
        for name in each["reductions"]
        if "@" in name
    }
    assert "figures/drift-RX-2.pdf" in {each["file"] for each in figures}
    assert drawn == plans
    assert len({each["file"] for each in figures}) == len(figures)


@pytest.mark.slow
def test_the_drawn_theory_is_the_fitted_one(demonstration: Demonstration) -> None:
    address = "2025-03/s006@film-dynamic.1"
    with Archive.open(demonstration[0] / "archive") as lab:
        scope = Scope([view(lab._source, "Test", "2025-03")], [address])
        document = next(each for each in scope.reductions if each.address == address)
        step = step_of(document, "film-dynamic-fit")
        T, drop = (taken(scope, document, step, port) for port in ("temperature", "period_drop"))
        period = float(np.nanmedian(taken(scope, document, step, "period")))
        r = lab.array(f"{address}#drop_residual")
        u = lab.array(f"{address}#period_drop.point")
        fitted = np.isfinite(r)
        curve, _ = fitted_theory(
            document, T[fitted], period=period, x0=-0.5, scale=fact(step, "scale_stated")
        )
    # The step weighs with what is stated of each point; its residuals are what the curve leaves, in those units.
    assert np.max(np.abs((drop[fitted] - curve) / u[fitted] - r[fitted])) < 0.02


@pytest.mark.slow
def test_what_the_demonstration_advises_works(demonstration: Demonstration, run: Run) -> None:
    _, ended = demonstration
    advice = [
        line.split()[1:] for line in ended.stdout.splitlines() if line.startswith("  stillroom --archive")
    ]
    assert len(advice) >= 4
    for words in advice:
        assert run(*words).exit_code == 0, words


@pytest.mark.slow
def test_coverage_in_any_unit_finds_the_same_sweeps(demonstration: Demonstration, run: Run) -> None:
    archive = ["--archive", str(demonstration[0] / "archive")]
    # 28 and 33 umol/m^2 times 6.02214076e23 per mol, in nm^-2.
    ranges = ["28:33 umol/m^2", "16.862:19.873 atoms/nm^2", "0.028:0.033 mmol/m^2"]
    found = [
        [row["address"] for row in parsed(run(*archive, "search", "--coverage", text, "--json"))]
        for text in ranges
    ]
    assert found[0]
    assert found[0] == found[1] == found[2]
    split = run(*archive, "search", "--coverage", "28:33", "umol/m^2", "--json")
    assert [row["address"] for row in parsed(split)] == found[0]


@pytest.mark.slow
def test_results_are_found_shown_traced_and_replayed(demonstration: Demonstration, run: Run) -> None:
    archive = ["--archive", str(demonstration[0] / "archive")]
    rows = parsed(run(*archive, "search", "--result", "T_KT=0.4:0.5 K", "--cell", "TO-4", "--json"))
    assert rows
    assert all(0.4 <= row["results"]["T_KT"]["value"] <= 0.5 for row in rows)
    sweep = parsed(run(*archive, "show", rows[0]["address"], "--json"))
    address = next(each["address"] for each in sweep["results"] if each["address"].endswith("#T_KT"))
    shown = parsed(run(*archive, "show", address, "--json"))
    assert (shown["address"], shown["what"]) == (address, "result")
    assert shown["value"] == rows[0]["results"]["T_KT"]["value"]
    tree = run(*archive, "trace", address)
    assert ":raw/" in tree.stdout
    assert "sha256" in tree.stdout
    replayed = parsed(run(*archive, "replay", address.partition("#")[0], "--strict", "--json"))
    assert replayed["identical"] is True


@pytest.mark.slow
def test_csv_and_layers_and_fixity_on_the_demonstration(demonstration: Demonstration, run: Run) -> None:
    archive = ["--archive", str(demonstration[0] / "archive")]
    table = run(*archive, "search", "--kind", "temperature-sweep", "--csv")
    header, *rows = csv.reader(io.StringIO(table.stdout))
    assert len(rows) > 5
    assert "T_KT (K)" in header
    layers = parsed(
        run(*archive, "convert", "2 layers", "--substrate", "PI-2200", "--to", "umol/m^2", "--json")
    )
    assert layers["value"] == pytest.approx(
        2 * 12.97, rel=1e-12
    )  # the layer that the demonstration's sheet states
    whole = run(*archive, "fixity", "--json")
    assert (whole.exit_code, parsed(whole)["whole"]) == (0, True)


@pytest.mark.slow
def test_the_index_is_rebuilt_and_nothing_is_lost(demonstration: Demonstration, run: Run) -> None:
    archive = ["--archive", str(demonstration[0] / "archive")]
    before = run(*archive, "search", "--json").stdout
    counts = parsed(run(*archive, "rebuild-index", "--json"))
    assert counts["accessions"] == 11
    assert run(*archive, "search", "--json").stdout == before
