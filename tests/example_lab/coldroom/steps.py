"""The group's own reduction step: a plain function of SI numbers and one declaration."""

from __future__ import annotations

from archive.reduction.estimate import FloatArray
from archive.reduction.step import NoParameters, Outcome, Port, Step

__all__ = ["HEATING", "joule_heating"]


def joule_heating(_: NoParameters, *, voltage: FloatArray, resistance: FloatArray) -> Outcome:
    """Return the power V^2/R that each reading dissipates in the thermometer, in W; voltage is rms.

    Its uncertainty is the runner's work: it shifts the inputs one after the other.
    """
    return Outcome({"power": voltage**2 / resistance})


HEATING = Step(
    name="joule-heating",
    version=1,
    function=joule_heating,
    takes={
        "voltage": Port("voltage", "array", "rms voltage across the thermometer"),
        "resistance": Port("resistance", "array", "resistance of the thermometer"),
    },
    yields={"power": Port("power", "array", "power dissipated in the thermometer")},
    sentence="The bridge dissipated the power V^2/R in the thermometer.",
)
