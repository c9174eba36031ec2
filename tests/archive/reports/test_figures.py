"""Figures: each shipped plan has one, what is drawn is what was fitted, and what is not held is said and not drawn."""

from __future__ import annotations

import re
import xml.etree.ElementTree as ET
import zlib

import matplotlib as mpl
import numpy as np
import pytest

from archive import Archive
from archive.demo.bulk_cooldowns import make_bulk_folders
from archive.demo.current_cooldown import make_current_folders
from archive.demo.third_sound_cooldown import make_third_sound_folders
from archive.lab.reporting import view
from archive.reduction.planning import shipped_plans
from archive.reports import figures_bulk
from archive.reports.figure_plots import enlarged
from archive.reports.figure_style import STYLE, NoFigure
from archive.reports.figure_values import fact, scalar, step_of, taken
from archive.reports.figures import MAKERS, Drawn, Undrawn, figure_of, figures
from archive.reports.scope import Scope
from tests.archive.reports.factories import accession, film_view, reduction, view_of

SEED = 20260301
SMALLEST = 8.0
"""pt: the least size of text in print."""


@pytest.fixture(scope="module")
def scope(tmp_path_factory):
    """Give all reductions of liquid, currents and third sound."""
    place = tmp_path_factory.mktemp("figures")
    with Archive.create(place / "lab", name="Test laboratory") as lab:
        folders = [
            *make_bulk_folders(place / "in", seed=SEED), *make_current_folders(place / "in", SEED), *make_third_sound_folders(place / "in", SEED),
        ]  # fmt: skip
        addresses = []
        for folder in folders:
            assert lab.ingest(folder).state == "ingested"
            addresses += [each.address for each in lab.reduce(folder.name) if each.address is not None]
        yield Scope([view(lab._source, "Test laboratory", folder.name) for folder in folders], addresses)


@pytest.fixture(scope="module")
def drawn(scope):
    """All figures of these, by the file's name."""
    made = list(figures(scope))
    assert [each for each in made if isinstance(each, Undrawn)] == []
    return {each.name.removeprefix("figures/").removesuffix(".pdf"): each for each in made}


def of(scope, address):
    """Return a reduction by its address."""
    return next(each for each in scope.reductions if each.address == address)


def test_every_shipped_plan_has_a_figure():
    assert set(MAKERS) == {plan.name for plan in shipped_plans()}


NAMES = [
    "background-2025-08-s001", *(f"{plan}-2025-08-s00{k}" for plan in ("bulk-oscillator", "bulk-superfluid-density") for k in (2, 3, 4)),
    "empty-calorimeter-2025-11-s001", *(f"heat-capacity-2025-11-s00{k}" for k in (2, 3, 4)),
    "persistent-current-2026-06-s001", "persistent-current-2026-06-s002", "persistent-current-2026-06-s003", "persistent-current-2026-06-s004", "third-sound-2025-06-s001",
]  # fmt: skip


def test_each_reduction_is_drawn_once(drawn, scope):
    assert sorted(drawn) == NAMES
    sources = sorted(source for each in drawn.values() for source in each.sources)
    assert sources == sorted(each.address for each in scope.reductions)


def test_a_figure_as_svg_says_how_it_looks_in_attributes(scope):
    """What forbids style sheets shows it all the same: nothing is left to a default that would fill every line."""
    document = of(scope, "2025-08/s001@empty-cell.1")
    made = figure_of(scope, document, kind="svg")
    assert isinstance(made, Drawn)
    root = ET.fromstring(made.content)  # noqa: S314 - our own
    assert (root.get("stroke-linejoin"), root.get("stroke-linecap")) == ("round", "butt")
    every = list(root.iter())
    assert not [each for each in every if each.tag.endswith("}style") or "style" in each.attrib]
    lines = [each for each in every if each.get("fill") == "none"]
    assert lines
    assert all("stroke" in each.attrib for each in lines)
    assert figure_of(scope, document).content.startswith(b"%PDF")


def streams(content):
    """Return the inflated streams of a PDF."""
    found = re.findall(rb"stream\r?\n(.*?)\r?\nendstream", content, flags=re.DOTALL)
    inflated = []
    for each in found:
        try:
            inflated.append(zlib.decompress(each))
        except zlib.error:
            continue
    return inflated


@pytest.mark.parametrize("name", NAMES)
def test_a_figure_is_vector_pdf_without_a_date_and_large_enough_to_read(drawn, name):
    content = drawn[name].content
    assert content.startswith(b"%PDF")
    assert b"CreationDate" not in content
    assert b"/Subtype /Image" not in content
    # The size of a text stands before its operator; what is smaller are sub- and superscripts, 0.7 of their text.
    sizes = {float(size) for part in streams(content) for size in re.findall(rb"/F\S+ ([0-9.]+) Tf", part)}
    assert sizes
    assert min(sizes) >= 0.69 * SMALLEST
    assert max(sizes) >= SMALLEST


