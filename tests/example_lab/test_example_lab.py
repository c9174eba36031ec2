"""A laboratory's own reader, check, step and plan come in through entry points and nothing else."""

from __future__ import annotations

import json
import os
import struct
import subprocess
import sys
import tomllib
from pathlib import Path
from types import ModuleType
from typing import Any

import numpy as np
import pytest

from archive.errors import BadRequest
from archive.intake import own_readers
from archive.intake.checks import registry
from archive.intake.own_readers import Reader
from archive.reduction import added_plans

HERE = Path(__file__).parent
ROOT = HERE.parents[1]

SHEET = """\
format = "stillroom-cooldown/1"
name = "2026-07"
cryostat = "fridge.r1"
begin = 2026-07-01T09:00:00+02:00
end = 2026-07-02T18:00:00+02:00
time_zone = "Europe/Helsinki"
operators = ["graduate student"]
purpose = "the excitation of a new bridge"
outcome = "complete"
temperature_scale = "ITS-90"

[gas_end]
state = "never-admitted"

[[record.cryostat]]
name = "fridge"
revision = 1
kind = "dilution"

[layout.bridge.channels.time]
column = "time"
quantity = "instant"

[layout.bridge.channels.excitation]
column = "excitation"
quantity = "voltage"
unit = "V"
convention = "rms"
uncertainty = "1 %"

[layout.bridge.channels.reading]
column = 3
quantity = "resistance"
unit = "Ohm"
uncertainty = "0.5 %"

[[sweep]]
name = "s001"
kind = "log"
files = ["night.brg"]
layout = "bridge"
"""

STORY = """
import json, sys
from pathlib import Path
from archive import Archive
with Archive.create(Path(sys.argv[1]) / "lab") as lab:
    outcome = lab.ingest(Path(sys.argv[1]) / "2026-07")
    (made,) = lab.reduce("2026-07", plan="thermometer-heating")
    view = lab.reduction(made.address)
    (Path(sys.argv[1]) / "2026-07" / "night.brg").write_bytes(bytes.fromhex(sys.argv[2]))
    cut = lab.check(Path(sys.argv[1]) / "2026-07")
    print(json.dumps({
        "cut": [each.sentence() for each in cut.findings if each.severity == "error"],
        "state": outcome.state, "findings": [each.model_dump(mode="json") for each in outcome.report.findings],
        "plans": [plan.address for plan in lab.plans()],
        "heating": view["heating"].tolist(), "u": view.uncertainty("heating").tolist(), "unit": view.units["heating"],
        "replayed": lab.replay(made.address).identical,
    }))
"""


