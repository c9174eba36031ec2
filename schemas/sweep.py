"""Sweeps: one recorded series, the files it stands in, and the state it was taken in."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import AwareDatetime, Field, StringConstraints, model_validator

from schemas.base import Name, Record, Reference, Text
from schemas.liquid import Liquid
from schemas.quantity import OfKind, Quantity
from schemas.thermometer import ScaleName

__all__ = [
    "CHANNEL_PATTERN",
    "FILE_PATTERN",
    "Channel",
    "Correction",
    "Detection",
    "Dialect",
    "Disturbance",
    "FilePath",
    "Layout",
    "LeftOut",
    "Sweep",
    "SweepKind",
]

SweepKind = Literal[
    "temperature-sweep",
    "dose-run",
    "drive-sweep",
    "frequency-sweep",
    "ringdown",
    "pulse-response",
    "drive-pulse",
    "isotherm",
    "heat-capacity",
    "persistent-current",
    "calibration",
    "log",
]

FILE_PATTERN = r"^[^\x00-\x1f\x7f\\]+$"
CHANNEL_PATTERN = r"^[a-z][a-z0-9_]{0,63}$"

FilePath = Annotated[str, StringConstraints(pattern=FILE_PATTERN, max_length=400, min_length=1)]
"""A file inside the cooldown folder, relative, with forward slashes."""

ChannelName = Annotated[str, StringConstraints(pattern=CHANNEL_PATTERN)]


class Dialect(Record):
    """How a text table is written."""

    delimiter: Literal[",", ";", "\t", "space", "|"] = ","
    decimal: Literal[".", ","] = "."
    comment: Annotated[str, StringConstraints(min_length=1, max_length=3)] | None = "#"
    encoding: Literal["utf-8", "latin-1"] = "utf-8"
    skip_rows: int = Field(
        default=0, ge=0, le=10_000, description="Lines before the header that are not data."
    )
    header_rows: int = Field(
        default=1, ge=0, le=20, description="Header lines: names first, then e.g. units."
    )
    header_comment: bool = Field(
        default=False,
        description="The header line itself begins with the comment mark, as in `# T (K), P (s)`.",
    )
    quote: Literal['"', "'"] | None = '"'
    time_format: str | None = Field(
        default=None,
        description="`iso8601`, `epoch` (seconds since 1970 UTC), or a strptime pattern for local time.",
    )
    time_zone: str | None = Field(default=None, description="Zone of local times, e.g. `Europe/Helsinki`.")
    fold: Literal["earlier", "later"] | None = Field(
        default=None, description="Which one is meant when the clock was set back and an hour ran twice."
    )
    names: tuple[str, ...] | None = Field(default=None, description="Column names, when the file has none.")


class Channel(Record):
    """One column of a sweep: what it is, in which unit, from which instrument, how well known."""

    column: str | int = Field(
        description="Column name in the file's header, or its number from 1; in a NumPy or HDF5 file an array, its column (`table/3`) or its row (`table/row/3`)."
    )
    quantity: str = Field(
        description="Quantity kind, e.g. `period`, `resistance`, `pressure`, `instant` for a time stamp."
    )
    unit: str | None = Field(
        default=None, description="Unit of the numbers in the file; time stamps have none."
    )
    description: Text = ""
    instrument: Text | None = None
    uncertainty: str | None = Field(
        default=None,
        description="Standard uncertainty of one reading: a quantity (`2 ns`) or a share (`0.01 %`).",
    )
    uncertainty_is: Literal["point", "run"] = Field(
        default="point",
        description="`point`: independent from row to row; `run`: common to all rows of this sweep.",
    )
    convention: Literal["rms", "peak", "peak-to-peak", "absolute", "gauge"] | None = None
    scale: ScaleName | None = Field(default=None, description="Scale of a temperature channel.")
    thermometer: Reference | None = Field(default=None, description="Thermometer that a reading belongs to.")
    calibration: Reference | None = Field(default=None, description="Calibration to reduce the reading with.")
    gauge: Name | None = Field(default=None, description="Gauge that a pressure was read on.")
    sentinels: tuple[str, ...] = Field(
        default=(), description="Cells that mean `no value`, as they stand in the file."
    )
    nan: Literal["keep", "error"] = Field(default="error", description="What an empty or NaN cell is.")
    full_scale: Annotated[str, StringConstraints(min_length=1)] | None = Field(
        default=None, description="Range of the instrument, a quantity; readings near it are saturated."
    )
    use: bool = Field(default=True, description="False: kept and never reduced with; say why.")
    why_not: Text | None = None

    @model_validator(mode="after")
    def _consistent(self) -> Channel:
        if self.quantity == "instant":
            if self.unit is not None:
                raise ValueError(
                    'a channel of time stamps (quantity = "instant") has no unit; its format stands in the dialect'
                )
        elif self.unit is None:
            raise ValueError('unit is missing; write "1" for a number without dimension')
        if self.quantity == "temperature" and self.scale is None:
            raise ValueError(
                'a temperature channel needs its scale, e.g. scale = "ITS-90"; a reading that is still to be calibrated is a resistance, pressure, ...'
            )
        if not self.use and not self.why_not:
            raise ValueError("a channel that is not to be used needs why_not")
        if isinstance(self.column, int) and self.column < 1:
            raise ValueError("column numbers count from 1")
        return self


class Layout(Record):
    """What the files of one instrument program look like; many sweeps share a layout."""

    dialect: Dialect = Dialect()
    channels: dict[ChannelName, Channel]


class LeftOut(Record):
    """A sub-range that is kept but not reduced with, and why."""

    channel: ChannelName | None = Field(default=None, description="Channel whose values bound the range.")
    low: str | None = Field(
        default=None, description="Lower end, a quantity of that channel or an RFC 3339 time."
    )
    high: str | None = None
    rows: tuple[int, int] | None = Field(
        default=None, description="First and last data row, from 1, instead of a range."
    )
    reason: Annotated[Text, StringConstraints(min_length=3)]

    @model_validator(mode="after")
    def _bounded(self) -> LeftOut:
        by_range = self.channel is not None and (self.low is not None or self.high is not None)
        if by_range == (self.rows is not None):
            raise ValueError("bound what is left out once: by channel with low and/or high, or by rows")
        return self


class Correction(Record):
    """A known correction; it becomes a recorded step, never an edit of the data."""

    channel: ChannelName
    correct: Literal["zero", "gain", "phase", "clock"] = Field(
        description="zero: value is subtracted; gain: values are divided by it; phase: the detector's phase error; clock: added to time stamps."
    )
    value: str = Field(
        description="A quantity with uncertainty, e.g. `0.15(3) Pa`, `1.0021(4)`, `2.1(5) deg`, `3600 s`."
    )
    known: Literal["measured", "computed", "document", "assumed"]
    source: Text = Field(description="From where it is known.")


class Disturbance(Record):
    """Something happened during a sweep: a knock, a transfer, a step of the period."""

    at: AwareDatetime
    what: Text
    new_segment: bool = Field(
        default=False, description="True: what follows is not referred to what went before."
    )


class Detection(Record):
    """Drive and detection of an oscillator."""

    torque_exponent: Literal[1, 2] = Field(description="p: torque is proportional to drive to the power p.")
    signal_exponent: Literal[0, 1] = Field(
        description="s: signal is proportional to amplitude times frequency to the power s."
    )
    amplitude_convention: Literal["rms", "peak"]
    bias: Annotated[Quantity, OfKind("voltage")] | None = None
    quadrature_sign: Literal[-1, 1] | None = Field(
        default=None, description="Sign of the quadrature, fixed by a deliberate detuning."
    )
    drive_mode: Literal["constant-drive", "constant-amplitude"] = "constant-drive"
    reference_signal: Annotated[Quantity, OfKind("amplitude")] | None = Field(
        default=None, description="Signal at the reference point where Q was measured independently."
    )
    reference_drive: Annotated[Quantity, OfKind("drive")] | None = None
    reference_quality_factor: Annotated[Quantity, OfKind("quality_factor")] | None = None
    reference_period: Annotated[Quantity, OfKind("period")] | None = None
    reference_rim_velocity: Annotated[Quantity, OfKind("velocity", convention_required=True)] | None = Field(
        default=None, description="Rim speed at the reference signal, e.g. `1.2(1) mm/s peak`."
    )


class Sweep(Record):
    """One recorded series and the state it was taken in."""

    name: Name
    kind: SweepKind
    files: tuple[FilePath, ...] = Field(min_length=1)
    layout: Name | None = Field(default=None, description="Layout of the sheet that these files follow.")
    dialect: Dialect | None = Field(default=None, description="Dialect of just this sweep.")
    channels: dict[ChannelName, Channel] = Field(
        default_factory=dict, description="Channels of just this sweep, over those of the layout."
    )
    cell: Reference | None = Field(default=None, description="Cell, when it is not the sheet's only one.")
    after_dose: Name | None = Field(default=None, description="Last dose admitted before this sweep.")
    empty_cell: bool = Field(default=False, description="True: no helium had been admitted.")
    doses: tuple[Name, ...] = Field(
        default=(), description="Doses admitted during a dose run or isotherm, in order."
    )
    thermometer: ChannelName | None = Field(default=None, description="Channel whose temperature counts.")
    calibrates: ChannelName | None = Field(
        default=None,
        description="Channel of the thermometer under calibration; `thermometer` then is the reference.",
    )
    liquid_depth: Annotated[Quantity, OfKind("length")] | None = Field(
        default=None,
        description="Depth of the thermometers below the liquid surface whose vapour pressure was read.",
    )
    liquid: Liquid | None = Field(
        default=None,
        description="Bulk liquid under pressure; left out: at its own vapour pressure, or no bulk liquid.",
    )
    gas: Literal["helium", "adsorptive"] = Field(
        default="helium",
        description="`adsorptive`: an isotherm with another gas (N2, Ar) that is no part of the helium bookkeeping.",
    )
    sample: Reference | None = Field(
        default=None, description="Gas of an isotherm, when not the helium of the run."
    )
    bath_temperature: Annotated[Quantity, OfKind("temperature")] | None = Field(
        default=None,
        description="Temperature of a run at one temperature, with scale, when no channel holds it.",
    )
    saturated_pressure: Annotated[Quantity, OfKind("pressure")] | None = Field(
        default=None,
        description="Saturated vapour pressure of the gas at the temperature of the film, when no channel holds it.",
    )
    direction: Literal["up", "down", "both", "hold", "none"] = "none"
    rate: Annotated[Quantity, OfKind("temperature_rate")] | None = None
    drive: Annotated[Quantity, OfKind("drive", convention_required=True)] | None = None
    settled: Text | None = Field(default=None, description="Waiting or annealing before the sweep.")
    detection: Detection | None = None
    left_out: tuple[LeftOut, ...] = ()
    corrections: tuple[Correction, ...] = ()
    disturbances: tuple[Disturbance, ...] = ()
    notes: Text = ""

    @model_validator(mode="after")
    def _consistent(self) -> Sweep:
        if self.layout is None and not self.channels:
            raise ValueError("name a layout of the sheet, or list the channels of this sweep")
        if self.empty_cell and self.after_dose is not None:
            raise ValueError(
                "empty_cell = true and after_dose contradict each other; keep the one that is true"
            )
        if self.empty_cell and self.liquid is not None:
            raise ValueError("empty_cell = true and liquid contradict each other; keep the one that is true")
        if self.calibrates is not None:
            if self.kind != "calibration":
                raise ValueError('calibrates belongs to a sweep of kind "calibration"')
            if self.thermometer is None or self.thermometer == self.calibrates:
                raise ValueError(
                    "a sweep that calibrates a thermometer names the reference in `thermometer`, another channel"
                )
        return self
