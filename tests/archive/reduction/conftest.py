"""A small laboratory in memory: one invented oscillator, its empty cell, a dose run, and two films with known truth.

The forward model is the dynamic theory of `archive.physics.film_dynamic`; noise comes from a seeded generator.
"""

from __future__ import annotations

import json
import math
from dataclasses import dataclass, field
from datetime import UTC, datetime, timedelta
from typing import Any, ClassVar

import numpy as np
import pytest
from pydantic import TypeAdapter

from archive.errors import UnknownAddress
from archive.physics import film_dynamic
from archive.physics.constants import MOLAR_MASS_HELIUM4
from archive.physics.helium_gas import amount_of_gas
from archive.reduction.digest import array_digest, record_digest
from archive.reduction.outputs import estimate_from
from archive.reduction.planning import shipped_plans
from archive.reduction.runner import run
from schemas.cooldown import CooldownSheet
from schemas.lineage import AccessionDocument, AnyRecord, ChannelEntry, RecordEntry, SweepEntry
from schemas.units import ucum
from tests.relative import relative_tolerances

__all__ = ["relative_tolerances"]

T_KT, B, LOG_D, CHI, AREA = 0.6, 5.5, 20.9, 0.10, 1.5
PERIOD, SLOPE = 1e-3, 0.042 * MOLAR_MASS_HELIUM4 / 1.5
U_PERIOD, U_LOSS = 3e-12, 2e-9
ONSET = 45e-6
BEGIN = datetime(2026, 3, 2, 9, 0, tzinfo=UTC)


class Clock:
    """A clock that advances by one second with every look."""

    def __init__(self) -> None:
        self.now = datetime(2026, 4, 1, tzinfo=UTC)

    def __call__(self) -> datetime:
        """Return the time."""
        self.now += timedelta(seconds=1)
        return self.now


@dataclass
class MemorySource:
    """What a reduction reads from, in dictionaries."""

    documents: dict[str, list[AccessionDocument]] = field(default_factory=dict)
    columns: dict[tuple[str, str, str], np.ndarray] = field(default_factory=dict)
    records: dict[str, Any] = field(default_factory=dict)
    done: list[Any] = field(default_factory=list)

    def cooldowns(self) -> list[str]:
        """Return the names of the cooldowns."""
        return list(self.documents)

    def accessions(self, cooldown: str) -> list[AccessionDocument]:
        """Return the accessions of a cooldown."""
        return self.documents.get(cooldown, [])

    def column(self, accession_address: str, sweep_name: str, channel: str) -> np.ndarray:
        """Return a channel as stored."""
        return self.columns[(accession_address, sweep_name, channel)]

    def record(self, address: str) -> AnyRecord:
        """Return a record."""
        if address not in self.records:
            raise UnknownAddress(f"there is no record {address}")
        return self.records[address]

    def reductions(self, plan: str, sweep_address: str) -> list[Any]:
        """Return the reductions of a plan on a sweep."""
        return [
            each.document
            for each in self.done
            if each.document.plan.name == plan and each.document.sweep == sweep_address
        ]

    def reduction(self, address: str) -> Any:
        """Return a reduction's document."""
        return self._outcome(address).document

    def output(self, reduction_address: str, name: str) -> Any:
        """Return an output of a reduction."""
        outcome = self._outcome(reduction_address)
        return estimate_from(outcome.document, lambda path: outcome.arrays[path][0], name)

    def grounds(self, sweep_address: str) -> dict[str, Any]:
        """Return that nothing is read otherwise than the sheet says."""
        return {}

    def digest(self, address: str) -> str:
        """Return the digest of a record."""
        return record_digest(self.records[address])

    def _outcome(self, address: str) -> Any:
        for each in self.done:
            if each.document.address == address:
                return each
        raise UnknownAddress(f"there is no reduction {address}")

    def reduce(self, plan: str, sweep: str, *, number: int = 1, clock: Any = None) -> Any:
        """Return a shipped plan carried out on a sweep, and remember it."""
        chosen = next(each for each in shipped_plans() if each.name == plan)
        outcome = run(chosen, sweep, self, number=number, clock=clock or Clock())
        self.done.append(outcome)
        return outcome


