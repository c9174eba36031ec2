"""The door to a laboratory's archive, for commands, notebooks, pages and tests alike."""

from archive.lab.door import Archive
from archive.lab.outcomes import CheckReport, IngestOutcome, ReduceOutcome, ReplayReport

__all__ = ["Archive", "CheckReport", "IngestOutcome", "ReduceOutcome", "ReplayReport"]
