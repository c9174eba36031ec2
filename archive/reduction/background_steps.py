"""Empty-cell background: its fit, and its subtraction with the alignment of one run."""

from __future__ import annotations

import math
from typing import Literal

import numpy as np
import numpy.typing as npt

from archive.physics.polynomial_background import fit_background
from archive.reduction.estimate import FloatArray
from archive.reduction.row_choice import chosen_rows
from archive.reduction.step import Covariance, NoParameters, Outcome
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import SourceEntry

__all__ = [
    "AlignmentParameters",
    "BackgroundParameters",
    "added_dissipation",
    "background_fit",
    "period_drop",
]

LEAST_IN_WINDOW = 5
"""Points that an alignment needs (common practice, no source)."""


class BackgroundParameters(Record):
    """How the background is represented."""

    highest_order: int = 8
    order: int | None = None
    """Chosen by the runs test and F-test when none."""


class AlignmentParameters(Record):
    """Where the period drop is zero."""

    align: Literal["above-transition", "coldest", "none"] = "above-transition"
    low: float = 1.1
    """Lower end of the window over the temperature of the dissipation peak (or of the steepest fall)."""
    high: float = 1.3
    coldest_share: float = 0.1
    """Share of the coldest rows, for `coldest`."""
    window_low_kelvin: float | None = None
    """Lower end in kelvin, instead of `low`."""
    window_high_kelvin: float | None = None
    rows: tuple[int, ...] | None = None
    """The rows to align on, from 1, in place of a window."""


def known_rows(*columns: FloatArray | None) -> npt.NDArray[np.bool_]:
    """Return the rows where every column has a value."""
    present = [np.isfinite(column) for column in columns if column is not None]
    return np.asarray(np.logical_and.reduce(present))


def weights(u: FloatArray | None, rows: npt.NDArray[np.bool_] | npt.NDArray[np.int64]) -> FloatArray | None:
    """Return the uncertainties of some rows, or None if they are not all stated."""
    if u is None:
        return None
    chosen = np.asarray(u)[rows]
    return chosen if chosen.size and bool((chosen > 0).all()) else None


def background_fit(
    parameters: BackgroundParameters,
    *,
    temperature: FloatArray,
    values: FloatArray,
    values_kind: str,
    u_values: FloatArray | None,
) -> Outcome:
    """Return the polynomial of an empty-cell record: Chebyshev coefficients and the range they hold for.

    Parameters
    ----------
    temperature : ndarray
        K.
    values : ndarray
        Period or dissipation of the empty cell.
    values_kind : str
        Quantity kind of `values`, for the words.
    u_values : ndarray or None
        Point uncertainty; rows count alike if not all is stated, and the covariance comes from the scatter.

    Raises
    ------
    ValueError
        Too few rows.

    Notes
    -----
    The covariance is never smaller than the scatter of the rows demands. The value at the coldest end is an output of its
    own: it is what one compares from cooldown to cooldown.
    """
    rows = known_rows(temperature, values)
    u = weights(u_values, rows)
    found = fit_background(
        temperature[rows], values[rows], standard_uncertainty=u, absolute=False, highest_order=parameters.highest_order, order=parameters.order
    )  # fmt: skip
    covariance = np.asarray(found.fit.covariance)
    chi2 = found.fit.chi2 / found.fit.dof if u is not None and found.fit.dof else math.nan
    if 0 < chi2 < 1:
        # Stated uncertainties larger than the scatter stand.
        covariance = covariance / chi2
    coefficients = np.asarray(found.fit.values)
    at_low = np.polynomial.chebyshev.chebvander(np.array([-1.0]), found.order)[0]
    names = (*(f"coefficients[{k}]" for k in range(coefficients.size)), "value_at_low")
    jacobian = np.vstack([np.eye(coefficients.size), at_low])
    rms = float(np.sqrt(np.mean(np.square(found.fit.residuals))))
    findings: tuple[Finding, ...] = ()
    if not found.accepted:
        findings = (
            Finding(
                code="background-has-shape",
                severity="warning",
                what=f"the residual of the background still has shape: {found.message}",
                remedy="raise highest_order, or leave out what is no smooth background",
            ),
        )
    return Outcome(
        {"coefficients": coefficients, "low": found.low, "high": found.high, "value_at_low": float(at_low @ coefficients)},
        covariance=Covariance(names, jacobian @ covariance @ jacobian.T),
        held={"order": found.order},
        facts={
            "order": found.order, "rms": rms, "points": int(np.count_nonzero(rows)), "runs_probability": found.runs_probability,
            "reduced_chi2": chi2, "low_K": found.low, "high_K": found.high, "message": found.message,
            "kind": values_kind, "rms_words": f"{rms * 1e12:.3g} ps" if values_kind == "period" else f"{rms:.3g}",
        },
        findings=findings,
    )  # fmt: skip


