"""What the archive knows of earlier cooldowns when a new one is checked: their files, and how quiet their cells were."""

from __future__ import annotations

from collections.abc import Collection

import numpy as np

from archive.intake.checks.check import History, LinearRegime
from archive.intake.checks.rows import noise
from archive.lab.effective import EffectiveSource
from archive.lab.source import LabSource

__all__ = ["history"]

_LATEST = 12
"""So many of the newest sweeps of a cell tell how quiet it usually is."""


def history(source: LabSource, cooldown: str, cells: Collection[str]) -> History:
    """Files and usual period scatter that the archive holds.

    Parameters
    ----------
    cooldown : str
        The cooldown being checked; its own earlier accessions do not count for the scatter.
    cells : collection of str
        Names of the cells it used.
    """
    files = {row.sha256: row.address for row in source.index.raw_files() if row.role == "sweep"}
    return History(
        cooldown=cooldown,
        files=files,
        scatter={cell: found for cell in cells if (found := _scatter(source, cooldown, cell))},
        regimes={cell: regime for cell in cells if (regime := _regime(source, cooldown, cell))},
    )


def _scatter(source: LabSource, cooldown: str, cell: str) -> float | None:
    """Median relative scatter of the period from row to row over the newest sweeps of a cell."""
    rows = [row for row in source.newest_sweeps(cell, kind="temperature-sweep") if row.cooldown != cooldown]
    found = []
    for row in rows[:_LATEST]:
        entry = next(entry for entry in source.accession(row.accession).sweeps if entry.name == row.name)
        name = next(
            (channel.name for channel in entry.channels if channel.quantity == "period" and channel.use), None
        )
        if name is None:
            continue
        values = np.asarray(source.column(row.accession, row.name, name), dtype=np.float64)
        if np.isfinite(values).sum() > 2:
            found.append(noise(values) / float(np.nanmedian(values)))
    return float(np.median(found)) if found else None


def _regime(source: LabSource, cooldown: str, cell: str) -> LinearRegime | None:
    """Rim speed up to which the newest drive sweep of other cooldowns found a cell to be linear."""
    reading = EffectiveSource(source)
    for row in source.newest_sweeps(cell, kind="drive-sweep"):
        documents = [] if row.cooldown == cooldown else reading.reductions("drive-linearity", row.address)
        if not documents:
            continue
        values = {output.name: output.value for output in documents[-1].outputs}
        for name, found in (("linear_velocity", True), ("tested_velocity", False)):
            value = values.get(name)
            if value is not None and value > 0:
                return LinearRegime(value, found, documents[-1].address)
    return None
