"""What a sheet says that bears on one sweep: its own table, and what it shares with others.

Two sheets that say the same here reduce the sweep alike; a sheet that says something else makes it another sweep.
"""

from __future__ import annotations

from schemas.base import Record
from schemas.cooldown import CooldownSheet
from schemas.gas import Dose

__all__ = ["sheet_of_sweep"]


def sheet_of_sweep(
    sheet: CooldownSheet, name: str
) -> dict[str, Record | str | list[Record] | dict[str, Record] | None]:
    """Everything in a sheet that bears on a sweep, by what it is.

    Parameters
    ----------
    sheet : CooldownSheet
    name : str
        Name of the sweep; the sheet has it.

    Notes
    -----
    Of the doses only those that the sweep has seen count, so that one admitted later changes nothing before it.
    """
    sweep = next(each for each in sheet.sweep if each.name == name)
    channels = sheet.channels_of(sweep)
    doses = _doses_seen(sheet, name)
    read_by = {each.gauge for each in channels.values()} | {each.gauge for each in doses}
    metered_by = {each.doser for each in doses}
    return {
        "sweep": sweep,
        "channels": dict(channels),
        "dialect": sheet.dialect_of(sweep),
        "detection": sheet.detection_of(sweep),
        "cell": sheet.cell_of(sweep),
        "sample": sweep.sample or sheet.sample,
        "temperature_scale": sheet.temperature_scale,
        "gauges": [each for each in sheet.gauge if each.name in read_by],
        "doses": list(doses),
        "dosers": [each for each in sheet.doser if each.name in metered_by],
        "dead_volumes": [] if sweep.empty_cell else list(sheet.dead_volume),
    }


def _doses_seen(sheet: CooldownSheet, name: str) -> list[Dose]:
    """Doses that a sweep has seen: those before it, and those during it."""
    sweep = next(each for each in sheet.sweep if each.name == name)
    if sweep.empty_cell or sweep.gas != "helium":
        return []
    named = {*sweep.doses, sweep.after_dose}
    last = max((each.at for each in sheet.dose if each.name in named), default=None)
    return [] if last is None else [each for each in sheet.dose if each.at <= last]
