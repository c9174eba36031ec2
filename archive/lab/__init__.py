"""The door to a laboratory's archive, for commands, notebooks, pages and tests alike.

The import is lazy: who only searches waits for nothing that reduces.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from archive.lab.act_outcomes import ActOutcome, WithdrawOutcome
    from archive.lab.door import Archive
    from archive.lab.outcomes import CheckReport, IngestOutcome, ReduceOutcome, ReplayReport
    from archive.lab.stale import Stale, StaleReason

__all__ = [
    "ActOutcome",
    "Archive",
    "CheckReport",
    "IngestOutcome",
    "ReduceOutcome",
    "ReplayReport",
    "Stale",
    "StaleReason",
    "WithdrawOutcome",
]

_MODULES = {
    **dict.fromkeys(("ActOutcome", "WithdrawOutcome"), "act_outcomes"),
    "Archive": "door",
    **dict.fromkeys(("CheckReport", "IngestOutcome", "ReduceOutcome", "ReplayReport"), "outcomes"),
    **dict.fromkeys(("Stale", "StaleReason"), "stale"),
}


def __getattr__(name: str) -> object:
    if name in _MODULES:
        return getattr(import_module(f"archive.lab.{_MODULES[name]}"), name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
