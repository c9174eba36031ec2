"""The plane: what stands where, and that nothing is lost where bars are merged."""

from __future__ import annotations

import math
from collections.abc import Iterator
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import constants
from sqlalchemy.dialects import sqlite

from archive.index import Index, SearchQuery
from archive.index.plane_queries import plane_results, plane_sweeps
from archive.lab.plane import plane
from archive.lab.plane_window import first_window, inside, strips_of, thinned_points, whole_of
from archive.lab.source import LabSource
from archive.physics.film_static import onset_coverage
from archive.reports.plane_figure import plane_figure
from archive.reports.plane_layout import side_by_side
from archive.reports.plane_remarks import line_remarks, remarks
from archive.reports.plane_ticks import round_values
from archive.reports.plane_view import Bar, PlaneView, Point, Window
from archive.store.memory import MemoryStore
from tests.archive.index import documents as make
from tests.plane_archive import planed

LINEAR = (False, False)


@pytest.fixture(scope="module")
def source(tmp_path_factory: pytest.TempPathFactory) -> Iterator[LabSource]:
    """Give what the plane is read from."""
    root = planed(tmp_path_factory.mktemp("plane") / "lab")
    with Index.open(f"sqlite:///{root}/index.sqlite3") as index:
        yield LabSource(MemoryStore(), index)


def _names(view: PlaneView) -> list[str]:
    return sorted(bar.address.partition("/")[2] for bar in view.bars)


def test_every_sweep_with_a_place_is_a_bar_and_the_others_are_counted(source: LabSource) -> None:
    view = plane(source, SearchQuery())
    asked = source.index.search(SearchQuery(limit=None))
    placed = {
        row.address: (row.coverage, row.temperature_low)
        for row in asked
        if row.coverage is not None and row.temperature_low is not None
    }
    flat = {bar.address: (bar.top, bar.cold) for bar in view.bars if bar.kind != "dose-run"}
    assert flat == placed
    doses = {bar.address: (bar.bottom, bar.top) for bar in view.bars if bar.kind == "dose-run"}
    assert doses == {
        "2025-01/d1": pytest.approx((5e-6, 28e-6)),
        "2025-01/t1": pytest.approx((30e-6, 50e-6)),
    }
    assert view.sweeps == len(asked) == 9
    assert dict(view.unplaced) == {"a temperature": 1, "a place on this axis": 1}
    assert (view.outside, view.merged, view.strips) == (0, 0, ())
    (one_end,) = (bar for bar in view.bars if bar.address.endswith("/s4"))
    assert one_end.cold == one_end.warm == 0.1


def test_a_cell_keeps_its_look_whatever_is_left_out(source: LabSource) -> None:
    every, some = plane(source, SearchQuery()), plane(source, SearchQuery(cell="PG-2"))
    assert [name for name, _ in every.cells][:1] == ["TO-4"], "the first that was used"
    assert some.cells == tuple(each for each in every.cells if each[0] == "PG-2")
    assert len({look for _, look in every.cells}) == len(every.cells)
    assert {bar.look for bar in every.bars if bar.cell == "TO-4"} == {0}, "revisions are one cell"


def test_transitions_stand_at_their_results_with_both_uncertainties(source: LabSource) -> None:
    points = {point.address: point for point in plane(source, SearchQuery()).points}
    assert sorted(points) == [
        "2025-01/s1@film-transition.2#T_KT",
        "2025-01/s3@porous-film.1#T_c",
        "2025-01/t1@third-sound.1#transition_coverage",
    ], "one for each current reduction, the first of its headline"
    film = points["2025-01/s1@film-transition.2#T_KT"]
    assert (film.temperature, film.temperature_uncertainty) == (0.41, 0.002)
    assert (film.height, film.height_uncertainty) == pytest.approx((30e-6, 0.5e-6))
    third_sound = points["2025-01/t1@third-sound.1#transition_coverage"]
    assert (third_sound.temperature, third_sound.height) == pytest.approx((0.6, 29e-6))
    assert third_sound.height_uncertainty == pytest.approx(0.1e-6)


