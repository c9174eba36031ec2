"""Step of the Coulomb blockade thermometer: a conductance dip, and the temperature by its width."""

from __future__ import annotations

import math

import numpy as np
from pydantic import Field

from archive.physics.coulomb_blockade import fit_dip, half_width
from archive.reduction.estimate import FloatArray
from archive.reduction.step import Covariance, Outcome, Port, Step
from schemas.base import Record

__all__ = ["COULOMB_STEPS", "DipParameters", "dip"]

_SCALE = "local:thermodynamic"
"""A primary thermometer gives thermodynamic temperature; no practical scale is meant."""


class DipParameters(Record):
    """The device and its wires."""

    junctions: float | None = Field(default=None, gt=0)
    """In series; left out: no temperature by the width."""
    wire_resistance_ohm: float = Field(default=0.0, ge=0)
    """Of all wires in series with the device."""
    noise_from_scatter: bool = True
    """True: the scatter about the dip is the noise; False: the stated uncertainty of the conductance is."""


def dip(
    parameters: DipParameters, *, bias: FloatArray, conductance: FloatArray, u_conductance: FloatArray
) -> Outcome:
    """Return depth and width of a conductance dip, and the temperature that its width means.

    Parameters
    ----------
    bias, conductance : ndarray
        V and S, as read over device and wires.
    u_conductance : ndarray
        Standard uncertainty of each conductance, S.

    Raises
    ------
    ValueError
        No dip, or wires that resist more than the whole.

    Notes
    -----
    Wires of resistance R in series: 1/G of the device is 1/G less R, and its share of the bias is 1 - R G; the share is taken
    at the mean conductance, which is right to the depth times R G.
    """
    known = np.isfinite(bias) & np.isfinite(conductance)
    V, G, R = bias[known], conductance[known], parameters.wire_resistance_ohm
    if G.size and float(np.max(G)) * R >= 1:
        raise ValueError(
            f"conductance: wires of {R:.6g} Ohm resist more than wires and device together, 1/G = {1 / float(np.max(G)):.6g} Ohm"
        )
    share = 1 - R * float(np.mean(G)) if G.size else 1.0
    own = 1 / (1 / G - R)
    stated = u_conductance[known] * (own / G) ** 2
    use_stated = not parameters.noise_from_scatter and bool(np.all(stated > 0))
    found = fit_dip(V * share, own, standard_uncertainty=stated if use_stated else None)
    outputs: dict[str, float] = {
        "conductance": found.conductance, "depth": found.depth, "width": found.width, "offset": found.offset, "temperature": math.nan,
    }  # fmt: skip
    names: tuple[str, ...] = ("conductance", "depth", "width", "offset")
    covariance, verdicts = found.covariance, {"temperature": "number of junctions not given"}
    if parameters.junctions is not None:
        per_volt = 1 / float(half_width(1.0, junctions=parameters.junctions))
        outputs["temperature"], verdicts = found.width * per_volt, {}
        turn = np.vstack([np.eye(4), per_volt * np.eye(4)[2]])
        names, covariance = (*names, "temperature"), turn @ covariance @ turn.T
    return Outcome(
        outputs, covariance=Covariance(names, covariance), scales={"temperature": _SCALE}, verdicts=verdicts,
        facts={
            "points": int(V.size), "rms": float(np.sqrt(np.mean(found.residuals**2))), "share": share,
            "wires": f"after taking off {R:.6g} Ohm of wires" if R else "with no wires taken off",
            "by_width": "" if parameters.junctions is None else f"; {parameters.junctions:.6g} junctions in series make that {outputs['temperature'] * 1e3:.4g} mK",
        },
    )  # fmt: skip


COULOMB_STEPS: tuple[Step, ...] = (
    Step(
        name="coulomb-dip", version=1, function=dip, parameters=DipParameters,
        takes={"bias": Port("voltage", "array", "bias over device and wires"), "conductance": Port("conductance", "array", "differential conductance")},
        yields={
            "conductance": Port("conductance", "scalar", "conductance far from the dip"), "depth": Port("fraction", "scalar", "depth of the dip at zero bias"),
            "width": Port("voltage", "scalar", "full width of the dip at half depth"), "offset": Port("voltage", "scalar", "bias of the middle of the dip"),
            "temperature": Port("temperature", "scalar", "thermodynamic temperature by the width"),
        },
        sentence="A dip of the Coulomb blockade was fitted to {points} points {wires}: {depth} deep, {width} wide at half depth{by_width}.",
        citations=("pekola-1994",), spread="refit", weights=("conductance",),
    ),
)  # fmt: skip
