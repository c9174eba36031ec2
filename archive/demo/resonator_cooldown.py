"""The invented cooldown 2026-07: fourth sound in a packed resonator, by pulses and by slow sweeps, and what is true of it.

Rules: as in `first_cooldown`; the frequencies follow the tabulated superfluid fraction and first sound, the resonator is invented.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Final

import numpy as np

from archive.demo.files import Column, comma_table, compressed
from archive.demo.recording import ZONE, CooldownFolder, at, filled, times_from
from archive.demo.resonator_sheet import RESONATOR_SHEET, record_text, sweep_text
from archive.demo.stated import generator
from archive.physics.fourth_sound import fourth_sound_ratio
from archive.physics.resonance import resonance_curve

if TYPE_CHECKING:
    import numpy.typing as npt

    Floats = npt.NDArray[np.float64]

__all__ = ["TEMPERATURES", "make_resonator_folders", "resonator_cooldown", "resonator_truth"]

NAME: Final = "2026-07"

TEMPERATURES: Final = (1.20, 1.32, 1.44, 1.55, 1.65, 1.73, 1.80)
"""True temperature of each record, K."""

_SWEPT: Final = 4
"""How many of them were swept over as well."""


@dataclass(frozen=True)
class PackedTruth:
    """A resonator packed with powder, its lines, and how it was read.

    Attributes
    ----------
    frequency, quality_factor : float
        Of the mode of fourth sound at 1.2 K, Hz; the loss rises with the normal fraction.
    spurious, spurious_quality : float
        A mode of the walls that does not move.
    tone : float
        What the electronics pick up, Hz.
    rate, points : float, int
        Readings per second, and of one record.
    noise : float
        Of one reading, V.
    """

    frequency: float = 2080.0
    quality_factor: float = 600.0
    spurious: float = 2712.0
    spurious_quality: float = 260.0
    tone: float = 1000.0
    rate: float = 8192.0
    points: int = 8192
    noise: float = 1e-4


PACKED: Final = PackedTruth()


def _line(temperature: float) -> tuple[float, float]:
    """Return frequency and quality factor of the mode of fourth sound."""
    ratio = float(fourth_sound_ratio(temperature, reference_temperature=TEMPERATURES[0]))
    return PACKED.frequency * ratio, PACKED.quality_factor * ratio


def resonator_truth() -> Mapping[str, Floats]:
    """Return temperature of each record (K), and frequency (Hz) and quality factor of the line that moves."""
    lines = np.array([_line(each) for each in TEMPERATURES])
    return {"temperature": np.array(TEMPERATURES), "frequency": lines[:, 0], "quality_factor": lines[:, 1]}


def pulse() -> Floats:
    """Return the drive of one record: a tone that rises from 500 Hz to 3500 Hz in 0.6 s with soft ends, V; then nothing."""
    t = np.arange(PACKED.points) / PACKED.rate
    length = 0.6
    phase = 2 * math.pi * (500.0 * t + (3500.0 - 500.0) / (2 * length) * t**2)
    soft = np.clip(np.minimum(t, length - t) / 0.03, 0.0, 1.0)
    return np.asarray(np.sin(phase) * np.sin(math.pi / 2 * soft) ** 2)


def _record(temperature: float, rng: np.random.Generator) -> Floats:
    """Return the response to the pulse: both modes, a little feed-through, the tone and noise, V."""
    f = np.fft.rfftfreq(PACKED.points, 1 / PACKED.rate)
    f0, quality = _line(temperature)
    response = (
        resonance_curve(f, resonance_frequency=f0, quality_factor=quality, height=8e-3, phase=0.4)
        + resonance_curve(f, resonance_frequency=PACKED.spurious, quality_factor=PACKED.spurious_quality, height=3e-3, phase=-0.8)
        + 2e-4
    )  # fmt: skip
    driven = np.fft.irfft(np.fft.rfft(pulse()) * response, PACKED.points)
    t = np.arange(PACKED.points) / PACKED.rate
    tone = 1.2e-4 * np.cos(2 * math.pi * PACKED.tone * t + 2 * math.pi * rng.random())
    return np.asarray(driven + tone + PACKED.noise * rng.standard_normal(PACKED.points))


def _record_file(seed: int, name: str, temperature: float) -> bytes:
    signal = _record(temperature, generator(seed, NAME, name))
    rows = [f"{1e3 * value:.4f},{PACKED.rate:.0f}" for value in signal]
    return compressed(("\n".join(["x,rate", "mV,Hz", *rows]) + "\n").encode())


def _pulse_file() -> bytes:
    return compressed(("\n".join(["V", *(f"{value:.6f}" for value in pulse())]) + "\n").encode())


def _sweep_file(seed: int, name: str, temperature: float, begin: str) -> bytes:
    rng = generator(seed, NAME, name)
    f0, quality = _line(temperature)
    f = f0 * (1 + 8 / quality * np.linspace(-0.5, 0.5, 161))
    z = resonance_curve(f, resonance_frequency=f0, quality_factor=quality, height=8e-4, phase=0.4) + 2e-5 * np.exp(-1.1j)  # fmt: skip
    noise = 2e-6 * rng.standard_normal((2, f.size))
    columns = [
        Column("f", "Hz", f, 4),
        Column("X", "mV", (z.real + noise[0]) * 1e3, 6),
        Column("Y", "mV", (z.imag + noise[1]) * 1e3, 6),
    ]
    return comma_table(times_from(at(begin), f.size, cadence=5.0), columns, zone=ZONE)


def resonator_cooldown(seed: int) -> CooldownFolder:
    """Return the folder of 2026-07.

    Parameters
    ----------
    seed : int
        Seed of the whole demonstration, not negative.
    """
    files = {"raw/pulse.csv.gz": _pulse_file()}
    blocks = []
    for number, temperature in enumerate(TEMPERATURES, 1):
        # The thermometer reads within a millikelvin; one draw a record.
        read = temperature + 3e-4 * generator(seed, NAME, f"T{number}").standard_normal()
        files[f"raw/r{number:02d}.csv.gz"] = _record_file(seed, f"r{number:02d}", temperature)
        blocks.append(record_text(f"r{number:02d}", read))
        if number <= _SWEPT:
            files[f"raw/q{number:02d}.csv"] = _sweep_file(
                seed, f"q{number:02d}", temperature, f"2026-07-{7 + number:02d} 14:00"
            )
            blocks.append(sweep_text(f"q{number:02d}", read))
    return CooldownFolder(NAME, filled(RESONATOR_SHEET, {"sweeps": "\n".join(blocks)}), files)


def make_resonator_folders(target: Path, seed: int) -> list[Path]:
    """Write the folder of the resonator cooldown and return its path, in a list.

    Parameters
    ----------
    target : Path
        Folder that gets `2026-07`; made if it is missing.
    seed : int
        Not negative.

    Raises
    ------
    FileExistsError
        If the folder is there already.
    """
    return [resonator_cooldown(seed).write(target)]
