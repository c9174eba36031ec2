"""Mass loading from a dose run, and its comparison with geometry."""

from __future__ import annotations

import math

import numpy as np

from archive.physics.constants import MOLAR_MASS_HELIUM3, MOLAR_MASS_HELIUM4
from archive.physics.linear_fit import straight_line
from archive.physics.loading import fit_loading
from archive.physics.oscillator import period_per_mass
from archive.reduction.background_steps import known_rows, weights
from archive.reduction.estimate import FloatArray
from archive.reduction.gas_amounts import helium_isotope
from archive.reduction.step import Covariance, NoParameters, Outcome
from schemas.base import Record
from schemas.finding import Finding
from schemas.substrate import Sample

__all__ = ["LoadingParameters", "geometric_sensitivity", "loading_fit"]


class LoadingParameters(Record):
    """How the loading curve is read."""

    points_below: int | None = None
    """Rows below the onset, in order of amount; chosen by least squares when none."""
    amount_high_umol: float | None = None
    """Rows above it are not fitted, e.g. where capillary condensation begins."""


def loading_fit(
    parameters: LoadingParameters, *, amount: FloatArray, period: FloatArray, u_period: FloatArray | None
) -> Outcome:
    """Return slopes below and past the onset, onset amount, empty period and chi from a dose run.

    Parameters
    ----------
    amount, period : ndarray
        mol, s; at the lowest temperature.
    u_period : ndarray or None
        Point uncertainty of the period.

    Raises
    ------
    ValueError
        No two slopes with four amounts or more on each, with the reason.

    Notes
    -----
    chi = slope past / slope below; chi and the slope are correlated, and the covariance of all five is kept.
    """
    rows = known_rows(amount, period)
    if parameters.amount_high_umol is not None:
        rows &= np.nan_to_num(amount, nan=np.inf) <= parameters.amount_high_umol * 1e-6
    n, P, u = amount[rows], period[rows], weights(u_period, rows)
    if parameters.points_below is not None:
        values, covariance, facts = _two_lines(n, P, u, parameters.points_below)
    else:
        found = fit_loading(n, P, standard_uncertainty=u, absolute=u is not None)
        if not found.found:
            raise ValueError(f"amount, period: {found.reason}")
        slope, drag, onset, empty = map(float, found.values)
        values = np.array([slope, slope * drag, drag, onset, empty])
        jacobian = np.array(
            [[1, 0, 0, 0], [drag, slope, 0, 0], [0, 1, 0, 0], [0, 0, 1, 0], [0, 0, 0, 1]], dtype=np.float64
        )
        reduced = found.chi2 / found.dof
        # Scatter beyond the stated uncertainty counts; less scatter does not make the result better than stated.
        inflation = max(reduced, 1.0) if u is not None else 1.0
        covariance = jacobian @ (found.covariance * inflation) @ jacobian.T
        facts = {
            "points_below": found.points_below, "points_past": found.points_past, "rms": float(np.sqrt(np.mean(np.square(found.residuals)))),
            "reduced_chi2": reduced if u is not None else math.nan,
            "largest_departure": float(np.max(np.abs(found.residuals[: found.points_below])) / (slope * (n.max() - n.min()))),
        }  # fmt: skip
    names = ("slope_below", "slope_past", "chi", "onset_amount", "empty_period")
    outputs: dict[str, float | FloatArray] = {
        name: float(value) for name, value in zip(names, values, strict=True)
    }
    return Outcome(
        outputs,
        covariance=Covariance(names, covariance),
        held={"points_below": facts["points_below"]},
        facts=facts,
    )


def _two_lines(
    n: FloatArray, P: FloatArray, u: FloatArray | None, below: int
) -> tuple[FloatArray, FloatArray, dict[str, float]]:
    """Return the same from a given number of points below the onset."""
    order = np.argsort(n, kind="stable")
    n, P = n[order], P[order]
    if not 2 <= below <= n.size - 2:
        raise ValueError(f"points_below: found {below}, expected 2 to {n.size - 2}")
    if u is None and n.size < 5:
        raise ValueError(
            "points_below: two lines through four points leave no scatter, and no uncertainty is stated"
        )
    parts = (slice(None, below), slice(below, None))
    first, past = (
        straight_line(n[part], P[part], standard_uncertainty=np.ones(n[part].size) if u is None else u[order][part], absolute=True)
        for part in parts
    )  # fmt: skip
    a, s, b, r = first.value("intercept"), first.value("slope"), past.value("intercept"), past.value("slope")
    onset = (b - a) / (s - r)
    gap = s - r
    # Rows: slope below, slope past, chi, onset, empty period; columns: a, s, b, r.
    jacobian = np.array(
        [[0, 1, 0, 0], [0, 0, 0, 1], [0, -r / s**2, 0, 1 / s], [-1 / gap, -onset / gap, 1 / gap, onset / gap], [1, 0, 0, 0]], dtype=np.float64
    )  # fmt: skip
    joint = np.zeros((4, 4))
    joint[:2, :2], joint[2:, 2:] = first.covariance, past.covariance
    reduced = (first.chi2 + past.chi2) / max(n.size - 4, 1)
    scale = reduced if u is None else max(reduced, 1.0)
    facts = {"points_below": below, "points_past": n.size - below, "reduced_chi2": reduced}
    return np.array([s, r, r / s, onset, a]), jacobian @ (joint * scale) @ jacobian.T, facts


def geometric_sensitivity(
    _: NoParameters,
    *,
    slope: float,
    period: float,
    mean_square_radius: float,
    inertia: float | None,
    torsion_constant: float | None,
    sample: Sample | None,
) -> Outcome:
    """Return the mass sensitivity that geometry gives, and the measured one over it.

    Parameters
    ----------
    sample : Sample or None
        Gas of the run, whose atomic mass counts; 4He if none is recorded.

    Raises
    ------
    ValueError
        Neither inertia nor torsion constant, or a gas that is no pure helium.

    Notes
    -----
    dP/dn = M P R_g^2/(2 I), with I = kappa (P/2 pi)^2 from the torsion constant if the inertia is not recorded. A check,
    not a calibration: within about ten per cent is usual, beyond fifteen the area, the inertia or the metering volume is in
    doubt (common practice, no source).
    """
    if inertia is None:
        if torsion_constant is None:
            raise ValueError("inertia: found none, expected the cell's moment of inertia or torsion constant")
        inertia = torsion_constant * (period / (2 * math.pi)) ** 2
    light = sample is not None and helium_isotope(sample) == "3He"
    expected = (MOLAR_MASS_HELIUM3 if light else MOLAR_MASS_HELIUM4) * period_per_mass(
        period=period, inertia=inertia, mean_square_radius=mean_square_radius
    )
    ratio = slope / expected
    findings: tuple[Finding, ...] = ()
    if abs(ratio - 1) > 0.15:
        findings = (
            Finding(
                code="mass-loading-geometry",
                severity="warning",
                what=f"the measured mass sensitivity is {ratio:.3f} of what geometry gives; more than 15 per cent apart points to a wrong area, inertia or metering volume",
            ),
        )
    return Outcome({"geometric_slope": expected, "ratio": ratio}, findings=findings)