def background_value(
    temperature: FloatArray, coefficients: FloatArray, low: float, high: float
) -> FloatArray:
    """Return the background at temperatures, NaN outside its range: it is never extrapolated."""
    # A part in 1e12 is the rounding of the ends.
    margin = 1e-12 * (high - low)
    with np.errstate(invalid="ignore"):
        inside = (temperature >= low - margin) & (temperature <= high + margin)
    scaled = (2 * np.where(inside, temperature, low) - low - high) / (high - low)
    return np.where(inside, np.polynomial.chebyshev.chebval(scaled, coefficients), np.nan)


def _outside(
    temperature: FloatArray, values: FloatArray, background: FloatArray, low: float, high: float
) -> tuple[Finding, ...]:
    count = int(np.count_nonzero(known_rows(temperature, values) & np.isnan(background)))
    if not count:
        return ()
    return (
        Finding(
            code="outside-background", severity="warning",
            what=f"{count} of {temperature.size} rows lie outside the empty-cell background, which reaches from {low:.5g} K to {high:.5g} K; they are not reduced",
            remedy="measure the empty cell over the whole range, or leave these rows out with a reason",
        ),
    )  # fmt: skip


def added_dissipation(
    _: NoParameters,
    *,
    temperature: FloatArray,
    dissipation: FloatArray,
    background: FloatArray,
    low: float,
    high: float,
) -> Outcome:
    """Return the dissipation that the helium adds: Q^-1 less that of the empty cell; NaN outside the background's range."""
    empty = background_value(temperature, background, low, high)
    return Outcome(
        {"added_dissipation": dissipation - empty},
        findings=_outside(temperature, dissipation, empty, low, high),
    )


def period_drop(
    parameters: AlignmentParameters,
    *,
    temperature: FloatArray,
    period: FloatArray,
    background: FloatArray,
    low: float,
    high: float,
    peak: float | None,
    u_period: FloatArray | None,
    u_temperature: FloatArray | None,
) -> Outcome:
    """Return the period of the fully coupled film minus the period, with the alignment of this run.

    Parameters
    ----------
    temperature, period : ndarray
        K, s.
    background : ndarray
        Chebyshev coefficients of the empty cell's period, s.
    low, high : float
        Range of the background, K.
    peak : float or None
        Temperature of the dissipation peak; without it the steepest fall of the drop stands for it.
    u_period, u_temperature : ndarray or None
        Point uncertainties; that of the temperature counts through the slope.

    Raises
    ------
    ValueError
        Fewer than five rows in the window, or rows named that the sweep does not have.

    Notes
    -----
    The mass of the film and the shift from one mounting to the next are one constant, found where the film is surely
    normal. Aligning at the coldest rows instead forces the superfluid density there to zero: right only for a film that is
    known not to be superfluid.
    """
    empty = background_value(temperature, background, low, high)
    raw = empty - period
    rows = known_rows(temperature, raw)
    if np.count_nonzero(rows) < LEAST_IN_WINDOW:
        raise ValueError(
            f"temperature: found {np.count_nonzero(rows)} rows inside the background's range, expected at least {LEAST_IN_WINDOW}"
        )
    window, where = _window(parameters, temperature, raw, rows, peak)
    shift, u_shift, count = 0.0, 0.0, 0
    if window is not None:
        count = int(np.count_nonzero(window))
        shift, u_shift = -float(np.mean(raw[window])), float(np.std(raw[window], ddof=1)) / math.sqrt(count)
        if u_period is not None:
            u_shift = max(u_shift, float(np.sqrt(np.mean(np.square(u_period[window])) / count)))
    drop = raw + shift
    point = np.zeros(drop.shape) if u_period is None else np.array(u_period, dtype=np.float64)
    if u_temperature is not None and np.any(u_temperature > 0):
        point = np.hypot(point, np.nan_to_num(_slope(temperature, raw, rows) * u_temperature))
    findings = list(_outside(temperature, period, empty, low, high))
    negative = int(np.count_nonzero(drop[rows] < -3 * np.hypot(point[rows], u_shift) - 1e-18))
    share = negative / np.count_nonzero(rows)
    if share > 0.05 and u_shift > 0:
        findings.append(
            Finding(
                code="negative-period-drop",
                severity="warning",
                what=f"the period drop is negative by more than three standard uncertainties in {share:.0%} of the rows; the sign convention or the alignment is wrong",
            )
        )
    source = SourceEntry(
        name="own alignment", description="alignment of the background, one constant for the run", level="run"
    )
    return Outcome(
        {"period_drop": drop, "shift": shift},
        point={"period_drop": point},
        shared={"period_drop": {"own alignment": u_shift}, "shift": {"own alignment": u_shift}} if u_shift else {},
        sources=(source,) if u_shift else (),
        held={"rows": tuple(int(row) + 1 for row in np.flatnonzero(window))} if window is not None else {},
        facts={
            "alignment": parameters.align, "aligned": _aligned(temperature, window, where), "rows_in_window": count,
            "shift_s": shift, "shift_uncertainty_s": u_shift,
        },
        findings=tuple(findings),
    )  # fmt: skip