def _record(content: dict[str, Any], kind: str) -> Any:
    sheet = CooldownSheet.model_fields["record"].annotation
    parsed = TypeAdapter(sheet).validate_json(json.dumps({kind: [content]}))
    return getattr(parsed, kind)[0]


def lab_records() -> dict[str, Any]:
    """Return the invented long-lived things."""
    fridge = {"name": "fridge", "revision": 1, "kind": "dilution"}
    cell = {
        "name": "TO-1", "revision": 1, "kind": "torsional-oscillator", "rod_material": "BeCu", "rim_radius": "7.5 mm",
        "torsion_constant": "19.73921 N m/rad", "inertia": "5.00(5) g cm^2", "gyration_radius_squared": "2.80(3)e-5 m^2", "substrate": "disc.r1",
    }  # fmt: skip
    substrate = {
        "name": "disc", "revision": 1, "material": "polyimide film", "area": f"{AREA:.2f}(3) m^2", "layer": "13.0 umol/m^2",
        "layer_definition": "bulk liquid density to the power two thirds",
    }  # fmt: skip
    sample = {"name": "gas", "revision": 1, "isotope": "4He", "gas_source": "cylinder, invented"}
    thermometer = {"name": "RX-1", "revision": 1, "kind": "ruthenium-oxide", "place": "cell"}
    calibration = {
        "name": "RX-1-cal", "revision": 1, "thermometer": "RX-1.r1", "scale": "PLTS-2000", "date": "2026-01-05", "against": "an invented reference",
        "reading_unit": "kOhm", "relation": {"form": "log-polynomial", "centre": 0.0, "coefficients": [3.0, -3.0]},
        "temperature_low": "0.05 K", "temperature_high": "1.2 K", "uncertainty": "0.5 mK",
    }  # fmt: skip
    content = {
        "cryostat": fridge, "cell": cell, "substrate": substrate, "sample": sample, "thermometer": thermometer, "calibration": calibration,
    }  # fmt: skip
    found = [_record(each, kind) for kind, each in content.items()]
    return {each.address: each for each in found}


def reading(temperature: np.ndarray) -> np.ndarray:
    """Return the thermometer's resistance in kOhm: ln T = 3 - 3 ln R."""
    return np.exp((3.0 - np.log(temperature)) / 3.0)


def film(temperature: np.ndarray, transition: float) -> tuple[np.ndarray, np.ndarray]:
    """Return period drop (s) and added dissipation of a film, without noise."""
    L = LOG_D - math.log(2 * math.pi / PERIOD)
    stiffness = film_dynamic.complex_stiffness(
        film_dynamic.fixed_start(temperature / transition, b=B), L=L, F=1.0
    )
    density = film_dynamic.dynamic_areal_density(temperature, stiffness)
    per_density = 0.042 * (1 - CHI)
    return per_density * density.real, -2 * per_density / PERIOD * density.imag


