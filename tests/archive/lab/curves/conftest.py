"""Three small cooldowns that differ in what a chart must not mix in silence: unit and scale, quantity kind, rms and peak."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest

from archive import Archive
from tests.small_cooldown import write_folder

AMPLITUDE = """
[layout.bridge.channels.signal]
column = "A (mV)"
quantity = "amplitude"
unit = "mV"
convention = "CONVENTION"
"""


def _rewritten(folder: Path, number: str, edits: dict[str, str], period: float, convention: str) -> Path:
    """A folder of its own name, sheet and numbers."""
    write_folder(folder, name=number)
    sheet = (folder / "cooldown.toml").read_text(encoding="utf-8").replace("2026-03-", f"{number}-")
    for old, new in edits.items():
        assert old in sheet
        sheet = sheet.replace(old, new)
    sheet += AMPLITUDE.replace("CONVENTION", convention)
    (folder / "cooldown.toml").write_text(sheet, encoding="utf-8")
    for name in ("empty.csv", "film.csv"):
        lines = (folder / name).read_text(encoding="utf-8").replace("2026-03-", f"{number}-").splitlines()
        head = lines[0].replace("P (ms)", "P") + ",A (mV)"
        rows = [line.split(",") for line in lines[1:]]
        shown = [
            [*row[:2], repr(float(row[2]) * period if period > 0 else 1e3 / float(row[2])), "1.25"]
            for row in rows
        ]
        (folder / name).write_text("\n".join([head, *map(",".join, shown)]) + "\n", encoding="utf-8")
    return folder


@pytest.fixture(scope="session")
def lab(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Archive]:
    """Give an archive with 2026-03 (ms, ITS-90, rms), 2026-04 (us, PLTS-2000, peak) and 2026-05 (Hz)."""
    top = tmp_path_factory.mktemp("curves")
    folders = (
        ("2026-03", {'"P (ms)"': '"P"'}, 1.0, "rms"),
        ("2026-04", {'"P (ms)"': '"P"', 'unit = "ms"': 'unit = "us"', '"ITS-90"': '"PLTS-2000"'}, 1000.0, "peak"),
        ("2026-05", {'"P (ms)"': '"P"', 'quantity = "period"': 'quantity = "frequency"', 'unit = "ms"': 'unit = "Hz"',
                     '"2 ps"': '"2 uHz"', "channels.period": "channels.frequency"}, -1.0, "rms"),
    )  # fmt: skip
    with Archive.create(top / "lab", name="Test laboratory") as archive:
        for name, edits, period, convention in folders:
            outcome = archive.ingest(_rewritten(top / name, name, edits, period, convention))
            assert outcome.state == "ingested", [str(each) for each in outcome.report.findings]
        yield archive
