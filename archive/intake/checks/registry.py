"""The list of all checks, and running them.

Rules: the list is literal; a laboratory's own checks come by the entry point group `stillroom.checks`, here and
nowhere else. A check that fails is told of, and the others go on.
"""

from __future__ import annotations

from importlib.metadata import entry_points

from archive.intake.checks.check import Check, History
from archive.intake.reading import Reading
from archive.intake.thresholds import Thresholds
from schemas.finding import Finding

__all__ = ["CHECKS", "all_checks", "run_checks"]

CHECKS: tuple[Check, ...] = ()

_GROUP = "stillroom.checks"


def all_checks() -> tuple[tuple[Check, ...], list[Finding]]:
    """Return the shipped checks and the laboratory's own, and what kept some of the latter from being loaded."""
    own: list[Check] = []
    faults: list[Finding] = []
    for entry in sorted(entry_points(group=_GROUP), key=lambda each: each.name):
        try:
            loaded = entry.load()
        except Exception as error:  # noqa: BLE001 - foreign code may fail in any way, and the other checks go on
            faults.append(_failed(entry.name, error))
            continue
        if isinstance(loaded, Check):
            own.append(loaded)
        else:
            faults.append(_failed(entry.name, TypeError("the entry point names no Check")))
    return (*CHECKS, *own), faults


def run_checks(reading: Reading, thresholds: Thresholds, *, earlier: History | None = None) -> list[Finding]:
    """Return the findings of all checks, sorted.

    Parameters
    ----------
    reading : Reading
        With temperatures and ledger, if they are known; its own findings are not repeated.
    thresholds : Thresholds
        Limits.
    earlier : History, optional
        What the archive already knows.

    Notes
    -----
    A check that lacks its inputs says nothing. An exception inside a check becomes an error `check-failed`.
    """
    checks, findings = all_checks()
    for check in checks:
        try:
            findings.extend(check.findings(reading, thresholds, earlier))
        except Exception as error:  # noqa: BLE001 - one failing check must not hide what the others have to say
            findings.append(_failed(check.code, error))
    return sorted(findings, key=lambda finding: finding.order)


def _failed(name: str, error: Exception) -> Finding:
    return Finding(
        code="check-failed",
        severity="error",
        what=f"the check {name} could not be carried out: {error}",
        found=type(error).__name__,
        remedy="report it with this sentence to whoever maintains the check",
    )
