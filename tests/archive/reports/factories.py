"""Small documents of an invented laboratory, from which views are made without any other part of the archive."""

from __future__ import annotations

import hashlib
import json
from datetime import UTC, datetime, timedelta
from typing import Any

import numpy as np

from archive.errors import UnknownAddress
from archive.reports import CooldownView
from schemas.lineage import AccessionDocument, ReductionDocument

__all__ = ["accession", "film_view", "finding", "reduction", "sheet", "view_of"]

BEGIN = datetime(2026, 3, 2, 7, 10, tzinfo=UTC)
SOFTWARE = {"stillroom": "0.1.0", "python": "3.11", "platform": "any", "packages": {}}
NAME = "2026-03"


def digest(*parts: object) -> str:
    """Return a SHA-256 that stands for some content."""
    return hashlib.sha256(json.dumps([str(part) for part in parts]).encode()).hexdigest()


def moment(hours: float = 0.0) -> str:
    """Return an instant of the invented cooldown."""
    return (BEGIN + timedelta(hours=hours)).isoformat()


def number(
    value: float | None, unit: str, uncertainty: float | None = None, scale: str | None = None
) -> dict[str, Any]:
    """Return a value with its unit."""
    return {"value": value, "uncertainty": uncertainty, "unit": unit, "scale": scale}


CELL = {
    "kind": "torsional-oscillator", "name": "TO-4", "revision": 2, "material": "beryllium copper", "seal": "indium", "shape": "cylinder", "substrate": "MYL-1",
    "free_volume": "0.45(5) cm^3", "closable_volume": "2.0(1) cm^3", "closing_valve": "V7", "rod_material": "BeCu", "rod": "12 mm long, aged 2 h at 315 C",
    "inertia": "5.00(5)e-7 kg m^2", "empty_period": "1.003214(1) ms", "empty_quality_factor": "3.97(4)e5", "mass_sensitivity": "112.8(1.2) ns/mmol",
    "rim_radius": "7.5 mm", "mode": "antisymmetric torsion",
}  # fmt: skip
SUBSTRATE = {
    "name": "MYL-1", "revision": 1, "material": "polyimide film", "form": "stack of 240 discs", "mass": "4.14(4) g", "area": "1.604(32) m^2",
    "area_method": "N2 at 77.3 K", "outgassing": "48 h at 350 K", "preplating": "none", "layer": "12.97(13) umol/m^2", "layer_definition": "two-thirds power of the liquid density",
}  # fmt: skip
SAMPLE = {
    "name": "He4-well",
    "revision": 1,
    "isotope": "4He",
    "helium3_fraction": "0.20(5) ppm",
    "gas_source": "bottle 17 through a trap at 77 K",
}
THERMOMETER = {
    "kind": "ruthenium-oxide",
    "name": "RX-2",
    "revision": 1,
    "place": "base of the cell",
    "excitation": "10 uV rms",
}
CALIBRATION = {
    "name": "RX-2-cal", "revision": 1, "thermometer": "RX-2", "scale": "PLTS-2000", "date": "2026-01-22", "against": "melting curve cell MC-1", "reading_unit": "Ohm",
    "relation": {"form": "log-polynomial", "centre": 7.0, "coefficients": [0.1, -1.0]}, "temperature_low": "15 mK", "temperature_high": "1.0 K", "relative_uncertainty": 1e-3,
}  # fmt: skip
CRYOSTAT = {
    "name": "DR-1",
    "revision": 1,
    "kind": "dilution",
    "frequency_reference": "rubidium standard, 1e-10 over a week",
    "site_contact": "cryogenics technician",
}


def channels() -> dict[str, Any]:
    """Return the channels of the invented program."""
    return {
        "time": {"column": 1, "quantity": "instant"},
        "temperature": {"column": 2, "quantity": "temperature", "unit": "K", "scale": "PLTS-2000"},
        "period": {"column": 3, "quantity": "period", "unit": "s"},
    }


