"""What a check is, and what it may know of earlier cooldowns."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from typing import Any

from archive.intake.reading import Reading
from archive.intake.thresholds import Thresholds
from schemas.finding import Finding
from schemas.thermometer import Calibration

__all__ = ["Check", "CheckFunction", "History", "LinearRegime"]

CheckFunction = Callable[[Reading, Thresholds], Iterable[Finding]]


@dataclass(frozen=True)
class LinearRegime:
    """Rim speed up to which a cell was seen to be linear.

    Attributes
    ----------
    velocity : float
        m/s, rms.
    found : bool
        True: beyond it period or dissipation had changed; False: nothing was tried beyond it.
    address : str
        Reduction that says so.
    """

    velocity: float
    found: bool
    address: str


@dataclass(frozen=True)
class History:
    """What the archive already knows.

    Attributes
    ----------
    cooldown : str or None
        The cooldown being looked at; its own earlier accessions are not told of.
    files : mapping of str to str
        SHA-256 of raw files of sweeps to the address that holds them.
    scatter : mapping of str to float
        Usual relative scatter of the period from row to row, by name of the cell.
    regimes : mapping of str to LinearRegime
        Up to which rim speed the newest drive sweep found a cell to be linear, by name of the cell.
    calibrations : mapping of str to tuple of Calibration
        Those that the archive holds, by name of the thermometer.
    made : mapping of str to Calibration or str
        For calibrations of the sheet that name a reduction: what that reduction found, or in words why that is not known, by address.
    """

    cooldown: str | None = None
    files: Mapping[str, str] = field(default_factory=dict)
    scatter: Mapping[str, float] = field(default_factory=dict)
    regimes: Mapping[str, LinearRegime] = field(default_factory=dict)
    calibrations: Mapping[str, tuple[Calibration, ...]] = field(default_factory=dict)
    made: Mapping[str, Calibration | str] = field(default_factory=dict)


@dataclass(frozen=True)
class Check:
    """One check.

    Attributes
    ----------
    code : str
        Code of its findings.
    title : str
        One line: what is tested, and the limit by its name.
    function : callable
        `function(reading, thresholds)`, or with the history as a third argument if `uses_history`.
    uses_history : bool
        Whether it compares with earlier cooldowns; it is left out when there are none.
    """

    code: str
    title: str
    function: Callable[..., Iterable[Finding]]
    uses_history: bool = False

    def findings(self, reading: Reading, thresholds: Thresholds, earlier: History | None) -> list[Finding]:
        """Return the findings of this check."""
        arguments: tuple[Any, ...] = (reading, thresholds)
        if self.uses_history:
            if earlier is None:
                return []
            arguments += (earlier,)
        return list(self.function(*arguments))
