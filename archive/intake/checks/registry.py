"""The list of all checks, and running them.

Rules: the list is literal; a laboratory's own checks come by the entry point group `stillroom.checks`, here and
nowhere else. A check that fails is told of, and the others go on.
"""

from __future__ import annotations

from importlib.metadata import entry_points

from archive.intake.checks import (
    background,
    calibrations,
    channels,
    drive,
    duplicates,
    film,
    gas,
    isotherm,
    liquid,
    names,
    quality,
    sheet,
    spans,
    temperatures,
    times,
)
from archive.intake.checks.check import Check, History
from archive.intake.reading import Reading
from archive.intake.thresholds import Thresholds
from schemas.finding import Finding

__all__ = ["CHECKS", "all_checks", "run_checks"]

CHECKS: tuple[Check, ...] = (
    # names and the sheet
    Check("unknown-name", "every name in the sheet names something", names.unknown_names),
    Check(
        "name-twice",
        "no name stands for two sweeps, doses, gauges, dosers or dead volumes",
        names.names_twice,
    ),
    Check(
        "record-revisions",
        "revisions of a record follow each other and say what changed",
        names.record_revisions,
    ),
    Check("text-unreadable", "uncertainties, full scales and bounds can be read", sheet.texts_unreadable),
    Check("time-zone-unknown", "time zones exist", sheet.time_zone_unknown),
    Check(
        "time-outside-cooldown",
        "time stamps lie between begin and end of the cooldown",
        spans.data_outside_cooldown,
    ),
    Check(
        "dose-outside-cooldown",
        "doses lie between begin and end of the cooldown",
        spans.doses_outside_cooldown,
    ),
    Check(
        "dose-order", "doses stand in order of time, and sweeps follow the dose they name", spans.dose_order
    ),
    Check("effects-not-stated", "every known effect has a state", sheet.effects_not_stated),
    Check("origin-not-stated", "values say how they are known", sheet.origins_not_stated),
    Check("files-not-named", "the sheet names every file of the folder", sheet.files_not_named),
    Check("event-during-sweep", "events that fall into a sweep are tied to it", spans.events_during_sweeps),
    # columns
    Check("time-reversed", "time does not run backwards", times.time_reversed),
    Check("time-repeated", "no time stamp stands twice", times.time_repeated),
    Check("time-gap", "no unexplained gaps, time_gap_ring_times and time_gap_intervals", times.time_gap),
    Check("sentinel-undeclared", "no overflow value is read as a number", channels.sentinel_undeclared),
    Check(
        "saturated",
        "readings stay below full scale, full_scale_fraction; no plateau, plateau_rows",
        channels.saturated,
    ),
    Check(
        "magnitude-floor",
        "amplitudes stand above their noise, magnitude_over_noise",
        channels.magnitude_floor,
    ),
    Check(
        "lock-phase",
        "the lock holds its phase, lock_phase_deg, lock_phase_step_deg, lock_phase_error_deg",
        channels.lock_phase,
    ),
    Check("constant-channel", "no channel is dead", channels.constant_channel),
    Check("coarse-steps", "columns have enough digits for their uncertainty", channels.coarse_steps),
    Check(
        "detection-missing", "the drive and detection of an oscillator are stated", channels.detection_missing
    ),
    Check("convention-missing", "rms or peak, absolute or gauge is stated", channels.convention_missing),
    # temperature
    Check(
        "temperature-outside-calibration",
        "readings lie inside the calibration",
        temperatures.outside_calibration,
    ),
    Check(
        "temperature-near-calibration-end",
        "readings keep away from the ends of the calibration, calibration_end_fraction",
        temperatures.near_calibration_end,
    ),
    Check(
        "calibrated-thermometer-missing",
        "a channel under calibration says which thermometer it reads",
        calibrations.calibration_without_thermometer,
    ),
    Check(
        "calibration-differs",
        "a calibration made in an archive is what its reduction found",
        calibrations.calibration_as_made,
        uses_history=True,
    ),
    Check(
        "calibration-drift",
        "a calibration agrees with the one before, calibration_drift_sigma",
        calibrations.calibration_drifted,
        uses_history=True,
    ),
    Check("scales-mixed", "temperatures of a cooldown are on one scale", temperatures.scales_mixed),
    Check(
        "thermometer-missing",
        "sweeps in temperature have a calibrated thermometer",
        temperatures.thermometer_missing,
    ),
    Check(
        "lambda-temperature",
        "a bulk lambda point lies at its temperature, lambda_temperature_k",
        temperatures.lambda_temperature,
    ),
    Check(
        "liquid-state",
        "liquid under pressure is as its gauge and the lambda line have it, liquid_pressure_fraction",
        liquid.liquid_state,
    ),
    Check(
        "liquid-above-rating",
        "liquid under pressure stays within the rating of its cell",
        liquid.liquid_above_rating,
    ),
    Check(
        "rod-below-200-mk",
        "a beryllium copper rod in the cold is tried at two drives, rod_temperature_k",
        temperatures.rod_below_200_mk,
    ),
    Check(
        "thermal-lag",
        "sweeps up and down agree, thermal_lag_k and thermal_lag_fraction",
        temperatures.thermal_lag,
    ),
    Check(
        "drift-rate",
        "temperature is slow against the ring time, drift_width_fraction",
        temperatures.drift_rate,
    ),
    # oscillator
    Check(
        "drive-linearity",
        "amplitude is proportional to drive, drive_linearity_fraction",
        drive.drive_linearity,
    ),
    Check(
        "amplitude-dependence",
        "the period does not depend on the drive, amplitude_shift_sigma",
        drive.amplitude_dependence,
    ),
    Check(
        "drive-beyond-regime",
        "the rim is no faster than the cell was found linear in earlier cooldowns",
        drive.drive_beyond_regime,
        uses_history=True,
    ),
    Check("velocity-film", "the rim is slow for vortex pairs, film_velocity_fraction", drive.velocity_film),
    Check("velocity-critical", "the rim is slow for films, film_velocity_m_per_s", drive.velocity_critical),
    Check(
        "quality-agreement",
        "Q from ringdown and reference agree, quality_agreement_fraction",
        quality.quality_agreement,
    ),
    Check("period-scatter", "the period scatters as stated, allan_factor", drive.period_scatter),
    Check(
        "period-scatter-history",
        "the period scatters as it used to in this cell, allan_factor",
        drive.period_scatter_history,
        uses_history=True,
    ),
    Check(
        "background-missing", "there is a temperature sweep of the empty cell", background.background_missing
    ),
    Check(
        "background-span", "empty-cell runs span the temperatures of the films", background.background_span
    ),
    Check(
        "background-drift",
        "empty-cell runs repeat, background_sigma and background_fraction",
        background.background_drift,
    ),
    Check(
        "period-jump",
        "the period does not step by itself, period_jump_sigma, period_jump_temperature_k",
        background.period_jump,
    ),
    Check(
        "drop-sign",
        "the drop of the period is positive, drop_sigma, drop_points_fraction",
        background.drop_sign,
    ),
    Check(
        "not-positive",
        "periods, frequencies, Q and dissipations are above zero, drop_points_fraction",
        background.dissipation_sign,
    ),
    # gas
    Check("dose-not-positive", "amounts and volumes are above zero", gas.dose_not_positive),
    Check("gauge-above-range", "gauges read within their range", gas.gauge_above_range),
    Check(
        "ledger-balance",
        "the doses add up to what was recovered, ledger_warning_fraction, ledger_error_fraction",
        gas.ledger_balance,
    ),
    Check(
        "coverage-not-stated",
        "sweeps say which dose they follow, or that the cell was empty",
        gas.coverage_not_stated,
    ),
    Check("annealing-missing", "annealing or settling after a dose is recorded", gas.annealing_missing),
    Check("helium3-content", "the 3He content is stated and small, helium3_ppm_layers", gas.helium3_content),
    Check("gas-end-unknown", "what became of the gas is recorded", gas.gas_end_unknown),
    Check("gas-end-contradiction", "the state of the gas agrees with the doses", gas.gas_end_contradiction),
    Check(
        "vapour-share",
        "little helium is vapour, or it is corrected, vapour_warning_fraction, vapour_error_fraction",
        film.vapour_share,
    ),
    Check(
        "pressure-at-saturation",
        "the pressure over a film stays below saturation, saturation_fraction",
        film.saturation,
    ),
    Check("capillary-condensation", "no liquid condenses in the pores", film.capillary_condensation),
    Check(
        "penetration-depth",
        "the helium is thin against the viscous penetration depth, penetration_warning_ratio, penetration_error_ratio",
        film.penetration_depth,
    ),
    Check("pore-size", "pores are wide against the diffusion length, pore_length_fraction", film.pore_size),
    Check(
        "isotherm-order",
        "the pressure of an isotherm rises and stays below saturation",
        isotherm.isotherm_order,
    ),
    Check(
        "isotherm-points",
        "an isotherm has points where a monolayer is sought, bet_low, bet_high, bet_points",
        isotherm.isotherm_points,
    ),
    Check("bet-criteria", "a monolayer can be found", isotherm.bet_criteria),
    # one record twice
    Check("file-twice", "no file stands twice", duplicates.file_twice),
    Check("same-data", "no data stand twice at different rounding, same_data_fraction", duplicates.same_data),
    Check("time-overlap", "one thermometer is not read by two sweeps at once", duplicates.time_overlap),
    Check(
        "file-archived",
        "no file is archived already in another cooldown",
        duplicates.file_archived,
        uses_history=True,
    ),
)
"""Every shipped check, in the order of the sheet, the columns, temperature, oscillator, gas and repetition."""

