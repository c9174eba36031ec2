"""A process of the command line, its JSON, and an archive that is not there."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from collections.abc import Callable
from datetime import UTC, datetime
from pathlib import Path
from types import SimpleNamespace
from typing import Any

from click.testing import Result

from archive.index import SweepResult, SweepRow

ROW = SweepRow(
    address="2026-03/s017",
    cooldown="2026-03",
    name="s017",
    kind="temperature-sweep",
    accession="2026-03.a1",
    cell="TO-4.r2",
    substrate="PI-2200.r1",
    sample=None,
    empty_cell=False,
    after_dose="d03",
    begin=datetime(2026, 3, 2, 9, 10, tzinfo=UTC),
    end=None,
    direction="up",
    rows=320,
    coverage=31.42e-6,
    coverage_uncertainty=0.06e-6,
    temperature_low=0.055,
    temperature_high=0.8,
    scale="PLTS-2000",
    thermometers=("RX-2.r1",),
    results=(
        SweepResult("T_KT", 0.73124, 0.00119, "K", None),
        SweepResult("exponent", None, None, "1", "no transition in range"),
    ),
    channels=("period",),
)
LAYER = {"value": 12.97, "unit": "umol/m^2", "uncertainty": 0.13, "kind": "coverage"}


class FakeArchive:
    """Archive that answers with what a test gave it, and keeps what it was asked."""

    def __init__(self, **answers: Any) -> None:
        self.asked: list[tuple[str, tuple[Any, ...], dict[str, Any]]] = []
        self.notices: list[str] = []
        self.answers: dict[str, Any] = {
            "search": [ROW],
            "results": lambda name="T_KT": (
                [SimpleNamespace(name="T_KT", quantity="temperature")] * (name == "T_KT")
            ),
            "result_quantities": lambda name="T_KT": ["temperature"] * (name == "T_KT"),
            "records": [
                SimpleNamespace(
                    name="PI-2200",
                    revision=1,
                    address="PI-2200.r1",
                    content={"layer": LAYER, "layer_definition": "the density of the bulk liquid"},
                )
            ],
            **answers,
        }

    def __enter__(self) -> FakeArchive:
        """Answer as an archive does."""
        return self

    def __exit__(self, *_: object) -> None:
        """Close nothing."""

    def __getattr__(self, verb: str) -> Callable[..., Any]:
        """Answer a verb of the archive."""

        def ask(*arguments: Any, **options: Any) -> Any:
            self.asked.append((verb, arguments, options))
            answer = self.answers[verb]
            if isinstance(answer, BaseException):
                raise answer
            return answer(*arguments) if callable(answer) else answer

        return ask


def child(
    *words: str, folder: Path | None = None, seconds: float = 300, counted: bool = True, **variables: str
) -> subprocess.CompletedProcess[str]:
    """Run a command line in a process of its own; its lines are counted for coverage unless that would take too long."""
    left_out = ("STILLROOM_ARCHIVE",) if counted else ("STILLROOM_ARCHIVE", "COVERAGE_")
    environment = {name: value for name, value in os.environ.items() if not name.startswith(left_out)}
    return subprocess.run(
        [sys.executable, "-W", "error", "-c", "from archive.commands.main import main; main()", *words],
        capture_output=True,
        text=True,
        encoding="utf-8",
        check=False,
        cwd=folder,
        env={
            **environment,
            "PYTHONPATH": str(Path(__file__).parents[3]),
            "PYTHONIOENCODING": "utf-8",
            **variables,
        },
        timeout=seconds,
    )


def parsed(result: Result | subprocess.CompletedProcess[str]) -> Any:
    """JSON document that is all there is on stdout."""
    return json.loads(result.stdout)
