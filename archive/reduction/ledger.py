"""The gas ledger of a cooldown: every dose with its running total, and the balance at the end.

The amounts come from the same functions as those of the reduction step, so that the ledger and a reduction agree.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from archive.reduction.estimate import Estimate
from archive.reduction.facts import GasBook
from archive.reduction.gas_amounts import DoseAmount, dose_amounts
from schemas.cooldown import CooldownSheet
from schemas.lineage import DoseEntry, Value
from schemas.quantity import Quantity
from schemas.substrate import Sample

__all__ = ["GasLedger", "amount_after", "gas_ledger"]


@dataclass(frozen=True)
class GasLedger:
    """The gas of one cooldown.

    Attributes
    ----------
    entries : tuple of DoseEntry
        In order of time, doses crossed out too, with what they would have been.
    admitted, removed, recovered, balance : Value
        mol; balance = admitted - removed - recovered, with the uncertainty of the whole.
    """

    entries: tuple[DoseEntry, ...]
    admitted: Value
    removed: Value
    recovered: Value
    balance: Value


def gas_ledger(sheet: CooldownSheet, *, sample: Sample | None, area: Quantity | None = None) -> GasLedger:
    """Return the gas ledger of a sheet.

    Parameters
    ----------
    sheet : CooldownSheet
    sample : Sample or None
        Gas of the run; needed when a dose is given by pressures.
    area : Quantity, optional
        Adsorbing area; with it the running coverage is told.

    Raises
    ------
    ValueError
        A dose that cannot be computed; the message names it.
    """
    doses = _doses(sheet, sample)
    entries = []
    taken: list[Estimate] = []
    for each in doses:
        if each.counted:
            taken.append(each.amount)
        total = _sum(taken)
        entries.append(
            DoseEntry(
                name=each.dose.name, at=each.dose.at, act=each.dose.act, counted=each.counted, amount=_value(each.amount),
                running_amount=_value(total), running_coverage=None if area is None else _coverage(total, area), method=each.method,
            )
        )  # fmt: skip
    counted = [each for each in doses if each.counted]
    acts = {
        act: _sum([each.amount for each in counted if each.dose.act == act])
        for act in ("add", "remove", "recover")
    }
    return GasLedger(
        tuple(entries),
        _value(acts["add"]),
        _value(_negative(acts["remove"])),
        _value(_negative(acts["recover"])),
        _value(_sum(taken)),
    )


def amount_after(sheet: CooldownSheet, dose: str | None, *, sample: Sample | None) -> Estimate:
    """Return the gas in the system after a dose; nothing before the first.

    Raises
    ------
    ValueError
        The sheet has no such dose, or a dose cannot be computed.
    """
    if dose is None:
        return _sum([])
    doses = _doses(sheet, sample)
    end = next((each.dose.at for each in doses if each.dose.name == dose), None)
    if end is None:
        raise ValueError(f"the sheet has no dose {dose!r}")
    return _sum([each.amount for each in doses if each.counted and each.dose.at <= end])


def _doses(sheet: CooldownSheet, sample: Sample | None) -> list[DoseAmount]:
    ordered = tuple(sorted(sheet.dose, key=lambda dose: (dose.at, dose.name)))
    book = GasBook(
        cooldown=sheet.name,
        doses=ordered,
        dosers=sheet.doser,
        gauges=sheet.gauge,
        dead_volumes=sheet.dead_volume,
    )
    return dose_amounts(book, sample)[0]


def _sum(amounts: list[Estimate]) -> Estimate:
    shared: dict[str, float] = {}
    for each in amounts:
        for name, part in each.shared.items():
            shared[name] = shared.get(name, 0.0) + float(part)
    value = math.fsum(float(each.value) for each in amounts)
    return Estimate(
        np.asarray(value), "amount", shared={name: np.asarray(part) for name, part in shared.items()}
    )


def _negative(amount: Estimate) -> Estimate:
    # Adding zero turns a minus zero into plain zero.
    return Estimate(
        0.0 - amount.value, "amount", shared={name: -part for name, part in amount.shared.items()}
    )


def _value(amount: Estimate) -> Value:
    return Value(value=float(amount.value), uncertainty=float(amount.uncertainty), unit="mol")


def _coverage(amount: Estimate, area: Quantity) -> Value:
    coverage = float(amount.value) / area.si
    spread = math.hypot(
        float(amount.uncertainty) / area.si, coverage * (area.si_uncertainty or 0.0) / area.si
    )
    return Value(value=coverage, uncertainty=spread, unit="mol/m^2")
