"""Which unit an axis is written in, and which offset is taken off where a quantity hardly changes."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from schemas.kinds import KINDS
from schemas.quantity import Quantity, canonical, unit_factor
from schemas.uncertain_text import in_preferred_unit
from schemas.units import parse_unit

__all__ = ["AxisUnit", "axis_name", "axis_unit", "in_unit", "offset_unit", "symbol", "unit_text"]

Column = NDArray[np.float64]

_SYMBOLS = {
    "temperature": "T", "period": "P", "dissipation": "1/Q", "amplitude": "A", "drive": "drive", "frequency": "f", "time": "t", "pressure": "p",
    "amount": "n", "specific_amount": "n per mass", "relative_pressure": "p/p\u2080", "pressure_ratio": "p/p\u2080", "coverage": "n/A",
    "areal_mass_density": "\u03c3\u209b", "resistance": "R", "voltage": "U", "current": "I", "heat_capacity": "C", "quality_factor": "Q",
    "molar_heat_capacity": "C", "temperature_difference": "\u0394T", "density": "\u03c1", "angular_momentum": "L", "length": "d", "speed": "c", "mutual_inductance": "M", "amount_sensitivity": "dP/dn",
}  # fmt: skip
# Small differences of a quantity are read in these, smallest first.
_FINE_UNITS: dict[str, tuple[str, ...]] = {"period": ("ps", "ns"), "frequency": ("uHz", "mHz")}


@dataclass(frozen=True)
class AxisUnit:
    """How values stand on an axis: less `offset`, times `factor`.

    Attributes
    ----------
    factor : float
        What a value in its own unit, less the offset, is multiplied with.
    offset : float
        In the value's own unit.
    unit : str
        Unit on the axis, as a page shows it; "" for a pure number.
    name : str
        Quantity over unit.
    """

    factor: float
    offset: float
    unit: str
    name: str


def symbol(kind: str) -> str:
    """Return the symbol of a quantity kind on an axis."""
    return _SYMBOLS.get(kind, kind.replace("_", " "))


def unit_text(unit: str) -> str:
    """Return a unit as an axis shows it; "" for a pure number."""
    return "" if unit == "1" else parse_unit(unit).typographic


def in_unit(values: Column, unit: str, kind: str) -> tuple[Column, str]:
    """Return values in the unit that reads best for their largest one, and that unit."""
    finite = values[np.isfinite(values)]
    if finite.size == 0 or kind not in KINDS:
        return values, unit
    si = values * unit_factor(unit, kind)
    biggest = float(np.max(np.abs(si[np.isfinite(si)])))
    shown = in_preferred_unit(
        Quantity(value=biggest, unit=canonical(kind) if kind != "drive" else _si_of(unit, kind), kind=kind)
    ).unit
    return np.asarray(si / unit_factor(shown, kind)), shown


def _si_of(unit: str, kind: str) -> str:
    return Quantity(value=1.0, unit=unit, kind=kind).si_unit


def offset_unit(low: float, high: float, kind: str, unit: str) -> AxisUnit:
    """Return how a quantity of known ends stands on an axis: less a round offset, in a unit that suits what is left, where it hardly changes.

    Parameters
    ----------
    low, high : float
        Smallest and largest value.
    kind, unit : str
        Of those values.
    """
    span = high - low
    if kind not in KINDS or not span > 0 or span > 2e-3 * max(abs(low), abs(high)):
        return AxisUnit(1.0, 0.0, unit_text(unit), axis_name(kind, unit))
    places = max(0, -math.floor(math.log10(span)) - 1)
    offset = math.floor(low * 10**places) / 10**places
    most = (high - offset) * unit_factor(unit, kind)
    able = [each for each in _FINE_UNITS.get(kind, ()) if most >= unit_factor(each, kind)]
    shown = able[-1] if able else in_unit(np.array([high - offset]), unit, kind)[1]
    factor = unit_factor(unit, kind) / unit_factor(shown, kind)
    between = f"({symbol(kind)} \u2212 {offset:.{places}f} {unit_text(unit)})".replace(" )", ")")
    return AxisUnit(factor, offset, unit_text(shown), f"{between} / {unit_text(shown)}".removesuffix(" / "))


def axis_unit(low: float, high: float, kind: str, unit: str) -> AxisUnit:
    """Return how a quantity of known ends stands on an axis, in the unit that reads best.

    Parameters
    ----------
    low, high : float
        Smallest and largest value.
    kind, unit : str
        Of those values; a kind that is not known is shown as it is.

    Examples
    --------
    >>> axis_unit(0.1, 0.4, "temperature", "K").name, axis_unit(0.0, 3e-9, "dissipation", "1").name
    ('T / mK', '1/Q / 10⁻⁹')
    """
    biggest = max(abs(low), abs(high))
    shown = in_unit(np.array([biggest]), unit, kind)[1]
    if shown == "1" and (0 < biggest < 0.01 or biggest >= 1e5):
        power = math.floor(math.log10(biggest))
        tenth = "10" + str(power).translate(str.maketrans("0123456789-", "⁰¹²³⁴⁵⁶⁷⁸⁹⁻"))
        factor = (unit_factor(unit, kind) if kind in KINDS else 1.0) / 10.0**power
        return AxisUnit(factor, 0.0, tenth, f"{symbol(kind)} / {tenth}")
    factor = unit_factor(unit, kind) / unit_factor(shown, kind) if kind in KINDS else 1.0
    left = offset_unit(low * factor, high * factor, kind, shown)
    return AxisUnit(factor * left.factor, left.offset / factor, left.unit, left.name)


def axis_name(kind: str, unit: str) -> str:
    """Return quantity over unit."""
    shown = unit_text(unit)
    return f"{symbol(kind)} / {shown}" if shown else symbol(kind)
