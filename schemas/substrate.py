"""Substrates and samples: what the film lies on, and what it is made of."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import Field, model_validator

from schemas.base import NamedRecord, Text
from schemas.quantity import OfKind, Quantity

__all__ = ["Isotope", "Sample", "Substrate"]

Isotope = Literal["4He", "3He", "3He-4He", "N2", "Ar", "Kr", "Ne", "H2", "other"]


class Substrate(NamedRecord):
    """An adsorbing surface with its area, how that is known, and its own definition of a layer."""

    material: Text = Field(description="e.g. `polyimide film`, `porous glass`.")
    form: Text | None = Field(default=None, description="Form and lot, e.g. `stack of 240 discs`.")
    mass: Annotated[Quantity, OfKind("mass")] | None = None
    area: Annotated[Quantity, OfKind("area")] | None = Field(
        default=None, description="Adsorbing area; common factor of every coverage, so give its uncertainty."
    )
    specific_area: Annotated[Quantity, OfKind("specific_area")] | None = None
    area_method: Text | None = Field(
        default=None,
        description="How the area is known: gas, temperature, range, cross-section, or geometry.",
    )
    volume: Annotated[Quantity, OfKind("volume")] | None = Field(
        default=None, description="Outer volume of a porous substrate, pores included."
    )
    pore_diameter: Annotated[Quantity, OfKind("length")] | None = None
    roughness: Annotated[Quantity, OfKind("length")] | None = None
    porosity: Annotated[Quantity, OfKind("fraction")] | None = None
    outgassing: Text | None = None
    preplating: Text | None = Field(default=None, description="Species, amount and annealing, or `none`.")
    layer: Annotated[Quantity, OfKind("coverage")] | None = Field(
        default=None,
        description="Coverage that one layer means on this substrate; needed before anything is told in layers.",
    )
    layer_definition: Text | None = Field(
        default=None, description="What defines that layer, in words, with its source."
    )
    van_der_waals: float | None = Field(
        default=None,
        gt=0,
        description="Frenkel-Halsey-Hill coefficient Gamma in K layer^3 (layers of 0.36 nm).",
    )

    @model_validator(mode="after")
    def _layer_is_defined(self) -> Substrate:
        if (self.layer is None) != (self.layer_definition is None):
            raise ValueError("layer and layer_definition belong together: give both, or neither")
        return self


class Sample(NamedRecord):
    """The gas that was admitted."""

    isotope: Isotope
    helium3_fraction: Annotated[Quantity, OfKind("fraction")] | None = Field(
        default=None, description="Amount fraction of 3He; leave it out when it is not known."
    )
    area_per_molecule: Annotated[Quantity, OfKind("atoms_area")] | None = Field(
        default=None,
        description="Area of one molecule in a full first layer, for areas by adsorption; a convention for N2 and Ar, not standardised for helium.",
    )
    gas_source: Text = Field(description="Where the gas came from, its stated purity, and traps it passed.")
