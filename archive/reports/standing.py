"""How a cooldown stands: its open, waived and cleared warnings, and why its run sheet is still a draft."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from archive.reports.view import CooldownView
from schemas.finding import Finding

__all__ = ["Standing", "Waived", "draft_reasons", "standing"]


@dataclass(frozen=True)
class Waived:
    """A waived warning with its flag."""

    flag: str
    finding: Finding


@dataclass(frozen=True)
class Standing:
    """What the checks say of a cooldown.

    Parameters
    ----------
    open : tuple of (str, Finding)
        Warnings and errors that nobody accepted, each with its flag ``!1``.
    waived : tuple of Waived
        Accepted warnings with their flags ``W1``.
    cleared : int
        Warnings of earlier accessions that the newest no longer raises.
    notes : tuple of Finding
        Notes.
    """

    open: tuple[tuple[str, Finding], ...]
    waived: tuple[Waived, ...]
    cleared: int
    notes: tuple[Finding, ...]

    def flags(self, sweep: str) -> list[str]:
        """Return the flags of one sweep."""
        return [flag for flag, finding in self.open if place_of(finding) == sweep] + [
            each.flag for each in self.waived if place_of(each.finding) == sweep
        ]


def place_of(finding: Finding) -> str:
    """Return the sweep or thing that a finding is about."""
    return (finding.place or "").partition("#")[0].rpartition("/")[2].partition("@")[0]


def standing(view: CooldownView) -> Standing:
    """Return what the checks of the newest accession and the steps of the current reductions say."""
    findings = list(view.newest.findings)
    for reduction in view.current:
        own = [*reduction.findings, *(each for step in reduction.steps for each in step.findings)]
        seen: set[str] = set()
        for each in own:
            placed = (
                each if each.place else each.model_copy(update={"place": reduction.sweep.partition("/")[2]})
            )
            if placed.sentence() not in seen:
                seen.add(placed.sentence())
                findings.append(placed)
    loud = [each for each in findings if each.severity != "note"]
    raised = [each for each in loud if each.waived is None]
    accepted = [each for each in loud if each.waived is not None]
    now = {(each.code, each.place) for each in loud}
    before = {
        (each.code, each.place)
        for accession in view.accessions[:-1]
        for each in accession.findings
        if each.severity != "note"
    }
    return Standing(
        open=tuple((f"!{number}", each) for number, each in enumerate(raised, 1)),
        waived=tuple(Waived(f"W{number}", each) for number, each in enumerate(accepted, 1)),
        cleared=len(before - now),
        notes=tuple(each for each in findings if each.severity == "note"),
    )


def draft_reasons(view: CooldownView, stands: Standing) -> tuple[str, ...]:
    """Return why a run sheet may not be issued as final; none when it may."""
    return tuple(_reasons(view, stands))


def _reasons(view: CooldownView, stands: Standing) -> Iterator[str]:
    newest = view.newest
    sheet = newest.sheet
    if newest.cooldown in view.withdrawn:
        yield f"it is withdrawn: {view.withdrawn[newest.cooldown]}"
    if stands.open:
        count = len(stands.open)
        yield f"{count} warning{'s are' if count > 1 else ' is'} open"
    if sheet.outcome == "open":
        yield "the sheet says that the run is still open"
    for name, value in (("cell", sheet.cell), ("sample", sheet.sample if sheet.dose else "none admitted")):
        if value is None:
            yield f"{name} is not recorded"
    if sheet.gas_end.state != "never-admitted" and sheet.gas_end.valve is None:
        yield "the state of the cell's valve is not recorded"
    if sheet.gas_end.state == "unknown":
        yield "the gas balance at the end is unknown"
    keys = [f"{each.cooldown}/{each.address}" for each in view.accessions] + [
        each.address for each in view.current
    ]
    missing = [key for key in keys if key not in view.sealed]
    if missing:
        yield f"no digest is known of {', '.join(missing)}"
