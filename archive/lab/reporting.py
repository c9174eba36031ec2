"""Gathering what the two reports tell from store and index.

The reports are imported where they are made: they draw, and what draws takes longer to import than a search to answer.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Literal, cast

from archive.errors import BadRequest, UnknownAddress
from archive.intake.checks import CHECKS
from archive.lab.report_reading import read_for_reports, withdrawn_in
from archive.lab.source import LabSource
from schemas.address import parse_address

if TYPE_CHECKING:
    from archive.lab.comparing import Comparison
    from archive.reports import CooldownView

__all__ = ["appendix", "comparison", "run_sheet", "view"]


def view(source: LabSource, archive_name: str, cooldown: str, *, reductions: bool = True) -> CooldownView:
    """Everything that reports may tell of one cooldown; without its reductions if they are not asked for.

    Raises
    ------
    UnknownAddress
        If the archive holds no such cooldown.
    """
    from archive.reports import CooldownView

    accessions = read_for_reports(source, cooldown)
    if not accessions:
        known = ", ".join(source.cooldowns()) or "none yet"
        raise UnknownAddress(f"there is no cooldown {cooldown} in this archive", expected=f"one of: {known}")
    withdrawn, resting = withdrawn_in(source, accessions)
    return CooldownView(
        archive_name=archive_name,
        accessions=tuple(accessions),
        sealed=source.index.sealed_files(under=f"{cooldown}/"),
        reductions=tuple(source.reduction(row.address) for row in source.index.reductions(cooldown=cooldown))
        if reductions
        else (),
        values=source.values,
        check_titles={check.code: check.title for check in CHECKS},
        amendments=tuple(source.amendments(cooldown)),
        revisions=tuple(each for each in source.own_revisions() if each.findings.get(cooldown)),
        withdrawn=withdrawn,
        resting=resting,
    )


def run_sheet(source: LabSource, archive_name: str, cooldown: str, *, paper: str) -> dict[str, bytes]:
    """Run sheet of a cooldown by file name."""
    from archive.reports import run_sheet_html, run_sheet_json, run_sheet_pdf

    if paper not in ("a4", "us-letter"):
        raise BadRequest("a run sheet is made for a4 or us-letter", found=paper)
    seen = view(source, archive_name, cooldown)
    pdf = run_sheet_pdf(seen, paper=cast("Literal['a4', 'us-letter']", paper))
    return {
        f"run-sheet-{cooldown}.html": run_sheet_html(seen).encode(),
        f"run-sheet-{cooldown}.pdf": pdf,
        f"run-sheet-{cooldown}.json": run_sheet_json(seen).encode(),
    }


def appendix(
    source: LabSource, archive_name: str, addresses: Sequence[str], *, title: str | None, level: str
) -> dict[str, bytes]:
    """Methods appendix behind cooldowns, sweeps, reductions or results."""
    from archive.reports import methods_appendix

    if not addresses:
        raise BadRequest(
            "name what the appendix is about", expected="addresses of cooldowns, sweeps or reductions"
        )
    chosen: dict[str, None] = {}
    cooldowns: dict[str, None] = {}
    for text in addresses:
        for address in _reductions(source, text):
            chosen[address] = None
            cooldowns[parse_address(address).head] = None
    views = [view(source, archive_name, cooldown) for cooldown in cooldowns]
    return methods_appendix(views, list(chosen), title=title, level=level)


def _reductions(source: LabSource, text: str) -> list[str]:
    """Addresses of the reductions that an address stands for."""
    parsed = parse_address(text)
    if parsed.reduction is not None:
        return [source.reduction(parsed.reduction).address]
    if parsed.kind == "name":
        rows = source.index.reductions(cooldown=parsed.head, newest_only=True)
        view(source, "", parsed.head)
    elif parsed.kind == "item":
        source.holding(parsed.head, parsed.item or "")
        rows = source.index.reductions(sweep=text, newest_only=True)
    else:
        raise BadRequest(
            f"an appendix cannot be made of {text}",
            expected="a cooldown, a sweep, a reduction or one of its outputs",
        )
    if not rows:
        raise BadRequest(
            f"nothing of {text} has been reduced yet",
            remedy=f"reduce it first: stillroom reduce {parsed.head}",
        )
    return [row.address for row in rows]


def comparison(source: LabSource, found: Comparison, *, kind: str) -> bytes:
    """Figure of two reductions.

    Raises
    ------
    BadRequest
        If both have neither a curve nor a result in common.
    """
    from archive.reports.comparison_figure import comparison_figure

    shifts = [(each.name, each.significance) for each in found.results if each.significance is not None]
    first, second = source.reduction(found.first), source.reduction(found.second)
    try:
        return comparison_figure(first, second, shifts, source.values, kind=kind)
    except ValueError as error:
        raise BadRequest("there is nothing to draw", found=str(error)) from None
