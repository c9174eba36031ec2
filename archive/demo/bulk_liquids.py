"""The liquid of the invented bulk cells: at its own vapour pressure, and at two pressures.

Rules: at saturated vapour pressure the amplitudes are published ones. Under pressure none were at hand: the lambda temperature is that of the coarse
lambda line, the density that of the normal liquid at 2.18 K, the heat capacity's amplitude is invented, and the superfluid density's follows
from it by the universality of the two-scale-factor combination, which therefore is the same at every pressure here.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Final

from archive.physics import helium_liquid
from archive.physics.constants import MOLAR_MASS_HELIUM4, T_LAMBDA
from archive.physics.film_static import STIFFNESS_UNIT
from archive.physics.heat_capacity import LambdaLaw
from archive.physics.lambda_line import LAMBDA_SLOPE, coarse_lambda_temperature, lambda_slope
from archive.physics.two_scale_factor import two_scale_factor

__all__ = ["SATURATED", "UNDER_PRESSURE", "LiquidTruth"]

LAW: Final = LambdaLaw.from_amplitudes(
    amplitude=5.6537,
    exponent=-0.01264,
    background=460.19,
    amplitude_ratio=1.0525,
    first=-0.0157,
    second=0.3311,
)
"""J. A. Lipa, J. A. Nissen, D. A. Stricker, D. R. Swanson, T. C. P. Chui, Physical Review B 68, 174518 (2003); table of coefficients from memory."""

_SINGSAAS: Final = 2.403
"""k_0 at saturated vapour pressure: A. Singsaas, G. Ahlers, Physical Review B 30, 5103 (1984), as reproduced by Donnelly and Barenghi (1998)."""


@dataclass(frozen=True)
class LiquidTruth:
    """Bulk liquid at one pressure.

    Attributes
    ----------
    pressure : float or None
        Pa; None: its own vapour pressure.
    lambda_temperature : float
        K.
    slope : float
        dT_lambda/dp, K/Pa.
    density : float
        At the lambda point, kg/m^3.
    amplitude : float
        k_0 of the superfluid fraction.
    law : LambdaLaw
        Molar heat capacity.
    """

    pressure: float | None
    lambda_temperature: float
    slope: float
    density: float
    amplitude: float
    law: LambdaLaw

    @property
    def coherence_length(self) -> float:
        """Amplitude of the transverse correlation length, m."""
        return STIFFNESS_UNIT * self.lambda_temperature / (self.amplitude * self.density)

    @property
    def combination(self) -> float:
        """Two-scale-factor combination."""
        return float(
            two_scale_factor(
                self.coherence_length,
                heat_capacity_amplitude=self.law.amplitude,
                molar_volume=MOLAR_MASS_HELIUM4 / self.density,
            )
        )

    @property
    def amplitude_share(self) -> float:
        """Amplitude of the superfluid fraction over that at saturated vapour pressure."""
        return self.amplitude / _SINGSAAS


SATURATED: Final = LiquidTruth(
    None, T_LAMBDA, LAMBDA_SLOPE, float(helium_liquid.density(T_LAMBDA)), _SINGSAAS, LAW
)


def _universal(pressure: float, density: float, heat_amplitude: float) -> LiquidTruth:
    """Return liquid under pressure whose superfluid density makes the combination that of saturated liquid."""
    law = replace(LAW, amplitude=heat_amplitude, first=LAW.first * heat_amplitude / LAW.amplitude, second=LAW.second * heat_amplitude / LAW.amplitude)  # fmt: skip
    found = LiquidTruth(
        pressure, float(coarse_lambda_temperature(pressure)), float(lambda_slope(pressure)), density, 1.0, law
    )
    # The combination falls as one over the amplitude.
    return replace(found, amplitude=found.combination / SATURATED.combination)


UNDER_PRESSURE: Final = {
    "s003": _universal(7.26 * 101325, 157.8, 5.3),
    "s004": _universal(18.18 * 101325, 169.8, 4.9),
}
"""By the sweep in both cooldowns; pressures of the coarse line's points. Density: equation of state of Ortiz Vega et al. (NISTIR 8474, 2023) at
2.18 K and that pressure, read from a public property library."""