def sweep_name(number_: int) -> str:
    """Return the name of the n-th sweep."""
    return f"s{number_:03d}"


def sheet(sweeps: int = 2, **changes: Any) -> dict[str, Any]:
    """Return a sheet with some temperature sweeps."""
    said: dict[str, Any] = {
        "format": "stillroom-cooldown/1", "name": NAME, "cryostat": "DR-1", "begin": moment(-24), "end": moment(24 * 30), "time_zone": "Europe/Helsinki",
        "operators": ["graduate student"], "purpose": "Follow the transition with coverage.", "outcome": "complete", "next_step": "repeat two coverages",
        "temperature_scale": "PLTS-2000", "cell": "TO-4", "sample": "He4-well", "licence": "CC0-1.0", "layout": {"counter": {"channels": channels()}},
        "detection": {
            "torque_exponent": 1, "signal_exponent": 1, "amplitude_convention": "rms", "bias": "200 V", "reference_rim_velocity": "0.180(10) mm/s peak", "reference_signal": "1.50(2) mV rms",
        },
        "doser": [{"name": "D1", "volume": "25.046(20) cm^3", "how": "weighed with water"}],
        "gauge": [{"name": "G1", "range": "10 Torr", "zero": "0.01474(38) Torr", "calibration": "works certificate 2023"}],
        "dose": [{"name": "d01", "at": moment(1), "amount": "50.4(5) umol", "annealing": "40 min at 0.8 K"}],
        "gas_end": {"state": "recovered", "valve": "V7 open to the ballast", "valve_open": True},
        "sweep": [
            {"name": sweep_name(k), "kind": "temperature-sweep", "files": [f"raw/{sweep_name(k)}.csv"], "layout": "counter", "after_dose": "d01", "direction": "up", "thermometer": "temperature"}
            for k in range(1, sweeps + 1)
        ],
        "effect": [
            {"effect": "self-heating", "state": "bounded", "bound": "0.05 mK at 20 mK", "reason": "bridge power halved at base"},
            {"effect": "slip", "state": "not-applicable", "reason": "film, no bulk liquid"},
            {"effect": "sensor-film offset", "state": "considered", "reason": "sensor on the base of the cell"},
            {"effect": "elasticity of contents and of cell", "state": "considered", "reason": "small amounts"},
            {"effect": "drift of the resonance", "state": "considered", "reason": "each run is aligned"},
        ],
    }  # fmt: skip
    return {**said, **changes}


def channel(sweep: str, name: str, quantity: str, unit: str, **changes: Any) -> dict[str, Any]:
    """Return a stored channel."""
    return {
        "name": name,
        "quantity": quantity,
        "unit": unit,
        "ucum": unit,
        "description": "",
        "digest": digest(sweep, name),
        **changes,
    }


def entry(said: dict[str, Any], number_: int) -> dict[str, Any]:
    """Return what was stored of one sweep of a sheet."""
    name = said["name"]
    return {
        "name": name, "kind": said["kind"], "files": said["files"], "rows": 60, "cell": "TO-4.r2", "substrate": "MYL-1.r1", "sample": "He4-well.r1", "after_dose": said.get("after_dose"),
        "begin": moment(10 * number_), "end": moment(10 * number_ + 6), "direction": said.get("direction", "none"), "thermometers": ["RX-2.r1"],
        "channels": [
            channel(name, "time", "instant", "s"), channel(name, "temperature", "temperature", "K", scale="PLTS-2000", thermometer="RX-2.r1", calibration="RX-2-cal.r1"),
            channel(name, "period", "period", "s"),
        ],
        "temperature_low": number(0.02, "K", scale="PLTS-2000"), "temperature_high": number(0.9, "K", scale="PLTS-2000"),
        "amount": number(5.04e-5, "mol", 5e-7), "coverage": number(3.142e-5, "mol/m^2", 6.3e-7),
    }  # fmt: skip


