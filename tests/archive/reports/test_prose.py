"""Names of results, long names, and articles as reports write them."""

from __future__ import annotations

import pytest

from archive.reports.prose import article, breakable, prose, symbol_of


@pytest.mark.parametrize(
    ("name", "shown"),
    [("T_KT", "T_KT"), ("T_KT_by_fit", "T_KT by fit"), ("x_at_monolayer", "x at monolayer"), ("mass_sensitivity", "mass sensitivity"), ("b", "b")],
)  # fmt: skip
def test_a_result_s_name_is_a_symbol_or_words_or_both(name, shown):
    assert symbol_of(name).plain == shown


def test_a_long_name_breaks_after_its_marks_and_not_within_its_date():
    pieces = breakable("2025-11/s001@film-transition.1").split("\u200b")
    assert pieces[:3] == ["2025-11/", "s001@", "film-"]
    assert "".join(pieces) == "2025-11/s001@film-transition.1"
    assert breakable("2025-11/s001") == "2025-11/s001"


@pytest.mark.parametrize(
    ("words", "expected"),
    [("annulus", "an"), ("cylinder", "a"), ("U-tube", "a"), ("Ellipsoid", "an"), ("", "a")],
)
def test_a_shape_takes_its_article(words, expected):
    assert article(words) == expected


@pytest.mark.parametrize(
    ("words", "latex", "page"),
    [
        ("(A/alpha) t^-alpha + B", r"\ensuremath{\alpha}) \ensuremath{t^{-\alpha}} + B", "<i>t</i><sup>\u2212α</sup> + B"),
        ("xi_0T (A^-/k_B)^(1/3)", r"\ensuremath{\xi_{\mathrm{0T}}} (\ensuremath{A^{-}}/", "<i>A</i><sup>\u2212</sup>/<i>k</i><sub>B</sub>)<sup>1/3</sup>"),
        ("|t|^-alpha", r"\textbar{}\ensuremath{^{-\alpha}}", "|t|<sup>\u2212α</sup>"),
        ("D t^0.5 and v^(1 + m)", r"D \ensuremath{t^{0.5}} and \ensuremath{v^{1 + m}}", "<i>v</i><sup>1 + m</sup>"),
        ("k_B T/(hbar^2 rho_s)", r"(\ensuremath{\hbar^{2}} \ensuremath{\rho_{s}})", "<i>ħ</i><sup>2</sup>"),
        ("Gamma = 27 K layer^3", r"\ensuremath{\Gamma} = \val{27}{27}{K}{K} layer\ensuremath{^{3}}", "layer<sup>3</sup>"),
        ("with 27.395 cm^3/mol", r"\val{27.395}{27.395}{cm^{3}.mol^{-1}}{cm^{3}\,mol^{-1}}", "27.395\u00a0cm³·mol⁻¹"),
    ],
)  # fmt: skip
def test_formulas_are_set_and_not_typed(words, latex, page):
    found = prose(words)
    assert latex in found.latex
    assert page in found.__html__()
