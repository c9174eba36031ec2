"""Names of results, long names, and articles as reports write them."""

from __future__ import annotations

import pytest

from archive.reports.prose import article, breakable, symbol_of


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
