"""The slim rows that the plane is drawn from, on both engines."""

from __future__ import annotations

from dataclasses import replace

from archive.index import Index, PlaneSweep, SearchQuery, Span
from tests.archive.index.test_acts import entries
from tests.plane_archive import documents


def _names(rows: list[PlaneSweep]) -> list[str]:
    return [row.address.partition("/")[2] for row in rows]


def test_the_rows_of_the_plane(index: Index) -> None:
    index.rebuild(entries(documents()))
    rows = index.plane_sweeps(SearchQuery())
    assert _names(rows) == ["e1", "s1", "s3", "s2", "none", "s4", "d1", "i1", "t1"], "by coverage, none last"
    assert rows[1] == PlaneSweep(
        "2025-01/s1", "temperature-sweep", "TO-4.r1", "PI-240.r1", "2026-03-02T08:10:00.000000Z", 0, 30e-6, 0.5e-6, 0.05, 0.6,
        reduced=True, withdrawn=False,
    )  # fmt: skip
    too = {row.address: row.withdrawn for row in index.plane_sweeps(SearchQuery(withdrawn=True))}
    assert [address for address, withdrawn in too.items() if withdrawn] == ["2025-01/w1"]
    cells = [use.cell for use in index.cells_and_substrates() if use.cell is not None]
    warm = SearchQuery(temperature=(0.0, 0.65))
    assert _names(index.plane_sweeps(warm, cells=cells, between=(30e-6, 31e-6))) == ["s1", "s3"]
    assert _names(index.plane_sweeps(warm, cells=cells)) == ["d1", "t1"]
    some = replace(warm, withdrawn=True, cell="TO-4")
    assert _names(index.plane_sweeps(some, cells=cells, between=(29e-6, 30e-6))) == ["w1", "s1"]


def test_what_is_found_and_dosed(index: Index) -> None:
    index.rebuild(entries(documents()))
    found = index.plane_results(("T_KT", "T_c"), low=0.41, high=0.6)
    assert [(row.reduction, row.value) for row in found] == [
        ("2025-01/s1@film-transition.2", 0.41),
        ("2025-01/s3@porous-film.1", 0.5),
    ]
    assert index.plane_results(("crossing_temperature",)) == [], "no headline of its plan"
    assert [row.value for row in index.plane_results(("crossing_temperature",), headline=False)] == [0.43]
    assert index.dosed_spans() == [
        Span("2025-01/d1", "mol/m^2", 5e-6, 28e-6),
        Span("2025-01/t1", "mol/m^2", 30e-6, 50e-6),
    ]
    assert index.spans("pressure") == [Span("2025-01/i1", "kPa", 2.0, 30.0)]
    assert index.record_contents(["glass.r1", "nothing.r1"])["glass.r1"]["pore_diameter"]["value"] == 7.0
    assert index.stamp()[1] == len(documents())
