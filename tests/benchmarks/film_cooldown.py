"""An archive with an invented cooldown of films, more and longer sweeps in it than the demonstration has."""

from __future__ import annotations

from datetime import UTC, datetime
from functools import partial
from pathlib import Path
from typing import Final

from archive import Archive
from archive.demo.first_cooldown import FIRST_COVERAGES, first_cooldown
from archive.demo.forward import film_sweep
from archive.demo.recording import CooldownFolder, at, sweep_bytes
from archive.demo.stated import generator
from archive.demo.truth import TO4

__all__ = ["COOLDOWN", "MOMENT", "SWEEP", "film_archive"]

COOLDOWN: Final = "2025-03"
SWEEP: Final = f"{COOLDOWN}/s008"
MOMENT: Final = partial(datetime, 2026, 4, 1, 12, tzinfo=UTC)
"""The clock of every reduction, so that two ways to the same one give the same bytes."""

_SEED: Final = 1


def film_archive(place: Path, *, rows: int, more: int = 0) -> Path:
    """Return the folder of an archive with the cooldown ingested.

    Parameters
    ----------
    place : Path
        Folder to make it below.
    rows : int
        Of the sweep through the transition of a film, and of those added.
    more : int
        Sweeps to add, as many repeats of the same one with noise of their own, named m0001 and so on.
    """
    made = first_cooldown(_SEED)
    sheet, files = made.sheet, dict(made.files)
    block = next(each for each in sheet.split("[[sweep]]\n") if each.startswith('name = "s008"'))
    for number in range(more + 1):
        name = "s008" if number == 0 else f"m{number:04d}"
        record = film_sweep(TO4, FIRST_COVERAGES["s008"], generator(_SEED, COOLDOWN, name), rows=rows)
        file = "raw/ts_d20_up.csv" if number == 0 else f"raw/{name}.csv"
        files[file] = sweep_bytes(record, at("2025-03-30 20:00"), sensor="RX2", cadence=0.5)
        if number:
            repeat = block.replace('"s008"', f'"{name}"').replace("raw/ts_d20_up.csv", file)
            sheet = sheet.replace('[[sweep]]\nname = "s009"', f'[[sweep]]\n{repeat}[[sweep]]\nname = "s009"')
    folder = CooldownFolder(COOLDOWN, sheet, files).write(place)
    with Archive.create(place / "lab", name="Bench", clock=MOMENT) as lab:
        outcome = lab.ingest(folder)
        if outcome.address is None:
            raise RuntimeError([str(each) for each in outcome.report.findings if each.severity == "error"])
    return place / "lab"
