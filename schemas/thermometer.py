"""Thermometers and their calibrations.

Rule: a temperature is a number, a unit, a scale name and a calibration. None of the four is guessed.
"""

from __future__ import annotations

from datetime import date
from typing import Annotated, Literal

from pydantic import Field, model_validator

from schemas.base import NamedRecord, Record, Reference, Text
from schemas.quantity import OfKind, Quantity

__all__ = [
    "Calibration",
    "CalibrationForm",
    "ChebyshevForm",
    "CurieWeissForm",
    "LogPolynomialForm",
    "MeltingCurveForm",
    "ScaleName",
    "SplineForm",
    "Thermometer",
    "VapourPressureForm",
]

ScaleName = Annotated[
    str, Field(pattern=r"^(ITS-90|PLTS-2000|EPT-76|T58|T62|PTB-2006|local:[A-Za-z0-9_-]{1,40})$")
]
"""Name of a temperature scale; a laboratory's own scale is `local:NAME`."""

_Temperature = Annotated[Quantity, OfKind("temperature")]


class Thermometer(NamedRecord):
    """A sensor."""

    kind: Literal[
        "germanium", "ruthenium-oxide", "carbon", "paramagnetic", "capacitance",
        "vapour-pressure-3He", "vapour-pressure-4He", "melting-curve", "noise", "other",
    ]  # fmt: skip
    place: Text = Field(description="Where it is mounted.")
    serial: Text | None = None
    wires: Literal[2, 4] | None = Field(default=None, description="Two-wire or four-wire reading.")
    excitation: Text | None = Field(default=None, description="Excitation (rms), frequency, power.")


class ChebyshevForm(Record):
    """T = sum a_i cos(i arccos k), k = ((Z - ZL) - (ZU - Z))/(ZU - ZL), Z = ln R or log10 R."""

    form: Literal["chebyshev"]
    logarithm: Literal["ln", "log10"]
    lower: float = Field(description="ZL")
    upper: float = Field(description="ZU")
    coefficients: tuple[float, ...] = Field(min_length=2, description="a_i in kelvin")


class LogPolynomialForm(Record):
    """ln(T/K) = sum b_i (ln(R/unit) - centre)^i."""

    form: Literal["log-polynomial"]
    centre: float = 0.0
    coefficients: tuple[float, ...] = Field(min_length=2)


class SplineForm(Record):
    """Cubic spline of ln T against ln R through the points; passes through their noise."""

    form: Literal["spline"]


class PointsForm(Record):
    """Polynomial ln T(ln R) fitted to the points; the order is chosen by F-test and AICc."""

    form: Literal["fitted-points"]
    largest_order: int = Field(default=9, ge=1, le=14)


class CurieWeissForm(Record):
    """M = M0 + C/(T - theta)."""

    form: Literal["curie-weiss"]
    offset: float = Field(description="M0 in the reading's unit")
    constant: float = Field(description="C in the reading's unit times kelvin")
    theta: float = Field(description="theta in kelvin, with the sign of T - theta")


class VapourPressureForm(Record):
    """The ITS-90 vapour pressure relation of the isotope; the reading is a pressure."""

    form: Literal["vapour-pressure"]
    isotope: Literal["3He", "4He"]


class MeltingCurveForm(Record):
    """The PLTS-2000 melting pressure of 3He; two temperatures fit most pressures, so the branch is recorded."""

    form: Literal["melting-curve"]
    branch: Literal["low", "high"]


CalibrationForm = Annotated[
    ChebyshevForm
    | LogPolynomialForm
    | SplineForm
    | PointsForm
    | CurieWeissForm
    | VapourPressureForm
    | MeltingCurveForm,
    Field(discriminator="form"),
]


class Calibration(NamedRecord):
    """How readings of one thermometer become temperatures on one named scale."""

    thermometer: Reference
    scale: ScaleName
    date: date
    against: Text = Field(description="What it was calibrated against, and where that stands.")
    reading_unit: str = Field(description="Unit of the reading, e.g. `ohm`, `Pa`, `uH`.")
    relation: CalibrationForm
    points: tuple[tuple[float, float], ...] = Field(
        default=(), description="Pairs [reading in reading_unit, temperature in K on the scale]."
    )
    temperature_low: _Temperature = Field(
        description="Lower end of the calibrated range; nothing is extrapolated."
    )
    temperature_high: _Temperature
    uncertainty: Annotated[Quantity, OfKind("temperature_difference")] | None = Field(
        default=None, description="Standard uncertainty of the calibration, common to all its readings."
    )
    relative_uncertainty: float | None = Field(
        default=None, gt=0, lt=0.5, description="The same as a fraction of T; give this or `uncertainty`."
    )

    @model_validator(mode="after")
    def _complete(self) -> Calibration:
        least = {"spline": 4, "fitted-points": 6}.get(self.relation.form, 0)
        if len(self.points) < least:
            raise ValueError(f"a calibration of form {self.relation.form} needs at least {least} points")
        if any(temperature <= 0 for _, temperature in self.points):
            raise ValueError("points: every temperature must be above 0 K")
        if (self.uncertainty is None) == (self.relative_uncertainty is None):
            raise ValueError(
                "give the standard uncertainty of the calibration once: `uncertainty` or `relative_uncertainty`"
            )
        if not self.temperature_low.si < self.temperature_high.si:
            raise ValueError("temperature_low must be below temperature_high")
        return self
