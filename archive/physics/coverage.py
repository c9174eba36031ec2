"""Coverage in its several languages: mol/m^2, atoms, areal mass, thickness, layers.

Rules: mol and m^2 are stored, the rest is derived; "one layer" has no fixed meaning, so the convention is always named.

References
----------
Units of the SI; the density of the bulk liquid from R. J. Donnelly, C. F. Barenghi, J. Phys. Chem. Ref. Data 27, 1217 (1998). Conventions of a layer:
common practice, no source.
"""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from archive.physics.arrays import FloatArray
from archive.physics.constants import AVOGADRO, MASS_HELIUM4, MOLAR_MASS_HELIUM4

__all__ = [
    "LAYER_CONVENTIONS",
    "areal_mass",
    "areal_number_density",
    "film_thickness_from_coverage",
    "layer_coverage",
    "layers",
]

LIQUID_DENSITY: Final = 145.14
"""Bulk 4He at saturated vapour pressure, T -> 0, kg/m^3.

R. J. Donnelly, C. F. Barenghi, "The observed properties of liquid helium at the saturated vapor pressure", Journal of Physical and
Chemical Reference Data 27, 1217 (1998).
"""

LIQUID_NUMBER_DENSITY: Final = LIQUID_DENSITY / MASS_HELIUM4

LAYER_CONVENTIONS: Final = {
    "bulk-density": "two-thirds power of the number density of the bulk liquid at T -> 0 and saturated vapour pressure",
    "3.6-angstrom": "a slab of the bulk liquid 3.6 angstrom thick",
}
"""The two conventions in use; they differ by 0.6 per cent."""


def areal_number_density(coverage: npt.ArrayLike) -> FloatArray:
    """Return atoms per m^2 from coverage in mol/m^2."""
    return np.asarray(np.asarray(coverage, dtype=np.float64) * AVOGADRO)


def areal_mass(coverage: npt.ArrayLike) -> FloatArray:
    """Return kg/m^2 of 4He from coverage in mol/m^2."""
    return np.asarray(np.asarray(coverage, dtype=np.float64) * MOLAR_MASS_HELIUM4)


def layer_coverage(convention: str) -> float:
    """Return the coverage of one layer of 4He, mol/m^2.

    Parameters
    ----------
    convention : str
        A name of `LAYER_CONVENTIONS`.

    Raises
    ------
    ValueError
        Another name.

    Examples
    --------
    >>> round(layer_coverage("bulk-density") * 1e6, 4)
    12.9732
    """
    if convention == "bulk-density":
        return float(LIQUID_NUMBER_DENSITY ** (2 / 3)) / AVOGADRO
    if convention == "3.6-angstrom":
        return float(LIQUID_NUMBER_DENSITY * 3.6e-10) / AVOGADRO
    raise ValueError(f"convention: found {convention!r}, expected one of {', '.join(LAYER_CONVENTIONS)}")


def layers(coverage: npt.ArrayLike, *, convention: str) -> FloatArray:
    """Return coverage in layers of the bulk liquid, by a named convention, from mol/m^2."""
    return np.asarray(np.asarray(coverage, dtype=np.float64) / layer_coverage(convention))


def film_thickness_from_coverage(
    coverage: npt.ArrayLike, *, inner_coverage: float = 0.0, inner_thickness: float = 0.0
) -> FloatArray:
    """Return the film thickness, m, with the outer part at the density of the bulk liquid.

    Parameters
    ----------
    coverage : array_like
        mol/m^2.
    inner_coverage : float
        Of the inner, denser layers, mol/m^2.
    inner_thickness : float
        Of those layers, m.

    Returns
    -------
    ndarray
        ``d_inner + (n - n_inner)/rho``; not a number below the inner coverage.
    """
    n = np.asarray(coverage, dtype=np.float64)
    outer = np.where(n >= inner_coverage, n - inner_coverage, np.nan)
    return np.asarray(inner_thickness + outer * AVOGADRO / LIQUID_NUMBER_DENSITY)
