"""Checklist items R08, R09, R26 to R35, R44 and R48: thermometry and measurement."""

from __future__ import annotations

from collections.abc import Iterator

from archive.reports.checklist import Item, Said, absence, sentence
from archive.reports.items_cell import plain
from archive.reports.items_gas import step_sentences
from archive.reports.numbers import shown_value
from archive.reports.prose import article
from archive.reports.scope import Scope
from schemas.cell import Cryostat, ThirdSoundRing
from schemas.lineage import SweepEntry, Value
from schemas.thermometer import Thermometer

__all__ = ["MEASUREMENT_ITEMS"]

_THERMOMETRY = "thermometry"
_MEASUREMENT = "measurement"


def _drive(scope: Scope) -> Iterator[Said]:
    for held in scope.runs:
        detection, name = held.sheet.detection, held.sheet.name
        if detection is None:
            yield absence(f"the drive scheme in {name}", name)
            continue
        speed = (
            plain(detection.reference_rim_velocity)
            if detection.reference_rim_velocity is not None
            else "not recorded"
        )
        yield sentence(
            f"The oscillator ran in {name} at {detection.drive_mode.replace('-', ' ')}; the rim speed at the reference point was {speed}.",
            name,
        )


def _linearity(scope: Scope) -> Iterator[Said]:
    cells = {each.address for each in scope.cells}
    own = {reduction.address for reduction, _ in scope.steps("drive-linearity")}
    found = False
    for held in scope.runs:
        of_cell = {
            f"{held.sheet.name}/{taken.sheet.name}"
            for taken in held.sweeps
            if taken.entry is not None and taken.entry.cell in cells
        }
        for reduction in held.view.current:
            for step in reduction.steps:
                if step.name == "drive-linearity" and reduction.sweep in of_cell:
                    found = True
                    not_here = (
                        ""
                        if reduction.address in own
                        else f" This reduction, {reduction.address}, is not among those of this appendix."
                    )
                    yield sentence(
                        f"{reduction.sweep}: {step.sentence}{not_here}",
                        f"{reduction.address} step {step.number}",
                    )
    if not found:
        yield absence(
            "the test of linearity",
            "the reductions of these cooldowns",
            reason="no such step was carried out",
        )


def _thermometers(scope: Scope) -> Iterator[Said]:
    named = dict.fromkeys(each.thermometer for each in scope.calibrations)
    for reference in named:
        found = next(
            (record for held in scope.runs if isinstance(record := held.named(reference), Thermometer)), None
        )
        if found is None:
            yield absence(f"the thermometer {reference}", reference)
            continue
        excitation = found.excitation or "an excitation that is not recorded"
        yield sentence(
            f"Temperature is taken from {found.address} ({found.kind.replace('-', ' ')}), {found.place}, read at {excitation}.",
            found.address,
        )


def _calibrations(scope: Scope) -> Iterator[Said]:
    for each in scope.calibrations:
        low, high = plain(each.temperature_low, setting=True), plain(each.temperature_high, setting=True)
        points = f"at {len(each.points)} points " if each.points else ""
        spread = (
            f"{each.relative_uncertainty:.2g} of T"
            if each.relative_uncertainty is not None
            else plain(each.uncertainty, setting=True)
        )
        origin = "" if each.made_from is None else f" (found by the reduction {each.made_from})"
        yield sentence(
            f"The calibration {each.address} is on {each.scale} against {each.against}{origin} {points}from {low} to {high} ({each.date}), form "
            f"{each.relation.form}, standard uncertainty {spread}; outside this range no temperature is given.",
            each.address,
        )


def _recorded_scale(scope: Scope) -> Iterator[Said]:
    converted = list(scope.steps("temperature-on-scale"))
    for reduction, step in converted:
        yield sentence(f"{reduction.sweep}: {step.sentence}", f"{reduction.address} step {step.number}")
    if not converted:
        scales = sorted(
            {each.scale for reduction in scope.reductions for each in reduction.outputs if each.scale}
        )
        yield sentence(
            f"No temperature was converted from one scale to another; the scales are: {', '.join(scales) or 'none'}.",
            "the steps of these reductions",
        )


def _control(scope: Scope) -> Iterator[Said]:
    sweeps = ", ".join(f"{held.sheet.name}/{taken.sheet.name}" for held, taken in scope.used)
    yield absence(f"the control of temperature during {sweeps}", "the sheets of these cooldowns")


