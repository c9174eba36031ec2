"""Steps of the gas bookkeeping: amount admitted, vapour, coverage, layers, thickness."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Literal

import numpy as np

from archive.physics.constants import MOLAR_MASS_HELIUM4
from archive.physics.helium_gas import molar_density
from archive.physics.helium_vapour import saturated_molar_density
from archive.reduction.estimate import FloatArray
from archive.reduction.facts import GasBook
from archive.reduction.gas_amounts import METHOD, DoseAmount, dose_amounts, helium_isotope
from archive.reduction.step import NoParameters, Outcome
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import SourceEntry, Value
from schemas.quantity import Quantity
from schemas.substrate import Sample, Substrate

__all__ = [
    "ThicknessParameters",
    "VapourParameters",
    "amount_from_doses",
    "coverage_from_amount",
    "layers_from_coverage",
    "thickness_from_coverage",
    "vapour_in_dead_volume",
]

LIQUID_DENSITY = 145.14
"""Liquid 4He at zero temperature and saturated vapour pressure, kg/m^3: R. J. Donnelly, C. F. Barenghi, "The observed
properties of liquid helium at the saturated vapor pressure", J. Phys. Chem. Ref. Data 27, 1217 (1998)."""

COLDEST_VAPOUR = 0.5
"""K; below it the value at 0.5 K stands as an upper bound, at most 0.5 nmol/cm^3."""


class VapourParameters(Record):
    """What to do without a measured pressure."""

    without_pressure: Literal["bound", "refuse"] = "bound"
    """`bound`: between nothing and saturation, all values alike (JCGM 100:2008, 4.3.7)."""


class ThicknessParameters(Record):
    """Inner layers whose density is not that of the liquid."""

    inner_coverage_umol_m2: float = 0.0
    inner_thickness_nm: float = 0.0


def amount_from_doses(
    _: NoParameters, *, gas: GasBook, sample: Sample | None, time: FloatArray | None
) -> Outcome:
    """Return the amount of gas in the cell's system: after the last dose, or at each row of a run of doses.

    Parameters
    ----------
    gas : GasBook
    sample : Sample or None
    time : ndarray or None
        Instants, seconds since 1970 UTC; needed when doses were admitted during the sweep.

    Raises
    ------
    ValueError
        A dose that cannot be computed, or rows without time in a run of doses.
    """
    doses, entries = dose_amounts(gas, sample)
    counted = [each for each in doses if each.counted]
    computed = any(each.dose.amount is None for each in counted)
    facts: dict[str, object] = {
        "crossed_out": [each.dose.name for each in doses if not each.counted],
        "method": f"by {METHOD}" if computed else "as stated in the notebook",
    }  # fmt: skip
    if gas.during:
        if time is None:
            raise ValueError(
                f"time: doses {', '.join(gas.during)} were admitted during the sweep, and no channel gives the time of a row"
            )
        return _cited(_running(counted, entries, time, facts), computed=computed)
    last = gas.admitted
    if last is not None and last not in {each.dose.name for each in doses}:
        raise ValueError(f"gas: the sweep follows dose {last}, and the sheet has no such dose")
    taken = [] if last is None else _up_to(counted, doses, last)
    facts |= {"doses": len(taken), "count": _doses_text(taken), "last": last or "none"}
    return _cited(_total(taken, entries, gas.cooldown, last, facts), computed=computed)


def _cited(outcome: Outcome, *, computed: bool) -> Outcome:
    """Cite the equation of state only where a dose was computed by it."""
    return outcome if computed else replace(outcome, citations=())


def _doses_text(doses: list[DoseAmount]) -> str:
    added = sum(each.dose.act == "add" for each in doses)
    removed = len(doses) - added
    less = f", less {removed} removal{'s' * (removed != 1)}," if removed else ""
    return f"{added} dose{'s' * (added != 1)}{less}"


def _up_to(counted: list[DoseAmount], doses: list[DoseAmount], last: str) -> list[DoseAmount]:
    end = next(each.dose.at for each in doses if each.dose.name == last)
    return [each for each in counted if each.dose.at <= end]


