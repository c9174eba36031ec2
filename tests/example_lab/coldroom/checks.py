"""The group's own check: a function from what was read to findings."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from archive.intake.checks.check import Check
from archive.intake.reading import Reading
from archive.intake.thresholds import Thresholds
from schemas.finding import Finding

__all__ = ["TOO_MUCH_HEATING", "too_much_heating"]

LIMIT_W = 1e-9
"""The group's own limit for its thermometers."""


def too_much_heating(reading: Reading, _: Thresholds) -> Iterator[Finding]:
    """Yield a warning for each sweep whose excitation heats a thermometer by more than the group allows."""
    for table in reading.tables.values():
        voltage, resistance = table.values("voltage"), table.values("resistance")
        if voltage is None or resistance is None:
            continue
        power = float(np.nanmax(voltage**2 / resistance))
        if power > LIMIT_W:
            yield Finding(
                code="too-much-heating",
                severity="warning",
                what=f"the bridge puts up to {power:.2g} W into the thermometer",
                place=table.name,
                expected=f"at most {LIMIT_W:g} W, the limit of this group",
                remedy="measure again with less excitation, or waive this with a reason",
            )


TOO_MUCH_HEATING = Check(
    "too-much-heating", "the bridge heats no thermometer by more than the group allows", too_much_heating
)
