"""Every step that Stillroom has, as one literal tuple, and those that a laboratory adds.

A laboratory's own steps come through the entry point group ``stillroom.steps``: each entry loads a `Step` or a sequence of
them. This is the only place where they are looked for.
"""

from __future__ import annotations

from collections.abc import Iterable
from functools import cache
from importlib.metadata import entry_points

from archive.errors import BadRequest
from archive.reduction import (
    adsorption_steps,
    background_steps,
    bulk_steps,
    calibration_steps,
    current_steps,
    dead_volume_steps,
    dynamic_steps,
    film_steps,
    fourth_sound_steps,
    gas_steps,
    gathering,
    heat_capacity_steps,
    jump_steps,
    lambda_line_steps,
    linear_regime_steps,
    loading_steps,
    oscillator_steps,
    peak_steps,
    porous_heat_steps,
    porous_steps,
    pulse_steps,
    ringdown_steps,
    stability_steps,
    sweep_steps,
    thermometry_steps,
    third_sound_steps,
    tracking_steps,
    transition_steps,
)
from archive.reduction.step import Port, Step

__all__ = ["STEPS", "all_steps", "step_named"]

_TEMPERATURE = Port("temperature", "array", "temperature of each row")
_PERIOD = Port("period", "array", "period of each row")
_ANY_PERIOD = Port("period", "number", "period; its median sets the frequency")
_GAS = Port("any", "record", "gas book of the sheet")
_SAMPLE = Port("any", "record", "gas of the run", optional=True)
_DENSITY = Port("areal_mass_density", "array", "areal superfluid density of each row")

