"""Quantities as fields of the schemas: one annotated name per kind, and what people need beside it.

Rules
-----
* ``Coverage`` and the like are pydantic fields; each reads a text, a table or (for pure numbers) a number.
* A plain `Pressure` enters gas laws: a gauge reading is refused there. `PressureAsRead` takes both and wants the word;
  `Amplitude` and `Drive` want rms, peak or peak-to-peak.
* Importing this module loads neither pint nor numpy.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Annotated, Any

from pydantic_core import core_schema

from schemas.kind_units import canonical, convert_array, unit_factor
from schemas.kinds import kind_of
from schemas.quantity_schema import quantity_schema
from schemas.quantity_value import Quantity
from schemas.units import ucum

if TYPE_CHECKING:
    from pydantic import GetCoreSchemaHandler, GetJsonSchemaHandler

__all__ = [
    "Amount",
    "AmountSensitivity",
    "Amplitude",
    "Angle",
    "AngularFrequency",
    "AngularMomentum",
    "Area",
    "ArealMassDensity",
    "ArealMassSensitivity",
    "AtomsArea",
    "Capacitance",
    "Charge",
    "Count",
    "Coverage",
    "Current",
    "Density",
    "Diffusivity",
    "Dissipation",
    "Drive",
    "Fraction",
    "Frequency",
    "GaugePressure",
    "HeatCapacity",
    "Inductance",
    "Length",
    "MagneticFluxDensity",
    "Mass",
    "MassSensitivity",
    "MolarHeatCapacity",
    "MolarMass",
    "MomentOfInertia",
    "MutualInductance",
    "Number",
    "OfKind",
    "Period",
    "Phase",
    "Power",
    "Pressure",
    "PressureAsRead",
    "PressureRatio",
    "QualityFactor",
    "Quantity",
    "RelativePressure",
    "Resistance",
    "SpecificAmount",
    "SpecificArea",
    "SpecificHeat",
    "SurfaceTension",
    "Temperature",
    "TemperatureDifference",
    "TemperatureRate",
    "Time",
    "Torque",
    "TorsionConstant",
    "Velocity",
    "Viscosity",
    "Voltage",
    "Volume",
    "canonical",
    "convert_array",
    "coverage_from_layers",
    "kind_of",
    "ucum",
    "unit_factor",
]


@dataclass(frozen=True, slots=True)
class OfKind:
    """Marks a pydantic field as a quantity of one kind: ``Annotated[Quantity, OfKind("coverage")]``.

    Parameters
    ----------
    kind : str
        Name of the kind.
    conventions : tuple of str or None
        Words accepted after the unit; None for all of the kind, but gauge only where a word is required.
    convention_required : bool
        Whether such a word must be written.
    """

    kind: str
    conventions: tuple[str, ...] | None = None
    convention_required: bool = False

    def __call__(self, data: object) -> Quantity:
        """Return the quantity in `data`, or raise ValueError with a sentence."""
        quantity = Quantity.read(data, self.kind)
        words = self._words()
        if quantity.convention is None:
            if self.convention_required:
                raise ValueError(
                    f"found {quantity.text!r}; expected the word {' or '.join(words)} after the unit"
                )
        elif quantity.convention not in words:
            raise ValueError(
                f"found {quantity.text!r}; expected {kind_of(self.kind).words} that is {' or '.join(words)},"
                f" not {quantity.convention}"
            )
        return quantity

    def __get_pydantic_core_schema__(
        self, source: Any, handler: GetCoreSchemaHandler
    ) -> core_schema.CoreSchema:
        """Let pydantic read the field."""
        return core_schema.no_info_plain_validator_function(
            self, serialization=core_schema.plain_serializer_function_ser_schema(Quantity.record)
        )

    def __get_pydantic_json_schema__(
        self, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler
    ) -> dict[str, Any]:
        """Describe the text form with examples, and the table forms."""
        words = self._words()
        return quantity_schema(kind_of(self.kind), convention=words[0] if self.convention_required else None)

    def _words(self) -> tuple[str, ...]:
        if self.conventions is not None:
            return self.conventions
        kind = kind_of(self.kind)
        return tuple(
            word for word in kind.conventions if self.convention_required or word not in kind.only_if_asked
        )


def coverage_from_layers(layers: float | Quantity, *, layer_coverage: Quantity) -> Quantity:
    """Return the coverage of a number of layers, given what one layer holds on this substrate.

    Parameters
    ----------
    layers : float or Quantity
        Number of layers; a quantity of kind ``number`` brings its uncertainty.
    layer_coverage : Quantity
        Coverage of one layer by the substrate's own definition, kind ``coverage``.

    Returns
    -------
    Quantity
        A coverage in the unit of `layer_coverage`; its uncertainty combines both (GUM 5.1.2, uncorrelated), and is
        None when neither is stated.

    Raises
    ------
    ValueError
        If an argument is of another kind.
    """
    Quantity.read(layer_coverage, "coverage")
    number = Quantity.read(layers, "number")
    value = number.value * layer_coverage.value
    stated = [one for one in (number.uncertainty, layer_coverage.uncertainty) if one is not None]
    uncertainty = None
    if stated:
        uncertainty = math.hypot(
            number.value * (layer_coverage.uncertainty or 0.0),
            layer_coverage.value * (number.uncertainty or 0.0),
        )
    return Quantity(
        value=value,
        uncertainty=uncertainty,
        unit=layer_coverage.unit,
        kind="coverage",
        known="computed",
        source=f"{number.text} layers of {layer_coverage.text}",
    )


Temperature = Annotated[Quantity, OfKind("temperature")]
TemperatureDifference = Annotated[Quantity, OfKind("temperature_difference")]
TemperatureRate = Annotated[Quantity, OfKind("temperature_rate")]
Time = Annotated[Quantity, OfKind("time")]
Period = Annotated[Quantity, OfKind("period")]
Frequency = Annotated[Quantity, OfKind("frequency")]
AngularFrequency = Annotated[Quantity, OfKind("angular_frequency")]
Dissipation = Annotated[Quantity, OfKind("dissipation")]
QualityFactor = Annotated[Quantity, OfKind("quality_factor")]
Resistance = Annotated[Quantity, OfKind("resistance")]
MutualInductance = Annotated[Quantity, OfKind("mutual_inductance")]
Inductance = Annotated[Quantity, OfKind("inductance")]
Capacitance = Annotated[Quantity, OfKind("capacitance")]
# A plain pressure enters gas laws, so gauge readings are refused there; PressureAsRead takes both and wants the word.
Pressure = Annotated[Quantity, OfKind("pressure")]
GaugePressure = Annotated[Quantity, OfKind("pressure", conventions=("gauge",), convention_required=True)]
PressureAsRead = Annotated[Quantity, OfKind("pressure", convention_required=True)]
PressureRatio = Annotated[Quantity, OfKind("pressure_ratio")]
RelativePressure = Annotated[Quantity, OfKind("relative_pressure")]
Volume = Annotated[Quantity, OfKind("volume")]
Area = Annotated[Quantity, OfKind("area")]
SpecificArea = Annotated[Quantity, OfKind("specific_area")]
Length = Annotated[Quantity, OfKind("length")]
Mass = Annotated[Quantity, OfKind("mass")]
Amount = Annotated[Quantity, OfKind("amount")]
SpecificAmount = Annotated[Quantity, OfKind("specific_amount")]
Coverage = Annotated[Quantity, OfKind("coverage")]
ArealMassDensity = Annotated[Quantity, OfKind("areal_mass_density")]
Density = Annotated[Quantity, OfKind("density")]
MomentOfInertia = Annotated[Quantity, OfKind("moment_of_inertia")]
TorsionConstant = Annotated[Quantity, OfKind("torsion_constant")]
MassSensitivity = Annotated[Quantity, OfKind("mass_sensitivity")]
ArealMassSensitivity = Annotated[Quantity, OfKind("areal_mass_sensitivity")]
AmountSensitivity = Annotated[Quantity, OfKind("amount_sensitivity")]
AngularMomentum = Annotated[Quantity, OfKind("angular_momentum")]
HeatCapacity = Annotated[Quantity, OfKind("heat_capacity")]
MolarHeatCapacity = Annotated[Quantity, OfKind("molar_heat_capacity")]
SpecificHeat = Annotated[Quantity, OfKind("specific_heat")]
Viscosity = Annotated[Quantity, OfKind("viscosity")]
Diffusivity = Annotated[Quantity, OfKind("diffusivity")]
Velocity = Annotated[Quantity, OfKind("velocity")]
Voltage = Annotated[Quantity, OfKind("voltage")]
Current = Annotated[Quantity, OfKind("current")]
Amplitude = Annotated[Quantity, OfKind("amplitude", convention_required=True)]
Drive = Annotated[Quantity, OfKind("drive", convention_required=True)]
Power = Annotated[Quantity, OfKind("power")]
Charge = Annotated[Quantity, OfKind("charge")]
Angle = Annotated[Quantity, OfKind("angle")]
Phase = Annotated[Quantity, OfKind("phase")]
MagneticFluxDensity = Annotated[Quantity, OfKind("magnetic_flux_density")]
Torque = Annotated[Quantity, OfKind("torque")]
SurfaceTension = Annotated[Quantity, OfKind("surface_tension")]
MolarMass = Annotated[Quantity, OfKind("molar_mass")]
AtomsArea = Annotated[Quantity, OfKind("atoms_area")]
Fraction = Annotated[Quantity, OfKind("fraction")]
Number = Annotated[Quantity, OfKind("number")]
Count = Annotated[Quantity, OfKind("count")]
