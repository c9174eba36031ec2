"""`stillroom search`: what is asked of the index, and how the answer is written."""

from __future__ import annotations

import csv
import io
from collections.abc import Callable
from dataclasses import replace
from datetime import UTC, datetime
from types import SimpleNamespace
from typing import get_args

import pytest
from click.testing import Result

from archive.index import ResultCondition, SearchQuery
from schemas.search_fields import SWEEP_KINDS
from schemas.sweep import SweepKind
from tests.archive.commands.support import ROW, FakeArchive, parsed

Run = Callable[..., Result]
Fake = Callable[..., FakeArchive]


def _query(archive: FakeArchive) -> SearchQuery:
    (query,) = next(arguments for verb, arguments, _ in archive.asked if verb == "search")
    assert isinstance(query, SearchQuery)
    return query


def test_the_kinds_of_the_help_are_those_of_the_schema() -> None:
    assert get_args(SweepKind) == SWEEP_KINDS


def test_every_option_reaches_the_query(run: Run, fake: Fake) -> None:
    archive = fake()
    result = run(
        "search", "porous", "glass", "--coverage", "20:35 umol/m^2", "--temperature", "400 mK:0.8 K", "--cell", "TO-4",
        "--substrate", "PI-2200", "--sample", "He4-well", "--thermometer", "RX-2", "--scale", "PLTS-2000", "--kind",
        "temperature-sweep", "--plan", "film-transition", "--cooldown", "2026-03", "--with-gas", "--since", "2026-01-01",
        "--until", "2026-12-31T00:00:00+02:00", "--sort", "coverage", "--descending", "--limit", "7", "--offset", "3",
        "--result", "T_KT=0.4:0.6 K", "--result", "T_KT",
    )  # fmt: skip
    assert result.exit_code == 0, result.stderr
    assert _query(archive) == SearchQuery(
        coverage=(20e-6, 35e-6), temperature=(0.4, 0.8), scale="PLTS-2000", cell="TO-4", substrate="PI-2200",
        sample="He4-well", thermometer="RX-2", kind="temperature-sweep", plan="film-transition", empty_cell=False,
        since=datetime(2026, 1, 1, tzinfo=UTC), until=datetime.fromisoformat("2026-12-31T00:00:00+02:00"),
        results=(ResultCondition("T_KT", 0.4, 0.6), ResultCondition("T_KT")), text="porous glass", cooldown="2026-03",
        sort="coverage", descending=True, limit=8, offset=3,
    )  # fmt: skip


@pytest.mark.parametrize(
    ("words", "bounds"),
    [
        pytest.param(["--coverage", "20:35 umol/m^2"], (20e-6, 35e-6), id="one-word"),
        pytest.param(["--coverage", "20:35", "umol/m^2"], (20e-6, 35e-6), id="two-words"),
        pytest.param(["--coverage=20:35", "umol/m^2"], (20e-6, 35e-6), id="equals"),
        # 1 atom/nm^2 = 1e18/6.02214076e23 mol/m^2
        pytest.param(
            ["--coverage", "12:18 atoms/nm^2"], (12e18 / 6.02214076e23, 18e18 / 6.02214076e23), id="atoms"
        ),
        pytest.param(
            ["--coverage", "2:", "layers", "--substrate", "PI-2200"], (2 * 12.97e-6, None), id="layers"
        ),
    ],
)
def test_any_coverage_unit_in_one_word_or_two(
    words: list[str], bounds: tuple[float, float | None], run: Run, fake: Fake
) -> None:
    archive = fake()
    result = run("search", *words)
    assert result.exit_code == 0, result.stderr
    query = _query(archive)
    assert query.coverage is not None
    assert query.coverage[0] == pytest.approx(bounds[0], rel=1e-12)
    assert query.coverage[1] == (None if bounds[1] is None else pytest.approx(bounds[1], rel=1e-12))
    assert query.text is None


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        pytest.param(["--coverage", "20:35"], "--coverage: found '20' without a unit", id="no-unit"),
        pytest.param(["--coverage", "20:35 K"], "expected a coverage", id="wrong-unit"),
        pytest.param(["--coverage", "2:3 layers"], "--substrate NAME", id="layers-without-substrate"),
        pytest.param(["--coverage", "31 umol/m^2"], "expected a range", id="no-range"),
        pytest.param(["--temperature", "0.4:0.8 MK"], "MK is a million kelvin", id="megakelvin"),
        pytest.param(["--temperature", "0.4:0.8 K on T58"], "--scale T58", id="scale-behind-a-range"),
        pytest.param(["--result", "T_X=0.4:0.6 K"], "no reduction here has a result T_X; expected one of: T_KT", id="unknown-result"),
        pytest.param(["--result", "T_KT=0.4:0.6 Pa"], "expected a temperature", id="unit-of-another-quantity"),
        pytest.param(["--result", "T_KT 0.4"], "name of a result", id="no-equals"),
        pytest.param(["--since", "yesterday"], "--since: found 'yesterday'", id="no-date"),
        pytest.param(["--until", "2026-01-01T10:00"], "without its offset", id="no-offset"),
        pytest.param(["--kind", "sweep"], "temperature-sweep", id="unknown-kind"),
        pytest.param(["--csv", "--json"], "exclude each other", id="csv-and-json"),
        pytest.param(["--limit", "0"], "--limit", id="no-limit"),
    ],
)  # fmt: skip
def test_what_cannot_be_searched_for_is_refused(
    words: list[str], sentence: str, run: Run, fake: Fake
) -> None:
    fake()
    result = run("search", *words)
    assert result.exit_code == 2
    assert sentence in result.stderr
    assert result.stdout == ""


