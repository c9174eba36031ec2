"""Steps of volumetric adsorption: the dead volume by expansion of helium, and the amount adsorbed beside the gas in it.

Rule: what the dead volume and the doses share (metering volume, gauge) keeps its name in both, so that it cancels in an isotherm
as far as it does in truth.
"""

from __future__ import annotations

import math

import numpy as np

from archive.physics.dead_volume import free_volume
from archive.physics.helium_vapour import saturated_vapour_pressure
from archive.reduction.background_steps import known_rows
from archive.reduction.cell_gas import GasParameters, cell_gas, stated_volumes
from archive.reduction.estimate import FloatArray
from archive.reduction.facts import GasBook
from archive.reduction.step import Covariance, NoParameters, Outcome, Port, Step
from schemas.finding import Finding
from schemas.substrate import Sample

__all__ = ["DEAD_VOLUME_STEPS"]

OFFSET_SHARE = 0.005
"""Part of the largest amount below which an offset is passed over (common practice, no source)."""


def _column(value: float | FloatArray, like: FloatArray) -> FloatArray:
    return np.array(np.broadcast_to(np.asarray(value, dtype=np.float64), like.shape))


def dead_volume_fit(
    parameters: GasParameters,
    *,
    amount: FloatArray,
    pressure: FloatArray,
    temperature: float | FloatArray,
    gas: GasBook,
    sample: Sample | None,
    u_pressure: FloatArray | None,
) -> Outcome:
    """Return the volume at the cell's temperature that helium fills, from expansions of metered amounts.

    Parameters
    ----------
    amount : ndarray
        Gas admitted up to each row, mol.
    pressure, temperature : ndarray, float or ndarray
        Of the gas in the cell in equilibrium, Pa, K.
    gas : GasBook
        Its volumes with a temperature of their own hold a part of the gas.
    sample : Sample or None
        The gas.
    u_pressure : ndarray or None
        Point uncertainty, Pa.

    Raises
    ------
    ValueError
        No usable row, a gas without a second virial coefficient, or no volume left for the cell.

    Notes
    -----
    The gas must not be adsorbed: helium at 77 K or above. Thermomolecular pressure differences are not in it.
    """
    T = _column(temperature, pressure)
    virial = cell_gas(parameters, sample)
    rows = known_rows(amount, pressure, T) & (np.nan_to_num(pressure) > 0)
    density = virial.density(pressure, T)
    rows &= np.isfinite(density) & (np.nan_to_num(amount) > 0)
    if not rows.any():
        raise ValueError(
            "pressure: no row has an amount, a pressure above zero and a temperature in the range of the virial equation"
        )
    warm, stated, u_stated, _ = stated_volumes(gas)
    held = [virial.density(pressure, _column(each.temperature, pressure))[rows] for each in warm]
    inside = amount[rows] - sum((each.volume * rho for each, rho in zip(warm, held, strict=True)), np.zeros(int(rows.sum())))  # fmt: skip
    # An error of the pressure moves the density that goes with an amount.
    spread = None
    if u_pressure is not None and (u_pressure[rows] > 0).all():
        rough = float(np.sum(inside * density[rows]) / np.sum(density[rows] ** 2))
        slope = np.abs(virial.density(pressure + u_pressure, T) - density)[rows]
        spread = np.abs(rough) * slope
    found = free_volume(inside, density[rows], standard_uncertainty=spread)
    if not found.volume > 0:
        raise ValueError(
            f"amount: the stated volumes hold more gas than was admitted; {found.volume * 1e6:.4g} cm^3 are left for the cell"
        )
    shared: dict[str, dict[str, float]] = {"volume": {}, "offset": {}}
    sources = []
    for each, rho in zip(warm, held, strict=True):
        if each.u_volume > 0:
            moved = free_volume(inside - each.u_volume * rho, density[rows], standard_uncertainty=spread)
            sources.append(each.source)
            _add(shared, each.source.name, moved.volume - found.volume, moved.offset - found.offset)
    source = virial.source(T)
    sides = [
        free_volume(inside, virial.density(pressure, T, sign)[rows], standard_uncertainty=spread)
        for sign in (1.0, -1.0)
    ]
    if sides[0].volume != sides[1].volume:
        sources.append(source)
        _add(shared, source.name, (sides[0].volume - sides[1].volume) / 2, (sides[0].offset - sides[1].offset) / 2)  # fmt: skip
    names: tuple[str, ...] = ("volume",)
    matrix = np.array([[found.u_volume**2]])
    verdicts = {"offset": "fewer than three pressures"}
    if math.isfinite(found.offset):
        names, verdicts = ("volume", "offset"), {}
        matrix = np.array([[found.u_volume**2, found.covariance], [found.covariance, found.u_offset**2]])
    residual = np.full(pressure.shape, math.nan)
    residual[rows] = found.residuals
    return Outcome(
        {"volume": found.volume, "offset": found.offset, "residual": residual},
        shared={name: parts for name, parts in shared.items() if name in names}, sources=tuple(sources),
        covariance=Covariance(names, matrix), verdicts=verdicts,
        facts={
            "points": int(rows.sum()), "isotope": virial.isotope, "low_K": float(T[rows].min()), "high_K": float(T[rows].max()),
            "low_kPa": float(pressure[rows].min()) / 1e3, "high_kPa": float(pressure[rows].max()) / 1e3,
            "warm_cm3": sum(each.volume for each in warm) * 1e6, "rms_umol": float(np.sqrt(np.mean(found.residuals**2))) * 1e6,
        },
        findings=_volume_findings(found.volume, found.u_volume, found.offset, found.u_offset, float(inside.max()), stated, u_stated),
    )  # fmt: skip


