"""State of bulk liquid in a reduction: tabulated at saturated vapour pressure, or stated for a run under pressure.

Rule: the coarse lambda line only parts normal liquid from superfluid; no temperature of a result is taken from it.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from archive.physics import helium_liquid
from archive.physics.constants import T_LAMBDA
from archive.physics.lambda_line import coarse_lambda_temperature
from archive.reduction.estimate import FloatArray

__all__ = ["LiquidState"]

NORMAL_ABOVE = 2.18
"""K; above the lambda point at saturated vapour pressure."""

ABOVE_COARSE_LINE = 0.02
"""K; the coarse lambda line is good to 15 mK."""


@dataclass(frozen=True)
class LiquidState:
    """What is taken for the state of the liquid.

    Attributes
    ----------
    density : float or None
        Held over the run, kg/m^3; None: tabulated at saturated vapour pressure.
    pressure : float or None
        As stated, Pa.
    lambda_temperature : float
        Where the transition is taken to lie, K; coarse under pressure.
    normal_above : float
        From here on all the liquid is normal, K.
    origin : str
        From where the density is, in words.
    """

    density: float | None
    pressure: float | None
    lambda_temperature: float
    normal_above: float
    origin: str

    @classmethod
    def of(
        cls,
        pressure: float | None,
        density: float | None,
        *,
        held_density: float | None,
        normal_above: float | None,
    ) -> LiquidState:
        """Return the state from what a sheet states and what a plan sets.

        Parameters
        ----------
        pressure, density : float or None
            Stated for the sweep, Pa and kg/m^3; None: at saturated vapour pressure.
        held_density, normal_above : float or None
            Set in the plan, kg/m^3 and K.

        Raises
        ------
        ValueError
            A pressure beyond the coarse lambda line.
        """
        transition, above = T_LAMBDA, NORMAL_ABOVE
        origin = "tables at saturated vapour pressure"
        if pressure is not None:
            transition = float(coarse_lambda_temperature(pressure))
            above = transition + ABOVE_COARSE_LINE
            origin = f"the sheet, for {pressure / 1e3:.5g} kPa"
        if held_density is not None:
            density, origin = held_density, "the plan"
        return cls(density, pressure, transition, above if normal_above is None else normal_above, origin)

    def densities(self, temperature: FloatArray) -> FloatArray:
        """Return the density at each temperature, kg/m^3."""
        if self.density is not None:
            return np.full(temperature.shape, self.density)
        return np.atleast_1d(helium_liquid.density(temperature))

    def saturated_equivalent(self, temperature: FloatArray) -> FloatArray:
        """Return the temperature of the same T/T_lambda in saturated liquid, K."""
        return temperature * (T_LAMBDA / self.lambda_temperature)
