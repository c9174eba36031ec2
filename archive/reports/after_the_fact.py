"""What was said of a cooldown after it was sealed: amendments, records in place of others, withdrawals; nothing if nothing.

Rules: an amended value is printed as amended, with a mark; the value before stands in the account of the amendment. What is
withdrawn is said wherever it is told of.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

from archive.reports.checklist import Said, sentence
from archive.reports.holdings import Holdings
from archive.reports.moments import full_time
from archive.reports.prose import Prose, prose
from archive.reports.scope import Scope
from archive.reports.view import CooldownView
from schemas.acts import AmendmentDocument, Difference
from schemas.finding import Finding
from schemas.lineage import ReductionDocument

__all__ = [
    "AMENDED",
    "WITHDRAWN",
    "act_sentences",
    "after_the_fact",
    "dose_mark",
    "flag_words",
    "result_mark",
    "sweep_flags",
    "warnings_of_acts",
]

AMENDED, WITHDRAWN = "A", "WD"
_WORDS = {
    AMENDED: "amended after it was sealed",
    WITHDRAWN: "withdrawn, or its result rests on something withdrawn",
}


def after_the_fact(held: Holdings) -> dict[str, Any]:
    """Return every amendment, replaced record and withdrawal of a cooldown, for the page of its own.

    Parameters
    ----------
    held : Holdings
    """
    zone = held.sheet.time_zone
    return {
        "amendments": [
            {
                "address": each.address, "by": each.by, "at": full_time(each.made, zone), "because": f"{each.because.rstrip('.')}.",
                "sweeps": ", ".join(sweep.partition("/")[2] for sweep in each.sweeps),
                "lines": [_line(said) for said in each.differences], "checks": _checks(each.findings), "findings": _raised(each.findings),
            }
            for each in held.view.amendments
        ],
        "revisions": [
            {"address": each.address, "by": each.by, "at": full_time(each.made, zone), "findings": _raised(each.findings[held.sheet.name])}
            for each in held.view.revisions
        ],
        "records": list(_records(held.view)),
        "withdrawn": [{"address": address, "why": why} for address, why in _withdrawn(held.view)],
        "resting": [
            {"address": ", ".join(addresses), "on": on} for on, addresses in _resting(held.view).items()
        ],
    }  # fmt: skip


def _checks(findings: Sequence[Finding] | None) -> str:
    if findings is None:
        return "the checks were not run again"
    if not findings:
        return "the checks, run again, found nothing new"
    return f"the checks, run again, found {len(findings)} thing{'s' * (len(findings) > 1)} that they had not found before"


def _raised(findings: Sequence[Finding] | None) -> list[Prose]:
    return [prose(f"{each.severity}: {each.sentence()}") for each in findings or ()]


def _line(said: Difference) -> dict[str, Any]:
    return {"field": said.field, "was": prose(said.before or "nothing"), "is": prose(said.after or "nothing")}


def _records(view: CooldownView) -> Iterator[dict[str, str]]:
    """Yield each record that a current reduction took in the place of another, once."""
    found: dict[tuple[str, str], dict[str, str]] = {}
    for reduction in view.current:
        for entry in reduction.inputs:
            if entry.instead_of is not None:
                said = {"now": entry.address, "was": entry.instead_of, "because": entry.because or ""}
                found.setdefault((entry.instead_of, entry.address), said)
    yield from (found[key] for key in sorted(found))


def flag_words(view: CooldownView) -> dict[str, str]:
    """Return what the flags of this module mean, as far as they occur."""
    found = {}
    if view.amendments:
        found[AMENDED] = _WORDS[AMENDED]
    if view.withdrawn or view.resting:
        found[WITHDRAWN] = _WORDS[WITHDRAWN]
    return found


def sweep_flags(view: CooldownView, sweep: str) -> list[str]:
    """Return the flags of one sweep."""
    address = f"{view.newest.cooldown}/{sweep}"
    flags = [AMENDED] if any(address in each.sweeps for each in view.amendments) else []
    gone = address in view.withdrawn or any(
        each.sweep == address and result_mark(view, each) for each in view.current
    )
    return flags + ([WITHDRAWN] if gone else [])


def result_mark(view: CooldownView, reduction: ReductionDocument) -> str:
    """Return what is said beside a result of a reduction; nothing if it stands as it is."""
    if reduction.address in view.resting:
        return "RESTS ON SOMETHING WITHDRAWN"
    return "amended" if any(reduction.sweep in each.sweeps for each in view.amendments) else ""


def dose_mark(view: CooldownView, dose: str) -> str:
    """Return which amendments speak of a dose, and what was said before."""
    prefix = f"dose.{dose}."
    said = [
        f"amended by {each.address} ({line.field.removeprefix(prefix)} was {line.before or 'nothing'})"
        for each in view.amendments
        for line in each.differences
        if line.field.startswith(prefix)
    ]
    return "; ".join(said)


def warnings_of_acts(view: CooldownView) -> list[str]:
    """Return what the front page says of acts, loudest first."""
    cooldown = view.newest.cooldown
    said = [f"{address} is WITHDRAWN: {why}" for address, why in _withdrawn(view)]
    said.sort(key=lambda each: not each.startswith(f"{cooldown} "))
    now = {each.address for each in view.current}
    for on, addresses in _resting(view).items():
        current = [each.partition("/")[2] for each in addresses if each in now]
        if current:
            said.append(f"on {on}, WITHDRAWN, rest results that count: {', '.join(current)}")
    said += [f"with {each.address} {_checks(each.findings[cooldown])}" for each in view.revisions]
    return said + [_amendment_words(each) for each in view.amendments]


def _withdrawn(view: CooldownView) -> list[tuple[str, str]]:
    """What is withdrawn itself, and why; what is made of a withdrawn sweep goes with it."""
    return [
        (address, why)
        for address, why in sorted(view.withdrawn.items())
        if address.partition("@")[0] == address or address.partition("@")[0] not in view.withdrawn
    ]


def _resting(view: CooldownView) -> dict[str, list[str]]:
    """Reductions that rest on something withdrawn, by what that is."""
    found: dict[str, list[str]] = {}
    for address, on in sorted(view.resting.items()):
        found.setdefault(", ".join(on), []).append(address)
    return found


def _amendment_words(each: AmendmentDocument) -> str:
    return (
        f"{each.address} amends what was sealed ({each.because.rstrip('.')}); values marked {AMENDED} are amended, "
        f"and {_checks(each.findings)}"
    )


def _raised_sentence(cooldown: str, act: str, found: Finding) -> Said:
    return sentence(
        f"With {act} the checks of {cooldown} found ({found.severity}): {found.sentence().rstrip('.')}.", act
    )


def act_sentences(scope: Scope) -> Iterator[Said]:
    """Yield one sentence for each amendment, replaced record and withdrawal behind an appendix; none if there is none."""
    for held in scope.runs:
        view, name = held.view, held.sheet.name
        for each in view.amendments:
            lines = "; ".join(
                f"{line.field} was {line.before or 'nothing'} and is {line.after or 'nothing'}"
                for line in each.differences
            )
            yield sentence(
                f"After {name} was sealed it was amended ({each.address}, {each.made.date()}, by the {each.by}) because: "
                f"{each.because.rstrip('.')}. {lines}.",
                each.address,
            )
            yield from (_raised_sentence(name, each.address, one) for one in each.findings or ())
        for revision in view.revisions:
            yield from (_raised_sentence(name, revision.address, one) for one in revision.findings[name])
        for said in _records(view):
            yield sentence(
                f"In {name}, {said['now']} was taken in the place of {said['was']}: {said['because'].rstrip('.')}.",
                said["now"],
            )
        for address, why in _withdrawn(view):
            yield sentence(f"{address} is withdrawn: {why}.", address)
    for reduction in scope.reductions:
        resting = scope.holdings_of(reduction).view.resting.get(reduction.address, ())
        if resting:
            yield sentence(
                f"Reduction {reduction.address} rests on {', '.join(resting)}, withdrawn.", reduction.address
            )
        taken_back = scope.holdings_of(reduction).view.withdrawn.get(reduction.address)
        if taken_back is not None:
            yield sentence(f"Reduction {reduction.address} is withdrawn: {taken_back}.", reduction.address)
