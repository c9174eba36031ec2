"""Every tabulated property of 4He on the saturation line at one temperature, as rows to print.

Rule: a property that is not available at that temperature has no value and says why; it is never zero or extrapolated.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Final, NamedTuple

from archive.physics import helium_gas, helium_liquid, helium_sound, helium_vapour, helium_viscosity
from archive.physics.ranges import Floats
from archive.physics.vapour_pressure import pressure_estimate, pressure_its90

__all__ = ["PropertyRow", "properties"]


class PropertyRow(NamedTuple):
    """One property: value in SI or None, its unit, range of temperatures in words, source, and a note."""

    name: str
    value: float | None
    unit: str
    range: str
    source: str
    note: str


_DONNELLY: Final = "R. J. Donnelly, C. F. Barenghi, J. Phys. Chem. Ref. Data 27, 1217 (1998)"
_ITS90: Final = "H. Preston-Thomas, Metrologia 27, 3 (1990)"
_PHASE_SHIFTS: Final = (
    "quantum phase shifts, potential of W. Cencek et al., J. Chem. Phys. 136, 224303 (2012)"
)


class _Entry(NamedTuple):
    name: str
    function: Callable[[float], Floats]
    unit: str
    range: str
    source: str
    note: str = ""


_ENTRIES: Final[tuple[_Entry, ...]] = (
    _Entry("vapour pressure", pressure_its90, "Pa", "1.25 to 5 K", _ITS90, "defines T90"),
    _Entry("vapour pressure (estimate)", pressure_estimate, "Pa", "0.5 to 1.25 K", _DONNELLY,
           "estimate, outside ITS-90; 0.1 per cent from 0.65 K"),
    _Entry("density, liquid", helium_liquid.density, "kg/m^3", "0.1 to 4.2221 K", _DONNELLY),
    _Entry("density, vapour", helium_vapour.saturated_vapour_density, "kg/m^3", "0.5 to 4.2221 K",
           "ITS-90 pressure with virial coefficients", "0.1 per cent to 2.75 K, 0.3 to 3.75 K, 0.5 above"),
    _Entry("superfluid fraction", helium_liquid.superfluid_fraction, "1", "0.1 to 4.2221 K", _DONNELLY, "uncertain by 0.001"),
    _Entry("density, normal component", helium_liquid.normal_density, "kg/m^3", "1.0 to 4.2221 K", _DONNELLY,
           "uncertain by 0.15 kg/m^3 below the lambda point"),
    _Entry("viscosity, liquid", helium_viscosity.viscosity, "Pa s", "0.8 to 4.2221 K", _DONNELLY,
           "1 per cent; depends on geometry below about 1 K"),
    _Entry("surface tension", helium_liquid.surface_tension, "N/m", "0.1 to 4.2221 K", _DONNELLY),
    _Entry("specific heat, liquid", helium_liquid.specific_heat, "J/(kg K)", "0.1 to 2.175 K, 2.18 to 4.2221 K", _DONNELLY,
           "along the saturation line; at constant pressure it is larger"),
    _Entry("first sound", helium_sound.first_sound, "m/s", "0.1 to 4.2221 K", _DONNELLY, "0.5 per cent"),
    _Entry("second sound", helium_sound.second_sound, "m/s", "0.6 to 2.1768 K", _DONNELLY, "0.5 per cent"),
    _Entry("second virial coefficient", helium_gas.second_virial, "m^3/mol", "0.5 to 300 K", _PHASE_SHIFTS,
           "1 per cent below 2 K"),
)  # fmt: skip


def properties(temperature: float) -> list[PropertyRow]:
    """Return the properties of liquid 4He and its vapour at saturation, in SI units.

    Parameters
    ----------
    temperature : float
        T90 in K, above 0.

    Returns
    -------
    list of PropertyRow
        Always the same rows in the same order. `value` is None where the temperature is outside the range of the property;
        then `note` begins with "not available".

    Raises
    ------
    ValueError
        When the temperature is not a number above 0.

    Examples
    --------
    >>> rows = {row.name: row for row in properties(1.5)}
    >>> round(rows["vapour pressure"].value, 2), rows["vapour pressure"].unit
    (471.54, 'Pa')
    >>> rows["vapour pressure (estimate)"].value is None
    True
    """
    if not temperature > 0:
        raise ValueError(f"temperature: found {temperature!r}, expected a number of kelvin above 0")
    return [_row(entry, float(temperature)) for entry in _ENTRIES]


def _row(entry: _Entry, temperature: float) -> PropertyRow:
    try:
        value = float(entry.function(temperature))
    except ValueError:
        note = f"not available at this temperature (range {entry.range})"
        return PropertyRow(entry.name, None, entry.unit, entry.range, entry.source, note)
    return PropertyRow(entry.name, value, entry.unit, entry.range, entry.source, entry.note)