def _ramps(scope: Scope) -> Iterator[Said]:
    for held, taken in scope.used:
        if taken.sheet.kind != "temperature-sweep":
            continue
        entry, address = taken.entry, f"{held.sheet.name}/{taken.sheet.name}"
        if entry is None or entry.temperature_low is None or entry.temperature_high is None:
            yield absence(f"the range of {address}", address)
            continue
        low, high = (
            shown_value(_short(end), "temperature", setting=True).plain
            for end in (entry.temperature_low, entry.temperature_high)
        )
        ending = f" on {entry.temperature_low.scale}"
        if entry.temperature_low.scale == entry.temperature_high.scale and high.endswith(ending):
            # One scale is named once.
            low = low.removesuffix(ending)
        rate = (
            f" at {plain(taken.sheet.rate, setting=True)}"
            if taken.sheet.rate is not None
            else _mean_rate(entry)
        )
        yield sentence(
            f"{address} ran between {low} and {high}{rate}, direction {taken.sheet.direction}.", address
        )


def _short(value: Value) -> Value:
    return value if value.value is None else value.model_copy(update={"value": float(f"{value.value:.4g}")})


def _mean_rate(entry: SweepEntry) -> str:
    begin, end, low, high = entry.begin, entry.end, entry.temperature_low, entry.temperature_high
    ends = [None if each is None else each.value for each in (low, high)]
    if begin is None or end is None or end <= begin or ends[0] is None or ends[1] is None:
        return "; its rate is not recorded"
    rate = (ends[1] - ends[0]) / (end - begin).total_seconds() * 3.6e6
    return f" at a mean of {rate:.3g} mK/h"


def _offset(scope: Scope) -> Iterator[Said]:
    for held in scope.runs:
        found = next((each for each in held.sheet.effect if each.effect == "sensor-film offset"), None)
        name = held.sheet.name
        if found is None:
            yield absence(f"the offset between sensor and film in {name}", name, reason="not examined")
        else:
            yield sentence(f"Offset between sensor and film in {name} ({found.state}): {found.reason}.", name)


def _clock(scope: Scope) -> Iterator[Said]:
    for held in scope.runs:
        cryostat = held.named(held.sheet.cryostat)
        if isinstance(cryostat, Cryostat) and cryostat.frequency_reference:
            yield sentence(
                f"Frequencies in {held.sheet.name} refer to {article(cryostat.frequency_reference)} {cryostat.frequency_reference}.",
                cryostat.address,
            )
        else:
            yield absence(f"the frequency reference in {held.sheet.name}", held.sheet.name)


def _response(scope: Scope) -> Iterator[Said]:
    times = list(scope.output("decay_time"))
    for reduction, each in times:
        yield sentence(
            f"Ring time {scope.text(each)} from {reduction.sweep}; detector and thermal time constants are not recorded.",
            reduction.address,
        )
    if not times:
        yield absence("the time response", "the steps of these reductions")


def _third_sound(scope: Scope) -> Iterator[Said]:
    for cell in scope.cells:
        if isinstance(cell, ThirdSoundRing):
            form = "a closed ring" if cell.closed else "a path between generator and detector"
            yield sentence(f"Waves ran over {plain(cell.path_length)}, {form}.", cell.address)


MEASUREMENT_ITEMS: tuple[Item, ...] = (
    Item("R26", "the thermometers", (), _THERMOMETRY, _thermometers),
    Item("R27", "calibration and scale", (), _THERMOMETRY, _calibrations),
    Item("R28", "conversion of scales", (), _THERMOMETRY, _recorded_scale),
    Item("R29", "corrections of vapour pressures", ("FS", "HC"), _THERMOMETRY, lambda _: ()),
    Item("R30", "the offset between sensor and sample", (), _THERMOMETRY, _offset),
    Item("R31", "control of temperature", (), _THERMOMETRY, _control),
    Item("R08", "drive scheme and rim speed", ("TO",), _MEASUREMENT, _drive),
    Item("R09", "the test of linearity", ("TO", "TS"), _MEASUREMENT, _linearity),
    Item("R32", "ramp rate and direction", (), _MEASUREMENT, _ramps),
    Item("R33", "time response", ("TO", "HC", "TS"), _MEASUREMENT, _response),
    Item("R34", "clock and frequency reference", ("TO", "TS"), _MEASUREMENT, _clock),
    Item("R35", "the way from signal to period and 1/Q", ("TO",), _MEASUREMENT, step_sentences("the way from signal to period and 1/Q", "dissipation-from-amplitude", "period-from-frequency", "dissipation-from-quality-factor", "resonance-fit", "ringdown-quality-factor")),
    Item("R44", "the method of heat capacity", ("HC",), _MEASUREMENT, step_sentences("the method of heat capacity", "heat-capacity-from-pulses")),
    Item("R48", "the geometry of third sound", ("TS",), _MEASUREMENT, _third_sound),
)  # fmt: skip
