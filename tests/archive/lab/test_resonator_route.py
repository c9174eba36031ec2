"""Ringdown in both components, a drive sweep that bends, and a temperature sweep driven too hard: through sheet, ingest and reduction.

The readings are invented from closed forms, with a fixed seed; the truth stands beside each.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest

from archive import Archive
from archive.lab import ReduceOutcome
from tests.small_cooldown import SHEET

Q, F0, OFFSET = 4.0e5, 1000.0, 0.004
TAU = Q / (math.pi * F0)
USUAL, BENDS = 1e-3, 1.5e-3
"""Amplitudes in V rms: of the reference point, and where the period has moved by 1e-7."""

MORE = """
[detection]
torque_exponent = 1
signal_exponent = 1
amplitude_convention = "rms"
reference_signal = "1.000 mV rms"
reference_drive = "0.1 V rms"
reference_quality_factor = "4.00(1)e5"
reference_period = "1.000000 ms"
reference_rim_velocity = "0.2 mm/s peak"

[layout.ring]
[layout.ring.channels.time]
column = "t (s)"
quantity = "time"
unit = "s"
[layout.ring.channels.x]
column = "X (mV)"
quantity = "amplitude"
unit = "mV"
convention = "rms"
[layout.ring.channels.y]
column = "Y (mV)"
quantity = "amplitude"
unit = "mV"
convention = "rms"

[layout.level]
[layout.level.channels.drive]
column = "D (V)"
quantity = "drive"
unit = "V"
convention = "rms"
[layout.level.channels.amplitude]
column = "A (mV)"
quantity = "amplitude"
unit = "mV"
convention = "rms"
[layout.level.channels.period]
column = "P (ms)"
quantity = "period"
unit = "ms"

[[sweep]]
name = "s003"
kind = "ringdown"
files = ["ring.csv"]
layout = "ring"
empty_cell = true
bath_temperature = "100 mK"