def test_the_slope_of_the_line_is_the_universal_jump() -> None:
    """Nelson and Kosterlitz, Phys. Rev. Lett. 39, 1201 (1977): 2 m^2 k/(pi hbar^2) a kelvin; the mass of 4He from CODATA's alpha particle and two electrons."""
    mass = constants.value("alpha particle mass") + 2 * constants.m_e  # less 79 eV of binding, 2e-8 of it
    per_kelvin = 2 * mass**2 * constants.k / (math.pi * constants.hbar**2) / (mass * constants.N_A)
    found = float(onset_coverage(1.0, inert_coverage=24e-6)) - 24e-6
    assert found == pytest.approx(per_kelvin, rel=1e-6)
    assert found == pytest.approx(8.72272e-6, rel=1e-6)


def test_each_cell_has_its_line_from_its_own_inert_layer_else_from_zero(source: LabSource) -> None:
    view = plane(source, SearchQuery(kind="temperature-sweep"))
    lines = {line.cell: line for line in view.lines}
    assert lines["TO-4"].source == "2025-01/d1@dose-run.1#onset_coverage", (
        "though the dose run is filtered away"
    )
    assert (lines["TO-4"].inert, lines["TO-4"].inert_uncertainty) == pytest.approx((24e-6, 0.4e-6))
    assert (lines["NEW-1"].inert, lines["NEW-1"].source, lines["NEW-1"].look) == (0.0, None, None)
    assert set(lines) == {"TO-4", "NEW-1"}, "no other cell has a film in the picture"
    assert view.in_pores == ("PG-2",)
    assert "PG-2" not in lines
    third_sound = {line.cell: line for line in plane(source, SearchQuery()).lines}["TS-1"]
    # By hand: 29 umol/m^2 less 8.72272 umol/m^2 a kelvin at 0.6 K.
    assert third_sound.inert == pytest.approx(23.766368e-6, rel=1e-6)


@pytest.mark.parametrize(
    ("query", "state", "expected"),
    [
        pytest.param({"cell": "TO-4.r2"}, "any", ["s2"], id="cell by revision"),
        pytest.param({"substrate": "glass"}, "any", ["s3"], id="substrate"),
        pytest.param({"kind": "dose-run"}, "any", ["d1", "t1"], id="kind"),
        pytest.param({"since": datetime(2026, 3, 5, tzinfo=UTC)}, "any", [], id="date"),
        pytest.param({"cooldown": "2025-01", "until": make.BEGIN + timedelta(hours=5)}, "any", ["e1", "s1", "s2"], id="until"),
        pytest.param({}, "reduced", ["d1", "s1", "s3", "t1"], id="reduced"),
        pytest.param({"kind": "temperature-sweep"}, "not reduced", ["e1", "s2", "s4"], id="not reduced"),
        pytest.param({}, "withdrawn", ["w1"], id="withdrawn"),
        pytest.param({"coverage": (30.5e-6, 34e-6)}, "any", ["s2", "s3"], id="coverage"),
    ],
)  # fmt: skip
def test_filters(source: LabSource, query: dict[str, Any], state: Any, expected: list[str]) -> None:
    assert _names(plane(source, SearchQuery(**query), state=state)) == expected


def test_a_part_shows_what_reaches_into_it_and_nothing_else_is_asked_for(source: LabSource) -> None:
    part = Window(0.65, 0.8, 29e-6, 34e-6)
    view = plane(source, SearchQuery(), window=part)
    assert _names(view) == ["s2", "s3"]
    assert (view.sweeps, view.outside, view.points, view.window) == (2, None, (), part)
    assert next(remarks(view)) == "2 sweeps in this part of the plane."
    assert {"TO-4", "TS-1"} <= {line.cell for line in view.lines}, (
        "lines go through a part where no bar of theirs is"
    )
    dosed = plane(source, SearchQuery(), window=Window(0.0, 0.03, 4e-6, 6e-6))
    assert _names(dosed) == ["d1"], "a dose run states no coverage, its doses do"


