"""The later pages of a run sheet: plots, doses, findings, replaced results, gaps, events, records, effects, reductions, files."""

from __future__ import annotations

import json
import re
from collections.abc import Container, Iterator
from typing import Any

from archive.reports.after_the_fact import after_the_fact, dose_mark
from archive.reports.budget import headline_budgets, largest_shares
from archive.reports.front_page import finding_line, grouped_digest
from archive.reports.holdings import Holdings
from archive.reports.lineage_graph import cooldown_graph
from archive.reports.moments import clock_lines, full_time
from archive.reports.numbers import CODES, shown_output, shown_value, words
from archive.reports.prose import prose, symbol_of
from archive.reports.set_up import calibration_rows, record_rows
from archive.reports.small_plots import sweep_plot
from archive.reports.small_reductions import reduction_plot
from archive.reports.standing import Standing
from schemas.cooldown import EFFECTS, Effect
from schemas.lineage import InputEntry, OutputEntry, ReductionDocument, StepRecord
from schemas.thermometer import Calibration

__all__ = ["dose_lines", "effect_states", "later_pages", "parameter_text"]

_SIZES = re.compile(r'(?:width|height)="([0-9.]+)mm"')
_PAGE = (180.0, 235.0)
"""Largest width and height of a drawing on paper, mm."""


def later_pages(held: Holdings, stands: Standing) -> dict[str, Any]:
    """Return everything that follows the front page."""
    zone = held.sheet.time_zone
    return {
        "plots": list(_plots(held)),
        "lineage": _lineage(held),
        "doses": list(dose_lines(held)),
        "findings": [finding_line(flag, each) for flag, each in stands.open]
        + [finding_line(each.flag, each.finding) for each in stands.waived]
        + [finding_line("", each) for each in stands.notes],
        "replaced": list(replaced_results(held)),
        "gaps": list(_gaps(held)),
        "events": [
            {"at": full_time(each.at, zone), "what": each.what.replace("-", " "), "text": each.text, "sweeps": ", ".join(each.sweeps) or "[nr]"}
            for each in sorted(held.sheet.event, key=lambda each: each.at)
        ],
        "notes": [
            {"at": full_time(each.at, zone), "role": each.role or "[nr]", "text": each.text} for each in held.sheet.note
        ],
        "sweep_notes": list(_sweep_notes(held)),
        "differences": list(held.view.newest.differences),
        "acts": after_the_fact(held),
        "records": list(_records(held)),
        "effects": list(effect_states(held)),
        "reductions": [reduction_block(held, each) for each in held.view.current],
        "files": [
            {"name": each.name, "role": each.role, "size": str(each.size), "sha256": grouped_digest(each.sha256)} for each in held.view.newest.raw_files
        ],
        "sealed": [
            {"key": key, "size": str(size), "sha256": grouped_digest(digest)} for key, (digest, size) in sorted(held.view.sealed.items())
        ],
        "codes": CODES,
    }  # fmt: skip


def _lineage(held: Holdings) -> dict[str, Any]:
    current = held.view.current
    drawn = cooldown_graph(held.view.newest.cooldown, held.view.newest.sweeps, current)
    sizes = [] if drawn is None else [float(each) for each in _SIZES.findall(drawn)[:2]]
    fitting = min((1.0, *(most / size for most, size in zip(_PAGE, sizes, strict=False))))
    count = f"{len(current)} reduction{'' if len(current) == 1 else 's'}"
    return {
        "svg": drawn,
        "width": sizes[0] * fitting if sizes else 0.0,
        "legend": "nothing is reduced yet"
        if drawn is None
        else f"What {count} took: sweeps and what came from other runs (plain), records (dashed), reductions (round corners) with the "
        "result that their plan shows first. Facts of the sheet are behind all of it and not drawn.",
    }


def _plots(held: Holdings) -> Iterator[dict[str, Any]]:
    for taken in held.sweeps:
        drawn = sweep_plot(held, taken)
        yield {"name": taken.sheet.name, "kind": taken.sheet.kind.replace("-", " "), "svg": drawn}
        for reduction in held.reductions_of(taken.sheet.name):
            found = reduction_plot(held, reduction)
            if found is not None:
                yield {"name": reduction.address.partition("/")[2], "kind": found[1], "svg": found[0]}


