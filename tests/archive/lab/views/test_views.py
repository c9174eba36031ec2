"""Views of sweeps, reductions and results: plain arrays, units beside them, tables, and pieces of pages."""

from __future__ import annotations

import re
import sys
from collections.abc import Iterator
from pathlib import Path
from xml.etree import ElementTree

import numpy as np
import pytest

from archive import Archive
from archive.errors import BadRequest, UnknownAddress
from archive.index import SearchQuery
from archive.lab.views import Column, ReductionView, Result, RowList, SweepView
from archive.lab.views.choice import hours, pair
from archive.lab.views.pint_units import pint_quantity
from schemas.unit_names import NAMES, PREFIXES
from schemas.units import parse_unit
from tests.small_cooldown import write_folder

EVIL = '<script>alert("x")</script>'


@pytest.fixture(scope="module")
def lab(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Archive]:
    """Give an archive with a reduced cooldown, to be read only."""
    place = tmp_path_factory.mktemp("views")
    with Archive.create(place / "lab", name=f"Cold {EVIL}") as lab:
        lab.ingest(write_folder(place / "2026-03"))
        lab.reduce("2026-03")
        yield lab


@pytest.fixture
def sweep(lab: Archive) -> SweepView:
    """Give a sweep."""
    return lab.sweep("2026-03/s001")


@pytest.fixture
def reduction(lab: Archive) -> ReductionView:
    """Give a reduction with arrays."""
    for row in lab.results():
        found = lab.reduction(row.reduction)
        if found:
            return found
    raise AssertionError("no reduction has arrays")


def test_a_sweep_is_still_a_mapping_of_plain_arrays(sweep: SweepView) -> None:
    assert list(sweep) == ["time", "temperature", "period"]
    assert type(sweep["period"]) is np.ndarray
    assert {name: array.shape for name, array in sweep.items()} == dict.fromkeys(sweep, (60,))
    with pytest.raises(KeyError):
        sweep["pressure"]


def test_units_stand_beside_the_arrays(sweep: SweepView) -> None:
    assert sweep.units == {"time": "s", "temperature": "K", "period": "ms"}
    assert sweep.column("temperature").scale == "ITS-90"
    period = sweep.quantity("period").to("us")
    # The folder says 1 ms + 1e-6 ms/K x 0.2 K for the first row.
    assert period.magnitude[0] == pytest.approx(1000 + 2e-4, rel=1e-12)
    with pytest.raises(UnknownAddress, match="one of: time, temperature, period"):
        sweep.quantity("pressure")


def test_a_sweep_outlives_its_archive(tmp_path: Path) -> None:
    with Archive.create(tmp_path / "lab") as lab:
        lab.ingest(write_folder(tmp_path / "2026-03"))
        view = lab.sweep("2026-03/s001")
    assert view.to_pandas().shape == (60, 3)


@pytest.mark.parametrize(
    ("ask", "address", "words"),
    [
        ("sweep", "2026-03", "no sweep"),
        ("sweep", "2026-03/s099", "there is no sweep"),
        ("sweep", "???", "address"),
        ("reduction", "2026-03/s001", "no reduction"),
        ("reduction", "2026-03/s001@none.1", "there is no reduction"),
        ("result", "2026-03/s001#period", "no result"),
        ("result", "2026-03/s001@empty-cell.1#none", "one of: "),
    ],
)
def test_an_address_of_something_else_is_refused(lab: Archive, ask: str, address: str, words: str) -> None:
    with pytest.raises(UnknownAddress, match=words):
        getattr(lab, ask)(address)


def test_pandas_gets_times_units_and_uncertainties(sweep: SweepView, reduction: ReductionView) -> None:
    table = sweep.to_pandas()
    # 10:00 at +02:00, as the folder writes it.
    assert str(table["time"].iloc[0]) == "2026-03-03 08:00:00+00:00"
    assert table.attrs["units"] == {"temperature": "K", "period": "ms"}
    assert list(sweep.to_pandas(units_in_names=True)) == ["time", "temperature/K", "period/ms"]
    name = next(iter(reduction))
    np.testing.assert_array_equal(reduction.to_pandas()[f"{name}_uncertainty"], reduction.uncertainty(name))
    assert reduction.to_pandas().attrs["address"] == reduction.address


