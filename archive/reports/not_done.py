"""What was not done, which warnings were waived, what was replaced, and where the data are: sentences of the appendix."""

from __future__ import annotations

from collections.abc import Iterator

from archive.reports.checklist import Said, sentence
from archive.reports.front_page import grouped_digest
from archive.reports.later_pages import effect_states, replaced_results
from archive.reports.scope import Scope
from archive.reports.standing import standing
from schemas.cooldown import EFFECTS

__all__ = ["data_sentences", "effect_sentences", "replaced_sentences", "waiver_sentences"]


def effect_sentences(scope: Scope) -> Iterator[Said]:
    """Yield one sentence for each known effect in each cooldown."""
    first = {each.address for each in scope.reductions}
    for held in scope.runs:
        name = held.sheet.name
        yield sentence(f"Of {len(EFFECTS)} known effects each has one state in {name}.", f"{name} effects")
        for each in effect_states(held, first):
            yield sentence(_effect(each), f"{name} effect {each['effect']}")


def _effect(each: dict[str, object]) -> str:
    effect = str(each["effect"])
    subject, text = effect[0].upper() + effect[1:], str(each["text"]).rstrip(".")
    match each["state"]:
        case "applied":
            return (
                f"{subject} was treated in {each['by']}: {text}."
                if each["by"] != "sheet"
                else f"{subject} was corrected, as the sheet says: {text}."
            )
        case "bounded":
            return f"{subject} was not corrected; it is below {each['bound']}, from: {text}."
        case "considered":
            return (
                f"{subject} may be present; we have no estimate of its size and made no correction ({text})."
            )
        case "not applicable":
            return f"{subject} cannot occur here: {text}."
        case "not possible to know":
            return f"The record needed for {effect} does not exist ({text})."
    return f"{subject} was not examined."


def waiver_sentences(scope: Scope) -> Iterator[Said]:
    """Yield the count of waived warnings, printed even when it is zero, and one sentence for each."""
    for held in scope.runs:
        name, stands = held.sheet.name, standing(held.view)
        count = len(stands.waived)
        counted = (
            "No warnings were waived"
            if count == 0
            else f"{count} warning{'s were' if count > 1 else ' was'} waived"
        )
        yield sentence(f"{counted} in {name}; {len(stands.open)} open, {stands.cleared} cleared.", name)
        for each in stands.waived:
            finding, waiver = each.finding, each.finding.waived
            title = held.view.check_titles.get(finding.code, "title not recorded")
            found = finding.what + (f"; expected {finding.expected}" if finding.expected else "")
            if waiver is not None:
                yield sentence(
                    f"Check {finding.code} ({title}) found in {finding.place or name}: {found}. It was waived on {waiver.date} by {waiver.role} "
                    f"because: {waiver.reason.rstrip('.')}. Effect on the results: not estimated.",
                    f"{name} {finding.code} {finding.place or ''}".strip(),
                )
        for flag, finding in stands.open:
            yield sentence(
                f"Open ({flag}): check {finding.code} in {finding.place or name}: {finding.what}.",
                f"{name} {finding.code} {finding.place or ''}".strip(),
            )


def replaced_sentences(scope: Scope) -> Iterator[Said]:
    """Yield one sentence for each replaced result, or that none was."""
    used = {(each.sweep, each.plan.name) for each in scope.reductions}
    found = False
    for held in scope.runs:
        for each in replaced_results(held):
            sweep, _, plan = str(each["new"]).partition("@")
            if (sweep, plan.rpartition(".")[0]) in used:
                found = True
                yield sentence(
                    f"{each['name'].plain} = {each['is'].plain} ({each['new']}) replaces {each['was'].plain} ({each['old']}, {each['date']}) because: {each['reason']}.",
                    str(each["new"]),
                )
    if not found:
        yield sentence("No result was replaced.", "the reductions of these cooldowns")


def data_sentences(scope: Scope, figures: int) -> Iterator[Said]:
    """Yield where the records are and how to tell that they are the same."""
    for held in scope.runs:
        newest, name = held.view.newest, held.sheet.name
        digest, size = held.view.sealed.get(f"{newest.cooldown}/{newest.address}", ("", 0))
        shown = grouped_digest(digest) if digest else "[nr]"
        yield sentence(
            f"The records of {name} behind the {figures} {'figure' if figures == 1 else 'figures'} and the tables are accession {newest.address} in the archive {held.view.archive_name}; "
            f"its sealed file ({size} bytes), which lists the SHA-256 of every raw file, has SHA-256 {shown}.",
            newest.address,
        )
        yield sentence(f"Licence of {name}: {held.sheet.licence or 'not recorded'}.", name)
    for reduction in scope.reductions:
        digest, _ = scope.holdings_of(reduction).view.sealed.get(reduction.address, ("", 0))
        yield sentence(
            f"Reduction {reduction.address}: sealed file SHA-256 {grouped_digest(digest) if digest else '[nr]'}.",
            reduction.address,
        )
    for address in scope.not_held:
        yield sentence(f"Reduction {address} was rested on and is not among the records at hand.", address)
    yield sentence(
        "No deposit with a persistent identifier is recorded; the addresses hold inside the archive named.",
        "the records of these cooldowns",
    )