@pytest.mark.parametrize("name", NAMES)
def test_a_caption_names_its_sweep_and_its_uncertainties(drawn, name):
    caption = drawn[name].caption
    assert drawn[name].sources[0].partition("@")[0] in caption
    assert re.search(r"Results: .+\.|standard uncertainty", caption)
    assert "None" not in caption
    assert "nan" not in caption


def test_equal_data_give_equal_bytes(drawn, scope):
    name = "heat-capacity-2025-11-s002"
    with mpl.rc_context(STYLE):
        again = MAKERS["heat-capacity"](scope, of(scope, "2025-11/s002@heat-capacity.1"))
    assert again == drawn[name]


def test_the_law_of_the_heat_capacity_that_is_drawn_is_the_one_that_was_fitted(scope):
    document = of(scope, "2025-11/s002@heat-capacity.1")
    step = step_of(document, "lambda-heat-capacity")
    T, C, rise = (
        taken(scope, document, step, port) for port in ("temperature", "molar_heat_capacity", "rise")
    )
    u = scope.holdings_of(document).column(document.address, "molar_heat_capacity.point")
    T_lambda = scalar(document, "T_lambda")
    law = figures_bulk.fitted_law(document, fact(step, "delta"))
    t = np.abs(1 - T / T_lambda)
    inside = (t > fact(step, "low")) & (t < fact(step, "high"))
    r = (C - figures_bulk.mean_law(law, T, rise, T_lambda))[inside] / u[inside]
    # The scatter about the curve is that of the fit: seven parameters were free.
    assert np.sum(r**2) / (r.size - 7) == pytest.approx(fact(step, "reduced_chi2"), rel=0.02)


@pytest.mark.parametrize("plan", sorted(MAKERS))
def test_without_its_numbers_a_plan_has_no_figure_and_a_reason(plan):
    own = {
        "name": plan,
        "revision": 1,
        "title": "Test",
        "applies": {"sweep_kinds": ["temperature-sweep"]},
        "step": [{"use": "static-transition", "take": {}, "give": {}}],
    }
    view_ = view_of(accession(), reductions=(reduction(plan=own, outputs=[], steps=[]),))
    (made, *more) = figures(Scope([view_], ["2026-03/s001@film-transition.1"]))
    assert isinstance(made, Undrawn)
    assert made.address == "2026-03/s001@film-transition.1"
    assert re.search(r"the reduction has no |was not carried out|holds neither|no line was fitted", made.why)
    assert all(isinstance(each, Undrawn) for each in more)


def test_a_film_without_all_of_its_steps_is_drawn_with_what_there_is():
    made = list(figures(Scope([film_view()], ["2026-03/s001@film-transition.1"])))
    assert [each.name for each in made if isinstance(each, Drawn)] == [
        "figures/film-transition-2026-03-s001.pdf", "figures/areal-density-TO-4-r2.pdf",
    ]  # fmt: skip
    (missing,) = [each for each in made if isinstance(each, Undrawn)]
    assert missing.what.startswith("figure of the whole way")
    assert missing.why == "step period-drop was not carried out"


@pytest.mark.parametrize(
    ("largest", "unit", "factor", "shown"),
    [
        (3e-9, "s", 1e-9, "ns"), (0.9e-9, "s", 1e-12, "ps"), (7200.0, "s", 1.0, "s"), (20000.0, "s", 3600.0, "h"), (0.0, "s", 1e-12, "ps"),
        (2.5e-6, "1", 1e-6, "10$^{-6}$"), (0.3, "1", 1.0, ""), (2e5, "1", 1e5, "10$^{5}$"), (0.25, "K", 1e-3, "mK"), (3.0, "lm", 1.0, "lm"),
    ],
)  # fmt: skip
def test_values_are_shown_in_the_unit_that_reads_best(largest, unit, factor, shown):
    found, words = enlarged(np.array([np.nan, -largest, largest / 2]), unit)
    assert (found, words) == (pytest.approx(factor, rel=1e-12), shown)


def test_a_column_that_is_not_at_hand_is_named(scope):
    from archive.reports.figure_values import values_at

    for address in ("2020-01/s001#period", "2025-08/s001#no-such", "2025-08.a1"):
        with pytest.raises(NoFigure, match=re.escape(address)):
            values_at(scope, address)