def test_xarray_gets_coordinates_and_units_as_attributes(sweep: SweepView, reduction: ReductionView) -> None:
    data = sweep.to_xarray()
    assert set(data.coords) == {"time", "temperature"}
    assert data.period.attrs["units"] == "ms"
    assert data.temperature.attrs["temperature_scale"] == "ITS-90"
    assert str(data.time.values[0]).startswith("2026-03-03T08:00:00")
    reduced = reduction.to_xarray()
    told = [name for name in reduced.variables if "ancillary_variables" in reduced[name].attrs]
    assert told
    for name in told:
        assert (
            reduced[reduced[name].attrs["ancillary_variables"]].attrs["units"] == reduced[name].attrs["units"]
        )


@pytest.mark.parametrize(("library", "call"), [("pandas", "to_pandas"), ("xarray", "to_xarray")])
def test_a_missing_library_is_told_with_what_to_install(
    sweep: SweepView, monkeypatch: pytest.MonkeyPatch, library: str, call: str
) -> None:
    monkeypatch.setitem(sys.modules, library, None)
    with pytest.raises(BadRequest, match=rf'pip install "stillroom\[{library}\]"'):
        getattr(sweep, call)()


def test_a_result_knows_its_unit_and_its_address(lab: Archive) -> None:
    row = next(row for row in lab.results() if row.unit == "s" and row.uncertainty)
    found = lab.result(f"{row.reduction}#{row.name}")
    assert (found.value, found.uncertainty, found.kind) == (row.value, row.uncertainty, row.quantity)
    assert found.quantity().to("ms").magnitude == pytest.approx(row.value * 1e3)
    assert repr(found).startswith(f"<{row.reduction}#{row.name}: ")
    assert lab.reduction(row.reduction).results[row.name] == found


def test_lists_are_lists_and_tables(lab: Archive) -> None:
    found = lab.search(SearchQuery())
    assert isinstance(found, list)
    assert found == list(found)
    assert list(found.to_pandas()["address"]) == [row.address for row in found]
    assert len(lab.results().to_pandas()) == len(lab.results())


def test_pieces_of_pages_are_well_formed_and_escaped(lab: Archive) -> None:
    row = lab.results()[0]
    shown = [
        lab,
        lab.search(SearchQuery()),
        lab.cooldowns(),
        lab.results(),
        lab.sweep("2026-03/s001"),
        lab.reduction(row.reduction),
        lab.result(f"{row.reduction}#{row.name}"),
    ]
    for each in shown:
        page = each._repr_html_()
        assert "<script" not in page
        assert ElementTree.fromstring(page).tag == "div"  # noqa: S314 - made here
    assert "alert" in lab._repr_html_()


def test_a_sweep_shows_a_small_picture_with_named_axes(sweep: SweepView) -> None:
    page = sweep._repr_html_()
    assert "<svg" in page
    assert "period/ms against temperature/K of 2026-03/s001" in page
    # 1 ms + 1e-6 T ms from 0.2 K to 0.79 K: less an offset, in ps. In the ink of the page, dark or light.
    assert re.search(r"\(P \u2212 1\.0+ ms\) / ps", page)
    assert "#000" not in page
    assert page.count("currentColor") > 60


def test_spaces_between_digits_and_units_are_kept(lab: Archive) -> None:
    row = next(each for each in lab.results() if each.unit == "K")
    shown = lab.result(f"{row.reduction}#{row.name}")._repr_html_()
    assert "\N{REPLACEMENT CHARACTER}" not in shown
    assert "\u00a0mK" in shown or "\u00a0K" in shown


def test_text_of_files_is_escaped_everywhere() -> None:
    column = Column(EVIL, "K", EVIL, np.array([1.0, 2.0]), description=EVIL)
    page = SweepView(EVIL, EVIL, [column], marks=[EVIL + "\x00\ud800"])._repr_html_()
    assert "<script" not in page
    assert page.encode()