def _total(
    taken: list[DoseAmount],
    entries: dict[str, SourceEntry],
    cooldown: str,
    last: str | None,
    facts: dict[str, object],
) -> Outcome:
    value = math.fsum(float(each.amount.value) for each in taken)
    shared: dict[str, float] = {}
    readings = 0.0
    for each in taken:
        for name, part in each.amount.shared.items():
            if name.startswith("reading "):
                # The noise of single readings is nobody else's; together it is one source.
                readings += float(part) ** 2
            else:
                shared[name] = shared.get(name, 0.0) + float(part)
    sources = [entries[name] for name in shared]
    if readings > 0:
        entry = SourceEntry(
            name=f"readings of the doses up to {last} in {cooldown}",
            description="noise of the single pressure readings",
            level="run",
        )
        shared[entry.name] = math.sqrt(readings)
        sources.append(entry)
    return Outcome({"amount": value}, shared={"amount": shared}, sources=tuple(sources), facts=facts)


def _running(
    counted: list[DoseAmount], entries: dict[str, SourceEntry], time: FloatArray, facts: dict[str, object]
) -> Outcome:
    ats = np.array([each.dose.at.timestamp() for each in counted])
    admitted = time[:, np.newaxis] >= ats[np.newaxis, :]
    amount = admitted @ np.array([float(each.amount.value) for each in counted])
    shared: dict[str, FloatArray] = {}
    for k, each in enumerate(counted):
        for name, part in each.amount.shared.items():
            shared[name] = shared.get(name, np.zeros(time.shape)) + admitted[:, k] * float(part)
    amount = np.where(np.isnan(time), np.nan, amount)
    # Doses after the last row are no part of any amount here.
    within = [each for k, each in enumerate(counted) if admitted[:, k].any()]
    facts |= {
        "doses": len(within),
        "count": _doses_text(within),
        "last": within[-1].dose.name if within else "none",
    }
    return Outcome(
        {"amount": amount},
        shared={"amount": shared},
        sources=tuple(entries[name] for name in shared),
        facts=facts,
    )


def vapour_in_dead_volume(
    parameters: VapourParameters,
    *,
    gas: GasBook,
    temperature: FloatArray,
    pressure: FloatArray | None,
    sample: Sample | None,
) -> Outcome:
    """Return the amount of gas that is vapour in the dead volumes, row by row.

    Raises
    ------
    ValueError
        No pressure while the parameter refuses that, or a gas that is no helium.

    Notes
    -----
    With a measured pressure each volume holds V rho(p, T_j). Without one the amount lies between nothing and saturation;
    every value between counts alike, so half the bound is taken, with the bound over the square root of twelve as
    standard uncertainty, common to all rows. The saturated vapour is that of 4He.
    """
    if not gas.dead_volumes:
        finding = Finding(
            code="dead-volume-not-recorded",
            severity="note",
            what="no dead volume is recorded; no vapour was subtracted",
        )
        return Outcome(
            {"vapour": np.where(np.isnan(temperature), np.nan, 0.0)},
            facts={"treatment": "taken as nothing: no dead volume is recorded", "volume_cm3": 0.0},
            findings=(finding,),
        )
    volume = sum(each.volume.si for each in gas.dead_volumes)
    facts: dict[str, object] = {"volume_cm3": volume * 1e6}
    isotope = helium_isotope(sample)
    total = np.zeros(np.shape(temperature))
    if pressure is None and parameters.without_pressure == "refuse":
        raise ValueError(
            "pressure: none was measured, and the plan does not take the saturated bound instead"
        )
    shared: dict[str, FloatArray] = {}
    sources: list[SourceEntry] = []
    for each in gas.dead_volumes:
        T = (
            np.maximum(temperature, COLDEST_VAPOUR)
            if each.temperature == "cell"
            else np.full(np.shape(temperature), _kelvin(each.temperature))
        )
        held = _density(T, pressure, isotope, temperature) * each.volume.si
        total = total + held
        if each.volume.si_uncertainty:
            entry = SourceEntry(
                name=f"dead volume {each.name}, {each.volume.format()}",
                description="stated dead volume",
                level="cell",
                stated=Value(
                    value=each.volume.si,
                    uncertainty=each.volume.si_uncertainty,
                    unit=each.volume.si_unit,
                ),
            )
            sources.append(entry)
            shared[entry.name] = np.where(np.isnan(held), 0.0, held) * (
                each.volume.si_uncertainty / each.volume.si
            )
    total = np.where(np.isnan(temperature), np.nan, total)
    if pressure is None:
        entry = SourceEntry(
            name=f"vapour between none and saturation in {gas.cooldown}",
            description="no pressure was measured",
            level="run",
            distribution="rectangular",
        )
        shared = {name: part / 2 for name, part in shared.items()} | {
            entry.name: np.where(np.isnan(total), 0.0, total) / math.sqrt(12)
        }
        sources.append(entry)
        total = total / 2
    facts["treatment"] = (
        "taken at the measured pressure and subtracted"
        if pressure is not None
        else "taken as half of what saturation allows and subtracted"
    )
    return Outcome({"vapour": total}, shared={"vapour": shared}, sources=tuple(sources), facts=facts)


