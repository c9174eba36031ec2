"""Limits of the checks, with a default each; a laboratory sets its own in `[thresholds]` of `stillroom.toml`.

Rules: the name of a limit ends in its unit where it has one. A limit is never lowered for one sweep; a warning that is
accepted there is waived, with a reason.
"""

from __future__ import annotations

from pydantic import Field

from schemas.base import Record

__all__ = ["Thresholds"]

_PRACTICE = "common practice, no source"


def _limit(default: float, description: str, *, above: float = 0.0, below: float | None = None) -> float:
    return Field(default=default, gt=above, lt=below, description=description)


class Thresholds(Record):
    """One limit a field."""

    time_gap_ring_times: float = _limit(
        5.0, f"A gap longer than so many ring times is a new segment ({_PRACTICE})."
    )
    time_gap_intervals: float = _limit(
        10.0, f"... if it is also longer than so many usual intervals ({_PRACTICE})."
    )
    calibration_end_fraction: float = _limit(
        0.02,
        f"Nearer to an end of the calibration than this fraction of it (in T) is told ({_PRACTICE}).",
        below=0.5,
    )
    calibration_drift_sigma: float = _limit(
        3.0,
        f"Difference of a calibration from the one before it, over the standard uncertainty of that difference ({_PRACTICE}).",
    )
    thermal_lag_k: float = _limit(1e-3, f"Offset in K between sweeps up and down ({_PRACTICE}).")
    thermal_lag_fraction: float = _limit(
        1e-3, f"The same as a fraction of T; the larger one counts ({_PRACTICE})."
    )
    thermal_lag_error_factor: float = _limit(
        5.0, f"Beyond so many times that limit it is an error ({_PRACTICE}).", above=1
    )
    drift_width_fraction: float = _limit(
        0.2, f"Change of T within one ring time, as a fraction of the width of the feature ({_PRACTICE})."
    )
    drive_linearity_fraction: float = _limit(
        0.01, f"Residual of amplitude against drive through zero ({_PRACTICE})."
    )
    amplitude_shift_sigma: float = _limit(
        3.0, f"Change of period between a drive and a third of it, in sigma ({_PRACTICE})."
    )
    full_scale_fraction: float = _limit(
        0.95, f"Readings above this fraction of full scale are saturated ({_PRACTICE})."
    )
    plateau_rows: int = Field(
        default=5, ge=3, description=f"So many equal rows at the largest value are a plateau ({_PRACTICE})."
    )
    magnitude_over_noise: float = _limit(
        20.0, f"Smallest signal over noise; a magnitude is biased upward below ({_PRACTICE})."
    )
    lock_phase_deg: float = _limit(5.0, f"Largest phase of the lock ({_PRACTICE}).")
    lock_phase_step_deg: float = _limit(1.0, f"Largest step of that phase from row to row ({_PRACTICE}).")
    lock_phase_error_deg: float = _limit(30.0, f"Beyond this phase it is an error ({_PRACTICE}).")
    allan_factor: float = _limit(
        3.0, f"Scatter of the period over the cell's usual or its stated one ({_PRACTICE})."
    )
    film_velocity_fraction: float = _limit(
        0.1,
        "Rim velocity over hbar/(m r_D), beyond which vortex pairs are torn apart (derived; the fraction is practice).",
    )
    film_velocity_m_per_s: float = _limit(0.01, f"Largest rim velocity in films ({_PRACTICE}).")
    background_sigma: float = _limit(
        3.0, f"Difference of two empty-cell runs, in sigma of the period ({_PRACTICE})."
    )
    background_fraction: float = _limit(0.01, f"The same over the largest drop of the period ({_PRACTICE}).")
    period_jump_sigma: float = _limit(
        10.0, f"Step of the period between neighbouring rows, in sigma ({_PRACTICE})."
    )
    period_jump_temperature_k: float = _limit(1e-3, f"... with a change of T below this ({_PRACTICE}).")
    drop_sigma: float = _limit(3.0, f"A drop of the period may be negative by so many sigma ({_PRACTICE}).")
    drop_points_fraction: float = _limit(
        0.05, f"Share of points with the wrong sign that is an error ({_PRACTICE})."
    )
    quality_agreement_fraction: float = _limit(
        0.05, f"Agreement of Q from ringdown and from the drive ({_PRACTICE})."
    )
    ledger_warning_fraction: float = _limit(
        0.005, f"Imbalance of the doses over what was recovered ({_PRACTICE})."
    )
    ledger_error_fraction: float = _limit(0.02, f"Beyond this imbalance it is an error ({_PRACTICE}).")
    vapour_warning_fraction: float = _limit(
        0.01, f"Helium in the vapour over all helium, uncorrected ({_PRACTICE})."
    )
    vapour_error_fraction: float = _limit(0.10, f"Beyond this share it is an error ({_PRACTICE}).")
    saturation_fraction: float = _limit(
        0.98, f"Pressure over saturation, above which a film is not defined ({_PRACTICE})."
    )
    penetration_warning_ratio: float = _limit(
        0.05, f"Film or half pore over the viscous penetration depth ({_PRACTICE})."
    )
    penetration_error_ratio: float = _limit(
        0.2, f"Beyond this ratio the normal fluid is not locked ({_PRACTICE})."
    )
    pore_length_fraction: float = _limit(
        0.3, f"Diffusion length over half the pore's circumference, for the planar theory ({_PRACTICE})."
    )
    helium3_ppm_layers: float = _limit(
        100.0, f"3He on the surface: fraction in ppm times layers ({_PRACTICE})."
    )
    rod_temperature_k: float = _limit(
        0.2, f"Below this a beryllium copper rod may be nonlinear ({_PRACTICE})."
    )
    lambda_temperature_k: float = _limit(
        2e-3,
        f"Distance of a bulk feature from T_lambda = 2.1768 K ({_PRACTICE}; T_lambda: Preston-Thomas, Metrologia 27, 3, 1990).",
    )
    liquid_pressure_fraction: float = _limit(
        0.02, f"Stated and read pressure of bulk liquid may differ by this share ({_PRACTICE})."
    )
    same_data_fraction: float = _limit(
        1e-6, f"Two tables that differ less than this are one data set ({_PRACTICE})."
    )
    bet_low: float = _limit(
        0.05, "Lower end of the usual range of p/p0 (Thommes et al., Pure Appl. Chem. 87, 1051, 2015)."
    )
    bet_high: float = _limit(0.30, "Upper end of that range (the same).")
    bet_points: int = Field(
        default=5, ge=3, description=f"Points wanted in that range ({_PRACTICE}; ISO 9277 asks for several)."
    )
