"""Corrections of vapour pressure thermometry, each a step with its sentence and its own sources of uncertainty.

Rules: order of the plan: gauge zero and gain (from the sheet), head of the gas, thermal transpiration, scale equation, head
of the liquid. Each acts only where the record of the thermometer or the sheet states the geometry; what is not corrected
is said.

References
----------
JCGM 100:2008 (GUM), 4.3.7 (rectangular distribution), 5.2 (shared sources).
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from archive.physics import pressure_head, thermomolecular, vapour_pressure
from archive.physics.constants import T_LAMBDA
from archive.reduction.estimate import FloatArray
from archive.reduction.step import NoParameters, Outcome, Port, Step
from schemas.finding import Finding
from schemas.lineage import SourceEntry
from schemas.quantity import Quantity
from schemas.thermometer import Calibration, SensingTube, Thermometer, VapourPressureForm

__all__ = ["PRESSURE_STEPS", "gas_head", "liquid_head", "transpiration"]

_EQUATION = "equation of thermal transpiration"
_WARN, _LARGE = 0.01, 0.10
"""Corrections above 1 per cent of p are warned of; above 10 per cent only a tenth of the correction may be claimed."""


def gas_head(_: NoParameters, *, pressure: FloatArray, thermometer: Thermometer) -> Outcome:
    """Return the pressure at the lower end of a sensing tube: that of the gauge and of the gas between.

    Parameters
    ----------
    pressure : ndarray
        At the gauge, Pa.
    thermometer : Thermometer
        Whose tube states `height`.

    Raises
    ------
    ValueError
        The tube states no height.

    Notes
    -----
    Without a stated temperature of the gas a straight profile from the liquid's temperature to that of the warm end is taken,
    and the correction is taken as known to its own size (rectangular, GUM 4.3.7).
    """
    tube, isotope = _tube(thermometer), _isotope(thermometer)
    height = tube.height
    if height is None:
        raise ValueError(
            "thermometer: its tube states no height, expected one; the head of the gas is not corrected"
        )
    cold = _saturated(pressure, isotope)

    def at_liquid(v: Mapping[str, float]) -> FloatArray:
        gas = v.get("gas temperature")
        middle = pressure_head.straight_profile(cold, v["warm end"]) if gas is None else gas
        head = pressure_head.aerostatic_head(
            pressure, height=v["height"], temperature=middle, isotope=isotope
        )
        return pressure + np.nan_to_num(np.asarray(head))

    stated = {"height": height, "gas temperature": tube.gas_temperature, "warm end": tube.warm_temperature}
    found = _corrected(
        at_liquid, {name: each for name, each in stated.items() if each is not None}, thermometer
    )
    change = found.value - pressure
    shared, entries = found.shared, found.entries
    if tube.gas_temperature is None:
        name = f"{thermometer.address} profile of the gas column"
        shared[name] = np.nan_to_num(np.abs(change) / np.sqrt(3.0))
        entries.append(
            SourceEntry(
                name=name,
                description="the temperature along the tube is not known",
                level="laboratory",
                address=thermometer.address,
            )
        )
    return Outcome(
        {"pressure": found.value}, shared={"pressure": shared}, sources=tuple(entries),
        facts={
            "height": height.format(), "largest": _largest(change), "share_percent": f"{_share(change, pressure):.2g}",
            "profile": "at the stated temperature" if tube.gas_temperature is not None else "on a straight profile of temperature, known to the size of the correction",
        },
    )  # fmt: skip


def transpiration(_: NoParameters, *, pressure: FloatArray, thermometer: Thermometer) -> Outcome:
    """Return the pressure at the cold end of a sensing tube, corrected for thermal transpiration (4He).

    Parameters
    ----------
    pressure : ndarray
        At the level of the cold end, Pa.
    thermometer : Thermometer
        Whose tube states its diameter and the temperature of its warm end.

    Notes
    -----
    The equation is known for 4He to a tenth of the correction, which is one source common to all that use it. For 3He nothing
    is corrected, and a finding says how large the correction of 4He would be.
    """
    tube, isotope = _tube(thermometer), _isotope(thermometer)
    cold = _saturated(pressure, isotope)
    usable = np.isfinite(cold) & (pressure > 0) & (cold < tube.warm_temperature.si)

    def at_cold_end(v: Mapping[str, float]) -> FloatArray:
        result = np.array(pressure, dtype=np.float64)
        if usable.any():
            result[usable] = thermomolecular.cold_pressure(
                pressure[usable], warm_temperature=v["warm end"], cold_temperature=cold[usable], radius=v["tube diameter"] / 2
            ).pressure  # fmt: skip
        return result

    stated = {"tube diameter": tube.inner_diameter, "warm end": tube.warm_temperature}
    found = _corrected(at_cold_end, stated, thermometer)
    change = found.value - pressure
    share = _share(change, pressure)
    facts = {"diameter": tube.inner_diameter.format(), "largest": _largest(change), "share_percent": share}
    if isotope == "3He":
        finding = Finding(
            code="transpiration-not-corrected", severity="warning" if share > 100 * _WARN else "note",
            what=f"thermal transpiration was not corrected: the equation is known for 4He only, where it would be up to {share:.2g} per cent of the pressure",
            remedy="bound the effect in the sheet (effect `thermal transpiration`), or use a wider tube",
        )  # fmt: skip
        said = "was not corrected (the equation is known for 4He only)"
        return Outcome({"pressure": np.array(pressure)}, facts={**facts, "said": said}, findings=(finding,))
    shared, entries = found.shared, found.entries
    # A tenth of the correction: `archive.physics.thermomolecular`.
    shared[_EQUATION] = np.nan_to_num(0.10 * change)
    entries.append(
        SourceEntry(
            name=_EQUATION,
            description="form of Weber and Schmidt, known to a tenth of the correction",
            level="laboratory",
        )
    )
    findings = () if share <= 100 * _WARN else (_large_correction(share),)
    said = (
        f"was corrected by up to {share:.2g} per cent of the pressure ({_largest(change)}), known to a tenth"
    )
    return Outcome(
        {"pressure": found.value}, shared={"pressure": shared}, sources=tuple(entries),
        facts={**facts, "said": said}, findings=findings,
    )  # fmt: skip


def _large_correction(share: float) -> Finding:
    beyond = share > 100 * _LARGE
    return Finding(
        code="transpiration-large", severity="warning",
        what=f"the correction for thermal transpiration reaches {share:.2g} per cent of the pressure"
        + ("; nothing better than a tenth of it can be claimed there" if beyond else ""),
        remedy="use a wider tube, or leave the lowest pressures out with the reason",
    )  # fmt: skip


def liquid_head(
    _: NoParameters, *, temperature: FloatArray, depth: float, calibration: Calibration
) -> Outcome:
    """Return the temperature at a depth below the surface of liquid 4He whose vapour pressure was read.

    Parameters
    ----------
    temperature : ndarray
        Of the surface, K on ITS-90.
    depth : float
        m.
    calibration : Calibration
        Of the vapour pressure thermometer; says the isotope.

    Notes
    -----
    In He II the bath has the temperature of its surface, and nothing is added. Above 4.2221 K the density is not tabulated:
    no temperature. A bath whose pressure has been falling may be stratified; the correction holds for one that boils evenly.
    """
    relation = calibration.relation
    if not isinstance(relation, VapourPressureForm) or relation.isotope != "4He":
        finding = Finding(
            code="liquid-head-not-corrected", severity="warning",
            what=f"the head of the liquid was not corrected: {calibration.address} is no vapour pressure of 4He",
            remedy="leave liquid_depth out of the sheet, or bound the effect `hydrostatic head` there",
        )  # fmt: skip
        return Outcome(
            {"temperature": np.array(temperature)}, facts={"said": "was not corrected"}, findings=(finding,)
        )
    result = np.array(temperature, dtype=np.float64)
    with np.errstate(invalid="ignore"):
        normal = (temperature > T_LAMBDA) & (temperature <= 4.2221)
        result[temperature > 4.2221] = np.nan
    if normal.any():
        result[normal] += pressure_head.liquid_head_temperature(temperature[normal], depth)
    change = result - temperature
    largest = 1e3 * float(np.nanmax(np.abs(change), initial=0.0)) if np.isfinite(change).any() else 0.0
    return Outcome(
        {"temperature": result},
        facts={"said": f"adds up to {largest:.3g} mK above the lambda point and nothing in He II", "rows": int(normal.sum()), "largest_mK": largest},
    )  # fmt: skip


def _tube(thermometer: Thermometer) -> SensingTube:
    if thermometer.tube is None:
        raise ValueError(
            f"thermometer: {thermometer.address} states no tube, expected one with its diameter and warm end"
        )
    return thermometer.tube


def _isotope(thermometer: Thermometer) -> vapour_pressure.Isotope:
    return "3He" if thermometer.kind.endswith("3He") else "4He"


def _saturated(pressure: FloatArray, isotope: vapour_pressure.Isotope) -> FloatArray:
    """Return the temperature of the liquid by the uncorrected pressure; the corrections need it to a few per cent only."""
    low, high = vapour_pressure.pressure_range_its90(isotope)
    found = np.full(np.shape(pressure), np.nan)
    with np.errstate(invalid="ignore"):
        inside = (pressure >= low) & (pressure <= high)
    if inside.any():
        found[inside] = vapour_pressure.temperature_its90(pressure[inside], isotope)
    return found


@dataclass(frozen=True)
class _Corrected:
    """A corrected pressure, and the contributions and descriptions of the stated quantities."""

    value: FloatArray
    shared: dict[str, FloatArray]
    entries: list[SourceEntry]


def _corrected(
    function: Callable[[Mapping[str, float]], FloatArray],
    stated: Mapping[str, Quantity],
    thermometer: Thermometer,
) -> _Corrected:
    """Return what a function of stated quantities gives, and what each contributes when shifted by its uncertainty."""
    values = {name: quantity.si for name, quantity in stated.items()}
    shared: dict[str, FloatArray] = {}
    entries: list[SourceEntry] = []
    for name, quantity in stated.items():
        spread = quantity.si_uncertainty
        if not spread:
            continue
        up, down = (function({**values, name: values[name] + sign * spread}) for sign in (1.0, -1.0))
        source = f"{thermometer.address} {name}"
        shared[source] = np.nan_to_num((up - down) / 2)
        entries.append(
            SourceEntry(
                name=source, description=f"stated: {quantity.format()}", level="laboratory", address=thermometer.address
            )
        )  # fmt: skip
    return _Corrected(function(values), shared, entries)


def _largest(change: FloatArray) -> str:
    finite = np.abs(change[np.isfinite(change)])
    return f"{float(finite.max()) if finite.size else 0.0:.3g} Pa"


def _share(change: FloatArray, pressure: FloatArray) -> float:
    """Return the largest correction in per cent of the pressure."""
    with np.errstate(invalid="ignore", divide="ignore"):
        share = np.abs(change / pressure)
    finite = share[np.isfinite(share)]
    return 100 * float(finite.max()) if finite.size else 0.0


_THERMOMETER = Port("any", "record", "thermometer with its sensing tube")

PRESSURE_STEPS: tuple[Step, ...] = (
    Step(
        name="gas-head", version=1, function=gas_head,
        takes={"pressure": Port("pressure", "array", "pressure at the gauge"), "thermometer": _THERMOMETER},
        yields={"pressure": Port("pressure", "array", "pressure at the level of the liquid")},
        sentence="The gas between gauge and liquid, {height} high, adds up to {largest} ({share_percent} per cent), {profile}.",
        effects={"hydrostatic head": "The head of the gas, up to {largest}, was added."},
    ),
    Step(
        name="thermal-transpiration", version=1, function=transpiration,
        takes={"pressure": Port("pressure", "array", "pressure at the level of the liquid"), "thermometer": _THERMOMETER},
        yields={"pressure": Port("pressure", "array", "pressure at the cold end of the tube")},
        sentence="Thermal transpiration in a tube of {diameter} {said}.", citations=("roberts-1956",),
        effects={"thermal transpiration": "It {said}."},
    ),
    Step(
        name="liquid-head", version=1, function=liquid_head,
        takes={
            "temperature": Port("temperature", "array", "temperature of the surface"), "depth": Port("length", "scalar", "depth of the thermometers below the surface"),
            "calibration": Port("any", "record", "calibration of the vapour pressure thermometer"),
        },
        yields={"temperature": Port("temperature", "array", "temperature at the depth of the thermometers")},
        sentence="The head of {depth} of liquid {said}.", effects={"hydrostatic head": "The head of the liquid {said}."},
    ),
)  # fmt: skip
