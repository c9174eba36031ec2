"""Small valid documents of an invented laboratory, and random ones."""

from __future__ import annotations

import hashlib
import json
from datetime import UTC, datetime, timedelta
from typing import Any

from hypothesis import strategies as st

from schemas.lineage import AccessionDocument, ReductionDocument

__all__ = ["accession", "archives", "channel", "entry", "number", "output", "record", "reduction", "sweep"]

BEGIN = datetime(2026, 3, 2, 7, 10, tzinfo=UTC)
SOFTWARE = {"stillroom": "0.1.0", "python": "3.11", "platform": "any", "packages": {}}


def digest(*parts: object) -> str:
    """SHA-256 that stands for some content."""
    return hashlib.sha256(json.dumps([str(part) for part in parts]).encode()).hexdigest()


def number(
    value: float | None, unit: str, *, uncertainty: float | None = None, scale: str | None = None
) -> dict[str, Any]:
    """Return a value with its unit."""
    return {"value": value, "uncertainty": uncertainty, "unit": unit, "scale": scale}


def moment(hours: float = 0.0) -> str:
    """Return an instant of the invented cooldown."""
    return (BEGIN + timedelta(hours=hours)).isoformat()


def channel(name: str = "period", **changes: Any) -> dict[str, Any]:
    """Return a channel of a sweep."""
    said = {
        "name": name,
        "quantity": "period",
        "unit": "s",
        "ucum": "s",
        "description": "Period of the bob.",
        "digest": digest("channel", name),
    }
    return {**said, **changes}


def sweep(name: str = "s017", **changes: Any) -> dict[str, Any]:
    """Return a temperature sweep over a film of 31.42 umol/m^2."""
    said = {
        "name": name,
        "kind": "temperature-sweep",
        "files": [f"{name}.csv"],
        "rows": 300,
        "channels": [
            channel(),
            channel(
                "temperature",
                quantity="temperature",
                unit="K",
                ucum="K",
                scale="ITS-90",
                description="Of the cell.",
            ),
        ],
        "cell": "TO-4.r2",
        "substrate": "PI-240.r1",
        "sample": "He-1.r1",
        "thermometers": ["GE-7.r1"],
        "begin": moment(1),
        "end": moment(3),
        "direction": "up",
        "temperature_low": number(0.5, "K", scale="ITS-90"),
        "temperature_high": number(1.2, "K", scale="ITS-90"),
        "amount": number(1.3e-3, "mol"),
        "coverage": number(31.42e-6, "mol/m^2", uncertainty=0.06e-6),
    }
    return {**said, **changes}


def record(address: str = "TO-4.r2", kind: str = "cell", **content: Any) -> dict[str, Any]:
    """Return a record entry with some content."""
    said = {"name": address.partition(".")[0], "description": f"The thing {address}.", **content}
    return {"kind": kind, "address": address, "digest": digest(address, said), "content": said}


def accession(
    cooldown: str = "2026-03",
    accession_number: int = 1,
    *,
    sweeps: tuple[dict[str, Any], ...] | None = None,
    sheet: dict[str, Any] | None = None,
    notes: dict[str, str] | None = None,
    **changes: Any,
) -> AccessionDocument:
    """Return an accession document.

    Parameters
    ----------
    cooldown, accession_number
        Which one.
    sweeps
        Its sweeps; left out: one.
    sheet
        Fields of the sheet over the usual ones.
    notes
        Notes in the sheet by sweep.
    changes
        Fields of the document over the usual ones.
    """
    entries = (sweep(),) if sweeps is None else sweeps
    said_sheet = {
        "format": "stillroom-cooldown/1",
        "name": cooldown,
        "cryostat": "DR-1.r1",
        "begin": moment(),
        "end": moment(200),
        "time_zone": "Europe/Helsinki",
        "operators": ["graduate student"],
        "purpose": "Onset of superfluidity in a thin film.",
        "outcome": "complete",
        "temperature_scale": "ITS-90",
        "cell": "TO-4.r2",
        "gas_end": {"state": "recovered"},
        "sweep": [
            {
                "name": entry["name"],
                "kind": entry["kind"],
                "files": [f"{entry['name']}.csv"],
                "channels": {"period": {"column": "P", "quantity": "period", "unit": "s"}},
                "notes": (notes or {}).get(entry["name"], ""),
            }
            for entry in entries
        ]
        or [
            {
                "name": "log",
                "kind": "log",
                "files": ["log.csv"],
                "channels": {"x": {"column": 1, "quantity": "period", "unit": "s"}},
            }
        ],
        **(sheet or {}),
    }
    said = {
        "format": "stillroom-accession/1",
        "address": f"{cooldown}.a{accession_number}",
        "cooldown": cooldown,
        "number": accession_number,
        "accessioned": moment(300 + accession_number),
        "sheet": said_sheet,
        "sheet_file": "cooldown.toml",
        "records": [record()],
        "sweeps": list(entries),
        "raw_files": [
            {
                "name": f"{entry['name']}.csv",
                "sha256": digest("raw", entry["name"]),
                "size": 5000,
                "role": "sweep",
            }
            for entry in entries
        ],
        "software": SOFTWARE,
        **changes,
    }
    return AccessionDocument.model_validate_json(json.dumps(said))


