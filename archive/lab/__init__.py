"""The door to a laboratory's archive, for commands, notebooks, pages and tests alike."""

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
