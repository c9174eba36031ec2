"""What is left out of a picture is never an extreme, a gap or an end; a long column and its survey show the same."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from archive.lab.curves import survey as surveys
from archive.lab.curves.survey import Points, seen, surveyed
from archive.lab.curves.thinned import POINTS_PER_BUCKET, kept_in_buckets, kept_rows

NUMBERS = st.one_of(
    st.floats(-1e6, 1e6), st.just(math.nan), st.sampled_from([0.0, 1.0, -1.0, math.inf, -math.inf])
)


@st.composite
def pairs(draw: st.DrawFn, *, longest: int = 300) -> tuple[np.ndarray, np.ndarray]:
    """Two columns of equal length, x rising or not, with gaps."""
    rows = draw(st.integers(0, longest))
    seed = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    x = np.cumsum(seed.random(rows)) if draw(st.booleans()) else seed.standard_normal(rows)
    y = seed.standard_normal(rows)
    for values in (x, y):
        for row, value in draw(st.lists(st.tuples(st.integers(0, max(rows - 1, 0)), NUMBERS), max_size=6)):
            if rows and values is y:
                values[row] = value
            elif rows:
                values[row] = math.nan
    for _ in range(draw(st.integers(0, 2)) if rows else 0):
        start = draw(st.integers(0, rows - 1))
        y[start : start + draw(st.integers(1, rows))] = math.nan
    return x, y


@given(pairs(), st.integers(POINTS_PER_BUCKET, 120))
def test_rows_kept_are_few_ordered_and_hold_the_extremes(
    pair: tuple[np.ndarray, np.ndarray], most: int
) -> None:
    x, y = pair
    rows = kept_rows(x, y, most)
    assert rows.size <= most
    assert (np.diff(rows) > 0).all()
    assert rows.size == x.size or x.size > most
    known = np.isfinite(x) & np.isfinite(y)
    kept = known[rows]
    assert kept.any() == known.any()
    if known.any():
        for values in (x, y):
            assert values[rows][kept].min() == values[known].min()
            assert values[rows][kept].max() == values[known].max()
        every = np.flatnonzero(known)
        assert every[0] in rows
        assert every[-1] in rows


@given(pairs(), st.integers(1, 40))
def test_each_bucket_keeps_its_own_extremes_and_its_gap(
    pair: tuple[np.ndarray, np.ndarray], size: int
) -> None:
    x, y = pair
    rows = kept_in_buckets(x, y, size)
    known = np.isfinite(x) & np.isfinite(y)
    for start in range(0, x.size, size):
        own = np.arange(start, min(start + size, x.size))
        kept = rows[(rows >= start) & (rows < start + size)]
        assert (~known[own]).any() == (~known[kept]).any()
        if known[own].any():
            assert np.nanmax(y[own][known[own]]) in y[kept]
            assert np.nanmin(y[own][known[own]]) in y[kept]


def test_too_few_points_for_the_extremes_are_refused() -> None:
    with pytest.raises(ValueError, match="at least 7"):
        kept_rows(np.zeros(10), np.zeros(10), 6)


@given(
    pairs(longest=3000),
    st.floats(-3, 60),
    st.floats(0.001, 60),
    st.sampled_from([40, 400, 10_000]),
    st.booleans(),
)
def test_a_view_is_a_slice_of_all_rows(
    pair: tuple[np.ndarray, np.ndarray], low: float, width: float, most: int, length: str
) -> None:
    x, y = pair
    high = low + width
    u = np.abs(y) / 10

    def read(start: int, stop: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        assert 0 <= start <= stop <= x.size
        return x[start:stop], y[start:stop], u[start:stop]

    with pytest.MonkeyPatch.context() as patch:
        # Small columns are looked through as long ones are: little is read exactly, buckets are short.
        patch.setattr(surveys, "EXACT_ROWS", 200)
        patch.setattr(surveys, "_SMALLEST_BUCKET", 8)
        patch.setattr(surveys, "_BLOCK", 64)
        patch.setattr(surveys, "_NEAR", 16)
        found = seen(surveyed(read, x.size) if length == "long" else None, read, x.size, low, high, most)
    _is_view(found, x, y, u, (low, high), most)


def _is_view(
    found: Points, x: np.ndarray, y: np.ndarray, u: np.ndarray, view: tuple[float, float], most: int
) -> None:
    inside = np.flatnonzero((x >= view[0]) & (x <= view[1]))
    assert found.rows.size <= most
    assert (np.diff(found.rows) > 0).all()
    np.testing.assert_array_equal(found.x, x[found.rows])
    np.testing.assert_array_equal(found.y, y[found.rows])
    if found.u is not None:
        np.testing.assert_array_equal(found.u, u[found.rows])
    known = x[np.isfinite(x)]
    assert found.rows.size == 0 or found.rising == bool((np.diff(known) >= 0).all())
    within = inside[np.isfinite(y[inside])]
    if not found.thinned:
        assert set(within) <= set(found.rows)
    shown = np.intersect1d(found.rows, within)
    assert bool(shown.size) == bool(within.size) or found.thinned
    if found.rising and within.size:
        # A rising abscissa is cut at the ends of the view alone, so that every extreme within is there.
        assert y[shown].max() == y[within].max()
        assert y[shown].min() == y[within].min()
        for before, after in zip(found.rows[:-1], found.rows[1:], strict=True):
            # No line runs over a row without a value.
            between = ~np.isfinite(y[before + 1 : after]) | ~np.isfinite(x[before + 1 : after])
            ends = np.isfinite([x[before], y[before], x[after], y[after]]).all()
            assert not (ends and between.all() and between.size) or found.thinned


def test_a_gap_breaks_the_line_at_any_magnification() -> None:
    x, y = np.arange(5000.0), np.sin(np.arange(5000.0))
    y[2000:3000] = np.nan
    for most in (20, 200, 6000):
        rows = kept_rows(x, y, most)
        assert np.isnan(y[rows[(rows >= 2000) & (rows < 3000)]]).all()
        assert ((rows >= 2000) & (rows < 3000)).any()
