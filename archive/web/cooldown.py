"""The page of a cooldown: its sheet as it is to be read, the weeks as a drawing, what was found and said, and what came in when."""

from __future__ import annotations

from collections.abc import Iterator

from starlette.requests import Request
from starlette.responses import Response

from archive.intake.cautions import FIXED_TEXT
from archive.lab import Archive
from archive.reports import CooldownView
from archive.reports.after_the_fact import after_the_fact
from archive.reports.holdings import Holdings
from archive.reports.later_pages import dose_lines
from archive.reports.prose import prose
from archive.web.finding_groups import finding_groups
from archive.web.page import page
from archive.web.site import lab_of
from archive.web.thumb import thumb_path
from archive.web.timeline import Dosed, moments_of, timeline
from schemas.address import Address
from schemas.finding import Finding
from schemas.lineage import DoseEntry, Value
from schemas.quantity import unit_factor

__all__ = ["cooldown"]

_MOST_ROWS = 200
"""Sweeps in the table; the drawing has all of them, and so has a search."""


def cooldown(request: Request, address: Address) -> Response:
    """Answer with the page of a cooldown."""
    lab = lab_of(request)
    view = lab.cooldown(address.head)
    held = Holdings(view)
    rows = lab.sweeps(address.head, withdrawn=True)
    findings = list(_findings(lab, view))
    return page(
        request,
        "cooldown.html.j2",
        name=address.head,
        sheet=held.sheet,
        withdrawn=view.withdrawn.get(address.head, ""),
        line=timeline(held.sheet, rows, [_dosed(address.head, each) for each in view.newest.doses]),
        moments=moments_of(held.sheet),
        undated=[each for each in held.sheet.note if each.at is None],
        rows=rows[:_MOST_ROWS],
        left_out=max(0, len(rows) - _MOST_ROWS),
        doses=list(dose_lines(held)),
        open=finding_groups(each for each in findings if each.severity != "note" and each.waived is None),
        waived=finding_groups(
            each for each in findings if each.severity != "note" and each.waived is not None
        ),
        remarks=finding_groups(each for each in findings if each.severity == "note"),
        remark_count=sum(each.severity == "note" for each in findings),
        swept={row.name for row in rows},
        cautions=[{**each, "text": prose(str(each.get("text", "")))} for each in view.newest.cautions],
        fixed_text=FIXED_TEXT,
        acts=after_the_fact(held),
        accessions=lab.accessions(address.head),
        things=_things(view),
        thumb_path=thumb_path,
    )


def _findings(lab: Archive, view: CooldownView) -> Iterator[Finding]:
    """Yield findings of the checks, then those of the steps of newest reductions, each placed at its sweep."""
    yield from view.newest.findings
    for row in lab.reductions(cooldown=view.newest.cooldown, newest_only=True):
        for each in lab.findings(row.address):
            finding = Finding.model_validate(each.content)
            yield finding if finding.place else finding.model_copy(update={"place": row.address})


def _dosed(cooldown: str, entry: DoseEntry) -> Dosed:
    return Dosed(
        address=f"{cooldown}/{entry.name}",
        at=entry.at,
        act=entry.act,
        counted=entry.counted,
        amount_mol=_si(entry.running_amount, "amount"),
        coverage_mol_per_m2=_si(entry.running_coverage, "coverage"),
    )


def _si(value: Value | None, kind: str) -> float | None:
    if value is None or value.value is None:
        return None
    return value.value * unit_factor(value.unit, kind)


def _things(view: CooldownView) -> dict[str, list[str]]:
    """Return addresses of the records that the newest accession holds, by kind."""
    found: dict[str, list[str]] = {}
    for entry in view.newest.records:
        found.setdefault(entry.kind, []).append(entry.address)
    return {kind: sorted(addresses) for kind, addresses in found.items()}
