"""Gas bookkeeping: doses, the volumes they were metered from, and the gas that is not in the film."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import AwareDatetime, Field, model_validator

from schemas.base import Name, Record, Reference, Text
from schemas.quantity import OfKind, Quantity

__all__ = ["DeadVolume", "Dose", "Doser", "GasEnd", "Gauge"]

_Pressure = Annotated[Quantity, OfKind("pressure")]
_Temperature = Annotated[Quantity, OfKind("temperature")]
_Volume = Annotated[Quantity, OfKind("volume")]
_Amount = Annotated[Quantity, OfKind("amount")]


class Gauge(Record):
    """A pressure gauge."""

    name: Name
    range: _Pressure
    zero: _Pressure | None = Field(
        default=None, description="Reading at zero pressure; subtracted from each reading."
    )
    convention: Literal["absolute", "gauge"] = "absolute"
    uncertainty: Annotated[Quantity, OfKind("pressure")] | None = Field(
        default=None, description="Standard uncertainty of a reading."
    )
    relative_uncertainty: float | None = Field(
        default=None, gt=0, lt=1, description="Standard uncertainty of its gain, common to all readings."
    )
    calibration: Text | None = None


class Doser(Record):
    """A metering volume at room temperature."""

    name: Name
    volume: _Volume
    how: Text = Field(description="How the volume was found, and when.")


class Dose(Record):
    """One addition or removal of gas."""

    name: Name
    at: AwareDatetime
    act: Literal["add", "remove", "recover"] = Field(
        default="add", description="`recover`: the inventory pumped out at the end, measured."
    )
    sample: Reference | None = Field(
        default=None, description="Which gas, when the sheet names more than one."
    )
    doser: Name | None = Field(default=None, description="Metering volume.")
    gauge: Name | None = None
    pressure_before: _Pressure | None = None
    pressure_after: _Pressure | None = None
    temperature_before: _Temperature | None = Field(default=None, description="Of the metering volume.")
    temperature_after: _Temperature | None = Field(default=None, description="Left out: the same as before.")
    amount: _Amount | None = Field(
        default=None,
        description="Amount as the notebook states it, instead of pressures; cm3 STP needs its reference state.",
    )
    crossed_out: Text | None = Field(
        default=None, description="The dose was crossed out in the notebook: why. It does not count."
    )
    annealing: Text | None = Field(default=None, description="How the film was annealed after this dose.")
    notes: Text = ""

    @model_validator(mode="after")
    def _stated_once(self) -> Dose:
        by_pressure = self.pressure_before is not None or self.pressure_after is not None
        if by_pressure == (self.amount is not None):
            raise ValueError(
                "state the dose once: by doser with pressure_before and pressure_after, or by amount"
            )
        if by_pressure:
            missing = [
                name
                for name in ("doser", "pressure_before", "pressure_after", "temperature_before")
                if getattr(self, name) is None
            ]
            if missing:
                raise ValueError(f"a dose by pressures also needs {', '.join(missing)}")
        return self


class DeadVolume(Record):
    """A volume that holds vapour: its gas is not in the film."""

    name: Name
    volume: _Volume
    temperature: _Temperature | Literal["cell"] = Field(
        description="Its temperature, or `cell` when it follows the cell."
    )


class GasEnd(Record):
    """State of the gas at the end of the run; `unknown` is an answer, silence is not."""

    state: Literal["recovered", "left-in-cell", "vented", "never-admitted", "unknown"]
    valve: Text | None = Field(
        default=None, description="Valve of the cell and its state, e.g. `V7 open to ballast`."
    )
    valve_open: bool | None = None
    warmest_temperature: _Temperature | None = Field(
        default=None, description="Highest plausible room temperature for the caution; a site figure."
    )
    notes: Text = ""
