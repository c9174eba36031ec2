"""Second virial coefficient and saturated vapour density of 4He, tabulated.

References
----------
Second virial coefficient, 2 to 300 K: quantum phase shifts computed from the pair potential of W. Cencek,
M. Przybytek, J. Komasa, J. B. Mehl, B. Jeziorski, K. Szalewicz, J. Chem. Phys. 136, 224303 (2012). Below 2 K: the same
computation from the potential of R. A. Aziz, F. R. W. McCourt, C. C. K. Wong, Mol. Phys. 61, 1487 (1987), good to about
1 per cent.
Saturated vapour density: ITS-90 pressure, that B, and the third virial coefficient of the equation of state of
D. O. Ortiz Vega et al. (NISTIR 8474, 2023), zero below 2.1768 K; 0.1 per cent to 2.75 K, 0.3 to 3.75 K, 0.5 above.
"""

from __future__ import annotations

from typing import Final

__all__ = ["SATURATED_VAPOUR", "SECOND_VIRIAL", "SECOND_VIRIAL_COLD"]

SECOND_VIRIAL: Final[tuple[tuple[float, float, float], ...]] = (
    (2.0, -194.480, 0.3),
    (2.1768, -175.761, 0.3),
    (2.5, -149.181, 0.3),
    (3, -120.272, 0.3),
    (3.5, -100.079, 0.3),
    (4, -85.114, 0.3),
    (4.2221, -79.634, 0.3),
    (5, -64.344, 0.3),
    (6, -50.575, 0.3),
    (8, -33.417, 0.3),
    (10, -23.144, 0.1),
    (12, -16.311, 0.1),
    (13.8033, -11.860, 0.1),
    (15, -9.503, 0.1),
    (20, -2.754, 0.1),
    (24.5561, 0.945, 0.1),
    (30, 3.834, 0.03),
    (40, 6.974, 0.03),
    (50, 8.749, 0.03),
    (60, 9.852, 0.03),
    (77, 10.946, 0.03),
    (100, 11.675, 0.03),
    (150, 12.167, 0.03),
    (200, 12.166, 0.03),
    (250, 12.018, 0.03),
    (273.16, 11.930, 0.03),
    (300, 11.822, 0.03),
)
"""T in K, B in cm^3/mol, standard uncertainty in cm^3/mol."""

SECOND_VIRIAL_COLD: Final[tuple[tuple[float, float], ...]] = (
    (0.5, -1370.0),
    (0.7, -806.0),
    (1.0, -476.7),
    (1.25, -351.3),
    (1.5, -277.4),
    (1.75, -228.9),
)
"""T in K, B in cm^3/mol, good to about 1 per cent; below the range of `SECOND_VIRIAL`."""

SATURATED_VAPOUR: Final[tuple[tuple[float, float, float], ...]] = (
    (1.25, 114.7343, 0.044359),
    (1.5, 471.5371, 0.15295),
    (1.75, 1365.6081, 0.38409),
    (2.0, 3129.6659, 0.78311),
    (2.1768, 5041.8152, 1.1758),
    (2.3, 6729.7922, 1.5014),
    (2.5, 10227.7579, 2.1401),
    (2.75, 16139.7343, 3.156),
    (3.0, 24046.3559, 4.4491),
    (3.25, 34248.5805, 6.0649),
    (3.5, 47045.3546, 8.0623),
    (3.75, 62734.0588, 10.522),
    (4.0, 81616.1686, 13.566),
    (4.2221, 101325.1388, 16.919),
)
"""T90 in K, pressure in Pa, density in kg/m^3."""