STEPS: tuple[Step, ...] = (
    Step(
        name="leave-out", version=1, function=sweep_steps.kept_rows, parameters=sweep_steps.LeaveOutParameters,
        takes={"values": Port("any", "array", "channel as stored")},
        yields={"values": Port("same:values", "array", "channel without the rows left out")},
        sentence="{count} of {total} points were left out ({reason}).",
    ),
    Step(
        name="apply-correction", version=1, function=sweep_steps.corrected, parameters=sweep_steps.CorrectionParameters,
        takes={"values": Port("any", "array", "channel before the correction"), "correction": Port("any", "scalar", "size of the correction")},
        yields={"values": Port("same:values", "array", "channel after the correction")},
        sentence="A {correct} correction of {stated} ({known}) was applied.", kinds=("values",),
    ),
    Step(
        name="period-from-frequency", version=1, function=sweep_steps.inverted,
        takes={"values": Port("frequency", "array", "frequency")}, yields={"inverse": Port("period", "array", "period, one over the frequency")},
        sentence="The period is one over the recorded frequency.",
    ),
    Step(
        name="dissipation-from-quality-factor", version=1, function=sweep_steps.inverted,
        takes={"values": Port("quality_factor", "array", "quality factor")},
        yields={"inverse": Port("dissipation", "array", "dissipation, one over the quality factor")},
        sentence="The dissipation is one over the recorded quality factor.",
    ),
    Step(
        name="temperature-from-calibration", version=2, function=thermometry_steps.temperature_from_calibration,
        takes={
            "reading": Port("any", "array", "reading of the thermometer, or a temperature"),
            "calibration": Port("any", "record", "calibration in force", optional=True),
        },
        yields={"temperature": Port("temperature", "array", "temperature")}, kinds=("reading",),
        sentence="{origin}{outside_words}.",
        citations=("preston-thomas-1990", "rusby-2002"),
    ),
    Step(
        name="temperature-on-scale", version=1, function=sweep_steps.on_scale, parameters=sweep_steps.ScaleParameters,
        takes={"temperature": _TEMPERATURE}, yields={"temperature": Port("temperature", "array", "temperature on the scale asked for")},
        sentence="Temperatures first recorded on {source} were converted to {target}; the largest change in the range is {largest_change_K} K.",
        citations=("preston-thomas-1990",), scales=("temperature",),
    ),
    Step(
        name="amount-from-doses", version=1, function=gas_steps.amount_from_doses,
        takes={"gas": _GAS, "sample": _SAMPLE, "time": Port("time", "array", "instant of each row", optional=True)},
        yields={"amount": Port("amount", "number", "gas in the cell's system")},
        sentence="{count} gave a total of {amount}, {method}.", spread="refit", citations=("cencek-2012",),
    ),
    Step(
        name="vapour-in-dead-volume", version=1, function=gas_steps.vapour_in_dead_volume, parameters=gas_steps.VapourParameters,
        takes={"gas": _GAS, "temperature": _TEMPERATURE, "pressure": Port("pressure", "array", "measured pressure", optional=True), "sample": _SAMPLE},
        yields={"vapour": Port("amount", "array", "gas that is not in the film")},
        sentence="The vapour in {volume_cm3} cm^3 of dead volume, {vapour}, was {treatment}.",
        effects={"vapour in dead volume": "The gas in the dead volumes was {treatment}."}, citations=("cencek-2012", "donnelly-1998"),
    ),
    Step(
        name="coverage-from-amount", version=1, function=gas_steps.coverage_from_amount,
        takes={
            "amount": Port("amount", "number", "gas in the cell's system"), "vapour": Port("amount", "array", "gas that is not in the film", optional=True),
            "area": Port("area", "scalar", "adsorbing area", optional=True), "specific_area": Port("specific_area", "scalar", "area per mass", optional=True),
            "mass": Port("mass", "scalar", "mass of substrate", optional=True),
        },
        yields={"coverage": Port("coverage", "number", "amount in the film over area")},
        sentence="The coverage, {coverage}, is {what} over an area of {area}.",
    ),
    Step(
        name="layers-from-coverage", version=1, function=gas_steps.layers_from_coverage,
        takes={
            "coverage": Port("coverage", "number", "coverage"), "layer": Port("coverage", "scalar", "coverage of one layer on this substrate"),
            "substrate": Port("any", "record", "substrate", optional=True),
        },
        yields={"layers": Port("number", "number", "coverage in layers of this substrate")},
        sentence="One layer means {layer} ({definition}).",
    ),
    Step(
        name="thickness-from-coverage", version=1, function=gas_steps.thickness_from_coverage, parameters=gas_steps.ThicknessParameters,
        takes={"coverage": Port("coverage", "number", "coverage")}, yields={"thickness": Port("length", "number", "thickness of the film")},
        sentence="Thickness takes {inner_coverage_umol_m2} umol/m^2 as inner layers of {inner_thickness_nm} nm and the rest as bulk liquid.",
        citations=("donnelly-1998",),
    ),
    Step(
        name="dissipation-from-amplitude", version=1, function=oscillator_steps.dissipation_from_amplitude,
        takes={
            "amplitude": Port("amplitude|voltage|current", "array", "detected signal"), "period": _PERIOD,
            "drive": Port("drive|voltage|current", "number", "drive", optional=True), "detection": Port("any", "record", "drive and detection"),
            "reference_signal": Port("amplitude", "scalar", "signal at the reference point"),
            "reference_drive": Port("drive", "scalar", "drive at the reference point", optional=True),
            "reference_quality_factor": Port("quality_factor", "scalar", "quality factor at the reference point"),
            "reference_period": Port("period", "scalar", "period at the reference point"),
        },
        yields={"dissipation": Port("dissipation", "array", "dissipation")},
        sentence="1/Q follows from the amplitude against the reference point Q = {reference_quality_factor} at {reference_signal}; the torque varies as drive to the power {p}, the signal as frequency to the power {s}; the drive was {drive_was}.",
    ),
    Step(
        name="background-fit", version=1, function=background_steps.background_fit, parameters=background_steps.BackgroundParameters,
        takes={"temperature": _TEMPERATURE, "values": Port("period|dissipation", "array", "record of the empty cell")},
        yields={
            "coefficients": Port("same:values", "array", "Chebyshev coefficients of the background, lowest first"),
            "low": Port("temperature", "scalar", "lowest temperature of the background"), "high": Port("temperature", "scalar", "highest temperature of the background"),
            "value_at_low": Port("same:values", "scalar", "background at its lowest temperature"),
        },
        sentence="The {kind} of the empty cell was measured between {low_K} K and {high_K} K and fitted by a polynomial of order {order} ({points} points, rms of the residuals {rms_words}).",
        spread="refit", weights=("values",), kinds=("values",),
    ),
    Step(
        name="quality-factor-from-dissipation", version=1, function=sweep_steps.inverted_scalar,
        takes={"values": Port("dissipation", "scalar", "dissipation")}, yields={"inverse": Port("quality_factor", "scalar", "quality factor")},
        sentence="Q = {inverse}.",
    ),
    Step(
        name="added-dissipation", version=1, function=background_steps.added_dissipation,
        takes={
            "temperature": _TEMPERATURE, "dissipation": Port("dissipation", "array", "dissipation"),
            "background": Port("dissipation", "array", "coefficients of the empty cell's dissipation"),
            "low": Port("temperature", "scalar", "lower end of the background"), "high": Port("temperature", "scalar", "upper end of the background"),
        },
        yields={"added_dissipation": Port("dissipation", "array", "dissipation that the helium adds")},
        sentence="The dissipation of the empty cell, known between {low} and {high}, was subtracted.",
    ),
    Step(
        name="period-drop", version=1, function=background_steps.period_drop, parameters=background_steps.AlignmentParameters,
        takes={
            "temperature": _TEMPERATURE, "period": _PERIOD, "background": Port("period", "array", "coefficients of the empty cell's period"),
            "low": Port("temperature", "scalar", "lower end of the background"), "high": Port("temperature", "scalar", "upper end of the background"),
            "peak": Port("temperature", "scalar", "temperature of the dissipation peak", optional=True),
        },
        yields={
            "period_drop": Port("period", "array", "period of the fully coupled film minus the period"),
            "shift": Port("period", "scalar", "constant added to the background for this run"),
        },
        sentence="The period was subtracted from that of the empty cell, shifted by {shift}; {aligned}.",
        spread="refit", weights=("period", "temperature"),
        effects={"remounting shift": "A constant shift of the background between runs is removed by the alignment; a shift that depends on temperature is not."},
    ),
    Step(
        name="loading-fit", version=1, function=loading_steps.loading_fit, parameters=loading_steps.LoadingParameters,
        takes={"amount": Port("amount", "array", "gas in the film"), "period": _PERIOD},
        yields={
            "slope_below": Port("amount_sensitivity", "scalar", "period per amount below the onset"),
            "slope_past": Port("amount_sensitivity", "scalar", "period per amount well past the onset"),
            "chi": Port("fraction", "scalar", "part of the superfluid that is dragged along"),
            "onset_amount": Port("amount", "scalar", "amount that stays normal at the lowest temperature"),
            "empty_period": Port("period", "scalar", "period without helium, from the line below the onset"),
        },
        sentence="From {points_below} points below the onset the period rises by {slope_below}, past it ({points_past} points) by {slope_past}; the fraction locked to the substrate is chi = {chi}.",
        citations=("agnolet-1989", "bishop-reppy-1980"), spread="refit", weights=("period",),
    ),
    Step(
        name="geometric-sensitivity", version=1, function=loading_steps.geometric_sensitivity,
        takes={
            "slope": Port("amount_sensitivity", "scalar", "measured period per amount"), "period": Port("period", "scalar", "period of the empty cell"),
            "mean_square_radius": Port("area", "scalar", "mean square distance of the substrate from the axis"),
            "inertia": Port("moment_of_inertia", "scalar", "moment of inertia", optional=True),
            "torsion_constant": Port("torsion_constant", "scalar", "torsion constant", optional=True), "sample": _SAMPLE,
        },
        yields={"geometric_slope": Port("amount_sensitivity", "scalar", "period per amount by geometry"), "ratio": Port("number", "scalar", "measured over geometric")},
        sentence="Geometry predicts {geometric_slope}; the measured sensitivity is {ratio} of it.",
    ),
    Step(
        name="superfluid-density", version=1, function=film_steps.superfluid_density, parameters=film_steps.DensityParameters,
        takes={
            "period_drop": Port("period", "array", "period drop"), "slope_below": Port("amount_sensitivity", "scalar", "period per amount of coupled helium"),
            "slope_past": Port("amount_sensitivity", "scalar", "period per amount past the onset", optional=True), "area": Port("area", "scalar", "adsorbing area"),
            "sample": _SAMPLE,
        },
        yields={"superfluid_density": _DENSITY},
        sentence="The areal superfluid density is the period drop over {period_per_areal_density} s m^2/kg and (1 - chi), chi = {chi} from {chi_from}.",
        citations=("bishop-reppy-1980",),
    ),
    Step(
        name="dissipation-peak", version=1, function=peak_steps.dissipation_peak, parameters=peak_steps.PeakParameters,
        takes={"temperature": _TEMPERATURE, "dissipation": Port("dissipation", "array", "dissipation that the helium adds")},
        yields={"peak_temperature": Port("temperature", "scalar", "temperature of the dissipation peak"), "peak_height": Port("dissipation", "scalar", "height of the dissipation peak")},
        sentence="The dissipation peaks at {peak_temperature} ({points} points from {low_K} K to {high_K} K).", spread="refit", weights=("dissipation",),
    ),
    Step(
        name="universal-crossing", version=1, function=film_steps.universal_crossing, parameters=film_steps.CrossingParameters,
        takes={"temperature": _TEMPERATURE, "superfluid_density": _DENSITY},
        yields={"crossing_temperature": Port("temperature", "scalar", "where the observed areal density falls through the universal line")},
        sentence="The observed areal density falls through the universal line at {crossing_temperature} (local polynomial of order {order} through {points} points).",
        citations=("nelson-kosterlitz-1977",), spread="refit", weights=("superfluid_density",),
    ),
    Step(
        name="static-transition", version=1, function=transition_steps.static_transition, parameters=transition_steps.DynamicParameters,
        takes={"crossing": Port("temperature", "scalar", "crossing of the universal line"), "period": _ANY_PERIOD},
        yields={"transition_temperature": Port("temperature", "scalar", "static transition temperature")},
        sentence="T_KT is the temperature where the static areal density meets the universal line: the crossing less {shift_mK} mK, which the dynamic theory gives with b = {b}, ln(D/(a^2 w)) = {L} and F = {free_vortices} held.",
        citations=("nelson-kosterlitz-1977", "ahns-1980"),
    ),
    Step(
        name="transition-from-peak", version=1, function=transition_steps.transition_from_peak, parameters=transition_steps.DynamicParameters,
        takes={"peak": Port("temperature", "scalar", "temperature of the dissipation peak"), "period": _ANY_PERIOD},
        yields={"transition_temperature": Port("temperature", "scalar", "static transition temperature by the dissipation peak")},
        sentence="The dissipation peak lies {shift_mK} mK above the static transition by the dynamic theory with b = {b}, ln(D/(a^2 w)) = {L} and F = {free_vortices} held.",
        citations=("ahns-1980",),
    ),
    Step(
        name="universal-ratio", version=1, function=transition_steps.universal_ratio, parameters=transition_steps.RatioParameters,
        takes={"temperature": _TEMPERATURE, "superfluid_density": _DENSITY, "transition": Port("temperature", "scalar", "static transition temperature"), "period": _ANY_PERIOD},
        yields={"ratio": Port("number", "scalar", "sigma_s(T_KT)/T_KT over the universal constant"), "density_at_transition": Port("areal_mass_density", "scalar", "static areal superfluid density at the transition")},
        sentence="At a static transition of {transition} sigma_s/T is {ratio} of the universal value, after division by {dynamic_excess} for the finite frequency.",
        citations=("nelson-kosterlitz-1977", "ahns-1980"), spread="refit", estimates=("transition",),
    ),
    Step(
        name="power-law-transition", version=1, function=film_steps.power_law_transition, parameters=film_steps.PowerLawParameters,
        takes={"temperature": _TEMPERATURE, "superfluid_density": _DENSITY},
        yields={
            "transition_temperature": Port("temperature", "scalar", "transition temperature of the power law"), "exponent": Port("number", "scalar", "exponent of the power law"),
            "amplitude": Port("areal_mass_density", "scalar", "amplitude of the power law"),
        },
        sentence="Model A (1 - T/T_c)^zeta was fitted to {points} points with 1 - T/T_c from {low} to {high}; free: T_c = {transition_temperature}, zeta = {exponent}; chi^2 per degree of freedom {reduced_chi2}.",
        citations=("bishop-1981",), spread="refit", weights=("superfluid_density",),
    ),
    Step(
        name="ringdown-quality-factor", version=1, function=oscillator_steps.ringdown_quality_factor, parameters=oscillator_steps.RingdownParameters,
        takes={"time": Port("time", "array", "time of each row"), "amplitude": Port("amplitude|voltage|current", "array", "signal of the free decay"), "period": _ANY_PERIOD},
        yields={
            "quality_factor": Port("quality_factor", "scalar", "quality factor"), "decay_time": Port("time", "scalar", "time in which it falls to 1/e"),
            "dissipation": Port("dissipation", "scalar", "one over the quality factor"),
        },
        sentence="From the ringdown of {points} points, with the {background} fitted, the {decays} falls to 1/e in {decay_time}, so Q = {quality_factor}.", spread="refit", weights=("amplitude",),
    ),
    Step(
        name="drive-linearity", version=1, function=oscillator_steps.drive_linearity, parameters=oscillator_steps.LinearityParameters,
        takes={
            "drive": Port("drive|voltage|current", "array", "drive of each row"), "amplitude": Port("amplitude|voltage|current", "array", "amplitude of each row"),
            "period": Port("period", "array", "period of each row", optional=True), "detection": Port("any", "record", "drive and detection", optional=True),
        },
        yields={"departure": Port("fraction", "scalar", "largest departure from proportionality"), "period_change": Port("period", "scalar", "change of the period over the amplitudes used")},
        sentence="Changing the torque by a factor {factor} over {levels} levels moved the period by {period_change}; the amplitude departs from proportionality by {departure_percent} per cent of the largest.",
        spread="refit", weights=("amplitude", "period"),
        considered={"amplitude dependence": "Linearity was tested by a drive sweep; nothing was corrected for it."},
    ),
    Step(
        name="resonance-fit", version=1, function=oscillator_steps.resonance_fit, parameters=oscillator_steps.ResonanceParameters,
        takes={
            "frequency": Port("frequency", "array", "drive frequency"), "x": Port("amplitude|voltage|current", "array", "in-phase component"),
            "y": Port("amplitude|voltage|current", "array", "quadrature component"),
        },
        yields={
            "resonance_frequency": Port("frequency", "scalar", "resonance frequency"), "quality_factor": Port("quality_factor", "scalar", "quality factor"),
            "height": Port("same:x", "scalar", "height of the resonance"), "width": Port("frequency", "scalar", "full width at half power"),
            "frequency_at_maximum": Port("frequency", "scalar", "grid frequency of the largest response above a constant"),
        },
        sentence="A complex Lorentzian on a {background} background was fitted to {points} points from {range}: {reason}.", spread="refit", weights=("x",),
    ),
    Step(
        name="relative-pressure", version=1, function=adsorption_steps.relative_pressure,
        takes={"pressure": Port("pressure", "array", "pressure over the film"), "saturated_pressure": Port("pressure", "number", "saturated pressure")},
        yields={"relative_pressure": Port("relative_pressure", "array", "pressure over saturated pressure")}, sentence="Pressures are given over the saturated pressure {saturated_pressure}.",
    ),
    Step(
        name="bet-area", version=2, function=adsorption_steps.bet, parameters=adsorption_steps.BetParameters,
        takes={
            "relative_pressure": Port("relative_pressure|pressure_ratio", "array", "relative pressure"), "amount": Port("amount|specific_amount", "array", "amount adsorbed"), "sample": _SAMPLE,
            "cross_section": Port("atoms_area", "scalar", "area of one molecule", optional=True),
        },
        yields={
            "monolayer": Port("same:amount", "scalar", "monolayer capacity"), "constant": Port("number", "scalar", "constant C"),
            "area": Port("area-of:amount", "scalar", "area by the monolayer"),
            "range_low": Port("relative_pressure", "scalar", "lower end of the line"), "range_high": Port("relative_pressure", "scalar", "upper end of the line"),
            "x_at_monolayer": Port("relative_pressure", "scalar", "where the isotherm reaches the monolayer"),
            "rising": Port("same:amount", "array", "amount times 1 - p/p0, which must rise over the line"),
            "residual": Port("number", "array", "x/(n(1 - x)) less line, times the monolayer"),
        },
        sentence="The {label} isotherm, analysed between p/p0 = {low} and {high} ({points} points) with {per_molecule} per molecule, gives a monolayer of {monolayer} (constant C = {constant}), reached at p/p0 = {x_at}.",
        citations=("bet-1938", "thommes-2015"), spread="refit", weights=("amount",), kinds=("amount",),
    ),
    Step(
        name="isotherm-plateau", version=1, function=adsorption_steps.plateau, parameters=adsorption_steps.PlateauParameters,
        takes={"relative_pressure": Port("relative_pressure|pressure_ratio", "array", "relative pressure"), "amount": Port("amount|specific_amount", "array", "amount adsorbed")},
        yields={"plateau_amount": Port("same:amount", "scalar", "amount on the plateau: filled pores")},
        sentence="Between p/p0 = {low} and {high} the isotherm {shape}; amount on the plateau: {plateau_amount}.", spread="refit",
    ),
    *gathering.GATHERING_STEPS,
    *jump_steps.JUMP_STEPS,
    *dead_volume_steps.DEAD_VOLUME_STEPS,
    *porous_steps.POROUS_STEPS,
    *porous_heat_steps.POROUS_HEAT_STEPS,
    *dynamic_steps.DYNAMIC_STEPS,
    *stability_steps.STABILITY_STEPS,
    *current_steps.CURRENT_STEPS,
    *third_sound_steps.THIRD_SOUND_STEPS,
    *bulk_steps.BULK_STEPS,
    *lambda_line_steps.LAMBDA_LINE_STEPS,
    *calibration_steps.CALIBRATION_STEPS,
    *heat_capacity_steps.HEAT_CAPACITY_STEPS,
    *pulse_steps.PULSE_STEPS,
    *ringdown_steps.RINGDOWN_STEPS,
    *linear_regime_steps.LINEAR_REGIME_STEPS,
    *tracking_steps.TRACKING_STEPS,
    *fourth_sound_steps.FOURTH_SOUND_STEPS,
)  # fmt: skip