def records(**replaced: dict[str, Any]) -> list[dict[str, Any]]:
    """Return the records of the laboratory; `cell={...}` changes fields, None takes one away."""
    each = {
        "cell": CELL,
        "substrate": SUBSTRATE,
        "sample": SAMPLE,
        "thermometer": THERMOMETER,
        "calibration": CALIBRATION,
        "cryostat": CRYOSTAT,
    }
    made = []
    for kind, content in each.items():
        changed = {
            name: value for name, value in {**content, **replaced.get(kind, {})}.items() if value is not None
        }
        made.append(
            {
                "kind": kind,
                "address": f"{changed['name']}.r{changed['revision']}",
                "digest": digest(kind, changed),
                "content": changed,
            }
        )
    return made


def finding(
    code: str = "rod-below-200-mk", place: str = "s001", *, waived: bool = False, **changes: Any
) -> dict[str, Any]:
    """Return a warning, waived or open."""
    waiver = {
        "check": code,
        "place": place,
        "reason": "The drive sweeps show no dependence.",
        "role": "postdoc",
        "date": "2026-04-22",
    }
    return {
        "code": code,
        "severity": "warning",
        "what": f"{place} goes below 0.2 K",
        "place": place,
        "waived": waiver if waived else None,
        **changes,
    }


def accession(said: dict[str, Any] | None = None, **changes: Any) -> AccessionDocument:
    """Return an accession of a sheet."""
    said = sheet() if said is None else said
    told = {
        "format": "stillroom-accession/1", "address": f"{said['name']}.a1", "cooldown": said["name"], "number": 1, "accessioned": moment(24 * 40), "sheet": said, "sheet_file": "cooldown.toml",
        "records": records(), "sweeps": [entry(each, number_) for number_, each in enumerate(said["sweep"], 1)],
        "doses": [
            {"name": "d01", "at": moment(1), "act": "add", "counted": True, "amount": number(5.04e-5, "mol", 5e-7), "running_amount": number(5.04e-5, "mol", 5e-7),
             "running_coverage": number(3.142e-5, "mol/m^2", 6.3e-7), "method": "as stated"},
        ],
        "raw_files": [{"name": each["files"][0], "sha256": digest(each["files"]), "size": 1234, "role": "sweep"} for each in said["sweep"]],
        "cautions": [
            {"subject": "trapped gas in TO-4.r2", "state": "caution", "missing": [], "text": "0.05 mmol of helium is recorded in TO-4. Ask cryogenics technician before warming.",
             "formula": "p = n R T/V", "numbers": {"amount": {"value": 5.04e-5, "unit": "mol"}}, "rating": "no rating recorded"},
        ],
        "software": SOFTWARE,
    }  # fmt: skip
    return AccessionDocument.model_validate_json(json.dumps({**told, **changes}))


