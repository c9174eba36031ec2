"""Constants of nature and conventions, in SI units.

Rule: one value a name, with its source beside it. The mass of a helium atom is that of the neutral atom; the mass
of the alpha particle, which many tables list first, would make the universal jump wrong by 5.5e-4.

References
----------
CODATA 2022 adjustment of the fundamental constants. The 2019 definition of the SI fixes k, N_A, h and e exactly.
"""

from __future__ import annotations

import math
from typing import Final

__all__ = [
    "ATOMIC_MASS_CONSTANT",
    "AVOGADRO",
    "BOLTZMANN",
    "ELEMENTARY_CHARGE",
    "GAS_CONSTANT",
    "HBAR",
    "MASS_HELIUM3",
    "MASS_HELIUM4",
    "MERCURY_MILLIMETRE",
    "MOLAR_MASS_HELIUM3",
    "MOLAR_MASS_HELIUM4",
    "PLANCK",
    "STANDARD_ATMOSPHERE",
    "STANDARD_GRAVITY",
    "T_LAMBDA",
]

BOLTZMANN: Final = 1.380649e-23  # J/K, exact (SI 2019)
AVOGADRO: Final = 6.02214076e23  # 1/mol, exact (SI 2019)
PLANCK: Final = 6.62607015e-34  # J s, exact (SI 2019)
HBAR: Final = PLANCK / (2 * math.pi)  # J s, exact
ELEMENTARY_CHARGE: Final = 1.602176634e-19  # C, exact (SI 2019)
GAS_CONSTANT: Final = 8.31446261815324  # J/(mol K), exact, N_A k
ATOMIC_MASS_CONSTANT: Final = 1.66053906892e-27  # kg, u = 5.2e-37 kg (CODATA 2022)

# Relative atomic masses: atomic mass evaluation 2020 (from memory), u = 1.6e-10 and 1e-9.
MASS_HELIUM4: Final = 4.00260325413 * ATOMIC_MASS_CONSTANT  # kg, neutral atom
MASS_HELIUM3: Final = 3.0160293220 * ATOMIC_MASS_CONSTANT  # kg, neutral atom
MOLAR_MASS_HELIUM4: Final = AVOGADRO * MASS_HELIUM4  # kg/mol
MOLAR_MASS_HELIUM3: Final = AVOGADRO * MASS_HELIUM3  # kg/mol

STANDARD_GRAVITY: Final = 9.80665  # m/s^2, exact (CGPM 1901)
STANDARD_ATMOSPHERE: Final = 101325.0  # Pa, exact (CGPM 1954)
# Pa: mercury of the conventional density at 0 degrees Celsius under standard gravity, the unit of the 1958 and 1962
# helium scales. It is neither the torr (101325/760) nor 133.322.
MERCURY_MILLIMETRE: Final = 13595.1 * STANDARD_GRAVITY * 1e-3
T_LAMBDA: Final = 2.1768  # K on ITS-90, at saturated vapour pressure (Preston-Thomas, Metrologia 27, 3, 1990)
