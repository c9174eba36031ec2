"""Cells and cryostats: where the helium was.

A cell is one of several kinds, each with the fields its reductions need. Pressure rating and the volume that can be
closed belong to every cell, since a caution is computed from them.
"""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import Field, model_validator

from schemas.base import NamedRecord, Reference, Text
from schemas.quantity import OfKind, Quantity

__all__ = [
    "AdsorptionCell",
    "Calorimeter",
    "Cell",
    "Cryostat",
    "PersistentCurrentRing",
    "ResonatorCell",
    "ThirdSoundRing",
    "TorsionalOscillator",
]

_Volume = Annotated[Quantity, OfKind("volume")]
_Length = Annotated[Quantity, OfKind("length")]
_Mass = Annotated[Quantity, OfKind("mass")]
_Pressure = Annotated[Quantity, OfKind("pressure")]

RodMaterial = Literal["BeCu", "Al5056", "brass", "silver", "titanium", "other"]


class Cryostat(NamedRecord):
    """The refrigerator that a cooldown ran in."""

    kind: Literal["dilution", "helium-3", "helium-4", "nuclear-demagnetisation", "cryocooler", "other"]
    frequency_reference: Text | None = Field(
        default=None, description="What frequencies refer to, with its uncertainty."
    )
    site_contact: Text | None = Field(
        default=None, description="Role to ask before warming or opening anything."
    )


class _CellBase(NamedRecord):
    material: Text | None = Field(default=None, description="Material of the body.")
    seal: Text | None = None
    shape: Text | None = Field(default=None, description="Shape in words, e.g. `cylinder`.")
    substrate: Reference | None = Field(default=None, description="The adsorbing surface inside, if any.")
    free_volume: _Volume | None = Field(default=None, description="Open volume inside, and how it is known.")
    closable_volume: _Volume | None = Field(
        default=None, description="Smallest volume that a valve or a plug can isolate (not the whole system)."
    )
    closing_valve: Text | None = Field(default=None, description="Name of the valve that closes it.")
    rated_pressure: Annotated[Quantity, OfKind("pressure", convention_required=True)] | None = Field(
        default=None, description="Recorded pressure rating with its convention, e.g. `0.35 MPa gauge`."
    )
    rating_document: Text | None = Field(
        default=None, description="Where the rating stands, with date of the last test."
    )
    relief_device: Text | None = Field(
        default=None, description="Recorded relief device: tag, set pressure, test date."
    )


class TorsionalOscillator(_CellBase):
    """Bob on a torsion rod; the superfluid that decouples lowers the period."""

    kind: Literal["torsional-oscillator"]
    rod_material: RodMaterial
    rod: Text | None = Field(default=None, description="Length, diameters and heat treatment of the rod.")
    inertia: Annotated[Quantity, OfKind("moment_of_inertia")] | None = None
    torsion_constant: Annotated[Quantity, OfKind("torsion_constant")] | None = None
    empty_period: Annotated[Quantity, OfKind("period")] | None = None
    empty_quality_factor: Annotated[Quantity, OfKind("quality_factor")] | None = None
    mass_sensitivity: Annotated[Quantity, OfKind("amount_sensitivity")] | None = Field(
        default=None, description="Period rise per amount of fully coupled helium, e.g. `168(3) ns/mmol`."
    )
    rim_radius: _Length
    gyration_radius_squared: Annotated[Quantity, OfKind("area")] | None = Field(
        default=None, description="Mean square distance of the substrate area from the axis."
    )
    gap: _Length | None = Field(
        default=None, description="Distance between neighbouring surfaces (disc spacing or pore width)."
    )
    mode: Text | None = Field(default=None, description="Which mode, and the nearest other one seen.")

    @model_validator(mode="after")
    def _enough(self) -> TorsionalOscillator:
        if self.torsion_constant is None and (self.empty_period is None or self.mass_sensitivity is None):
            raise ValueError(
                "a torsional oscillator needs torsion_constant, or both empty_period and mass_sensitivity; "
                "add what the cell's own calibration gives"
            )
        return self


class Calorimeter(_CellBase):
    """Cell for heat capacity."""

    kind: Literal["calorimeter"]
    helium_amount: Annotated[Quantity, OfKind("amount")] | None = None
    height: _Length = Field(description="Height of the liquid: gravity spreads the lambda point over it.")
    addenda: Text | None = Field(
        default=None, description="Where the heat capacity of the empty cell comes from."
    )


class PersistentCurrentRing(_CellBase):
    """Annulus or packed ring whose trapped circulation is read as angular momentum."""

    kind: Literal["persistent-current-ring"]
    mean_radius: _Length
    width: _Length | None = None


class ThirdSoundRing(_CellBase):
    """Closed or open path on which third sound runs."""

    kind: Literal["third-sound-ring"]
    path_length: _Length
    closed: bool = Field(description="True for a ring, false for a path between generator and detector.")


class AdsorptionCell(_CellBase):
    """Cell of an isotherm."""

    kind: Literal["adsorption-cell"]
    sample_mass: _Mass | None = Field(default=None, description="Mass of adsorbent, for amounts per gram.")


class ResonatorCell(_CellBase):
    """Volume with acoustic or mechanical resonances read by a lock-in detector."""

    kind: Literal["resonator"]
    frequency_low: Annotated[Quantity, OfKind("frequency")] | None = Field(
        default=None, description="Lowest frequency at which a resonance is looked for."
    )
    frequency_high: Annotated[Quantity, OfKind("frequency")] | None = None


Cell = Annotated[
    TorsionalOscillator
    | Calorimeter
    | PersistentCurrentRing
    | ThirdSoundRing
    | AdsorptionCell
    | ResonatorCell,
    Field(discriminator="kind"),
]
"""Any cell, told apart by its `kind`."""
