"""Findings for people: grouped by file, each with severity, place, expectation and remedy."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from itertools import groupby
from typing import TYPE_CHECKING, Any

import click

from archive.commands.terminal import clean, say, styled

if TYPE_CHECKING:
    from archive.lab import CheckReport
    from schemas.finding import Finding

__all__ = ["counts", "report_content", "say_cautions", "say_findings"]

_COLOURS = {"error": "red", "warning": "yellow", "note": "cyan", "waived": "green"}


def say_findings(findings: Iterable[Finding]) -> None:
    """Write findings to stdout, under the name of the file each is about."""
    ordered = sorted(findings, key=lambda finding: finding.order)
    for file, group in groupby(ordered, key=lambda finding: finding.file):
        say(file or "The cooldown as a whole")
        for finding in group:
            _say_finding(finding)
        say()


def _say_finding(finding: Finding) -> None:
    word = "waived" if finding.waived is not None else finding.severity
    place = ", ".join(
        part
        for part in (
            None if finding.line is None else f"line {finding.line}",
            None if finding.column is None else f"column {finding.column}",
            finding.field,
            finding.place,
        )
        if part
    )
    # The words are padded to the longest, so that the places stand in one column.
    click.echo("  " + styled(f"{word:<7}", _COLOURS[word], bold=word == "error") + " ", nl=False)
    say(f"{place}: {finding.what}" if place else finding.what)
    details = (
        ("found", finding.found),
        ("expected", finding.expected),
        ("remedy", finding.remedy),
        ("check", finding.code),
    )
    for name, text in details:
        if text:
            say(f"          {name}: {text}")
    if finding.waived is not None:
        say(
            f"          waived: {finding.waived.reason} ({finding.waived.role}, {finding.waived.date.isoformat()})"
        )


def say_cautions(cautions: Iterable[Mapping[str, Any]]) -> None:
    """Write cautions to stdout, each with its state, and the words that always stand below them."""
    from archive.intake.caution_texts import FIXED_TEXT

    said = False
    for caution in cautions:
        subject = clean(str(caution.get("subject") or "caution"))
        state = clean(str(caution.get("state") or "caution"))
        click.echo(styled(state, "red", bold=state == "caution") + ": ", nl=False)
        say(f"{subject}: {caution.get('text') or ', '.join(map(str, caution.get('missing') or ()))}")
        said = True
    if said:
        say(FIXED_TEXT)
        say()


def counts(report: CheckReport) -> str:
    """Return the counts of a report in words."""
    waived = f" ({report.waived} more waived)" if report.waived else ""
    return ", ".join(
        (
            _some(report.errors, "error"),
            _some(report.warnings, "warning") + waived,
            _some(report.notes, "note"),
        )
    )


def _some(number: int, word: str) -> str:
    return f"{number or 'no'} {word}{'' if number == 1 else 's'}"


def report_content(report: CheckReport) -> dict[str, Any]:
    """Report as programs read it."""
    return {
        "errors": report.errors,
        "warnings": report.warnings,
        "notes": report.notes,
        "waived": report.waived,
        "summary": report.summary,
        "findings": report.findings,
        "cautions": report.cautions,
    }
