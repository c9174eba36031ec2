"""Cautions: what a person should think of before a cell is warmed or opened, from what the record says.

Rules: arithmetic on recorded values, at the unfavourable ends; no risk assessment. A caution never gives a permission,
never blocks anything, and cannot be switched off. A missing input is named; it gets no default. There are three
states: `caution`, `not assessed`, `outside range of this formula`.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal

from pydantic import Field

from archive.intake.caution_texts import BIAS, EVENTS, FIXED_TEXT, amount_text, pressure_text
from archive.intake.reading import Reading
from archive.physics.constants import STANDARD_ATMOSPHERE
from archive.physics.trapped_gas import trapped_pressure
from schemas.base import Record
from schemas.cell import Cell, Cryostat
from schemas.lineage import Value
from schemas.quantity import Quantity, unit_factor

__all__ = ["FIXED_TEXT", "Caution", "cautions"]

_TRAPPED_FORMULA = "p = n R T/V (1 + B c + C c^2), c = n/V; ideal: p = n R T/V; gauge: above 101.325 kPa"
_COVERAGE_FACTOR = 2.0  # expanded uncertainty, JCGM 100:2008, 6.2 and annex G
# Bias above which helium may break down: its Paschen minimum lies near 156 V (from memory).
_DISCHARGE_V = 150.0


class Caution(Record):
    """One caution.

    Attributes
    ----------
    subject : str
    state : str
    missing : tuple of str
        Inputs that are not recorded.
    text : str
        Fact, assumption, consequence, and who decides.
    formula : str
        Formula of the estimate, if there is one.
    numbers : dict of str to Value
        What went in and came out, at full precision.
    rating : str
        The recorded rating, printed beside, and never compared.
    """

    subject: str
    state: Literal["caution", "not assessed", "outside range of this formula"]
    missing: tuple[str, ...] = ()
    text: str
    formula: str = ""
    numbers: dict[str, Value] = Field(default_factory=dict)
    rating: str = ""


def cautions(reading: Reading) -> list[Caution]:
    """Return every caution that the record of a run gives reason for.

    Parameters
    ----------
    reading : Reading
        With the gas ledger, if doses were given.
    """
    cells = _cells(reading)
    return [
        *(found for cell in cells for found in _trapped_gas(reading, cell)),
        *(_relief(cell) for cell in cells if cell.closable_volume is not None),
        *_of_events(reading),
        *_of_bias(reading),
    ]


def _cells(reading: Reading) -> list[Cell]:
    cells = {
        cell.address: cell for sweep in reading.sheet.sweep if (cell := reading.cell_of(sweep)) is not None
    }
    return list(cells.values())


@dataclass(frozen=True)
class _Held:
    """Helium that may be in the cell: mol, its standard uncertainty, and what was assumed."""

    amount: float
    uncertainty: float
    assumption: str


def _held(reading: Reading) -> _Held | None:
    """Helium left at the end; all that was added where no recovery was measured; None if it cannot be told."""
    state = reading.sheet.gas_end.state
    held, u_held, recovered, u_recovered = 0.0, 0.0, 0.0, 0.0
    added = measured = False
    for entry in reading.ledger:
        if not entry.counted or entry.amount.value is None:
            continue
        factor = unit_factor(entry.amount.unit, "amount")
        amount, u = abs(entry.amount.value) * factor, (entry.amount.uncertainty or 0.0) * factor
        if entry.act == "recover":
            recovered, u_recovered, measured = recovered + amount, math.hypot(u_recovered, u), True
            continue
        added = added or entry.act == "add"
        held += amount if entry.act == "add" else -amount
        running = entry.running_amount
        u_held = (running.uncertainty or 0.0) * unit_factor(running.unit, "amount")
    if not added:
        return None
    if state == "recovered" and measured:
        return _Held(
            max(held - recovered, 0.0), math.hypot(u_held, u_recovered), "what was added and not recovered"
        )
    if state == "left-in-cell":
        return _Held(max(held - recovered, 0.0), math.hypot(u_held, u_recovered), "left in the cell")
    words = {
        "unknown": "its state at the end is unknown, so all that was added is counted",
        "recovered": "no measured recovery is recorded, so all that was added is counted",
        "vented": "what was vented is not measured, so all that was added is counted",
        "never-admitted": "the sheet says that none was admitted, and its doses count",
    }
    return _Held(max(held, 0.0), u_held, words[state])


def _rating(cell: Cell) -> str:
    if cell.rated_pressure is None:
        return "no rating recorded"
    document = f"document {cell.rating_document}" if cell.rating_document else "not assessed: rating document"
    return f"recorded rating {cell.rated_pressure.text}, {document}"


def _contact(reading: Reading) -> str:
    cryostat = reading.record(reading.sheet.cryostat)
    contact = cryostat.site_contact if isinstance(cryostat, Cryostat) else None
    return contact or "the person whom the rules of this site name"


def _trapped_gas(reading: Reading, cell: Cell) -> Iterator[Caution]:
    end = reading.sheet.gas_end
    held = _held(reading)
    doses = [dose for dose in reading.sheet.dose if dose.crossed_out is None]
    if held is None and not doses and end.state in ("never-admitted", "recovered", "vented"):
        return
    subject = f"trapped gas in {cell.address}"
    volume, warmest, rating = cell.closable_volume, end.warmest_temperature, _rating(cell)
    missing = [
        name
        for name, absent in (
            ("amount of helium", held is None),
            ("closable volume of the cell", volume is None),
            ("warmest temperature of this site", warmest is None),
        )
        if absent
    ]
    if held is None or volume is None or warmest is None:
        yield Caution(
            subject=subject,
            state="not assessed",
            missing=tuple(missing),
            text=f"Not assessed: {', '.join(missing)}. Gas shut into a cold volume presses hard when it warms. "
            f"Ask {_contact(reading)} before warming.",
            formula=_TRAPPED_FORMULA,
            rating=rating,
        )
        return
    if held.amount + _COVERAGE_FACTOR * held.uncertainty > 0:
        yield _estimate(reading, cell, held, volume, warmest)


def _estimate(reading: Reading, cell: Cell, held: _Held, volume: Quantity, warmest: Quantity) -> Caution:
    end, rating = reading.sheet.gas_end, _rating(cell)
    u_volume = _COVERAGE_FACTOR * (volume.si_uncertainty or 0.0)
    if not volume.si > u_volume:
        return Caution(
            subject=f"trapped gas in {cell.address}",
            state="not assessed",
            missing=("closable volume of the cell, better than its uncertainty",),
            text=f"Not assessed: the closable volume {volume.text} is not larger than its expanded uncertainty. "
            f"Ask {_contact(reading)} before warming.",
            formula=_TRAPPED_FORMULA,
            rating=rating,
        )
    n = held.amount + _COVERAGE_FACTOR * held.uncertainty
    estimate = trapped_pressure(
        amount=n, volume=volume.si, temperature=warmest.si, volume_uncertainty=u_volume
    )
    gauge = estimate.gauge(STANDARD_ATMOSPHERE)
    valve = end.valve or (
        f"valve {cell.closing_valve}, state not recorded" if cell.closing_valve else "valve not recorded"
    )
    unknown_valve = end.valve_open is None and end.state != "unknown"
    assumption = (
        "the valve is recorded open; the estimate holds if a plug closes the volume"
        if end.valve_open
        else "the valve or a plug closes the volume"
    )
    state: Literal["caution", "not assessed", "outside range of this formula"] = estimate.state
    lead = ""
    if unknown_valve:
        lead = "Not assessed: state of the valve. "
        state = "not assessed" if state == "caution" else state
    text = (
        f"{lead}{amount_text(n)} of helium is recorded in {cell.name} ({held.assumption}), {valve}. "
        f"Assumed: {assumption}, and nothing vents. If it warms to {warmest.si:.4g} K, the estimate is "
        f"{pressure_text(estimate.largest)} absolute"
        + (f" ({pressure_text(gauge)} gauge)" if gauge > 0 else "")
        + f"; {estimate.note}. {rating[0].upper()}{rating[1:]}. Ask {_contact(reading)} before warming."
    )
    numbers = {
        "amount": Value(value=n, unit="mol"),
        "volume": Value(value=estimate.volume, unit="m^3"),
        "temperature": Value(value=estimate.temperature, unit="K"),
        "ideal pressure": Value(value=estimate.ideal, unit="Pa"),
        "pressure": Value(value=estimate.largest, unit="Pa"),
    }
    if gauge > 0:
        numbers["gauge pressure"] = Value(value=gauge, unit="Pa")
    if cell.rated_pressure is not None:
        numbers["rating"] = Value(value=cell.rated_pressure.si, unit="Pa")
    return Caution(
        subject=f"trapped gas in {cell.address}",
        state=state,
        missing=("state of the valve",) if unknown_valve else (),
        text=text,
        formula=_TRAPPED_FORMULA,
        numbers=numbers,
        rating=rating,
    )


def _relief(cell: Cell) -> Caution:
    device = (
        f"relief device recorded: {cell.relief_device}" if cell.relief_device else "no relief device recorded"
    )
    return Caution(
        subject=f"relief device of {cell.address}",
        state="caution",
        missing=() if cell.relief_device else ("relief device",),
        text=f"The volume of {cell.name} can be closed; {device}. Whether it needs one, and which, is for a competent person "
        "to say case by case; a device must not sit where it freezes or behind a shut valve.",
        rating=_rating(cell),
    )


def _of_events(reading: Reading) -> Iterator[Caution]:
    logged = dict.fromkeys(event.what for event in reading.sheet.event)
    for what in logged:
        for subject, text, missing in EVENTS.get(what, ()):
            yield Caution(
                subject=subject,
                state="not assessed" if missing else "caution",
                missing=missing,
                text=(f"Not assessed: {', '.join(missing)}. {text}" if missing else text).replace(
                    "{contact}", _contact(reading)
                ),
            )


def _of_bias(reading: Reading) -> Iterator[Caution]:
    biases = {
        detection.bias.si: detection.bias
        for sweep in reading.sheet.sweep
        if (detection := reading.detection_of(sweep)) is not None and detection.bias is not None
    }
    if not biases:
        return
    largest = max(abs(value) for value in biases)
    numbers = {"bias": Value(value=largest, unit="V")}
    yield Caution(
        subject="bias voltage",
        state="not assessed",
        missing=("capacitance of electrodes, cable and supply filter",),
        text=f"A bias of {largest:.4g} V is recorded, and the capacitance that it charges is not. {BIAS[0]}",
        formula="E = C U^2/2; after switching off, wait 5 r C through the bleeder r, then measure",
        numbers=numbers,
    )
    if largest >= _DISCHARGE_V:
        yield Caution(
            subject="discharge in gas",
            state="caution",
            text=f"A bias of {largest:.4g} V is recorded. {BIAS[1]}",
            formula="breakdown depends on gas density times gap; in cold gas the pressure scales by T/293 K",
            numbers=numbers,
        )
