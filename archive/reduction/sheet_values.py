"""What a sheet and its records say of a sweep, by name: ``cell.mass_sensitivity``, ``substrate.area``, ``gas``, ...

A value with an uncertainty becomes an estimate whose source is named after the record and field, so that two sweeps
that rest on the same statement stay correlated.
"""

from __future__ import annotations

from typing import Literal

import numpy as np

from archive.reduction.channels import rms_value
from archive.reduction.estimate import Estimate
from archive.reduction.facts import SweepFacts
from schemas.lineage import SourceEntry, Value
from schemas.quantity import Quantity, canonical, unit_factor

__all__ = ["SheetValue", "quantity_estimate", "sheet_value"]

SheetValue = tuple[Estimate | object | None, tuple[SourceEntry, ...], str]
"""Value (estimate, record or None), new sources, and the address it stands at."""

Level = Literal["run", "cell", "laboratory"]


def quantity_estimate(
    quantity: Quantity, *, name: str, level: Level, address: str, unstated: str | None = None
) -> tuple[Estimate, tuple[SourceEntry, ...]]:
    """Return a stated quantity as an estimate, with the source of its uncertainty.

    Parameters
    ----------
    quantity : Quantity
    name : str
        Name of the source; equal statements must have equal names.
    level, address : str
        Whom the source is common to, and where it stands.
    unstated : str, optional
        Convention of an amplitude that states none.
    """
    rms = rms_value(quantity, unstated)
    value = np.asarray(quantity.si * rms)
    spread = (quantity.si_uncertainty or 0.0) * rms
    if spread == 0:
        return Estimate(value, quantity.kind, scale=quantity.scale), ()
    stated = Value(value=float(value), uncertainty=spread, unit=quantity.si_unit, scale=quantity.scale)
    entry = SourceEntry(
        name=name, description=f"stated: {quantity.format()}", level=level, address=address, stated=stated
    )
    return Estimate(value, quantity.kind, shared={name: np.asarray(spread)}, scale=quantity.scale), (entry,)


def sheet_value(facts: SweepFacts, name: str) -> SheetValue:
    """Return what the sheet or the records say under a name; None if nothing.

    Parameters
    ----------
    facts : SweepFacts
    name : str
        ``gas``, ``sheet``, ``sweep``, ``liquid``, ``detection``, ``cell``, ``substrate``, ``sample`` (records); a field of one of the
        last six, e.g. ``cell.gap``; ``amount`` or ``coverage`` as the accession computed them.
    """
    head, _, field = name.partition(".")
    if head in ("amount", "coverage") and not field:
        return _accession_value(facts, head)
    holder, address, level = _holder(facts, head)
    if holder is None or not field:
        return holder, (), address
    found = getattr(holder, field, None)
    if not isinstance(found, Quantity):
        return found, (), address
    detection = facts.accession.sheet.detection_of(facts.sweep)
    estimate, sources = quantity_estimate(
        found,
        name=f"{address} {field}",
        level=level,
        address=address,
        unstated=None if detection is None else detection.amplitude_convention,
    )
    if estimate.quantity == "temperature" and estimate.scale is None:
        estimate = estimate.with_scale(facts.accession.sheet.temperature_scale)
    return estimate, sources, address


def _holder(facts: SweepFacts, head: str) -> tuple[object | None, str, Level]:
    sheet, entry = facts.accession.sheet, facts.entry
    holders: dict[str, tuple[object | None, str, Level]] = {
        "gas": (facts.gas_book, facts.accession.address, "run"),
        "sheet": (sheet, facts.accession.address, "run"),
        "sweep": (facts.sweep, facts.address, "run"),
        "liquid": (facts.sweep.liquid, facts.address, "run"),
        "detection": (sheet.detection_of(facts.sweep), facts.accession.address, "run"),
        "cell": (facts.cell, entry.cell or facts.address, "cell"),
        "substrate": (facts.substrate, entry.substrate or facts.address, "cell"),
        "sample": (facts.sample, entry.sample or facts.address, "laboratory"),
    }
    return holders.get(head, (None, facts.address, "run"))


def _accession_value(facts: SweepFacts, head: str) -> SheetValue:
    stated: Value | None = getattr(facts.entry, head)
    if stated is None or stated.value is None:
        return None, (), facts.address
    factor = unit_factor(stated.unit, head)
    spread = (stated.uncertainty or 0.0) * factor
    name = f"{facts.address} {head}"
    sources: tuple[SourceEntry, ...] = ()
    if spread:
        sources = (
            SourceEntry(
                name=name,
                description=f"{head} during the sweep",
                level="run",
                address=facts.address,
                stated=Value(value=stated.value * factor, uncertainty=spread, unit=canonical(head)),
            ),
        )
    return (
        Estimate(np.asarray(stated.value * factor), head, shared={name: np.asarray(spread)}),
        sources,
        facts.address,
    )