def _add(shared: dict[str, dict[str, float]], name: str, volume: float, offset: float) -> None:
    shared["volume"][name] = volume
    if math.isfinite(offset):
        shared["offset"][name] = offset


def _volume_findings(
    volume: float, u_volume: float, offset: float, u_offset: float, largest: float, stated: float, u_stated: float
) -> tuple[Finding, ...]:  # fmt: skip
    findings: list[Finding] = []
    if math.isfinite(offset) and abs(offset) > max(3 * u_offset, OFFSET_SHARE * largest):
        findings.append(
            Finding(
                code="expansions-not-proportional", severity="warning",
                what=f"the amounts do not extrapolate to nothing at zero pressure but to {offset * 1e6:.4g} umol, {abs(offset) / largest:.1%} of the largest",
                remedy="look for gas that is adsorbed, a leak, the zero of the gauge, or equilibrium that was not waited for",
            )
        )  # fmt: skip
    if stated > 0 and abs(volume - stated) > 3 * math.hypot(u_volume, u_stated):
        findings.append(
            Finding(
                code="dead-volume-differs", severity="note",
                what=f"the sheet states {stated * 1e6:.4g} cm^3 at the cell's temperature, and helium fills {volume * 1e6:.4g} cm^3",
            )
        )  # fmt: skip
    return tuple(findings)


def adsorbed_amount(
    parameters: GasParameters,
    *,
    amount: FloatArray,
    pressure: FloatArray,
    temperature: float | FloatArray,
    volume: float | None,
    gas: GasBook,
    sample: Sample | None,
) -> Outcome:
    """Return the amount adsorbed: what was admitted less the gas in the dead volumes, row by row.

    Parameters
    ----------
    amount, pressure, temperature
        As in `dead_volume_fit`.
    volume : float or None
        Volume at the cell's temperature as helium found it, m^3; without it what the sheet states for it.

    Raises
    ------
    ValueError
        No dead volume at all, or a gas without a second virial coefficient.

    Notes
    -----
    The excess amount (Gibbs): the volume of the film itself is not taken off the dead volume.
    """
    T = _column(temperature, pressure)
    virial = cell_gas(parameters, sample)
    warm, stated, _, cold = stated_volumes(gas)
    if volume is None and not gas.dead_volumes:
        raise ValueError(
            "volume: no dead volume was measured or stated; expand helium into the cell and reduce that run by the plan dead-volume, or state it in the sheet"
        )
    measured = volume is not None
    V = stated if volume is None else volume
    density = virial.density(pressure, T)
    held = V * density
    shared: dict[str, FloatArray] = {}
    sources = []
    for each in warm:
        own = virial.density(pressure, _column(each.temperature, pressure))
        held = held + each.volume * own
        if each.u_volume > 0:
            sources.append(each.source)
            shared[each.source.name] = np.nan_to_num(each.u_volume * own)
    for each in () if measured else cold:
        if each.u_volume > 0:
            sources.append(each.source)
            shared[each.source.name] = np.nan_to_num(each.u_volume * density)
    part = V * (virial.density(pressure, T, 1.0) - virial.density(pressure, T, -1.0)) / 2
    if np.any(np.nan_to_num(part) != 0):
        sources.append(virial.source(T))
        shared[virial.source(T).name] = np.nan_to_num(part)
    adsorbed = amount - held
    with np.errstate(divide="ignore", invalid="ignore"):
        share = held / amount
    beyond = int(np.count_nonzero(known_rows(amount, pressure, T) & np.isnan(held)))
    findings: tuple[Finding, ...] = ()
    if beyond:
        findings = (
            Finding(
                code="gas-too-dense", severity="note",
                what=f"{beyond} of {pressure.size} rows are beyond the virial equation cut after its second term and have no amount adsorbed",
            ),
        )  # fmt: skip
    return Outcome(
        {"adsorbed": adsorbed, "gas_amount": held},
        shared={"adsorbed": {name: -each for name, each in shared.items()}, "gas_amount": shared}, sources=tuple(sources),
        facts={
            "dead_cm3": (V + sum(each.volume for each in warm)) * 1e6, "largest_share": float(np.nanmax(share)) if np.isfinite(share).any() else math.nan,
            "isotope": virial.isotope, "known_by": "expansion" if measured else "the sheet",
        },
        findings=findings,
    )  # fmt: skip