def dose_lines(held: Holdings) -> Iterator[dict[str, Any]]:
    """Yield the lines of the gas ledger, each with what is remarked on it."""
    entries = held.view.newest.doses
    told = {each.name: each for each in held.sheet.dose}
    starts = clock_lines([each.at for each in entries], held.sheet.time_zone)
    for each, start in zip(entries, starts, strict=True):
        sheet = told.get(each.name)
        note = "; ".join(
            part
            for part in (
                f"crossed out: {sheet.crossed_out}" if sheet and sheet.crossed_out else "",
                (sheet.annealing or "") if sheet else "",
                sheet.notes if sheet else "",
                dose_mark(held.view, each.name),
            )
            if part
        )
        yield {
            "name": each.name, "at": start, "act": each.act, "counted": "yes" if each.counted else "no", "amount": shown_value(each.amount, "amount"),
            "running": shown_value(each.running_amount, "amount"), "coverage": shown_value(each.running_coverage, "coverage", code="na" if held.sheet.cell is None else "nr"),
            "note": note,
        }  # fmt: skip


def replaced_results(held: Holdings) -> Iterator[dict[str, Any]]:
    """Yield each headline result that a later reduction replaced: was, is, both addresses, when."""
    current = {(each.sweep, each.plan.name): each for each in held.view.current}
    for old in sorted(held.view.reductions, key=lambda each: each.address):
        new = current.get((old.sweep, old.plan.name))
        # Where all are withdrawn, nothing replaces them; where the newest is, it does not replace the one before.
        if new is None or new.number <= old.number:
            continue
        outputs = {each.name: each for each in new.outputs}
        for was in held.headline(old):
            yield {
                "name": symbol_of(was.name), "was": shown_output(was), "is": shown_output(outputs.get(was.name)), "old": old.address, "new": new.address,
                "date": full_time(new.begin, held.sheet.time_zone), "reason": _why(old, new),
            }  # fmt: skip


def _why(old: ReductionDocument, new: ReductionDocument) -> str:
    parts = []
    if old.plan_digest != new.plan_digest:
        parts.append(
            f"plan {old.plan.address} became {new.plan.address}"
            + (f": {new.plan.changed}" if new.plan.changed else "")
        )
    before = {(each.address, each.role): each.digest for each in old.inputs}
    changed = [
        each
        for each in new.inputs
        if (each.address, each.role) not in before or before[each.address, each.role] != each.digest
    ]
    parts += list(dict.fromkeys(f"{each.address}: {each.because}" for each in changed if each.because))
    bare = list(dict.fromkeys(each.address for each in changed if not each.because))
    parts += [f"changed inputs: {', '.join(bare)}"] if bare else []
    if new.monte_carlo is not None and new.monte_carlo != old.monte_carlo:
        parts.append(f"the plan was repeated with drawn inputs ({new.monte_carlo.trials} trials)")
    if old.software != new.software and not parts:
        parts.append("the software changed")
    return "; ".join(parts) or "[nr]"


def _gaps(held: Holdings) -> Iterator[dict[str, str]]:
    for taken in held.sweeps:
        if taken.entry is None:
            yield {"where": taken.sheet.name, "what": "no stored values", "why": "[nr]"}
            continue
        channels = held.sheet.channels_of(taken.sheet)
        for channel in taken.entry.channels:
            if channel.missing:
                yield {
                    "where": f"{taken.sheet.name}#{channel.name}",
                    "what": f"{channel.missing} of {taken.entry.rows} rows have no value",
                    "why": "sentinel or empty cell in the file",
                }
            told = channels.get(channel.name)
            if told is not None and not told.use:
                yield {
                    "where": f"{taken.sheet.name}#{channel.name}",
                    "what": "kept, not used",
                    "why": told.why_not or "[nr]",
                }
        for left in taken.sheet.left_out:
            span = (
                f"rows {left.rows[0]} to {left.rows[1]}"
                if left.rows
                else f"{left.channel} from {left.low or 'its lowest'} to {left.high or 'its highest'}"
            )
            yield {"where": taken.sheet.name, "what": f"left out: {span}", "why": left.reason}
        for reduction in held.reductions_of(taken.sheet.name):
            for output in reduction.outputs:
                if output.verdict is not None and output.rows is None:
                    yield {
                        "where": f"{reduction.address}#{output.name}",
                        "what": "no number",
                        "why": output.verdict,
                    }


def _sweep_notes(held: Holdings) -> Iterator[dict[str, str]]:
    zone = held.sheet.time_zone
    for taken in held.sweeps:
        sweep = taken.sheet
        said = [f"settled: {sweep.settled}"] if sweep.settled else []
        if sweep.liquid is not None:
            said.append(
                f"liquid at {sweep.liquid.pressure.format()}, {sweep.liquid.density.format()} at its lambda point ({sweep.liquid.source})"
            )
        said += [
            f"{full_time(each.at, zone)}: {each.what}" + (" (new segment)" if each.new_segment else "")
            for each in sweep.disturbances
        ]
        said += [
            f"{each.correct} correction of {each.channel} by {each.value} ({each.known}): {each.source}"
            for each in sweep.corrections
        ]
        said += [sweep.notes] if sweep.notes else []
        if said:
            yield {"name": sweep.name, "text": "; ".join(said)}