def empty(temperature: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return period and dissipation of the empty cell."""
    return PERIOD + 2e-9 * temperature**2 - 1e-9 * temperature, 2e-6 + 3e-7 * temperature


def _dose(k: int) -> dict[str, Any]:
    return {
        "name": f"d{k:02d}", "at": (BEGIN + timedelta(hours=k)).isoformat(), "act": "add", "doser": "V1", "gauge": "G1",
        "pressure_before": "1000.0 Pa", "pressure_after": "700.0 Pa", "temperature_before": "295.0(3) K",
    }  # fmt: skip


DOSES = 16
DOSE = float(amount_of_gas(1000.0, 50e-6, 295.0) - amount_of_gas(700.0, 50e-6, 295.0))


def _layout() -> dict[str, Any]:
    return {
        "channels": {
            "resistance": {"column": "R", "quantity": "resistance", "unit": "kOhm", "uncertainty": "0.003 %", "thermometer": "RX-1", "calibration": "RX-1-cal"},
            "period": {"column": "P", "quantity": "period", "unit": "ms", "uncertainty": "3 ps"},
            "dissipation": {"column": "Q", "quantity": "dissipation", "unit": "1", "uncertainty": "2e-9"},
        }
    }  # fmt: skip


def sheet_content() -> dict[str, Any]:
    """Return the sheet of the invented cooldown as plain data."""
    common = {"layout": "sweep", "cell": "TO-1", "thermometer": "resistance"}
    run_channels = {
        "at": {"column": "t", "quantity": "instant"}, "period": {"column": "P", "quantity": "period", "unit": "ms", "uncertainty": "3 ps"},
    }  # fmt: skip
    return {
        "format": "stillroom-cooldown/1", "name": "2026-03", "cryostat": "fridge", "begin": BEGIN.isoformat(), "end": (BEGIN + timedelta(days=20)).isoformat(),
        "time_zone": "Europe/Helsinki", "operators": ["graduate student"], "purpose": "test", "outcome": "complete", "temperature_scale": "PLTS-2000",
        "cell": "TO-1", "sample": "gas", "layout": {"sweep": _layout()},
        "gauge": [{"name": "G1", "range": "1 bar", "zero": "2.0(1) Pa", "uncertainty": "0.2 Pa", "relative_uncertainty": 0.001}],
        "doser": [{"name": "V1", "volume": "50.0(1) cm^3", "how": "invented"}],
        "dead_volume": [{"name": "cell", "volume": "0.50(5) cm^3", "temperature": "cell"}],
        "dose": [_dose(k) for k in range(1, DOSES + 1)], "gas_end": {"state": "recovered"},
        "sweep": [
            {"name": "e1", "kind": "temperature-sweep", "files": ["e1.csv"], "empty_cell": True, **common},
            {"name": "r1", "kind": "dose-run", "files": ["r1.csv"], "cell": "TO-1", "channels": run_channels, "doses": [f"d{k:02d}" for k in range(1, DOSES + 1)]},
            {"name": "f1", "kind": "temperature-sweep", "files": ["f1.csv"], "after_dose": f"d{DOSES:02d}", **common},
            {"name": "f2", "kind": "temperature-sweep", "files": ["f2.csv"], "after_dose": f"d{DOSES:02d}", **common},
        ],
    }  # fmt: skip


def sweep_data(seed: int = 1) -> dict[str, dict[str, np.ndarray]]:
    """Return the columns of every sweep, in the units of the files."""
    random = np.random.default_rng(seed)
    data: dict[str, dict[str, np.ndarray]] = {}
    for name, transition, low, high, rows in (
        ("e1", None, 0.1, 1.1, 400),
        ("f1", T_KT, 0.3, 0.9, 2400),
        ("f2", 0.5, 0.25, 0.8, 2400),
    ):
        T = np.linspace(low, high, rows)
        period, loss = empty(T)
        if transition is not None:
            drop, added = film(T, transition)
            period, loss = period + SLOPE * DOSES * DOSE - drop, loss + added
        noise_P, noise_Q = random.normal(0, U_PERIOD, rows), random.normal(0, U_LOSS, rows)
        resistance = reading(T) * (1 + 3e-5 * random.normal(size=rows))
        data[name] = {
            "resistance": resistance,
            "period": (period + noise_P) * 1e3,
            "dissipation": loss + noise_Q,
        }
    hours = np.arange(0, DOSES + 1)
    n = hours * DOSE
    P = (
        PERIOD
        + SLOPE * np.minimum(n, ONSET)
        + CHI * SLOPE * np.maximum(n - ONSET, 0)
        + random.normal(0, U_PERIOD, n.size)
    )
    at = np.array([(BEGIN + timedelta(hours=int(k), minutes=30)).timestamp() for k in hours])
    data["r1"] = {"at": at, "period": P * 1e3}
    return data


def build(
    content: dict[str, Any] | None = None, data: dict[str, dict[str, np.ndarray]] | None = None
) -> MemorySource:
    """Return the laboratory of a sheet and its columns."""
    content = content or sheet_content()
    data = data or sweep_data()
    records = lab_records()
    sheet = CooldownSheet.model_validate_json(json.dumps(content))
    entries = []
    for sweep in sheet.sweep:
        channels = []
        for name, channel in sheet.channels_of(sweep).items():
            values = data[sweep.name][name]
            unit = "s" if channel.quantity == "instant" else (channel.unit or "")
            known = values[np.isfinite(values)]
            channels.append(
                ChannelEntry(
                    name=name, quantity=channel.quantity, unit=unit, ucum=ucum(unit) if unit else "", description="", scale=channel.scale,
                    thermometer="RX-1.r1" if channel.thermometer else None, calibration="RX-1-cal.r1" if channel.calibration else None,
                    low=float(known.min()), high=float(known.max()), use=channel.use, digest=array_digest(values),
                )
            )  # fmt: skip
        entries.append(
            SweepEntry(
                name=sweep.name, kind=sweep.kind, files=sweep.files, rows=channels_rows(data[sweep.name]), first_lines=dict.fromkeys(sweep.files, 2),
                channels=tuple(channels), cell="TO-1.r1" if sweep.cell else None, substrate="disc.r1" if sweep.cell else None,
                sample="gas.r1", empty_cell=sweep.empty_cell, after_dose=sweep.after_dose, doses=sweep.doses,
            )
        )  # fmt: skip
    kinds = {
        "fridge.r1": "cryostat",
        "TO-1.r1": "cell",
        "disc.r1": "substrate",
        "gas.r1": "sample",
        "RX-1.r1": "thermometer",
        "RX-1-cal.r1": "calibration",
    }
    document = AccessionDocument.model_validate(
        {
            "format": "stillroom-accession/1", "address": "2026-03.a1", "cooldown": "2026-03", "number": 1, "accessioned": BEGIN, "sheet": sheet,
            "sheet_file": "cooldown.toml", "sweeps": tuple(entries),
            "records": tuple(RecordEntry(kind=kinds[a], address=a, digest=record_digest(r), content=r.model_dump(mode="json")) for a, r in records.items()),
            "raw_files": tuple({"name": f"{s.name}.csv", "sha256": f"{k:064x}", "size": 10, "role": "sweep"} for k, s in enumerate(sheet.sweep)),
            "software": {"stillroom": "0", "python": "3", "platform": "test", "packages": {}},
        }
    )  # fmt: skip
    source = MemorySource({"2026-03": [document]}, records=records)
    for sweep_name, columns in data.items():
        for name, values in columns.items():
            source.columns[("2026-03.a1", sweep_name, name)] = values
    return source


def channels_rows(columns: dict[str, np.ndarray]) -> int:
    """Return the number of rows of a sweep."""
    return int(next(iter(columns.values())).size)


@pytest.fixture
def laboratory() -> MemorySource:
    """Return a laboratory with nothing reduced."""
    return build()


@pytest.fixture(scope="session")
def reduced() -> MemorySource:
    """Return a laboratory with the empty cell, the dose run and two films reduced."""
    source = build()
    source.reduce("empty-cell", "2026-03/e1")
    source.reduce("dose-run", "2026-03/r1")
    source.reduce("film-transition", "2026-03/f1")
    source.reduce("film-transition", "2026-03/f2")
    return source


@pytest.fixture(scope="session")
def tools() -> Any:
    """Return the builders of this file, for tests that change the sheet or the data."""

    class Tools:
        build = staticmethod(build)
        sheet_content = staticmethod(sheet_content)
        sweep_data = staticmethod(sweep_data)
        empty = staticmethod(empty)
        reading = staticmethod(reading)
        Clock = Clock
        truth: ClassVar = {"T_KT": T_KT, "chi": CHI, "slope": SLOPE, "onset": ONSET, "dose": DOSE}

    return Tools