def _installed(site: Path) -> None:
    """Write what an installer writes beside a package: its name, version and entry points (PyPA specifications)."""
    project = tomllib.loads((HERE / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    folder = site / f"{project['name']}-{project['version']}.dist-info"
    folder.mkdir(parents=True)
    text = f"Metadata-Version: 2.1\nName: {project['name']}\nVersion: {project['version']}\n"
    (folder / "METADATA").write_text(text, encoding="utf-8")
    groups = project["entry-points"].items()
    lines = [
        f"[{group}]\n" + "".join(f"{k} = {v}\n" for k, v in entries.items()) for group, entries in groups
    ]
    (folder / "entry_points.txt").write_text("\n".join(lines), encoding="utf-8")


def _bridge_file(excitation: float, rows: int = 20) -> bytes:
    begin = 1_782_892_800.0  # 2026-07-01 08:00 UTC
    records = [struct.pack("<3d", begin + 60.0 * k, excitation, 1000.0 + k) for k in range(rows)]
    return b"BRG1" + b"".join(records)


def _in_that_laboratory(site: Path, *words: str) -> subprocess.CompletedProcess[str]:
    paths = os.pathsep.join(map(str, (site, HERE, ROOT)))
    environment = {**os.environ, "PYTHONPATH": paths, "STILLROOM_ROLE": "graduate student"}
    return subprocess.run(
        [sys.executable, *words], env=environment, capture_output=True, text=True, check=False, timeout=120
    )


def test_a_laboratory_brings_reader_check_step_and_plan(tmp_path: Path) -> None:
    _installed(tmp_path / "site")
    folder = tmp_path / "2026-07"
    folder.mkdir()
    (folder / "cooldown.toml").write_text(SHEET, encoding="utf-8")
    (folder / "night.brg").write_bytes(_bridge_file(2e-3))
    cut_off = _bridge_file(2e-3)[:-5]
    done = _in_that_laboratory(tmp_path / "site", "-c", STORY, str(tmp_path), cut_off.hex())
    assert done.returncode == 0, done.stderr
    told = json.loads(done.stdout)
    assert told["state"] == "ingested"
    found = {each["code"]: each for each in told["findings"]}
    assert "4e-09 W" in found["too-much-heating"]["what"]
    assert found["own-reader"]["found"] == "coldroom 1.2"
    assert "coldroom-bridge version 1" in found["own-reader"]["what"]
    assert "thermometer-heating.r1" in told["plans"]
    R = 1000.0 + np.arange(20)
    power = 4e-6 / R
    np.testing.assert_allclose(told["heating"], power, rtol=1e-12)
    # JCGM 100:2008, 5.1.6: relative uncertainties of a product of powers; 2 x 1 % and 0.5 %.
    np.testing.assert_allclose(told["u"], power * np.hypot(0.02, 0.005), rtol=1e-3)
    assert told["unit"] == "W"
    assert told["replayed"]
    assert any("night.brg" in each and "it ends in the middle of record 20" in each for each in told["cut"])


class _Entry:
    """An entry point that gives what a test says."""

    def __init__(self, name: str, loaded: Any) -> None:
        self.name, self.value, self.loaded, self.dist = name, f"{name}:THING", loaded, None

    def load(self) -> Any:
        """Give it, or fail."""
        if isinstance(self.loaded, Exception):
            raise self.loaded
        return self.loaded


def _reader(*suffixes: str) -> Reader:
    return Reader("ours", 1, suffixes, lambda path: {"a": np.arange(3.0)})


@pytest.mark.parametrize(
    ("loaded", "words"),
    [
        pytest.param([ImportError("no module")], "cannot be loaded", id="broken package"),
        pytest.param(["text"], "is no Reader", id="something else"),
        pytest.param([_reader()], "is no Reader", id="no suffix"),
        pytest.param([_reader(".csv")], "which Stillroom reads itself", id="text tables"),
        pytest.param([_reader(".h5")], "which Stillroom reads itself", id="HDF5"),
        pytest.param([_reader("BRG")], "in lower case", id="no suffix as they are written"),
        pytest.param([_reader(".brg"), _reader(".brg")], "both claim .brg", id="two of them"),
    ],
)
def test_a_reader_that_clashes_is_refused(
    monkeypatch: pytest.MonkeyPatch, loaded: list[Any], words: str
) -> None:
    entries = [_Entry(f"e{k}", each) for k, each in enumerate(loaded)]
    monkeypatch.setattr(own_readers, "entry_points", lambda group: entries)
    with pytest.raises(BadRequest, match=words):
        own_readers.own_readers.__wrapped__()


def test_a_reader_that_fails_in_any_way_is_told_in_a_sentence() -> None:
    def broken(path: Path) -> dict[str, Any]:
        raise KeyError(path.name)

    with pytest.raises(ValueError, match="the reader ours failed: KeyError"):
        Reader("ours", 1, (".x",), broken).columns(Path("a.x"))


def _package(place: Path, *plans: str) -> ModuleType:
    place.mkdir()
    shipped = (HERE / "coldroom" / "plans" / "thermometer-heating.toml").read_text(encoding="utf-8")
    for number, name in enumerate(plans):
        text = shipped.replace("thermometer-heating", name)
        (place / f"{number}.toml").write_text(text, encoding="utf-8")
    package = ModuleType("their_plans")
    package.__path__ = [str(place)]
    package.__spec__ = None
    package.__file__ = str(place / "__init__.py")
    return package


@pytest.mark.parametrize(
    ("plans", "words"),
    [
        pytest.param(["ringdown"], "has the name of a plan of Stillroom", id="shipped name"),
        pytest.param(["ours", "ours"], "has the name of a plan of lab", id="twice"),
    ],
)
def test_a_plan_whose_name_is_taken_is_refused(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path, plans: list[str], words: str
) -> None:
    place = tmp_path / "plans"
    _package(place, *plans)
    monkeypatch.setattr(added_plans, "entry_points", lambda group: [_Entry("lab", ModuleType("theirs"))])
    monkeypatch.setattr(added_plans.resources, "files", lambda package: place)
    monkeypatch.setattr(added_plans, "shipped_plans", lambda: [type("Plan", (), {"name": "ringdown"})])
    with pytest.raises(BadRequest, match=words):
        added_plans.added_plans.__wrapped__()


@pytest.mark.parametrize(
    ("loaded", "words"),
    [
        pytest.param(ImportError("no module"), "cannot be loaded", id="broken package"),
        pytest.param("text", "names no Python package", id="something else"),
    ],
)
def test_an_entry_point_without_plans_is_refused(
    monkeypatch: pytest.MonkeyPatch, loaded: Any, words: str
) -> None:
    monkeypatch.setattr(added_plans, "entry_points", lambda group: [_Entry("lab", loaded)])
    with pytest.raises(BadRequest, match=words):
        added_plans.added_plans.__wrapped__()


def test_a_check_whose_code_is_taken_is_told_of(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(registry, "entry_points", lambda group: [_Entry("again", registry.CHECKS[0])])
    checks, faults = registry.all_checks()
    assert checks == registry.CHECKS
    assert [fault.severity for fault in faults] == ["error"]
    assert f"{registry.CHECKS[0].code}, is taken" in faults[0].what