def test_what_was_looked_at_is_kept_until_something_comes_in(tmp_path: Path) -> None:
    with Index.create(f"sqlite:///{tmp_path}/index.sqlite3") as index:
        empty = plane(LabSource(MemoryStore(), index), SearchQuery())
        assert empty.sweeps == 0
        assert plane(LabSource(MemoryStore(), index), SearchQuery()) is empty
        index.rebuild([make.entry(make.accession())])
        assert plane(LabSource(MemoryStore(), index), SearchQuery()).sweeps == 1


def test_other_axes(source: LabSource) -> None:
    pressure = plane(source, SearchQuery(), axis="pressure")
    (bar,) = pressure.bars
    assert (bar.address, bar.bottom, bar.top) == ("2025-01/i1", pytest.approx(2e3), pytest.approx(3e4))
    cells = plane(source, SearchQuery(), axis="cell")
    assert [name for name, _ in cells.lanes] == ["TS-1", "TO-4", "PG-2", "NEW-1", "AC-1"], (
        "from below, so that names read from above"
    )
    assert {math.floor(bar.top) for bar in cells.bars if bar.cell == "PG-2"} == {2}
    assert cells.lines == ()


def test_a_few_sweeps_far_above_all_others_do_not_squeeze_them() -> None:
    films = [_bar(number, 0.1, 0.5, 30e-6 + number * 1e-7) for number in range(9)]
    window = first_window([*films, _bar(99, 1.3, 2.1, 0.017)], log=LINEAR)
    assert 30.8e-6 < window.top < 35e-6
    assert 0.5 < window.warm < 0.6
    assert first_window([*films[:2], _bar(99, 0.1, 0.5, 1.0)], log=LINEAR).top > 1.0, (
        "one of three is not a few"
    )


def _bar(number: int, cold: float, warm: float, height: float, look: int = 0) -> Bar:
    return Bar(f"2025-01/s{number}", "log", f"C-{look}", look, None, cold, warm, height, height, None)


_bars = st.lists(
    st.tuples(st.floats(0, 1), st.floats(0, 1), st.floats(1, 2), st.integers(0, 4)), min_size=1, max_size=60
)


@settings(max_examples=150)
@given(drawn=_bars, most=st.integers(5, 40), log=st.booleans())
def test_strips_lose_no_sweep_and_no_extreme(*, drawn: list[tuple[float, ...]], most: int, log: bool) -> None:
    bars = [_bar(n, 0.01 + min(a, b), 0.01 + max(a, b), y, int(look)) for n, (a, b, y, look) in enumerate(drawn)]  # fmt: skip
    window = whole_of(bars, log=(log, log))
    strips = strips_of(bars, window, most=most, log=(log, log))
    assert len(strips) <= most
    assert sum(strip.count for strip in strips) == len(bars)
    for look in {bar.look for bar in bars}:
        own, merged = [b for b in bars if b.look == look], [s for s in strips if s.look == look]
        assert min(b.cold for b in own) == min(s.cold for s in merged)
        assert max(b.warm for b in own) == max(s.warm for s in merged)
        assert min(b.bottom for b in own) == min(s.bottom for s in merged)
        assert max(b.top for b in own) == max(s.top for s in merged)
    for bar in bars:
        assert inside(bar, window)
        assert any(
            s.look == bar.look and s.cold <= bar.cold and bar.warm <= s.warm and s.bottom <= bar.bottom <= s.top
            for s in strips
        )  # fmt: skip


def test_too_many_points_are_thinned_but_the_outermost_stay() -> None:
    points = [
        Point(f"2025-01/s{k}@p.1#T", f"2025-01/s{k}", "T", "C", 0, 0.3 + k * 1e-5, None, 3e-5 + k * 1e-10, None)
        for k in range(500)
    ]  # fmt: skip
    window = Window(0.0, 1.0, 0.0, 5e-5)
    assert thinned_points(points, window, most=500, log=LINEAR) == tuple(points)
    kept = thinned_points(points, window, most=20, log=LINEAR)
    assert len(kept) <= 20
    assert {points[0], points[-1]} <= set(kept)