def test_a_result_that_is_two_quantities_is_asked_about(run: Run, fake: Fake) -> None:
    fake(
        result_quantities=["frequency", "temperature"],
        results=[
            SimpleNamespace(name="width", quantity=quantity) for quantity in ("temperature", "frequency")
        ],
    )
    result = run("search", "--result", "width=1:2 K")
    assert result.exit_code == 2
    assert "not the same quantity" in result.stderr


def test_the_table_shows_coverage_results_and_verdicts(run: Run, fake: Fake) -> None:
    fake()
    result = run("search")
    line = result.stdout.splitlines()[2]
    assert line.split() == [
        "2026-03/s017", "temperature-sweep", "2026-03-02", "TO-4.r2", "31.420(60)", "0.055-0.8",
        "T_KT", "=", "0.7312(12)", "K", "exponent", "=", "no", "transition", "in", "range",
    ]  # fmt: skip
    assert result.stdout.splitlines()[-1] == "1 sweep."


def test_an_empty_answer_is_fine(run: Run, fake: Fake) -> None:
    fake(search=[])
    assert run("search").stdout == "No sweeps.\n"
    assert parsed(run("search", "--json")) == []


def test_more_than_the_limit_is_said(run: Run, fake: Fake) -> None:
    fake(search=[ROW, ROW])
    result = run("search", "--limit", "1")
    assert "1 sweep." in result.stdout
    assert "only the first 1" in result.stderr


def test_json_gives_quantities_addresses_and_times(run: Run, fake: Fake) -> None:
    fake()
    (row,) = parsed(run("search", "--json"))
    assert row["address"] == "2026-03/s017"
    assert row["begin"] == "2026-03-02T09:10:00+00:00"
    assert row["end"] is None
    assert row["coverage"] == {"value": 31.42e-6, "uncertainty": 0.06e-6, "unit": "mol/m^2"}
    assert row["temperature_low"] == {"value": 0.055, "uncertainty": None, "unit": "K", "scale": "PLTS-2000"}
    assert row["results"]["T_KT"] == {"value": 0.73124, "uncertainty": 0.00119, "unit": "K"}
    assert row["results"]["exponent"]["verdict"] == "no transition in range"


def test_csv_names_units_and_holds_full_precision(run: Run, fake: Fake) -> None:
    fake(search=[ROW, replace(ROW, address="2026-03/s018", results=(), cell="=cmd()")])
    header, first, second = csv.reader(io.StringIO(run("search", "--csv").stdout))
    row = dict(zip(header, first, strict=True))
    assert row["coverage (mol/m^2)"] == "3.142e-05"
    assert row["T_KT (K)"] == "0.73124"
    assert row["u(T_KT) (K)"] == "0.00119"
    assert row["exponent (1)"] == "no transition in range"
    assert dict(zip(header, second, strict=True))["cell"] == "'=cmd()"
    assert dict(zip(header, second, strict=True))["T_KT (K)"] == ""


def test_text_from_sheets_cannot_steer_the_terminal(run: Run, fake: Fake) -> None:
    fake(search=[replace(ROW, cell="TO\x1b[2J-4")])
    assert "\x1b" not in run("search").stdout