@cache
def all_steps() -> tuple[Step, ...]:
    """Return the steps of Stillroom and those of the laboratory.

    Raises
    ------
    BadRequest
        An entry point that cannot be loaded, is no step, or takes a name and version that exist.
    """
    found = list(STEPS)
    taken = {(step.name, step.version) for step in found}
    for entry in sorted(entry_points(group="stillroom.steps"), key=lambda point: point.name):
        try:
            loaded = entry.load()
        except (ImportError, AttributeError) as error:
            raise BadRequest(
                f"the laboratory's step {entry.name} ({entry.value}) cannot be loaded: {error}",
                remedy="mend or remove the package that brings it",
            ) from None
        for step in [loaded] if isinstance(loaded, Step) else _steps(loaded, entry.name):
            if (step.name, step.version) in taken:
                raise BadRequest(
                    f"step {step.name} version {step.version} exists already; the one from {entry.name} needs another name"
                )
            taken.add((step.name, step.version))
            found.append(step)
    return tuple(found)


def _steps(loaded: object, name: str) -> list[Step]:
    steps = list(loaded) if isinstance(loaded, Iterable) else []
    if not steps or not all(isinstance(step, Step) for step in steps):
        raise BadRequest(f"the entry point {name} of stillroom.steps is no step and no sequence of steps")
    return steps


def step_named(name: str, version: int | None = None) -> Step:
    """Return a step by name; the newest version unless one is given.

    Raises
    ------
    BadRequest
        There is no such step, or not in that version.

    Examples
    --------
    >>> step_named("leave-out").version
    1
    """
    known = [step for step in all_steps() if step.name == name]
    if not known:
        names = ", ".join(sorted({step.name for step in all_steps()}))
        raise BadRequest(f"there is no step {name!r}", expected=f"one of {names}")
    if version is None:
        return max(known, key=lambda step: step.version)
    for step in known:
        if step.version == version:
            return step
    raise BadRequest(
        f"step {name} has no version {version}", expected=", ".join(str(step.version) for step in known)
    )