[[sweep]]
name = "s004"
kind = "drive-sweep"
files = ["drive.csv"]
layout = "level"
empty_cell = true
bath_temperature = "100 mK"
"""

SIGNAL = """
[layout.bridge.channels.amplitude]
column = "A (mV)"
quantity = "amplitude"
unit = "mV"
convention = "rms"
"""


def _sweep(day: int, shift: float, amplitude: float) -> str:
    rows = ["time,T (K),P (ms),A (mV)"]
    for k in range(60):
        stamp = f"2026-03-{day:02d}T{10 + k // 30:02d}:{k % 30 * 2:02d}:00+02:00"
        rows.append(
            f"{stamp},{0.2 + 0.01 * k:.4f},{1 + 1e-6 * (0.2 + 0.01 * k) + shift:.9f},{1e3 * amplitude:.6f}"
        )
    return "\n".join(rows) + "\n"


def _folder(folder: Path, name: str, amplitude: float) -> Path:
    folder.mkdir()
    random = np.random.default_rng(11)
    t = np.arange(0, 400, 0.5)
    z = (
        np.exp((2j * np.pi * OFFSET - 1 / TAU) * t)
        + random.normal(0, 2e-3, t.size)
        + 1j * random.normal(0, 2e-3, t.size)
    )
    ring = [f"{a:.1f},{b.real:.7f},{b.imag:.7f}" for a, b in zip(t, z, strict=True)]
    drive = np.repeat(np.linspace(0.02, 0.3, 15), 8)
    signal = drive / 0.1 * USUAL * (1 + random.normal(0, 1e-4, drive.size))
    period = 1 + 1e-7 * (signal / BENDS) ** 4 + random.normal(0, 2e-9, drive.size)
    levels = [f"{a:.4f},{1e3 * b:.7f},{c:.12f}" for a, b, c in zip(drive, signal, period, strict=True)]
    sheet = SHEET.replace("[[dose]]", SIGNAL + "\n[[dose]]", 1).replace("NAME", name)
    (folder / "cooldown.toml").write_text(sheet + MORE, encoding="utf-8")
    (folder / "ring.csv").write_text("\n".join(["t (s),X (mV),Y (mV)", *ring]) + "\n", encoding="utf-8")
    (folder / "drive.csv").write_text("\n".join(["D (V),A (mV),P (ms)", *levels]) + "\n", encoding="utf-8")
    (folder / "empty.csv").write_text(_sweep(3, 0.0, amplitude), encoding="utf-8")
    (folder / "film.csv").write_text(_sweep(8, 8e-6, USUAL), encoding="utf-8")
    return folder


@pytest.fixture(scope="module")
def lab(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Archive]:
    """Give an archive that holds the cooldown."""
    root = tmp_path_factory.mktemp("resonator")
    with Archive.create(root / "lab", name="Test laboratory") as lab:
        outcome = lab.ingest(_folder(root / "2026-03", "2026-03", 2e-3))
        assert outcome.state == "ingested", [finding.sentence() for finding in outcome.report.findings]
        yield lab


@pytest.fixture(scope="module")
def reduced(lab: Archive) -> dict[str, ReduceOutcome]:
    """Reduce three sweeps, the drive sweep first."""
    found = {}
    for sweep, plan in (("s004", "drive-linearity"), ("s003", "ringdown"), ("s001", "empty-cell")):
        (outcome,) = lab.reduce(f"2026-03/{sweep}", plan=plan)
        assert outcome.problem is None, str(outcome.problem)
        found[plan] = outcome
    return found


def _value(outcome: ReduceOutcome, name: str) -> tuple[float, float]:
    assert outcome.document is not None
    (output,) = [each for each in outcome.document.outputs if each.name == name]
    return output.value or math.nan, output.uncertainty or math.nan


@pytest.mark.parametrize(
    ("name", "truth"),
    [
        ("resonance_frequency", F0 + OFFSET),
        ("frequency_offset", OFFSET),
        ("quality_factor_by_components", Q),
        ("quality_factor", Q),
        ("quality_factor_at_rest", Q),
    ],
)
def test_a_ringdown_of_both_components(reduced: dict[str, ReduceOutcome], name: str, truth: float) -> None:
    value, u = _value(reduced["ringdown"], name)
    assert abs(value - truth) < 4 * u
    assert u < 3e-3 * truth or name == "frequency_offset"


def test_an_exponential_decay_has_no_finding_of_its_shape(reduced: dict[str, ReduceOutcome]) -> None:
    document = reduced["ringdown"].document
    assert document is not None
    assert not {"curved-ringdown", "amplitude-dependent-dissipation"} & {
        each.code for each in document.findings
    }
    considered = [step for step in document.steps if "amplitude dependence" in step.considered]
    assert len(considered) == 1
    assert "not refused" in considered[0].considered["amplitude dependence"]


def test_the_regime_ends_where_the_period_bends(reduced: dict[str, ReduceOutcome]) -> None:
    value, u = _value(reduced["drive-linearity"], "linear_amplitude")
    # Straight lines between levels 0.2 mV apart under a fourth power; their own part below 1 mV is 3 per cent of the limit.
    assert value == pytest.approx(BENDS, rel=0.03)
    assert 0 < u < 0.05e-3
    speed, _ = _value(reduced["drive-linearity"], "linear_velocity")
    assert speed == pytest.approx(value / USUAL * 0.2e-3 / math.sqrt(2), rel=1e-9)


def test_a_sweep_driven_too_hard_is_told_of(lab: Archive, reduced: dict[str, ReduceOutcome]) -> None:
    document = reduced["empty-cell"].document
    assert document is not None
    assert "driven-beyond-linear" in {
        finding.code for finding in document.findings if finding.severity == "warning"
    }
    assert _value(reduced["empty-cell"], "amplitude_over_linear")[0] == pytest.approx(2e-3 / BENDS, rel=0.03)
    assert lab.replay(reduced["empty-cell"].address or "").identical


@pytest.mark.parametrize(("amplitude", "told"), [(2e-3, True), (1e-3, False)], ids=["beyond", "within"])
def test_a_later_cooldown_is_told_of_it_when_it_is_checked(
    lab: Archive,
    reduced: dict[str, ReduceOutcome],
    tmp_path: Path,
    amplitude: float,
    told: bool,  # noqa: FBT001 - a table of cases
) -> None:
    report = lab.check(_folder(tmp_path / "2026-04", "2026-04", amplitude))
    found = [each for each in report.findings if each.code == "drive-beyond-regime"]
    assert [each.severity for each in found] == (["warning"] if told else [])
    assert all(reduced["drive-linearity"].address in (each.expected or "") for each in found)


def test_the_run_sheet_says_considered_not_applied(lab: Archive, reduced: dict[str, ReduceOutcome]) -> None:
    assert reduced["ringdown"].problem is None
    text = lab.run_sheet("2026-03")["run-sheet-2026-03.json"].decode()
    row = text[text.index('"amplitude dependence"') :][:400]
    assert '"considered"' in row
    assert '"applied"' not in row.partition("}")[0]