def saturated_pressure(_: NoParameters, *, temperature: float | FloatArray, sample: Sample | None) -> Outcome:
    """Return the vapour pressure of 4He at the temperature of the film.

    Raises
    ------
    ValueError
        Another gas, or a temperature outside 0.5 K to 5 K.
    """
    if sample is None or sample.isotope != "4He":
        found = "a gas that is not recorded" if sample is None else sample.isotope
        raise ValueError(f"sample: found {found}, expected 4He; state the saturated pressure in the sheet")
    return Outcome({"saturated_pressure": saturated_vapour_pressure(temperature)})


_AMOUNT = Port("amount", "array", "gas admitted up to each row")
_PRESSURE = Port("pressure", "array", "pressure in the cell")
_T = Port("temperature", "number", "temperature of the cell")
_GAS = Port("any", "record", "gas book of the sheet")
_SAMPLE = Port("any", "record", "gas of the run", optional=True)

DEAD_VOLUME_STEPS: tuple[Step, ...] = (
    Step(
        name="dead-volume-fit", version=1, function=dead_volume_fit, parameters=GasParameters,
        takes={"amount": _AMOUNT, "pressure": _PRESSURE, "temperature": _T, "gas": _GAS, "sample": _SAMPLE},
        yields={
            "volume": Port("volume", "scalar", "volume at the cell's temperature that the gas fills"),
            "offset": Port("amount", "scalar", "amount at zero pressure, of a line whose offset is free"),
            "residual": Port("amount", "array", "amount less line through the origin"),
        },
        sentence="{points} expansions of {isotope} to pressures from {low_kPa} kPa to {high_kPa} kPa, with the cell between {low_K} K and {high_K} K, {warm_cm3} cm^3 beside it at temperatures of their own and the second virial coefficient, give a dead volume of {volume} (rms of the residuals {rms_umol} umol; offset of a free line {offset}).",
        citations=("cencek-2012",), spread="refit", weights=("pressure",),
    ),
    Step(
        name="adsorbed-amount", version=1, function=adsorbed_amount, parameters=GasParameters,
        takes={
            "amount": _AMOUNT, "pressure": _PRESSURE, "temperature": _T, "volume": Port("volume", "scalar", "dead volume at the cell's temperature", optional=True),
            "gas": _GAS, "sample": _SAMPLE,
        },
        yields={"adsorbed": Port("amount", "array", "amount adsorbed"), "gas_amount": Port("amount", "array", "gas in the dead volumes")},
        sentence="The gas in {dead_cm3} cm^3 of dead volume, known by {known_by} and taken with the second virial coefficient of {isotope}, at most {largest_share} of the whole, was taken off the amount admitted.",
        effects={"vapour in dead volume": "The gas in the dead volumes was taken at the measured pressure and subtracted."}, citations=("cencek-2012",),
    ),
    Step(
        name="saturated-pressure-of-helium", version=1, function=saturated_pressure, takes={"temperature": _T, "sample": _SAMPLE},
        yields={"saturated_pressure": Port("pressure", "number", "saturated vapour pressure at the temperature of the film")},
        sentence="The saturated pressure is the vapour pressure of 4He at the temperature of the film, {saturated_pressure}.",
        citations=("preston-thomas-1990", "donnelly-1998"),
    ),
)  # fmt: skip
"""Steps of this module."""