def output(name: str = "T_KT", value: float | None = 0.812, **changes: Any) -> dict[str, Any]:
    """Return a scalar result."""
    said = {
        "name": name,
        "quantity": "temperature",
        "unit": "K",
        "ucum": "K",
        "description": "Transition temperature.",
        "step": 1,
        "scale": "ITS-90",
        "value": value,
        "uncertainty": 0.003,
        "digest": digest(name, value),
    }
    return {**said, **changes}


def reduction(
    address_of_sweep: str = "2026-03/s017",
    plan: str = "film-transition",
    reduction_number: int = 1,
    *,
    inputs: tuple[str, ...] = ("2026-03/s017#period",),
    outputs: tuple[dict[str, Any], ...] | None = None,
    **changes: Any,
) -> ReductionDocument:
    """Return a reduction document of one step."""
    said_plan = {
        "name": plan,
        "revision": 1,
        "title": f"The plan {plan}",
        "applies": {"sweep_kinds": ["temperature-sweep"]},
        "step": [{"use": "leave-out"}],
        "headline": ["T_KT"],
    }
    said = {
        "format": "stillroom-reduction/1",
        "address": f"{address_of_sweep}@{plan}.{reduction_number}",
        "cooldown": address_of_sweep.partition("/")[0],
        "sweep": address_of_sweep,
        "number": reduction_number,
        "plan": said_plan,
        "plan_digest": digest(said_plan),
        "inputs": [{"address": each, "role": "channel", "digest": digest(each)} for each in inputs],
        "steps": [
            {
                "number": 1,
                "name": "leave-out",
                "version": 1,
                "sentence": "Nothing was left out.",
                "parameters": {},
                "inputs": {},
                "outputs": ["T_KT"],
                "begin": moment(400),
                "end": moment(401),
            }
        ],
        "outputs": [output()] if outputs is None else list(outputs),
        "begin": moment(400),
        "end": moment(401),
        "software": SOFTWARE,
        **changes,
    }
    return ReductionDocument.model_validate_json(json.dumps(said))


Document = AccessionDocument | ReductionDocument


def entry(document: Document) -> tuple[str, str, int, Document]:
    """Key, digest, size and document, as the store tells them."""
    cooldown, _, rest = document.address.partition("/")
    key = document.address if rest else f"{cooldown.rpartition('.')[0]}/{document.address}"
    body = document.model_dump_json()
    return key, digest(body), len(body), document


_words = st.text(st.characters(codec="utf-8", categories=("L", "N", "P", "S", "Zs", "Cc")), max_size=12)
_reals = st.none() | st.floats(allow_nan=False, allow_infinity=False)
_hours = st.integers(-1_000, 1_000)


@st.composite
def _sweeps(draw: st.DrawFn, name: str) -> dict[str, Any]:
    low, coverage = draw(_reals), draw(_reals)
    return sweep(
        name,
        cell=draw(st.sampled_from([None, "TO-4.r1", "TO-4.r2", "CAL-1.r1"])),
        begin=draw(st.none() | _hours.map(moment)),
        rows=draw(st.integers(0, 10**12)),
        temperature_low=None if low is None else number(low, draw(st.sampled_from(["K", "mK", "furlong"]))),
        coverage=None if coverage is None else number(coverage, "mol/m^2", uncertainty=draw(_reals)),
        thermometers=draw(st.lists(st.sampled_from(["GE-7.r1", "RX-2.r1"]), max_size=2)),
        channels=[channel(description=draw(_words), low=draw(_reals), missing=draw(st.integers(0, 9)))],
    )


@st.composite
def archives(draw: st.DrawFn) -> list[Document]:
    """Documents of a random archive, accessions before what rests on them."""
    documents: list[Document] = []
    for cooldown in draw(
        st.lists(st.sampled_from(["2026-01", "2026-02", "2025-11"]), unique=True, min_size=1)
    ):
        for accession_number in range(1, draw(st.integers(1, 3)) + 1):
            names = draw(st.lists(st.sampled_from(["s1", "s2", "s3"]), unique=True, max_size=3))
            documents.append(
                accession(
                    cooldown,
                    accession_number,
                    sweeps=tuple(draw(_sweeps(name)) for name in names),
                    sheet={
                        "purpose": draw(_words),
                        "outcome": draw(st.sampled_from(["complete", "aborted"])),
                    },
                    records=[record(draw(st.sampled_from(["TO-4.r1", "TO-4.r2"])), remark=draw(_words))],
                    findings=draw(st.lists(_findings(), max_size=2)),
                )
            )
        for plan in draw(st.lists(st.sampled_from(["empty-cell", "film-transition"]), unique=True)):
            documents += [
                reduction(
                    f"{cooldown}/s1",
                    plan,
                    reduction_number,
                    outputs=(
                        output(value=draw(_reals)),
                        output("steps", draw(_reals), quantity="unheard-of"),
                    ),
                    findings=draw(st.lists(_findings(), max_size=1)),
                )
                for reduction_number in range(1, draw(st.integers(1, 3)) + 1)
            ]
    return documents


@st.composite
def _findings(draw: st.DrawFn) -> dict[str, Any]:
    severity = draw(st.sampled_from(["warning", "note"]))
    waived = {
        "check": "drift",
        "place": "s1",
        "reason": "looked at by hand",
        "role": "data steward",
        "date": "2026-03-09",
    }
    return {
        "code": "drift",
        "severity": severity,
        "what": draw(_words),
        "waived": draw(st.sampled_from([None, waived])),
    }