def _records(held: Holdings) -> Iterator[dict[str, Any]]:
    for address, record in sorted(
        held.records.items(), key=lambda item: (held.entries[item[0]].kind, item[0])
    ):
        kind = held.entries[address].kind
        rows = calibration_rows(record) if isinstance(record, Calibration) else record_rows(record)
        absent = [name for name, value in rows if value.plain == "[nr]"]
        yield {
            "address": address, "kind": kind, "digest": held.entries[address].digest[:16],
            "rows": [{"name": name, "value": value} for name, value in rows if value.plain != "[nr]"], "absent": ", ".join(absent),
        }  # fmt: skip


def effect_states(held: Holdings, first: Container[str] = ()) -> Iterator[dict[str, Any]]:
    """Yield every known effect with its one state: applied by a step, else what the sheet says, else considered by a step, else not examined.

    Parameters
    ----------
    held : Holdings
    first : container of str
        Addresses of the reductions whose steps are named before those of others.
    """
    treated: dict[str, tuple[str, str]] = {}
    considered: dict[str, tuple[str, str]] = {}
    for reduction in sorted(held.view.current, key=lambda each: each.address not in first):
        for step in reduction.steps:
            where = f"{reduction.address}, step {step.number}"
            for effect, sentence in step.effects.items():
                treated.setdefault(effect, (sentence, where))
            for effect, sentence in step.considered.items():
                considered.setdefault(effect, (sentence, where))
    said: dict[str, Effect] = {each.effect: each for each in held.sheet.effect}
    for effect in EFFECTS:
        found = said.get(effect)
        if effect in treated:
            sentence, where = treated[effect]
            yield {"effect": effect, "state": "applied", "bound": "", "text": prose(sentence), "by": where}
        elif found is not None:
            yield {
                "effect": effect,
                "state": found.state.replace("-", " "),
                "bound": found.bound or "",
                "text": prose(found.reason),
                "by": "sheet",
            }
        elif effect in considered:
            sentence, where = considered[effect]
            yield {"effect": effect, "state": "considered", "bound": "", "text": prose(sentence), "by": where}
        else:
            yield {
                "effect": effect,
                "state": "not examined",
                "bound": "",
                "text": prose("was not examined"),
                "by": "nobody",
            }


def reduction_block(held: Holdings, reduction: ReductionDocument) -> dict[str, Any]:
    """Return one reduction: results with uncertainties, steps with parameters, inputs and digests."""
    return {
        "address": reduction.address,
        "plan": reduction.plan.address,
        "title": reduction.plan.title,
        "plan_digest": reduction.plan_digest[:16],
        "sha256": held.view.sealed.get(reduction.address, ("[nr]", 0))[0][:16],
        "begin": full_time(reduction.begin, held.sheet.time_zone),
        "software": f"stillroom {reduction.software.stillroom}",
        "results": [_result(each, reduction) for each in reduction.outputs if each.rows is None],
        "budgets": headline_budgets(reduction),
        "steps": [_step(each, reduction) for each in reduction.steps],
    }


def _result(output: OutputEntry, reduction: ReductionDocument) -> dict[str, Any]:
    return {
        "name": symbol_of(output.name),
        "what": output.description,
        "value": shown_output(output),
        "shares": largest_shares(reduction, output),
        "step": output.step,
    }


def _step(step: StepRecord, reduction: ReductionDocument) -> dict[str, Any]:
    digests = {each.name: each.digest[:16] for each in reduction.outputs}
    return {
        "number": step.number, "name": step.name, "version": step.version, "sentence": prose(step.sentence),
        "parameters": "; ".join(f"{name} = {parameter_text(value)}" for name, value in step.parameters.items()) or "none",
        "inputs": "; ".join(_input(port, entry) for port, entry in step.inputs.items()),
        "outputs": "; ".join(f"{name} {digests.get(name, '')}".strip() for name in step.outputs),
        "findings": [prose(each.sentence()) for each in step.findings],
    }  # fmt: skip


def _input(port: str, entry: InputEntry) -> str:
    return f"{port}: {entry.address}" + (f" {entry.digest[:16]}" if entry.digest else "")


def parameter_text(value: object) -> str:
    """Return a parameter as it stands in a table."""
    return value if isinstance(value, str) else words(json.dumps(value)).plain