def test_bars_at_one_height_stand_side_by_side_where_they_would_cover_each_other() -> None:
    bars = [
        _bar(1, 0.1, 0.5, 3e-5),
        _bar(2, 0.1, 0.5, 3e-5),
        _bar(3, 0.1, 0.5, 3e-5),
        _bar(4, 0.6, 0.7, 3e-5),
        _bar(5, 0.1, 0.5, 4e-5),
    ]
    places = side_by_side(bars)
    assert [places[bar.address] for bar in bars] == [0, 1, -1, 0, 0]


@pytest.mark.parametrize(
    ("low", "high", "log", "expected"),
    [
        (0.0, 5.7e1, False, [0.0, 10.0, 20.0, 30.0, 40.0, 50.0]),
        (0.41, 0.44, False, [0.41, 0.415, 0.42, 0.425, 0.43, 0.435, 0.44]),
        (0.0046, 134.0, True, [0.01, 0.1, 1.0, 10.0, 100.0]),
        (1e-30, 1e30, True, [1e-27, 1e-18, 1e-9, 1.0, 1e9, 1e18, 1e27]),
        (1.9, 2.3, True, [1.9, 2.0, 2.1, 2.2, 2.3]),
    ],
)
def test_round_values(*, low: float, high: float, log: bool, expected: list[float]) -> None:
    assert round_values(low, high, log=log) == expected


@pytest.mark.parametrize("axis", ["coverage", "pressure", "cell"])
def test_the_figure_is_made_twice_the_same(source: LabSource, axis: Any) -> None:
    view = plane(source, SearchQuery(), axis=axis)
    drawn = plane_figure(view, kind="svg")
    assert drawn == plane_figure(view, kind="svg")
    assert plane_figure(view)[:5] == b"%PDF-"


def test_the_picture_says_what_it_leaves_out_and_assumes(source: LabSource) -> None:
    view = plane(source, SearchQuery())
    said = " ".join((*remarks(view), *line_remarks(view))).replace("\N{NO-BREAK SPACE}", " ")
    for words in (
        "9 sweeps, 7 of them shown",
        "1 sweep without a temperature",
        "8.723 µmol·m⁻² per kelvin",
        "Thermal excitations",
        "NEW-1: no inert layer has been found, so the line begins at zero",
        "TO-4: above an inert layer of 24.00(40) µmol·m⁻², from 2025-01/d1@dose-run.1#onset_coverage",
        "PG-2: no line, since a film on the walls of pores has no universal jump",
    ):
        assert words.casefold() in said.casefold(), words


def test_withdrawn_sweeps_say_so(source: LabSource) -> None:
    (bar,) = plane(source, SearchQuery(), state="withdrawn").bars
    assert bar.marks == ("withdrawn", "not reduced")
    marks = {
        bar.address.partition("/")[2]: bar.marks for bar in plane(source, SearchQuery(withdrawn=True)).bars
    }
    assert (marks["w1"], marks["s1"], marks["e1"]) == (bar.marks, (), ("empty cell", "not reduced"))


def test_a_part_is_looked_up_and_not_sought(source: LabSource) -> None:
    """No table is gone through from end to end for the sweeps and transitions between some edges."""
    sweeps = plane_sweeps(
        SearchQuery(temperature=(0.1, 0.2)), amended=False, anything_withdrawn=False, cells=["TO-4.r1"], between=(1e-6, 2e-6)
    )  # fmt: skip
    for asked in (sweeps, plane_results(("T_KT", "T_c"), low=0.1, high=0.2)):
        sql = asked.compile(dialect=sqlite.dialect(), compile_kwargs={"literal_binds": True})  # type: ignore[no-untyped-call]
        with source.index._engine.connect() as connection:
            plan = [str(row[3]) for row in connection.exec_driver_sql(f"EXPLAIN QUERY PLAN {sql}")]
        assert any("SEARCH" in line for line in plan)
        assert [line for line in plan if line.startswith("SCAN")] == []
