"""Dead volume and isotherm of helium from metered doses, from the sheets to the area, with gas by an equation of state from elsewhere."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI
from scipy.optimize import brentq

from archive import Archive
from archive.lab import ReduceOutcome

DOSER, CELL, WARM = 50.0e-6, 3.0e-6, 12.0e-6
ROOM, COLD, BATH = 295.0, 77.36, 4.2
MONOLAYER, C = 12e-3, 120.0
AREA_EACH = 0.0847e-18


def rho(p: float, T: float) -> float:
    """Molar density of helium."""
    return float(PropsSI("Dmolar", "P", p, "T", T, "Helium")) if p > 0 else 0.0


def sheet(
    name: str, *, dead: str, kind: str, bath: float, doses: list[tuple[float, float]], month: int
) -> str:
    """Return a cooldown sheet with its doses."""
    text = f'''format = "stillroom-cooldown/1"
name = "{name}"
cryostat = "insert"
begin = 2026-{month:02d}-02T08:00:00+02:00
end = 2026-{month:02d}-03T18:00:00+02:00
time_zone = "Europe/Helsinki"
operators = ["postdoc"]
purpose = "test"
outcome = "complete"
temperature_scale = "ITS-90"
cell = "adsorption-1.r1"
sample = "gas.r1"

[gas_end]
state = "recovered"

[[record.cryostat]]
name = "insert"
revision = 1
kind = "other"

[[record.cell]]
name = "adsorption-1"
revision = 1
kind = "adsorption-cell"
substrate = "powder.r1"

[[record.substrate]]
name = "powder"
revision = 1
material = "invented silica powder"

[[record.sample]]
name = "gas"
revision = 1
isotope = "4He"
gas_source = "invented"
area_per_molecule = "0.0847 nm^2"

[[gauge]]
name = "G1"
range = "2 bar"
uncertainty = "3 Pa"
relative_uncertainty = 0.002

[[doser]]
name = "V1"
volume = "50.00(15) cm^3"
how = "invented"

[[dead_volume]]
name = "capillary"
volume = "12.00(6) cm^3"
temperature = "295 K"
{dead}
'''
    for k, (before, after) in enumerate(doses, 1):
        text += f'''
[[dose]]
name = "d{k:02d}"
at = 2026-{month:02d}-02T{8 + k:02d}:00:00+02:00
doser = "V1"
gauge = "G1"
pressure_before = "{before:.2f} Pa"
pressure_after = "{after:.2f} Pa"
temperature_before = "{ROOM} K"
'''
    names = ", ".join(f'"d{k:02d}"' for k in range(1, len(doses) + 1))
    return (
        text
        + f'''
[[sweep]]
name = "run"
kind = "{kind}"
files = ["run.csv"]
doses = [{names}]
bath_temperature = "{bath} K on ITS-90"
dialect = {{ time_format = "iso8601" }}

[sweep.channels.at]
column = "time"
quantity = "instant"

[sweep.channels.pressure]
column = "p"
quantity = "pressure"
unit = "Pa"
uncertainty = "3 Pa"
convention = "absolute"
'''
    )


def table(pressures: list[float], month: int) -> str:
    """Return the rows half an hour after each dose."""
    rows = [f"2026-{month:02d}-02T{8 + k:02d}:40:00+02:00,{p:.2f}" for k, p in enumerate(pressures, 1)]
    return "time,p\n" + "\n".join(rows) + "\n"


def expansions(rng: np.random.Generator) -> tuple[list[tuple[float, float]], list[float]]:
    """Return readings of a doser filled to 120 kPa and opened to the cell, again and again."""
    doses, pressures, cell = [], [], 0.0
    for _ in range(8):

        def surplus(p: float, before: float = cell) -> float:
            gained = CELL * (rho(p, COLD) - rho(before, COLD)) + WARM * (rho(p, ROOM) - rho(before, ROOM))
            return DOSER * (rho(1.2e5, ROOM) - rho(p, ROOM)) - gained

        p = float(brentq(surplus, cell, 1.2e5))
        doses.append((1.2e5 + 3 * rng.normal(), p + 3 * rng.normal()))
        pressures.append(p + 3 * rng.normal())
        cell = p
    return doses, pressures


def adsorbed(x: float) -> float:
    """Return the amount that the equation of Brunauer, Emmett and Teller gives."""
    return MONOLAYER * C * x / ((1 - x) * (1 + (C - 1) * x))


def isotherm(rng: np.random.Generator) -> tuple[list[tuple[float, float]], list[float]]:
    """Return readings of doses that take the film through its first layers."""
    saturated = float(PropsSI("P", "T", BATH, "Q", 1, "Helium"))
    doses, pressures, total = [], [], 0.0
    for x in np.linspace(0.02, 0.30, 12):
        p = float(x * saturated)
        wanted = adsorbed(x) + CELL * rho(p, BATH) + WARM * rho(p, ROOM)
        after = max(p, 3e4)
        need = (wanted - total) / DOSER + rho(after, ROOM)
        before = float(brentq(lambda q, need=need: rho(q, ROOM) - need, after, 3e6))
        doses.append((before + 3 * rng.normal(), after + 3 * rng.normal()))
        pressures.append(p + 3 * rng.normal())
        total = wanted
    return doses, pressures


@pytest.fixture(scope="module")
def lab(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Archive]:
    """Give an archive with both runs."""
    rng = np.random.default_rng(7)
    folders = tmp_path_factory.mktemp("volumetric")
    with Archive.create(folders / "lab", name="Volumetric") as lab:
        for name, kind, bath, month, (doses, pressures) in (
            ("2026-03", "dose-run", COLD, 3, expansions(rng)),
            ("2026-04", "isotherm", BATH, 4, isotherm(rng)),
        ):
            folder = folders / name
            folder.mkdir()
            text = sheet(name, dead="", kind=kind, bath=bath, doses=doses, month=month)
            (folder / "cooldown.toml").write_text(text)
            (folder / "run.csv").write_text(table(pressures, month))
            outcome = lab.ingest(folder)
            assert outcome.state == "ingested", [each.sentence() for each in outcome.report.findings]
        yield lab


def number(outcome: ReduceOutcome, name: str) -> tuple[float, float]:
    """Value and uncertainty of a result."""
    assert outcome.problem is None, outcome.problem
    assert outcome.document is not None
    (found,) = [each for each in outcome.document.outputs if each.name == name]
    assert found.value is not None
    return found.value, found.uncertainty or 0.0


def test_without_a_dead_volume_the_isotherm_counts_all_gas_and_says_so(lab: Archive) -> None:
    # Only the capillary is stated; the cell's own gas then counts as adsorbed.
    (outcome,) = lab.reduce("2026-04", plan="isotherm-from-doses")
    assert outcome.document is not None
    monolayer, _ = number(outcome, "monolayer")
    assert monolayer > 1.15 * MONOLAYER
    (step,) = [each for each in outcome.document.steps if each.name == "adsorbed-amount"]
    assert step.facts["known_by"] == "the sheet"


def test_expansion_then_isotherm(lab: Archive) -> None:
    (expansion,) = lab.reduce("2026-03")
    volume, u = number(expansion, "dead_volume")
    assert abs(volume - CELL) < 3 * u
    # Metering volume 0.3 %, over 3 + 12 * 77.36/295 cm^3, and the capillary's 0.06 cm^3 as 0.0157 cm^3 of cold cell.
    assert 0.02e-6 < u < 0.06e-6
    offset, u_offset = number(expansion, "offset")
    assert abs(offset) < 3 * u_offset
    (found,) = lab.reduce("2026-04", plan="isotherm-from-doses")
    monolayer, u = number(found, "monolayer")
    assert abs(monolayer - MONOLAYER) < 3 * u
    assert u < 0.005 * MONOLAYER
    area, u = number(found, "area")
    assert area == pytest.approx(monolayer * 6.02214076e23 * AREA_EACH, rel=1e-9)
    constant, u = number(found, "constant")
    assert abs(constant - C) < 4 * u
    assert found.document is not None
    # The metering volume is one source, in the dead volume and in the doses.
    shared = {each.name: each.shared for each in found.document.outputs}
    assert "volume of doser V1, 50.00(15) cm^3" in shared["monolayer"]
    # The doser's 0.3 % would be the monolayer's too; the dead volume, which grows with it, takes a part back.
    part = abs(shared["monolayer"]["volume of doser V1, 50.00(15) cm^3"]) / monolayer
    assert 0.002 < part < 0.003
    assert lab.replay(found.address or "").identical


def test_the_trace_of_the_area_leads_to_the_expansions(lab: Archive) -> None:
    lab.reduce("2026-03")
    (found,) = lab.reduce("2026-04", plan="isotherm-from-doses")
    lines = "\n".join(lab.trace(f"{found.address}#area").lines())
    assert "2026-03/run@dead-volume.1#dead_volume" in lines
    assert "2026-03.a1:run.csv" in lines


def test_a_run_of_doses_is_left_to_its_own_plan(lab: Archive) -> None:
    assert {outcome.plan for outcome in lab.reduce("2026-04")} == {"isotherm-from-doses.r1"}
