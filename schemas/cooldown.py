"""The cooldown sheet: what the person writes about a finished cooldown."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import AwareDatetime, Field, StringConstraints, model_validator

from schemas.base import Name, Record, Reference, Text
from schemas.cell import Cell, Cryostat
from schemas.finding import Waiver
from schemas.gas import DeadVolume, Dose, Doser, GasEnd, Gauge
from schemas.substrate import Sample, Substrate
from schemas.sweep import Channel, Detection, Dialect, FilePath, Layout, Sweep
from schemas.thermometer import Calibration, ScaleName, Thermometer

__all__ = ["EFFECTS", "CooldownSheet", "Effect", "EffectName", "Event", "Note", "Records"]

EffectName = Literal[
    "vapour in dead volume",
    "desorption in heat capacity",
    "thermal transpiration",
    "hydrostatic head",
    "self-heating",
    "sensor-film offset",
    "amplitude dependence",
    "finite ring time",
    "elasticity of contents and of cell",
    "slip",
    "crossing modes",
    "viscous drag of vapour",
    "drift of the resonance",
    "remounting shift",
    "isotopic content",
    "capillary condensation",
    "gravity rounding",
    "ageing of the thermometer",
    "contamination by frozen air",
]
"""The closed list of known effects; each has exactly one state, so that silence is impossible."""

EFFECTS: tuple[str, ...] = EffectName.__args__  # type: ignore[attr-defined]


class Effect(Record):
    """What was done about one known effect."""

    effect: EffectName
    state: Literal["applied", "bounded", "considered", "not-applicable", "not-possible-to-know"]
    bound: Text | None = Field(default=None, description="Size or bound, with unit; required for `bounded`.")
    reason: Annotated[Text, StringConstraints(min_length=3)]

    @model_validator(mode="after")
    def _bounded(self) -> Effect:
        if self.state == "bounded" and self.bound is None:
            raise ValueError('an effect that is "bounded" needs its bound')
        return self


class Note(Record):
    """A line of the notebook."""

    at: AwareDatetime | None = None
    role: Text | None = None
    text: Text


class Event(Record):
    """A leak, plug, transfer, power loss, ..."""

    at: AwareDatetime
    what: Literal["transfer", "leak", "plug", "power-loss", "fault", "magnet", "rotation", "turbo", "other"]
    text: Text
    sweeps: tuple[Name, ...] = Field(default=(), description="Sweeps that it affects.")


class Records(Record):
    """Records written in a sheet: `[[record.cell]]`, `[[record.calibration]]`, ..."""

    cryostat: tuple[Cryostat, ...] = ()
    cell: tuple[Cell, ...] = ()
    substrate: tuple[Substrate, ...] = ()
    sample: tuple[Sample, ...] = ()
    thermometer: tuple[Thermometer, ...] = ()
    calibration: tuple[Calibration, ...] = ()


class CooldownSheet(Record):
    """`cooldown.toml`."""

    format: Literal["stillroom-cooldown/1"]
    name: Name = Field(description="Name of the cooldown, e.g. `2026-03`.")
    cryostat: Reference
    begin: AwareDatetime | None = Field(default=None, description="With offset: 2026-03-02T09:10:00+02:00")
    end: AwareDatetime | None = None
    undated: Text | None = Field(
        default=None, description="Why begin and end are not known, when they are not."
    )
    time_zone: str = Field(description="Zone of the laboratory, e.g. `Europe/Helsinki`.")
    operators: tuple[str, ...] = Field(min_length=1, description="By role, e.g. `graduate student`.")
    purpose: Text
    outcome: Literal["complete", "aborted", "open"] = Field(description="How the run ended.")
    next_step: Text | None = Field(default=None, description="What was meant to be done next.")
    temperature_scale: ScaleName = Field(
        description="Scale of every temperature in this sheet that names no other."
    )
    cell: Reference | None = Field(default=None, description="The cell, when the run had one.")
    sample: Reference | None = Field(default=None, description="The helium of the run.")
    licence: str | None = Field(default=None, description="SPDX identifier under which the data may be used.")

    record: Records = Field(
        default_factory=lambda: Records(), description="Long-lived things described in this sheet."
    )

    layout: dict[Name, Layout] = Field(default_factory=dict)
    detection: Detection | None = None
    gauge: tuple[Gauge, ...] = Field(default=())
    doser: tuple[Doser, ...] = Field(default=())
    dead_volume: tuple[DeadVolume, ...] = Field(default=())
    dose: tuple[Dose, ...] = Field(default=())
    gas_end: GasEnd
    sweep: tuple[Sweep, ...] = Field(min_length=1)
    other_files: tuple[FilePath, ...] = Field(
        default=(),
        description="Files to keep beside the sweeps: scans of the notebook, scripts, calibration sheets.",
    )
    effect: tuple[Effect, ...] = Field(default=())
    waiver: tuple[Waiver, ...] = Field(default=())
    note: tuple[Note, ...] = Field(default=())
    event: tuple[Event, ...] = Field(default=())

    @model_validator(mode="after")
    def _consistent(self) -> CooldownSheet:
        if self.begin is None or self.end is None:
            if self.undated is None:
                missing = " and ".join(name for name in ("begin", "end") if getattr(self, name) is None)
                raise ValueError(
                    f"{missing} missing; give begin and end with their offset, or say in `undated` why they are not known"
                )
        elif self.end <= self.begin:
            raise ValueError("end must be later than begin")
        return self

    @property
    def records(self) -> tuple[Cryostat | Cell | Substrate | Sample | Thermometer | Calibration, ...]:
        """Every record written in this sheet."""
        each = self.record
        return (
            *each.cryostat,
            *each.cell,
            *each.substrate,
            *each.sample,
            *each.thermometer,
            *each.calibration,
        )

    def channels_of(self, sweep: Sweep) -> dict[str, Channel]:
        """Channels of one sweep: those of its layout, replaced or added to by its own."""
        shared = self.layout[sweep.layout].channels if sweep.layout in self.layout else {}
        return {**shared, **sweep.channels}

    def dialect_of(self, sweep: Sweep) -> Dialect:
        """Dialect of one sweep's files: its own, else that of its layout, else plain CSV."""
        if sweep.dialect is not None:
            return sweep.dialect
        return self.layout[sweep.layout].dialect if sweep.layout in self.layout else Dialect()

    def cell_of(self, sweep: Sweep) -> str | None:
        """Reference of the cell that one sweep was taken in."""
        return sweep.cell or self.cell

    def detection_of(self, sweep: Sweep) -> Detection | None:
        """Drive and detection of one sweep."""
        return sweep.detection or self.detection
