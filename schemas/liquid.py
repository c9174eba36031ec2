"""Bulk liquid under pressure: what no table gives away from saturated vapour pressure and a person states instead."""

from __future__ import annotations

from typing import Annotated

from pydantic import Field, StringConstraints

from schemas.base import Record, Text
from schemas.quantity import OfKind, Quantity

__all__ = ["Liquid"]


class Liquid(Record):
    """State of the bulk liquid that fills the cell during a sweep under pressure."""

    pressure: Annotated[Quantity, OfKind("pressure")] = Field(
        description="Absolute pressure of the liquid, with its uncertainty."
    )
    density: Annotated[Quantity, OfKind("density")] = Field(
        description="Density of the liquid at its lambda point at that pressure, with its uncertainty."
    )
    amount: Annotated[Quantity, OfKind("amount")] | None = Field(
        default=None, description="Helium in the cell at that pressure, in place of the cell's own."
    )
    source: Annotated[Text, StringConstraints(min_length=3)] = Field(
        description="From where the density is known."
    )
