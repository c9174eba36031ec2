"""The front page of a run sheet: band, results, what to mind, set-up, strip, sweeps, origin, in this order."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from typing import Any

from archive.intake.cautions import FIXED_TEXT
from archive.reports.after_the_fact import flag_words, result_mark, warnings_of_acts
from archive.reports.holdings import Holdings
from archive.reports.moments import full_time
from archive.reports.numbers import Shown, shown_output, shown_value
from archive.reports.prose import prose, symbol_of
from archive.reports.set_up import left_column, right_column
from archive.reports.standing import Standing, draft_reasons
from archive.reports.strip import strip
from archive.reports.sweep_lines import SWEEP_HEADS, sweep_lines
from schemas.finding import Finding
from schemas.lineage import ReductionDocument

__all__ = ["finding_line", "front_page", "grouped_digest"]

_GAS = {
    "recovered": "recovered", "left-in-cell": "left in the cell", "vented": "vented", "never-admitted": "never admitted", "unknown": "unknown",
}  # fmt: skip
_FLAGS = {
    "W": "warning waived", "!": "warning open", "X": "a channel is kept and not used", "L": "rows left out, listed later", "d": "computed from recorded values",
    "P": "provisional",
}  # fmt: skip


def front_page(held: Holdings, stands: Standing) -> dict[str, Any]:
    """Return the blocks 0 to 6 of a run sheet."""
    reasons = draft_reasons(held.view, stands)
    drawing, legend = strip(held)
    return {
        "band": _band(held, stands, reasons),
        "results": list(_results(held, provisional=bool(reasons))),
        "mind": _mind(held, stands),
        "set_up": {"left": _rows(left_column(held)), "right": _rows(right_column(held))},
        "strip": {"svg": drawing, "legend": legend},
        "sweeps": {
            "heads": list(SWEEP_HEADS),
            "lines": sweep_lines(held, stands),
            "flags": {**_FLAGS, **flag_words(held.view)},
        },
        "origin": _origin(held),
    }


def _rows(rows: list[tuple[str, Shown]]) -> list[dict[str, Any]]:
    return [{"name": name, "value": value} for name, value in rows]


def _band(held: Holdings, stands: Standing, reasons: tuple[str, ...]) -> dict[str, Any]:
    sheet = held.sheet
    cell = held.named(sheet.cell)
    if sheet.begin is None or sheet.end is None:
        dates = f"[nr]: {sheet.undated}"
    else:
        dates = f"{full_time(sheet.begin, sheet.time_zone)} to {full_time(sheet.end, sheet.time_zone)}"
    is_open = sheet.outcome == "open" or bool(stands.open)
    return {
        "name": sheet.name,
        "dates": dates,
        "cell": "[nr]" if cell is None else cell.address,
        "purpose": sheet.purpose,
        "operators": ", ".join(sheet.operators),
        "state": "WITHDRAWN"
        if sheet.name in held.view.withdrawn
        else "OPEN"
        if is_open
        else sheet.outcome.upper(),
        "state_words": f"run {sheet.outcome}, {_count(len(stands.open), 'warning')} open" if is_open else "",
        "draft": bool(reasons),
        "reasons": list(reasons),
    }


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}{'' if number == 1 else 's'}"


def _results(held: Holdings, *, provisional: bool) -> Iterator[dict[str, Any]]:
    """Yield at most three with their uncertainty: one of each plan, those that rest on others first, then those that others rest on."""
    used: dict[str, int] = {}
    for entry in (entry for each in held.view.current for entry in each.inputs):
        address = entry.address.partition("#")[0]
        used[address] = used.get(address, 0) + 1
    order = {f"{held.view.newest.cooldown}/{each.sheet.name}": each.number for each in held.sweeps}
    ranked = sorted(
        held.view.current,
        key=lambda each: (
            -len(each.plan.needs),
            -used.get(each.address, 0),
            each.plan.name,
            -order.get(each.sweep, 0),
        ),
    )
    seen: set[str] = set()
    for reduction in ranked:
        if reduction.plan.name in seen or len(seen) == 3:
            continue
        best = next(
            (each for each in held.headline(reduction) if each.value is not None and each.uncertainty), None
        )
        if best is not None:
            seen.add(reduction.plan.name)
            yield {
                "name": symbol_of(best.name), "what": best.description, "value": shown_output(best), "where": _where(held, reduction),
                "number": reduction.number, "address": f"{reduction.address}#{best.name}", "provisional": provisional, "mark": result_mark(held.view, reduction),
            }  # fmt: skip


def _where(held: Holdings, reduction: ReductionDocument) -> str:
    name = reduction.sweep.partition("/")[2]
    taken = next((each for each in held.sweeps if each.sheet.name == name), None)
    if taken is None or taken.entry is None or taken.sheet.empty_cell or taken.entry.coverage is None:
        return name
    return f"{name}, {shown_value(taken.entry.coverage, 'coverage')}"


def _mind(held: Holdings, stands: Standing) -> dict[str, Any]:
    end = held.sheet.gas_end
    return {
        "counts": f"{len(stands.open)} open, {len(stands.waived)} waived, {stands.cleared} cleared",
        "open": list(_alike(stands.open)),
        "waived": list(_alike([(each.flag, each.finding) for each in stands.waived])),
        "acts": [prose(each) for each in warnings_of_acts(held.view)],
        "none_waived": "No warnings were waived." if not stands.waived else "",
        "gas": {
            "state": _GAS[end.state],
            "valve": end.valve or "[nr]",
            "notes": end.notes,
            "last": _last_amount(held),
        },
        "cautions": [_caution(each) for each in held.view.newest.cautions],
        "fixed_text": FIXED_TEXT,
    }


def _alike(flagged: Iterable[tuple[str, Finding]]) -> Iterator[dict[str, Any]]:
    """Yield warnings, those of one check with one answer as one line; each stands in full on a later page."""
    groups: dict[tuple[str, str], list[tuple[str, Finding]]] = {}
    for flag, finding in flagged:
        waiver = finding.waived
        answer = "" if waiver is None else f"{waiver.date} {waiver.role} {waiver.reason}"
        groups.setdefault((finding.code, answer), []).append((flag, finding))
    for members in groups.values():
        line = finding_line(*members[0])
        if len(members) > 1:
            line["flag"] = (
                f"{members[0][0]} to {members[-1][0]}"
                if _consecutive(members)
                else ", ".join(flag for flag, _ in members)
            )
            line["place"] = ", ".join(finding.place or "the cooldown" for _, finding in members)
        yield line


def _consecutive(members: list[tuple[str, Finding]]) -> bool:
    numbers = [int(flag[1:]) for flag, _ in members]
    return numbers == list(range(numbers[0], numbers[0] + len(numbers)))


def _last_amount(held: Holdings) -> str:
    doses = held.view.newest.doses
    if not doses:
        return "no dose is recorded"
    last = doses[-1]
    return f"after {last.name} the ledger held {shown_value(last.running_amount, 'amount')}"


def _caution(caution: dict[str, Any]) -> dict[str, Any]:
    numbers = caution.get("numbers") or {}
    return {
        "subject": caution.get("subject", ""),
        "state": caution.get("state", ""),
        "missing": list(caution.get("missing") or ()),
        "text": prose(str(caution.get("text", ""))),
        "formula": caution.get("formula", ""),
        "numbers": [{"name": name, "value": _bare(each)} for name, each in numbers.items()],
        "rating": caution.get("rating", ""),
    }


def _bare(value: dict[str, Any]) -> str:
    number = value.get("value")
    return "[nr]" if number is None else str(prose(f"{number:.3g} {value.get('unit', '')}".strip()))


def finding_line(flag: str, finding: Finding) -> dict[str, Any]:
    """Return a finding as both reports print it: code, place, what, and the waiver in words."""
    waiver = finding.waived
    told = finding.what
    told += f"; found {finding.found}" if finding.found else ""
    told += f"; expected {finding.expected}" if finding.expected else ""
    return {
        "flag": flag,
        "code": finding.code,
        "severity": finding.severity,
        "place": finding.place or "the cooldown",
        "where": ", ".join(
            part for part in (finding.file or "", f"line {finding.line}" if finding.line else "") if part
        ),
        "what": prose(told),
        "remedy": finding.remedy or "",
        "waiver": None
        if waiver is None
        else {"date": str(waiver.date), "role": waiver.role, "reason": waiver.reason},
    }


def grouped_digest(digest: str) -> str:
    """Return a digest in groups of four."""
    return " ".join(digest[k : k + 4] for k in range(0, len(digest), 4))


def _origin(held: Holdings) -> dict[str, Any]:
    newest = held.view.newest
    key = f"{newest.cooldown}/{newest.address}"
    digest = held.view.sealed.get(key, ("", 0))
    replaced = [each.address for each in held.view.accessions[:-1]]
    software = newest.software
    return {
        "archive": held.view.archive_name,
        "accession": newest.address,
        "key": key,
        "sha256": grouped_digest(digest[0]) if digest[0] else "[nr]",
        "short": digest[0][:16] or "[nr]",
        "size": f"{digest[1]} bytes",
        "accessioned": full_time(newest.accessioned, held.sheet.time_zone),
        "software": f"stillroom {software.stillroom}, Python {software.python}",
        "replaces": ", ".join(replaced) or "nothing",
        "next_step": held.sheet.next_step or "[nr]",
        "licence": held.sheet.licence or "[nr]",
        "raw_files": f"{len(newest.raw_files)} raw files, {sum(each.size for each in newest.raw_files)} bytes",
    }