_Rows = npt.NDArray[np.bool_]


def _aligned(T: FloatArray, window: _Rows | None, where: str) -> str:
    """Return how the run was aligned, in words, with the temperatures that the rows really have."""
    if window is None:
        return "nothing was aligned"
    count = int(np.count_nonzero(window))
    ends = f"{float(np.min(T[window])):.4g} K to {float(np.max(T[window])):.4g} K"
    return f"the shift makes the mean drop zero {where} ({count} rows from {ends})"


def _window(
    parameters: AlignmentParameters, T: FloatArray, raw: FloatArray, rows: _Rows, peak: float | None
) -> tuple[_Rows | None, str]:
    if parameters.align == "none":
        return None, ""
    if parameters.rows is not None:
        chosen = chosen_rows(parameters.rows, T.size)
        chosen &= rows
        if np.count_nonzero(chosen) < LEAST_IN_WINDOW:
            raise ValueError(
                f"rows: found {np.count_nonzero(chosen)} with a value, expected at least {LEAST_IN_WINDOW}"
            )
        return chosen, "over the rows named in the plan"
    if parameters.align == "coldest":
        low = float(np.min(T[rows]))
        high = float(np.quantile(T[rows], parameters.coldest_share))
    else:
        about = peak if peak is not None else steepest_fall(T[rows], raw[rows])
        low, high = parameters.low * about, parameters.high * about
    where = "at the coldest rows" if parameters.align == "coldest" else "above the transition"
    low = low if parameters.window_low_kelvin is None else parameters.window_low_kelvin
    high = high if parameters.window_high_kelvin is None else parameters.window_high_kelvin
    window = rows & (np.nan_to_num(T, nan=-1.0) >= low) & (np.nan_to_num(T, nan=-1.0) <= high)
    count = int(np.count_nonzero(window))
    if count < LEAST_IN_WINDOW:
        raise ValueError(
            f"temperature: found {count} rows between {low:.5g} K and {high:.5g} K, where the film is taken to be normal, "
            f"expected at least {LEAST_IN_WINDOW}; set window_low_kelvin and window_high_kelvin, or another alignment"
        )
    return window, where


def steepest_fall(T: FloatArray, drop: FloatArray) -> float:
    """Return the temperature where a drop falls most steeply, from medians of about forty groups of rows."""
    order = np.argsort(T, kind="stable")
    middle, level = _medians(order, max(3, min(40, order.size // 3)), T, drop)
    apart = np.diff(middle) > 0
    slope = np.where(apart, np.diff(level) / np.where(apart, np.diff(middle), 1.0), 0.0)
    k = int(np.argmin(slope))
    return float((middle[k] + middle[k + 1]) / 2)


def _medians(order: npt.NDArray[np.intp], count: int, *columns: FloatArray) -> list[FloatArray]:
    """Return for each column the medians of its rows in groups that follow one another, as alike in size as can be; none is empty."""
    share, longer = divmod(order.size, count)
    # Groups of one size are the rows of a matrix: a call for each of a hundred groups took a tenth of the whole reduction.
    cut = longer * (share + 1)
    parts = [order[:cut].reshape(longer, share + 1), order[cut:].reshape(count - longer, share)]
    return [
        np.concatenate([np.median(column[part], axis=1) for part in parts if part.size]) for column in columns
    ]


def _slope(T: FloatArray, y: FloatArray, rows: _Rows) -> FloatArray:
    """Return dy/dT from medians of groups, interpolated to the rows."""
    order = np.flatnonzero(rows)[np.argsort(T[rows], kind="stable")]
    middle, level = _medians(order, max(3, min(100, order.size // 5)), T, y)
    different = np.concatenate([[True], np.diff(middle) > 0])
    middle, level = middle[different], level[different]
    if middle.size < 2:
        return np.zeros(T.shape)
    return np.asarray(np.interp(np.nan_to_num(T), middle, np.gradient(level, middle)))
