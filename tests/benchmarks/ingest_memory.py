"""Peak resident memory of an ingest of a log and of one several times as long; 200 MB and 2 GB at the full size.

On Linux only, where the system tells the peak of one process.
"""

from __future__ import annotations

import shutil
import subprocess
import sys
import tempfile
from pathlib import Path

from tests.benchmarks.harness import Benchmark, Size, Work
from tests.benchmarks.measured_log import write_folder

__all__ = ["BENCHMARK"]

_BYTES_A_ROW = 132
_PROGRAM = """
import sys
from pathlib import Path
from archive import Archive
with Archive.create(Path(sys.argv[2])) as lab:
    assert lab.ingest(sys.argv[1]).state == "ingested"
# Not getrusage: what that tells goes on from the process that started this one.
(peak,) = [line for line in Path("/proc/self/status").read_text().splitlines() if line.startswith("VmHWM:")]
print(1024 * int(peak.split()[1]))
"""


def _peak(folder: Path, archive: Path) -> int:
    shutil.rmtree(archive, ignore_errors=True)
    command = [sys.executable, "-c", _PROGRAM, str(folder), str(archive)]
    return int(subprocess.run(command, check=True, capture_output=True, text=True).stdout)


def _prepare(size: Size) -> Work:
    place = Path(tempfile.mkdtemp(prefix="stillroom-memory-"))
    short, long = {"small": (0.2, 1), "default": (70, 210), "full": (200, 2000)}[size]
    folders = [
        write_folder(place / name, int(megabytes * 1e6 / _BYTES_A_ROW))
        for name, megabytes in (("short", short), ("long", long))
    ]
    return Work(
        lambda: _peak(folders[1], place / "lab"),
        lambda: _peak(folders[0], place / "lab"),
        int(long),
        lambda: shutil.rmtree(place),
    )


BENCHMARK = Benchmark(
    name="ingest-memory",
    description="peak resident memory of an ingest",
    subject="a long log",
    baseline="one of a third of its length (a tenth at the full size)",
    unit="MB",
    prepare=_prepare,
    cost="bytes",
)