def reduction(
    sweep: str = "s001",
    number_: int = 1,
    *,
    value: float = 0.73124,
    uncertainty: float = 0.00119,
    order: float = 2,
    **changes: Any,
) -> ReductionDocument:
    """Return a reduction to an areal density and a transition temperature."""
    address = f"{NAME}/{sweep}@film-transition.{number_}"
    plan = {
        "name": "film-transition", "revision": 1, "title": "Superfluid transition of a flat film", "headline": ["T_KT"],
        "applies": {"sweep_kinds": ["temperature-sweep"]},
        "step": [{"use": "superfluid-density", "take": {"period": "channel:period"}, "give": {"superfluid_density": "superfluid_density"}}, {"use": "static-transition", "take": {"crossing": "superfluid_density"}, "give": {"transition_temperature": "T_KT"}}],
    }  # fmt: skip
    text = f"{value:.5f}"
    told = {
        "format": "stillroom-reduction/1", "address": address, "cooldown": NAME, "sweep": f"{NAME}/{sweep}", "number": number_, "plan": plan, "plan_digest": digest(plan),
        "inputs": [{"address": f"{NAME}/{sweep}#period", "role": "period", "digest": digest(sweep, "period")}, {"address": "RX-2-cal.r1", "role": "calibration", "digest": digest("calibration")}],
        "steps": [
            {"number": 1, "name": "superfluid-density", "version": 1, "sentence": "The areal superfluid mass is the period drop over 1.0581e+09 ns m^2/kg.", "parameters": {"order": order, "drag_factor": None},
             "inputs": {"period": {"address": f"{NAME}/{sweep}#period", "role": "period", "digest": digest(sweep, "period")}}, "outputs": ["temperature", "superfluid_density"],
             "citations": ["bishop-reppy-1980"], "effects": {"remounting shift": "A constant shift is removed by the alignment."}, "begin": moment(900), "end": moment(900)},
            {"number": 2, "name": "static-transition", "version": 1, "sentence": f"The crossing lies at {text} K with b = {order} held.", "parameters": {"b": order},
             "inputs": {"crossing": {"address": f"{address}#superfluid_density", "role": "areal density"}}, "outputs": ["T_KT"], "citations": ["nelson-kosterlitz-1977", "ahns-1980"],
             "begin": moment(900), "end": moment(900)},
        ],
        "outputs": [
            {"name": "temperature", "quantity": "temperature", "unit": "K", "description": "temperature of each row", "step": 1, "rows": 60, "scale": "PLTS-2000", "digest": digest(address, "T")},
            {"name": "superfluid_density", "quantity": "areal_mass_density", "unit": "kg/m^2", "description": "areal superfluid density", "step": 1, "rows": 60, "digest": digest(address, "sigma", order)},
            {"name": "T_KT", "quantity": "temperature", "unit": "K", "description": "static transition temperature", "step": 2, "scale": "PLTS-2000", "value": value, "uncertainty": uncertainty,
             "point": uncertainty * 0.6, "shared": {"RX-2-cal.r1": uncertainty * 0.8}, "digest": digest(address, "T_KT", value)},
        ],
        "sources": [{"name": "RX-2-cal.r1", "description": "calibration", "level": "laboratory", "address": "RX-2-cal.r1"}],
        "begin": moment(900), "end": moment(900), "software": SOFTWARE,
    }  # fmt: skip
    return ReductionDocument.model_validate_json(json.dumps({**told, **changes}))


def stored(address: str, name: str) -> np.ndarray:
    """Return invented values: a film that loses its superfluid near 0.73 K."""
    T = np.linspace(0.02, 0.9, 60)
    sigma = np.where(T < 0.74, 4e-8 * (1 - (T / 0.9) ** 4), 0.0)
    known = {
        "time": BEGIN.timestamp() + 360.0 * np.arange(60), "temperature": T, "period": 1.003e-3 + 1e-9 * T - 0.1 * sigma, "superfluid_density": sigma,
        "superfluid_density.point": np.full(60, 1e-10), "superfluid_density.uncertainty": np.full(60, 1e-9),
    }  # fmt: skip
    if name not in known:
        raise UnknownAddress(f"there are no values {address}#{name}")
    return known[name]


def view_of(*accessions: AccessionDocument, reductions: tuple[ReductionDocument, ...] = ()) -> CooldownView:
    """Return a view of documents, everything sealed."""
    keys = [f"{each.cooldown}/{each.address}" for each in accessions] + [each.address for each in reductions]
    return CooldownView(
        archive_name="basement", accessions=accessions, sealed={key: (digest(key), 4321) for key in keys}, reductions=reductions, values=stored,
        check_titles={"rod-below-200-mk": "a beryllium copper rod in the cold is tested at two drives"},
    )  # fmt: skip


def film_view(
    sweeps: int = 2,
    *,
    record: dict[str, dict[str, Any]] | None = None,
    findings: list[dict[str, Any]] | None = None,
    said: dict[str, Any] | None = None,
    **reduced: Any,
) -> CooldownView:
    """Return a view of one cooldown whose first sweep is reduced."""
    document = accession(
        sheet(sweeps, **(said or {})), records=records(**(record or {})), findings=findings or []
    )
    return view_of(document, reductions=(reduction(**reduced),))