def test_a_mark_is_seen_first(tmp_path: Path) -> None:
    with Archive.create(tmp_path / "lab") as lab:
        lab.ingest(write_folder(tmp_path / "2026-03"))
        lab.withdraw("2026-03/s001", why="the wrong cell was cabled", by="data steward")
        view = lab.sweep("2026-03/s001")
    assert "the wrong cell was cabled" in view.marks[0]
    for text in (repr(view), view._repr_html_(), view.to_xarray().attrs["marks"]):
        assert "the wrong cell was cabled" in text


@pytest.mark.parametrize("name", NAMES)
def test_every_unit_has_the_size_in_pint_that_it_has_here(name: str) -> None:
    for prefix in ("", *NAMES[name].prefixes):
        if prefix or NAMES[name].bare:
            unit = parse_unit(prefix + name)
            base = pint_quantity(1.0, prefix + name).to_base_units()
            # The base unit of mass is the kilogram here and in pint; degrees become radians in both.
            assert float(base.magnitude) == pytest.approx(float(unit.factor), rel=1e-9)
    assert set(NAMES[name].prefixes) <= set(PREFIXES)


@pytest.mark.parametrize(
    ("kind", "kinds", "expected"),
    [
        ("temperature-sweep", ("instant", "resistance", "period"), (1, 2)),
        ("temperature-sweep", ("instant", "temperature", "resistance", "period"), (1, 3)),
        ("isotherm", ("instant", "pressure", "amount"), (1, 2)),
        ("frequency-sweep", ("frequency", "amplitude"), (0, 1)),
        ("ringdown", ("instant", "amplitude"), (0, 1)),
        ("log", ("instant",), None),
    ],
)
def test_a_small_plot_shows_what_the_trade_plots(
    kind: str, kinds: tuple[str, ...], expected: tuple[int, int] | None
) -> None:
    columns = {f"c{k}": Column(f"c{k}", "1", each, np.arange(3.0)) for k, each in enumerate(kinds)}
    chosen = pair(kind, columns)
    assert (chosen and tuple(each.name for each in chosen)) == (expected and tuple(f"c{k}" for k in expected))


def test_a_column_without_numbers_is_not_plotted() -> None:
    empty = Column("p", "us", "period", np.full(3, np.nan))
    T = Column("T", "K", "temperature", np.arange(3.0))
    assert pair("temperature-sweep", {"T": T, "p": empty}) is None
    assert pair("temperature-sweep", {"T": T, "p": empty}, "p") is None
    assert "<svg" not in SweepView("a/b", "log", [T, empty])._repr_html_()
    assert hours(T) is T


def test_results_of_a_verdict_and_long_lists_are_shown(lab: Archive) -> None:
    rows = RowList(list(lab.search(SearchQuery())) * 30)
    assert f"and {len(rows) - 40} more" in rows._repr_html_()
    known = next(iter(lab.reduction(lab.results()[0].reduction).results.values()))
    entry = known.entry.model_copy(update={"value": None, "uncertainty": None, "verdict": "no peak in range"})
    none = Result(known.address, entry)
    assert np.isnan(none.quantity().magnitude)
    assert "no peak in range" in none._repr_html_()


def test_a_curve_beside_the_rows_is_kept_apart() -> None:
    columns = [
        Column("T", "K", "temperature", np.arange(3.0)),
        Column("p", "us", "period", np.arange(3.0)),
        Column("curve", "us", "period", np.arange(5.0), np.ones(5)),
    ]
    view = ReductionView("a/b@c.1", "temperature-sweep", columns)
    assert view.rows == 3
    assert list(view.to_pandas()) == ["T", "p"]
    assert dict(view.to_xarray().sizes) == {"row": 3, "row_5": 5}
    assert pair("temperature-sweep", view.columns, "curve") is None
    assert "p/us against T/K" in view._repr_html_()