def _kelvin(temperature: Quantity | str) -> float:
    assert isinstance(temperature, Quantity)  # noqa: S101 - the only text is "cell"
    return temperature.si


def _density(
    T: FloatArray, pressure: FloatArray | None, isotope: Literal["3He", "4He"], cell: FloatArray
) -> FloatArray:
    known = np.isfinite(T) & (np.isfinite(pressure) if pressure is not None else np.isfinite(cell))
    density = np.full(T.shape, np.nan)
    if not known.any():
        return density
    if pressure is not None:
        # Below zero is noise of the gauge about no gas at all.
        density[known] = molar_density(np.maximum(pressure[known], 0.0), T[known], isotope=isotope)
        return density
    if isotope != "4He":
        raise ValueError(
            "pressure: without a measured one the bound is that of saturated 4He, and the gas is 3He"
        )
    cold = np.maximum(cell[known], COLDEST_VAPOUR)
    saturated = np.asarray(saturated_molar_density(cold))
    # A warmer volume holds less at the same pressure, in proportion to the temperatures to first order.
    density[known] = saturated * np.minimum(cold / T[known], 1.0)
    return density


def coverage_from_amount(
    _: NoParameters,
    *,
    amount: float | FloatArray,
    vapour: FloatArray | None,
    area: float | None,
    specific_area: float | None,
    mass: float | None,
) -> Outcome:
    """Return the coverage: amount that is not vapour, over the area.

    Raises
    ------
    ValueError
        No area, or an area that is not positive.
    """
    facts: dict[str, object] = {}
    if area is None and specific_area is not None and mass is not None:
        area = specific_area * mass
        facts["area"] = f"{area:.4g} m^2 (specific area times mass)"
    if area is None:
        raise ValueError("area: found none, expected the substrate's area, or its specific area and mass")
    if not area > 0:
        raise ValueError(f"area: found {area} m^2, expected > 0")
    film = amount - (vapour if vapour is not None else 0.0)
    share = 0.0
    if vapour is not None and np.isfinite(vapour).any():
        share = float(np.nanmax(np.asarray(vapour) / np.where(np.asarray(amount) > 0, amount, np.nan)))
    what = "the amount" if vapour is None else "the amount that is not vapour"
    facts |= {"largest_vapour_share": share, "what": what}
    return Outcome({"coverage": film / area}, facts=facts)


def layers_from_coverage(
    _: NoParameters, *, coverage: float | FloatArray, layer: float, substrate: Substrate | None
) -> Outcome:
    """Return the coverage in layers of the substrate's own definition."""
    if not layer > 0:
        raise ValueError(f"layer: found {layer} mol/m^2, expected > 0")
    definition = substrate.layer_definition if substrate is not None else None
    return Outcome({"layers": coverage / layer}, facts={"definition": definition or "not recorded"})


def thickness_from_coverage(parameters: ThicknessParameters, *, coverage: float | FloatArray) -> Outcome:
    """Return the film thickness: inner layers as stated, the rest as bulk liquid 4He.

    Notes
    -----
    d = d_inner + (n - n_inner) M/rho with rho = 145.14 kg/m^3. Below n_inner it is not defined (NaN).
    """
    rest = np.asarray(coverage, dtype=np.float64) - parameters.inner_coverage_umol_m2 * 1e-6
    thickness = parameters.inner_thickness_nm * 1e-9 + rest * MOLAR_MASS_HELIUM4 / LIQUID_DENSITY
    result = np.where(rest >= 0, thickness, np.nan)
    return Outcome({"thickness": result if result.ndim else float(result)})
