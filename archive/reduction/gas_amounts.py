"""Amounts of the doses of a cooldown, with every uncertainty that the sheet states.

One place for the step, the ledger and the checks. A dose is V (rho(p1, T1) - rho(p2, T2)) with the second virial
coefficient; a dose crossed out does not count; what is removed or recovered is negative.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Literal, TypeVar

import numpy as np

from archive.physics.helium_gas import molar_density
from archive.reduction.estimate import Estimate
from archive.reduction.facts import GasBook
from schemas.gas import Dose, Doser, Gauge
from schemas.lineage import SourceEntry, Value
from schemas.quantity import Quantity
from schemas.substrate import Sample

__all__ = ["DoseAmount", "dose_amounts", "helium_isotope"]

_Thing = TypeVar("_Thing", Doser, Gauge)

METHOD = "V (rho(p1) - rho(p2)), p = R T (rho + B rho^2)"


@dataclass(frozen=True)
class DoseAmount:
    """One dose with its signed amount.

    Attributes
    ----------
    dose : Dose
    counted : bool
    amount : Estimate
        mol, negative when gas was taken out; what it would have been, for a dose that does not count.
    method : str
    """

    dose: Dose
    counted: bool
    amount: Estimate
    method: str


@dataclass
class _Terms:
    """Stated numbers of one dose with their sources."""

    values: dict[str, float] = field(default_factory=dict)
    sources: dict[str, tuple[SourceEntry, dict[str, float]]] = field(default_factory=dict)

    def add(self, term: str, quantity: Quantity, source: SourceEntry, spread: float | None = None) -> None:
        """Note a stated value and its uncertainty under a source."""
        self.values[term] = quantity.si
        u = spread if spread is not None else quantity.si_uncertainty
        if u:
            stated = Value(value=quantity.si, uncertainty=u, unit=quantity.si_unit, scale=quantity.scale)
            source = source.model_copy(update={"stated": stated})
            self.sources.setdefault(source.name, (source, {}))[1][term] = u


def helium_isotope(sample: Sample | None) -> Literal["3He", "4He"]:
    """Return the isotope whose virial coefficient counts.

    Raises
    ------
    ValueError
        The sample is not recorded, or is no pure helium.
    """
    if sample is None:
        raise ValueError("sample: the gas of the run is not recorded; name the sample in the sheet")
    if sample.isotope == "4He" or sample.isotope == "3He":  # noqa: PLR1714 - narrows the type
        return sample.isotope
    raise ValueError(f"sample: found {sample.isotope} ({sample.address}), expected 4He or 3He")


def dose_amounts(book: GasBook, sample: Sample | None) -> tuple[list[DoseAmount], dict[str, SourceEntry]]:
    """Return the signed amount of every dose of a cooldown, in order of time, and the sources of uncertainty.

    Parameters
    ----------
    book : GasBook
    sample : Sample or None
        Gas of the run.

    Raises
    ------
    ValueError
        A dose that names a doser or gauge the sheet does not have, a gauge pressure, or gas whose properties are not known.
    """
    sources: dict[str, SourceEntry] = {}
    found = [_dose_amount(book, dose, sample, sources) for dose in book.doses]
    return found, sources


def _dose_amount(
    book: GasBook, dose: Dose, sample: Sample | None, sources: dict[str, SourceEntry]
) -> DoseAmount:
    counted = dose.crossed_out is None
    if dose.amount is not None:
        terms = _Terms()
        stated = SourceEntry(
            name=f"amount of dose {dose.name} in {book.cooldown}",
            description=f"stated: {dose.amount.format()}",
            level="run",
            address=f"{book.cooldown}/{dose.name}",
        )
        terms.add("amount", dose.amount, stated)
        function: Callable[[Mapping[str, float]], float] = _stated_amount
        method = "as stated in the notebook"
    else:
        terms = _terms_of(book, dose)
        isotope = helium_isotope(sample)
        function, method = _metered(isotope), f"{METHOD}, B of {isotope}"
    outward = dose.act != "add"
    amount = _amount(terms, function, outward=outward)
    sources |= {name: source for name, (source, _) in terms.sources.items()}
    if not outward and not amount.value > 0:
        raise ValueError(
            f'dose {dose.name}: the pressures say that gas came out ({float(amount.value) * 1e6:.4g} umol); write act = "remove" or correct them'
        )
    return DoseAmount(dose, counted, amount, method)


def _amount(terms: _Terms, function: Callable[[Mapping[str, float]], float], *, outward: bool) -> Estimate:
    def signed(values: Mapping[str, float]) -> float:
        amount = function(values)
        return -abs(amount) if outward else amount

    shared: dict[str, np.ndarray[tuple[()], np.dtype[np.float64]]] = {}
    for name, (_, parts) in terms.sources.items():
        up = signed({term: value + parts.get(term, 0.0) for term, value in terms.values.items()})
        down = signed({term: value - parts.get(term, 0.0) for term, value in terms.values.items()})
        shared[name] = np.asarray((up - down) / 2)
    return Estimate(np.asarray(signed(terms.values)), "amount", shared=shared)


def _stated_amount(values: Mapping[str, float]) -> float:
    return values["amount"]


def _metered(isotope: Literal["3He", "4He"]) -> Callable[[Mapping[str, float]], float]:
    def amount(values: Mapping[str, float]) -> float:
        densities = [
            float(
                molar_density(
                    max(values["gain"] * (values[p] - values["zero"]), 0.0), values[T], isotope=isotope
                )
            )
            for p, T in (("p1", "T1"), ("p2", "T2"))
        ]
        return values["V"] * (densities[0] - densities[1])

    return amount


def _terms_of(book: GasBook, dose: Dose) -> _Terms:
    doser: Doser = _named(book.dosers, dose.doser, "doser", dose)
    gauge: Gauge | None = _named(book.gauges, dose.gauge, "gauge", dose) if dose.gauge is not None else None
    place = f"{book.cooldown}/{dose.name}"
    terms = _Terms({"zero": 0.0, "gain": 1.0})
    # Equal statements about a metering volume are one source, also from cooldown to cooldown.
    volume = SourceEntry(
        name=f"volume of doser {doser.name}, {doser.volume.format()}",
        description=doser.how,
        level="laboratory",
    )
    terms.add("V", doser.volume, volume)
    for term, pressure, word in (
        ("p1", dose.pressure_before, "before"),
        ("p2", dose.pressure_after, "after"),
    ):
        if pressure is None:
            raise ValueError(f"dose {dose.name}: pressure_{word} is missing")
        if pressure.convention == "gauge" or (gauge is not None and gauge.convention == "gauge"):
            raise ValueError(
                f"dose {dose.name}: pressure_{word} is a gauge pressure and the ambient pressure is not recorded; write absolute pressures"
            )
        own = pressure.si_uncertainty
        if own is None and gauge is not None and gauge.uncertainty is not None:
            own = gauge.uncertainty.si
        terms.add(
            term,
            pressure,
            SourceEntry(
                name=f"reading {word} {place}",
                description=f"pressure {word} dose {dose.name}",
                level="run",
                address=place,
            ),
            own,
        )
    before = dose.temperature_before
    if before is None:
        raise ValueError(f"dose {dose.name}: temperature_before is missing")
    warm = SourceEntry(
        name=f"temperature of doser {doser.name} in {book.cooldown}",
        description="temperature of the metering volume, common to all its doses",
        level="run",
    )
    terms.add("T1", before, warm)
    terms.add("T2", dose.temperature_after or before, warm)
    if gauge is not None:
        if gauge.zero is not None:
            terms.add(
                "zero",
                gauge.zero,
                SourceEntry(
                    name=f"zero of gauge {gauge.name} in {book.cooldown}",
                    description=f"stated: {gauge.zero.format()}",
                    level="run",
                ),
            )
        if gauge.relative_uncertainty is not None:
            entry = SourceEntry(
                name=f"gain of gauge {gauge.name} in {book.cooldown}",
                description=f"relative standard uncertainty {gauge.relative_uncertainty:.3g}",
                level="run",
                stated=Value(value=1.0, uncertainty=gauge.relative_uncertainty, unit="1"),
            )
            terms.sources[entry.name] = (entry, {"gain": gauge.relative_uncertainty})
    return terms


def _named(things: tuple[_Thing, ...], name: str | None, word: str, dose: Dose) -> _Thing:
    for each in things:
        if each.name == name:
            return each
    raise ValueError(f"dose {dose.name} names {word} {name!r}, and the sheet describes no such {word}")
