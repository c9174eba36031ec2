"""An archive whose index alone is filled: what stands on its plane is known."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from archive import Archive
from archive.index import Index
from tests.archive.index import documents as make
from tests.archive.index.test_acts import entries, withdrawal

__all__ = ["documents", "planed"]


def planed(root: Path) -> Path:
    """Make the archive in a folder that is not there yet, and return it."""
    with Archive.create(root, name="Films & pores") as lab:
        url = lab.settings.index_address(lab.root)
    with Index.open(url) as index:
        index.rebuild(entries(documents()))
    return root


def documents() -> list[Any]:
    """Two cells with films, one with a film in pores, one with third sound, one without an inert layer, an isotherm, a withdrawn sweep."""
    pressure = make.channel("p", quantity="pressure", unit="kPa", ucum="kPa", low=2.0, high=30.0)
    first = make.accession(
        "2025-01",
        sweeps=(
            _sweep("e1", 0.02, 1.0, 0.0, empty_cell=True),
            _sweep("s1", 0.05, 0.6, 30.0),
            _sweep("s2", 0.05, 0.7, 33.0, cell="TO-4.r2"),
            _sweep("d1", 0.02, 0.02, None, kind="dose-run", begin=make.moment(10), end=make.moment(20)),
            _sweep("s3", 0.1, 0.9, 31.0, cell="PG-2.r1", substrate="glass.r1", begin=make.moment(30)),
            _sweep("t1", 0.6, 0.6, None, kind="dose-run", cell="TS-1.r1", begin=make.moment(40), end=make.moment(50)),
            _sweep("s4", 0.1, None, 40.0, cell="NEW-1.r1", begin=make.moment(60)),
            _sweep("i1", 4.2, 4.2, None, kind="isotherm", cell="AC-1.r1", begin=None, end=None, channels=[pressure]),
            _sweep("none", None, None, 40.0, kind="log"),
            _sweep("w1", 0.05, 0.55, 29.0),
        ),
        doses=[_dose("d01", 11, 5.0), _dose("d02", 15, 28.0), _dose("d03", 41, 30.0), _dose("d04", 49, 50.0), _dose("d05", 70, 90.0)],
        records=[make.record("TO-4.r1"), make.record("glass.r1", kind="substrate", pore_diameter={"value": 7.0, "unit": "nm"})],
    )  # fmt: skip
    both = (
        make.output(value=0.41, uncertainty=0.002),
        make.output("T_KT_by_peak", value=0.42),
        make.output("crossing_temperature", value=0.43),
    )
    reductions = (
        make.reduction("2025-01/s1", outputs=(make.output(value=0.3),)),
        make.reduction("2025-01/s1", reduction_number=2, outputs=both),
        make.reduction("2025-01/s3", plan="porous-film", outputs=(make.output("T_c", value=0.5),)),
        make.reduction("2025-01/d1", plan="dose-run", outputs=(_coverage("onset_coverage", 24.0, 0.4),)),
        make.reduction("2025-01/t1", plan="third-sound", outputs=(_coverage("transition_coverage", 29.0, 0.1),)),
    )  # fmt: skip
    reduced = [_headlined(each, "T_KT", "T_KT_by_peak", "T_c", "onset_coverage", "transition_coverage") for each in reductions]  # fmt: skip
    back = withdrawal("2025-01/w1", address="2025-01.w1", cooldown="2025-01", rests_on="2025-01.a1")
    return [first, *reduced, back]


def _sweep(
    name: str, cold: float | None, warm: float | None, coverage: float | None, **said: Any
) -> dict[str, Any]:
    kelvin = {
        "temperature_low": None if cold is None else make.number(cold, "K"),
        "temperature_high": None if warm is None else make.number(warm, "K"),
    }
    n = None if coverage is None else make.number(coverage, "umol/m^2", uncertainty=0.5)
    return make.sweep(name, coverage=n, **{"cell": "TO-4.r1", **kelvin, **said})


def _dose(name: str, hours: float, coverage: float) -> dict[str, Any]:
    return {
        "name": name, "at": make.moment(hours), "act": "add", "counted": True, "method": "pV = nRT",
        "running_coverage": make.number(coverage, "umol/m^2"), "amount": make.number(1e-6, "mol"), "running_amount": make.number(1e-5, "mol"),
    }  # fmt: skip


def _coverage(name: str, value: float, u: float) -> dict[str, Any]:
    shown = make.number(value * 1e-6, "mol/m^2", uncertainty=u * 1e-6)
    return make.output(name, quantity="coverage", ucum="mol/m2", **{**shown, "scale": None})


def _headlined(document: Any, *names: str) -> Any:
    return document.model_copy(update={"plan": document.plan.model_copy(update={"headline": names})})
