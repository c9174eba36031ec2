"""Thermometers and their calibrations.

Rule: a temperature is a number, a unit, a scale name and a calibration. None of the four is guessed.
"""

from __future__ import annotations

from datetime import date
from typing import Annotated, Literal

from pydantic import Field, StringConstraints, model_validator

from schemas.base import NamedRecord, Record, Reference, Text
from schemas.quantity import OfKind, Quantity

__all__ = [
    "MADE_FROM_PATTERN",
    "Calibration",
    "CalibrationForm",
    "ChebyshevForm",
    "Contribution",
    "CurieWeissForm",
    "LogPolynomialForm",
    "MeltingCurveForm",
    "ScaleName",
    "SensingTube",
    "SplineForm",
    "Thermometer",
    "VapourPressureForm",
]

ScaleName = Annotated[
    str, Field(pattern=r"^(ITS-90|PLTS-2000|EPT-76|T58|T62|PTB-2006|local:[A-Za-z0-9_-]{1,40})$")
]
"""Name of a temperature scale; a laboratory's own scale is `local:NAME`."""

MADE_FROM_PATTERN = r"^[A-Za-z0-9][A-Za-z0-9_-]{0,63}/[A-Za-z0-9][A-Za-z0-9_-]{0,63}@[A-Za-z0-9][A-Za-z0-9_-]{0,63}\.[1-9][0-9]{0,5}$"

_Temperature = Annotated[Quantity, OfKind("temperature")]


_Length = Annotated[Quantity, OfKind("length")]


class SensingTube(Record):
    """Tube between a bulb or bath and the gauge that reads its vapour pressure; what corrections need of it."""

    inner_diameter: _Length
    warm_temperature: _Temperature = Field(description="Temperature of the warm end, where the gauge is.")
    height: _Length | None = Field(
        default=None,
        description="Height of the gauge above the liquid; negative if it is lower. Needed for the head of the gas.",
    )
    gas_temperature: _Temperature | None = Field(
        default=None,
        description="Temperature of the gas over that height, if it is mostly at one; else a straight profile is taken.",
    )


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
    tube: SensingTube | None = Field(
        default=None,
        description="Tube of a vapour pressure thermometer; with it its pressures are corrected.",
    )

    @model_validator(mode="after")
    def _tube_where_there_is_vapour(self) -> Thermometer:
        if self.tube is not None and not self.kind.startswith("vapour-pressure"):
            raise ValueError("only a vapour pressure thermometer has a tube")
        return self


class ChebyshevForm(Record):
    """T = sum a_i cos(i arccos k), k = ((Z - ZL) - (ZU - Z))/(ZU - ZL), Z = ln R or log10 R."""

    form: Literal["chebyshev"]
    logarithm: Literal["ln", "log10"]
    lower: float = Field(description="ZL")
    upper: float = Field(description="ZU")
    coefficients: tuple[float, ...] = Field(min_length=2, description="a_i in kelvin")


class LogPolynomialForm(Record):
    """ln(T/K) = sum b_i ((ln(R/unit) - centre)/half_width)^i."""

    form: Literal["log-polynomial"]
    centre: float = 0.0
    half_width: float = Field(default=1.0, gt=0)
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


class Contribution(Record):
    """How far one source of uncertainty moves each coefficient of a calibration, to first order and with its sign."""

    source: Annotated[str, StringConstraints(min_length=1, max_length=400)] = Field(
        description="Name of the source; equal names are one source, wherever they stand."
    )
    level: Literal["run", "cell", "laboratory"]
    description: Text
    address: str | None = Field(default=None, description="Where the source is described.")
    coefficients: tuple[float, ...] = Field(
        min_length=1, description="In the order and units of the coefficients."
    )


class Calibration(NamedRecord):
    """How readings of one thermometer become temperatures on one named scale.

    A calibration made in the archive names its reduction in `made_from`, and says in `contribution` how each source of
    uncertainty moves its coefficients: of the polynomials as listed, of `curie-weiss` offset, constant and theta, of a
    spline the temperatures of its points. Then these are carried into temperatures, and `uncertainty` is their summary.
    """

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
    readings: tuple[float, float] | None = Field(
        default=None, description="Smallest and largest reading of its points, in reading_unit."
    )
    interpolation_uncertainty: float | None = Field(
        default=None,
        ge=0,
        lt=0.5,
        description="What the form leaves open between the points, as a fraction of T; a source of its own.",
    )
    residual_rms: Annotated[Quantity, OfKind("temperature_difference")] | None = Field(
        default=None, description="Rms of the points about the curve."
    )
    made_from: Annotated[str, StringConstraints(pattern=MADE_FROM_PATTERN)] | None = Field(
        default=None,
        description="Address of the reduction that found it, e.g. `2024-11/c01@thermometer-calibration.1`.",
    )
    contribution: tuple[Contribution, ...] = ()

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
        if self.readings is not None and not self.readings[0] < self.readings[1]:
            raise ValueError("readings: the smaller comes first")
        self._check_contributions()
        return self

    def _check_contributions(self) -> None:
        if not self.contribution:
            return
        if self.coefficients is None or self.readings is None:
            raise ValueError(
                f"contribution: a calibration of form {self.relation.form} carries none; a fitted one also states `readings`"
                if self.coefficients is None
                else "contribution: a calibration that carries them also states `readings`"
            )
        expected = len(self.coefficients)
        for number, each in enumerate(self.contribution, 1):
            if len(each.coefficients) != expected:
                raise ValueError(
                    f"contribution[{number}]: found {len(each.coefficients)} coefficients, expected {expected} as in the relation"
                )
        names = [each.source for each in self.contribution]
        if len(set(names)) != len(names):
            raise ValueError("contribution: each source stands once")

    @property
    def coefficients(self) -> tuple[float, ...] | None:
        """Numbers that a fit found, in the order that `contribution` follows; None for a form without any."""
        relation = self.relation
        if isinstance(relation, ChebyshevForm | LogPolynomialForm):
            return relation.coefficients
        if isinstance(relation, CurieWeissForm):
            return (relation.offset, relation.constant, relation.theta)
        if isinstance(relation, SplineForm):
            return tuple(temperature for _, temperature in self.points)
        return None