_GROUP = "stillroom.checks"


def all_checks() -> tuple[tuple[Check, ...], list[Finding]]:
    """Return the shipped checks and the laboratory's own, and what kept some of the latter from being loaded."""
    own: list[Check] = []
    faults: list[Finding] = []
    for entry in sorted(entry_points(group=_GROUP), key=lambda each: each.name):
        try:
            loaded = entry.load()
        except Exception as error:  # noqa: BLE001 - foreign code may fail in any way, and the other checks go on
            faults.append(_failed(entry.name, error))
            continue
        if not isinstance(loaded, Check):
            faults.append(_failed(entry.name, TypeError("the entry point names no Check")))
        elif loaded.code in {check.code for check in (*CHECKS, *own)}:
            faults.append(
                _failed(entry.name, ValueError(f"its code, {loaded.code}, is taken by another check"))
            )
        else:
            own.append(loaded)
    return (*CHECKS, *own), faults


def run_checks(reading: Reading, thresholds: Thresholds, *, earlier: History | None = None) -> list[Finding]:
    """Return the findings of all checks, sorted.

    Parameters
    ----------
    reading : Reading
        With temperatures and ledger, if they are known; its own findings are not repeated.
    thresholds : Thresholds
        Limits.
    earlier : History, optional
        What the archive already knows.

    Notes
    -----
    A check that lacks its inputs says nothing. An exception inside a check becomes an error `check-failed`.
    """
    checks, findings = all_checks()
    for check in checks:
        try:
            findings.extend(check.findings(reading, thresholds, earlier))
        except Exception as error:  # noqa: BLE001 - one failing check must not hide what the others have to say
            findings.append(_failed(check.code, error))
    return sorted(findings, key=lambda finding: finding.order)


def _failed(name: str, error: Exception) -> Finding:
    return Finding(
        code="check-failed",
        severity="error",
        what=f"the check {name} could not be carried out: {error}",
        found=type(error).__name__,
        remedy="report it with this sentence to whoever maintains the check",
    )
